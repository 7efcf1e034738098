"""Laws of photoelectric yield near the threshold, at oblique incidence and in X-rays."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import e, k
from scipy.special import spence

from materials.errors import finite_array


def fowler_function(x: ArrayLike) -> NDArray[np.float64]:
    r"""Fowler's function of the reduced excess energy.

    :math:`f(x) = \int_0^\infty \ln(1 + e^{x-y})\,dy = -\mathrm{Li}_2(-e^x)`,
    which Fowler wrote as the series :math:`e^x - e^{2x}/4 + e^{3x}/9 - \dots` for
    x <= 0 and :math:`\pi^2/6 + x^2/2 - (e^{-x} - e^{-2x}/4 + \dots)` for x >= 0.

    Parameters
    ----------
    x : array_like
        (hv - threshold)/kT, any shape.

    Returns
    -------
    ndarray
        > 0 (0 where exp(x) underflows), rising.

    Raises
    ------
    ValueError
        Not finite.

    References
    ----------
    Fowler (1931), Phys. Rev. 38, 45, eq. for phi(x) (number from memory).

    Examples
    --------
    >>> round(float(fowler_function(0.0)), 12) == round(np.pi**2 / 12.0, 12)
    True
    """
    x = finite_array("x", x)
    # spence(1 + e^-|x|) = Li2(-e^-|x|); the identity of the dilogarithm joins the sides.
    # Where 1 + t has lost digits of t = e^-|x|, Fowler's own series: 40 terms below 1/e
    t = np.exp(-np.abs(x))
    small = np.where(t < np.exp(-1.0), t, 0.0)
    series = np.zeros_like(small)
    for n in range(40, 0, -1):
        series = small * ((1.0 if n % 2 else -1.0) / n**2 + series)
    low = np.where(t < np.exp(-1.0), series, -spence(1.0 + t))
    return np.asarray(np.where(x <= 0.0, low, np.pi**2 / 6.0 + 0.5 * x**2 - low))


def fowler_dubridge(
    photon_energy_eV: ArrayLike,
    *,
    threshold_eV: float,
    electrons_per_photon_at_1_eV: float,
    temperature_K: float = 0.0,
) -> NDArray[np.float64]:
    r"""Yield of a metal near its threshold at a temperature.

    :math:`Y = 2 Y_1 (kT)^2 f[(h\nu-\Phi)/kT]`, energies in eV; at 0 K
    :math:`Y_1 (h\nu-\Phi)^2` above the threshold and 0 below.

    Parameters
    ----------
    photon_energy_eV : array_like
        Photon energy [eV], >= 0.
    threshold_eV : float
        Work function [eV].
    electrons_per_photon_at_1_eV : float
        :math:`Y_1`, the yield 1 eV above the threshold at 0 K.
    temperature_K : float, optional
        Temperature of the metal [K], >= 0.

    Returns
    -------
    ndarray
        Electrons per photon, same shape.

    Raises
    ------
    ValueError
        Negative or not finite.

    Notes
    -----
    Valid within 1 to 2 eV of the threshold: bands, optics and escape depth enter beyond.

    References
    ----------
    Fowler (1931), Phys. Rev. 38, 45; DuBridge (1933), Phys. Rev. 43, 727.

    Examples
    --------
    >>> fowler_dubridge([4.0, 5.5], threshold_eV=4.5, electrons_per_photon_at_1_eV=1e-5).tolist()
    [0.0, 1e-05]
    """
    energy = finite_array("photon_energy_eV", photon_energy_eV, at_least=0.0)
    finite_array("temperature_K", temperature_K, at_least=0.0)
    thermal = k * temperature_K / e
    if thermal == 0.0:
        return law_yield(energy, threshold_eV, electrons_per_photon_at_1_eV, exponent=2.0)
    excess = (energy - threshold_eV) / thermal
    return np.asarray(2.0 * electrons_per_photon_at_1_eV * thermal**2 * fowler_function(excess))


def law_yield(
    photon_energy_eV: ArrayLike,
    threshold_eV: float,
    electrons_per_photon_at_1_eV: float,
    *,
    exponent: float,
) -> NDArray[np.float64]:
    r"""Power law of the yield near a threshold, :math:`Y_1 (h\nu - E_T)^n`.

    Parameters
    ----------
    photon_energy_eV : array_like
        Photon energy [eV].
    threshold_eV : float
        :math:`E_T` [eV].
    electrons_per_photon_at_1_eV : float
        :math:`Y_1`.
    exponent : float
        n, 1 to 5/2: 1 for direct excitation without scattering, 3/2 from surface states,
        2 for indirect excitation or a metal, 5/2 with scattering (Kane; which case has
        which exponent from memory).

    Returns
    -------
    ndarray
        Electrons per photon; 0 up to the threshold.

    Raises
    ------
    ValueError
        Exponent outside 1 to 5/2, energy not finite.

    References
    ----------
    Kane (1962), Phys. Rev. 127, 131.

    Examples
    --------
    >>> law_yield([8.0, 9.0, 13.0], 9.0, 1e-3, exponent=1.5).round(6).tolist()
    [0.0, 0.0, 0.008]
    """
    energy = finite_array("photon_energy_eV", photon_energy_eV)
    finite_array("exponent", exponent, at_least=1.0, at_most=2.5)
    excess = np.maximum(energy - threshold_eV, 0.0)
    return np.asarray(electrons_per_photon_at_1_eV * excess**exponent)


def incidence_factor(
    incidence_cosine: ArrayLike, *, largest_growth: float = 1.0
) -> NDArray[np.float64]:
    r"""Photocurrent at oblique incidence over that at normal incidence.

    The light per area falls as :math:`\cos\theta`; the yield may grow as
    :math:`1/\cos\theta`, because photons are absorbed closer to the surface, up to
    `largest_growth`. 1 (no growth) is this project's default.

    Parameters
    ----------
    incidence_cosine : array_like
        0 to 1.
    largest_growth : float, optional
        Cap of the growth, >= 1; 1 to 2.5 is what the literature spans (memory).

    Returns
    -------
    ndarray
        0 to 1: :math:`\min(1, c \cdot growth)`.

    Raises
    ------
    ValueError
        Cosine outside 0 to 1, growth below 1.

    References
    ----------
    Samson, Techniques of Vacuum Ultraviolet Spectroscopy; Feuerbacher & Fitton (1972), J.
    Appl. Phys. 43, 1563 (memory; no single accepted law).

    Examples
    --------
    >>> incidence_factor([0.0, 0.5, 0.8, 1.0], largest_growth=1.5).tolist()
    [0.0, 0.75, 1.0, 1.0]
    """
    cosine = finite_array("incidence_cosine", incidence_cosine, at_least=0.0, at_most=1.0)
    finite_array("largest_growth", largest_growth, at_least=1.0)
    return np.asarray(np.minimum(1.0, cosine * largest_growth))


def absorption_factor(
    photon_energy_eV: ArrayLike,
    *,
    sample_energy_eV: ArrayLike,
    mass_absorption_m2_kg: ArrayLike,
    from_eV: float,
) -> NDArray[np.float64]:
    r"""X-ray yield over the yield at one energy, :math:`E\mu(E)/E_0\mu(E_0)`.

    Each absorbed photon turns its energy into secondaries, and those freed within
    the escape depth leave.

    Parameters
    ----------
    photon_energy_eV : array_like
        E [eV], > 0.
    sample_energy_eV, mass_absorption_m2_kg : array_like, (point,)
        Mass absorption coefficient; log-log between points, last slope beyond.
    from_eV : float
        :math:`E_0` [eV].

    Returns
    -------
    ndarray
        1 at :math:`E_0`.

    References
    ----------
    Henke, Knauer & Premaratne (1981), J. Appl. Phys. 52, 1509 (memory).

    Examples
    --------
    >>> absorption_factor(400.0, sample_energy_eV=[100, 1000],
    ...                   mass_absorption_m2_kg=[1e4, 10.0], from_eV=100.0).round(6).item()
    0.0625
    """
    x, y = np.log(np.asarray(sample_energy_eV)), np.log(np.asarray(mass_absorption_m2_kg))

    def energy_times_absorption(energy: NDArray[np.float64]) -> NDArray[np.float64]:
        log_energy = np.log(energy)
        beyond = np.maximum(log_energy - x[-1], 0.0) * (y[-1] - y[-2]) / (x[-1] - x[-2])
        return np.asarray(log_energy + np.interp(log_energy, x, y) + beyond)

    here = energy_times_absorption(finite_array("photon_energy_eV", photon_energy_eV, above=0.0))
    return np.asarray(np.exp(here - energy_times_absorption(np.asarray(from_eV))))
