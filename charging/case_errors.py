"""Faults of a case in the words of the file: which table, which key, what is allowed.

The validation of :mod:`charging.case_tables` speaks of types; a person who writes a case wants to
know which line to change. Every fault becomes a :class:`charging.errors.Problem`, then an
:class:`charging.errors.InputError` with file and line.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace
from datetime import date, datetime, time
from typing import Any

from pydantic import BaseModel, ValidationError
from pydantic_core import ErrorDetails

from charging import case_modes as modes
from charging import case_orbit as orbits
from charging import case_plasma
from charging import case_shape as shapes
from charging import case_strings as strings
from charging import case_tables as tables
from charging.case_values import nearest_name, quoted
from charging.errors import InputError, KeyPath, Problem, ProblemsFound, printable
from charging.toml_lines import line_of
from charging.units import TableName, case_bare_keys

ORBIT_KINDS: Mapping[str, type[BaseModel]] = {
    "kepler": orbits.OrbitKepler,
    "oem": orbits.OrbitFile,
    "tle": orbits.OrbitFile,
    "table": orbits.OrbitFile,
    "fixed": orbits.OrbitFixed,
}
_MODELS: Mapping[TableName, type[BaseModel]] = {
    (): tables.Case,
    ("time",): tables.Time,
    ("sun",): tables.Sun,
    ("attitude",): orbits.Attitude,
    ("plasma",): case_plasma.PlasmaTable,
    ("plasma", "event"): case_plasma.PlasmaEvent,
    ("plasma", "substorm"): case_plasma.PlasmaSubstorm,
    ("body",): tables.Body,
    ("emission",): tables.Emission,
    ("shape",): shapes.Shape,
    ("surface",): tables.Surface,
    ("surface", "temperature_K"): tables.SunlitEclipse,
    ("link",): tables.Link,
    ("mode",): modes.Mode,
    ("mode", "attitude"): orbits.Attitude,
    ("emitter",): modes.Emitter,
    ("string",): strings.ArrayString,
    ("radiation",): strings.Radiation,
    ("limit",): tables.Limit,
    ("limit", "margin_policy"): tables.MarginPolicy,
    ("review",): tables.Review,
}
_ARRAYS: Sequence[TableName] = (
    ("plasma", "event"), ("plasma", "substorm"), ("shape",), ("surface",), ("link",), ("mode",),
    ("emitter",), ("string",), ("limit",),
    ("population",),  # of a plasma file
)  # fmt: skip
_MOST_GUESSES = 200


def problems_of(error: ValidationError, document: Mapping[str, Any]) -> list[Problem]:
    """Return the faults that a validation found, with their ways from the top of the document."""
    found: list[Problem] = []
    for detail in error.errors(include_url=False):
        if len(found) < _MOST_GUESSES:
            found += _translated(detail, document)
        else:  # counted only: a search for the nearest name each would take minutes
            found.append(Problem(_place(detail["loc"], document), "cannot stand here"))
    guessed = {(*fault.key[:-1], fault.nearest) for fault in found if fault.nearest is not None}
    # a key misspelt is not missing too
    return [fault for fault in found if not fault.missing or fault.key not in guessed]


def input_error(
    problems: Iterable[Problem],
    document: Mapping[str, Any],
    *,
    file: str,
    lines: dict[KeyPath, int],
    origin: Mapping[KeyPath, KeyPath] | None = None,
) -> InputError:
    """Return the error for the first of `problems` by line; the others are counted.

    Parameters
    ----------
    problems : iterable of Problem
        At least one.
    document : mapping
        The document they were found in.
    file : str
        As the person named it.
    lines : dict
        From :func:`charging.toml_lines.index`.
    origin : mapping, optional
        Keys of the document that stand in the file under another name.
    """
    origin = origin or {}
    placed = [
        (line_of(lines, origin.get(problem.key, problem.key)), problem) for problem in problems
    ]
    placed.sort(key=lambda pair: math.inf if pair[0] is None else pair[0])
    line, problem = placed[0]
    key = origin.get(problem.key, problem.key)
    return InputError(
        _sentence(problem, key, document),
        file=file,
        line=line,
        key=key,
        value=problem.value,
        allowed=problem.allowed,
        nearest=problem.nearest,
        next_step=problem.next_step,
        more=len(placed) - 1,
    )


# the sentence ------------------------------------------------------------------------------------


def _sentence(problem: Problem, key: KeyPath, document: Mapping[str, Any]) -> str:
    table, rest = _table_label(key, document)
    before = f"{table}: " if table else ""
    if problem.sentence:
        return f"{before}{problem.message}"
    name = ".".join(part for part in rest if isinstance(part, str))
    if rest and isinstance(rest[-1], int) and not isinstance(problem.value, str):
        name = f"entry {rest[-1] + 1} of {name}"
    if problem.missing:
        return f"{before}{name} {problem.message}" if name else f"{before}{problem.message}"
    return f"{before}{name} = {shown(problem.value)} {problem.message}"


def _table_label(key: KeyPath, document: Mapping[str, Any]) -> tuple[str, KeyPath]:
    """Return how to call the table that holds `key`, and what is left of the way."""
    for names in _ARRAYS:
        size = len(names)
        if key[:size] == names and len(key) > size and isinstance(key[size], int):
            own_name = _value_at(document, (*key[: size + 1], "name"))
            if isinstance(own_name, str) and own_name:
                return f'{" ".join(names)} "{printable(own_name, 70)}"', key[size + 1 :]
            return f"{' '.join(names)} {int(key[size]) + 1}", key[size + 1 :]
    if len(key) > 1 and (key[:1] in _MODELS or key[0] == "orbit"):
        return f"[{key[0]}]", key[1:]
    return "", key


def shown(value: object) -> str:
    """Return a value of a TOML file as the file may have it, on one line.

    Examples
    --------
    >>> shown(True), shown("two words"), shown([1.0, 2])
    ('true', '"two words"', '[1.0, 2]')
    """
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, int) and abs(value) >= 10**20:
        return f"(a number near {'-' if value < 0 else ''}1e{math.log10(abs(value)):.0f})"
    if isinstance(value, str):
        return f'"{printable(value, 70)}"'
    if isinstance(value, datetime):
        return value.isoformat().replace("+00:00", "Z")
    if isinstance(value, date | time):
        return value.isoformat()
    if isinstance(value, Mapping):
        return "{…}"
    if isinstance(value, list | tuple):
        ends = ", …]" if len(value) > 6 else "]"
        return f"[{', '.join(shown(element) for element in value[:6])}{ends}"
    return printable(repr(value), 40)


def _value_at(document: object, key: KeyPath) -> object:
    for part in key:
        try:
            document = document[part]  # type: ignore[index]
        except (KeyError, IndexError, TypeError):
            return None
    return document


def _names(key: KeyPath) -> TableName:
    return tuple(part for part in key if isinstance(part, str))


# one fault ---------------------------------------------------------------------------------------


def _translated(detail: ErrorDetails, document: Mapping[str, Any]) -> list[Problem]:
    key = _place(detail["loc"], document)
    value = detail["input"]
    context = detail.get("ctx", {})
    match detail["type"]:
        case "default_factory_not_called":  # follows from the fault of another key
            return []
        case "value_error" if isinstance(context.get("error"), ProblemsFound):
            return [
                replace(
                    problem,
                    key=(*key, *problem.key),
                    value=problem.value if problem.key else value,
                )
                for problem in context["error"].problems
            ]
        case "missing" if key and isinstance(key[-1], int):
            return [_wrong_length(key[:-1], document)]
        case "too_long":
            return [_wrong_length(key, document, context.get("max_length"))]
        case "missing":
            return [_missing(key)]
        case "union_tag_not_found":
            allowed = quoted(ORBIT_KINDS)
            return [Problem((*key, "kind"), "is missing", missing=True, allowed=allowed)]
        case "union_tag_invalid":
            return [_choice((*key, "kind"), _value_at(document, (*key, "kind")), ORBIT_KINDS)]
        case "literal_error":
            choices = re.findall(r"'([^']*)'", str(context.get("expected", "")))
            return [_choice(key, value, choices)]
        case "extra_forbidden":
            return [_unknown_key(key, document)]
        case kind:
            message, allowed_text = _plain(kind, value, context, key)
            return [Problem(key, message, value=value, allowed=allowed_text)]


def _place(location: tuple[int | str, ...], document: Mapping[str, Any]) -> KeyPath:
    """Drop from a validation's way what names an alternative rather than a key."""
    key = list(location)
    if len(key) > 1 and key[0] == "orbit" and key[1] in ORBIT_KINDS:
        del key[1]
    if len(key) > 3 and key[2] == "temperature_K" and key[3] in ("number", "table", "file"):
        del key[3]
    return tuple(key)


