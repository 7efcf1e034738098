"""Quantities written as text with a unit, ``"5 mil"``, turned into keys that carry the unit.

A key of a file carries its unit (``thickness_m = 127e-6``) or is bare with a unit text
(``thickness = "5 mil"``), never both. Conversion is done in decimal, so 5 mil is exactly the
float nearest to 0.000127 m.
"""

from __future__ import annotations

import difflib
import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from decimal import Decimal, localcontext
from functools import cache
from math import isinf, pi
from typing import Any, TypeAlias

from charging.errors import KeyPath, Problem, ProblemsFound, printable

# Sizes of the units in the first unit of their kind. Exact by definition (SI brochure 2019, 9th
# edition; inch 25.4 mm; astronomical unit IAU 2012 resolution B2), except the degree (pi).
UNITS: Mapping[str, Mapping[str, str]] = {
    "length": {
        "m": "1", "km": "1e3", "cm": "1e-2", "mm": "1e-3", "um": "1e-6", "nm": "1e-9",
        "mil": "2.54e-5", "inch": "2.54e-2", "AU": "149597870700",
    },
    "area": {"m2": "1", "cm2": "1e-4", "mm2": "1e-6"},
    "number density": {"m-3": "1", "cm-3": "1e6"},
    "energy": {"eV": "1", "keV": "1e3", "MeV": "1e6"},
    "temperature": {"K": "1", "degC": "1"},
    "resistivity": {"ohm m": "1", "ohm cm": "1e-2"},
    "resistance": {"ohm": "1", "kohm": "1e3", "Mohm": "1e6", "Gohm": "1e9", "Tohm": "1e12"},
    "capacitance": {"F": "1", "mF": "1e-3", "uF": "1e-6", "nF": "1e-9", "pF": "1e-12"},
    "time": {"s": "1", "min": "60", "h": "3600", "d": "86400"},
    "angle": {"deg": "1", "rad": repr(180.0 / pi)},
    "voltage": {"V": "1", "kV": "1e3", "mV": "1e-3"},
    "electric field": {
        "V m-1": "1", "kV m-1": "1e3", "MV m-1": "1e6", "V cm-1": "1e2", "kV cm-1": "1e5",
        "V mm-1": "1e3", "kV mm-1": "1e6", "V um-1": "1e6",
    },
}  # fmt: skip
CELSIUS_ZERO_K = Decimal("273.15")

_NUMBER = re.compile(
    r"\s*([+-]?(?:\d{1,40}(?:\.\d{0,40})?|\.\d{1,40})(?:[eE][+-]?\d{1,3})?)\s*", re.ASCII
)
_SPELLINGS = str.maketrans(
    {
        "µ": "u", "μ": "u", "Ω": "ohm", "\u2126": "ohm", "·": " ", "⋅": " ", "*": " ", "^": "",
        "−": "-", "⁻": "-", "¹": "1", "²": "2", "³": "3",
    }
)  # fmt: skip
_SYNONYMS = {"°C": "degC", "in": "inch", "au": "AU", "°": "deg", "days": "d"}


def parse_quantity(text: str, kind: str) -> float:
    """Return the value of a text such as ``"27.5 keV"``.

    Parameters
    ----------
    text : str
        Number and unit; a space between them is optional.
    kind : str
        A key of `UNITS`.

    Returns
    -------
    float
        In the first unit of the kind: SI, but eV for energy and degrees for angles.

    Raises
    ------
    ValueError
        No number, no unit, a unit of another kind, or beyond the range of a float.

    Examples
    --------
    >>> parse_quantity("5 mil", "length"), parse_quantity("27.5 keV", "energy")
    (0.000127, 27500.0)
    >>> parse_quantity("1.2 cm-3", "number density"), parse_quantity("1e16 ohm cm", "resistivity")
    (1200000.0, 100000000000000.0)
    >>> parse_quantity("20 °C", "temperature")
    293.15
    """
    return convert_quantity(text, kind, next(iter(UNITS[kind])))


def convert_quantity(text: str, kind: str, unit: str) -> float:
    """Return a quantity text in `unit`, a unit of `kind`; errors as `parse_quantity`.

    Examples
    --------
    >>> convert_quantity("90 s", "time", "min")
    1.5
    """
    match = _NUMBER.match(text)
    if match is None:
        raise ValueError("is no number with a unit")
    written = _unit_name(text[match.end() :])
    if not written:
        raise ValueError("has no unit")
    if written not in UNITS[kind]:
        raise ValueError(f'has no unit of {kind}: "{printable(written, 20)}"')
    with localcontext() as context:
        context.prec = 100
        number = Decimal(match.group(1)) * Decimal(UNITS[kind][written])
        if written == "degC":
            number += CELSIUS_ZERO_K
        value = float(number / Decimal(UNITS[kind][unit]))
    if isinf(value):
        raise ValueError("is too large")
    return value


