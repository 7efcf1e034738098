r"""The field of a sphere whose surfaces are caps: weights along each patch's normal.

Laplace's equation is linear, so the potential on the normal of patch i is
:math:`\Phi_i(r) = \sum_j w_j(r) V_j` with weights of the geometry alone. Every surface
is a cap around its normal with its own area; what is left of the sphere is structure.
On the axis only the share of each circle that a cap covers matters, and the circle of
polar angle θ about the axis counts with the kernel of Poisson's integral, here in units
of the radius,

.. math:: k(x,\theta) = \frac{(x^2-1)\sin\theta}{2(1+x^2-2x\cos\theta)^{3/2}},

whose integral over a cap is closed: (x+1)/(2x) − (x²−1)/(2xD), D² = (x−1)² + 4x sin²(α/2).
So the own cap is exact and the others are one smooth integral over θ: none of the ringing
of a truncated series, no weight below zero, and their sum is R/r.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.polynomial.legendre import leggauss
from numpy.typing import NDArray

Array = NDArray[np.float64]
Index = NDArray[np.intp]

WIDEST_PANEL = 1.4  # ratio of the angles at the ends of a panel, for the kernel's sake
PANEL_POINTS = 10


@dataclass(frozen=True, slots=True)
class Patch:
    """A surface on the sphere: unit outward normal, area [m2] and its node in the network."""

    normal: tuple[float, float, float]
    area_m2: float
    node: int


@dataclass(frozen=True, slots=True)
class _Group:
    """Caps of about the same direction, mixed by area: direction, area [2πR²], node shares."""

    direction: Array
    size: float
    patches: tuple[int, ...]


def cap_weight(x: Array, half_angle: Array | float) -> Array:
    """Potential at x = r/R on the axis of a cap at 1 on a sphere otherwise at 0."""
    d = np.hypot(x - 1.0, 2.0 * np.sqrt(x) * np.sin(np.asarray(half_angle) / 2.0))
    return np.asarray((x + 1.0) / (2.0 * x) - (x * x - 1.0) / (2.0 * x * d))


def sphere_weights(
    patches: Sequence[Patch], radius_m: float, nodes: int, x: Array, structure: int = 0
) -> Array:
    r"""Weights of all node potentials along the normals of patches on a sphere.

    Parameters
    ----------
    patches : sequence of Patch, length P
    radius_m : float
        Radius of the sphere [m].
    nodes : int
        Number of nodes n.
    x : ndarray [K]
        Distances from the centre over the radius, all > 1.
    structure : int, optional
        Node of what no cap covers.

    Returns
    -------
    ndarray [P, K, n]
        Never negative; they add to R/r.

    Notes
    -----
    Seen from its own axis a patch is its own cap, whole. Caps whose centre lies in the
    cap of a larger one stand for one place (a panel and an antenna on it): the others of
    the group are mixed by area around the own cap, so that their area is kept. Where
    other groups overlap they share, and what reaches under the own cap is hidden. Areas
    that exceed the sphere are reduced in proportion.
    """
    sizes = _sizes(patches, radius_m)
    groups = _groups(patches, sizes)
    return np.stack(
        [_along(i, patches, sizes, groups, nodes, x, structure) for i in range(len(patches))]
    )


def _sizes(patches: Sequence[Patch], radius_m: float) -> Array:
    """1 − cos of each half-angle: areas over 2πR², at most 2 together."""
    sizes = np.array([p.area_m2 for p in patches]) / (2.0 * np.pi * radius_m**2)
    return np.asarray(sizes * min(1.0, 2.0 / sizes.sum()))


def _half_angle(size: Array | float) -> Array:
    return 2.0 * np.arcsin(np.sqrt(np.clip(np.asarray(size) / 2.0, 0.0, 1.0)))


def _angle(a: Array, b: Array) -> float:
    return float(2.0 * np.arctan2(np.linalg.norm(a - b), np.linalg.norm(a + b)))


def _groups(patches: Sequence[Patch], sizes: Array) -> list[_Group]:
    """Merge caps whose centre lies in the cap of a larger group, largest first."""
    normals = np.array([p.normal for p in patches])
    normals = normals / np.linalg.norm(normals, axis=1, keepdims=True)
    order = sorted(range(len(patches)), key=lambda i: (-sizes[i], *normals[i]))
    groups: list[_Group] = []
    for i in order:
        for k, group in enumerate(groups):
            if _angle(normals[i], group.direction) < float(_half_angle(group.size)):
                mean = group.size * group.direction + sizes[i] * normals[i]
                members = (*group.patches, i)
                size = float(group.size + sizes[i])
                groups[k] = _Group(mean / np.linalg.norm(mean), size, members)
                break
        else:
            groups.append(_Group(normals[i], float(sizes[i]), (i,)))
    return groups


def _along(
    i: int,
    patches: Sequence[Patch],
    sizes: Array,
    groups: Sequence[_Group],
    nodes: int,
    x: Array,
    structure: int,
) -> Array:
    """Weights [K, n] along the axis of patch i."""
    axis = np.array(patches[i].normal)
    axis = axis / np.linalg.norm(axis)
    own = float(_half_angle(sizes[i]))
    angle = np.array([_angle(axis, g.direction) for g in groups])
    half = np.array([float(_half_angle(g.size)) for g in groups])
    share = np.zeros((len(groups), nodes))
    for k, g in enumerate(groups):
        rest = [j for j in g.patches if j != i]
        if i in g.patches:
            size = float(sizes[rest].sum())
            half[k] = _around(size, float(angle[k]), own) if rest else 0.0
        total = sizes[rest].sum()
        for j in rest:
            share[k, patches[j].node] += sizes[j] / total
    theta, weight = _circles(x, own, angle, half)
    cover = _cover(theta, groups, axis, angle, half)  # [T, G], at most 1 together
    ring = weight @ cover
    found = ring @ share
    found[:, patches[i].node] += cap_weight(x, own)
    found[:, structure] += weight @ (1.0 - cover.sum(axis=1))
    return np.asarray(found)


def _around(size: float, angle: float, own: float) -> float:
    """Half-angle of a cap at `angle` from the axis with `size` outside the own cap."""
    if angle < 1e-6:
        return float(_half_angle(min(2.0, size + 2.0 * np.sin(own / 2.0) ** 2)))
    low, high = 0.0, np.pi
    x, w = leggauss(100)
    theta = own + (np.pi - own) * (1.0 + x) / 2.0
    w = w * (np.pi - own) / 2.0 * np.sin(theta) / np.pi
    for _ in range(60):
        middle = 0.5 * (low + high)
        outside = float((w * _arc(theta, angle, middle)).sum())
        low, high = (middle, high) if outside < size else (low, middle)
    return 0.5 * (low + high)


def _arc(theta: Array, angle: Array | float, half: Array | float) -> Array:
    """Half the azimuth [rad] that a cap covers on circles of polar angle theta."""
    top = np.cos(half) - np.cos(theta) * np.cos(angle)
    under = np.sin(theta) * np.sin(angle)
    q = np.divide(top, under, out=np.sign(top) * np.inf, where=under > 1e-9)
    return np.asarray(np.arccos(np.clip(q, -1.0, 1.0)))


def _circles(x: Array, own: float, angle: Array, half: Array) -> tuple[Array, Array]:
    """Polar angles [T] outside the own cap and their weights [K, T] on the axis.

    Panels end where a cap begins or ends, with points crowded there because arcs start
    as square roots; the weights of a panel add to its closed form.
    """
    marks = np.concatenate([np.abs(angle - half), angle + half, [np.pi]])
    marks = np.where(marks > np.pi, 2.0 * np.pi - marks, marks)
    edges = np.unique(np.concatenate([[own], marks[marks > own]]))
    edges = edges[np.concatenate([[True], np.diff(edges) > 1e-7])]
    fine: list[float] = [float(edges[0])]
    for end in edges[1:]:
        ratio = end / max(fine[-1], 1e-9)
        parts = int(np.ceil(np.log(ratio) / np.log(WIDEST_PANEL))) if ratio > 1.0 else 1
        fine += np.geomspace(fine[-1], end, parts + 1)[1:].tolist()
    low, high = np.array(fine[:-1])[:, None], np.array(fine[1:])[:, None]
    g, w = leggauss(PANEL_POINTS)
    share = np.sin(np.pi / 4.0 * (1.0 + g)) ** 2
    theta = low + (high - low) * share
    measure = (high - low) * w * np.pi / 4.0 * np.sin(np.pi / 2.0 * (1.0 + g))
    d = np.hypot(x[:, None, None] - 1.0, 2.0 * np.sqrt(x[:, None, None]) * np.sin(theta / 2.0))
    weight = measure * np.sin(theta) / d**3  # (x² − 1)/2 comes with the closed form
    closed = cap_weight(x[:, None], high[:, 0]) - cap_weight(x[:, None], low[:, 0])
    weight = weight * (closed / weight.sum(axis=-1))[..., None]
    return theta.ravel(), weight.reshape(len(x), -1)


def _cover(theta: Array, groups: Sequence[_Group], axis: Array, angle: Array, half: Array) -> Array:
    """Share [T, G] of each circle that a group covers, overlaps shared evenly."""
    arcs = np.where(half > 0.0, _arc(theta[:, None], angle, half), 0.0)
    first = np.array([1.0, 0.0, 0.0]) if abs(axis[0]) < 0.9 else np.array([0.0, 1.0, 0.0])
    e1 = np.cross(axis, first)
    e1 = e1 / np.linalg.norm(e1)
    e2 = np.cross(axis, e1)
    azimuth = np.array([np.arctan2(g.direction @ e2, g.direction @ e1) for g in groups])
    ends = np.concatenate([azimuth - arcs, azimuth + arcs, np.zeros((len(theta), 1))], axis=1)
    ends = np.sort(np.mod(ends, 2.0 * np.pi), axis=1)
    ends = np.concatenate([ends, np.full((len(theta), 1), 2.0 * np.pi)], axis=1)
    length, middle = np.diff(ends, axis=1), (ends[:, 1:] + ends[:, :-1]) / 2.0
    away = np.abs(np.mod(middle[..., None] - azimuth + np.pi, 2.0 * np.pi) - np.pi)
    inside = away < arcs[:, None, :]  # [T, segments, G]
    count = np.maximum(inside.sum(axis=-1, keepdims=True), 1)
    found: Array = (length[..., None] * inside / count).sum(axis=1) / (2.0 * np.pi)
    return found
