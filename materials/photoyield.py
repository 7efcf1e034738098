"""Photoyield curves and the saturation photocurrent they give."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import e

from materials.errors import finite_array
from materials.record import PhotoYield


def yield_per_photon(photon_energy_eV: ArrayLike, photoyield: PhotoYield) -> NDArray[np.float64]:
    r"""Electrons per incident photon.

    Log-log between the points of the curve. Zero up to the threshold (the
    first point); from there to the second point
    :math:`Y_2[(E - E_1)/(E_2 - E_1)]^2`, the quadratic rise of Fowler (1931,
    Phys. Rev. 38, 45). Above the last point its value is held.

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
    Holding the last value (100 eV in our curves) is a stated policy, not
    physics: yields in the soft X-ray range follow E times the absorption
    coefficient and jump at edges. Photons above 100 eV carry below a few
    percent of the photocurrent of the quiet sun.

    Examples
    --------
    >>> from materials import load_material
    >>> curve = load_material("gold").photoyield
    >>> yield_per_photon([4.0, 10.2, 500.0], curve).round(4).tolist()
    [0.0, 0.025, 0.04]
    """
    energy = finite_array("photon_energy_eV", photon_energy_eV, at_least=0.0)
    points, values = photoyield.photon_energy_eV, photoyield.electrons_per_photon
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
