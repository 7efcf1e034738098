"""Where in the magnetosphere a spacecraft is: centred dipole, L, magnetic local time."""

from dataclasses import dataclass
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.earth_axes import earth_fixed_to_j2000
from environments.vectors import as_vectors, direction, length

Array = NDArray[np.float64]

MEAN_RADIUS_M: Final = 6371.2e3
"""Reference radius of the field model; L counts in it."""

# Dipole coefficients g10, g11, h11 [nT] and their change a year, 2025.0 (from memory,
# checked in the tests against 2020 and the pole).
_YEAR: Final = 2025.0
_COEFFICIENTS_NT: Final = (-29350.0, -1410.3, 4545.5)
_CHANGE_NT: Final = (12.6, 10.0, -21.5)


class MagneticPlace(NamedTuple):
    """Place in the magnetosphere at N times.

    Attributes
    ----------
    dipole_latitude_deg : ndarray, shape (N,)
        -90 to 90, positive north.
    l_shell : ndarray, shape (N,)
        Distance of the dipole's field line from the centre at the magnetic equator, in
        units of 6371.2 km; inf on the dipole's axis.
    magnetic_local_time_h : ndarray, shape (N,)
        0 to 24, 12 under the Sun, 0 at midnight, 6 at dawn.
    """

    dipole_latitude_deg: Array
    l_shell: Array
    magnetic_local_time_h: Array


@dataclass(frozen=True, slots=True)
class Dipole:
    """Centred dipole of the Earth in a year.

    Attributes
    ----------
    colatitude_deg, longitude_deg : float
        Of its northern axis on the ground.
    equatorial_field_T : float
        On the ground at the magnetic equator [T].
    """

    colatitude_deg: float
    longitude_deg: float
    equatorial_field_T: float


def dipole(year: float) -> Dipole:
    """Centred dipole of a year.

    Parameters
    ----------
    year : float
        1995 to 2040; the change a year of 2025 to 2030 is held.

    Returns
    -------
    Dipole
        Within 0.15 deg and 0.3 % for 2015 to 2035, 0.5 deg beyond.

    Raises
    ------
    ValueError
        Another year.

    References
    ----------
    International Geomagnetic Reference Field, 14th generation (Alken et al. 2021 describe
    the 13th), first-degree coefficients (from memory).

    Examples
    --------
    >>> axis = dipole(2025.0)
    >>> round(90.0 - axis.colatitude_deg, 2), round(axis.longitude_deg, 2)
    (80.79, -72.76)
    """
    if not 1995.0 <= year <= 2040.0:
        raise ValueError(f"year = {year} is outside 1995 to 2040")
    passed = year - _YEAR
    g10, g11, h11 = (c + d * passed for c, d in zip(_COEFFICIENTS_NT, _CHANGE_NT, strict=True))
    size = float(np.sqrt(g10**2 + g11**2 + h11**2))
    return Dipole(
        float(np.degrees(np.arccos(-g10 / size))),
        float(np.degrees(np.arctan2(-h11, -g11))),
        1e-9 * size,
    )


def magnetic_place(position_m: ArrayLike, sun_m: ArrayLike, times: ArrayLike) -> MagneticPlace:
    """Dipole latitude, L and magnetic local time.

    Parameters
    ----------
    position_m, sun_m : array_like, shape (3, N)
        Of the spacecraft and the Sun from the Earth's centre [m], GCRS-like.
    times : array_like of datetime64, shape (N,)
        UTC, 1995 to 2040; the dipole is that of their middle.

    Returns
    -------
    MagneticPlace

    Raises
    ------
    ValueError
        Shapes that do not fit, times outside the years of the dipole.

    Notes
    -----
    A centred dipole, nothing of the rest of the field, which is (from memory): in low orbit
    up to 10 deg of latitude and 20 % of L, worst over the South Atlantic, where the
    dipole's offset of 550 km counts; at geostationary distance 5 % of L, and 1 of L at
    night in a storm, when currents stretch the field. Magnetic local time within 0.5 h below
    60 deg of magnetic latitude. The Earth's axes are good to 0.01 deg.

    References
    ----------
    Kivelson & Russell (1995), Introduction to Space Physics, ch. 6 and 10 (dipole field
    lines, L, local time; chapters from memory).

    Examples
    --------
    >>> noon = np.array(["2031-03-20T12:00:00"], "datetime64[ns]")
    >>> sunward = [[4.2164e7], [0.0], [0.0]]
    >>> place = magnetic_place(sunward, [[1.5e11], [0.0], [0.0]], noon)
    >>> place.magnetic_local_time_h.round(6).tolist(), place.l_shell.round(1).tolist()
    ([12.0], [6.6])
    """
    position, sun = as_vectors(position_m, "position_m"), as_vectors(sun_m, "sun_m")
    stamps = np.asarray(times)
    if stamps.shape != position.shape[1:] or position.shape != sun.shape:
        raise ValueError("position_m, sun_m and times must hold the same number of times")
    if not stamps.size:
        empty = np.empty(0)
        return MagneticPlace(empty, empty, empty)
    axis = dipole_axis(stamps)
    radius = length(position)
    sine = np.clip(np.sum(axis * position, axis=0) / radius, -1.0, 1.0)
    cosine2 = (1.0 - sine) * (1.0 + sine)
    with np.errstate(divide="ignore"):
        shell = radius / MEAN_RADIUS_M / cosine2
    # angle about the axis from the Sun's meridian, eastward
    east = np.sum(axis * np.cross(sun, position, axis=0), axis=0)
    along = np.sum(sun * position, axis=0) - np.sum(axis * sun, axis=0) * radius * sine
    hours = (12.0 + np.degrees(np.arctan2(east, along)) / 15.0) % 24.0
    return MagneticPlace(np.degrees(np.arcsin(sine)), shell, hours)


def dipole_axis(times: ArrayLike) -> Array:
    """Northern axis of the centred dipole in inertial axes.

    Parameters
    ----------
    times : array_like of datetime64, shape (N,)
        UTC; the dipole is that of the middle between first and last.

    Returns
    -------
    ndarray, shape (3, N)
        Unit vectors, GCRS-like.

    Examples
    --------
    >>> axis = dipole_axis(np.array(["2031-03-20T12:00:00"], "datetime64[ns]"))
    >>> round(float(np.degrees(np.arccos(axis[2, 0]))))  # from the Earth's axis [deg]
    9
    """
    stamps = np.asarray(times).astype("datetime64[ns]")
    middle = stamps.min() + (stamps.max() - stamps.min()) / 2
    days = (middle - np.datetime64("2000-01-01", "ns")) / np.timedelta64(86400, "s")
    now = dipole(2000.0 + float(days) / 365.25)
    colatitude, longitude = np.radians(now.colatitude_deg), np.radians(now.longitude_deg)
    fixed = [
        [np.sin(colatitude) * np.cos(longitude)],
        [np.sin(colatitude) * np.sin(longitude)],
        [np.cos(colatitude)],
    ]
    return direction(earth_fixed_to_j2000(fixed, stamps))
