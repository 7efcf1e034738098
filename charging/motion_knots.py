"""Times along a run between which light and place change almost linearly."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from charging.errors import InputError
from charging.flight import Path, angular_speed_rad_s, contacts
from environments.eclipse import Eclipse
from environments.trajectory import Trajectory

Array = NDArray[np.float64]

LARGEST_TURN_RAD = np.radians(0.25)  # between knots: cosines err by 0.25²/8 (rad) = 2.4e-6
PENUMBRA_KNOTS = 240  # illumination errs by 1e-5
KNOTS_A_TURN = 360  # of a spin that is followed: cosines err by 4e-5 before refinement
LONGEST_KNOT_S = 60.0
MOST_KNOTS = 2_000_000


def motion_knots(way: Path, eclipses: Sequence[Eclipse], end: float) -> Array:
    """Knots [K] from 0 to `end`: motion, spin and penumbrae."""
    if way.trajectory is None:
        return np.array([0.0, end])
    knots = np.union1d(_motion_knots(way.trajectory, end), [0.0, end])
    for leg in way.legs:
        spin = leg.attitude
        if spin.law == "spin" and spin.resolved and spin.period_s is not None:
            count = (leg.end_s - leg.start_s) / spin.period_s * KNOTS_A_TURN
            if count > MOST_KNOTS:
                raise InputError(
                    f"attitude.resolved: {count:.3g} steps would follow every turn of "
                    f"{spin.period_s:g} s",
                    key=("attitude", "resolved"),
                    value=True,
                    allowed=f"{MOST_KNOTS} steps; resolved = false takes the mean of a turn",
                )
            knots = np.union1d(knots, np.linspace(leg.start_s, leg.end_s, int(count) + 2))
    for first, last in penumbrae(eclipses):
        knots = np.union1d(knots, np.clip(np.linspace(first, last, PENUMBRA_KNOTS), 0.0, end))
    return knots


def _motion_knots(trajectory: Trajectory, end: float) -> Array:
    """Times at most a minute and a quarter of a degree of motion apart."""
    coarse = np.linspace(0.0, end, int(np.ceil(end / (0.98 * LONGEST_KNOT_S))) + 1)
    step = coarse[1] - coarse[0]
    turn = angular_speed_rad_s(trajectory, coarse)
    # 2 %: what the turn can gain between two neighbours of a minute
    parts = np.ceil(1.02 * np.maximum(turn[1:], turn[:-1]) * step / LARGEST_TURN_RAD)
    parts = np.where(parts <= 1.0, 1, parts).astype(np.intp)
    if parts.max() == 1:
        return coarse
    first = np.repeat(coarse[:-1], parts)
    number = np.arange(first.size) - np.repeat(np.cumsum(parts) - parts, parts)
    return np.append(first + number * (step / np.repeat(parts, parts)), end)


def penumbrae(eclipses: Sequence[Eclipse]) -> list[tuple[float, float]]:
    """Spans [s] within which the illumination changes."""
    spans = []
    for eclipse in eclipses:
        times = contacts(eclipse)
        if eclipse.umbra_s <= 0.0 and times:
            spans.append((times[0], times[-1]))
            continue
        if eclipse.penumbra_start is not None and eclipse.umbra_start is not None:
            spans.append((eclipse.penumbra_start, eclipse.umbra_start))
        if eclipse.penumbra_end is not None and eclipse.umbra_end is not None:
            spans.append((eclipse.umbra_end, eclipse.penumbra_end))
    return spans
