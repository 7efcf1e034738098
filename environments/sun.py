"""Where the Sun stands, how much of it a spacecraft sees, and its eclipses."""

from collections.abc import Callable
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.earth_axes import centuries_tt, equinox_of_date_to_j2000
from environments.earth_series import sun_of_date
from environments.timescales import utc_at
from environments.vectors import as_vectors, length

Path = Callable[[NDArray[np.float64]], NDArray[np.float64]]
"""Positions [m], shape (3, N), at times [s], shape (N,)."""

ASTRONOMICAL_UNIT_M: Final = 149597870700.0
"""IAU 2012 resolution B2, exact."""

SOLAR_RADIUS_M: Final = 6.957e8
"""Nominal solar radius, IAU 2015 resolution B3 (photosphere)."""


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
    Within 0.001 deg and 1e-5 of the distance from 1972 to 2055 (tested). Left out: smaller
    terms of the series and the angle between the ecliptic of the theory and that of the
    equinox. An error of 0.001 deg moves the edge of a geostationary eclipse by 0.25 s, of a
    grazed one by more.

    References
    ----------
    See `environments.earth_series.sun_of_date` and
    `environments.earth_axes.equinox_of_date_to_j2000`.

    Examples
    --------
    >>> x, y, z = sun_position_m(np.array(["2000-06-21T02:00"], "datetime64[ns]"))[:, 0]
    >>> round(float(np.degrees(np.arctan2(z, np.hypot(x, y)))), 2)
    23.44
    """
    T = centuries_tt(times)
    lon, lat, r = sun_of_date(T)
    r = r * ASTRONOMICAL_UNIT_M
    obliquity = np.radians(23.439291 - 0.0130042 * T)
    cos, sin = np.cos(obliquity), np.sin(obliquity)
    x, y, z = r * np.cos(lat) * np.cos(lon), r * np.cos(lat) * np.sin(lon), r * np.sin(lat)
    return equinox_of_date_to_j2000(np.stack((x, cos * y - sin * z, sin * y + cos * z)), T)


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
    1.0166
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
    position_m: ArrayLike,
    sun_m: ArrayLike,
    body_radius_m: float,
    *,
    polar_radius_m: float | None = None,
) -> NDArray[np.float64]:
    """Share of the Sun's disc that a sphere or a flattened body leaves free.

    Parameters
    ----------
    position_m : array_like, shape (3, N)
        Of the spacecraft from the centre of the body [m].
    sun_m : array_like, shape (3, N) or (3, 1)
        Of the Sun from the centre of the body [m].
    body_radius_m : float
        Radius that stops light [m], at the equator of a flattened body, with the height of
        an absorbing atmosphere added if one is wanted; see `earth_shadow_radii_m`.
    polar_radius_m : float, optional
        Radius that stops light along z [m]; without it the body is a sphere.

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
    disc has uniform brightness. Refraction, which bends light into the shadow, is left out.

    A flattened body is stretched along z to a sphere, and the scene with it. That keeps
    every line of sight. The Sun's disc, stretched too, counts as a circle with its size
    towards the limb of the body: exact at contacts, between them to 0.2 % of the share. The
    axis is z of J2000, from which the Earth's has moved by 0.17 deg in 2031: the limb
    moves by less than 0.1 km.
    The Earth as a sphere instead: its poles lie 21 km deeper, which is 8 s of a 400 km orbit
    at beta 0 and more where the shadow is grazed.

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
    if not (np.isfinite(body_radius_m) and body_radius_m > 0.0):
        raise ValueError("body_radius_m must be finite and positive")
    stretch = polar_stretch(body_radius_m, polar_radius_m)
    position = as_vectors(position_m, "position_m") * stretch
    to_sun = as_vectors(sun_m, "sun_m") * stretch - position
    radius, sun_distance = length(position), length(to_sun)
    if not bool((radius >= body_radius_m).all()):
        raise ValueError("position_m lies inside the body")
    if not bool((sun_distance > SOLAR_RADIUS_M).all()):
        raise ValueError("position_m lies inside the Sun")
    along = np.sum(position * to_sun, axis=0) / sun_distance**2
    off = position - along * to_sun
    limb = off[2] / np.maximum(length(off), 0.5 * body_radius_m)
    a = np.arcsin(stretched_solar_radius_m(limb, float(stretch[2, 0])) / sun_distance)
    b = np.arcsin(body_radius_m / radius)  # apparent radius of the body
    c = np.arctan2(length(np.cross(to_sun, -position, axis=0)), np.sum(to_sun * -position, axis=0))
    return _free_share(a, b, c)


def earth_shadow_radii_m(absorbing_height_m: float = 0.0) -> tuple[float, float]:
    """Equatorial and polar radius of the Earth and an absorbing atmosphere.

    Parameters
    ----------
    absorbing_height_m : float, optional
        Height up to which the air stops the light in question [m]: 0 for comparisons with
        other geometry, about 150 km (assumed) for the far ultraviolet that drives
        photoemission.

    Returns
    -------
    equatorial, polar : float
        [m].

    Raises
    ------
    ValueError
        Height negative or not finite.

    References
    ----------
    WGS 84, flattening 1/298.257223563 (from memory).

    Examples
    --------
    >>> [round(radius) for radius in earth_shadow_radii_m()]
    [6378137, 6356752]
    """
    if not (np.isfinite(absorbing_height_m) and absorbing_height_m >= 0.0):
        raise ValueError("absorbing_height_m must be finite and not negative")
    equatorial = 6378137.0
    polar = equatorial * (1.0 - 1.0 / 298.257223563)
    return equatorial + absorbing_height_m, polar + absorbing_height_m


def polar_stretch(body_radius_m: float, polar_radius_m: float | None) -> NDArray[np.float64]:
    """Factors, shape (3, 1), that turn a flattened body into a sphere.

    Raises
    ------
    ValueError
        Polar radius not positive, larger than the other, or flattened by more than 10 %.

    Examples
    --------
    >>> polar_stretch(2.0, 1.9)[:, 0].round(4).tolist()
    [1.0, 1.0, 1.0526]
    """
    polar = body_radius_m if polar_radius_m is None else polar_radius_m
    if not 0.9 * body_radius_m <= polar <= body_radius_m:
        raise ValueError("polar_radius_m must be 0.9 to 1 times body_radius_m")
    return np.array([[1.0], [1.0], [body_radius_m / polar]])


def stretched_solar_radius_m(limb_z: NDArray[np.float64], stretch: float) -> NDArray[np.float64]:
    """Size of the Sun stretched along z, towards a direction across the line of sight [m].

    Parameters
    ----------
    limb_z : ndarray
        z component of the unit vector of the direction.
    stretch : float
        Factor along z.

    Examples
    --------
    >>> stretched_solar_radius_m(np.array([0.0, 1.0]), 1.001).round(3).tolist()
    [695700000.0, 696395700.0]
    """
    return np.asarray(SOLAR_RADIUS_M * np.sqrt(1.0 + (stretch**2 - 1.0) * limb_z**2))


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
    return lambda seconds: sun_position_m(utc_at(epoch, seconds))


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
