"""Single entries of a material record: there, of the right kind, finite."""

from __future__ import annotations

import difflib
import math
import unicodedata
from collections.abc import Mapping, Sequence

from materials.errors import MaterialError

Path = tuple[str | int, ...]
Table = Mapping[str, object]


def refuse_unknown(table: Table, known: Sequence[str], path: Path) -> None:
    """Refuse keys that are not among `known`."""
    for key in table:
        if key not in known:
            close = difflib.get_close_matches(str(key), known, n=1)
            raise MaterialError(
                (*path, key),
                None,
                "is an unknown key",
                allowed=", ".join(known),
                nearest=close[0] if close else None,
            )


def table_at(entry: object, path: Path) -> Table:
    """Return the entry as a table."""
    if not isinstance(entry, Mapping):
        raise MaterialError(path, entry, "is no table", allowed="a table with value and source")
    return entry


def entry_at(table: Table, path: Path) -> object:
    """Return an entry that must be there."""
    key = str(path[-1])
    if key not in table:
        raise MaterialError(path, None, "is missing")
    return table[key]


def text_at(table: Table, path: Path) -> str:
    """Return a text that is not empty."""
    entry = entry_at(table, path)
    if not isinstance(entry, str) or not entry.strip():
        raise MaterialError(path, entry, "is no text", allowed="a text that is not empty")
    if any(unicodedata.category(c) == "Cc" and c not in "\n\t" for c in entry):
        raise MaterialError(path, entry, "holds a control character", allowed="text")
    return entry


def source_at(table: Table, path: Path) -> str:
    """Return the source of a value; "" where a file gives none.

    A value without source can be run with, but no limit that it drives can be assessed.
    """
    return text_at(table, path) if str(path[-1]) in table else ""


def choice_at(table: Table, path: Path, choices: Sequence[str]) -> str:
    """Return one of some words."""
    entry = entry_at(table, path)
    if not isinstance(entry, str) or entry not in choices:
        close = difflib.get_close_matches(entry, choices, n=1) if isinstance(entry, str) else []
        raise MaterialError(
            path,
            entry,
            "is not allowed",
            allowed=", ".join(choices),
            nearest=close[0] if close else None,
        )
    return entry


def number_at(table: Table, path: Path) -> float:
    """Return a finite number."""
    return as_number(entry_at(table, path), path)


def numbers_at(table: Table, path: Path) -> list[float]:
    """Return a list of finite numbers."""
    entry = entry_at(table, path)
    if isinstance(entry, str) or not isinstance(entry, Sequence):
        raise MaterialError(path, entry, "is no list", allowed="a list of numbers")
    return [as_number(item, (*path, index)) for index, item in enumerate(entry)]


def as_number(entry: object, path: Path) -> float:
    """Return one entry of a list or table as a finite number."""
    if isinstance(entry, bool) or not isinstance(entry, int | float):
        raise MaterialError(path, entry, "is no number", allowed="a number without quotes")
    # an int too large for a float counts as not finite
    number = float(entry) if abs(entry) < 1e300 else math.inf
    if not math.isfinite(number):
        raise MaterialError(path, entry, "is not finite", allowed="a finite number")
    return number
