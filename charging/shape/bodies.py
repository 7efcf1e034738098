"""Shapes of a case as panels in body axes, at any angle of the wings."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from charging.case_shape import Shape
from charging.shape.panels import Panels
from charging.shape.revolve import box, equal_area_radius, graded, revolved

Array = NDArray[np.float64]

FEWEST_SECTORS, MOST_SECTORS = 16, 40
FEWEST_RINGS = 3


@dataclass(frozen=True, slots=True)
class Outline:
    """A flat face: its corners [K, 3], counter-clockwise from outside, and those of a hole.

    face : int, number of the face in its shape.
    """

    face: int
    corners_m: Array
    hole_m: Array | None = None


def rotation(shape: Shape, angle_rad: float) -> Array:
    """Own axes of a shape as columns in body axes [3, 3]; `angle_rad` is that of the wings.

    At angle 0 the front of a wing looks along body +z, at 90 degrees along +x.
    """
    if shape.tracks_sun:
        c, s = np.cos(angle_rad), np.sin(angle_rad)
        return np.array([[c, 0.0, s], [0.0, 1.0, 0.0], [-s, 0.0, c]])
    z = np.array(shape.axis if shape.axis is not None else (0.0, 0.0, 1.0))
    near = np.array(shape.along if shape.along is not None else (1.0, 0.0, 0.0))
    x = near - (near @ z) * z
    if np.sqrt(x @ x) < 1e-6:
        near = np.array([0.0, 1.0, 0.0])
        x = near - (near @ z) * z
    x /= np.sqrt(x @ x)
    return np.stack([x, np.cross(z, x), z], axis=1)


def placed(points_m: Array, shape: Shape, angle_rad: float) -> Array:
    """Points [..., 3] from a shape's own axes to body axes."""
    return np.asarray(points_m @ rotation(shape, angle_rad).T + np.array(shape.center_m))


def own_panels(shape: Shape, step_m: float, *, coarse: bool = False) -> Panels:
    """Panels of a shape in its own axes; patches by its faces.

    Parameters
    ----------
    shape : Shape
    step_m : float
        Wished size of a panel.
    coarse : bool, optional
        Flat faces are left whole (in sectors, where round); curved ones are as in the mesh.
    """
    match shape.kind:
        case "block" | "panel":
            return _box(shape, step_m, coarse)
        case "ball":
            return _ball(shape, step_m)
        case _:
            n = sectors(shape, step_m)
            return revolved(_profile(shape, step_m, n, coarse), n)


def sectors(shape: Shape, step_m: float) -> int:
    """Flat parts of a turn, a multiple of four."""
    assert shape.radius_m is not None
    wished = 2.0 * np.pi * shape.radius_m / step_m
    return int(np.clip(4 * round(wished / 4), FEWEST_SECTORS, MOST_SECTORS))


def _box(shape: Shape, step_m: float, coarse: bool) -> Panels:
    assert shape.size_m is not None
    size: Sequence[float] = shape.size_m
    if shape.kind == "panel":
        assert shape.thickness_m is not None
        size = (*shape.size_m, shape.thickness_m)
    panels = box(size, 1e9 if coarse else step_m, 1 if coarse else 2)
    if shape.kind == "block":
        return panels
    to_panel = np.array([2, 2, 2, 2, 0, 1])  # +x, -x, +y, -y are the edge; +z front; -z back
    return Panels(panels.corners_m, to_panel[panels.patch])


def _ball(shape: Shape, step_m: float) -> Panels:
    r = shape.radius_m
    assert r is not None
    cap = shape.cap_half_angle_deg
    rings = int(np.clip(round(np.pi * r / step_m), 8, 60))
    if cap is None:
        polar = np.linspace(np.pi, 0.0, rings + 1)
        split = rings
    else:
        c = np.radians(cap)
        inner = max(FEWEST_RINGS, round(rings * cap / 180.0))
        outer = max(FEWEST_RINGS, round(rings * (1.0 - cap / 180.0)))
        quarter = np.linspace(0.0, 0.5 * np.pi, inner + 1)
        rest = np.linspace(0.0, 0.5 * np.pi, outer + 1)
        polar = np.concatenate(
            [(c + (np.pi - c) * (1.0 - np.cos(rest)))[::-1], (c * np.sin(quarter))[::-1][1:]]
        )
        split = outer
    radius = np.sin(polar)
    radius[[0, -1]] = 0.0
    height = np.cos(polar)
    n = int(np.clip(4 * round(2.0 * np.pi * r / step_m / 4), FEWEST_SECTORS, 2 * MOST_SECTORS))
    pieces = [(radius[: split + 1], height[: split + 1], 0)]
    if split < rings or cap is not None:
        pieces.append((radius[split:], height[split:], 1))
    panels = revolved(pieces, n)
    widen = r * np.sqrt(4.0 * np.pi / panels.area_m2.sum())  # the area of the ball itself
    return Panels(panels.corners_m * widen, panels.patch)


