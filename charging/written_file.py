"""A result file that appears as a whole or not at all."""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from charging.errors import InputError, printable


@contextmanager
def written_file(target: Path, *, option: str, force: bool = True) -> Iterator[Path]:
    """Give a scratch name beside `target`; the file moves there when the block ends well.

    Parameters
    ----------
    target : Path
        Where the file is to be.
    option : str
        What the person called it, for messages (``--plot``).
    force : bool, optional
        Whether a file that exists may be replaced.

    Yields
    ------
    Path
        Name to write to, same folder and same ending.

    Raises
    ------
    InputError
        The place cannot be written, or the target exists and may not be replaced.
    """
    shown = f"{option} {printable(str(target))}"
    try:
        if target.is_dir():
            raise InputError(f"{shown}: is a folder", value=target, allowed="the name of a file")
        if not force and os.path.lexists(target):
            raise InputError(f"{shown}: exists", value=target, next_step="Replace it with --force.")
        scratch = target.with_name(f".{target.stem}.{os.getpid()}.partial{target.suffix}")
        scratch.touch()
    except (OSError, ValueError) as error:
        raise _unwritable(shown, target, error) from None
    try:
        yield scratch
        with scratch.open("rb") as stream:
            os.fsync(stream.fileno())
        scratch.replace(target)
    except OSError as error:
        raise _unwritable(shown, target, error) from None
    finally:
        scratch.unlink(missing_ok=True)


def _unwritable(shown: str, target: Path, error: Exception) -> InputError:
    reason = getattr(error, "strerror", None) or "not a usable path"
    return InputError(
        f"{shown}: cannot be written ({reason.lower()})", value=target, allowed="a writable place"
    )
