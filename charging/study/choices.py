"""Choices of a study: every combination of the values that it lists, each a checked case."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import product
from types import MappingProxyType

from charging.case import LoadedCase, changed_case
from charging.case_library import Sources, find_material
from charging.errors import KeyPath, Problem, ProblemsFound
from charging.study.targets import PHOTOYIELD, Target
from materials.record import Material

Value = str | float | int | bool
Grid = Sequence[tuple[tuple[Target, ...], tuple[Value, ...]]]


@dataclass(frozen=True, slots=True)
class Choice:
    """One combination.

    Attributes
    ----------
    label : str
        The values, in the order of the study.
    values : mapping of str to value
        By path.
    loaded : LoadedCase
        The case with them.
    """

    label: str
    values: Mapping[str, Value]
    loaded: LoadedCase

    def __reduce__(self) -> tuple[type[Choice], tuple[object, ...]]:
        return Choice, (self.label, dict(self.values), self.loaded)


def choices_of(
    loaded: LoadedCase, grid: Grid, *, allow_outside: bool = False
) -> tuple[Choice, ...]:
    """Every combination of the values of a grid, checked like a file.

    Raises
    ------
    InputError
        A combination that makes no valid case.
    """
    if not grid:
        return (Choice("as in the case", {}, loaded),)
    found = []
    for values in product(*(row for _, row in grid)):
        given: dict[str, Value] = {}
        edits: dict[KeyPath, object] = {}
        records: list[tuple[Target, Value]] = []
        plasmas: list[tuple[Target, Value]] = []
        # coatings first: a thickness that the study gives overrides the one they bring
        rows = sorted(zip(grid, values, strict=True), key=lambda row: not _coats(row[0][0]))
        for (targets, _), value in rows:
            for one in targets:
                given[one.text] = value
                if one.kind == "material":
                    records.append((one, value))
                elif one.kind == "plasma":
                    plasmas.append((one, value))
                else:
                    edits |= _edits(loaded, one, value, allow_outside)
        changed = changed_case(loaded, edits, allow_outside=allow_outside) if edits else loaded
        changed = with_numbers(changed, [*records, *plasmas])
        found.append(Choice(", ".join(_word(v) for v in values), MappingProxyType(given), changed))
    return tuple(found)


def _coats(targets: Sequence[Target]) -> bool:
    return any(one.kind == "case" and one.key[-1] == "material" for one in targets)


def _word(value: Value) -> str:
    return value if isinstance(value, str) else f"{value:g}"


def _edits(
    loaded: LoadedCase, one: Target, value: Value, allow_outside: bool
) -> dict[KeyPath, object]:
    """What a value changes in the file; a coating brings or drops its thickness.

    A conductor has none, and no resistor to what it is bonded to; another dielectric than the
    surface's own takes the thickness that its record calls typical, where there is one.
    """
    bare = {"thickness_m": "thickness", "area_m2": "area", "radius_m": "radius"}
    name = str(one.key[-1])
    edits: dict[KeyPath, object] = {one.key: value}
    if name in bare:
        edits[(*one.key[:-1], bare[name])] = None
    if one.key[0] != "surface" or name != "material":
        return edits
    place = one.key[:2]
    surface = loaded.case.surface[int(one.key[1])]
    try:
        material = _material(loaded, str(value), allow_outside)
    except ProblemsFound:
        return edits  # the checked case tells it
    if material.kind == "conductor":
        edits |= {(*place, "thickness_m"): None, (*place, "thickness"): None}
        # a resistor to what it is now bonded to joins nothing
        ends = {surface.name, surface.attached_to}
        rows = tomllib.loads(loaded.text).get("link", [])
        kept = [row for row in rows if set(row["between"]) != ends]
        if len(kept) < len(rows):
            edits[("link",)] = kept or None
    elif material.kind == "dielectric" and str(value) != surface.material:
        typical = material.get("typical_thickness_m", 0.0)
        if typical > 0.0:
            edits |= {(*place, "thickness_m"): typical, (*place, "thickness"): None}
    return edits


def _material(loaded: LoadedCase, name: str, allow_outside: bool) -> Material:
    if name in loaded.materials:
        return loaded.materials[name]
    case_file = loaded.path if loaded.path.is_file() else None
    return find_material(name, Sources(case_file, allow_outside))[0]


def with_numbers(loaded: LoadedCase, numbers: Sequence[tuple[Target, Value | float]]) -> LoadedCase:
    """Case with numbers of its materials and plasmas, or of its own tables, set."""
    materials, plasmas, case = dict(loaded.materials), dict(loaded.plasmas), loaded.case
    for one, value in numbers:
        number = _number(one, value)
        if one.kind == "material":
            name, key = str(one.key[0]), str(one.key[1])
            materials[name] = _with_property(materials[name], key, number)
        elif one.kind == "plasma":
            name, index, key = str(one.key[0]), int(one.key[1]), str(one.key[2])
            own = list(plasmas[name].populations)
            if key == "density_m3":
                own[index] = replace(own[index], density_m3=number)
            else:
                own[index] = replace(own[index], temperature_eV=number)
            plasmas[name] = replace(plasmas[name], populations=tuple(own))
        else:
            table = str(one.key[0])
            key = str(one.key[-1])
            if len(one.key) == 3:
                rows = list(getattr(case, table))
                index = int(one.key[1])
                rows[index] = rows[index].model_copy(update={key: number})
                case = case.model_copy(update={table: tuple(rows)})
            else:
                changed = getattr(case, table).model_copy(update={key: number})
                case = case.model_copy(update={table: changed})
    return replace(
        loaded,
        case=case,
        materials=MappingProxyType(materials),
        plasmas=MappingProxyType(plasmas),
    )


def _number(one: Target, value: Value | float) -> float:
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise ProblemsFound(
            [Problem(("values",), f"is no number for {one.text}", value, allowed="numbers")]
        )
    return float(value)


def _with_property(material: Material, key: str, value: float) -> Material:
    if key == PHOTOYIELD:
        assert material.photoyield is not None  # the path was checked
        curve = replace(material.photoyield, level_factor=value)
        return replace(material, photoyield=curve)
    record = material.values[key]
    values = {**material.values, key: replace(record, value=value)}
    return replace(material, values=MappingProxyType(values))
