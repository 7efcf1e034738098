"""Properties of a case that are uncertain, and members with other values of them.

A setting gives a property's place in its spread: 0 the low end, 1 the high end, between
them its quantile. What has no setting keeps the value of its record.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from math import exp, log, sqrt
from types import MappingProxyType

import numpy as np

from charging.array_strings import irradiated
from charging.case import Case, LoadedCase
from charging.members import Member
from charging.review.designs import Design, designed, limited_name
from materials.library import load_material
from materials.record import Material, Spread
from materials.secondary import YieldLaw
from materials.surface_state import in_state

PHOTOYIELD = "photoyield"
"""Key of the level of a photoyield curve, a factor either way."""

EMISSION = (
    "secondary_yield_peak",
    "secondary_yield_peak_energy_eV",
    "mean_atomic_number",
    "backscatter_high_energy",
    "backscatter_low_energy_drop",
    "backscatter_drop_energy_eV",
    "ion_yield_peak",
    "ion_yield_peak_energy_eV",
    "work_function_eV",
    "secondary_energy_eV",
    "coating_thickness_m",
    "substrate_atomic_number",
)
FILM = ("relative_permittivity", "bulk_resistivity_ohm_m", "activation_energy_eV")
IRRADIATED = ("radiation_conductivity_S_m", "radiation_conductivity_exponent")
LOW, HIGH = 0.0, 1.0

Key = tuple[str, str]
"""Material as the case names it, and property."""
Settings = tuple[tuple[Key, float], ...]
"""Places in the spreads; sorted by key."""


@dataclass(frozen=True, slots=True)
class Property:
    """One uncertain property of one material of a case.

    material : as the case names it; key : of the record, or `PHOTOYIELD`; nominal; spread;
    basis; source ("" where the record gives none); surfaces : that are made of it.
    """

    material: str
    key: str
    nominal: float
    spread: Spread
    basis: str
    source: str
    surfaces: tuple[str, ...]

    @property
    def name(self) -> Key:
        """Key of a setting."""
        return self.material, self.key

    def at(self, place: float) -> float:
        """Value at a place of the spread."""
        return quantile(self.spread, self.nominal, place)


def quantile(spread: Spread, nominal: float, place: float) -> float:
    """Value of a spread below which the share `place` of its draws lies.

    Examples
    --------
    >>> round(quantile(Spread("log_uniform", 1.0, 100.0), 10.0, 0.5), 9)
    10.0
    >>> quantile(Spread("triangular", 0.0, 2.0), 1.0, 0.125)
    0.5
    """
    low, high = spread.low, spread.high
    if place <= LOW:
        return low
    if place >= HIGH:
        return high
    if spread.law == "log_uniform":
        return exp(log(low) + place * (log(high) - log(low)))
    if spread.law == "triangular" and high > low:
        turn = (nominal - low) / (high - low)
        if place < turn:
            return low + sqrt(place * (high - low) * (nominal - low))
        return high - sqrt((1.0 - place) * (high - low) * (high - nominal))
    return low + place * (high - low)


def material_in_state(loaded: LoadedCase, name: str, state: str) -> Material:
    """Material of a case in a state of its surface; kept records come before the library."""
    kept = loaded.materials

    def load(other: str) -> Material:
        return kept[other] if other in kept else load_material(other)

    return in_state(kept[name], state, load=load)


def state_at(state: str, age: str) -> str:
    """State of a surface at an age: as the case gives it, or aged at the end of life."""
    return "aged" if age == "end" else state


def properties(loaded: LoadedCase, age: str) -> tuple[Property, ...]:
    """Uncertain properties that enter a run of the case at an age."""
    found: dict[Key, Property] = {}
    users: dict[str, list[str]] = {}
    for surface in loaded.case.surface:
        users.setdefault(surface.material, []).append(surface.name)
    for surface in loaded.case.surface:
        name = surface.material
        material = loaded.materials[name]
        if not material.emits and surface.thickness_m is None:
            continue
        keys = [k for k in EMISSION if k in material.values] if material.emits else []
        if surface.thickness_m is not None:
            keys += FILM
            keys += [k for k in IRRADIATED if k in material.values and irradiated(loaded.case)]
        for key in keys:
            record = material.values[key]
            found.setdefault(
                (name, key),
                Property(name, key, record.value, record.spread, record.basis, record.source,
                         tuple(users[name])),
            )  # fmt: skip
        curve = material_in_state(loaded, name, state_at(surface.surface_state, age)).photoyield
        if curve is not None:
            factor = curve.spread_factor
            found.setdefault(
                (name, PHOTOYIELD),
                Property(name, PHOTOYIELD, 1.0, Spread("log_uniform", 1.0 / factor, factor),
                         curve.basis, curve.source, tuple(users[name])),
            )  # fmt: skip
    return tuple(found[key] for key in sorted(found))


def varied(properties_of: tuple[Property, ...]) -> tuple[Property, ...]:
    """Those whose spread is more than a point."""
    return tuple(p for p in properties_of if p.spread.high > p.spread.low)


@dataclass(frozen=True, slots=True)
class Variant:
    """What tells one member of a review from another: age, law, collection, settings, design."""

    age: str
    law: YieldLaw
    collection: str
    settings: Settings = ()
    design: Design = ()

    @property
    def bonded(self) -> frozenset[str]:
        """Surfaces without a node of their own through the design: blocks share their nodes."""
        return frozenset(change.surface for change in self.design if change.bonds)


@dataclass(slots=True)
class Workshop:
    """Makes members of a case; equal materials are one object, so that tables are shared."""

    loaded: LoadedCase
    _materials: dict[object, Material]
    _cases: dict[object, Case]
    _spaces: dict[str, dict[Key, Property]]
    _designed: dict[Design, Workshop]

    @classmethod
    def of(cls, loaded: LoadedCase) -> Workshop:
        """Make an empty workshop."""
        return cls(loaded, {}, {}, {}, {})

    def member(self, variant: Variant) -> Member:
        """Member of a variant."""
        if variant.design:
            return self._with_design(variant)
        case = self._case(variant)
        by_material: dict[str, list[tuple[str, float]]] = {}
        for (material, key), place in variant.settings:
            by_material.setdefault(material, []).append((key, place))
        # those of strings of an array, too, which have no state
        materials = dict(self.loaded.materials) | {
            of_state: self._material(name, state, variant.age, tuple(by_material.get(name, ())))
            for of_state, name, state in self._named(variant.age)
        }
        return Member(case, materials, self.loaded.plasmas, variant.law, variant.collection)

    def _with_design(self, variant: Variant) -> Member:
        """Member of a changed design; a bounded resistivity keeps the rest of its material."""
        if variant.design not in self._designed:
            self._designed[variant.design] = Workshop.of(designed(self.loaded, variant.design))
        settings = list(variant.settings)
        materials = {s.name: s.material for s in self.loaded.case.surface}
        for change in variant.design:
            if change.key == "bulk_resistivity_ohm_m":
                old = materials[change.surface]
                new = limited_name(old, float(change.value))
                settings += [
                    ((new, key), place) for (name, key), place in variant.settings if name == old
                ]
        same = replace(variant, settings=tuple(settings), design=())
        return self._designed[variant.design].member(same)

    def _named(self, age: str) -> Iterator[tuple[str, str, str]]:
        """Name in the member's case, name in the case, and state, of every material."""
        for surface in self.loaded.case.surface:
            state = state_at(surface.surface_state, age)
            yield f"{surface.material} ({state})", surface.material, state

    def _case(self, variant: Variant) -> Case:
        key = (variant.age, variant.collection)
        if key not in self._cases:
            case = self.loaded.case
            names = [name for name, _, _ in self._named(variant.age)]
            surfaces = tuple(
                surface.model_copy(update={"material": name, "surface_state": "as recorded"})
                for surface, name in zip(case.surface, names, strict=True)
            )
            body = case.body.model_copy(update={"collection": variant.collection})
            self._cases[key] = case.model_copy(update={"surface": surfaces, "body": body})
        return self._cases[key]

    def _material(
        self, name: str, state: str, age: str, places: tuple[tuple[str, float], ...]
    ) -> Material:
        key = (name, state, places)
        if key not in self._materials:
            start = material_in_state(self.loaded, name, state)
            self._materials[key] = (
                changed(start, name, places, self._space(age)) if places else start
            )
        return self._materials[key]

    def _space(self, age: str) -> Mapping[Key, Property]:
        if age not in self._spaces:
            self._spaces[age] = {p.name: p for p in properties(self.loaded, age)}
        return MappingProxyType(self._spaces[age])


