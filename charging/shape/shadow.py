"""Which share of every surface the rest of the spacecraft leaves free, by a direction.

The direction is that of the Sun, or the one from which plasma streams in. Faces of blocks and
plates are treated exactly, round and curved ones by the centres of their panels.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from charging.case_shape import Shape
from charging.shape.bodies import own_panels, rotation
from charging.shape.craft import SAME_WAY, Craft, patches, shape_panels, step_m
from charging.shape.panels import Panels, joined
from charging.shape.shade import covered_area
from charging.shape.silhouette import Convex, convex, shadow_edges

Array = NDArray[np.float64]

BLOCK = 256
"""Directions worked on at a time."""
LEAST_COSINE = 0.02
"""A direction below the horizon of a face, or closer to it, is lifted to this cosine: what is
said about a face that sees no light is what holds where it begins to see some."""
UNASKED_COSINE = -0.15
"""Faces turned further away than this, more than a step of the tables, count as free."""
SECTORS_STEP_M = 1e9  # of bodies that throw shadows: as few sectors as there may be


@dataclass(frozen=True, slots=True)
class _Body:
    """A shape for shadows, in its own axes.

    `whole`: flat faces of blocks and plates, uncut, patches by surface, and `area_m2` of each
    that is not covered; `parts`: other panels, covered parts cut away; `solids`: convex bodies
    that make it up; `dish`: panels of a body that shades itself.
    """

    shape: Shape
    whole: Panels
    area_m2: Array
    parts: Panels
    solids: tuple[Convex, ...]
    dish: Panels | None


def exposure(craft: Craft, directions: Array, angles_rad: Array) -> tuple[Array, Array]:
    """Unshaded mean cosine, and the share of it that arrives, for every surface.

    Parameters
    ----------
    craft : Craft
    directions : ndarray [3, D]
        Unit vectors in body axes towards the source.
    angles_rad : ndarray [D]
        Angles of the wings.

    Returns
    -------
    ndarray [S, D], ndarray [S, D]
        Mean of max(cosine, 0) over the area of a surface as if it stood alone, and the share
        left free by other shapes (and by a dish itself), weighted with that cosine.
    """
    surfaces = len(craft.faces)
    s = np.ascontiguousarray(directions.T)
    lit, free, weight = np.zeros((3, surfaces, len(s)))
    area = np.zeros((surfaces, 1))
    bodies = _bodies(craft)
    for body in bodies:
        for first in range(0, len(s), BLOCK):
            here = slice(first, first + BLOCK)
            sun, angles = _source(body.shape, angles_rad[here], s[here]), angles_rad[here]
            for panels, size, shares in (
                (body.whole, body.area_m2, _exact),
                (body.parts, body.parts.area_m2, _by_centres),
            ):
                if not len(panels):
                    continue
                cosine = panels.normal @ sun.T
                # a face without light still says a share
                seen = size[:, None] * np.maximum(cosine, 1e-9)
                share = shares(body, bodies, sun, s[here], angles)
                for k in np.unique(panels.patch):
                    of = panels.patch == k
                    lit[k, here] += (size[:, None] * np.maximum(cosine, 0.0))[of].sum(axis=0)
                    weight[k, here] += seen[of].sum(axis=0)
                    free[k, here] += (seen * share)[of].sum(axis=0)
                    area[k, 0] += size[of].sum() if first == 0 else 0.0
    return lit / area, free / weight


def panel_light(craft: Craft, towards: Array, angle_rad: float) -> tuple[Panels, Array]:
    """Panels of the mesh in body axes and the cosine of light on each, 0 in shade.

    For pictures: a panel is lit or not by its centre. `towards` [3] is the direction of the Sun.
    """
    bodies = _bodies(craft)
    s, angles = towards[None], np.array([angle_rad])
    parts, light = [], []
    for body, mesh in zip(bodies, shape_panels(craft, angle_rad), strict=True):
        local = (mesh.corners_m - np.array(body.shape.center_m)) @ rotation(body.shape, angle_rad)
        here = replace(body, parts=Panels(local, mesh.patch))
        sun = _source(body.shape, angles, s)
        # the body stays one of the bodies, so that it does not shade itself
        seen = [here if other is body else other for other in bodies]
        free = _by_centres(here, seen, sun, s, angles)[:, 0]
        parts.append(Panels(mesh.corners_m, craft.patch_of(body.shape)[mesh.patch]))
        light.append(free * np.maximum(here.parts.normal @ sun[0], 0.0))
    return joined(parts), np.concatenate(light)


def _bodies(craft: Craft) -> list[_Body]:
    step = step_m(craft)
    coarse, fine = shape_panels(craft, 0.0, coarse=True), shape_panels(craft, 0.0)
    normals = [one.normal for one in patches(craft)[:-1]]
    found = []
    for shape, cut, mesh in zip(craft.shapes, coarse, fine, strict=True):
        of = craft.patch_of(shape)
        turn, centre = rotation(shape, 0.0), np.array(shape.center_m)
        if shape.kind in ("block", "panel"):
            own = own_panels(shape, step, coarse=True)
            whole = Panels(own.corners_m, of[own.patch])
            keep = _main(whole, normals, turn)
            left = np.zeros(len(own))
            way = cut.normal @ turn
            for f in range(len(own)):  # what of each face is left: by place of its plane
                mine = (own.patch[f] == cut.patch) & (way @ own.normal[f] > SAME_WAY)
                left[f] = cut.area_m2[mine].sum()
            keep &= left > 1e-9 * own.area_m2
            whole, left = _chosen(whole, keep), left[keep]
            parts = _chosen(whole, np.zeros(len(whole), dtype=bool))
        else:
            local = Panels((mesh.corners_m - centre) @ turn, of[mesh.patch])
            parts = _chosen(local, _main(local, normals, turn))
            whole, left = _chosen(parts, np.zeros(len(parts), dtype=bool)), np.zeros(0)
        rough = own_panels(shape, SECTORS_STEP_M, coarse=True)
        solids: tuple[Panels, ...] = (rough,)
        dish = None
        if shape.kind == "paraboloid":
            # its own shade by the very panels whose centres are looked at
            solids, dish = (_closed(rough),), own_panels(shape, step)
        elif shape.kind == "ring plate":
            solids = _wedges(rough)
        found.append(_Body(shape, whole, left, parts, tuple(convex(p) for p in solids), dish))
    return found


def _chosen(panels: Panels, keep: NDArray[np.bool_]) -> Panels:
    return Panels(panels.corners_m[keep], panels.patch[keep])


def _main(
    panels: Panels, normals: Sequence[tuple[float, float, float] | None], turn: Array
) -> NDArray[np.bool_]:
    """Panels of surfaces; of a flat surface those that look along its normal, no edges."""
    keep = panels.patch < len(normals)
    for k, normal in enumerate(normals):
        if normal is not None:
            keep &= (panels.patch != k) | (panels.normal @ turn.T @ np.array(normal) > SAME_WAY)
    return np.asarray(keep)


def _closed(dish: Panels) -> Panels:
    """A dish closed by a lid: what passes the lid ends in the dish, so shadows are the same."""
    front = dish.patch == 2
    top = dish.corners_m[dish.patch == 1][:, [3, 2]]  # upper border of the edge, forwards
    middle = np.zeros_like(top[:, :1])
    middle[..., 2] = top[:, :1, 2]
    lid = np.concatenate([top, middle, middle], axis=1)
    corners = np.concatenate([dish.corners_m[~front], lid])
    return Panels(corners, np.concatenate([dish.patch[~front], np.full(len(lid), 2)]))


def _wedges(ring: Panels) -> tuple[Panels, ...]:
    """A ring as convex wedges, one for each sector."""
    below, outer, top, inner = (ring.corners_m[ring.patch == face] for face in range(4))
    found = []
    for k in range(len(below)):
        walls = [
            # borders of the outer wall (0: low first, 3: high first), inner wall the other way
            np.stack([inner[k, 3], outer[k, 0], outer[k, 3], inner[k, 0]]),
            np.stack([outer[k, 1], inner[k, 2], inner[k, 1], outer[k, 2]]),
        ]
        corners = np.stack([below[k], outer[k], top[k], inner[k], *walls])
        found.append(Panels(corners, np.zeros(6, dtype=np.intp)))
    return tuple(found)


def _axes(shape: Shape, angles_rad: Array) -> Array:
    """Own axes of a shape at angles [D], [D, 3, 3] or [1, 3, 3] where they stand still."""
    if not shape.tracks_sun:
        return rotation(shape, 0.0)[None]
    c, s, zero = np.cos(angles_rad), np.sin(angles_rad), np.zeros(len(angles_rad))
    rows = [[c, zero, s], [zero, zero + 1.0, zero], [-s, zero, c]]
    return np.stack([np.stack(row, axis=-1) for row in rows], axis=-2)


def _into(target: Shape, source: Shape, angles_rad: Array) -> tuple[Array, Array]:
    """Turn [D or 1, 3, 3] and shift [D or 1, 3] from one shape's axes to those of another."""
    a, b = _axes(target, angles_rad), _axes(source, angles_rad)
    offset = np.array(source.center_m) - np.array(target.center_m)
    if target.tracks_sun and source.tracks_sun and not offset[[0, 2]].any():
        a, b = a[:1], b[:1]  # on one hinge they turn together
    turn = np.einsum("dki,dkj->dij", *np.broadcast_arrays(a, b))
    return np.asarray(turn), np.asarray(np.einsum("dki,k->di", a, offset))


