"""A solar spectrum in other bins, with photons and energy conserved."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.spectrum import NM_EV, SolarSpectrum


def rebin(spectrum: SolarSpectrum, edge_nm: ArrayLike) -> SolarSpectrum:
    r"""Sort the photons of a spectrum into other wavelength bins.

    Within a bin of the source the irradiance per wavelength is taken as constant, so
    that photons per wavelength rise as the wavelength: the only such law under which
    the energy at the middle wavelength, which the source bins have, is the mean photon
    energy exactly. Each part then keeps its own photons,
    :math:`N(b^2-a^2)/(\lambda_2^2-\lambda_1^2)`, and its own energy,
    :math:`\propto b-a`. Both totals are conserved to rounding, between any edges that
    enclose the source. A line goes into the bin that holds it.

    Parameters
    ----------
    spectrum : SolarSpectrum
        From `solar_spectrum`.
    edge_nm : array_like, (bin + 1,)
        Rising edges [nm], >= 0; photons outside are left out.

    Returns
    -------
    SolarSpectrum
        Its `photon_energy_eV` is the mean energy of the photons of a bin (of the bin's
        middle where it holds none), `band` the band of most of them.

    Raises
    ------
    ValueError
        Fewer than two edges, not rising, negative or not finite.

    Notes
    -----
    Lines lose their place to the width of a bin, which matters near a threshold.

    Examples
    --------
    >>> from environments.spectrum import solar_spectrum
    >>> coarse = rebin(solar_spectrum(), [0.0, 100.0, 200.0, 400.0])
    >>> bool(np.isclose(coarse.photon_flux_m2_s.sum(), solar_spectrum().photon_flux_m2_s.sum()))
    True
    """
    edge = np.asarray(edge_nm, dtype=np.float64)
    if edge.ndim != 1 or edge.size < 2 or not np.all(np.isfinite(edge)):
        raise ValueError("edge_nm must hold at least two finite edges")
    if edge[0] < 0.0 or not np.all(np.diff(edge) > 0.0):
        raise ValueError("edge_nm must rise from 0 or above")
    photons, energy = _parts(spectrum, edge)
    flux = photons.sum(axis=0)
    middle = NM_EV / (0.5 * (edge[1:] + edge[:-1]))
    filled = flux > 0.0
    mean = np.where(filled, energy.sum(axis=0) / np.where(filled, flux, 1.0), middle)
    names = list(dict.fromkeys(spectrum.band))
    member = np.array([[b == name for b in spectrum.band] for name in names], dtype=np.float64)
    by_band = (member[:, :, None] * photons).sum(axis=1)
    low, high = edge[:-1].copy(), edge[1:].copy()
    for array in (low, high, mean, flux):
        array.flags.writeable = False
    return replace(
        spectrum,
        wavelength_low_nm=low,
        wavelength_high_nm=high,
        photon_energy_eV=mean,
        photon_flux_m2_s=flux,
        band=tuple(names[i] for i in by_band.argmax(axis=0)),
    )


def _parts(
    spectrum: SolarSpectrum, edge: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Photons and photons times eV of source bin i in new bin j, both [i, j]."""
    low, high = spectrum.wavelength_low_nm[:, None], spectrum.wavelength_high_nm[:, None]
    a, b = np.maximum(low, edge[:-1]), np.minimum(high, edge[1:])
    width = high - low
    line = width == 0.0
    inside = b > a
    span = np.where(inside, b - a, 0.0) / np.where(line, 1.0, width)
    middle = np.where(inside, b + a, 0.0) / np.where(line, 1.0, high + low)
    in_line = (low >= edge[:-1]) & (low < edge[1:])
    number = np.where(line, in_line, span * middle) * spectrum.photon_flux_m2_s[:, None]
    power = np.where(line, in_line, span)
    energy = power * (spectrum.photon_flux_m2_s * spectrum.photon_energy_eV)[:, None]
    return number, energy
