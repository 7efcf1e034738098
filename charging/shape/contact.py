"""Where shapes touch: the covered part of their faces is cut away from their panels."""

import numpy as np
from numpy.typing import NDArray

from charging.shape.bodies import Outline
from charging.shape.panels import Panels

Array = NDArray[np.float64]

SAME_PLANE_M = 1e-5
"""Faces nearer to each other than this lie on one another."""
_SMALLEST = 1e-9  # of a panel's area; less is rounding


def normal_of(polygon: Array) -> Array:
    """Area vector of a flat polygon [K, 3], twice its area long."""
    x, y, z = (polygon[1:] - polygon[0]).T  # np.cross takes ten times as long
    return np.array(
        [
            (y[:-1] * z[1:] - z[:-1] * y[1:]).sum(),
            (z[:-1] * x[1:] - x[:-1] * z[1:]).sum(),
            (x[:-1] * y[1:] - y[:-1] * x[1:]).sum(),
        ]
    )


def area_of(polygon: Array) -> float:
    """Area of a flat polygon."""
    if len(polygon) < 3:
        return 0.0
    n = normal_of(polygon)
    return 0.5 * float(np.sqrt(n @ n))


def kept_side(polygon: Array, through: Array, outward: Array) -> Array:
    """Part of a convex polygon [K, 3] behind a plane, corners in order."""
    height = (polygon - through) @ outward
    out = []
    for k in range(len(polygon)):
        j = (k + 1) % len(polygon)
        if height[k] <= 0.0:
            out.append(polygon[k])
        if height[k] * height[j] < 0.0:
            share = height[k] / (height[k] - height[j])
            out.append(polygon[k] + share * (polygon[j] - polygon[k]))
    return np.array(out).reshape(-1, 3)


def edges_outward(polygon: Array) -> tuple[Array, Array]:
    """Begins of the edges and their outward directions in the plane, each [K, 3]."""
    n = normal_of(polygon)
    out = np.cross(np.roll(polygon, -1, axis=0) - polygon, n)
    return polygon, out / np.sqrt((out**2).sum(axis=1))[:, None]


def inside(polygon: Array, convex: Array) -> Array:
    """Part of a convex polygon inside another of the same plane; empty if none."""
    for begin, out in zip(*edges_outward(convex), strict=True):
        if len(polygon) < 3:
            return polygon[:0]
        polygon = kept_side(polygon, begin, out)
    return polygon


def outside(polygon: Array, convex: Array) -> list[Array]:
    """Convex parts of a convex polygon outside another of the same plane."""
    parts, least = [], _SMALLEST * area_of(polygon)
    for begin, out in zip(*edges_outward(convex), strict=True):
        beyond = kept_side(polygon, begin, -out)
        if area_of(beyond) > least:
            parts.append(beyond)
        polygon = kept_side(polygon, begin, out)
        if area_of(polygon) <= least:
            break
    return parts


def lies_on(one: Outline, other: Outline) -> bool:
    """Whether two faces look at each other in one plane and overlap."""
    a, b = normal_of(one.corners_m), normal_of(other.corners_m)
    size = np.sqrt((a @ a) * (b @ b))
    if a @ b > -size * (1.0 - 1e-9):
        return False
    unit = a / np.sqrt(a @ a)
    if np.abs((other.corners_m - one.corners_m[0]) @ unit).max() > SAME_PLANE_M:
        return False
    least = 1e-6 * min(area_of(one.corners_m), area_of(other.corners_m))
    return area_of(inside(one.corners_m, other.corners_m[::-1])) > least


def covered_by(panels: Panels, face: int, cover: Outline) -> Panels:
    """Panels of a shape without what a face of another one covers of its face `face`."""
    corners: list[Array] = []
    patch: list[int] = []
    outer = cover.corners_m[::-1]
    hole = None if cover.hole_m is None else cover.hole_m[::-1]
    n = normal_of(outer)
    unit = n / np.sqrt(n @ n)
    for polygon, of in zip(panels.corners_m, panels.patch, strict=True):
        flat = np.abs((polygon - outer[0]) @ unit).max() <= SAME_PLANE_M
        if of != face or not flat or normal_of(polygon[:3]) @ unit <= 0.0:
            corners.append(polygon)
            patch.append(int(of))
            continue
        own = polygon[:3] if np.array_equal(polygon[2], polygon[3]) else polygon
        if area_of(inside(own, outer)) <= _SMALLEST * area_of(own):
            corners.append(polygon)  # untouched panels stay as they are
            patch.append(int(of))
            continue
        parts = outside(own, outer)
        if hole is not None:
            parts.append(inside(own, hole))
        for part in parts:
            for quad in quads(part):
                corners.append(quad)
                patch.append(int(of))
    return Panels(np.array(corners).reshape(-1, 4, 3), np.array(patch, dtype=np.intp))


def quads(polygon: Array) -> list[Array]:
    """Convex polygon as panels of four corners; a triangle repeats its last one."""
    found = []
    for k in range(1, len(polygon) - 1, 2):
        last = min(k + 2, len(polygon) - 1)
        quad = polygon[[0, k, k + 1, last]]
        if area_of(quad) > 0.0:
            found.append(quad)
    return found