def _source(shape: Shape, angles_rad: Array, s: Array) -> Array:
    """Directions [D, 3] in a shape's own axes."""
    a = np.broadcast_to(_axes(shape, angles_rad), (len(s), 3, 3))
    return np.asarray(np.einsum("dki,dk->di", a, s))


def _exact(body: _Body, bodies: Sequence[_Body], sun: Array, s: Array, angles: Array) -> Array:
    """Free shares [M, D] of the whole faces of a block or plate."""
    whole, left = body.whole.area_m2, body.area_m2
    share = np.ones((len(whole), len(sun)))
    others = [
        (one, *_into(body.shape, other.shape, angles))
        for other in bodies
        if other is not body
        for one in other.solids
    ]
    for m in range(len(body.whole)):
        n, face = body.whole.normal[m], body.whole.corners_m[m]
        asked = np.flatnonzero(sun @ n > UNASKED_COSINE)
        if not asked.size:
            continue
        light = sun[asked] + np.maximum(LEAST_COSINE - sun[asked] @ n, 0.0)[:, None] * n
        light = light / np.sqrt((light**2).sum(axis=1))[:, None]
        u = (face[1] - face[0]) / np.sqrt(((face[1] - face[0]) ** 2).sum())
        frame = np.stack([u, np.cross(n, u)])
        flat = (face - face[0]) @ frame.T
        middle = face.mean(axis=0)
        reach = float(np.sqrt(((face - middle) ** 2).sum(axis=1).max()))
        found = []
        for one, turn, shift in others:
            turn, shift = (x if len(x) == 1 else x[asked] for x in (turn, shift))
            near = _in_the_way(turn @ one.centre_m + shift - middle, light, reach + one.radius_m)
            if not near.any():
                continue
            turn, shift = (x if len(x) == 1 else x[near] for x in (turn, shift))
            edges = shadow_edges(one, turn, shift, light[near], (face[0], n, frame))
            if edges is not None and _reaches(edges[0], flat).any():
                begin, end = np.zeros((2, len(asked), *edges[0].shape[1:]))
                begin[near], end[near] = edges
                found.append((begin, end))
        if found:
            touched = np.any([_reaches(p, flat) for p, _ in found], axis=0)
            some = [(p[touched], q[touched]) for p, q in found]
            share[m, asked[touched]] = (whole[m] - covered_area(flat, some)) / left[m]
    return np.clip(share, 0.0, 1.0)  # rounding of 1e-7


