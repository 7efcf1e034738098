"""Finished blocks of a study on disk: whole or not there, and never silently changed.

A block is written under a temporary name, flushed to the disk, and renamed to a name that
holds its SHA-256; the folder is flushed after it. Renaming is the moment at which a block is
finished: whatever kills a run before it leaves a temporary file that the next run removes. The
manifest says what the study is; a run that is resumed must say the same.
"""

from __future__ import annotations

import hashlib
import json
import os
import platform
import re
import zipfile
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager, suppress
from importlib.metadata import version
from io import BytesIO
from pathlib import Path
from typing import Any

import numpy as np

from charging import __version__
from charging.errors import InputError
from charging.study.plan import Plan
from charging.study.solve import Block, Results

CODE = (".py", ".toml")
LIBRARIES = ("numpy", "scipy", "xarray", "netCDF4")
MANIFEST, BLOCKS, LOCK = "manifest.json", "blocks", "lock"
_NAME = re.compile(r"(\d{6})-([0-9a-f]{64})\.npz")


def manifest_of(plan: Plan, blocks: Sequence[Block]) -> dict[str, Any]:
    """What a study is: its files, draws, blocks, and what computes it."""
    loaded = plan.loaded
    return {
        "study_sha256": plan.sha256,
        "case_sha256": loaded.sha256,
        "materials_sha256": _hashes(
            {n: t for c in plan.choices for n, t in c.loaded.material_texts.items()}
        ),
        "plasmas_sha256": _hashes(
            {n: t for c in plan.choices for n, t in c.loaded.plasma_texts.items()}
        ),
        "files_sha256": dict(sorted(loaded.files.sha256.items())),
        "seed": plan.file.seed,
        "choices": len(plan.choices),
        "draws": plan.draws,
        "blocks": [[b.choice, b.first, b.last] for b in blocks],
        "halflit": __version__,
        "code_sha256": code_sha256(),
        "python": platform.python_version(),
        "machine": platform.machine(),
        "libraries": {name: version(name) for name in LIBRARIES},
    }


def code_sha256() -> str:
    """Hash of every source and data file of the three packages."""
    root = Path(__file__).parents[2]
    found = hashlib.sha256()
    for package in ("materials", "environments", "charging"):
        for path in sorted(p for p in (root / package).rglob("*") if p.suffix in CODE):
            found.update(path.relative_to(root).as_posix().encode())
            found.update(path.read_bytes())
    return found.hexdigest()


def _hashes(texts: Mapping[str, str]) -> dict[str, str]:
    return {n: hashlib.sha256(t.encode()).hexdigest() for n, t in sorted(texts.items())}


