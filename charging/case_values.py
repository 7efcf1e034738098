"""Values of single keys of a case: names, files, texts, moments, directions.

Each check returns the value to keep and raises :class:`charging.errors.ProblemsFound`.
"""

from __future__ import annotations

import difflib
import math
import re
from collections.abc import Iterable
from datetime import UTC, datetime

from charging.errors import Problem, ProblemsFound

NAME_PATTERN = r"^[A-Za-z0-9](?:[A-Za-z0-9 ,()._+-]{0,62}[A-Za-z0-9)+])?$"
FIRST_YEAR, LAST_YEAR = 1950, 2100  # range of the low-precision solar position
_LONGEST_TEXT = 4000


def nearest_name(name: str, names: Iterable[str]) -> str | None:
    """Return the nearest of `names` to `name`, or None when none is near.

    Examples
    --------
    >>> nearest_name("polyimid", ["polyimide film", "PTFE"])
    'polyimide film'
    """
    by_folded = {candidate.casefold(): candidate for candidate in names}
    found = difflib.get_close_matches(name[:200].casefold(), by_folded, n=1, cutoff=0.5)
    return by_folded[found[0]] if found else None


def quoted(names: Iterable[str]) -> str:
    """Return the names in double quotes, parted by commas."""
    return ", ".join(f'"{name}"' for name in names)


def is_file(reference_text: str) -> bool:
    """Return whether a material or plasma is given as a file rather than a library name."""
    return reference_text.endswith(".toml") or "/" in reference_text


def is_name(text: str) -> bool:
    """Return whether `text` may be the name of a surface, mode, material or plasma."""
    return re.fullmatch(NAME_PATTERN, text) is not None


# values of single keys ---------------------------------------------------------------------------


def _refuse(message: str, allowed: str | None = None) -> ProblemsFound:
    return ProblemsFound([Problem((), message, allowed=allowed)])


def direction(vector: tuple[float, float, float]) -> tuple[float, float, float]:
    """Return the unit vector along `vector`; zero is refused."""
    largest = max(abs(component) for component in vector)
    if largest == 0.0:
        raise _refuse("has no direction", "three numbers, not all zero")
    scaled = [component / largest for component in vector]  # no overflow in the squares
    length = math.hypot(*scaled)
    x, y, z = (component / length for component in scaled)
    return x, y, z


def free_text(text: str) -> str:
    """Return a free text; empty, endless and control characters are refused."""
    if not text.strip():
        raise _refuse("is empty", "a text")
    if len(text) > _LONGEST_TEXT:
        raise _refuse(f"is {len(text)} characters long", f"up to {_LONGEST_TEXT} characters")
    if any(
        (character < " " and character not in "\n\t") or character == "\x7f" for character in text
    ):
        raise _refuse("holds a control character", "text, line breaks and tabs")
    return text


def reference(text: str) -> str:
    """Return a library name or file; what can be neither is refused."""
    if is_file(text):
        if "\0" in text or len(text) > 1000:
            raise _refuse("cannot be a file name", "a path inside the folder of the case")
        if not text.endswith(".toml"):
            raise _refuse("holds a slash, so it names a file", "a file ending in .toml")
    elif not is_name(text):
        raise _refuse("cannot be a name", "a library name, or a file ending in .toml")
    return text


def data_file(text: str) -> str:
    """Return the name of a data file; what cannot be one is refused."""
    if not text.strip() or "\0" in text or len(text) > 1000:
        raise _refuse("cannot be a file name", "a path inside the folder of the case")
    return text


def csv_name(text: str) -> str:
    """Return the name of a CSV file; other endings are refused."""
    if not data_file(text).endswith(".csv"):
        raise _refuse("is no CSV file", "a file ending in .csv")
    return text


def utc_time(moment: datetime) -> datetime:
    """Return a moment in UTC; one without Z or offset, or far off, is refused."""
    if moment.tzinfo is None:
        raise _refuse("does not say its time zone", f"UTC with Z: {moment.isoformat()}Z")
    if not FIRST_YEAR <= moment.year < LAST_YEAR:
        raise _refuse("is outside the range of the Sun's position", f"{FIRST_YEAR} to {LAST_YEAR}")
    return moment.astimezone(UTC)
