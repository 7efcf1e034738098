"""Magnetopause and bow shock of the Earth, and the direction from which the wind comes."""

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.coefficients import Coefficient
from environments.vectors import direction

Array = NDArray[np.float64]

_SHUE: Final = "Shue et al. 1998, J. Geophys. Res. 103, 17691"

COEFFICIENTS: Final = (
    Coefficient("standoff", (10.22, 1.29, 0.184, 8.14, -1.0 / 6.6), "RE, nT, nPa", "handbook",
                f"{_SHUE}, as coded alike in several public programs"),
    Coefficient("flaring", (0.58, 0.007, 0.024), "1, 1/nT, 1", "handbook",
                f"{_SHUE}, as coded alike in several public programs"),
    Coefficient("shock standoff over magnetopause", (1.3,), "1", "memory",
                "Fairfield 1971; Farris & Russell 1994 (1.25 to 1.4)"),
    Coefficient("eccentricity of the shock", (0.81,), "1", "memory",
                "Farris, Petrinec & Russell 1991, Geophys. Res. Lett. 18, 1821"),
    Coefficient("speed of the Earth", (29.8,), "km s-1", "derived", "mean of the orbit"),
)  # fmt: skip
"""Figures of this module."""

FIT_RANGE: Final = {"bz_nT": (-18.0, 15.0), "pressure_nPa": (0.5, 60.0)}
"""Where the magnetopause was fitted (from memory, uncertain)."""

EARTH_SPEED_M_S: Final = 29.8e3
"""Mean orbital speed of the Earth [m s-1]."""

_ECLIPTIC_NORTH: Final = (0.0, -0.39777716, 0.91748206)  # J2000 axes, obliquity 23.4393 deg


def magnetopause_standoff(bz_nT: ArrayLike, pressure_nPa: ArrayLike) -> Array:
    """Distance of the magnetopause under the Sun.

    Parameters
    ----------
    bz_nT, pressure_nPa : array_like
        Northward field and dynamic pressure of the wind; fitted for -18 to 15 nT and 0.5 to
        60 nPa.

    Returns
    -------
    ndarray
        In Earth radii.

    References
    ----------
    Shue et al. (1998), J. Geophys. Res. 103, 17691, eq. 10.

    Examples
    --------
    >>> magnetopause_standoff([0.0, -10.0], [2.0, 10.0]).round(3).tolist()
    [10.252, 6.91]
    """
    a, b, c, d, power = COEFFICIENTS[0].value
    tanh = np.tanh(c * (np.asarray(bz_nT, dtype=np.float64) + d))
    return np.asarray((a + b * tanh) * np.asarray(pressure_nPa) ** power, dtype=np.float64)


def magnetopause_flaring(bz_nT: ArrayLike, pressure_nPa: ArrayLike) -> Array:
    """Exponent of the shape of the magnetopause.

    Parameters
    ----------
    bz_nT, pressure_nPa : array_like
        See `magnetopause_standoff`.

    Returns
    -------
    ndarray
        1; the tail is open above 0.5.

    References
    ----------
    Shue et al. (1998), eq. 11.

    Examples
    --------
    >>> magnetopause_flaring([0.0, -10.0], [2.0, 10.0]).round(4).tolist()
    [0.5896, 0.6859]
    """
    e, f, g = COEFFICIENTS[1].value
    bz = np.asarray(bz_nT, dtype=np.float64)
    return np.asarray((e - f * bz) * (1.0 + g * np.log(np.asarray(pressure_nPa))))


def magnetopause_radius(cosine: ArrayLike, bz_nT: ArrayLike, pressure_nPa: ArrayLike) -> Array:
    """Distance of the magnetopause from the Earth's centre in a direction.

    Parameters
    ----------
    cosine : array_like
        Of the angle from the direction that the wind comes from, > -1.
    bz_nT, pressure_nPa : array_like
        See `magnetopause_standoff`.

    Returns
    -------
    ndarray
        In Earth radii, r0 (2/(1 + cos))^alpha. Fitted to crossings of the day side and the
        near tail; used here down the tail too.

    Examples
    --------
    >>> float(magnetopause_radius(0.0, 0.0, 2.0).round(2))
    15.43
    """
    base = 2.0 / np.maximum(1.0 + np.asarray(cosine, dtype=np.float64), 1e-9)
    shape = base ** magnetopause_flaring(bz_nT, pressure_nPa)
    return np.asarray(magnetopause_standoff(bz_nT, pressure_nPa) * shape)


def bow_shock_radius(cosine: ArrayLike, bz_nT: ArrayLike, pressure_nPa: ArrayLike) -> Array:
    """Distance of the bow shock from the Earth's centre in a direction.

    Parameters
    ----------
    cosine, bz_nT, pressure_nPa : array_like
        See `magnetopause_radius`.

    Returns
    -------
    ndarray
        In Earth radii: a conic of eccentricity 0.81 whose nose stands 1.3 times as far as the
        magnetopause (1.25 to 1.4), never inside of 1.05 times the magnetopause.

    Examples
    --------
    >>> float(bow_shock_radius(1.0, 0.0, 2.0).round(1))
    13.3
    """
    eps = COEFFICIENTS[3].first
    c = np.asarray(cosine, dtype=np.float64)
    nose = COEFFICIENTS[2].first * magnetopause_standoff(bz_nT, pressure_nPa)
    conic = nose * (1.0 + eps) / (1.0 + eps * c)
    return np.maximum(conic, 1.05 * magnetopause_radius(c, bz_nT, pressure_nPa))


def earth_velocity_m_s(sun_m: ArrayLike) -> Array:
    """Velocity of the Earth about the Sun.

    Parameters
    ----------
    sun_m : array_like, shape (3, N)
        The Sun from the Earth [m], GCRS-like.

    Returns
    -------
    ndarray, shape (3, N)
        [m s-1], a circular orbit: within 1 deg and 2 %.

    Examples
    --------
    >>> earth_velocity_m_s([[1.5e11], [0.0], [0.0]]).round(-2)[:, 0].tolist()
    [0.0, -27300.0, -11900.0]
    """
    sun = direction(sun_m)
    north = np.array(_ECLIPTIC_NORTH)[:, None]
    return EARTH_SPEED_M_S * direction(np.cross(sun, np.broadcast_to(north, sun.shape), axis=0))


def wind_velocity_m_s(sun_m: ArrayLike, speed_m_s: ArrayLike) -> Array:
    """Velocity of the solar wind against the Earth, aberration included.

    Parameters
    ----------
    sun_m : array_like, shape (3, N)
        The Sun from the Earth [m], GCRS-like.
    speed_m_s : array_like, shape (N,)
        Radial speed of the wind [m s-1].

    Returns
    -------
    ndarray, shape (3, N)
        [m s-1], pointing away from the Sun and 4 deg back along the Earth's way.

    Examples
    --------
    >>> wind = wind_velocity_m_s([[1.5e11], [0.0], [0.0]], [4.4e5])
    >>> round(float(np.degrees(np.arccos(-wind[0, 0] / np.linalg.norm(wind)))), 1)
    3.9
    """
    return -np.asarray(speed_m_s) * direction(sun_m) - earth_velocity_m_s(sun_m)
