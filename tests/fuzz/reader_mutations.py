"""Bend valid files so that most still parse: by value, cell, line and table, seldom by byte."""

from __future__ import annotations

import copy
import math
import random
import re
import tomllib
from datetime import datetime
from typing import Any

NUMBERS = (
    0, 1, -1, 2, 3, 90, 360, 0.0, -0.0, 0.5, 1.0, -1.0, 1e-12, 1e-300, 5e-324, 1e300, 1e12, 1e30,
    2**31, 2**63, -(2**63), 10**25, 1e-3, 1e3, math.pi, 299.0, 6378.137, 42164.0,
)  # fmt: skip
TEXTS = (
    "", " ", "x", "structure", "gold", "PTFE", "lunar regolith", "both", "../x.toml", "/dev/zero",
    "a/b", "x.toml", "x.csv", "1 km", "5 mil", "-3 V", "nan", "2 cm-3", "27.5 keV", "\u202e", "é",
    "a\nb", "=1+1", "\u0007", "\u009b2J", "🛰", "A" * 300, "%s{0}", "electron", "H+", "kappa",
    "sphere", "clean", "aged", "end", "uncharged", "tracking", "front", "earth", "moon", "sun",
)  # fmt: skip
CELLS = (
    "", " ", "0", "-0", "1", "-1", "1e308", "1e-308", "1e400", "nan", "inf", "0x1", "1_0", "1.5D+2",
    "2031-03-20T00:00:00Z", "2031-03-20T00:00:60Z", "2016-12-31T23:59:60Z", "2031-02-30T00:00:00Z",
    "9999-12-31T23:59:59Z", "0001-01-01T00:00:00Z", "2031-079T00:00:00", "é", "\u0000", "x", "UTC",
    "TAI", "TDB", "EME2000", "ITRF2000", "LAGRANGE", "27", "1000000", "0.0000001", "²", "١",
)  # fmt: skip


def number_near(value: float, draw: random.Random) -> float | int:
    """Number that often is still within the range of `value`."""
    pick = draw.random()
    if pick < 0.75:
        new = value * math.exp(draw.choice((1e-6, 0.05, 1.0)) * (2.0 * draw.random() - 1.0))
    elif pick < 0.9:
        new = value + draw.choice((-1.0, 1.0, 0.1))
    else:
        return draw.choice(NUMBERS)
    whole = isinstance(value, int) and abs(new) < 1e15
    return round(new) if whole else new


# --- TOML by value --------------------------------------------------------------------------------


def places(value: Any, at: tuple[Any, ...] = ()) -> list[tuple[Any, ...]]:
    """Ways to every value of a document."""
    pairs = (
        value.items()
        if isinstance(value, dict)
        else enumerate(value)
        if isinstance(value, list)
        else ()
    )
    return [way for key, child in pairs for way in ((*at, key), *places(child, (*at, key)))]


def parent_of(document: Any, way: tuple[Any, ...]) -> Any:
    """Table or array that holds the value at `way`."""
    for part in way[:-1]:
        document = document[part]
    return document


def changed(value: Any, draw: random.Random, pool: list[Any]) -> Any:
    """Another value, most often of the same kind."""
    if draw.random() < 0.03:
        return copy.deepcopy(draw.choice(pool))
    if isinstance(value, bool):
        return not value if draw.random() < 0.9 else draw.choice(NUMBERS)
    if isinstance(value, int | float):
        return number_near(value, draw)
    if isinstance(value, str):
        pick = draw.random()
        if pick < 0.5:
            return draw.choice([one for one in pool if isinstance(one, str)] or [value])
        if pick < 0.8 or not value:
            return draw.choice(TEXTS)
        k = draw.randrange(len(value))
        return value[:k] + draw.choice("aZ0 .-_/é") + value[k + draw.randrange(2) :]
    if isinstance(value, list) and value:
        pick, new = draw.random(), list(value)
        k = draw.randrange(len(new))
        if pick < 0.5:
            new[k] = changed(new[k], draw, pool)
        elif pick < 0.7:
            del new[k]
        elif pick < 0.9:
            new.insert(k, copy.deepcopy(new[k]))
        else:
            draw.shuffle(new)
        return new
    if isinstance(value, datetime):
        step = draw.choice((1, 60, 3600, 86400, -86400, 86400 * 365))
        try:
            return datetime.fromtimestamp(value.timestamp() + step, tz=value.tzinfo)
        except (OverflowError, ValueError):
            return value
    return value


def bent_document(document: dict[str, Any], draw: random.Random) -> dict[str, Any]:
    """Copy of a document with one to four changes of values, keys or rows."""
    new: dict[str, Any] = copy.deepcopy(document)
    for _ in range(draw.choice((1, 1, 1, 2, 2, 3, 4))):
        ways = places(new)
        if not ways:
            return new
        way = draw.choice(ways)
        holder, last = parent_of(new, way), way[-1]
        pool = [parent_of(new, one)[one[-1]] for one in ways]
        pick = draw.random()
        if pick < 0.82:
            holder[last] = changed(holder[last], draw, pool)
        elif pick < 0.92:
            del holder[last]
        elif isinstance(holder, list):
            holder.insert(last, copy.deepcopy(holder[last]))
        else:
            other = draw.choice(ways)
            value = parent_of(new, other)[other[-1]]
            holder[str(other[-1])] = copy.deepcopy(value)
    return new


