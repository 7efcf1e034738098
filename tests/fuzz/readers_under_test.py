"""Every reader of files that people give, as one call, and whether a file got past its grammar."""

from __future__ import annotations

import importlib
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import numpy as np

import charging.case
import charging.study.plan
from charging.case_library import Sources, find_material, find_plasma
from charging.errors import InputError
from environments.errors import EnvironmentDataError

EPOCH = np.datetime64("2031-03-20T00:00:00", "ns")

GATES = {
    "case": ("charging.case", "read_files"),
    "study": ("charging.study.plan", "load_case"),
    "material": ("materials.reader", "Material"),
    "plasma": ("environments.catalogue", "population_of"),
    "oem": ("environments.oem", "_segment"),
    "ephemeris table": ("environments.ephemeris_table", "read_tai"),
    "tle": ("environments.tle", "_epoch"),
    "plasma timeline": ("environments.plasma_timeline", "_times"),
    "activity": ("environments.activity", "number"),
    "spectrum": ("environments.spectrum_file", "Tabulated"),
    "attitude": ("environments.attitude_file", "number"),
    "temperature": ("charging.temperatures", "number"),
    "shadow": ("environments.shadow_table", "number"),
}
"""Function of each kind that is called only for files whose form was understood."""


class Gate:
    """Notes whether the function behind it was called."""

    def __init__(self, kind: str) -> None:
        self.module = importlib.import_module(GATES[kind][0])
        self.name = GATES[kind][1]
        self.inner: Callable[..., Any] = getattr(self.module, self.name)
        self.passed = False

    def __call__(self, *args: Any, **kwargs: Any) -> Any:
        self.passed = True
        return self.inner(*args, **kwargs)


@contextmanager
def watched(kind: str) -> Iterator[Gate]:
    """Put a gate in place."""
    gate = Gate(kind)
    setattr(gate.module, gate.name, gate)
    try:
        yield gate
    finally:
        setattr(gate.module, gate.name, gate.inner)


def readers(folder: Path, case_text: str) -> dict[str, Callable[[bytes], object]]:
    """Readers by kind; each takes the bytes of a file. Files are written into `folder`."""
    from charging.temperatures import read_temperature_csv
    from environments.activity import read_activity
    from environments.attitude_file import read_attitude_csv
    from environments.catalogue import read_plasma
    from environments.ephemeris_table import read_ephemeris_csv
    from environments.oem import read_oem
    from environments.plasma_timeline import read_plasma_timeline
    from environments.shadow_table import read_shadow_csv
    from environments.tle import read_tle

    case = folder / "case.toml"
    case.write_text(case_text, encoding="utf-8")

    def of(name: str, read: Callable[[Path], object]) -> Callable[[bytes], object]:
        path = folder / name

        def reader(content: bytes) -> object:
            path.write_bytes(content)
            return read(path)

        return reader

    def spectrum(path: Path) -> object:
        row = {"species": "electron", "law": "tabulated", "spectrum_file": path.name}
        return read_plasma({"title": "x", "source": "x", "population": [row]}, folder)

    sources = Sources(case)
    return {
        "case": of("bent.toml", charging.case.load_case),
        "study": of("study.toml", charging.study.plan.load_study),
        "material": of("m.toml", lambda path: find_material(path.name, sources)),
        "plasma": of("p.toml", lambda path: find_plasma(path.name, sources, to_charge=True)),
        "oem": of("o.oem", read_oem),
        "ephemeris table": of("e.csv", read_ephemeris_csv),
        "tle": of("t.tle", read_tle),
        "plasma timeline": of("l.csv", read_plasma_timeline),
        "activity": of("a.csv", read_activity),
        "spectrum": of("s.csv", spectrum),
        "attitude": of("q.csv", lambda path: read_attitude_csv(path, EPOCH)),
        "temperature": of("k.csv", lambda path: read_temperature_csv(path, EPOCH)),
        "shadow": of("h.csv", read_shadow_csv),
    }


def refused(read: Callable[[bytes], object], content: bytes) -> bool:
    """Whether a file is refused; anything but a proper refusal escapes.

    A refusal is one line or two, readable, without what a terminal would obey.
    """
    error = refusal(read, content)
    if error is None:
        return False
    shown = str(error)
    named = error.file is not None or (isinstance(error, EnvironmentDataError) and error.key)
    assert named, shown
    assert all(part.isprintable() for part in shown.split("\n")), repr(shown)
    assert len(shown) < 5000, len(shown)
    return True


def refusal(
    read: Callable[[bytes], object], content: bytes
) -> InputError | EnvironmentDataError | None:
    """Error with which a file is refused, None where it is read."""
    try:
        read(content)
    except (InputError, EnvironmentDataError) as error:
        return error
    return None
