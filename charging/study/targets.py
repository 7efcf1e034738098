"""What a path of a study names: a key of the case, a property of a material, a plasma's number.

Paths: ``surface.NAME.KEY``, ``link.N.resistance_ohm`` (N from 1), ``material.NAME.PROPERTY``
or ``material.NAME.photoyield`` (a factor on the curve), ``plasma.NAME.POPULATION.KEY``, and
``TABLE.KEY`` for a single key of a table of the case. Names may hold dots and spaces.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from math import inf
from typing import Literal

from charging.case import LoadedCase
from charging.case_tables import Link, Surface
from charging.case_values import nearest_name
from charging.errors import KeyPath, Problem, ProblemsFound
from environments.plasma import population_names
from materials.record import PROPERTIES

PHOTOYIELD = "photoyield"

Kind = Literal["case", "material", "plasma"]

# numbers that differ between members of one block, by table and key
SURFACE_NUMBERS = ("area_m2", "thickness_m", "capacitance_F")
NUMBERS: Mapping[str, tuple[str, ...]] = {
    "surface": SURFACE_NUMBERS,
    "link": ("resistance_ohm",),
    "emitter": ("current_A", "energy_eV", "below_V", "hold_V"),
    "string": ("exposed_share", "voltage_V"),
    "body": ("radius_m",),
}
RANGES: Mapping[str, tuple[float, float]] = {
    "area_m2": (1e-9, 1e5),
    "thickness_m": (1e-9, 1.0),
    "capacitance_F": (1e-15, 1.0),
    "resistance_ohm": (1e-6, 1e20),
    "current_A": (1e-12, 100.0),
    "energy_eV": (1e-3, 1e5),
    "below_V": (-1e5, 1e5),
    "hold_V": (-1e5, 1e5),
    "exposed_share": (1e-6, 1.0),
    "voltage_V": (1e-3, 2e3),
    "radius_m": (1e-3, 1e3),
    "density_m3": (1e-3, 1e16),
    "temperature_eV": (1e-3, 1e6),
    PHOTOYIELD: (1e-3, 1e3),
}
SINGLE_TABLES = ("orbit", "time", "sun", "attitude", "plasma", "body", "emission")


@dataclass(frozen=True, slots=True)
class Target:
    """What varies.

    Attributes
    ----------
    text : str
        The path as written.
    kind : {"case", "material", "plasma"}
    key : tuple of str and int
        In the case file; for a material its name and property; for a plasma its name, the
        number of the population and the property.
    least, most : float
        Allowed numbers.
    """

    text: str
    kind: Kind
    key: KeyPath
    least: float = -inf
    most: float = inf


def target(path: str, loaded: LoadedCase) -> Target:
    """Return what a path names, for values that are choices.

    Raises
    ------
    ProblemsFound
        The path names nothing; the nearest name is in the problem.
    """
    head, _, rest = path.partition(".")
    if head in ("material", "plasma"):
        return number_target(path, loaded)
    if head in ("surface", "emitter", "string"):
        name, key = _split(path, rest)
        table = getattr(loaded.case, head)
        index = _index(path, name, [one.name for one in table], head)
        _known(path, key, Surface.model_fields if head == "surface" else NUMBERS[head])
        return Target(path, "case", (head, index, key))
    if head == "link":
        return number_target(path, loaded)
    if head in SINGLE_TABLES:
        keys = rest.split(".")
        table = getattr(loaded.case, head)
        _known(path, keys[0], type(table).model_fields)
        return Target(path, "case", (head, *keys))
    raise _unknown(path, head, ("surface", "link", "material", "emitter", "string", *SINGLE_TABLES))


def number_target(path: str, loaded: LoadedCase) -> Target:
    """Return what a path names, for numbers that are drawn or searched; errors as `target`."""
    head, _, rest = path.partition(".")
    if head == "material":
        return _material(path, rest, loaded)
    if head == "plasma":
        return _plasma(path, rest, loaded)
    if head not in NUMBERS:
        raise _unknown(path, head, ("material", "plasma", *NUMBERS))
    if head == "body":
        _known(path, rest, NUMBERS["body"])
        return _ranged(path, ("body", rest))
    name, key = _split(path, rest)
    if head == "link":
        count = len(loaded.case.link)
        if not (name.isdecimal() and 1 <= int(name) <= count):
            raise _problem(path, f'names link "{name}"; the case has {count}',
                           allowed=f"1 to {count}" if count else None)  # fmt: skip
        _known(path, key, Link.model_fields)
        return _ranged(path, ("link", int(name) - 1, key))
    index = _index(path, name, [one.name for one in getattr(loaded.case, head)], head)
    _known(path, key, NUMBERS[head])
    if getattr(getattr(loaded.case, head)[index], key) is None:
        raise _problem(path, f'has nothing to vary: {head} "{name}" gives no {key}')
    return _ranged(path, (head, index, key))


def _material(path: str, rest: str, loaded: LoadedCase) -> Target:
    name, key = _split(path, rest)
    if name not in loaded.materials:
        raise _unknown(path, name, loaded.materials)
    material = loaded.materials[name]
    if key == PHOTOYIELD:
        if material.photoyield is None:
            raise _problem(path, f'has nothing to vary: "{name}" frees no photoelectrons')
        return _ranged(path, (name, PHOTOYIELD), "material")
    if key not in material.values:
        raise _unknown(path, key, [*material.values, PHOTOYIELD])
    allowed = PROPERTIES[key]
    return Target(path, "material", (name, key), allowed.low, allowed.high)


def _plasma(path: str, rest: str, loaded: LoadedCase) -> Target:
    beginning, key = _split(path, rest)
    name = max(
        (n for n in loaded.plasmas if beginning == n or beginning.startswith(f"{n}.")),
        key=len,
        default=None,
    )
    if name is None:
        raise _unknown(path, beginning.rpartition(".")[0], loaded.plasmas)
    wanted = beginning[len(name) + 1 :]
    labels = population_names(loaded.plasmas[name].populations)
    if wanted not in labels:
        raise _unknown(path, wanted, labels)
    _known(path, key, ("density_m3", "temperature_eV"))
    number = labels.index(wanted)
    if loaded.plasmas[name].populations[number].distribution is not None:
        raise _problem(path, "is no Maxwellian population; only those vary")
    return _ranged(path, (name, number, key), "plasma")


def _ranged(path: str, key: KeyPath, kind: Kind = "case") -> Target:
    least, most = RANGES[str(key[-1])]
    return Target(path, kind, key, least, most)


def _split(path: str, rest: str) -> tuple[str, str]:
    name, dot, key = rest.rpartition(".")
    if not dot or not name or not key:
        raise _problem(
            path, "is no path", allowed="TABLE.NAME.KEY, for example surface.boom.area_m2"
        )
    return name, key


def _index(path: str, name: str, names: list[str], table: str) -> int:
    if name not in names:
        raise _unknown(path, name, names)
    return names.index(name)


def _known(path: str, key: str, keys: Iterable[str]) -> None:
    if key not in keys:
        raise _unknown(path, key, keys)


def _unknown(path: str, part: str, names: Iterable[str]) -> ProblemsFound:
    known = list(names)
    return _problem(
        path,
        f'names "{part}", which is not there',
        allowed=", ".join(known[:20]) or None,
        nearest=nearest_name(part, known),
    )


def _problem(
    path: str, message: str, *, allowed: str | None = None, nearest: str | None = None
) -> ProblemsFound:
    return ProblemsFound([Problem(("path",), message, path, allowed=allowed, nearest=nearest)])
