"""Extremes and final states of a block, gathered while it is marched.

An ensemble cannot keep the steps of ten thousand members; what a verdict needs is the
extremes of every potential and its time. They come from the integrator's own dense
output, as those of a single run do.
"""

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Index = NDArray[np.intp]

INSIDE_STEP = np.arange(1, 6) / 5.0
"""Points of every step at which extremes are looked for; its start is the end of the last."""


class Peaks:
    """A `Record` of a march that keeps extremes instead of steps.

    Parameters
    ----------
    quantities : callable
        Potentials [..., Q] of states [..., n], for example `ChargeBalance.controlled`.
    start : ndarray [M, n]
        States at the start.
    start_s : float

    Attributes
    ----------
    lowest, highest : ndarray [M, Q]
    lowest_s, highest_s : ndarray [M, Q]
        Times of the extremes.
    end : ndarray [M, n]
        Last states.
    end_s : ndarray [M]
    count : ndarray of int [M]
        Steps taken.
    """

    def __init__(
        self, quantities: Callable[[Array], Array], start: Array, start_s: float = 0.0
    ) -> None:
        self._quantities = quantities
        first = quantities(start)
        self.lowest, self.highest = first.copy(), first.copy()
        self.lowest_s, self.highest_s = np.full((2, *first.shape), start_s)
        self.end, self.end_s = start.copy(), np.full(len(start), start_s)
        self.count = np.zeros(len(start), dtype=np.intp)

    def steps(
        self, member: Index, start_s: Array, step_s: Array, y0: Array, y1: Array, c2: Array,
        c3: Array,
    ) -> None:  # fmt: skip
        """Look through one step of each of some members."""
        lowest, highest = self.lowest[member], self.highest[member]
        lowest_s, highest_s = self.lowest_s[member], self.highest_s[member]
        for theta in INSIDE_STEP.tolist():
            if theta < 1.0:
                state = (1.0 - theta) * y0 + theta * (y1 + (1.0 - theta) * (c2 + theta * c3))
            else:
                state = y1
            found = self._quantities(state)
            time = (start_s + theta * step_s)[:, None]
            below, above = found < lowest, found > highest
            lowest, lowest_s = np.where(below, found, lowest), np.where(below, time, lowest_s)
            highest, highest_s = np.where(above, found, highest), np.where(above, time, highest_s)
        self.lowest[member], self.highest[member] = lowest, highest
        self.lowest_s[member], self.highest_s[member] = lowest_s, highest_s
        self.end[member], self.end_s[member] = y1, start_s + step_s
        self.count[member] += 1
