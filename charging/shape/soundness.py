"""Faults of shapes: bodies that overlap, hang loose, or leave a surface without area."""

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from charging.case_shape import Shape
from charging.errors import Problem
from charging.shape.bodies import own_panels, placed
from charging.shape.craft import Craft, contacts, patches, shape_panels, step_m
from charging.shape.integrals import panel_integrals
from charging.shape.panels import Panels

Array = NDArray[np.float64]

DEEP = 1e-4
"""A point this far inside another shape, as a share of a panel's size, overlaps it."""
JOINT_M = 1e-3
"""Shapes nearer to each other than this hang together."""
SMALLEST_SHARE = 1e-6
"""A surface with less of the whole area has none."""


def craft_problems(craft: Craft) -> Iterator[Problem]:
    """Yield faults by the name of the shape or surface concerned."""
    seen: set[tuple[int, int]] = set()
    for angle in craft.angles_rad:
        for i, j in _overlaps(craft, angle):
            if (i, j) in seen:
                continue
            seen.add((i, j))
            turned = f" with the wings at {np.degrees(angle):.0f} deg" if craft.turns else ""
            yield Problem(
                ("shape", j, "name"),
                f'overlaps shape "{craft.shapes[i].name}"{turned}',
                value=craft.shapes[j].name,
                allowed="shapes may touch, not share space",
            )
    if seen:
        return
    yield from _loose(craft)
    found = patches(craft)
    whole = sum(one.area_m2 for one in found)
    for k, one in enumerate(found[:-1]):
        if one.area_m2 < SMALLEST_SHARE * whole:
            faces = craft.faces[k]
            yield Problem(
                ("surface", k, "face"),
                "has no area: other shapes cover it",
                value=faces[0] if len(faces) == 1 else list(faces),
            )


def _whole(shape: Shape, step: float, angle: float) -> Panels:
    """Closed panels of one shape in body axes, nothing cut away."""
    own = own_panels(shape, step, coarse=True)
    return Panels(placed(own.corners_m, shape, angle), own.patch)


def _overlaps(craft: Craft, angle: float) -> Iterator[tuple[int, int]]:
    step = step_m(craft)
    closed = [_whole(shape, step, angle) for shape in craft.shapes]
    fine = [own_panels(shape, step) for shape in craft.shapes]
    probes = []
    for shape, own in zip(craft.shapes, fine, strict=True):
        least = min(step, *(m for m in _measures(shape)))
        inward = own.centre_m - DEEP * least * own.normal
        probes.append(placed(inward, shape, angle))
    for i in range(len(closed)):
        for j in range(i + 1, len(closed)):
            if _apart(closed[i], closed[j]):
                continue
            if (
                _inside(probes[i], closed[j])
                or _inside(probes[j], closed[i])
                or _crosses(closed[i], closed[j])
                or _crosses(closed[j], closed[i])
            ):
                yield i, j


def _measures(shape: Shape) -> tuple[float, ...]:
    given = (shape.thickness_m, shape.radius_m, shape.length_m, shape.depth_m)
    return (*(m for m in given if m is not None), *(shape.size_m or ()))


def _apart(one: Panels, other: Panels) -> bool:
    a, b = one.corners_m.reshape(-1, 3), other.corners_m.reshape(-1, 3)
    return bool(((a.min(axis=0) > b.max(axis=0)) | (b.min(axis=0) > a.max(axis=0))).any())


def _inside(points: Array, closed: Panels) -> bool:
    """Whether any point lies inside: there the solid angles add to -4 pi."""
    angle = panel_integrals(points, closed)[1].sum(axis=1)
    return bool((angle < -2.0 * np.pi).any())


def _crosses(edges_of: Panels, faces_of: Panels) -> bool:
    """Whether an edge of one body passes through the inner part of a panel of another."""
    p = edges_of.corners_m.reshape(-1, 3)
    q = np.roll(edges_of.corners_m, -1, axis=1).reshape(-1, 3)
    v, n = faces_of.corners_m, faces_of.normal
    small = 1e-6 * float(np.ptp(np.concatenate([p, v.reshape(-1, 3)]), axis=0).max())
    base = (n * v[:, 0]).sum(axis=1)
    hp, hq = p @ n.T - base, q @ n.T - base
    across = ((hp > small) & (hq < -small)) | ((hp < -small) & (hq > small))
    k, f = np.nonzero(across)
    if not k.size:
        return False
    share = hp[k, f] / (hp[k, f] - hq[k, f])
    at = p[k] + share[:, None] * (q - p)[k]
    edge = np.roll(v, -1, axis=1)[f] - v[f]
    out = np.cross(edge, n[f][:, None, :])
    size = np.sqrt((out**2).sum(axis=2))
    height = ((at[:, None, :] - v[f]) * out).sum(axis=2) / np.where(size > 0.0, size, 1.0)
    return bool(((height < -small) | (size == 0.0)).all(axis=1).any())


def _loose(craft: Craft) -> Iterator[Problem]:
    """Yield the shapes that do not hang together with the first one."""
    touching = {(i, j) for i, _, j, _ in contacts(craft, 0.0)}
    parts = shape_panels(craft, 0.0, coarse=True)
    joined = {0}
    rest = list(range(1, len(craft.shapes)))
    progress = True
    while rest and progress:
        progress = False
        for j in list(rest):
            if any(
                (min(i, j), max(i, j)) in touching or gap_m(parts[i], parts[j]) < JOINT_M
                for i in joined
            ):
                joined.add(j)
                rest.remove(j)
                progress = True
    for j in rest:
        near = min(gap_m(parts[i], parts[j]) for i in joined)
        yield Problem(
            ("shape", j, "name"),
            f"hangs loose, {near:.3g} m from the rest of the spacecraft",
            value=craft.shapes[j].name,
            allowed="shapes that touch one another; a tube can join two",
        )


def gap_m(one: Panels, other: Panels) -> float:
    """Least distance from the corners of each to the panels of the other."""
    return min(_reach(one, other), _reach(other, one))


def _reach(points_of: Panels, faces_of: Panels) -> float:
    x = points_of.corners_m.reshape(-1, 3)
    v, n = faces_of.corners_m, faces_of.normal
    height = x @ n.T - (n * v[:, 0]).sum(axis=1)
    edge = np.roll(v, -1, axis=1) - v
    arm = x[:, None, None, :] - v  # [Q, N, 4, 3]
    size = np.maximum((edge**2).sum(axis=2), 1e-30)
    t = np.clip((arm * edge).sum(axis=3) / size, 0.0, 1.0)
    to_edge = np.sqrt(((arm - t[..., None] * edge) ** 2).sum(axis=3)).min(axis=2)
    outward = np.cross(edge, n[:, None, :])
    over = ((arm * outward).sum(axis=3) <= 0.0).all(axis=2)
    return float(np.where(over, np.abs(height), to_edge).min())
