"""Shares of photo- and secondary electrons that leave, for members with tables of their own."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from charging.currents.cells import Grids, grids
from charging.currents.splines import polynomial, polynomial_and_slope
from charging.currents.tables import YieldTable

Array = NDArray[np.float64]
Index = NDArray[np.intp]


class EscapeShares(Protocol):
    """What the net current needs to know of escape; see `Escape`."""

    def shares(self, table: Index, height_V: Array) -> Array:
        """Shares [m, S, 2] that leave."""
        ...

    def shares_and_slopes(self, table: Index, height_V: Array) -> tuple[Array, Array]:
        """`shares` and their derivatives by height."""
        ...


@dataclass(frozen=True, slots=True)
class Escape:
    """Escape above a barrier height, U tables of S surfaces.

    Attributes
    ----------
    grids : Grids
        Knots of the height [V] from 0.
    coefficients : ndarray [U, S, K-1, 6, 2]
        Columns: photoelectrons, secondary electrons.
    """

    grids: Grids
    coefficients: Array

    def shares(self, table: Index, height_V: Array) -> Array:
        """Shares [m, S, 2] that leave surfaces of the tables [m] at heights [m, S] >= 0."""
        found = np.ones((height_V.size, 2))
        climbing = np.flatnonzero(height_V > 0.0)  # where nothing need be climbed, all leave
        if climbing.size:
            found[climbing] = polynomial(*self._cells(table, height_V, climbing))
        return found.reshape(*height_V.shape, 2)

    def shares_and_slopes(self, table: Index, height_V: Array) -> tuple[Array, Array]:
        """`shares` and their derivatives by height, 0 where the height is 0."""
        found, slope = np.ones((height_V.size, 2)), np.zeros((height_V.size, 2))
        climbing = np.flatnonzero(height_V > 0.0)
        if climbing.size:
            found[climbing], slope[climbing] = polynomial_and_slope(
                *self._cells(table, height_V, climbing)
            )
        shape = (*height_V.shape, 2)
        return found.reshape(shape), slope.reshape(shape)

    def _cells(self, table: Index, height_V: Array, which: Index) -> tuple[Array, Array]:
        """Coefficients [N, 6, 2] and distance from the left knot [N, 1] of the flat entries."""
        surfaces = height_V.shape[1]
        member, surface = np.divmod(which, surfaces)
        own = table[member]
        k, x = self.grids.cell(own, height_V.ravel()[which, None])
        rows = self.coefficients.reshape(-1, *self.coefficients.shape[3:])
        return rows[(own * surfaces + surface) * self.coefficients.shape[2] + k[:, 0]], x


def escape_of(tables: Sequence[YieldTable]) -> Escape:
    """Gather the escape tables of U models with the same number of surfaces."""
    cells = max(table.coefficients.shape[1] for table in tables)
    filled = np.zeros((len(tables), *tables[0].coefficients.shape))
    if filled.shape[2] != cells:
        filled = np.zeros((*filled.shape[:2], cells, *filled.shape[3:]))
    for u, table in enumerate(tables):
        filled[u, :, : table.coefficients.shape[1]] = table.coefficients
    return Escape(grids([table.knots_V for table in tables]), filled)
