"""Photocurrents of materials in sunlight, and how positive potential holds them back."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from charging.arguments import as_material, as_number, from_environment
from charging.currents.emission import photo_saturation_A_m2
from charging.errors import InputError
from environments.errors import EnvironmentDataError
from environments.spectrum import NM_EV, SolarSpectrum, solar_spectrum
from materials.photoemission import (
    escape_fraction,
    mean_photoelectron_energy,
    potential_at_escape,
)
from materials.photoyield import emission_spectrum
from materials.record import Material, PhotoYield

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class PhotoRow:
    """Photoemission of one material; None where nothing is emitted.

    Attributes
    ----------
    material : str
    threshold_eV, threshold_nm : float or None
        Photon energy [eV] and wavelength [nm] at which emission begins.
    saturation_current_A_m2 : float
        Current density with every electron escaping, incidence cosine included [A m-2], >= 0.
    potential_at_1_percent_V, potential_at_0p1_percent_V : float or None
        Potential of the surface [V] at which this share still escapes (planar).
    mean_energy_eV : float or None
        Mean kinetic energy of the emitted electrons [eV].
    upper_photon_energy_eV : float or None
        Last point of the yield curve [eV]; above it its yield is held.
    basis, level, source : str or None
        How the curve is known, how its absolute level was found, and where it comes from.
    spread_factor : float or None
        Factor either way by which the yield is uncertain.
    """

    material: str
    threshold_eV: float | None
    threshold_nm: float | None
    saturation_current_A_m2: float
    potential_at_1_percent_V: float | None
    potential_at_0p1_percent_V: float | None
    mean_energy_eV: float | None
    upper_photon_energy_eV: float | None
    basis: str | None
    level: str | None
    source: str | None
    spread_factor: float | None


def photoyield_table(
    materials: Sequence[Material | str],
    *,
    distance_au: float = 1.0,
    f107: float = 150.0,
    incidence_cosine: float = 1.0,
) -> tuple[PhotoRow, ...]:
    """Tabulate the photoemission of materials under the solar spectrum.

    Parameters
    ----------
    materials : sequence of Material or str
        Objects, library names, or files (end in .toml or hold a slash).
    distance_au : float, optional
        Distance from the Sun [AU], 0.01 to 100.
    f107 : float, optional
        Solar radio flux at 10.7 cm and its 81-day mean [1e-22 W m-2 Hz-1], 50 to 500.
    incidence_cosine : float, optional
        Cosine of the angle of incidence, 0 to 1; scales the current only.

    Returns
    -------
    tuple of PhotoRow
        In the order of `materials`.

    Raises
    ------
    InputError
        Unknown name, unusable file, number out of range.

    Notes
    -----
    Most yield levels were set from published saturation currents: the current of such a
    material is a calibration, not a prediction (`PhotoRow.level`).

    Examples
    --------
    >>> row = photoyield_table(["gold"], distance_au=2.0)[0]
    >>> row.threshold_eV, row.saturation_current_A_m2 < 1e-5
    (4.8, True)
    """
    cosine = as_number("incidence_cosine", incidence_cosine, at_least=0.0, high=1.0)
    spectrum = _spectrum(distance_au, f107)
    return tuple(_row(as_material(given), spectrum, cosine) for given in materials)


def retarding_curves(
    materials: Sequence[Material | str],
    potential_V: Array,
    *,
    distance_au: float = 1.0,
    f107: float = 150.0,
    incidence_cosine: float = 1.0,
) -> dict[str, Array]:
    """Photocurrent density that still escapes at positive potentials, by material name.

    Parameters
    ----------
    materials, distance_au, f107, incidence_cosine
        As in `photoyield_table`.
    potential_V : ndarray [N]
        Potential of the surface [V].

    Returns
    -------
    dict of str to ndarray [N]
        [A m-2], >= 0; materials that emit nothing are left out.

    Examples
    --------
    >>> curve = retarding_curves(["gold"], np.array([0.0, 5.0]))["gold"]
    >>> bool(curve[0] > 10.0 * curve[1] > 0.0)
    True
    """
    cosine = as_number("incidence_cosine", incidence_cosine, at_least=0.0, high=1.0)
    spectrum = _spectrum(distance_au, f107)
    curves = {}
    for material in map(as_material, materials):
        if material.photoyield is not None:
            emitted = _emitted(material.photoyield, spectrum)
            escaping = escape_fraction(
                potential_V, spectrum.photon_energy_eV, emitted, material.photoyield.threshold_eV
            )
            curves[material.name] = cosine * photo_saturation_A_m2(material, spectrum) * escaping
    return curves


def _spectrum(distance_au: float, f107: float) -> SolarSpectrum:
    try:
        return solar_spectrum(f107=f107, distance_au=distance_au)
    except EnvironmentDataError as error:
        raise from_environment(error) from None


def _emitted(curve: PhotoYield, spectrum: SolarSpectrum) -> Array:
    return emission_spectrum(spectrum.photon_energy_eV, spectrum.photon_flux_m2_s, curve)


def _row(material: Material, spectrum: SolarSpectrum, cosine: float) -> PhotoRow:
    curve = material.photoyield
    if curve is None:
        return PhotoRow(material.name, None, None, 0.0, *[None] * 8)
    energy, emitted, threshold = (
        spectrum.photon_energy_eV,
        _emitted(curve, spectrum),
        curve.threshold_eV,
    )
    if not emitted.any():
        raise InputError(
            f'material "{material.name}": no photon of the solar spectrum exceeds the threshold',
            key=("photoyield",),
            value=threshold,
        )
    return PhotoRow(
        material=material.name,
        threshold_eV=threshold,
        threshold_nm=NM_EV / threshold,
        saturation_current_A_m2=cosine * photo_saturation_A_m2(material, spectrum),
        potential_at_1_percent_V=potential_at_escape(0.01, energy, emitted, threshold),
        potential_at_0p1_percent_V=potential_at_escape(0.001, energy, emitted, threshold),
        mean_energy_eV=mean_photoelectron_energy(energy, emitted, threshold),
        upper_photon_energy_eV=float(curve.photon_energy_eV[-1]),
        basis=curve.basis,
        level=curve.level,
        source=curve.source,
        spread_factor=curve.spread_factor,
    )
