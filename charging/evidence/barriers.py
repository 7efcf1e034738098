"""Potential barriers and capacitances of shapes against closed forms."""

from __future__ import annotations

from collections.abc import Iterator
from functools import cache, partial

import numpy as np
from numpy.typing import NDArray
from scipy.constants import epsilon_0

from charging.case_shape import Shape
from charging.currents.barrier_field import DISTANCES, barrier_field
from charging.currents.cap_weights import Patch, sphere_weights
from charging.evidence.check import Check
from charging.shape.bodies import own_panels
from charging.shape.field import solve_field
from charging.shape.panels import Panels

CAP = (
    "potential on the axis of a cap at 1 V on a sphere at 0 V, (x^2-1)/(2x) [1/(x-1) - 1/D], "
    "its minimum with another program"
)
DIPOLE = "(2D - |K|)^2/(4D) of K/r + D cos/r^2, Besse & Rubin 1980, by hand"
SPHERES = "sum of images of two spheres, Maxwell, as in Smythe 1950, summed by hand"
CUBE = "Hwang & Mascagni 2004, J. Appl. Phys. 95, 3798"


def _cap_height_V(half_angle_deg: float) -> float:
    """Barrier before a cap at 0 V on a sphere of 1 m at -1000 V."""
    area = 2.0 * np.pi * (1.0 - np.cos(np.radians(half_angle_deg)))
    weights = np.zeros((1, len(DISTANCES), 2))
    cap = Patch((0.0, 0.0, 1.0), float(area), 1)
    weights[:, 1:-1] = sphere_weights([cap], 1.0, 2, 1.0 + DISTANCES[1:-1])
    weights[0, 0, 1] = 1.0
    field = barrier_field(np.array([0]), np.array([1]), weights)
    return float(field.heights(np.array([[-1000.0, 0.0]]), np.zeros((1, 1)))[0, 0])


def _dipole_height_V(monopole_V: float, dipole_V: float) -> float:
    """Barrier on the axis of a monopole and a dipole, for a surface at their sum."""
    x = 1.0 + DISTANCES[:-1]
    weights = np.zeros((1, len(DISTANCES), 3))
    weights[0, :-1, 1] = 1.0 / x - 1.0 / x**2
    weights[0, :-1, 2] = 1.0 / x**2
    field = barrier_field(np.array([0]), np.array([2]), weights)
    surface = monopole_V + dipole_V
    node_V = np.array([[0.0, monopole_V, surface]])
    return float(field.heights(node_V, np.array([[surface]]))[0, 0])


def _panels(step_m: float, **keys: object) -> Panels:
    return own_panels(Shape.model_validate({"name": "x", **keys}), step_m)


def _capacitance_m(step_m: float, **keys: object) -> float:
    """Capacitance over 4 pi eps0 [m] of one body."""
    panels = _panels(step_m, **keys)
    field = solve_field(panels, int(panels.patch.max()) + 1)
    return float(field.total_capacitance_F / (4.0 * np.pi * epsilon_0))


@cache
def _two_spheres() -> NDArray[np.float64]:
    one = _panels(0.4, kind="ball", radius_m=1.0)
    both = np.concatenate([one.corners_m, one.corners_m + np.array([0.0, 0.0, 3.0])])
    field = solve_field(Panels(both, np.repeat([0, 1], len(one))), 2)
    return np.asarray(field.capacitance_F / (4.0 * np.pi * epsilon_0))


def barrier_checks() -> Iterator[Check]:
    """Rows about barriers and shapes.

    Yields
    ------
    Check
    """
    _two_spheres.cache_clear()
    heights = ((10.0, 624.0387), (30.0, 366.0254), (60.0, 184.7095), (90.0, 89.9798))
    for half_angle, height in heights:
        yield Check(
            f"barrier before a cap of {half_angle:g} deg at 0 V on a sphere at -1000 V",
            "barrier before a cap", height, "V", 1e-3, CAP, "closed form",
            partial(_cap_height_V, half_angle),
        )  # fmt: skip
    yield Check(
        "barrier of a monopole of -1000 V and a dipole of 900 V", "barrier of a dipole", 177.7778,
        "V", 1e-3, DIPOLE, "closed form", partial(_dipole_height_V, -1000.0, 900.0),
    )  # fmt: skip
    for name, value, step, keys in (
        ("a ball of 1 m radius", 1.0, 0.4, {"kind": "ball", "radius_m": 1.0}),
        ("a disc of 1 m radius", 2.0 / np.pi, 0.25,
         {"kind": "tube", "radius_m": 1.0, "length_m": 2e-4}),
    ):  # fmt: skip
        yield Check(
            f"capacitance of {name} over 4 pi eps0, panels", "capacitance of shapes", value, "m",
            0.02, "R; 2R/pi for a disc, by hand", "closed form",
            partial(_capacitance_m, step, **keys),
        )  # fmt: skip
    for j, value, what in ((0, 1.146287, "own"), (1, -0.3890831, "mutual")):
        yield Check(
            f"{what} capacitance of two spheres three radii apart over 4 pi eps0, panels",
            "capacitance of shapes", value, "m", 0.02, SPHERES, "closed form",
            partial(_mutual_m, j),
        )  # fmt: skip
    yield Check(
        "capacitance of a cube of 1 m over 4 pi eps0, panels", "capacitance of a cube", 0.6606782,
        "m", 0.01, CUBE, "memory", partial(_capacitance_m, 0.125, kind="block",
                                           size_m=(1.0, 1.0, 1.0)),
    )  # fmt: skip


def _mutual_m(j: int) -> float:
    return float(_two_spheres()[0, j])
