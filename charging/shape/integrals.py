"""Exact integrals of 1/r over flat panels: potential of a uniform charge, and solid angle."""

import numpy as np
from numpy.typing import NDArray

from charging.shape.panels import Panels

Array = NDArray[np.float64]

BLOCK = 40_000
"""Pairs of point and panel that are worked on at a time: they stay in a core's cache."""


def panel_integrals(points_m: Array, panels: Panels) -> tuple[Array, Array]:
    r"""Integrals over every panel seen from every point.

    With d the height of the point above the plane of a panel, :math:`p_i` the distance of its
    foot from edge i (positive inside), :math:`R_i` the distances of the corners and
    :math:`L_i` the lengths of the edges,

    .. math::
        \int \frac{dA}{r} = \sum_i p_i \ln\frac{R_i + R_{i+1} + L_i}{R_i + R_{i+1} - L_i}
        - d\,\Omega, \qquad \Omega = \int \frac{d}{r^3} dA ,

    and :math:`\Omega` is the solid angle by :math:`\tan(\Omega/2)` of two triangles.

    Parameters
    ----------
    points_m : ndarray [P, 3]
    panels : Panels, N of them

    Returns
    -------
    ndarray [P, N], ndarray [P, N]
        :math:`\int dA/r` [m], and the solid angle [sr], positive on the side of the normal.
        On the panel itself the solid angle is that of its outer side, 2 pi.

    Notes
    -----
    Exact for flat convex panels, without a distinction of near and far; the points must not
    lie on an edge.

    References
    ----------
    Hess & Smith (1967), Prog. Aerosp. Sci. 8, 1 (potential of a flat quadrilateral, in this
    form of the logarithm); Van Oosterom & Strackee (1983), IEEE Trans. Biomed. Eng. 30, 125
    (solid angle). Both from memory; tests compare with numerical integrals.

    Examples
    --------
    >>> square = Panels(np.array([[[0.0, 0, 0], [1, 0, 0], [1, 1, 0], [0, 1, 0]]]), np.array([0]))
    >>> potential, angle = panel_integrals(np.array([[0.5, 0.5, 0.5]]), square)
    >>> round(float(angle[0, 0] / (4 * np.pi)), 12)  # a sixth: a side of a cube from its centre
    0.166666666667
    """
    v = panels.corners_m
    n = panels.normal
    edge = np.roll(v, -1, axis=1) - v
    length = np.sqrt((edge**2).sum(axis=2))
    some = length > 0.0
    outward = np.cross(edge, n[:, None, :]) / np.where(some, length, 1.0)[..., None]
    inner = (outward * v).sum(axis=2)  # p = inner - outward · point
    base = (n * v[:, 0]).sum(axis=1)
    twice = panels.twice_area_m2
    diagonal2 = ((v[:, 2] - v[:, 0]) ** 2).sum(axis=1)
    shape = (len(points_m), len(panels))
    potential, angle = np.empty(shape), np.empty(shape)
    rows = max(1, BLOCK // max(1, len(panels)))
    flat = outward.reshape(-1, 3).T
    for first in range(0, len(points_m), rows):
        x = points_m[first : first + rows]
        here = slice(first, first + len(x))
        d = x @ n.T - base
        p = inner - (x @ flat).reshape(len(x), -1, 4)
        r = [
            np.sqrt(
                (x[:, 0:1] - v[:, k, 0]) ** 2
                + (x[:, 1:2] - v[:, k, 1]) ** 2
                + (x[:, 2:3] - v[:, k, 2]) ** 2
            )
            for k in range(4)
        ]
        total = np.zeros_like(d)
        for k in range(4):
            if not some[:, k].any():
                continue
            both = r[k] + r[(k + 1) % 4]
            near = both - length[:, k]
            total += p[:, :, k] * np.log((both + length[:, k]) / np.where(near > 0.0, near, 1e-300))
        s01, s12 = length[:, 0] ** 2, length[:, 1] ** 2
        s23, s30 = length[:, 2] ** 2, length[:, 3] ** 2
        omega = _triangle(d, twice[:, 0], r[0], r[1], r[2], s01, s12, diagonal2)
        if twice[:, 1].any():
            omega += _triangle(d, twice[:, 1], r[0], r[2], r[3], diagonal2, s23, s30)
        angle[here] = omega
        potential[here] = total - d * omega
    return potential, angle


def _triangle(
    d: Array, twice: Array, a: Array, b: Array, c: Array, ab2: Array, bc2: Array, ca2: Array
) -> Array:
    """Solid angle of a triangle by distances of its corners and squares of its edges."""
    a2, b2, c2 = a * a, b * b, c * c
    below = a * b * c + 0.5 * ((a2 + b2 - ab2) * c + (b2 + c2 - bc2) * a + (c2 + a2 - ca2) * b)
    angle: Array = 2.0 * np.arctan2(twice * d, below)
    return angle
