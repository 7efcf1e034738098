"""Where the Sun stands, how much of it a spacecraft sees, and its eclipses."""

from collections.abc import Callable
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.vectors import as_vectors, length

Path = Callable[[NDArray[np.float64]], NDArray[np.float64]]
"""Positions [m], shape (3, N), at times [s], shape (N,)."""

ASTRONOMICAL_UNIT_M: Final = 149597870700.0
"""IAU 2012 resolution B2, exact."""

SOLAR_RADIUS_M: Final = 6.957e8
"""Nominal solar radius, IAU 2015 resolution B3 (photosphere)."""

_J2000: Final = np.datetime64("2000-01-01T12:00:00", "ns")
_DAYS_PER_CENTURY: Final = 36525.0


def sun_position_m(times: ArrayLike) -> NDArray[np.float64]:
    """Apparent position of the Sun from the Earth's centre.

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
    Valid 1950 to 2050 within 0.01 deg as printed; aberration is in the constant of the
    longitude. Left out: the pull of Moon and planets on the Earth (most of the 0.01 deg),
    the Sun's ecliptic latitude (0.0003 deg), and TT - UTC of 69 s (0.0008 deg). An error
    of 0.01 deg moves the edge of a geostationary eclipse by 2.4 s.

    References
    ----------
    The Astronomical Almanac, section C, low-precision formulas for the Sun (also Vallado
    2013, algorithm 29; numbers from memory); precession: Lieske et al. (1977), Astron.
    Astrophys. 58, 1 (IAU 1976 angles, from memory).

    Examples
    --------
    >>> x, y, z = sun_position_m(np.array(["2000-06-21T02:00"], "datetime64[ns]"))[:, 0]
    >>> round(float(np.degrees(np.arctan2(z, np.hypot(x, y)))), 2)
    23.44
    """
    days = _days(times)
    g = np.radians(357.528 + 0.9856003 * days)
    longitude = np.radians(280.460 + 0.9856474 * days + 1.915 * np.sin(g) + 0.020 * np.sin(2.0 * g))
    obliquity = np.radians(23.439 - 4e-7 * days)
    distance = (1.00014 - 0.01671 * np.cos(g) - 0.00014 * np.cos(2.0 * g)) * ASTRONOMICAL_UNIT_M
    x = distance * np.cos(longitude)
    y = distance * np.sin(longitude) * np.cos(obliquity)
    z = distance * np.sin(longitude) * np.sin(obliquity)
    return _equinox_of_date_to_j2000(x, y, z, days / _DAYS_PER_CENTURY)


def distance_au(position_m: ArrayLike) -> NDArray[np.float64]:
    """Distance from a position of the Sun, in astronomical units.

    Parameters
    ----------
    position_m : array_like, shape (3, N)
        Vector to the Sun [m].

    Returns
    -------
    ndarray, shape (N,)
        [AU].

    Examples
    --------
    >>> july = sun_position_m(np.array(["2026-07-06"], "datetime64[ns]"))
    >>> round(float(distance_au(july)[0]), 4)
    1.0167
    """
    return np.asarray(length(as_vectors(position_m, "position_m")) / ASTRONOMICAL_UNIT_M)


def beta_angle_deg(
    position_m: ArrayLike, velocity_m_s: ArrayLike, sun_m: ArrayLike
) -> NDArray[np.float64]:
    """Angle of the Sun above the orbit plane.

    Parameters
    ----------
    position_m, velocity_m_s, sun_m : array_like, shape (3, N)
        Of the spacecraft [m], [m s-1] and of the Sun [m], from the Earth's centre.

    Returns
    -------
    ndarray, shape (N,)
        [deg], positive on the side of the orbit normal r × v.

    Examples
    --------
    >>> one = np.eye(3)
    >>> beta_angle_deg(one[:, :1], one[:, 1:2], one[:, 2:]).tolist()
    [90.0]
    """
    sun = as_vectors(sun_m, "sun_m")
    normal = np.cross(
        as_vectors(position_m, "position_m"), as_vectors(velocity_m_s, "velocity_m_s"), axis=0
    )
    along = np.sum(normal * sun, axis=0)
    across = length(np.cross(normal, sun, axis=0))
    return np.asarray(np.degrees(np.arctan2(along, across)), dtype=np.float64)