def accepted_units(kinds: Iterable[str]) -> str:
    """Return the units of the kinds in words.

    Examples
    --------
    >>> accepted_units(["energy"])
    'number and unit (eV, keV, MeV)'
    """
    return f"number and unit ({', '.join(unit for kind in kinds for unit in UNITS[kind])})"


def _unit_name(text: str) -> str:
    name = " ".join(text[:80].translate(_SPELLINGS).split())
    name = _SYNONYMS.get(name, name)
    over = re.fullmatch(r"(.*?) ?/ ?([A-Za-z]+)(\d?)", name)  # V/m, 1/cm3 without the 1
    if over is not None:
        name = f"{over[1]} {over[2]}-{over[3] or '1'}".strip()
    return name


# which bare key stands for which --------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Bare:
    """A key that carries its unit, as the target of a bare one."""

    key: str
    kind: str
    unit: str


TableName: TypeAlias = tuple[str, ...]
BareKeys: TypeAlias = Mapping[TableName, Mapping[str, tuple[Bare, ...]]]


def _angle(*names: str) -> dict[str, tuple[Bare, ...]]:
    return {name: (Bare(f"{name}_deg", "angle", "deg"),) for name in names}


_ATTITUDE: Mapping[str, tuple[Bare, ...]] = {
    "period": (Bare("period_s", "time", "s"),),
    **_angle("phase"),
}


@cache
def case_bare_keys() -> BareKeys:
    """Return the bare keys of a case file, by table."""
    return {
        ("orbit",): {
            "semi_major_axis": (Bare("semi_major_axis_km", "length", "km"),),
            **_angle("inclination", "raan", "argument_of_perigee", "mean_anomaly"),
            "duration": (Bare("duration_h", "time", "h"),),
        },
        ("time",): {
            "duration": (Bare("duration_h", "time", "h"),),
            "output_step": (Bare("output_step_s", "time", "s"),),
        },
        ("sun",): {
            "distance": (Bare("distance_au", "length", "AU"),),
            "absorbing_height": (Bare("absorbing_height_km", "length", "km"),),
        },
        ("plasma", "event"): {
            name: (Bare(f"{name}_min", "time", "min"),) for name in ("rise", "hold", "decay")
        },
        ("plasma", "substorm"): {
            **{name: (Bare(f"{name}_min", "time", "min"),) for name in ("rise", "hold", "decay")},
            **{
                f"{kind}_density": (Bare(f"{kind}_density_m3", "number density", "m-3"),)
                for kind in ("electron", "ion")
            },
            **{
                f"{kind}_temperature": (Bare(f"{kind}_temperature_eV", "energy", "eV"),)
                for kind in ("electron", "ion")
            },
        },
        ("body",): {"radius": (Bare("radius_m", "length", "m"),)},
        ("shape",): {
            **{
                name: (Bare(f"{name}_m", "length", "m"),)
                for name in ("thickness", "radius", "inner_radius", "length", "depth")
            },
            **_angle("cap_half_angle"),
        },
        ("surface",): {
            "area": (Bare("area_m2", "area", "m2"),),
            "thickness": (Bare("thickness_m", "length", "m"),),
            "temperature": (Bare("temperature_K", "temperature", "K"),),
            "capacitance": (Bare("capacitance_F", "capacitance", "F"),),
        },
        ("surface", "temperature_K"): {
            "sunlit": (Bare("sunlit_K", "temperature", "K"),),
            "eclipse": (Bare("eclipse_K", "temperature", "K"),),
            "time_constant": (Bare("time_constant_min", "time", "min"),),
        },
        ("attitude",): _ATTITUDE,
        ("mode", "attitude"): _ATTITUDE,
        ("mode",): _angle("parked_sun_angle"),
        ("emitter",): {
            "energy": (Bare("energy_eV", "energy", "eV"),),
            "below": (Bare("below_V", "voltage", "V"),),
            "hold": (Bare("hold_V", "voltage", "V"),),
        },
        ("string",): {"voltage": (Bare("voltage_V", "voltage", "V"),)},
        ("link",): {"resistance": (Bare("resistance_ohm", "resistance", "ohm"),)},
        ("limit",): {
            "allowed": (
                Bare("allowed_V", "voltage", "V"),
                Bare("allowed_V_m", "electric field", "V m-1"),
            )
        },
    }


