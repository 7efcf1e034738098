"""Eclipses of an orbit by root search, none missed."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from environments.orbit import EARTH_GM_M3_S2, EARTH_RADIUS_M
from environments.sun import Path, polar_stretch, stretched_solar_radius_m
from environments.vectors import length

# Search for eclipses: first step, and the width at which an interval is left alone [s].
_FIRST_STEP_S: Final = 300.0
_LAST_STEP_S: Final = 0.01
_MOST_INTERVALS: Final = 2_000_000
# Turning of the Sun's direction: 2.06e-7 rad/s at perihelion [rad s-1], rounded up; the
# Earth's flattening adds 0.7 % at most, the motion of the Moon as a body 4 %.
_SUN_RATE_RAD_S: Final = 2.2e-7

# Distances [m] at times [s], or speeds [m s-1] at radii [m]; shape (N,) to (N,).
_Scalar = Callable[[NDArray[np.float64]], NDArray[np.float64]]


@dataclass(frozen=True, slots=True)
class Eclipse:
    """One passage through the shadow of a body.

    Attributes
    ----------
    body : str
        What throws the shadow.
    penumbra_start, umbra_start, umbra_end, penumbra_end : float or None
        Contacts [s] in the time of the search. None where the passage has no such contact
        within the search: no umbra reached, or under way at the start or end.
    umbra_s : float
        Time in the umbra within the search [s]; 0 when it is not reached.
    """

    body: str
    penumbra_start: float | None
    umbra_start: float | None
    umbra_end: float | None
    penumbra_end: float | None
    umbra_s: float


def find_eclipses(
    position: Path,
    sun: Path,
    start_s: float,
    end_s: float,
    *,
    body: str = "earth",
    body_radius_m: float = EARTH_RADIUS_M,
    polar_radius_m: float | None = None,
    gm_m3_s2: float = EARTH_GM_M3_S2,
    speed_limit_m_s: float | None = None,
) -> tuple[Eclipse, ...]:
    """All passages through the shadow of a body between two times.

    Parameters
    ----------
    position, sun : callable
        Positions from the centre of the body [m], shape (3, N), at times [s], shape (N,).
    start_s, end_s : float
        Times between which to search [s], start < end.
    body : str, optional
        Name for the result.
    body_radius_m : float, optional
        Radius that stops light [m]; add the height of an absorbing atmosphere if wanted.
    polar_radius_m : float, optional
        Radius that stops light along z [m]; without it the body is a sphere. Both for the
        Earth: `environments.sun.earth_shadow_radii_m`.
    gm_m3_s2 : float, optional
        Gravity of the body; a bound orbit stays below its escape speed.
    speed_limit_m_s : float, optional
        Highest speed of `position` [m s-1] where that does not hold.

    Returns
    -------
    tuple of Eclipse
        In the order of time.

    Raises
    ------
    ValueError
        Times not in order, a position inside the body, a motion faster than the limit, or
        a path that runs along the edge of the shadow for hours.

    Notes
    -----
    The signed distance from the surface of a shadow cone changes no faster than the
    spacecraft moves. An interval is therefore free of contacts for certain when its two
    distances together exceed what can be travelled; all others are halved down to 0.01 s,
    and contacts found there are bisected to below a microsecond. What can be missed
    is a graze shorter than 0.01 s, less than a millimetre deep. Cones and flattening as in
    `illumination`, light time left out (below 0.2 s at the Moon, 1 ms in low orbit).

    References
    ----------
    Montenbruck & Gill (2000), Satellite Orbits, sec. 3.4 (shadow cones; section from memory).

    Examples
    --------
    >>> from environments.orbit import KeplerOrbit, position_velocity
    >>> from environments.sun import sun_path
    >>> orbit = KeplerOrbit(np.datetime64("2031-03-20"), 42164.17, 0.0, 0.0)
    >>> found = find_eclipses(lambda t: position_velocity(orbit, t)[0],
    ...                       sun_path(orbit.epoch), 0.0, 86400.0)
    >>> len(found), round(found[0].umbra_s / 60.0)
    (1, 67)
    """
    if not (np.isfinite(start_s) and np.isfinite(end_s) and start_s < end_s):
        raise ValueError("start_s and end_s must be finite, start_s < end_s")

    def speed(radius: NDArray[np.float64]) -> NDArray[np.float64]:
        if speed_limit_m_s is not None:
            return np.full(radius.shape, speed_limit_m_s)
        return np.sqrt(2.0 * gm_m3_s2 / np.maximum(radius, body_radius_m))

    # a flattened body becomes a sphere when all is stretched along its axis
    stretch = polar_stretch(body_radius_m, polar_radius_m)
    longest = float(stretch[2, 0])

    def stretched_speed(radius: NDArray[np.float64]) -> NDArray[np.float64]:
        return longest * speed(radius / longest)

    def place(t: NDArray[np.float64]) -> NDArray[np.float64]:
        return position(t) * stretch

    passages = []
    for sign in (1.0, -1.0):  # penumbra, umbra

        def depth(t: NDArray[np.float64], sign: float = sign) -> NDArray[np.float64]:
            return _outside_cone(place(t), sun(t) * stretch, body_radius_m, sign, longest)

        contacts = _contacts(depth, place, stretched_speed, start_s, end_s, body_radius_m)
        inside = bool(depth(np.array([start_s]))[0] < 0.0)
        edges: list[float | None] = [None, *contacts] if inside else [*contacts]
        if len(edges) % 2:
            edges.append(None)
        passages.append(list(zip(edges[0::2], edges[1::2], strict=True)))
    eclipses = []
    for begin, end in passages[0]:
        low = start_s if begin is None else begin
        high = end_s if end is None else end
        umbrae = [
            (first, last)
            for first, last in passages[1]
            if low <= (start_s if first is None else first) <= high
        ]
        umbra_s = sum(
            (end_s if last is None else last) - (start_s if first is None else first)
            for first, last in umbrae
        )
        first, last = (umbrae[0][0], umbrae[-1][1]) if umbrae else (None, None)
        eclipses.append(Eclipse(body, begin, first, last, end, float(umbra_s)))
    return tuple(eclipses)


def _outside_cone(
    position: NDArray[np.float64],
    sun: NDArray[np.float64],
    body_radius_m: float,
    sign: float,
    stretch: float,
) -> NDArray[np.float64]:
    """Distance outside a shadow cone [m], negative inside; sign +1 penumbra, -1 umbra."""
    distance = length(sun)
    axis = -sun / distance
    along = np.sum(position * axis, axis=0)
    off = position - along * axis
    across = length(off)
    limb = off[2] / np.maximum(across, 0.5 * body_radius_m)
    sine = (stretched_solar_radius_m(limb, stretch) + sign * body_radius_m) / distance
    mantle = across * np.sqrt(1.0 - sine * sine) - sign * along * sine - body_radius_m
    # the shadow begins at the circle where the cone touches the body
    return np.asarray(np.maximum(mantle, -sign * body_radius_m * sine - along), dtype=np.float64)


def _contacts(
    depth: _Scalar,
    position: Path,
    speed: _Scalar,
    start_s: float,
    end_s: float,
    body_radius_m: float,
) -> list[float]:
    """Times at which `depth` changes its sign, none missed; see `find_eclipses`."""
    count = max(1, int(np.ceil((end_s - start_s) / _FIRST_STEP_S)))
    times = np.linspace(start_s, end_s, count + 1)
    values, places = depth(times), position(times)
    left, right, d_left, d_right = times[:-1], times[1:], values[:-1], values[1:]
    p_left, p_right = places[:, :-1], places[:, 1:]
    while True:
        width = right - left
        r_left, r_right = length(p_left), length(p_right)
        if bool((np.minimum(r_left, r_right) < body_radius_m).any()):
            raise ValueError("the path leads through the body that throws the shadow")
        # no point of the interval is further than half of it from one of its ends
        travel = 0.5 * width * speed(np.full(width.shape, body_radius_m))
        fastest = speed(np.minimum(r_left, r_right) - travel)
        # 1.003: drift by oblateness, the cone's change with the Sun's distance, both below 1e-3,
        # and with the direction of the limb of a flattened body, below 1e-3 to the Moon's distance
        if bool((length(p_right - p_left) > 1.003 * fastest * width + 1.0).any()):
            raise ValueError("the path moves faster than the speed limit of the search")
        reach = width * (1.003 * fastest + _SUN_RATE_RAD_S * (np.maximum(r_left, r_right) + travel))
        changed = (d_left < 0.0) != (d_right < 0.0)
        open_ = changed | (np.abs(d_left) + np.abs(d_right) <= reach)
        if not bool(open_.any()):
            return []
        left, right, d_left, d_right = left[open_], right[open_], d_left[open_], d_right[open_]
        p_left, p_right = p_left[:, open_], p_right[:, open_]
        if bool((right - left <= _LAST_STEP_S).all()):
            break
        if left.size > _MOST_INTERVALS:
            raise ValueError("the path runs along the edge of the shadow; search shorter times")
        middle = 0.5 * (left + right)
        d_middle, p_middle = depth(middle), position(middle)
        left, right = np.concatenate((left, middle)), np.concatenate((middle, right))
        d_left, d_right = np.concatenate((d_left, d_middle)), np.concatenate((d_middle, d_right))
        p_left, p_right = np.hstack((p_left, p_middle)), np.hstack((p_middle, p_right))
    changed = (d_left < 0.0) != (d_right < 0.0)
    left, right, inside = left[changed], right[changed], d_left[changed] < 0.0
    # 1e-7 s, or what a float can still tell apart that far from the epoch
    finest = max(1e-7, 4.0 * float(np.spacing(max(abs(start_s), abs(end_s)))))
    while left.size and bool((right - left > finest).any()):
        middle = 0.5 * (left + right)
        same = (depth(middle) < 0.0) == inside
        left, right = np.where(same, middle, left), np.where(same, right, middle)
    return sorted((0.5 * (left + right)).tolist())