def toml_text(document: dict[str, Any]) -> str:
    """Document as TOML, tables inline below the first level."""
    return "\n".join(f"{_key(key)} = {_value(value)}" for key, value in document.items()) + "\n"


def _key(key: object) -> str:
    return _value(str(key))


def _value(value: Any) -> str:
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, float):
        return repr(value) if math.isfinite(value) else ("nan" if value != value else "inf")
    if isinstance(value, int):
        return str(value)
    if isinstance(value, str):
        plain = value.replace("\\", "\\\\").replace('"', '\\"')
        return '"' + re.sub(r"[\x00-\x1f\x7f]", lambda m: f"\\u{ord(m[0]):04x}", plain) + '"'
    if isinstance(value, list):
        return "[" + ", ".join(map(_value, value)) + "]"
    if isinstance(value, dict):
        return "{" + ", ".join(f"{_key(k)} = {_value(v)}" for k, v in value.items()) + "}"
    return value.isoformat() if hasattr(value, "isoformat") else str(value)


def bent_toml(text: str, draw: random.Random) -> str:
    """TOML text with values changed; one in ten by line or byte instead."""
    if draw.random() < 0.1:
        return bent_lines(text, draw)
    try:
        return toml_text(bent_document(tomllib.loads(text), draw))
    except (ValueError, RecursionError):
        return bent_lines(text, draw)


# --- tables by cell -------------------------------------------------------------------------------

_CELL = re.compile(r"[^,\s=]+")


def bent_table(text: str, draw: random.Random) -> str:
    """Text of lines and cells with one to four cells or lines changed."""
    rows = text.split("\n")
    for _ in range(draw.choice((1, 1, 1, 2, 2, 3, 4))):
        if not rows:
            break
        k = draw.randrange(len(rows))
        if not rows[k][:1].isdigit() and draw.random() < 0.7:  # heads are short-lived when bent
            k = draw.randrange(len(rows))
        row, pick = rows[k], draw.random()
        cells = list(_CELL.finditer(row))
        if pick < 0.8 and cells:
            cell = draw.choice(cells)
            rows[k] = row[: cell.start()] + bent_cell(cell[0], draw) + row[cell.end() :]
        elif pick < 0.88:
            del rows[k]
        elif pick < 0.96:
            rows.insert(k, draw.choice(rows))
        else:
            rows[k] = row[: draw.randrange(len(row) + 1)]
    return "\n".join(rows)


def bent_cell(cell: str, draw: random.Random) -> str:
    """Cell that most often is of the same kind."""
    pick = draw.random()
    if pick < 0.75:
        try:
            return repr(number_near(float(cell), draw))
        except ValueError:
            pass
        digits = [m.start() for m in re.finditer(r"\d", cell)]
        if digits:
            k = draw.choice(digits[-6:])
            return cell[:k] + str(draw.randrange(10)) + cell[k + 1 :]
    if pick < 0.95:
        return draw.choice(CELLS)
    k = draw.randrange(len(cell) + 1)
    return cell[:k] + chr(draw.randrange(1, 300)) + cell[k:]


def bent_lines(text: str, draw: random.Random) -> str:
    """Text with characters exchanged and lines moved, without regard to its meaning."""
    for _ in range(draw.randrange(1, 4)):
        k = draw.randrange(len(text) + 1)
        pick = draw.random()
        if pick < 0.4:
            text = text[:k] + chr(draw.randrange(1, 300)) + text[k + draw.randrange(2) :]
        elif pick < 0.7:
            text = text[:k] + text[k + draw.randrange(20) :]
        else:
            other = draw.randrange(len(text) + 1)
            text = text[:k] + text[other : other + draw.randrange(60)] + text[k:]
    return text


def bent_elements(text: str, draw: random.Random) -> str:
    """Two-line elements with digits changed and, most often, the checksum put right."""
    rows = text.split("\n")
    for _ in range(draw.choice((1, 1, 2, 3))):
        k = draw.randrange(len(rows))
        if rows[k]:
            at = draw.randrange(len(rows[k]))
            new = draw.choice("0123456789" if rows[k][at].isdigit() else "0123456789 -.+A")
            rows[k] = rows[k][:at] + new + rows[k][at + 1 :]
    if draw.random() < 0.9:
        for k, row in enumerate(rows):
            if len(row) == 69 and row[0] in "12":
                total = sum(int(c) if c in "0123456789" else c == "-" for c in row[:68])
                rows[k] = row[:68] + str(total % 10)
    return "\n".join(rows) if draw.random() < 0.95 else bent_table("\n".join(rows), draw)


def bent(kind: str, text: str, draw: random.Random) -> str:
    """Text of a kind of file, bent."""
    if kind in {"case", "study", "material", "plasma"}:
        return bent_toml(text, draw)
    if kind == "tle":
        return bent_elements(text, draw)
    return bent_table(text, draw) if draw.random() < 0.97 else bent_lines(text, draw)
