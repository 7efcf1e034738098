"""Axes that turn with the Earth or with its equinox, against those of J2000.

All of it is of low precision, with the size of what is left out stated at each function.
J2000 (the mean equator and equinox of that day) and the GCRS count as one: the frame bias
between them is 0.023 arcsec, 0.8 m in low orbit and 5 m in geostationary.
"""

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.timescales import TT_MINUS_TAI_S, tai_from_utc
from environments.vectors import as_vectors

Array = NDArray[np.float64]

_J2000: Final = np.datetime64("2000-01-01T12:00:00", "ns")
_DAY: Final = np.timedelta64(86400 * 10**9, "ns")
_DAYS_PER_CENTURY: Final = 36525.0
_ARCSEC: Final = np.pi / 648000.0

EARTH_TURNS_RAD_S: Final = 7.2921159e-5
"""Sidereal rate about the pole; IERS conventions."""


def turning_with_earth_m_s(position_m: ArrayLike) -> Array:
    """Velocity of what turns with the Earth as a rigid body.

    Parameters
    ----------
    position_m : array_like, shape (3, N)
        From the Earth's centre [m], GCRS-like; the pole counts as the third axis.

    Returns
    -------
    ndarray, shape (3, N)
        [m s-1], inertial.

    Raises
    ------
    ValueError
        Not vectors.

    Examples
    --------
    >>> float(turning_with_earth_m_s([[6378137.0], [0.0], [0.0]])[1, 0].round(1))  # to the east
    465.1
    """
    x, y, _ = as_vectors(position_m, "position_m")
    return np.asarray(EARTH_TURNS_RAD_S * np.stack((-y, x, np.zeros_like(x))), dtype=np.float64)


def centuries_tt(times: ArrayLike) -> Array:
    """Julian centuries of Terrestrial Time since J2000 at UTC times.

    Parameters
    ----------
    times : array_like of datetime64, shape (N,)
        UTC.

    Returns
    -------
    ndarray, shape (N,)

    Raises
    ------
    ValueError
        Not a one-dimensional array of times.

    Examples
    --------
    >>> day = np.array(["2000-01-01T11:58:55.816"], "datetime64[ns]")  # 12 h TT
    >>> abs(float(centuries_tt(day)[0])) < 1e-15
    True
    """
    tt = (tai_from_utc(_stamps(times)) - _J2000) / _DAY + TT_MINUS_TAI_S / 86400.0
    return np.asarray(tt / _DAYS_PER_CENTURY, dtype=np.float64)


def equinox_of_date_to_j2000(vector: ArrayLike, centuries: Array) -> Array:
    """Turn vectors from the mean equator and equinox of date to those of J2000.

    Parameters
    ----------
    vector : array_like, shape (3, N)
        Any unit.
    centuries : ndarray, shape (N,) or (1,)
        Time of the equinox, Julian centuries since J2000.

    Returns
    -------
    ndarray, shape (3, N)

    Notes
    -----
    Angles of 1976; against those of 2006 they are off by 0.3 arcsec per century.

    References
    ----------
    Lieske et al. (1977), Astron. Astrophys. 58, 1 (IAU 1976 angles, from memory).

    Examples
    --------
    >>> pole = equinox_of_date_to_j2000([[0.0], [0.0], [1.0]], np.array([0.31]))
    >>> round(float(np.degrees(np.arccos(pole[2, 0]))), 2)  # the pole moved by 2031 [deg]
    0.17
    """
    x, y, z = as_vectors(vector, "vector")
    T = centuries
    zeta = (2306.2181 * T + 0.30188 * T**2 + 0.017998 * T**3) * _ARCSEC
    zed = (2306.2181 * T + 1.09468 * T**2 + 0.018203 * T**3) * _ARCSEC
    theta = (2004.3109 * T - 0.42665 * T**2 - 0.041833 * T**3) * _ARCSEC
    # inverse of R_z(-z) R_y(theta) R_z(-zeta)
    x, y = _turn(x, y, -zed)
    x, z = _turn(x, z, -theta)
    x, y = _turn(x, y, -zeta)
    return np.stack((x, y, z))