def changed(
    material: Material,
    name: str,
    places: tuple[tuple[str, float], ...],
    space: Mapping[Key, Property],
) -> Material:
    """Material with some properties at other places of their spreads.

    A drop of the backscatter coefficient larger than the coefficient itself is that
    coefficient: no fewer than none come back.
    """
    values = dict(material.values)
    curve = material.photoyield
    for key, place in places:
        if (name, key) not in space:
            continue  # at another age the property is not there
        value = space[name, key].at(place)
        if key == PHOTOYIELD:
            if curve is not None:
                curve = replace(curve, level_factor=value * curve.level_factor)
        else:
            values[key] = replace(values[key], value=value)
    drop, level = (
        values.get(key) for key in ("backscatter_low_energy_drop", "backscatter_high_energy")
    )
    if drop is not None and level is not None and drop.value > level.value:
        values["backscatter_low_energy_drop"] = replace(drop, value=level.value)
    return replace(material, values=values, photoyield=curve)


def draw(space: tuple[Property, ...], count: int, seed: int) -> list[Settings]:
    """Random settings of all properties, each independent; the same for the same seed.

    A draw depends on its number and the names of the properties alone.
    """
    names = [p.name for p in space]
    places = np.random.Generator(np.random.PCG64(seed)).random((count, len(names)))
    return [tuple(zip(names, row, strict=True)) for row in places.tolist()]
