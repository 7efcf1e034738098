"""Check of one material record, entry by entry."""

from __future__ import annotations

import difflib
import math
from collections.abc import Iterable, Mapping, Sequence
from itertools import pairwise

import numpy as np

from materials.errors import MaterialError
from materials.record import (
    BASES,
    EMISSION_NEEDED,
    EMISSION_OPTIONAL,
    KINDS,
    NAME_PATTERN,
    PHOTOYIELD_LEVELS,
    PROPERTIES,
    RESISTIVITY_METHODS,
    SPREAD_LAWS,
    YIELD_HOLDS,
    Material,
    PhotoYield,
    Spread,
    Value,
)

Path = tuple[str | int, ...]
Table = Mapping[str, object]

_HEAD = ("name", "kind", "description", "emits")
_VALUE_KEYS = ("value", "source", "basis", "spread", "note")
_EXTRA_KEYS = {
    "secondary_yield_peak": ("holds", YIELD_HOLDS),
    "bulk_resistivity_ohm_m": ("measurement_method", RESISTIVITY_METHODS),
}
_CURVE_KEYS = (
    "photon_energy_eV",
    "electrons_per_photon",
    "source",
    "basis",
    "level",
    "spread_factor",
    "near_threshold_factor",
    "near_threshold_to_eV",
    "high_energy_factor",
    "high_energy_from_eV",
    "note",
)


def material_from(document: Table) -> Material:
    """Return the material of a parsed record; see `materials.read_material`."""
    _refuse_unknown(document, (*_HEAD, "photoyield", *PROPERTIES), ())
    name = _text(document, ("name",))
    if NAME_PATTERN.fullmatch(name) is None:
        raise MaterialError(
            ("name",),
            name,
            "is no usable name",
            allowed="1 to 64 letters, digits, spaces and ,()._+-, no space at either end",
        )
    kind = _choice(document, ("kind",), KINDS)
    emits = document.get("emits", True)
    if not isinstance(emits, bool):
        raise MaterialError(("emits",), emits, "is no truth value", allowed="true or false")
    description = _text(document, ("description",)) if "description" in document else ""
    values = {key: _value(document[key], key) for key in PROPERTIES if key in document}
    curve = _photoyield(document["photoyield"]) if "photoyield" in document else None
    material = Material(name, kind, description, emits, values, curve)
    _check_completeness(material)
    return material


def _check_completeness(material: Material) -> None:
    needed: list[str] = []
    if material.emits:
        needed += EMISSION_NEEDED
        if material.kind == "conductor":
            needed.append("work_function_eV")
        else:
            needed += ["photoelectric_threshold_eV", "secondary_energy_eV"]
        if material.photoyield is None:
            raise MaterialError(("photoyield",), None, "is missing in a material that emits")
    else:
        for key in (*EMISSION_NEEDED, *EMISSION_OPTIONAL):
            if key in material.values:
                raise MaterialError(
                    (key,), material.value(key), "has no meaning in a material with emits = false"
                )
        if material.photoyield is not None:
            raise MaterialError(
                ("photoyield",), None, "has no meaning in a material with emits = false"
            )
    if material.kind == "conductor":
        _refuse_other_kind(material, ("photoelectric_threshold_eV", "secondary_energy_eV"))
    else:
        _refuse_other_kind(material, ("work_function_eV",))
        needed += ["relative_permittivity", "bulk_resistivity_ohm_m"]
    for key in needed:
        if key not in material.values:
            raise MaterialError((key,), None, f"is missing in a {material.kind}")
    drop = material.get("backscatter_low_energy_drop", 0.0)
    if drop != 0.0 and "backscatter_drop_energy_eV" not in material.values:
        raise MaterialError(
            ("backscatter_drop_energy_eV",), None, "is missing beside backscatter_low_energy_drop"
        )
    if material.get("backscatter_high_energy", 0.0) < drop:
        raise MaterialError(
            ("backscatter_low_energy_drop", "value"),
            drop,
            "makes the backscatter coefficient negative",
            allowed="at most backscatter_high_energy",
        )


def _refuse_other_kind(material: Material, keys: Iterable[str]) -> None:
    for key in keys:
        if key in material.values:
            raise MaterialError(
                (key,), material.value(key), f"does not belong to a {material.kind}"
            )


def _value(entry: object, key: str) -> Value:
    table = _table(entry, (key,))
    extra, choices = _EXTRA_KEYS.get(key, (None, ()))
    _refuse_unknown(table, _VALUE_KEYS if extra is None else (*_VALUE_KEYS, extra), (key,))
    number = _number(table, (key, "value"))
    unit, low, high, _ = PROPERTIES[key]
    allowed = f"{low:g} to {high:g}" + ("" if unit == "1" else f" {unit}")
    if not low <= number <= high:
        raise MaterialError((key, "value"), number, "is out of range", allowed=allowed)
    spread = _spread(table, key, number)
    if spread.low < low or spread.high > high:
        raise MaterialError(
            (key, "spread"), [spread.low, spread.high], "is out of range", allowed=allowed
        )
    word = None if extra is None else _choice(table, (key, extra), choices)
    return Value(
        value=number,
        source=_text(table, (key, "source")),
        basis=_choice(table, (key, "basis"), BASES),
        spread=spread,
        measurement_method=word if extra == "measurement_method" else None,
        holds=word if extra == "holds" else None,
        note=_text(table, (key, "note")) if "note" in table else "",
    )


