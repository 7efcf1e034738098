"""The spacecraft of a case as shapes whose faces are surfaces: panels, areas, neighbours."""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from charging.case_shape import Shape
from charging.shape.bodies import outlines, own_panels, placed
from charging.shape.contact import covered_by, lies_on
from charging.shape.panels import Panels, joined

Array = NDArray[np.float64]
Index = NDArray[np.intp]

ANGLES_RAD = np.pi / 4.0 * np.arange(8)
"""Angles of the wings at which the field is solved, where wings turn."""
SAME_WAY = 0.9998
"""Cosine of the angle, 1 degree, within which panels belong to one flat face."""
TOUCHING_M = 1e-4
"""Edges of panels nearer to each other than this are shared."""


@dataclass(frozen=True, slots=True)
class Craft:
    """Shapes and the surfaces on them; hashable, the key of every cache.

    Attributes
    ----------
    shapes : tuple of Shape
    faces : tuple of tuple of str
        Faces ``shape.face`` of each of S surfaces. Faces without a surface are patch S,
        structure.
    panels : int
        Panels aimed at.
    """

    shapes: tuple[Shape, ...]
    faces: tuple[tuple[str, ...], ...]
    panels: int

    @property
    def turns(self) -> bool:
        """Whether wings track the Sun."""
        return any(shape.tracks_sun for shape in self.shapes)

    @property
    def angles_rad(self) -> tuple[float, ...]:
        """Angles of the wings at which the field is solved."""
        return tuple(ANGLES_RAD.tolist()) if self.turns else (0.0,)

    def patch_of(self, shape: Shape) -> Index:
        """Patch of every face of a shape."""
        owner = {face: k for k, faces in enumerate(self.faces) for face in faces}
        bare = len(self.faces)
        return np.array([owner.get(f"{shape.name}.{face}", bare) for face in shape.faces])


@lru_cache(maxsize=64)
def step_m(craft: Craft) -> float:
    """Size of a panel that gives about the number wished."""
    step = 1.0
    for _ in range(6):
        parts = [own_panels(shape, step) for shape in craft.shapes]
        count = sum(len(part) for part in parts)
        area = sum(float(part.area_m2.sum()) for part in parts)
        if _ == 0:
            step = float(np.sqrt(area / craft.panels))
        elif abs(count / craft.panels - 1.0) < 0.05:
            break
        else:
            step *= float(np.sqrt(count / craft.panels))
    return step


@lru_cache(maxsize=64)
def contacts(craft: Craft, angle_rad: float) -> tuple[tuple[int, int, int, int], ...]:
    """Faces that lie on one another: shape and face, shape and face."""
    step = step_m(craft)
    flat = [outlines(shape, step, angle_rad) for shape in craft.shapes]
    found = []
    for i, first in enumerate(flat):
        for j in range(i + 1, len(flat)):
            found += [(i, a.face, j, b.face) for a in first for b in flat[j] if lies_on(a, b)]
    return tuple(found)


@lru_cache(maxsize=64)
def shape_panels(craft: Craft, angle_rad: float, *, coarse: bool = False) -> tuple[Panels, ...]:
    """Panels of every shape in body axes, patches by face, covered parts cut away."""
    step = step_m(craft)
    parts = []
    for shape in craft.shapes:
        own = own_panels(shape, step, coarse=coarse)
        parts.append(Panels(placed(own.corners_m, shape, angle_rad), own.patch))
    flat = [outlines(shape, step, angle_rad) for shape in craft.shapes]
    for i, face_i, j, face_j in contacts(craft, angle_rad):
        a, b = parts[i], parts[j]
        for cover in (one for one in flat[j] if one.face == face_j):
            a = covered_by(a, face_i, cover)
        for cover in (one for one in flat[i] if one.face == face_i):
            b = covered_by(b, face_j, cover)
        parts[i], parts[j] = a, b
    return tuple(parts)


def craft_panels(craft: Craft, angle_rad: float, *, coarse: bool = False) -> Panels:
    """All panels in body axes; patches are surfaces, the last one structure's bare faces."""
    parts = shape_panels(craft, angle_rad, coarse=coarse)
    return joined(
        [
            Panels(part.corners_m, craft.patch_of(shape)[part.patch])
            for part, shape in zip(parts, craft.shapes, strict=True)
        ]
    )


@dataclass(frozen=True, slots=True)
class Patch:
    """Size and orientation of a surface on shapes.

    Attributes
    ----------
    area_m2 : float
        Exposed: what other shapes cover is left out.
    normal : tuple of float or None
        Of a surface that is flat, wings at angle 0; None where its faces look several ways.
    tracks_sun, front : bool
        Whether it turns with the Sun, and then whether it faces it.
    """

    area_m2: float
    normal: tuple[float, float, float] | None
    tracks_sun: bool
    front: bool


@lru_cache(maxsize=64)
def patches(craft: Craft) -> tuple[Patch, ...]:
    """Area and normal of every surface, and of the bare faces last."""
    panels = craft_panels(craft, 0.0, coarse=True)
    area, normal = panels.area_m2, panels.normal
    turning = {
        f"{shape.name}.{face}" for shape in craft.shapes for face in shape.faces if shape.tracks_sun
    }
    found = []
    for k in range(len(craft.faces) + 1):
        of = panels.patch == k
        flat = None
        if of.any():
            # edges of plates may belong to a flat surface: less than a tenth of it
            largest = normal[of][int(np.argmax(area[of]))]
            along = normal[of] @ largest > SAME_WAY
            if area[of][along].sum() > 0.9 * area[of].sum():
                flat = tuple(float(x) for x in np.round(largest, 12) + 0.0)
        faces = craft.faces[k] if k < len(craft.faces) else ()
        tracks = bool(faces) and all(face in turning for face in faces)
        front = tracks and flat is not None and flat[2] > 0.0
        found.append(Patch(float(area[of].sum()), flat, tracks, front))  # type: ignore[arg-type]
    return tuple(found)


@lru_cache(maxsize=16)
def neighbours(craft: Craft) -> tuple[tuple[int, ...], ...]:
    """Surfaces with a shared edge, by number; found at the first angle of the wings."""
    panels = craft_panels(craft, 0.0, coarse=True)
    count = len(craft.faces)
    begin = panels.corners_m
    end = np.roll(begin, -1, axis=1)
    middle = 0.5 * (begin + end)
    found: list[set[int]] = [set() for _ in range(count)]
    for a in range(count):
        of_a = panels.patch == a
        probes = np.concatenate(
            [middle[of_a], begin[of_a] + 0.1 * (end - begin)[of_a], begin[of_a]]
        ).reshape(-1, 3)
        for b in range(count):
            of_b = panels.patch == b
            if a == b or not of_b.any() or not of_a.any():
                continue
            p, q = begin[of_b].reshape(-1, 3), end[of_b].reshape(-1, 3)
            along = q - p
            size = np.maximum((along**2).sum(axis=1), 1e-30)
            t = ((probes[:, None] - p) * along).sum(axis=2) / size
            # a corner alone is no edge: the foot must lie inside the other's edge
            foot = p + np.clip(t, 0.0, 1.0)[..., None] * along
            near = np.sqrt(((probes[:, None] - foot) ** 2).sum(axis=2)) < TOUCHING_M
            if (near & (t > 1e-3) & (t < 1.0 - 1e-3)).any():
                found[a].add(b)
                found[b].add(a)
    return tuple(tuple(sorted(one)) for one in found)
