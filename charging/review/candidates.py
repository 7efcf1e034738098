"""Candidate changes of a surface, family by family, and the steps between two of them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from charging.case import LoadedCase, Surface
from charging.errors import ProblemsFound
from charging.review.designs import Change, Design, designed
from charging.review.space import FILM
from materials.library import load_material, material_names

Array = NDArray[np.float64]
Key = tuple[str, str]
"""Surface and family."""

FAMILIES = (
    "extra grounding",
    "bleed resistance",
    "film thickness",
    "alternative coating",
    "bulk resistivity",
)
"""In the order in which one is chosen."""

THINNEST_M = 6e-6
"""Films below this are no product."""
NEVER = ("bare collector", "lunar regolith")
GLASS = ("cover glass", "fused silica")


def candidates(loaded: LoadedCase, name: str, family: str) -> list[Change]:
    """Changes of a family that suit a surface, the least far-reaching first."""
    surface = next(s for s in loaded.case.surface if s.name == name)
    if surface.floating:
        if family == "extra grounding":
            return [Change(name, "bond", "structure", bonds=True)]
        if family == "bleed resistance":
            return [Change(name, "link", r) for r in np.logspace(12.0, 3.0, 10).tolist()]
        return []
    assert surface.thickness_m is not None
    if family == "film thickness":
        thinner = surface.thickness_m * 0.5 ** np.arange(1, 9)
        return [Change(name, "thickness_m", d) for d in thinner.tolist() if d >= THINNEST_M]
    if family == "bulk resistivity":
        now = loaded.materials[surface.material].value("bulk_resistivity_ohm_m")
        return [
            Change(name, "bulk_resistivity_ohm_m", r)
            for r in (now * 10.0 ** -np.arange(1.0, 11.0)).tolist()
        ]
    if family == "alternative coating":
        return [
            Change(name, "material", other, bonds=load_material(other).kind == "conductor")
            for other in coatings(surface)
        ]
    return []


def coatings(surface: Surface) -> list[str]:
    """Library materials that may stand for that of a surface; glass stays glass.

    Thermal and optical properties are not compared.
    """
    glass = surface.material.startswith(GLASS)
    found = []
    for name in material_names():
        material = load_material(name)
        if name == surface.material or name in NEVER or name.startswith(GLASS) != glass:
            continue
        if material.kind != "conductor" and any(key not in material.values for key in FILM):
            continue
        found.append(name)
    return found


def finer(loaded: LoadedCase, key: Key, ladder: Sequence[Change], worst: Array) -> list[Change]:
    """Steps between the last candidate that fails and the first that does not."""
    good = np.flatnonzero(worst <= 1.0)
    if not good.size:
        return []
    k = int(good[0])
    value = ladder[k].value
    if not isinstance(value, float):
        return []
    above = value_before(loaded, *key, ladder, k)
    return [replace(ladder[k], value=v) for v in np.geomspace(above, value, 8)[1:-1].tolist()]


def value_before(
    loaded: LoadedCase, name: str, family: str, possible: Sequence[Change], k: int
) -> float:
    """Value of the candidate before the k-th: the one before it, or that of the case."""
    if k:
        return float(possible[k - 1].value)
    surface = next(s for s in loaded.case.surface if s.name == name)
    if family == "film thickness":
        return float(surface.thickness_m or 0.0)
    if family == "bulk resistivity":
        return loaded.materials[surface.material].value("bulk_resistivity_ohm_m")
    return 10.0 * float(possible[0].value)


def fits(loaded: LoadedCase, design: Design) -> bool:
    """Whether a changed case is one."""
    try:
        designed(loaded, design)
    except ProblemsFound:
        return False
    return True