def _profile(
    shape: Shape, step_m: float, n: int, coarse: bool
) -> Sequence[tuple[Array, Array, int]]:
    """Pieces of the profile, from the axis below around the outside to the axis above."""
    assert shape.radius_m is not None
    wide = equal_area_radius(n)
    r = shape.radius_m * wide

    def cut(length: float, least: int = 1) -> Array:
        return graded(1 if coarse else max(least, round(length / step_m)))

    def flat(inner: float, outer: float, height: float) -> tuple[Array, Array]:
        """From the inside outwards, finer towards an edge."""
        parts = 1 if coarse else max(2, round((outer - inner) / step_m))
        if inner == 0.0:
            x = np.sin(0.5 * np.pi * np.linspace(0.0, 1.0, parts + 1))
            return outer * x, np.full(parts + 1, height)
        return inner + (outer - inner) * graded(parts), np.full(parts + 1, height)

    def wall(radius: float, low: float, high: float) -> tuple[Array, Array]:
        x = cut(high - low)
        return np.full(len(x), radius), low + (high - low) * x

    match shape.kind:
        case "tube":
            assert shape.length_m is not None
            h = 0.5 * shape.length_m
            below, above = flat(0.0, r, -h), flat(0.0, r, h)
            return (
                (*below, 0),
                (*wall(r, -h, h), 1),
                (above[0][::-1], above[1], 2),
            )
        case "ring plate":
            assert shape.thickness_m is not None
            assert shape.inner_radius_m is not None
            h, inner = 0.5 * shape.thickness_m, shape.inner_radius_m * wide
            below, above = flat(inner, r, -h), flat(inner, r, h)
            hole = wall(inner, -h, h)
            return (
                (*below, 0),
                (*wall(r, -h, h), 1),
                (above[0][::-1], above[1], 2),
                (hole[0], hole[1][::-1], 3),
            )
        case _:
            assert shape.thickness_m is not None
            assert shape.depth_m is not None
            t, depth = shape.thickness_m, shape.depth_m
            rings = max(FEWEST_RINGS, round(shape.radius_m / step_m))
            x = np.sin(0.5 * np.pi * np.linspace(0.0, 1.0, rings + 1))
            return (
                (r * x, depth * x**2 - t, 0),
                (*wall(r, depth - t, depth), 1),
                ((r * x)[::-1], (depth * x**2)[::-1], 2),
            )


def outlines(shape: Shape, step_m: float, angle_rad: float) -> list[Outline]:
    """Flat faces of a shape in body axes; those of a round one as polygons of its mesh."""
    coarse = own_panels(shape, step_m, coarse=True)
    if shape.kind in ("block", "panel"):
        corners = placed(coarse.corners_m, shape, angle_rad)
        return [Outline(int(f), c) for f, c in zip(coarse.patch, corners, strict=True)]
    if shape.kind not in ("tube", "ring plate"):
        return []
    n = sectors(shape, step_m)
    assert shape.radius_m is not None
    turn = 2.0 * np.pi * np.arange(n) / n
    circle = equal_area_radius(n) * np.stack([np.cos(turn), np.sin(turn), 0.0 * turn], axis=1)
    h = 0.5 * (shape.length_m if shape.kind == "tube" else shape.thickness_m or 0.0)  # type: ignore[operator]
    found = []
    for face, sign in ((0, -1.0), (2, 1.0)):
        up = np.array([0.0, 0.0, sign * h])
        order = slice(None) if sign > 0.0 else slice(None, None, -1)
        outer = placed(shape.radius_m * circle + up, shape, angle_rad)[order]
        hole = None
        if shape.inner_radius_m is not None:
            hole = placed(shape.inner_radius_m * circle + up, shape, angle_rad)[order]
        found.append(Outline(face, outer, hole))
    return found
