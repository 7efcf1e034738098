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

from collections.abc import Iterable
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
POINTS, EVERY = 49, 2  # distances; every second is looked at first
NEWTON = 2  # steps from the root of a straight derivative across a cell of 0.24
LEFT_OUT = 1.0  # of the rises to the neighbouring points: what a minimum may hide between them

HIDDEN = 0.125  # the same, for a parabola


def _distances() -> tuple[Array, Array]:
    """Coordinate u [K] and height over the surface in body radii [K], the last one infinite."""
    u = np.linspace(np.log(NEAREST / (1.0 + FARTHEST)), np.log((1.0 + NEAREST) / FARTHEST), POINTS)
    t = (np.exp(u) * (1.0 + FARTHEST) - NEAREST) / (1.0 + np.exp(u))  # t = 1 − R/r
    t[0], t[-1] = 0.0, 1.0
    with np.errstate(divide="ignore"):
        return u, t / (1.0 - t)


COORDINATE, DISTANCES = _distances()
STEP = float(COORDINATE[1] - COORDINATE[0])
FACTORS = np.arange(5.0, 0.0, -1.0)  # of the derivative of a quintic
ENDS = STEP ** np.arange(4.0, -1.0, -1.0)


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
    first : ndarray [n, P·K'], seldom : ndarray of int [K']
        Weights at every few distances and derivatives at both ends, for the first look, and
        the indices of these distances.
    near : ndarray [P, K, n]
        Weights at `DISTANCES`; at infinity 0, on the surface 1 of the own node.
    pieces : ndarray [P, K-1, 6, n]
        Splines between them.
    """

    surface: Index
    node: Index
    first: Array
    seldom: Index
    near: Array
    pieces: Array

    def heights(self, node_V: Array, surface_V: Array) -> Array:
        """Height [V, m, S] for node potentials [m, n] and surface potentials [m, S]."""
        height = escape_height(surface_V)[0]
        for member, patch, start, count in self._candidates(node_V):
            surface = self.surface[patch]
            saddle, _ = self._saddle(patch, node_V[member], start, count)
            excess = surface_V[member, surface] - saddle - height[member, surface]
            height[member, surface] += _join(excess)[0]
        return height

    def heights_and_slopes(self, node_V: Array, surface_V: Array) -> Heights:
        """`heights` and their derivatives."""
        height, own = escape_height(surface_V)
        found = []
        for member, patch, start, count in self._candidates(node_V):
            surface = self.surface[patch]
            saddle, weight = self._saddle(patch, node_V[member], start, count)
            excess = surface_V[member, surface] - saddle - height[member, surface]
            active = excess > 0.0
            member, patch, surface = member[active], patch[active], surface[active]
            join, d_join = _join(excess[active])
            height[member, surface] += join
            own[member, surface] *= 1.0 - d_join
            rows = -d_join[:, None] * weight[active]
            rows[np.arange(len(rows)), self.node[patch]] += d_join
            found.append((member, surface, rows))
        if not found:
            none = np.zeros(0, dtype=np.intp)
            return Heights(height, own, none, none, np.zeros((0, node_V.shape[1])))
        member, surface, rows = (np.concatenate(part) for part in zip(*found, strict=True))
        return Heights(height, own, member, surface, rows)

    def _candidates(self, node_V: Array) -> Iterable[tuple[Index, Index, Index, int]]:
        """Members and patches [A] that may have a minimum below the plasma and the patch.

        With each group: where to look, as first distance [A] and number of distances.
        """
        count = len(self.seldom)
        # one product of small arrays per member: nothing is summed over members
        found = np.matmul(node_V[:, None, :], self.first)[:, 0]
        found = found.reshape(len(node_V), len(self.surface), count + 2)
        phi, middle = found[..., :count], found[..., 1 : count - 1]
        left, right = middle - phi[..., : count - 2], middle - phi[..., 2:]
        on_surface = phi[..., 0]
        ends = np.minimum(on_surface, 0.0)
        # the lowest of three points may hide a lower value between them
        minima = (left <= 0.0) & (right <= 0.0)
        minima &= middle + LEFT_OUT * (left + right) < ends[..., None]
        # right at the surface, or so far out that only the slope at infinity tells
        near = (found[..., count] < 0.0) & (on_surface <= 0.0) & (middle[..., 0] >= on_surface)
        far = (found[..., count + 1] > 0.0) & (on_surface >= 0.0) & (middle[..., -1] >= 0.0)
        number = minima.sum(axis=-1) + near + far
        member, patch = np.nonzero(number == 1)
        if member.size:
            start = np.where(near, 0, np.where(far, count - 3, np.argmax(minima, axis=-1)))
            yield member, patch, EVERY * start[member, patch], 2 * EVERY + 1
        member, patch = np.nonzero(number > 1)
        if member.size:
            yield member, patch, np.zeros_like(member), len(COORDINATE)

    def _saddle(self, patch: Index, node_V: Array, start: Index, count: int) -> tuple[Array, Array]:
        """Least potential [A] along the normals of patches [A], and weights there [A, n].

        Looks at `count` distances from `start` [A].
        """
        near = self.near[patch[:, None], start[:, None] + np.arange(count)]
        phi = (near * node_V[:, None, :]).sum(axis=-1)
        last = len(COORDINATE) - 1
        middle = phi[:, 1:-1]
        left, right = middle - phi[:, :-2], middle - phi[:, 2:]
        hidden = np.where((left <= 0.0) & (right <= 0.0), left + right, 0.0)
        bound = phi.copy()
        bound[:, 1:-1] += HIDDEN * hidden
        lowest = np.argmin(bound, axis=1)
        # the derivative tells on which side of the lowest point the minimum lies
        k = start + lowest
        cell = np.minimum(k, last - 1)
        slope = (self.pieces[patch, cell, -2] * node_V).sum(axis=-1)
        weights = self.pieces[patch, cell - ((slope > 0.0) & (k > 0) & (k < last))]
        c = (weights * node_V[:, None, :]).sum(axis=-1)  # [A, 6]
        first, second = c[:, :-1] * FACTORS, c[:, :-2] * (FACTORS[:-1] * (FACTORS[:-1] - 1.0))
        # where the derivative crosses zero, first as if it were straight
        at_0, at_1 = first[:, -1], (first * ENDS).sum(axis=-1)
        crosses = (at_0 < 0.0) & (at_1 > 0.0)
        u = STEP * np.divide(at_0, at_0 - at_1, out=(at_0 < 0.0) * 1.0, where=crosses)
        for _ in range(NEWTON):
            powers = _powers(u)
            fall = (first * powers[:, 1:]).sum(axis=-1)
            bend = (second * powers[:, 2:]).sum(axis=-1)
            u = u - np.divide(fall, bend, out=np.zeros_like(u), where=crosses & (bend > 0.0))
            u = np.minimum(np.maximum(u, 0.0), STEP)
        powers = _powers(u)
        least = (c * powers).sum(axis=-1)
        return least, (weights * powers[..., None]).sum(axis=1)


def _powers(u: Array) -> Array:
    """Powers 5 to 0 of u [A], [A, 6]."""
    found = np.ones((len(u), 6))
    for n in range(4, -1, -1):
        np.multiply(found[:, n + 1], u, out=found[:, n])
    return found


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
    seldom = np.arange(0, len(COORDINATE), EVERY)
    first = np.concatenate(
        [weights[:, seldom], pieces[:, 0, None, -2], at_end[:, None]], axis=1
    )  # [P, K'+2, n]
    return BarrierField(
        surface=np.asarray(surface, dtype=np.intp),
        node=np.asarray(node, dtype=np.intp),
        first=np.ascontiguousarray(first.reshape(-1, first.shape[-1]).T),
        seldom=seldom,
        near=np.ascontiguousarray(weights),
        pieces=np.ascontiguousarray(pieces),
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
