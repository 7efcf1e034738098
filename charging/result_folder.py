"""A result folder that appears as a whole or not at all."""

from __future__ import annotations

import json
import os
import re
import shutil
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from charging.errors import InputError

MARKS = ("summary.json", "review.json")
"""Every result folder holds one of these files, with the key `PROGRAM`."""

PROGRAM = "halflit_version"
OWN = re.compile(
    r"report\.html|review\.json|summary\.json|surfaces\.csv"
    r"|result(_\d+)?(_[a-z_0-9]+)?(\.nc)?|[a-z]+\.png"
)
"""Names that a run writes; a folder with anything else is not ours to replace."""


def check_target(target: Path) -> None:
    """Refuse a target that `result_folder` would refuse, before any work is done.

    Raises
    ------
    InputError
        As `result_folder`.
    """
    target = target.resolve()
    try:
        str(target).encode(sys.getfilesystemencoding())  # as the NetCDF library will
    except UnicodeError:
        raise InputError(
            f"--out {target}: has characters that no file name may have in this locale",
            allowed="other characters, or a locale with UTF-8 (LC_ALL=C.UTF-8)",
        ) from None
    if target.exists():
        _refuse_foreign(target)
    standing = next(p for p in target.parents if p.exists())
    if not standing.is_dir() or not os.access(standing, os.W_OK):
        raise InputError(
            f"--out {target}: {standing} is no folder that can be written",
            allowed="a writable place",
        )


@contextmanager
def result_folder(target: Path) -> Iterator[Path]:
    """Give a scratch folder that replaces `target` when the block ends well.

    The scratch folder stands beside the target as ``.NAME.partial``; the former result
    waits as ``.NAME.previous`` for the moment of the exchange. Leftovers of an
    interrupted run are cleared away, a result caught between the two renames is put back.

    Raises
    ------
    InputError
        The target exists and is no result folder, or the place cannot be written.
    """
    target = target.resolve()  # a link stays a link to the new result
    partial = target.with_name(f".{target.name}.partial")
    previous = target.with_name(f".{target.name}.previous")
    try:
        if previous.is_dir() and not target.exists():
            previous.rename(target)
        if target.exists():
            _refuse_foreign(target)
        for leftover in (partial, previous):
            if leftover.exists():
                shutil.rmtree(leftover)
        partial.mkdir(parents=True)
    except OSError as error:
        raise _unwritable(target, error) from error
    try:
        yield partial
        if target.exists():
            target.rename(previous)
        partial.rename(target)
    except OSError as error:
        raise _unwritable(target, error) from error
    finally:
        shutil.rmtree(partial, ignore_errors=True)
        if target.exists():
            shutil.rmtree(previous, ignore_errors=True)


def _refuse_foreign(target: Path) -> None:
    if not target.is_dir():
        raise InputError(f"--out {target}: is a file", allowed="a folder that may be (re)placed")
    names = sorted(entry.name for entry in target.iterdir())
    if not names:
        return
    strange = [name for name in names if not OWN.fullmatch(name)]
    if strange:
        reason = f"holds {strange[0]}, which no run wrote"
    elif not any(_is_ours(target / mark) for mark in MARKS):
        reason = f"holds no {MARKS[0]} of this program"
    else:
        return
    raise InputError(
        f"--out {target}: exists and {reason}, so it is not replaced",
        allowed="a new name, an empty folder or an earlier result",
    )


def _is_ours(mark: Path) -> bool:
    try:
        document = json.loads(mark.read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return False
    return isinstance(document, dict) and PROGRAM in document


def _unwritable(target: Path, error: OSError) -> InputError:
    reason = os.strerror(error.errno) if error.errno else str(error)
    return InputError(f"--out {target}: cannot be written ({reason})", allowed="a writable place")
