"""Photoyield curves and the saturation photocurrent they give."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import e

from materials.errors import finite_array
from materials.photo_laws import absorption_factor, fowler_dubridge, law_yield
from materials.record import PhotoYield


def yield_per_photon(photon_energy_eV: ArrayLike, photoyield: PhotoYield) -> NDArray[np.float64]:
    r"""Electrons per incident photon.

    A table is log-log between its points; zero up to the threshold (the
    first point); from there to the second point
    :math:`Y_2[(E - E_1)/(E_2 - E_1)]^2`, the quadratic rise of Fowler (1931,
    Phys. Rev. 38, 45). A law is evaluated as such. Above the last point, by the
    record: its value is held, or :math:`Y_n E\mu(E)/E_n\mu(E_n)` with the mass
    absorption of the record. A yield that counts absorbed photons is multiplied
    by 1 - reflectance.

    Parameters
    ----------
    photon_energy_eV : array_like
        Photon energy [eV], >= 0, any shape.
    photoyield : PhotoYield
        The curve.

    Returns
    -------
    ndarray
        Electrons per photon, same shape.

    Raises
    ------
    ValueError
        Energy negative or not finite.

    Notes
    -----
    Photons above 100 eV, where our curves end, carry below a few percent of the
    photocurrent of the quiet Sun.

    Examples
    --------
    >>> from materials import load_material
    >>> curve = load_material("gold").photoyield
    >>> yield_per_photon([4.0, 10.2, 100.0], curve).round(4).tolist()
    [0.0, 0.025, 0.04]
    """
    energy = finite_array("photon_energy_eV", photon_energy_eV, at_least=0.0)
    points = photoyield.photon_energy_eV
    last = points[-1]
    inside = np.minimum(energy, last)
    if photoyield.law == "table":
        emitted = _table_yield(inside, points, photoyield.electrons_per_photon)
    elif photoyield.law == "fowler_dubridge":
        emitted = fowler_dubridge(
            inside,
            threshold_eV=photoyield.threshold_eV,
            electrons_per_photon_at_1_eV=photoyield.electrons_per_photon_at_1_eV,
            temperature_K=photoyield.temperature_K,
        )
    else:
        emitted = law_yield(
            inside,
            photoyield.threshold_eV,
            photoyield.electrons_per_photon_at_1_eV,
            exponent=photoyield.exponent,
        )
    if photoyield.above_last_point == "x-ray absorption" and photoyield.x_ray is not None:
        emitted = emitted * absorption_factor(
            np.maximum(energy, last),
            sample_energy_eV=photoyield.x_ray.photon_energy_eV,
            mass_absorption_m2_kg=photoyield.x_ray.values,
            from_eV=float(last),
        )
    if photoyield.counts == "absorbed photons" and photoyield.reflectance is not None:
        known = photoyield.reflectance
        emitted = emitted * (1.0 - np.interp(energy, known.photon_energy_eV, known.values))
    return np.asarray(photoyield.level_factor * emitted)


def _table_yield(
    energy: NDArray[np.float64], points: NDArray[np.float64], values: NDArray[np.float64]
) -> NDArray[np.float64]:
    first, second = points[0], points[1]
    rise = values[1] * np.clip((energy - first) / (second - first), 0.0, None) ** 2
    above = np.maximum(energy, second)
    table = np.exp(np.interp(np.log(above), np.log(points[1:]), np.log(values[1:])))
    return np.asarray(np.where(energy < second, rise, table))


def emission_spectrum(
    photon_energy_eV: ArrayLike, photon_flux_m2_s: ArrayLike, photoyield: PhotoYield
) -> NDArray[np.float64]:
    """Electrons emitted per photon bin at normal incidence.

    Parameters
    ----------
    photon_energy_eV : array_like, (..., bin)
        Photon energy of each bin [eV].
    photon_flux_m2_s : array_like, (..., bin)
        Photons arriving in each bin [m-2 s-1], >= 0.
    photoyield : PhotoYield
        The curve.

    Returns
    -------
    ndarray, (..., bin)
        Electron flux [m-2 s-1]; the weights of `escape_fraction`.

    Raises
    ------
    ValueError
        A flux or energy is negative or not finite.

    Examples
    --------
    >>> from materials import load_material
    >>> emission_spectrum([10.2], [4e15], load_material("gold").photoyield).round(-10).tolist()
    [100000000000000.0]
    """
    flux = finite_array("photon_flux_m2_s", photon_flux_m2_s, at_least=0.0)
    return np.asarray(flux * yield_per_photon(photon_energy_eV, photoyield))


def photo_current_density(
    photon_energy_eV: ArrayLike, photon_flux_m2_s: ArrayLike, photoyield: PhotoYield
) -> NDArray[np.float64]:
    """Saturation photocurrent density at normal incidence.

    J = e sum_bins F Y: what leaves when nothing holds electrons back.

    Parameters
    ----------
    photon_energy_eV, photon_flux_m2_s : array_like, (..., bin)
        Energy [eV] and photon flux [m-2 s-1] of each bin.
    photoyield : PhotoYield
        The curve.

    Returns
    -------
    ndarray, (...)
        [A m-2], >= 0: leaving electrons count as positive charge arriving.
        Multiply by the cosine of incidence and by the illumination.

    Raises
    ------
    ValueError
        A flux or energy is negative or not finite.

    Notes
    -----
    Most yield levels were set from published saturation currents: comparing
    the result with those currents is calibration, not validation.

    Examples
    --------
    >>> from materials import load_material
    >>> curve = load_material("gold").photoyield
    >>> float(photo_current_density([10.2], [4e15], curve).round(8))  # Lyman-alpha alone
    1.602e-05
    """
    return np.asarray(e * emission_spectrum(photon_energy_eV, photon_flux_m2_s, photoyield).sum(-1))


def escaping_weights(
    photon_energy_eV: ArrayLike, photon_flux_m2_s: ArrayLike, photoyield: PhotoYield
) -> NDArray[np.float64]:
    """Electrons emitted per photon bin above the threshold, for `escape_fraction`.

    As `emission_spectrum`, but 0 up to the threshold: what a warm metal emits below its
    threshold has no more than kT and counts in the current only.

    Parameters
    ----------
    photon_energy_eV, photon_flux_m2_s, photoyield
        As in `emission_spectrum`.

    Returns
    -------
    ndarray, (..., bin)
        Electron flux [m-2 s-1].

    Raises
    ------
    ValueError
        A flux or energy is negative or not finite.

    Examples
    --------
    >>> from materials import load_material
    >>> escaping_weights([4.0], [1e18], load_material("gold").photoyield).tolist()
    [0.0]
    """
    emitted = emission_spectrum(photon_energy_eV, photon_flux_m2_s, photoyield)
    return np.where(np.asarray(photon_energy_eV) > photoyield.threshold_eV, emitted, 0.0)