class Store:
    """Blocks of one study in a folder."""

    def __init__(self, folder: Path, manifest: Mapping[str, Any]) -> None:
        self.folder = folder
        self.manifest = dict(manifest)

    @contextmanager
    def opened(self, *, resume: bool) -> Iterator[None]:
        """Hold the folder for one run.

        Raises
        ------
        InputError
            Another run holds it; it holds something else; it holds this study and `resume` is
            not set; with `resume`, the study differs from the one begun.
        """
        try:
            self.folder.mkdir(parents=True, exist_ok=True)
            lock = os.open(self.folder / LOCK, os.O_RDWR | os.O_CREAT, 0o644)
        except OSError as error:
            raise InputError(
                f"folder {self.folder} cannot be written: {(error.strerror or '').lower()}"
            ) from None
        try:
            if not _locked(lock):
                raise InputError(
                    f"folder {self.folder} is in use by another run",
                    next_step="Wait for it, or choose another folder with --out.",
                )
            self._prepared(resume=resume)
            yield
        finally:
            os.close(lock)  # releases it, as the end of the process would

    def _prepared(self, *, resume: bool) -> None:
        path = self.folder / MANIFEST
        if path.exists():
            self._compared(path, resume=resume)
        else:
            foreign = sorted(
                p.name for p in self.folder.iterdir() if p.name != LOCK and ".part" not in p.name
            )
            if foreign:
                raise InputError(
                    f"folder {self.folder} holds {foreign[0]} and no study",
                    next_step="Choose another folder with --out.",
                )
            (self.folder / BLOCKS).mkdir(exist_ok=True)
            write_whole(path, json.dumps(self.manifest, indent=2, ensure_ascii=False).encode())
        for left in (self.folder / BLOCKS).glob("*.part"):
            left.unlink()

    def _compared(self, path: Path, *, resume: bool) -> None:
        try:
            begun = json.loads(path.read_text(encoding="utf-8"))
        except ValueError:
            raise InputError(f"{path} is no manifest of a study") from None
        if not resume:
            raise InputError(
                f"folder {self.folder} holds a study already",
                next_step="Go on with --resume, or choose another folder with --out.",
            )
        now = json.loads(json.dumps(self.manifest))
        differ = [
            f"{key}: {_short(begun.get(key))} then, {_short(now.get(key))} now"
            for key in sorted({*begun, *now})
            if begun.get(key) != now.get(key)
        ]
        if differ:
            raise InputError(
                f"the study in {self.folder} cannot be resumed, it differs: " + "; ".join(differ),
                next_step="Start anew in another folder with --out.",
            )

    def finished(self) -> dict[int, Path]:
        """Blocks on disk by number, each checked against its hash.

        Raises
        ------
        InputError
            A block is not what was written.
        """
        found: dict[int, Path] = {}
        for path in sorted((self.folder / BLOCKS).iterdir()):
            match = _NAME.fullmatch(path.name)
            if match is None:
                continue
            if hashlib.sha256(path.read_bytes()).hexdigest() != match.group(2):
                raise InputError(
                    f"{path} is damaged: its content does not have the hash in its name",
                    next_step="Delete it and go on with --resume: it will be computed again.",
                )
            found[int(match.group(1))] = path
        return found

    def write(self, block: Block, results: Results) -> None:
        """Keep a finished block."""
        content = _packed(results)
        digest = hashlib.sha256(content).hexdigest()
        write_whole(self.folder / BLOCKS / f"{block.number:06d}-{digest}.npz", content)

    def read(self, path: Path) -> Results:
        """Results of a block."""
        with np.load(path, allow_pickle=False) as kept:
            return {name: kept[name] for name in kept.files}


def _packed(results: Results) -> bytes:
    """Archive of arrays that `numpy.load` reads; equal results give equal bytes."""
    stream = BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_STORED) as archive:
        for name, value in sorted(results.items()):
            array = BytesIO()
            np.save(array, value, allow_pickle=False)
            archive.writestr(zipfile.ZipInfo(f"{name}.npy"), array.getvalue())
    return stream.getvalue()


def write_whole(path: Path, content: bytes) -> None:
    """Write a file so that it is there whole or not at all, also after a power cut.

    Raises
    ------
    InputError
        The disk is full, or the folder cannot be written.
    """
    part = path.with_name(path.name[:40] + ".part")
    try:
        with part.open("wb") as stream:
            stream.write(content)
            stream.flush()
            os.fsync(stream.fileno())
        part.replace(path)
        sync_folder(path.parent)
    except OSError as error:
        with suppress(OSError):
            part.unlink(missing_ok=True)
        raise unwritable(path, error) from None


def sync_folder(folder: Path) -> None:
    """Make sure that names in a folder are on the disk, where the system can do that."""
    if os.name == "nt":  # no folder can be opened there
        return
    descriptor = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(descriptor)
    finally:
        os.close(descriptor)


def unwritable(path: Path, error: OSError) -> InputError:
    """A file could not be written."""
    return InputError(
        f"{path} cannot be written: {(error.strerror or str(error)).lower()}",
        next_step="What was finished before stays; go on with --resume.",
    )


def _short(value: object) -> str:
    text = json.dumps(value, ensure_ascii=False)
    return text if len(text) <= 60 else f"{text[:57]}…"


def _locked(descriptor: int) -> bool:
    """Take the lock; the operating system gives it back when the process ends, however."""
    try:
        import fcntl
    except ImportError:  # no such locks on this system: a second run is not noticed
        return True
    try:
        fcntl.flock(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError:
        return False
    return True
