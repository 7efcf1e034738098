"""Where the Moon stands, and the eclipses it causes."""

from functools import cache
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.earth_axes import centuries_tt, equinox_of_date_to_j2000
from environments.eclipse import Eclipse, find_eclipses
from environments.sun import Path, sun_path
from environments.timescales import utc_at

Array = NDArray[np.float64]

MOON_RADIUS_M: Final = 1.7374e6
"""Mean radius, IAU working group on cartographic coordinates (2015); from memory."""

_MOON_FASTEST_M_S: Final = 1.1e3
"""Speed at perigee, 1.08 km/s, rounded up."""

# Multiples of D, M, M', F; amplitude in longitude [1e-6 deg] and in distance [m].
_LONGITUDE_DISTANCE: Final = """
0 0 1 0 6288774 -20905355; 2 0 -1 0 1274027 -3699111; 2 0 0 0 658314 -2955968
0 0 2 0 213618 -569925; 0 1 0 0 -185116 48888; 0 0 0 2 -114332 -3149
2 0 -2 0 58793 246158; 2 -1 -1 0 57066 -152138; 2 0 1 0 53322 -170733
2 -1 0 0 45758 -204586; 0 1 -1 0 -40923 -129620; 1 0 0 0 -34720 108743
0 1 1 0 -30383 104755; 2 0 0 -2 15327 10321; 0 0 1 2 -12528 0
0 0 1 -2 10980 79661; 4 0 -1 0 10675 -34782; 0 0 3 0 10034 -23210
4 0 -2 0 8548 -21636; 2 1 -1 0 -7888 24208; 2 1 0 0 -6766 30824
1 0 -1 0 -5163 -8379; 1 1 0 0 4987 -16675; 2 -1 1 0 4036 -12831
2 0 2 0 3994 -10445; 4 0 0 0 3861 -11650; 2 0 -3 0 3665 14403
0 1 -2 0 -2689 -7003; 2 0 -1 2 -2602 0; 2 -1 -2 0 2390 10056
1 0 1 0 -2348 6322; 2 -2 0 0 2236 -9884; 0 1 2 0 -2120 5751
0 2 0 0 -2069 0; 2 -2 -1 0 2048 -4950; 2 0 1 -2 -1773 4130
2 0 0 2 -1595 0; 4 -1 -1 0 1215 -3958; 0 0 2 2 -1110 0
3 0 -1 0 -892 3258; 2 1 1 0 -810 2616; 4 -1 -2 0 759 -1897
0 2 -1 0 -713 -2117; 2 2 -1 0 -700 2354; 2 1 -2 0 691 0
2 -1 0 -2 596 0; 4 0 1 0 549 -1423; 0 0 4 0 537 -1117
4 -1 0 0 520 -1571; 1 0 -2 0 -487 -1739
"""
# Multiples of D, M, M', F; amplitude in latitude [1e-6 deg].
_LATITUDE: Final = """
0 0 0 1 5128122; 0 0 1 1 280602; 0 0 1 -1 277693; 2 0 0 -1 173237; 2 0 -1 1 55413
2 0 -1 -1 46271; 2 0 0 1 32573; 0 0 2 1 17198; 2 0 1 -1 9266; 0 0 2 -1 8822
2 -1 0 -1 8216; 2 0 -2 -1 4324; 2 0 1 1 4200; 2 1 0 -1 -3359; 2 -1 -1 1 2463
2 -1 0 1 2211; 2 -1 -1 -1 2065; 0 1 -1 -1 -1870; 4 0 -1 -1 1828; 0 1 0 1 -1794
0 0 0 3 -1749; 0 1 -1 1 -1565; 1 0 0 1 -1491; 0 1 1 1 -1475; 0 1 1 -1 -1410
0 1 0 -1 -1344; 1 0 0 -1 -1335; 0 0 3 1 1107; 4 0 0 -1 1021; 4 0 -1 1 833
0 0 1 -3 777; 4 0 -2 1 671; 2 0 0 -3 607; 2 0 2 -1 596; 2 -1 1 -1 491
2 0 -2 1 -451; 0 0 3 -1 439; 2 0 2 1 422; 2 0 -3 -1 421
"""


