"""Which cell of a table of knots a value lies in, when every member has knots of its own."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Index = NDArray[np.intp]

PARTS_AN_OCTAVE = 6  # as a power of two: 64 boxes between 1 V and 2 V
LOWEST_EXPONENT = -24  # what is smaller lies in the first box


@dataclass(frozen=True, slots=True)
class Grids:
    """Knots of U tables, one after the other, with boxes that narrow the search.

    Attributes
    ----------
    knots : ndarray [all]
        Of every table, rising from 0.
    first : ndarray of int [U]
        Where the knots of a table begin.
    boxes : ndarray of int [U, B]
        Cell of the lower edge of each box; the last box is that of the last knot.
    halvings : int
        How often a search inside a box must be halved.
    """

    knots: Array
    first: Index
    boxes: Index
    halvings: int

    @property
    def shared(self) -> bool:
        """Whether all tables have the same knots."""
        return len(self.first) == 1

    def cell(self, table: Index, size: Array) -> tuple[Index, Array]:
        """Cell [m, S] of values [m, S] >= 0 in the tables [m], and the distance from its left knot.

        A value on a knot lies right of it, and one beyond the last knot in the last cell.
        """
        if self.shared:
            k = self.knots[1:-1].searchsorted(size, side="right")
            return k, size - self.knots[k]
        row = table[:, None]
        box = np.minimum(_box(size), self.boxes.shape[1] - 2)
        low, high = self.boxes[row, box], self.boxes[row, box + 1]
        first = self.first[row]
        for _ in range(self.halvings):
            middle = (low + high + 1) // 2
            right = size >= self.knots[first + middle]
            low, high = np.where(right, middle, low), np.where(right, high, middle - 1)
            high = np.maximum(high, low)
        return low, size - self.knots[first + low]


def _box(size: Array) -> Index:
    """Box of values: exponent and leading bits of the floating-point number."""
    bits = np.ascontiguousarray(size).view(np.int64) >> (52 - PARTS_AN_OCTAVE)
    zero = (1023 + LOWEST_EXPONENT) << PARTS_AN_OCTAVE
    return np.asarray(np.maximum(bits - zero, 0), dtype=np.intp)


def grids(knots: Sequence[Array]) -> Grids:
    """Prepare the knots of U tables; equal ones are kept once."""
    if all(np.array_equal(knots[0], other) for other in knots[1:]):
        return Grids(knots[0], np.zeros(1, np.intp), np.zeros((1, 2), np.intp), 0)
    count = 1 + max(int(_box(k[-1:])[0]) for k in knots)
    bits = np.arange(count + 1, dtype=np.int64) + ((1023 + LOWEST_EXPONENT) << PARTS_AN_OCTAVE)
    edges = (bits << (52 - PARTS_AN_OCTAVE)).view(np.float64)
    edges[0] = 0.0
    boxes = np.stack(
        [np.clip(np.searchsorted(k, edges, side="right") - 1, 0, len(k) - 2) for k in knots]
    )
    widest = int(np.diff(boxes, axis=1).max())
    first = np.concatenate([[0], np.cumsum([len(k) for k in knots])[:-1]]).astype(np.intp)
    return Grids(np.concatenate(knots), first, boxes, int(widest).bit_length())