def _in_the_way(place: Array, light: Array, reach: float) -> NDArray[np.bool_]:
    """Whether spheres at places [D or 1, 3] about a face may lie in light to a sphere on it."""
    along = (place * light).sum(axis=1)
    beside = (place**2).sum(axis=1) - along**2
    return np.asarray((beside < reach**2) & (along > -reach))


def _reaches(points: Array, flat: Array) -> NDArray[np.bool_]:
    """Whether shadows [D, E, 2] may touch a face."""
    low, high = points.min(axis=1), points.max(axis=1)
    return np.asarray(((high > flat.min(axis=0)) & (low < flat.max(axis=0))).all(axis=1))


def _by_centres(body: _Body, bodies: Sequence[_Body], sun: Array, s: Array, angles: Array) -> Array:
    """Free shares (0 or 1) [M, D] of the parts of a shape, by their centres."""
    hit = np.zeros((len(s), len(body.parts)), dtype=bool)
    centre = body.parts.centre_m
    for other in bodies:
        if other is body and body.dish is not None:
            hit |= _hits_panels(centre, sun, body.dish)
        elif other is not body or len(body.solids) > 1:  # a single convex body has no shade
            light = _source(other.shape, angles, s)
            turn, shift = _into(other.shape, body.shape, angles)
            points = np.einsum("dij,pj->dpi", turn, centre) + shift[:, None, :]
            for one in other.solids:
                hit |= _hits(points, light, one.panels)
    return (~hit.T).astype(np.float64)


def _hits(points: Array, light: Array, solid: Panels) -> NDArray[np.bool_]:
    """Whether rays from points [D or 1, M, 3] towards light [D, 3] meet a convex body."""
    normal = solid.normal
    base = (normal * solid.corners_m[:, 0]).sum(axis=1)
    _, first = np.unique(np.round(np.column_stack([normal, base]), 9), axis=0, return_index=True)
    enter = np.zeros((len(light), points.shape[1]))
    leave = np.full_like(enter, np.inf)
    for f in first:
        toward = (light @ normal[f])[:, None]
        room = base[f] - points @ normal[f]
        with np.errstate(divide="ignore", invalid="ignore"):
            t = room / toward
        np.maximum(enter, np.where(toward < 0.0, t, -np.inf), out=enter)
        np.minimum(leave, np.where(toward > 0.0, t, np.inf), out=leave)
        leave[(toward == 0.0) & (room < 0.0)] = -1.0
    return np.asarray(leave > enter + 1e-6)


def _hits_panels(points: Array, light: Array, solid: Panels) -> NDArray[np.bool_]:
    """Whether rays from points [M, 3] meet any closed body: then they leave it by a panel."""
    normal, v = solid.normal, solid.corners_m
    out = np.cross(np.roll(v, -1, axis=1) - v, normal[:, None, :])
    limit = (out * v).sum(axis=2)
    hit = np.zeros((len(light), len(points)), dtype=bool)
    for f in range(len(solid)):
        toward = light @ normal[f]
        leaves = toward > 1e-12
        if not leaves.any():
            continue
        t = ((v[f, 0] - points) @ normal[f]) / toward[leaves, None]
        within = t > 1e-6
        for k in range(4):
            across = points @ out[f, k] + t * (light[leaves] @ out[f, k])[:, None]
            within &= across <= limit[f, k]
        hit[leaves] |= within
    return hit
