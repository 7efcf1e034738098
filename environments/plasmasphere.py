"""Cold plasma of the inner magnetosphere: plasmasphere, plasmapause, trough."""

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.coefficients import Coefficient

Array = NDArray[np.float64]

_PAPER: Final = "Carpenter & Anderson 1992, J. Geophys. Res. 97, 1097"

COEFFICIENTS: Final = (
    Coefficient("saturated density", (-0.3145, 3.9043), "log10 cm-3", "handbook",
                f"{_PAPER}, as coded in a public library"),
    Coefficient("season and sunspots", (0.15, 0.5, 9.0, 0.00127, 0.0635, 2.0, 1.5), "1", "memory",
                f"{_PAPER}; public codes differ in whether the season decays with L"),
    Coefficient("plasmapause", (5.6, 0.46), "L", "handbook", f"{_PAPER}, in several public codes"),
    Coefficient("width of the plasmapause", (0.1, 0.011), "L", "memory",
                f"{_PAPER}; a public code has 0.010"),
    Coefficient("trough", (5800.0, 300.0, -800.0, 1400.0, -4.5, 2.0, 10.0), "cm-3", "handbook",
                f"{_PAPER}, as coded in a public library"),
    Coefficient("bridge from 15 to 24 h", (15.0, 24.0), "h", "assumed",
                "the paper has no law there: logarithm of the density linear in local time from "
                "the value at 15 h to that at 24 h"),
    Coefficient("sunspots from radio flux", (63.7, 0.728, 8.9e-4), "1", "memory",
                "Stewart & Leftin 1972, Telecomm. J. 39, 159"),
    Coefficient("exponent along the field line, plasmasphere and trough", (1.0, 2.5), "1",
                "memory", "Denton et al. 2002, 2006, J. Geophys. Res. (0 to 1; 2 to 4)"),
    Coefficient("temperature, plasmasphere and trough", (0.7, 2.0), "eV", "memory",
                "3000 to 15000 K, warmer towards the plasmapause: Comfort 1996"),
    Coefficient("H+, He+, O+ of the cold ions", (0.85, 0.13, 0.02), "1", "memory",
                "Craven, Gallagher & Comfort 1997; Farrugia et al. 1989"),
)  # fmt: skip
"""Figures of this module."""

FITTED_L: Final = (2.25, 8.0)
"""Where the paper has data."""

ION_SHARES: Final = COEFFICIENTS[9].value
"""H+, He+ and O+ among the cold ions."""


class ColdPlasma(NamedTuple):
    """Cold electrons at N places.

    Attributes
    ----------
    density_m3 : ndarray
        [m-3].
    plasmasphere_density_m3, trough_density_m3 : ndarray
        What either law alone would give [m-3].
    plasmasphere_share : ndarray
        0 to 1: density = share of the one + rest of the other.
    temperature_eV : ndarray
        [eV], mixed by pressure.
    """

    density_m3: Array
    plasmasphere_density_m3: Array
    trough_density_m3: Array
    plasmasphere_share: Array
    temperature_eV: Array


def plasmapause_l(kp_max_24h: ArrayLike) -> Array:
    """Inner edge of the plasmapause.

    Parameters
    ----------
    kp_max_24h : array_like
        Largest Kp of the 24 h before.

    Returns
    -------
    ndarray
        L. Below 2.25, from Kp 7.3, it lies inside the data of the paper.

    References
    ----------
    Carpenter & Anderson (1992), eq. 6. The paper leaves the last one to three 3-h intervals
    out at 06 to 15 h; here they count.

    Examples
    --------
    >>> plasmapause_l([0.0, 5.0]).round(2).tolist()
    [5.6, 3.3]
    """
    intercept, slope = COEFFICIENTS[2].value
    return np.asarray(intercept - slope * np.asarray(kp_max_24h, dtype=np.float64))


def saturated_density_m3(
    l_shell: ArrayLike, day_of_year: ArrayLike = 0.0, sunspots: ArrayLike | None = None
) -> Array:
    """Equatorial electron density of the filled plasmasphere.

    Parameters
    ----------
    l_shell : array_like
        L, 2.25 to 8.
    day_of_year : array_like, optional
        1 to 366.
    sunspots : array_like, optional
        13-month mean sunspot number; without it the plain law, no season and no cycle.

    Returns
    -------
    ndarray
        [m-3].

    References
    ----------
    Carpenter & Anderson (1992), eq. 5.

    Examples
    --------
    >>> (saturated_density_m3([2.0, 4.0, 6.6]) / 1e6).round(1).tolist()
    [1885.0, 442.9, 67.4]
    """
    L = np.asarray(l_shell, dtype=np.float64)
    slope, offset = COEFFICIENTS[0].value
    exponent = slope * L + offset
    if sunspots is not None:
        size, second, shift, per_spot, base, start, fall = COEFFICIENTS[1].value
        x = 2.0 * np.pi * (np.asarray(day_of_year, dtype=np.float64) + shift) / 365.0
        season = size * (np.cos(x) - second * np.cos(2.0 * x))
        spots = per_spot * np.asarray(sunspots) - base
        exponent = exponent + (season + spots) * np.exp(-(L - start) / fall)
    return np.asarray(1e6 * 10.0**exponent)


