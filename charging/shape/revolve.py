"""Panels of the shapes in their own axes: boxes, and bodies of revolution about z."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from charging.shape.panels import Panels

Array = NDArray[np.float64]

GRADING = 0.6
"""Panels shrink towards edges, where charge crowds: the last one is 0.4 of the mean."""

ACROSS = (
    ("+x", 0, 1.0),
    ("-x", 0, -1.0),
    ("+y", 1, 1.0),
    ("-y", 1, -1.0),
    ("+z", 2, 1.0),
    ("-z", 2, -1.0),
)
"""Faces of a box: name, axis of the normal, its sign."""


def graded(parts: int, grading: float = GRADING) -> Array:
    """Edges of `parts` intervals of 0…1, the outer ones smaller.

    Examples
    --------
    >>> graded(2).tolist()
    [0.0, 0.5, 1.0]
    """
    x = np.linspace(0.0, 1.0, parts + 1)
    graded_x = x - grading * np.sin(2.0 * np.pi * x) / (2.0 * np.pi)
    graded_x[[0, -1]] = 0.0, 1.0
    return np.asarray(graded_x)


def box(size_m: Sequence[float], step_m: float, least: int = 2) -> Panels:
    """Panels of a box about the origin; patches 0…5 in the order of `ACROSS`.

    `step_m` is the wished size of a panel; a side shorter than a tenth of its neighbours is an
    edge of a plate and is not divided across.
    """
    size = np.asarray(size_m, dtype=np.float64)
    cuts = []
    for length in size:
        parts = max(least, round(length / step_m))
        if length < 0.1 * size.max() and length < step_m:
            parts = 1
        cuts.append(length * (graded(parts) - 0.5))
    corners, patch = [], []
    for face, (_, axis, sign) in enumerate(ACROSS):
        u, w = (axis + 1) % 3, (axis + 2) % 3
        a, b = cuts[u], cuts[w]
        quads = np.empty((len(a) - 1, len(b) - 1, 4, 3))
        quads[..., axis] = 0.5 * sign * size[axis]
        for k, (i, j) in enumerate(((0, 0), (1, 0), (1, 1), (0, 1))):
            quads[:, :, k, u] = a[i : len(a) - 1 + i, None]
            quads[:, :, k, w] = b[None, j : len(b) - 1 + j]
        if sign < 0.0:
            quads = quads[:, :, ::-1]
        corners.append(quads.reshape(-1, 4, 3))
        patch.append(np.full(len(corners[-1]), face))
    return Panels(np.concatenate(corners), np.concatenate(patch))


def revolved(profile: Sequence[tuple[Array, Array, int]], sectors: int) -> Panels:
    """Panels of a body of revolution about z from pieces of its profile.

    Parameters
    ----------
    profile : sequence of (radius, height, patch)
        Points [K] of every piece in order; the body lies to the left of the way, so that the
        outside is on the right: up along the outer wall, inwards over the top.
    sectors : int
        Flat parts of a turn.

    Notes
    -----
    Radii are of the corners: a circle of radius r becomes a polygon inside it; callers widen
    it where areas matter. A piece that ends on the axis ends in triangles.
    """
    turn = 2.0 * np.pi * np.arange(sectors + 1) / sectors
    cos, sin = np.cos(turn), np.sin(turn)
    cos[-1], sin[-1] = cos[0], sin[0]
    corners, patch = [], []
    for radius, height, number in profile:
        for k in range(len(radius) - 1):
            r0, r1, z0, z1 = radius[k], radius[k + 1], height[k], height[k + 1]
            low = np.stack([r0 * cos, r0 * sin, np.full(sectors + 1, z0)], axis=1)
            high = np.stack([r1 * cos, r1 * sin, np.full(sectors + 1, z1)], axis=1)
            a, b = low[:-1], low[1:]
            c, d = high[1:], high[:-1]
            if r1 == 0.0:
                quads = np.stack([a, b, c, c], axis=1)
            elif r0 == 0.0:
                quads = np.stack([a, c, d, d], axis=1)
            else:
                quads = np.stack([a, b, c, d], axis=1)
            corners.append(quads)
            patch.append(np.full(sectors, number))
    return Panels(np.concatenate(corners), np.concatenate(patch))


def equal_area_radius(sectors: int) -> float:
    """Radius of the corners of a regular polygon with the area of the unit circle.

    Examples
    --------
    >>> round(equal_area_radius(24), 4)
    1.0057
    """
    x = 2.0 * np.pi / sectors
    return float(np.sqrt(x / np.sin(x)))