def teme_to_j2000(vector: ArrayLike, times: ArrayLike) -> Array:
    """Turn vectors from the true equator, mean equinox of date (TEME) to J2000.

    TEME is the frame in which SGP4 computes.

    Parameters
    ----------
    vector : array_like, shape (3, N)
        Any unit.
    times : array_like of datetime64, shape (N,)
        UTC.

    Returns
    -------
    ndarray, shape (3, N)
        GCRS-like.

    Notes
    -----
    Nutation by its four largest terms, good to 0.7 arcsec; with the precession of 1976 the
    direction is good to 1 arcsec: 35 m in low orbit, 200 m in geostationary, well below
    the kilometres of SGP4 itself. The turning of TEME (1e-11 rad/s) is left out of
    velocities: below 1 mm/s.

    References
    ----------
    Vallado (2013), Fundamentals of Astrodynamics and Applications, 4th ed., sec. 3.7 (TEME);
    Meeus (1998), Astronomical Algorithms, ch. 22 (short nutation); numbers from memory.

    Examples
    --------
    >>> day = np.array(["2026-01-01"], "datetime64[ns]")
    >>> x, y, z = teme_to_j2000([[1.0], [0.0], [0.0]], day)[:, 0]
    >>> round(float(np.degrees(np.arctan2(y, x))), 2)  # 26 years of precession [deg]
    -0.33
    """
    x, y, z = as_vectors(vector, "vector")
    T = centuries_tt(times)
    in_longitude, in_obliquity = _nutation(T)
    mean = np.radians(23.439291 - 0.0130042 * T)
    # to the true equinox
    x, y = _turn(x, y, in_longitude * np.cos(mean))
    # true equator to mean equator, over the ecliptic
    y, z = _turn(y, z, -(mean + in_obliquity))
    x, y = _turn(x, y, -in_longitude)
    y, z = _turn(y, z, mean)
    return equinox_of_date_to_j2000(np.stack((x, y, z)), T)


def earth_rotation_angle_rad(times: ArrayLike) -> Array:
    """Greenwich mean sidereal time: angle from the mean equinox of date to Greenwich.

    Parameters
    ----------
    times : array_like of datetime64, shape (N,)
        UTC.

    Returns
    -------
    ndarray, shape (N,)
        [rad], 0 to 2 pi.

    Notes
    -----
    UTC counts as UT1: less than 0.9 s or 0.004 deg of longitude. Polar motion (below
    0.5 arcsec) and nutation (below 0.005 deg) are left out.

    References
    ----------
    Aoki et al. (1982), Astron. Astrophys. 105, 359, in the form of Meeus (1998), eq. 12.4
    (numbers from memory).

    Examples
    --------
    >>> noon = np.array(["2000-01-01T12:00:00"], "datetime64[ns]")
    >>> round(float(np.degrees(earth_rotation_angle_rad(noon)[0])), 3)
    280.461
    """
    days = np.asarray((_stamps(times) - _J2000) / _DAY, dtype=np.float64)
    T = days / _DAYS_PER_CENTURY
    turned = 280.46061837 + 360.98564736629 * days + 0.000387933 * T**2 - T**3 / 38710000.0
    return np.asarray(np.radians(turned % 360.0), dtype=np.float64)


def earth_fixed_to_j2000(vector: ArrayLike, times: ArrayLike) -> Array:
    """Turn vectors fixed to the rotating Earth into inertial ones.

    Parameters
    ----------
    vector : array_like, shape (3, N) or (3, 1)
        x to Greenwich in the equator, z to the north pole.
    times : array_like of datetime64, shape (N,)
        UTC.

    Returns
    -------
    ndarray, shape (3, N)
        GCRS-like.

    Notes
    -----
    Good to 0.01 deg; see `earth_rotation_angle_rad`.

    Examples
    --------
    >>> noon = np.array(["2031-03-20T12:00:00"], "datetime64[ns]")
    >>> earth_fixed_to_j2000([[0.0], [0.0], [1.0]], noon)[2].round(3).tolist()
    [1.0]
    """
    x, y, z = as_vectors(vector, "vector")
    x, y = _turn(x, y, earth_rotation_angle_rad(times))
    of_date = np.stack((x, y, np.broadcast_to(z, x.shape)))
    return equinox_of_date_to_j2000(of_date, centuries_tt(times))


def _nutation(T: Array) -> tuple[Array, Array]:
    """Nutation in longitude and obliquity [rad]."""
    node = np.radians(125.04452 - 1934.136261 * T)
    sun = 2.0 * np.radians(280.4665 + 36000.7698 * T)
    moon = 2.0 * np.radians(218.3165 + 481267.8813 * T)
    in_longitude = (
        -17.20 * np.sin(node) - 1.32 * np.sin(sun) - 0.23 * np.sin(moon) + 0.21 * np.sin(2.0 * node)
    )
    in_obliquity = (
        9.20 * np.cos(node) + 0.57 * np.cos(sun) + 0.10 * np.cos(moon) - 0.09 * np.cos(2.0 * node)
    )
    return in_longitude * _ARCSEC, in_obliquity * _ARCSEC


def _turn(x: Array, y: Array, angle: Array) -> tuple[Array, Array]:
    cos, sin = np.cos(angle), np.sin(angle)
    return cos * x - sin * y, sin * x + cos * y


def _stamps(times: ArrayLike) -> NDArray[np.datetime64]:
    stamps = np.asarray(times)
    if stamps.ndim != 1 or stamps.dtype.kind != "M" or bool(np.isnat(stamps).any()):
        raise ValueError("times must be a one-dimensional array of datetime64")
    return stamps.astype("datetime64[ns]")