def trough_density_m3(l_shell: ArrayLike, local_time_h: ArrayLike) -> Array:
    """Equatorial electron density outside of the plasmapause.

    Parameters
    ----------
    l_shell : array_like
        L, 2.25 to 8.
    local_time_h : array_like
        Magnetic local time, 0 to 24. The paper has 0 to 15; from 15 to 24 the logarithm is
        interpolated between the values at 15 and 0 h (assumed).

    Returns
    -------
    ndarray
        [m-3].

    References
    ----------
    Carpenter & Anderson (1992), eqs. 8 and 9.

    Examples
    --------
    >>> (trough_density_m3(6.6, [3.0, 12.0, 19.5]) / 1e6).round(2).tolist()
    [1.74, 3.65, 2.65]
    """
    L = np.asarray(l_shell, dtype=np.float64)
    t = np.asarray(local_time_h, dtype=np.float64) % 24.0
    low0, low1, high0, high1, power, start, fall = COEFFICIENTS[4].value
    known = np.minimum(t, 15.0)
    factor = np.where(known < 6.0, low0 + low1 * known, high0 + high1 * known)
    background = -np.expm1(-(L - start) / fall)
    law = factor * L**power + np.maximum(background, 0.0)
    midnight = low0 * L**power + np.maximum(background, 0.0)
    first, last = COEFFICIENTS[5].value
    share = np.clip((t - first) / (last - first), 0.0, 1.0)
    return np.asarray(1e6 * law ** (1.0 - share) * midnight**share)


def cold_plasma(
    l_shell: Array,
    local_time_h: Array,
    radius_re: Array,
    day_of_year: Array,
    kp_max_24h: Array,
    f107: Array,
) -> ColdPlasma:
    """Cold electrons at places of the closed magnetosphere.

    Parameters
    ----------
    l_shell, local_time_h, radius_re : ndarray, shape (N,)
        L, magnetic local time [h], distance from the centre in Earth radii.
    day_of_year, kp_max_24h, f107 : ndarray, shape (N,)
        Season and activity.

    Returns
    -------
    ColdPlasma
        Beyond the plasmapause the density falls by a decade in 0.1 to 0.2 of L until it meets
        the trough. Off the equator it rises as (L/r)^1 and (L/r)^2.5.

    Notes
    -----
    Drainage plumes, 10 to 100 cm-3 in the afternoon at geostationary distance after storms (from
    memory: Thomsen et al. 1998; Su et al. 2001), are left out.

    References
    ----------
    Carpenter & Anderson (1992), sec. 4; see `COEFFICIENTS`.
    """
    L = np.minimum(l_shell, 1e3)
    spots = sunspots_from_f107(f107)
    full = saturated_density_m3(L, day_of_year, spots)
    trough = trough_density_m3(L, local_time_h)
    edge = plasmapause_l(kp_max_24h)
    at_edge = saturated_density_m3(edge, day_of_year, spots)
    narrow, widening = COEFFICIENTS[3].value
    t = local_time_h
    width = narrow + widening * np.clip(np.minimum(t, 24.0 - t + 6.0) - 6.0, 0.0, 9.0)
    fall = at_edge * 10.0 ** (-np.clip((L - edge) / width, 0.0, 300.0))
    equatorial = np.where(edge >= L, full, np.maximum(np.minimum(fall, full), trough))
    room = full - trough
    share = np.clip((equatorial - trough) / np.where(room > 0.0, room, 1.0), 0.0, 1.0)
    share = np.where(edge >= L, 1.0, np.where(room > 0.0, share, 0.0))
    along_full, along_trough = COEFFICIENTS[7].value
    farther = np.maximum(L / radius_re, 1.0)
    full = full * farther**along_full
    trough = trough * farther**along_trough
    density = share * full + (1.0 - share) * trough
    warm, warmer = COEFFICIENTS[8].value
    pressure = share * full * warm + (1.0 - share) * trough * warmer
    return ColdPlasma(density, full, trough, share, pressure / density)


def sunspots_from_f107(f107: ArrayLike) -> Array:
    """Sunspot number that belongs to a radio flux, both smoothed.

    Parameters
    ----------
    f107 : array_like
        1e-22 W m-2 Hz-1.

    Returns
    -------
    ndarray
        The root of F = 63.7 + 0.728 R + 8.9e-4 R^2; 0 below 63.7.

    References
    ----------
    Stewart & Leftin (1972), Telecomm. J. 39, 159 (from memory).

    Examples
    --------
    >>> sunspots_from_f107([63.7, 150.0]).round(1).tolist()
    [0.0, 105.1]
    """
    base, slope, curve = COEFFICIENTS[6].value
    above = np.maximum(np.asarray(f107, dtype=np.float64) - base, 0.0)
    return np.asarray((np.sqrt(slope**2 + 4.0 * curve * above) - slope) / (2.0 * curve))
