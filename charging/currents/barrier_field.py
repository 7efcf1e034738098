r"""Potential barriers that other surfaces raise in front of a surface.

Negative neighbours can close off a patch: on the way out along its normal the potential
passes a minimum below both the patch and the plasma, and slow electrons return (Besse &
Rubin 1980). Laplace's equation is linear, so the potential along the normal is
:math:`\Phi_i(r) = \sum_j w_j(r) V_j`, and the height is :math:`V_i - \min_r \Phi_i`.

The weights may come from any geometry; they are wanted at the distances `DISTANCES`
above the patch, in body radii. Between them splines in a coordinate that is
logarithmic near the surface and far out.

References
----------
Besse & Rubin (1980), J. Geophys. Res. 85, 2324 (from memory).
"""

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from charging.currents.barrier import escape_height
from charging.currents.splines import spline

Array = NDArray[np.float64]
Index = NDArray[np.intp]

JOIN_V = 0.1
"""A barrier joins max(V, 0) over this height [V]; the join errs by 15 % of it at most."""

NEAREST, FARTHEST = 5e-4, 0.02  # where the coordinate ceases to be logarithmic, in t and 1 − t
POINTS = 49
NEWTON = 2  # steps from the root of a straight derivative across a cell of 0.24


def _distances() -> tuple[Array, Array]:
    """Coordinate u [K] and height over the surface in body radii [K], the last one infinite."""
    u = np.linspace(np.log(NEAREST / (1.0 + FARTHEST)), np.log((1.0 + NEAREST) / FARTHEST), POINTS)
    t = (np.exp(u) * (1.0 + FARTHEST) - NEAREST) / (1.0 + np.exp(u))  # t = 1 − R/r
    t[0], t[-1] = 0.0, 1.0
    with np.errstate(divide="ignore"):
        return u, t / (1.0 - t)


COORDINATE, DISTANCES = _distances()
STEP = float(COORDINATE[1] - COORDINATE[0])


class Heights(NamedTuple):
    """Barrier heights and their derivatives.

    height_V, own : ndarray [m, S]
        Height [V], and its derivative by the surface's own potential as far as it does not
        stand in `rows`.
    member, surface : ndarray of int [A]
        Where a barrier is active.
    rows : ndarray [A, n]
        Derivatives of these heights by all node potentials.
    """

    height_V: Array
    own: Array
    member: Index
    surface: Index
    rows: Array


@dataclass(frozen=True, slots=True)
class BarrierField:
    """Weights along the normals of P patches, and which surfaces they belong to.

    Attributes
    ----------
    surface, node : ndarray of int [P]
        Surface and node of each patch: one node may have patches on several sides.
    falls : ndarray [n, P·K]
        Derivatives of the weights by the coordinate at `DISTANCES`.
    pieces : ndarray [P, K-1, n, 6]
        Quintics of the weights between them.
    """

    surface: Index
    node: Index
    falls: Array
    pieces: Array

    def heights(self, node_V: Array, surface_V: Array) -> Array:
        """Height [V, m, S] for node potentials [m, n] and surface potentials [m, S]."""
        height = escape_height(surface_V)[0]
        member, patch, _, _, least = self._minima(node_V)
        if member.size:
            surface = self.surface[patch]
            excess = surface_V[member, surface] - least - height[member, surface]
            # of several minima on one normal the lowest counts
            join = np.zeros_like(height)
            np.maximum.at(join, (member, surface), _join(excess)[0])
            height += join
        return height

    def heights_and_slopes(self, node_V: Array, surface_V: Array) -> Heights:
        """`heights` and their derivatives."""
        height, own = escape_height(surface_V)
        member, patch, cell, u, least = self._minima(node_V)
        surface = self.surface[patch]
        excess = surface_V[member, surface] - least - height[member, surface]
        active = np.flatnonzero(excess > 0.0)
        place = member[active] * surface_V.shape[1] + surface[active]
        if (place[1:] == place[:-1]).any():  # several minima of one patch follow each other
            order = np.lexsort((-excess[active], place))
            first = np.diff(place[order], prepend=-1) > 0
            active = active[order[first]]
        member, patch, surface = member[active], patch[active], surface[active]
        join, d_join = _join(excess[active])
        height[member, surface] += join
        own[member, surface] *= 1.0 - d_join
        u = u[active]
        u2, u3 = u * u, u * u * u
        powers = np.stack([u3 * u2, u2 * u2, u3, u2, u, np.ones_like(u)], axis=-1)
        weights = (self.pieces[patch, cell[active]] * powers[:, None, :]).sum(axis=-1)
        rows = -d_join[:, None] * weights
        rows[np.arange(len(rows)), self.node[patch]] += d_join
        return Heights(height, own, member, surface, rows)

    def _minima(self, node_V: Array) -> tuple[Index, Index, Index, Array, Array]:
        """Minima [A] along the normals: member, patch, cell, place in it and potential [V].

        The derivative rises through zero in the cell; a maximum and a minimum inside one cell
        are not seen.
        """
        patches = len(self.surface)
        # one product of small arrays per member: nothing is summed over members
        slope = np.matmul(node_V[:, None, :], self.falls).reshape(len(node_V) * patches, POINTS)
        falls = slope < 0.0
        row, cell = np.divmod(np.flatnonzero(falls[:, :-1] & ~falls[:, 1:]), POINTS - 1)
        member, patch = np.divmod(row, patches)
        at_0, at_1 = slope[row, cell], slope[row, cell + 1]
        quintic = (self.pieces[patch, cell] * node_V[member][:, :, None]).sum(axis=1)
        c5, c4, c3, c2, c1, c0 = np.ascontiguousarray(quintic.T)
        b5, b4, b3, b2 = 20.0 * c5, 12.0 * c4, 6.0 * c3, 2.0 * c2
        a5, a4, a3 = 5.0 * c5, 4.0 * c4, 3.0 * c3
        # where the derivative crosses zero, first as if it were straight
        u = STEP * at_0 / (at_0 - at_1)
        for _ in range(NEWTON):
            fall = (((a5 * u + a4) * u + a3) * u + b2) * u + c1
            bend = ((b5 * u + b4) * u + b3) * u + b2
            bends = bend > 0.0
            u = u - np.where(bends, fall, 0.0) / np.where(bends, bend, 1.0)
            u = np.minimum(np.maximum(u, 0.0), STEP)
        least = ((((c5 * u + c4) * u + c3) * u + c2) * u + c1) * u + c0
        return member, patch, cell, u, least


