"""Tables in text files: comma-separated columns under comments that say what they are.

::

    # frame = GCRF
    # center = earth
    time,x_km,y_km,z_km
    2031-03-20T00:00:00Z,42164.17,0.0,0.0
"""

import re
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path
from stat import S_ISREG
from typing import Final

import numpy as np

from environments.errors import EnvironmentDataError, nearest_name
from environments.timescales import read_tai

LARGEST_FILE_BYTES: Final = 10_000_000
_NUMBER: Final = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eEdD][+-]?\d+)?")


@dataclass(frozen=True, slots=True)
class TextTable:
    """Content of a file.

    Attributes
    ----------
    file : str
        For errors.
    notes : dict of str to (str, int)
        ``# key = value`` lines above the columns, and their line.
    columns : tuple of str
        Names.
    columns_line : int
        Their line.
    rows : list of tuple
        Line and cells, as many as columns.
    """

    file: str
    notes: dict[str, tuple[str, int]]
    columns: tuple[str, ...]
    columns_line: int
    rows: list[tuple[int, list[str]]]

    def error(self, problem: str, line: int | None = None, **more: str) -> EnvironmentDataError:
        """Return an error that names the file."""
        return EnvironmentDataError(
            problem, file=self.file, line=line, allowed=more.get("allowed"),
            nearest=more.get("nearest"),
        )  # fmt: skip


def increasing_times(table: TextTable) -> Iterator[tuple[np.datetime64, int, list[str]]]:
    """Read the first cell of row after row as a time in UTC with Z.

    Yields
    ------
    datetime64, int, list of str
        TAI; the line of the row and its cells.

    Raises
    ------
    EnvironmentDataError
        With file and line: no such time, or not after the one before.
    """
    last: np.datetime64 | None = None
    for line, cells in table.rows:
        try:
            stamp = read_tai(cells[0], "UTC", zone="required")
        except EnvironmentDataError as error:
            raise table.error(str(error), line) from error
        if last is not None and stamp <= last:
            raise table.error(f"time {cells[0]} is not after the one before", line)
        last = stamp
        yield stamp, line, cells


def read_lines(path: str | Path) -> list[str]:
    """Lines of a text file.

    Raises
    ------
    EnvironmentDataError
        Cannot be read, too large, or not UTF-8.
    """
    file = Path(path)
    try:
        status = file.stat()
        if not S_ISREG(status.st_mode):  # a pipe or device might never end
            raise EnvironmentDataError("is no ordinary file", file=str(path))
        with file.open("rb") as stream:
            data = stream.read(LARGEST_FILE_BYTES + 1)
    except OSError as error:
        raise EnvironmentDataError(f"cannot be read: {error.strerror}", file=str(path)) from error
    if len(data) > LARGEST_FILE_BYTES:
        raise EnvironmentDataError(
            f"is too large, {status.st_size} bytes", file=str(path),
            allowed=f"up to {LARGEST_FILE_BYTES // 1_000_000} MB",
        )  # fmt: skip
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        raise EnvironmentDataError("is not UTF-8 text", file=str(path), line=line) from error
    return text.replace("\r\n", "\n").replace("\r", "\n").split("\n")


def read_table(path: str | Path, note_keys: Iterable[str]) -> TextTable:
    """Read a table with notes.

    Parameters
    ----------
    path : str or Path
        UTF-8.
    note_keys : iterable of str
        Notes that may be given; other comments must not look like one.

    Returns
    -------
    TextTable

    Raises
    ------
    EnvironmentDataError
        With file and line: unknown or repeated note, repeated column, a row with another
        number of cells, no rows.
    """
    known = tuple(note_keys)
    notes: dict[str, tuple[str, int]] = {}
    columns: tuple[str, ...] | None = None
    columns_line = 0
    rows: list[tuple[int, list[str]]] = []
    file = str(path)
    line = 0
    for line, text in enumerate(read_lines(path), start=1):
        content = text.strip()
        if not content:
            continue
        if content.startswith("#"):
            key, equals, value = (part.strip() for part in content[1:].partition("="))
            if not equals or not key.replace("_", "").isalnum():
                continue
            if key not in known:
                raise EnvironmentDataError(
                    "is no note of this table", value=key, file=file, line=line,
                    allowed=", ".join(known), nearest=nearest_name(key, known),
                )  # fmt: skip
            if key in notes:
                raise EnvironmentDataError(f"gives {key} a second time", file=file, line=line)
            notes[key] = (value, line)
            continue
        cells = [cell.strip() for cell in content.split(",")]
        if columns is None:
            columns, columns_line = tuple(cells), line
            if len(set(cells)) != len(cells):
                raise EnvironmentDataError("names a column twice", file=file, line=line)
            continue
        if len(cells) != len(columns):
            raise EnvironmentDataError(
                f"has {len(cells)} cells under {len(columns)} columns: truncated?",
                file=file, line=line,
            )  # fmt: skip
        rows.append((line, cells))
    if columns is None or not rows:
        raise EnvironmentDataError("ends before any rows: truncated", file=file, line=line)
    return TextTable(file, notes, columns, columns_line, rows)


def number(text: str, line: int, file: str | None = None) -> float:
    """Read a finite number of a file.

    Raises
    ------
    EnvironmentDataError
        Anything else, nan and inf included.

    Examples
    --------
    >>> number("1.5E3", 7), number("4.2D+01", 7)
    (1500.0, 42.0)
    """
    if _NUMBER.fullmatch(text):
        value = float(text.replace("D", "E").replace("d", "e"))
        if abs(value) < float("inf"):
            return value
    raise EnvironmentDataError("is not a finite number", value=text, file=file, line=line)


FARTHEST: Final = 1e15
"""Kilometres or metres of a coordinate, km/s or m/s of its motion: far outside any orbit."""


def coordinate(text: str, line: int, file: str | None = None) -> float:
    """Read a component of a position or velocity; beyond 1e15 is no place.

    Raises
    ------
    EnvironmentDataError
        As `number`; too large.
    """
    value = number(text, line, file)
    if abs(value) > FARTHEST:
        raise EnvironmentDataError(
            "is no place of a spacecraft", value=text, file=file, line=line,
            allowed=f"up to {FARTHEST:g}",
        )  # fmt: skip
    return value