def _spread(table: Table, key: str, number: float) -> Spread:
    if "spread" not in table:
        raise MaterialError(
            (key, "spread"), None, "is missing", allowed='{law = "uniform", low = …, high = …}'
        )
    entry = _table(table["spread"], (key, "spread"))
    _refuse_unknown(entry, ("law", "low", "high"), (key, "spread"))
    law = _choice(entry, (key, "spread", "law"), SPREAD_LAWS)
    low, high = (_number(entry, (key, "spread", end)) for end in ("low", "high"))
    if not low <= number <= high:
        raise MaterialError(
            (key, "spread"),
            [low, high],
            f"does not hold the value {number:g}",
            allowed="low to high",
        )
    if law == "log_uniform" and low <= 0.0:
        raise MaterialError(
            (key, "spread", "low"), low, "has no logarithm", allowed="above 0 for log_uniform"
        )
    return Spread(law, low, high)


def _photoyield(entry: object) -> PhotoYield:
    where = "photoyield"
    table = _table(entry, (where,))
    _refuse_unknown(table, _CURVE_KEYS, (where,))
    energy = _numbers(table, (where, "photon_energy_eV"))
    emitted = _numbers(table, (where, "electrons_per_photon"))
    if len(energy) != len(emitted):
        raise MaterialError(
            (where, "electrons_per_photon"),
            len(emitted),
            "is a different number of points",
            allowed=f"{len(energy)}, as many as photon_energy_eV",
        )
    if len(energy) < 3:
        raise MaterialError(
            (where, "photon_energy_eV"), len(energy), "is too few points", allowed="at least 3"
        )
    for index, (before, after) in enumerate(pairwise(energy), start=1):
        if not 0.0 < before < after:
            raise MaterialError(
                (where, "photon_energy_eV", index),
                after,
                "does not rise",
                allowed="above 0, rising",
            )
    if emitted[0] != 0.0:
        raise MaterialError(
            (where, "electrons_per_photon", 0), emitted[0], "is not 0", allowed="0 at the threshold"
        )
    for index, number in enumerate(emitted[1:], start=1):
        if not 0.0 < number <= 10.0:
            raise MaterialError(
                (where, "electrons_per_photon", index), number, "is out of range", allowed="0 to 10"
            )
    factor = _factor(table, "spread_factor")
    near, high = "near_threshold_to_eV", "high_energy_from_eV"
    return PhotoYield(
        photon_energy_eV=np.array(energy),
        electrons_per_photon=np.array(emitted),
        source=_text(table, (where, "source")),
        basis=_choice(table, (where, "basis"), BASES),
        level=_choice(table, (where, "level"), PHOTOYIELD_LEVELS),
        spread_factor=factor,
        near_threshold_factor=_factor(table, "near_threshold_factor", factor),
        near_threshold_to_eV=_number(table, (where, near)) if near in table else energy[0],
        high_energy_factor=_factor(table, "high_energy_factor", factor),
        high_energy_from_eV=_number(table, (where, high)) if high in table else energy[-1],
        note=_text(table, (where, "note")) if "note" in table else "",
    )


def _factor(table: Table, key: str, default: float | None = None) -> float:
    if key not in table and default is not None:
        return default
    number = _number(table, ("photoyield", key))
    if not 1.0 <= number <= 1000.0:
        raise MaterialError(("photoyield", key), number, "is out of range", allowed="1 to 1000")
    return number


def _refuse_unknown(table: Table, known: Sequence[str], path: Path) -> None:
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


def _table(entry: object, path: Path) -> Table:
    if not isinstance(entry, Mapping):
        raise MaterialError(path, entry, "is no table", allowed="a table with value and source")
    return entry


def _entry(table: Table, path: Path) -> object:
    key = str(path[-1])
    if key not in table:
        raise MaterialError(path, None, "is missing")
    return table[key]


def _text(table: Table, path: Path) -> str:
    entry = _entry(table, path)
    if not isinstance(entry, str) or not entry.strip():
        raise MaterialError(path, entry, "is no text", allowed="a text that is not empty")
    return entry


def _choice(table: Table, path: Path, choices: Sequence[str]) -> str:
    entry = _entry(table, path)
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


def _number(table: Table, path: Path) -> float:
    return _as_number(_entry(table, path), path)


def _numbers(table: Table, path: Path) -> list[float]:
    entry = _entry(table, path)
    if isinstance(entry, str) or not isinstance(entry, Sequence):
        raise MaterialError(path, entry, "is no list", allowed="a list of numbers")
    return [_as_number(item, (*path, index)) for index, item in enumerate(entry)]


def _as_number(entry: object, path: Path) -> float:
    if isinstance(entry, bool) or not isinstance(entry, int | float):
        raise MaterialError(path, entry, "is no number", allowed="a number without quotes")
    # an int too large for a float counts as not finite
    number = float(entry) if abs(entry) < 1e300 else math.inf
    if not math.isfinite(number):
        raise MaterialError(path, entry, "is not finite", allowed="a finite number")
    return number
