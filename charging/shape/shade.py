"""Area that convex shadows cover of a convex face, exactly, for many directions at once."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

_WIDER = 1e-7
"""Shadows are widened by parts of this, all by different ones, so that no two edges coincide."""


def covered_area(face: Array, shadows: Sequence[tuple[Array, Array]]) -> Array:
    r"""Area of a polygon that lies under a union of convex shadows.

    The border of the covered part consists of the pieces of the shadows' edges that are inside
    the face and outside all other shadows, and of the pieces of the face's edges under a
    shadow; each edge meets a convex polygon in one interval, so the pieces are known exactly,
    and :math:`A = \tfrac12 \oint x\,dy - y\,dx` along them.

    Parameters
    ----------
    face : ndarray [V, 2]
        Convex, counter-clockwise.
    shadows : sequence of (begin, end), ndarray [D, E, 2] each
        At least one; edges of a convex shadow, counter-clockwise but in any order. An edge
        whose ends coincide does not count, nor does a shadow of such edges alone.

    Returns
    -------
    ndarray [D]

    Notes
    -----
    Exact but for a widening of 1e-7 of a shadow's size.

    Examples
    --------
    >>> square = np.array([[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]])
    >>> two = [square[None] + 0.5, square[None] + (0.5, 0.0)]
    >>> edges = [(one, np.roll(one, -1, axis=1)) for one in two]
    >>> round(float(covered_area(square, edges)[0]), 6)
    0.5
    """
    d = len(shadows[0][0])
    about = face.mean(axis=0)
    face = face - about
    wide = [_widened(p - about, q - about, k) for k, (p, q) in enumerate(shadows)]
    there = [(p != q).any(axis=(1, 2)) for p, q in wide]
    a = np.concatenate([p for p, _ in wide], axis=1)
    b = np.concatenate([q for _, q in wide], axis=1)
    own = np.concatenate([np.full(p.shape[1], k) for k, (p, _) in enumerate(wide)])
    corners = np.broadcast_to(face, (d, *face.shape))
    following = np.broadcast_to(np.roll(face, -1, axis=0), corners.shape)
    first, last = _within(a, b, corners, following)
    low, high = np.empty((2, *first.shape, len(wide)))
    for k, (p, q) in enumerate(wide):
        low[..., k], high[..., k] = _within(a, b, p, q)
        high[:, own == k, k] = -1.0
        high[~there[k], :, k] = -1.0
    free = np.maximum(last - first, 0.0) - _union(low, high, first, last)
    area = (_cross(a, b) * free).sum(axis=1)
    low, high = np.empty((2, d, len(face), len(wide)))
    for k, (p, q) in enumerate(wide):
        low[..., k], high[..., k] = _within(corners, following, p, q)
        high[~there[k], :, k] = -1.0
    zero = np.zeros((d, len(face)))
    under = _union(low, high, zero, zero + 1.0)
    return np.asarray(0.5 * (area + (_cross(corners, following) * under).sum(axis=1)))


def _widened(begin: Array, end: Array, number: int) -> tuple[Array, Array]:
    real = (begin != end).any(axis=2, keepdims=True)
    count = np.maximum(real.sum(axis=1, keepdims=True), 1)
    middle = (begin * real).sum(axis=1, keepdims=True) / count
    growth = 1.0 + _WIDER * (0.5 + 0.5 * (((number + 1) * 0.6180339887) % 1.0))
    return middle + (begin - middle) * growth, middle + (end - middle) * growth


def _cross(a: Array, b: Array) -> Array:
    return np.asarray(a[..., 0] * b[..., 1] - a[..., 1] * b[..., 0])


def _within(a: Array, b: Array, left: Array, right: Array) -> tuple[Array, Array]:
    """Interval of each segment [D, M] inside a convex polygon of edges [D, E]."""
    low, high = np.zeros(a.shape[:2]), np.ones(a.shape[:2])
    ax, ay = a[..., 0], a[..., 1]
    dx, dy = b[..., 0] - ax, b[..., 1] - ay
    for k in range(left.shape[1]):
        at, way = left[:, k : k + 1], right[:, k : k + 1] - left[:, k : k + 1]
        wx, wy = way[..., 0], way[..., 1]
        before = wx * ay - wy * ax - (wx * at[..., 1] - wy * at[..., 0])
        change = wx * dy - wy * dx
        with np.errstate(divide="ignore", invalid="ignore"):
            t = -before / change
        np.maximum(low, np.where(change > 0.0, t, -np.inf), out=low)
        np.minimum(high, np.where(change < 0.0, t, np.inf), out=high)
        high[(change == 0.0) & (before < 0.0)] = -1.0
    return low, high


def _union(low: Array, high: Array, first: Array, last: Array) -> Array:
    """Length of the union of intervals [..., J] within [first, last]."""
    low = np.maximum(low, first[..., None])
    high = np.minimum(high, last[..., None])
    empty = high <= low
    low = np.where(empty, np.inf, low)
    high = np.where(empty, -np.inf, high)
    order = np.argsort(low, axis=-1)
    low, high = np.take_along_axis(low, order, -1), np.take_along_axis(high, order, -1)
    reached = np.maximum.accumulate(high, axis=-1)
    before = np.concatenate([np.full((*low.shape[:-1], 1), -np.inf), reached[..., :-1]], axis=-1)
    return np.asarray(np.maximum(high - np.maximum(low, before), 0.0).sum(axis=-1))
