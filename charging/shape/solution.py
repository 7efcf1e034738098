"""The field around a spacecraft, solved once per angle of the wings and kept in memory."""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from charging.currents.barrier_field import DISTANCES, BarrierField, barrier_field
from charging.shape.craft import Craft, craft_panels, patches, shape_panels
from charging.shape.field import Field, solve_field
from charging.shape.integrals import panel_integrals
from charging.shape.panels import Panels, joined

Array = NDArray[np.float64]

SHORT_OF = 0.85
"""How far a line goes on its way to another shape."""
SMOOTHINGS = 4
FADE_OVER = 8
"""Least number of points over which such a line fades."""
CLEAR = 0.03
"""Free way before a point, as a share of the size of its face."""
FEWEST_AROUND = 8
"""Panels that meet at one point on the axis of a round face; a grid has four."""


@dataclass(frozen=True, slots=True)
class ShapeField:
    """What a run needs of the field around S surfaces on shapes.

    Attributes
    ----------
    capacitance_F : ndarray [S+1, S+1]
        Maxwell's matrix to the plasma; last: faces without a surface, at structure's potential.
        Mean over the angles of the wings.
    distance_m : ndarray [S, R]
        From a surface outwards: `barrier_field.DISTANCES` times the square root of its area,
        from 0 to infinity.
    weights : ndarray [S, R, S+1]
        Potential along the normal from the innermost point of each surface per volt on each
        patch; where the line ends on another shape, it fades out from there. Mean over the
        angles at which it ends nowhere, if there are any.
    capacitance_spread, weight_spread : float
        Largest change with the angle: of the whole capacitance, relative, and of a weight.
    weight_error : float
        Largest amount by which a weight had to be changed to stay within 0 and 1, and the sum of
        a line within 1: panels of constant charge err next to their corners.
    asymmetry : float
        See `charging.shape.field.Field`; the largest over the angles.
    """

    capacitance_F: Array
    distance_m: Array
    weights: Array
    capacitance_spread: float
    weight_spread: float
    weight_error: float
    asymmetry: float


@lru_cache(maxsize=16)
def field_at(craft: Craft, angle_rad: float) -> Field:
    """Field with the wings at one angle."""
    return solve_field(craft_panels(craft, angle_rad), len(craft.faces) + 1)


@lru_cache(maxsize=16)
def shape_field(craft: Craft) -> ShapeField:
    """Solve the field around a craft at every angle of its wings.

    Notes
    -----
    A turn of the wings moves charge between surfaces only as far as the capacitances change
    with it; the network takes the mean and leaves the current of the turn out. Its size is
    `capacitance_spread`, a few thousandths for wings well off the body.
    """
    size = np.sqrt([one.area_m2 for one in patches(craft)[:-1]])
    distance = size[:, None] * DISTANCES
    fields = [field_at(craft, angle) for angle in craft.angles_rad]
    raw, weights, cut = (
        np.stack(part)
        for part in zip(
            *(
                _lines(craft, field, angle, distance)
                for field, angle in zip(fields, craft.angles_rad, strict=True)
            ),
            strict=True,
        )
    )
    # lines that a wing cuts at some angles only: the other angles stand for them
    counts = ~cut | cut.all(axis=0)
    share = (counts / counts.sum(axis=0))[..., None, None]
    mean = (share * weights).sum(axis=0)
    smoothed = _smoothed(mean)
    capacitance = np.stack([field.capacitance_F for field in fields])
    whole = capacitance.sum(axis=(1, 2))
    return ShapeField(
        capacitance.mean(axis=0),
        distance,
        smoothed if len(craft.shapes) > 1 else mean,
        float(np.ptp(whole) / whole.mean()),
        float(np.ptp(weights, axis=0).max()),
        float(np.abs(raw - weights).max()),
        max(field.asymmetry for field in fields),
    )