def moon_position_m(times: ArrayLike) -> Array:
    """Apparent position of the Moon from the Earth's centre.

    Parameters
    ----------
    times : array_like of datetime64, shape (N,)
        UTC.

    Returns
    -------
    ndarray, shape (3, N)
        [m], axes of J2000 (GCRS-like).

    Raises
    ------
    ValueError
        Not a one-dimensional array of times.

    Notes
    -----
    The larger terms of a lunar theory: within 20 arcsec and 60 km from 1975 to 2049 (tested),
    about 40 km across the sky. A spacecraft in geostationary orbit crosses that in some 15 s,
    the accuracy of an eclipse by the Moon; a grazing one may appear or vanish.

    References
    ----------
    Meeus (1998), Astronomical Algorithms, ch. 47, after Chapront-Touze & Chapront's ELP 2000
    (numbers from memory).

    Examples
    --------
    >>> place = moon_position_m(np.array(["2026-08-12T17:46:00"], "datetime64[ns]"))
    >>> round(float(np.linalg.norm(place)) / 1e6)  # Mm, during the solar eclipse of that day
    367
    """
    T = centuries_tt(times)
    # mean longitude, elongation, anomalies of Sun and Moon, argument of latitude [deg]
    L = 218.3164477 + T * (481267.88123421 + T * (-0.0015786 + T / 538841.0))
    D = 297.8501921 + T * (445267.1114034 + T * (-0.0018819 + T / 545868.0))
    M = 357.5291092 + T * (35999.0502909 - 0.0001536 * T)
    m = 134.9633964 + T * (477198.8675055 + T * (0.0087414 + T / 69699.0))
    F = 93.2720950 + T * (483202.0175233 + T * (-0.0036539 - T / 3526000.0))
    L, D, M, m, F = (np.radians(angle % 360.0) for angle in (L, D, M, m, F))
    shrink = 1.0 - 0.002516 * T - 0.0000074 * T**2  # of the Earth's eccentricity
    longitude, distance, latitude = np.zeros_like(T), np.zeros_like(T), np.zeros_like(T)
    for d, s, a, f, in_longitude, in_distance in _rows(_LONGITUDE_DISTANCE):
        argument = d * D + s * M + a * m + f * F
        size = shrink ** abs(s)
        longitude += in_longitude * size * np.sin(argument)
        distance += in_distance * size * np.cos(argument)
    for d, s, a, f, in_latitude in _rows(_LATITUDE):
        latitude += in_latitude * shrink ** abs(s) * np.sin(d * D + s * M + a * m + f * F)
    # Venus, Jupiter and the flattening of the Earth
    venus, jupiter = np.radians(119.75 + 131.849 * T), np.radians(53.09 + 479264.290 * T)
    longitude += 3958.0 * np.sin(venus) + 1962.0 * np.sin(L - F) + 318.0 * np.sin(jupiter)
    latitude += -2235.0 * np.sin(L) + 382.0 * np.sin(np.radians(313.45 + 481266.484 * T))
    latitude += 350.0 * np.sin(venus) * np.cos(F) + 127.0 * np.sin(L - m) - 115.0 * np.sin(L + m)
    lon = L + np.radians(1e-6 * longitude)
    lat = np.radians(1e-6 * latitude)
    r = 385000560.0 + distance
    obliquity = np.radians(23.439291 - 0.0130042 * T)
    x, y, z = r * np.cos(lat) * np.cos(lon), r * np.cos(lat) * np.sin(lon), r * np.sin(lat)
    cos, sin = np.cos(obliquity), np.sin(obliquity)
    return equinox_of_date_to_j2000(np.stack((x, cos * y - sin * z, sin * y + cos * z)), T)


def moon_path(epoch: np.datetime64) -> Path:
    """Position of the Moon as a function of seconds since an epoch.

    Parameters
    ----------
    epoch : numpy.datetime64
        UTC.

    Returns
    -------
    callable
        Times [s], shape (N,), to positions [m], shape (3, N); see `moon_position_m`.

    Examples
    --------
    >>> moon_path(np.datetime64("2031-03-20"))(np.array([0.0, 3600.0])).shape
    (3, 2)
    """
    return lambda seconds: moon_position_m(utc_at(epoch, seconds))


def find_moon_eclipses(
    position: Path,
    epoch: np.datetime64,
    start_s: float,
    end_s: float,
    *,
    speed_limit_m_s: float,
) -> tuple[Eclipse, ...]:
    """All passages of a spacecraft through the shadow of the Moon.

    Parameters
    ----------
    position : callable
        Positions from the Earth's centre [m], shape (3, N), at times [s], shape (N,).
    epoch : numpy.datetime64
        UTC at 0 s.
    start_s, end_s : float
        Times between which to search [s].
    speed_limit_m_s : float
        Highest speed of the spacecraft about the Earth [m s-1].

    Returns
    -------
    tuple of Eclipse
        With ``body = "moon"``; `illumination` about the Moon gives their depth.

    Notes
    -----
    Edges as good as the Moon's position, about 15 s; see `moon_position_m`. The Moon counts
    as a sphere.

    Examples
    --------
    >>> from environments.orbit import KeplerOrbit, position_velocity
    >>> orbit = KeplerOrbit(np.datetime64("2026-08-12"), 42164.17, 0.0, 0.0, 0.0, 0.0, 150.0)
    >>> found = find_moon_eclipses(lambda t: position_velocity(orbit, t)[0], orbit.epoch,
    ...                            0.0, 86400.0, speed_limit_m_s=3.2e3)
    >>> [one.body for one in found]
    ['moon']
    """
    sun, moon = sun_path(epoch), moon_path(epoch)
    return find_eclipses(
        lambda t: position(t) - moon(t),
        lambda t: sun(t) - moon(t),
        start_s,
        end_s,
        body="moon",
        body_radius_m=MOON_RADIUS_M,
        speed_limit_m_s=speed_limit_m_s + _MOON_FASTEST_M_S,
    )


@cache
def _rows(table: str) -> tuple[tuple[int, ...], ...]:
    return tuple(
        tuple(int(n) for n in row.split()) for row in table.replace("\n", ";").split(";") if row
    )