def _join(excess_V: Array) -> tuple[Array, Array]:
    """What a barrier adds to max(V, 0), and its derivative: 0 below 0, the excess above `JOIN_V`.

    Between them the cubic that joins both with equal slopes.
    """
    t = np.clip(excess_V / JOIN_V, 0.0, 1.0)
    inside = excess_V < JOIN_V
    value = np.where(inside, JOIN_V * t * t * (2.0 - t), excess_V)
    return value, np.where(inside, t * (4.0 - 3.0 * t), 1.0)


def barrier_field(surface: Index, node: Index, weights: Array) -> BarrierField:
    """Prepare the weights of any geometry.

    Parameters
    ----------
    surface, node : ndarray of int [P]
        Surface and node of each patch that has a barrier.
    weights : ndarray [P, K, n]
        Share of each node's potential in the potential at the heights `DISTANCES` (in body
        radii) above the patch: on the surface 1 of the own node, at infinity 0; between
        them never negative and together at most 1.
    """
    pieces = np.moveaxis(spline(COORDINATE, np.moveaxis(weights, 1, 0)), 2, 0)  # [P, K-1, 6, n]
    at_end = (
        pieces[:, -1] * (np.arange(5, -1, -1) * STEP ** np.arange(4.0, -2.0, -1.0))[:, None]
    ).sum(axis=1)
    falls = np.concatenate([pieces[:, :, -2], at_end[:, None]], axis=1)  # [P, K, n]
    return BarrierField(
        surface=np.asarray(surface, dtype=np.intp),
        node=np.asarray(node, dtype=np.intp),
        falls=np.ascontiguousarray(falls.reshape(-1, falls.shape[-1]).T),
        pieces=np.ascontiguousarray(np.swapaxes(pieces, -1, -2)),
    )


@dataclass(frozen=True, slots=True)
class Barriers:
    """Barriers of the members of a block.

    Attributes
    ----------
    fields : tuple of BarrierField
    which : ndarray of int [M]
        Field of each member.
    """

    fields: tuple[BarrierField, ...]
    which: Index

    def of(self, member: int) -> "Barriers":
        """Barriers of one member alone, as member 0."""
        return Barriers((self.fields[self.which[member]],), np.zeros(1, dtype=np.intp))

    def heights(self, member: Index, node_V: Array, surface_V: Array) -> Array:
        """Heights [V, m, S] in front of the surfaces of members [m]; see `BarrierField`."""
        if len(self.fields) == 1:
            return self.fields[0].heights(node_V, surface_V)
        found = np.empty_like(surface_V)
        for g in np.unique(self.which[member]):
            rows = np.flatnonzero(self.which[member] == g)
            found[rows] = self.fields[g].heights(node_V[rows], surface_V[rows])
        return found

    def heights_and_slopes(self, member: Index, node_V: Array, surface_V: Array) -> Heights:
        """`heights` and their derivatives; `Heights.member` counts within [m]."""
        if len(self.fields) == 1:
            return self.fields[0].heights_and_slopes(node_V, surface_V)
        height, own = np.empty_like(surface_V), np.empty_like(surface_V)
        parts = []
        for g in np.unique(self.which[member]):
            rows = np.flatnonzero(self.which[member] == g)
            found = self.fields[g].heights_and_slopes(node_V[rows], surface_V[rows])
            height[rows], own[rows] = found.height_V, found.own
            parts.append((rows[found.member], found.surface, found.rows))
        where, surface, by_node = (np.concatenate(part) for part in zip(*parts, strict=True))
        return Heights(height, own, where, surface, by_node)
