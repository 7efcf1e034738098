"""Moments of measured spectra, and the two Maxwellians that have them."""

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import e

Array = NDArray[np.float64]

# of the temperature, below which two temperatures count as one
_EQUAL: Final = 1e-6


class TwoMaxwellians(NamedTuple):
    """Densities and temperatures at T times; one may have no density.

    Attributes
    ----------
    cold_density_m3, cold_temperature_eV, hot_density_m3, hot_temperature_eV : ndarray
        [m-3], [eV]; the hot one has the higher temperature.
    single : ndarray of bool
        No two Maxwellians have the moments (a spectrum narrower than a Maxwellian): all
        particles are in the hot one, whose density and pressure are those measured.
    """

    cold_density_m3: Array
    cold_temperature_eV: Array
    hot_density_m3: Array
    hot_temperature_eV: Array
    single: NDArray[np.bool_]


def spectrum_moments(energy_eV: ArrayLike, flux_m2_s_sr_eV: ArrayLike, mass_kg: float) -> Array:
    r"""Four moments of measured spectra.

    Parameters
    ----------
    energy_eV : array_like, shape (K,)
        Channels, rising [eV].
    flux_m2_s_sr_eV : array_like, shape (T, K)
        Directional differential number flux, isotropic, >= 0.
    mass_kg : float
        Of the particle.

    Returns
    -------
    ndarray, shape (4, T)
        Density [m-3], one-sided number flux [m-2 s-1], energy density [eV m-3], one-sided
        energy flux [eV m-2 s-1]. Power laws between channels, phase-space density constant
        below the first, nothing above the last; a channel of zero flux counts as 1e-9 of the
        spectrum's largest.

    Examples
    --------
    >>> E = np.geomspace(10.0, 1e5, 200)
    >>> n, _, energy, _ = spectrum_moments(E, [E * np.exp(-E / 1e3)], 9.109e-31)
    >>> (energy / n).round(0).tolist()  # 3/2 kT
    [1500.0]
    """
    E = np.asarray(energy_eV, dtype=np.float64)
    j = np.asarray(flux_m2_s_sr_eV, dtype=np.float64)
    largest = j.max(axis=-1, keepdims=True)
    held = np.where(largest > 0.0, np.maximum(j, 1e-9 * largest), 1.0)
    ratio = np.log(E[1:] / E[:-1])
    slope = np.log(held[:, 1:] / held[:, :-1]) / ratio
    per_speed = 4.0 * np.pi / np.sqrt(2.0 * e / mass_kg)
    found = []
    for power, factor in ((-0.5, per_speed), (0.0, np.pi), (0.5, per_speed), (1.0, np.pi)):
        # integral of j E^power over each interval, j ~ E^slope
        growth = (slope + power + 1.0) * ratio
        small = np.abs(growth) < 1e-8
        safe = np.where(small, 1.0, growth)
        mean = np.where(small, 1.0 + 0.5 * growth, np.expm1(safe) / safe)
        parts = held[:, :-1] * E[:-1] ** (power + 1.0) * ratio * mean
        below = held[:, 0] * E[0] ** (power + 1.0) / (power + 2.0)
        found.append(factor * (parts.sum(axis=-1) + below))
    return np.where(largest[:, 0] > 0.0, np.stack(found), 0.0)


def two_maxwellians(moments: ArrayLike, mass_kg: float) -> TwoMaxwellians:
    """Two Maxwellians with given moments.

    Parameters
    ----------
    moments : array_like, shape (4, T)
        As `spectrum_moments`.
    mass_kg : float
        Of the particle.

    Returns
    -------
    TwoMaxwellians
        In closed form: the moments are sums of n T^(k/2), k = 0 to 3, so the roots of the
        temperatures are the nodes of a two-point Gauss rule.

    References
    ----------
    Garrett & DeForest (1979), Planet. Space Sci. 27, 1101 (two Maxwellians from four moments;
    from memory).

    Examples
    --------
    >>> n, T = np.array([1e6, 2e5]), np.array([400.0, 9e3])
    >>> v = np.sqrt(e * T / (2 * np.pi * 9.109e-31))
    >>> four = [[sum(n)], [sum(n * v)], [sum(1.5 * n * T)], [sum(2 * n * T * v)]]
    >>> found = two_maxwellians(four, 9.109e-31)
    >>> found.cold_temperature_eV.round(3).tolist(), found.hot_density_m3.round(3).tolist()
    ([400.0], [200000.0])
    """
    n, flux, energy, energy_flux = np.asarray(moments, dtype=np.float64)
    thermal = np.sqrt(e / (2.0 * np.pi * mass_kg))
    some = n > 0.0
    one = np.where(some, n, 1.0)
    m1, m2, m3 = (
        np.where(some, m / (c * one), 1.0)
        for m, c in ((flux, thermal), (energy, 1.5), (energy_flux, 2.0 * thermal))
    )
    spread = m2 - m1**2
    two = some & (spread > _EQUAL * m2) & (m1 * m3 > m2**2)
    safe = np.where(two, spread, 1.0)
    # nodes of x^2 - b x + c from the moments 1, m1, m2, m3
    b = (m3 - m1 * m2) / safe
    c = (m1 * m3 - m2**2) / safe
    root = np.sqrt(np.maximum(b * b / 4.0 - c, 0.0))
    high = b / 2.0 + root
    two &= (c > 0.0) & (root > 0.0)
    low = np.where(two, c / np.where(high > 0.0, high, 1.0), np.sqrt(m2))
    high = np.where(two, high, np.sqrt(m2))
    share = np.where(two, (m1 - low) / np.where(two, high - low, 1.0), 1.0)
    return TwoMaxwellians(
        n * (1.0 - share), low**2, n * share, high**2, some & ~two
    )  # fmt: skip