def _lines(
    craft: Craft, field: Field, angle_rad: float, distance: Array
) -> tuple[Array, Array, NDArray[np.bool_]]:
    """Weights [S, R, S+1] along the normals at one angle, as solved and within their bounds.

    With them, which lines [S] end on another shape. Such a line is drawn together towards its
    end and then fades, both smoothly: a corner would make ripples of volts in kilovolts.
    """
    begin, way = middles(craft, angle_rad)
    count, last = distance.shape[0], distance.shape[1] - 1
    end = _first_hit(begin, way, field.panels)
    cut = np.isfinite(end)
    reach = np.where(cut, SHORT_OF * end, 1.0)[:, None]
    inner = distance[:, 1:last]
    drawn = np.where(cut[:, None], -reach * np.expm1(-inner / reach), inner)
    points = begin[:, None, :] + drawn[..., None] * way[:, None, :]
    weights = np.zeros((count, last + 1, count + 1))
    solved = field.potential(points.reshape(-1, 3)).reshape(count, last - 1, count + 1)
    # from 1 where the end is nearly reached to 0 at infinity, two derivatives without a jump
    first = np.minimum((inner < 3.0 * reach).sum(axis=1), last - FADE_OVER)
    s = np.clip((np.arange(1, last) - first[:, None]) / (last - first[:, None]), 0.0, 1.0)
    fade = 1.0 - s**3 * (10.0 - 15.0 * s + 6.0 * s * s)
    weights[:, 1:last] = solved * np.where(cut[:, None], fade, 1.0)[..., None]
    weights[np.arange(count), 0, np.arange(count)] = 1.0
    bounded = np.maximum(weights, 0.0)
    return weights, bounded / np.maximum(bounded.sum(axis=2, keepdims=True), 1.0), cut


def _smoothed(weights: Array) -> Array:
    """Weights [S, R, S+1], rounded where a line passes close by another shape.

    There the potential falls in more than one step. A trough between them may be narrower
    than the spacing of the points, and what a search finds in it would depend on where it
    looks; `SMOOTHINGS` binomial means make it a few points wide, and less deep.
    """
    smooth = weights.copy()
    # before a lone convex body the fall of the potential has a single peak
    bend = np.diff(weights.sum(axis=2), n=2, axis=1)
    turns = np.where(np.abs(bend) > 1e-4, np.sign(bend), 0.0)
    passing = np.array([(np.diff(row[row != 0.0]) != 0.0).sum() > 1 for row in turns])
    for _ in range(SMOOTHINGS):
        inner = 0.25 * (smooth[:, :-2] + 2.0 * smooth[:, 1:-1] + smooth[:, 2:])
        smooth[:, 2:-1] = np.where(passing[:, None, None], inner[:, 1:], smooth[:, 2:-1])
    return smooth


def _first_hit(begin: Array, way: Array, panels: Panels) -> Array:
    """Distance [S] at which lines first enter a body; infinite where they never do."""
    n, v = panels.normal, panels.corners_m
    toward = way @ n.T
    room = (n * v[:, 0]).sum(axis=1) - begin @ n.T
    t = np.where(toward < -1e-9, room / np.where(toward < -1e-9, toward, -1.0), -1.0)
    at = begin[:, None, :] + t[..., None] * way[:, None, :]
    out = np.cross(np.roll(v, -1, axis=1) - v, n[:, None, :])
    within = (((at[:, :, None, :] - v) * out).sum(axis=3) <= 0.0).all(axis=2) & (t > 1e-6)
    return np.asarray(np.where(within, t, np.inf).min(axis=1))