def _missing(key: KeyPath) -> Problem:
    allowed = None
    if len(key) == 1:
        allowed = f"[[{key[0]}]]" if key in _ARRAYS else f"[{key[0]}]"
        allowed = None if key == ("title",) else f"a table {allowed}"
    return Problem(key, "is missing", missing=True, allowed=allowed)


def _wrong_length(key: KeyPath, document: Mapping[str, Any], most: object = None) -> Problem:
    value = _value_at(document, key)
    count = len(value) if isinstance(value, list | tuple) else 0
    due = {
        "between": "two names",
        "normal": "three numbers",
        "sun_direction": "three numbers",
        "center_m": "three numbers",
        "axis": "three numbers",
        "along": "three numbers",
    }.get(_names(key)[-1], f"up to {most} entries")
    entries = f"{count} entr{'y' if count == 1 else 'ies'}"
    return Problem(key, f"has {entries}", value=value, allowed=due)


def _choice(key: KeyPath, value: object, choices: Iterable[str]) -> Problem:
    names = list(choices)
    near = nearest_name(value, names) if isinstance(value, str) else None
    return Problem(key, "is unknown", value=value, allowed=quoted(names), nearest=near)


def _unknown_key(key: KeyPath, document: Mapping[str, Any]) -> Problem:
    names = _names(key)
    name = printable(str(key[-1]), 70)
    model = _MODELS.get(names[:-1])
    if names[:-1] == ("orbit",):
        model = ORBIT_KINDS[str(_value_at(document, ("orbit", "kind")))]
    fields = model.model_fields if model is not None else {}
    known = [field.alias or name for name, field in fields.items()]
    near = nearest_name(str(key[-1]), [*known, *case_bare_keys().get(names[:-1], ())])
    return Problem(
        key, f'key "{name}" is unknown', sentence=True, allowed=", ".join(known), nearest=near
    )