@cache
def plasma_bare_keys() -> BareKeys:
    """Return the bare keys of a plasma file, by table."""
    return {
        ("population",): {
            "density": (Bare("density_m3", "number density", "m-3"),),
            "temperature": (Bare("temperature_eV", "energy", "eV"),),
            "maxwellian_density": (Bare("maxwellian_density_m3", "number density", "m-3"),),
            **{
                name: (Bare(f"{name}_eV", "energy", "eV"),)
                for name in (
                    "maxwellian_temperature",
                    "maxwellian_energy",
                    "gaussian_energy",
                    "gaussian_width",
                    "low_cutoff",
                    "high_cutoff",
                    "flat_up_to",
                )
            },
        }
    }


@dataclass(frozen=True, slots=True)
class Rewritten:
    """A document without bare keys.

    Attributes
    ----------
    document : dict
        Copy with every bare key replaced; lists have become tuples.
    origin : dict
        Way to a replaced key, to the way as it stands in the file.
    problems : list
        What could not be replaced; these keys are absent from `document`.
    absent : set
        Where in `document` they would stand.
    """

    document: dict[str, Any]
    origin: dict[KeyPath, KeyPath] = field(default_factory=dict)
    problems: list[Problem] = field(default_factory=list)
    absent: set[KeyPath] = field(default_factory=set)


def rewrite_quantities(document: Mapping[str, Any], bare_keys: BareKeys) -> Rewritten:
    """Return a copy of a document in which bare keys are replaced by those with units."""
    rewritten = Rewritten(document={})
    rewritten.document.update(_rewritten_table(document, (), bare_keys, rewritten))
    return rewritten


def normalise_plasma_document(document: Mapping[str, Any]) -> dict[str, Any]:
    """Return a plasma document with ``density_m3`` and ``temperature_eV`` for the bare keys.

    Raises
    ------
    ProblemsFound
        A quantity is no number with a unit of its kind, or is given twice.

    Examples
    --------
    >>> normalise_plasma_document({"population": [{"density": "1.2 cm-3"}]})
    {'population': ({'density_m3': 1200000.0},)}
    """
    rewritten = rewrite_quantities(document, plasma_bare_keys())
    if rewritten.problems:
        raise ProblemsFound(rewritten.problems)
    return rewritten.document


def _rewritten_table(
    table: Mapping[str, Any], path: KeyPath, bare_keys: BareKeys, result: Rewritten
) -> dict[str, Any]:
    name = tuple(part for part in path if isinstance(part, str))
    bare = bare_keys.get(name, {})
    copy: dict[str, Any] = {}
    for key, value in table.items():
        if key not in bare:
            copy[key] = _rewritten_value(value, (*path, key), bare_keys, result)
            continue
        problem = _bare_problem(key, value, table, bare[key])
        if problem is None:
            target = _target(value, bare[key])
            copy[target.key] = convert_quantity(value, target.kind, target.unit)
            result.origin[(*path, target.key)] = (*path, key)
        else:
            message, nearest = problem
            allowed = accepted_units(target.kind for target in bare[key])
            result.problems.append(
                Problem((*path, key), message, value=value, allowed=allowed, nearest=nearest)
            )
            result.absent.update((*path, target.key) for target in bare[key])
    return copy


def _rewritten_value(value: Any, path: KeyPath, bare_keys: BareKeys, result: Rewritten) -> Any:
    if isinstance(value, Mapping):
        return _rewritten_table(value, path, bare_keys, result)
    if isinstance(value, list | tuple):
        return tuple(
            _rewritten_value(element, (*path, index), bare_keys, result)
            for index, element in enumerate(value)
        )
    return value


def _target(text: str, targets: tuple[Bare, ...]) -> Bare:
    match = _NUMBER.match(text)
    unit = _unit_name(text[match.end() :]) if match else ""
    return next((target for target in targets if unit in UNITS[target.kind]), targets[0])


def _bare_problem(
    key: str, value: object, table: Mapping[str, Any], targets: tuple[Bare, ...]
) -> tuple[str, str | None] | None:
    """Return what is wrong with a bare key and the nearest unit, or None."""
    for target in targets:
        if target.key in table:
            return f"stands beside {target.key}; give one of the two", None
    if not isinstance(value, str):
        return f"has no unit; write {key} as a text with a unit, or {targets[0].key}", None
    target = _target(value, targets)
    try:
        convert_quantity(value, target.kind, target.unit)
    except ValueError as error:
        match = _NUMBER.match(value)
        units = {unit.casefold(): unit for each in targets for unit in UNITS[each.kind]}
        written = _unit_name(value[match.end() :]).casefold() if match else ""
        near = difflib.get_close_matches(written, units, n=1) if written else []
        return str(error), units[near[0]] if near else None
    return None