def illumination(
    position_m: ArrayLike, sun_m: ArrayLike, body_radius_m: float
) -> NDArray[np.float64]:
    """Share of the Sun's disc that a spherical body leaves free.

    Parameters
    ----------
    position_m : array_like, shape (3, N)
        Of the spacecraft from the centre of the body [m].
    sun_m : array_like, shape (3, N) or (3, 1)
        Of the Sun from the centre of the body [m].
    body_radius_m : float
        Radius that stops light [m]; for the Earth its equatorial radius, with the height
        of an absorbing atmosphere added if one is wanted.

    Returns
    -------
    ndarray, shape (N,)
        1 in full sun, 0 in the umbra, continuous between; beyond the tip of the umbra the
        body covers only part of the disc.

    Raises
    ------
    ValueError
        Wrong shapes, radius not positive, a position inside the body.

    Notes
    -----
    Overlap of two discs in the plane that touches the sky at the Sun: contacts are exact,
    between them the share is right to 1e-5, the square of the Sun's apparent radius. The
    disc has uniform brightness. The Earth counts as a sphere of equatorial radius; its
    poles lie 21 km deeper, which is 8 s of a 400 km orbit at beta 0 and more where the
    shadow is grazed. Refraction, which bends light into the shadow, is left out.

    References
    ----------
    Montenbruck & Gill (2000), Satellite Orbits, sec. 3.4.2, eqs. 3.85-3.94 (numbers from
    memory).

    Examples
    --------
    >>> sun = [[1.5e11], [0.0], [0.0]]
    >>> illumination([[4.2e7, -4.2e7], [0, 0], [0, 0]], sun, 6378137.0).tolist()
    [1.0, 0.0]
    """
    position = as_vectors(position_m, "position_m")
    if not (np.isfinite(body_radius_m) and body_radius_m > 0.0):
        raise ValueError("body_radius_m must be finite and positive")
    to_sun = as_vectors(sun_m, "sun_m") - position
    radius, sun_distance = length(position), length(to_sun)
    if not bool((radius >= body_radius_m).all()):
        raise ValueError("position_m lies inside the body")
    if not bool((sun_distance > SOLAR_RADIUS_M).all()):
        raise ValueError("position_m lies inside the Sun")
    a = np.arcsin(SOLAR_RADIUS_M / sun_distance)  # apparent radius of the Sun
    b = np.arcsin(body_radius_m / radius)  # apparent radius of the body
    c = np.arctan2(length(np.cross(to_sun, -position, axis=0)), np.sum(to_sun * -position, axis=0))
    return _free_share(a, b, c)


def sun_path(epoch: np.datetime64) -> Path:
    """Position of the Sun as a function of seconds since an epoch.

    Parameters
    ----------
    epoch : numpy.datetime64
        UTC.

    Returns
    -------
    callable
        Times [s], shape (N,), to positions [m], shape (3, N); see `sun_position_m`.

    Examples
    --------
    >>> sun_path(np.datetime64("2031-03-20"))(np.array([0.0, 3600.0])).shape
    (3, 2)
    """
    start = np.asarray(epoch).astype("datetime64[ns]")

    def path(seconds: NDArray[np.float64]) -> NDArray[np.float64]:
        return sun_position_m(start + np.rint(seconds * 1e9).astype("timedelta64[ns]"))

    return path


def _free_share(
    a: NDArray[np.float64], b: NDArray[np.float64], c: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Free share of a disc of radius a behind one of radius b, centres c apart [rad]."""
    partial = (c < a + b) & (c > np.abs(b - a))
    gap = np.where(partial, c - b, a)  # result elsewhere not used; keeps the formula finite
    # A limb of radius b on the sky has the curvature cot b: in the plane a circle of radius
    # tan b through the same nearest point. A large limb would be bent too much otherwise.
    radius = np.tan(b)
    centre = radius + gap
    x = (a * a + gap * (centre + radius)) / (2.0 * centre)
    y = np.sqrt(np.maximum(0.0, (a - x) * (a + x)))
    overlap = a * a * _segment(np.arctan2(y, x)) + radius**2 * _segment(np.arctan2(y, centre - x))
    share = np.clip(1.0 - overlap / (np.pi * a * a), 0.0, 1.0)  # cuts rounding, ~1e-16
    covered = np.where(b >= a, 0.0, 1.0 - (np.minimum(a, b) / a) ** 2)
    return np.asarray(
        np.where(partial, share, np.where(c >= a + b, 1.0, covered)), dtype=np.float64
    )


def _segment(half_angle: NDArray[np.float64]) -> NDArray[np.float64]:
    """Area of a segment of the unit circle: p - sin p cos p, by series for small p."""
    p = half_angle
    series = p**3 * (2.0 / 3.0 + p**2 * (-2.0 / 15.0 + p**2 * (4.0 / 315.0 - p**2 * 2.0 / 2835.0)))
    return np.asarray(np.where(p < 0.05, series, p - np.sin(p) * np.cos(p)), dtype=np.float64)


def _equinox_of_date_to_j2000(
    x: NDArray[np.float64],
    y: NDArray[np.float64],
    z: NDArray[np.float64],
    centuries: NDArray[np.float64],
) -> NDArray[np.float64]:
    T = centuries
    arcsec = np.pi / 648000.0
    zeta = (2306.2181 * T + 0.30188 * T**2 + 0.017998 * T**3) * arcsec
    zed = (2306.2181 * T + 1.09468 * T**2 + 0.018203 * T**3) * arcsec
    theta = (2004.3109 * T - 0.42665 * T**2 - 0.041833 * T**3) * arcsec
    # inverse of R_z(-z) R_y(theta) R_z(-zeta)
    x, y = np.cos(zed) * x + np.sin(zed) * y, -np.sin(zed) * x + np.cos(zed) * y
    x, z = np.cos(theta) * x + np.sin(theta) * z, -np.sin(theta) * x + np.cos(theta) * z
    x, y = np.cos(zeta) * x + np.sin(zeta) * y, -np.sin(zeta) * x + np.cos(zeta) * y
    return np.stack((x, y, z))


def _days(times: ArrayLike) -> NDArray[np.float64]:
    stamps = np.asarray(times)
    if stamps.ndim != 1 or stamps.dtype.kind != "M" or bool(np.isnat(stamps).any()):
        raise ValueError("times must be a one-dimensional array of datetime64")
    elapsed = stamps.astype("datetime64[ns]") - _J2000
    return np.asarray(elapsed / np.timedelta64(1, "D"), dtype=np.float64)
