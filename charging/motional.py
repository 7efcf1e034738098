"""What the motion through the Earth's field does to long spacecraft: v x B and its potentials."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from charging.case_strings import ArrayString
from charging.case_tables import Case
from charging.flight import Path, moments
from environments.earth_axes import turning_with_earth_m_s
from environments.magnetic_field import field_T, motional_field_V_m, motional_potential_V

Array = NDArray[np.float64]

FIELD_WITHIN_M = 6.0 * 6.371e6
"""Distance within which a dipole stands for the Earth's field."""


def field_aboard_V_m(case: Case, way: Path, time_s: Array) -> Array:
    """Field v x B [V m-1, 3, N] of the motion through plasma that turns with the Earth.

    In inertial axes; 0 far from the Earth and for a fixed case.
    """
    found = np.zeros((3, len(time_s)))
    if way.trajectory is None:
        return found
    position, velocity = way.trajectory.position_velocity(time_s)
    near = (position**2).sum(axis=0) < FIELD_WITHIN_M**2
    if near.any():
        place = position[:, near]
        turning = turning_with_earth_m_s(place)
        field = field_T(place, moments(case, time_s[near]))
        found[:, near] = motional_field_V_m(velocity[:, near] - turning, field)
    return found


def largest_V_m(case: Case, way: Path, time_s: Array) -> float:
    """Largest field of the motion at times [s after the start]."""
    return float(np.sqrt((field_aboard_V_m(case, way, time_s) ** 2).sum(axis=0)).max(initial=0.0))


def string_potentials_V(case: Case, way: Path, times_s: Sequence[Array]) -> Array | None:
    """What v x B . L adds to the ends of strings against the plasma there, by leg of the way.

    Parameters
    ----------
    case : Case
    way : Path
    times_s : sequence of ndarray
        One per leg.

    Returns
    -------
    ndarray [K, 2 E] or None
        At all times in turn: negative ends, then positive ends [V]. None where no string says
        where its ends are, or the case does not fly.
    """
    if way.trajectory is None or all(s.negative_end_m is None for s in case.string):
        return None
    rows = []
    for number, own in enumerate(times_s):
        aboard = way.in_body(number, own, field_aboard_V_m(case, way, own))
        rows.append(
            [
                motional_potential_V(aboard, np.array(place))
                for ends in zip(*(_ends(string) for string in case.string), strict=True)
                for place in ends
            ]
        )
    return np.ascontiguousarray(np.concatenate([np.stack(row) for row in rows], axis=1).T)


def _ends(string: ArrayString) -> tuple[tuple[float, ...], tuple[float, ...]]:
    if string.negative_end_m is None or string.positive_end_m is None:
        return (0.0, 0.0, 0.0), (0.0, 0.0, 0.0)
    return string.negative_end_m, string.positive_end_m
