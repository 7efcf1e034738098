"""Light and flow on surfaces of shapes, tabulated by the direction they come from."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from charging.case_tables import Case
from charging.schedule import Leg
from charging.shape.craft import Craft, patches
from charging.shape.shadow import exposure

Array = NDArray[np.float64]

STEP_DEG = 5.0
"""Of the grid of directions; what interpolation errs by is measured and stated."""
PROBES = 200
"""Directions at which the tables are compared with the exact shares."""


@dataclass(frozen=True, slots=True)
class Views:
    """Mean cosine and free share of S surfaces on a grid of directions in body axes.

    Attributes
    ----------
    azimuth_deg, elevation_deg : ndarray [A], [E]
        atan2(s_y, s_x) over a whole turn, and asin(s_z).
    cosine, share : ndarray [S, A, E]
    """

    azimuth_deg: Array
    elevation_deg: Array
    cosine: Array
    share: Array

    def at(self, directions: Array) -> tuple[Array, Array]:
        """Mean cosines and free shares [S, N] in body directions [3, N], bilinear."""
        azimuth = np.degrees(np.arctan2(directions[1], directions[0]))
        elevation = np.degrees(np.arctan2(directions[2], np.hypot(*directions[:2])))
        i, u = _place(self.azimuth_deg, azimuth)
        j, v = _place(self.elevation_deg, elevation)

        def between(table: Array) -> Array:
            low = table[:, i, j] + u * (table[:, i + 1, j] - table[:, i, j])
            high = table[:, i, j + 1] + u * (table[:, i + 1, j + 1] - table[:, i, j + 1])
            return np.asarray(low + v * (high - low))

        return between(self.cosine), between(self.share)


def _place(grid: Array, value: Array) -> tuple[NDArray[np.intp], Array]:
    k = np.minimum(np.searchsorted(grid, value, side="right") - 1, grid.size - 2)
    k = np.maximum(k, 0)
    return k, (value - grid[k]) / (grid[k + 1] - grid[k])


@dataclass(frozen=True, slots=True)
class Wings:
    """Where the wings stand: `offset_rad` off where they track the Sun, or at `fixed_rad`."""

    offset_rad: float = 0.0
    fixed_rad: float | None = None

    def angles(self, sun_body: Array) -> Array:
        """Angles [N] with the Sun in body directions [3, N]."""
        if self.fixed_rad is not None:
            return np.full(sun_body.shape[1], self.fixed_rad)
        return np.asarray(np.arctan2(sun_body[0], sun_body[2]) + self.offset_rad)


@lru_cache(maxsize=16)
def sun_views(craft: Craft, wings: Wings) -> Views:
    """Tables by the direction of the Sun, which wings follow or not."""
    azimuth = np.arange(-180.0, 180.0 + STEP_DEG, STEP_DEG)
    elevation = np.arange(-90.0, 90.0 + STEP_DEG, STEP_DEG)
    grid = np.meshgrid(np.radians(azimuth), np.radians(elevation), indexing="ij")
    a, e = (one.ravel() for one in grid)
    towards = np.stack([np.cos(e) * np.cos(a), np.cos(e) * np.sin(a), np.sin(e)])
    cosine, share = exposure(craft, towards, wings.angles(towards))
    shape = (len(craft.faces), azimuth.size, elevation.size)
    return Views(azimuth, elevation, cosine.reshape(shape), share.reshape(shape))


@lru_cache(maxsize=16)
def table_error(craft: Craft, wings: Wings) -> tuple[Array, Array]:
    """Largest and root-mean-square error of cosine times share [S] by interpolation.

    Over `PROBES` directions spread evenly over the sphere, none of them on the grid.
    """
    k = np.arange(PROBES) + 0.5
    z = 1.0 - 2.0 * k / PROBES
    turn = np.pi * (1.0 + np.sqrt(5.0)) * k
    flat = np.sqrt(1.0 - z * z)
    towards = np.stack([flat * np.cos(turn), flat * np.sin(turn), z])
    right = np.prod(exposure(craft, towards, wings.angles(towards)), axis=0)
    error = np.prod(sun_views(craft, wings).at(towards), axis=0) - right
    return np.abs(error).max(axis=1), np.sqrt((error**2).mean(axis=1))


def wings_of(leg: Leg) -> Wings:
    """Where the wings stand in a leg of a run."""
    if not leg.parked:
        return Wings()
    if leg.parked_normal is not None:
        return Wings(fixed_rad=float(np.arctan2(leg.parked_normal[0], leg.parked_normal[2])))
    return Wings(offset_rad=float(np.radians(leg.parked_angle_deg)))


def craft_of(case: Case) -> Craft:
    """Shapes of a case and the surfaces on them."""
    return Craft(case.shape, tuple(s.lies_on for s in case.surface), case.body.panels)


def shaped_light(
    case: Case, sun_body: Array, leg: Leg, signed_cosine: Array
) -> tuple[Array, Array]:
    """Signed cosines and lit shares [S, N] of a case with shapes.

    Flat surfaces keep their cosine; of others, it is the mean over their area.
    """
    craft = craft_of(case)
    mean, share = sun_views(craft, wings_of(leg)).at(sun_body)
    cosine = signed_cosine.copy()
    for k, one in enumerate(patches(craft)[:-1]):
        if one.normal is None:
            cosine[k] = mean[k]
    return cosine, np.where(cosine > 0.0, share, 1.0)
