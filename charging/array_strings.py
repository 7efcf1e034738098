"""Strings of solar cells and the dose rate of a case: checks, materials, what a march needs."""

from collections.abc import Iterator, Mapping, Sequence

import numpy as np

from charging.case_tables import Case
from charging.case_values import nearest_name, quoted
from charging.currents.lookup import NetCurrents
from charging.currents.surface import SurfaceModel
from charging.errors import Problem
from charging.network.strings import Strings
from materials.record import Material

SPECIALIST_V = 70.0
"""Voltage of an array above which no verdict stands without a specialist review."""


def array_problems(case: Case, materials: Mapping[str, Material]) -> Iterator[Problem]:
    """Yield strings whose conductors are none, and dose rates that go with nothing."""
    from environments.regions import REGIONS

    for index, string in enumerate(case.string):
        material = materials[string.material]
        if material.kind != "conductor":
            yield Problem(
                ("string", index, "material"),
                f"is no conductor but a {material.kind}",
                value=string.material,
                allowed="the material of interconnects and cell edges, such as silver",
            )
    by_region = case.radiation.by_region
    if by_region and case.plasma.model is None:
        yield Problem(
            ("radiation", "by_region"),
            'goes only with [plasma] model = "regions"',
            value=dict(by_region),
        )
    for name in by_region:
        if name not in REGIONS:
            yield Problem(
                ("radiation", "by_region", name),
                "is no region",
                value=name,
                nearest=nearest_name(name, REGIONS),
                allowed=quoted(REGIONS),
            )


def unirradiated(case: Case, materials: Mapping[str, Material]) -> tuple[str, ...]:
    """Materials of films to which a dose rate adds nothing, for want of a figure."""
    if not irradiated(case):
        return ()
    names = [
        materials[surface.material].name
        for surface in case.surface
        if surface.thickness_m is not None
        and "radiation_conductivity_S_m" not in materials[surface.material].values
    ]
    return tuple(dict.fromkeys(names))


def array_voltage_V(case: Case) -> float:
    """Largest voltage of a solar array that the case names; 0 without."""
    strings = [string.voltage_V for string in case.string]
    return max([case.review.array_voltage_V or 0.0, *strings])


def irradiated(case: Case) -> bool:
    """Whether there is a dose rate anywhere."""
    radiation = case.radiation
    return radiation.dose_rate_rad_s > 0.0 or any(v > 0.0 for v in radiation.by_region.values())


def string_materials(case: Case, materials: Mapping[str, Material]) -> Sequence[Material]:
    """Materials of the exposed conductors in the order of the strings."""
    return tuple(materials[string.material] for string in case.string)


def array_strings(
    cases: Sequence[Case], table: NetCurrents, models: tuple[SurfaceModel, ...]
) -> Strings:
    """Strings of a block of cases, from the table and the models of their conductors.

    Raises
    ------
    ValueError
        Cases have not the same strings on the same surfaces with the same polarity.
    """
    first = cases[0]
    fixed = [(s.name, s.surface, s.grounded) for s in first.string]
    if any([(s.name, s.surface, s.grounded) for s in c.string] != fixed for c in cases):
        raise ValueError("members of a block must have the same strings")
    place = [first.names.index(s.surface) for s in first.string]
    area = [
        [s.exposed_share * c.surface[k].area_m2 for s, k in zip(c.string, place, strict=True)]
        for c in cases
    ]
    return Strings(
        names=tuple(s.name for s in first.string),
        surface=np.array(place, dtype=np.intp),
        area_m2=np.array(area),
        voltage_V=np.array([[s.voltage_V for s in c.string] for c in cases]),
        grounded=np.array([float(s.grounded == "positive") for s in first.string]),
        table=table,
        models=models,
    )
