"""Members of a study against the limits of its case."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from charging.case import LoadedCase
from charging.review.extremes import Quantity, judged, neighbours
from charging.review.limits import Requirement, requirements
from charging.study.solve import Results

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Against:
    """One quantity of one choice against one requirement.

    Attributes
    ----------
    requirement : Requirement
    quantity : Quantity
    value : ndarray [draws]
        Worst over modes and emission laws, with sign; nan where a member found no solution.
    """

    requirement: Requirement
    quantity: Quantity
    value: Array

    @property
    def severity(self) -> Array:
        """|value| over the limit: above 1 the limit is exceeded."""
        return np.abs(self.value) / self.requirement.limit

    @property
    def text(self) -> str:
        """Limit in a few words."""
        name = self.quantity.surface or "structure"
        return f"{self.requirement.kind}: {name}"


def against_limits(
    loaded: LoadedCase, results: Results, surfaces: Sequence[str] | None = None
) -> tuple[Against, ...]:
    """Every requirement with everything it concerns, for results [draws, mode, law, …].

    `surfaces` leaves out what concerns none of them.
    """
    return tuple(
        Against(requirement, quantity, _value(loaded, quantity, results))
        for requirement, quantity in judged(loaded.case, requirements(loaded.case))
        if surfaces is None or {quantity.surface, quantity.against} & set(surfaces)
    )


def severities(rows: Sequence[Against], draws: int) -> Array:
    """Largest severity of every draw over all limits [draws]; nan where any is, else 0."""
    if not rows:
        return np.zeros(draws)
    found: Array = np.max(np.stack([row.severity for row in rows]), axis=0)
    return found


def _value(loaded: LoadedCase, one: Quantity, results: Results) -> Array:
    names = loaded.case.names
    if one.kind == "structure":
        low = _over(results["structure_lowest_V"], np.min)
        high = _over(results["structure_highest_V"], np.max)
        return np.where(-low > high, low, high)
    if one.kind in ("neighbour", "neighbour normal", "neighbour inverted"):
        return _between(loaded, one, results)
    surface = names.index(one.surface)
    name, worst = {
        "normal": ("lowest_V", np.min),
        "inverted": ("highest_V", np.max),
        "field": ("largest_field_V_m", np.max),
        "energy": ("largest_energy_J", np.max),
    }[one.kind]
    found = _over(results[name][..., surface], worst)
    if one.kind == "normal":
        return np.minimum(found, 0.0)
    return np.maximum(found, 0.0)


def _between(loaded: LoadedCase, one: Quantity, results: Results) -> Array:
    pairs = neighbours(loaded.case)
    wanted = (one.surface, one.against)
    turned = wanted not in pairs
    at = pairs.index((one.against, one.surface) if turned else wanted)
    low = _over(results["pair_lowest_V"][..., at], np.min)
    high = _over(results["pair_highest_V"][..., at], np.max)
    if turned:
        low, high = -high, -low
    if one.kind == "neighbour normal":
        return np.minimum(low, 0.0)
    if one.kind == "neighbour inverted":
        return np.maximum(high, 0.0)
    return np.where(-low > high, low, high)


def _over(value: Array, worst: object) -> Array:
    """Worst over modes and laws of values [draws, mode, law]."""
    found: Array = worst(value, axis=(1, 2))  # type: ignore[operator]
    return found