_BOUNDS = {
    "greater_than": ("gt", "above"),
    "greater_than_equal": ("ge", "at least"),
    "less_than": ("lt", "below"),
    "less_than_equal": ("le", "at most"),
}


def _plain(
    kind: str, value: object, context: Mapping[str, Any], key: KeyPath
) -> tuple[str, str | None]:
    """Return message and allowed values of a fault of type or range."""
    if kind in _BOUNDS:
        bound, words = _BOUNDS[kind]
        return "is out of range", f"{words} {context[bound]:.10g}"
    match kind:
        case "float_type" if isinstance(value, str):
            return "is a text", "a number without quotes"
        case "float_type" if isinstance(value, int) and not isinstance(value, bool):
            return "is too large", "a finite number"
        case "float_type":
            return "is no number", "a number"
        case "finite_number":
            return "is not finite", "a finite number"
        case "bool_type":
            return "is neither true nor false", "true, false"
        case "string_type":
            return "is no text", "a text in quotes"
        case "string_pattern_mismatch":
            return (
                "cannot be a name",
                "1 to 64 letters, digits, spaces and ,()._+- that begin with a letter or digit",
            )
        case "datetime_type":
            return "is no moment", "date, time and zone without quotes: 2031-03-20T00:00:00Z"
        case "tuple_type" if _names(key) in _ARRAYS:
            return "is no array of tables", f"[[{'.'.join(_names(key))}]]"
        case "tuple_type":
            return "is no list", "a list in brackets"
        case "model_type" | "dict_type" | "model_attributes_type":
            double = key and isinstance(key[-1], int)
            header = f"[[{'.'.join(_names(key))}]]" if double else f"[{'.'.join(_names(key))}]"
            return "is no table", f"a table {header}"
    return "cannot stand here", None
