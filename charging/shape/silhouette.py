"""Shadows of convex bodies on planes: the edges of their outlines, for many directions."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from charging.shape.panels import Panels

Array = NDArray[np.float64]

_SHORT_M = 1e-9


@dataclass(frozen=True, slots=True)
class Convex:
    """A convex body as panels, and each edge between two of them once.

    Attributes
    ----------
    panels : Panels
    begin, end : ndarray [E, 3]
        Edges, in the order of the panel on their left.
    left, right : ndarray of int [E]
        Panels on both sides.
    centre_m : ndarray [3]
    radius_m : float
        Of a sphere around the body.
    """

    panels: Panels
    begin: Array
    end: Array
    left: NDArray[np.intp]
    right: NDArray[np.intp]
    centre_m: Array
    radius_m: float


def convex(panels: Panels) -> Convex:
    """Find the edges of a closed convex body.

    Raises
    ------
    ValueError
        The panels are not closed.
    """
    v = panels.corners_m
    following = np.roll(v, -1, axis=1)
    known: dict[tuple[tuple[float, ...], tuple[float, ...]], int] = {}
    begin, end, left, right = [], [], [], []
    for f in range(len(panels)):
        for k in range(4):
            a, b = v[f, k], following[f, k]
            if np.array_equal(a, b):
                continue
            p, q = tuple((np.round(a, 9) + 0.0).tolist()), tuple((np.round(b, 9) + 0.0).tolist())
            partner = known.pop((q, p), None)
            if partner is None:
                known[p, q] = f
            else:
                begin.append(b)
                end.append(a)
                left.append(partner)
                right.append(f)
    if known:
        raise ValueError("the panels of a body are not closed")
    centre = np.mean(begin, axis=0)
    reach = np.sqrt(((v.reshape(-1, 3) - centre) ** 2).sum(axis=1))
    return Convex(
        panels,
        np.array(begin),
        np.array(end),
        np.array(left, dtype=np.intp),
        np.array(right, dtype=np.intp),
        centre,
        float(reach.max()),
    )


def shadow_edges(
    body: Convex, turn: Array, shift: Array, light: Array, plane: tuple[Array, Array, Array]
) -> tuple[Array, Array] | None:
    """Edges of the shadow that a body throws on a plane, [D, E, 2] begins and ends.

    Parameters
    ----------
    body : Convex
    turn, shift : ndarray [D or 1, 3, 3], [D or 1, 3]
        From the body's axes to those of the plane.
    light : ndarray [D, 3]
        Directions towards the source, above the plane.
    plane : (origin [3], normal [3], frame [2, 3])

    Returns
    -------
    tuple or None
        Counter-clockwise edges, those without length last; None if no part of the body is
        above the plane for any direction. What is below the plane throws no shadow.
    """
    origin, normal, frame = plane

    def moved(points: Array) -> Array:
        flat = points.reshape(-1, 3) @ turn.transpose(0, 2, 1) + shift[:, None, :]
        return np.asarray(flat.reshape(-1, *points.shape))

    centre = turn @ body.centre_m + shift
    if ((centre - origin) @ normal < -body.radius_m).all():
        return None
    begin, end = moved(body.begin), moved(body.end)
    low, high = (begin - origin) @ normal, (end - origin) @ normal
    if not (np.maximum(low, high) > _SHORT_M).any():
        return None
    outward = body.panels.normal @ turn.transpose(0, 2, 1)
    facing = (outward * light[:, None, :]).sum(axis=2) > 0.0
    forth = facing[:, body.left] & ~facing[:, body.right]
    back = ~facing[:, body.left] & facing[:, body.right]
    cut = ((low > 0.0) != (high > 0.0)).any()
    swap = back[..., None]
    a, b = np.where(swap, end, begin), np.where(swap, begin, end)
    counts = forth | back
    if cut:
        ha, hb = np.where(back, high, low), np.where(back, low, high)
        a, b = _raised(a, b, ha, hb), _raised(b, a, hb, ha)
        counts &= np.maximum(ha, hb) > 0.0
        panels = moved(body.panels.corners_m)
        panels = np.broadcast_to(panels, (len(light), *panels.shape[1:]))
        ends = _cut_edges(panels, facing, origin, normal)
        a, b = np.concatenate([a, ends[0]], axis=1), np.concatenate([b, ends[1]], axis=1)
        counts = np.concatenate([counts, ends[2]], axis=1)
    fall = light / (light @ normal)[:, None]

    def projected(points: Array) -> Array:
        drop = ((points - origin) @ normal)[..., None] * fall[:, None, :]
        return np.asarray((points - origin - drop) @ frame.T)

    p, q = projected(a), projected(b)
    counts &= ((q - p) ** 2).sum(axis=2) > _SHORT_M**2
    most = max(1, int(counts.sum(axis=1).max()))
    order = np.argsort(~counts, axis=1, kind="stable")[:, :most]
    p = np.take_along_axis(p, order[..., None], axis=1)
    q = np.take_along_axis(q, order[..., None], axis=1)
    return p, np.where(np.take_along_axis(counts, order, axis=1)[..., None], q, p)


def _raised(a: Array, b: Array, ha: Array, hb: Array) -> Array:
    """Point a, or where the way from a to b passes height 0 if a is below it."""
    with np.errstate(divide="ignore", invalid="ignore"):
        t = np.where((ha < 0.0) & (hb > 0.0), ha / (ha - hb), 0.0)
    return np.asarray(a + t[..., None] * (b - a))


def _cut_edges(
    corners: Array, facing: NDArray[np.bool_], origin: Array, normal: Array
) -> tuple[Array, Array, NDArray[np.bool_]]:
    """Where panels that face the light pass through the plane: edges of the shadow there."""
    height = (corners - origin) @ normal
    above = height > 0.0
    then = np.roll(above, -1, axis=2)
    down, up = above & ~then, ~above & then
    following, further = np.roll(corners, -1, axis=2), np.roll(height, -1, axis=2)
    with np.errstate(divide="ignore", invalid="ignore"):
        t = np.where(down | up, height / (height - further), 0.0)
    at = corners + t[..., None] * (following - corners)

    def only(which: NDArray[np.bool_]) -> Array:
        return np.asarray((at * which[..., None]).sum(axis=2))

    counts = facing & down.any(axis=2) & up.any(axis=2)
    return only(down), only(up), counts