def middles(craft: Craft, angle_rad: float) -> tuple[Array, Array]:
    """Innermost point of the largest face of each surface, and its normal, [S, 3] each."""
    begin, way = np.empty((2, len(craft.faces), 3))
    parts = shape_panels(craft, angle_rad)
    every = joined(parts)
    for k, faces in enumerate(craft.faces):
        best, most = None, 0.0
        for shape, part in zip(craft.shapes, parts, strict=True):
            for number in np.unique(part.patch):
                if f"{shape.name}.{shape.faces[number]}" not in faces:
                    continue
                of = part.patch == number
                face = Panels(part.corners_m[of], part.patch[of])
                area = float(face.area_m2.sum())
                if area > most * (1.0 + 1e-9):
                    best, most = face, area
        assert best is not None
        begin[k], way[k] = _innermost(best, every)
    return begin, way


def _innermost(face: Panels, every: Panels) -> tuple[Array, Array]:
    """Point farthest from the border of a face, near its middle, and the normal there.

    The middle of a panel, where its potential is met exactly, except on the axis of a dish or
    ball, around which panels stand.
    """
    begin = face.corners_m.reshape(-1, 3)
    end = np.roll(face.corners_m, -1, axis=1).reshape(-1, 3)
    middle = 0.5 * (begin + end)
    length = np.sqrt(((end - begin) ** 2).sum(axis=1))
    _, place, count = np.unique(
        np.round(middle, 7), axis=0, return_inverse=True, return_counts=True
    )
    border = (count[place.ravel()] == 1) & (length > 0.0)
    mean = (face.centre_m * face.area_m2[:, None]).sum(axis=0) / face.area_m2.sum()
    off = np.sqrt(((face.centre_m - mean) ** 2).sum(axis=1))
    score = -off
    if border.any():
        way = end[border] - begin[border]
        arm = face.centre_m[:, None] - begin[border]
        t = np.clip((arm * way).sum(axis=2) / (way**2).sum(axis=1), 0.0, 1.0)
        deep = np.sqrt(((arm - t[..., None] * way) ** 2).sum(axis=2)).min(axis=1)
        score = deep - 1e-3 * off
    # not where another shape stands right before it
    clear = CLEAR * np.sqrt(face.area_m2.sum())

    def blocked(points: Array) -> NDArray[np.bool_]:
        return np.asarray(panel_integrals(points, every)[1].sum(axis=1) < -2.0 * np.pi)

    score = np.where(blocked(face.centre_m + clear * face.normal), -np.inf, score)
    equal = score > score.max() - 1e-6 * np.ptp(face.corners_m.reshape(-1, 3), axis=0).max()
    best = int(np.argmax(score))
    corner = face.corners_m[best, :, None, None]
    meets = ((np.abs(face.corners_m[equal] - corner) < 1e-9).all(axis=3)).any(axis=2)
    around = np.flatnonzero(equal)[meets[int(np.argmax(meets.sum(axis=1)))]]
    if len(around) < FEWEST_AROUND:
        return face.centre_m[best], face.normal[best]
    normal = face.normal[around].mean(axis=0)
    normal /= np.sqrt(normal @ normal)
    point = face.centre_m[around].mean(axis=0)
    # on a curved face the mean lies below the surface: up to where the last panel is passed
    rise = ((face.corners_m[around, 0] - point) * face.normal[around]).sum(axis=1)
    lift = (rise / (face.normal[around] @ normal)).max()
    point += lift * normal
    if lift <= 0.0 or blocked((point + clear * normal)[None])[0]:  # hollow, or something there
        return face.centre_m[best], face.normal[best]
    return point, normal


def shape_barrier(craft: Craft, surface_node: NDArray[np.intp], nodes: int) -> BarrierField:
    """Barriers in front of all surfaces of a craft.

    Parameters
    ----------
    craft : Craft
    surface_node : ndarray of int [S]
        Node of each surface; bare faces are node 0, structure.
    nodes : int
    """
    weights = shape_field(craft).weights
    bearer = np.append(surface_node, 0)
    by_node = np.stack([weights[..., bearer == n].sum(axis=-1) for n in range(nodes)], axis=-1)
    return barrier_field(np.arange(len(surface_node)), surface_node, by_node)
