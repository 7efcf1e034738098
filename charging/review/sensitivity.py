"""Records of the search for corners: sensitivities, draws, corners."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from charging.case import LoadedCase
from charging.review.extremes import Quantity, bonded
from charging.review.limits import size_of
from charging.review.nominal import Cell, Place
from charging.review.space import Property, Settings, Variant

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Sensitivity:
    """Effect of one property alone on one quantity, by full reruns at both ends of its spread.

    of : the property; low, high : value of the quantity [its unit] with the property at either end;
    monotone : False where both ends lie on one side of the nominal value.
    """

    of: Property
    low: float
    high: float
    nominal: float
    monotone: bool

    @property
    def reach(self) -> float:
        """Largest change either way."""
        return max(abs(self.low - self.nominal), abs(self.high - self.nominal))


@dataclass(frozen=True, slots=True)
class Draws:
    """Random draws against the corner of one quantity.

    count : that were solved; failed : without a solution; largest : worst value met;
    values : ndarray, of the combination where the quantity is worst at nominal values.
    """

    count: int
    failed: int
    largest: float
    values: Array


@dataclass(frozen=True, slots=True)
class Corner:
    """Deterministic worst case of one quantity.

    Attributes
    ----------
    quantity : Quantity
    trivial : bool
        The quantity is zero by construction: a surface bonded to what it is against.
    settings : Settings
        Places in the spreads.
    value, time_s : float
        Worst over all scenes and ages.
    scene, variant : int, Variant
        Where.
    by_cell : ndarray [cell, age]
        Value in every scene at every age.
    sensitivities : tuple of Sensitivity
        The largest first.
    draws : Draws
    extended : bool
        A draw beat the first corner by more than 5 %.
    first : float
        Value of the first corner.
    searched : bool
        False where no corner was looked for: the value is the nominal one.
    """

    quantity: Quantity
    trivial: bool
    settings: Settings
    value: float
    time_s: float
    scene: int
    variant: Variant
    by_cell: Array
    sensitivities: tuple[Sensitivity, ...]
    draws: Draws
    extended: bool
    first: float
    searched: bool = True


@dataclass(frozen=True, slots=True)
class Ensemble:
    """Options of the search.

    draws, seed : of the random draws, per governing combination.
    """

    draws: int
    seed: int


def sensitivities_of(
    space: Sequence[Property], nominal: float, ends: Array, quantity: Quantity, floor: float
) -> tuple[Sensitivity, ...]:
    """Effects of properties from the values at both ends of their spreads, the largest first.

    `ends` [2N] are low and high of every property in turn; `floor` is the change below which
    nothing is told apart.
    """
    found = []
    for i, one in enumerate(space):
        low, high = float(ends[2 * i]), float(ends[2 * i + 1])
        if not np.isfinite(low) or not np.isfinite(high):
            continue  # no solution there: a draw that fails is counted
        one_side = (low - nominal) * (high - nominal) > 0.0
        # both ends on one side of the nominal value, by more than what is told apart
        monotone = not (one_side and min(abs(low - nominal), abs(high - nominal)) > floor)
        found.append(Sensitivity(one, low, high, nominal, monotone))
    return tuple(sorted(found, key=lambda s: -s.reach))


def unsearched(
    loaded: LoadedCase, cells: Sequence[Cell], places: Sequence[Place], wanted: Sequence[Quantity]
) -> tuple[Corner, ...]:
    """Stand-ins for corners that were not looked for: nominal values, no effects, no draws."""
    ages, nothing = loaded.case.review.ages, Draws(0, 0, 0.0, np.zeros(0))
    found = []
    for q, (quantity, place) in enumerate(zip(wanted, places, strict=True)):
        table = np.zeros((len(cells), len(ages)))
        for c, cell in enumerate(cells):
            for a, age in enumerate(ages):
                own = [cell.worst.value[v, q] for v, w in enumerate(cell.variants) if w.age == age]
                table[c, a] = max(own, key=lambda value: size_of(quantity.kind, value))
        found.append(
            Corner(
                quantity=quantity,
                trivial=bonded(loaded.case, quantity),
                settings=(),
                value=place.value,
                time_s=place.time_s,
                scene=place.cell,
                variant=cells[place.cell].variants[place.variant],
                by_cell=table,
                sensitivities=(),
                draws=nothing,
                extended=False,
                first=place.value,
                searched=bonded(loaded.case, quantity),
            )
        )
    return tuple(found)
