"""How photoelectrons leave a lit body at positive potential: from a plane or a point.

The energies come from `materials`, the light from `environments`. Near a body that is
large against the sheath of its own photoelectrons the normal energy decides; near a small
one the whole energy. Between the two limits the sheath length blends.
"""

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray
from scipy.constants import e, epsilon_0, k, m_e

from environments.spectrum import SolarSpectrum
from materials.photoemission import (
    escape_fraction,
    low_energy_peak,
    mean_photoelectron_energy,
)
from materials.photoyield import escaping_weights, photo_current_density
from materials.record import Material

Array = NDArray[np.float64]

PhotoGeometry = Literal["auto", "planar", "point source"]
PHOTO_GEOMETRIES: tuple[PhotoGeometry, ...] = ("auto", "planar", "point source")
"""`auto` blends by the Debye length of the photoelectrons."""


@dataclass(frozen=True, slots=True)
class PhotoSheath:
    """Photoelectrons in front of one surface in full sun at normal incidence, all returning.

    Attributes
    ----------
    saturation_current_A_m2 : float
        Emitted current density [A m-2].
    mean_energy_eV : float
        Mean kinetic energy of what is emitted [eV].
    temperature_eV : float
        Of the Maxwellian with that mean energy in its flux: half of it [eV].
    density_m3 : float
        Density at the surface, outward and returning together [m-3].
    debye_length_m : float
        Debye length of that density and temperature [m].
    """

    saturation_current_A_m2: float
    mean_energy_eV: float
    temperature_eV: float
    density_m3: float
    debye_length_m: float


def photo_sheath(material: Material, spectrum: SolarSpectrum) -> PhotoSheath | None:
    r"""Return the photoelectron sheath of a material, None where nothing is emitted.

    :math:`n = (J/e)\sqrt{2\pi m/eT}` and :math:`\lambda = \sqrt{\varepsilon_0 T/ne}` with
    T half the mean energy.

    References
    ----------
    Grard (1973), J. Geophys. Res. 78, 2885 (memory). For 85 uA m-2 and 2.1 eV it gives
    2.2e9 m-3; Nakagawa et al. (2000), Earth Planets Space 52, 283, found 2.9e9 +- 1.4e9.
    """
    curve = material.photoyield
    if curve is None:
        return None
    energy, flux = spectrum.photon_energy_eV, spectrum.photon_flux_m2_s
    current = float(photo_current_density(energy, flux, curve))
    if curve.energies is not None:
        return sheath_of(current, curve.energies.mean_energy_eV) if current > 0.0 else None
    weight = escaping_weights(energy, flux, curve)
    if not np.any(weight > 0.0):
        return None
    mean = mean_photoelectron_energy(
        energy, weight, curve.threshold_eV, peak=low_energy_peak(material)
    )
    return sheath_of(current, mean)


def sheath_of(saturation_current_A_m2: float, mean_energy_eV: float) -> PhotoSheath:
    """Return the sheath of a current density [A m-2] and a mean energy [eV], both > 0.

    Examples
    --------
    >>> sheath = sheath_of(85e-6, 2 * 2.1)
    >>> f"{sheath.density_m3:.2g} {sheath.debye_length_m:.2f}"
    '2.2e+09 0.23'
    """
    temperature = 0.5 * mean_energy_eV
    density = saturation_current_A_m2 / e * np.sqrt(2.0 * np.pi * m_e / (e * temperature))
    debye = np.sqrt(epsilon_0 * temperature / (density * e))
    return PhotoSheath(
        saturation_current_A_m2, mean_energy_eV, temperature, float(density), float(debye)
    )


def point_source_weight(sheath: PhotoSheath, radius_m: float) -> float:
    r"""Share of point-source escape from a body, 0…1.

    :math:`w = \lambda^2/(\lambda^2+R^2)` with the Debye length of the photoelectrons, the
    form that collection uses; the blend is ours (assumed).

    Parameters
    ----------
    sheath : PhotoSheath
    radius_m : float
        Radius of the body [m].

    Notes
    -----
    The potential does not enter. A sheath of photoelectrons alone widens as
    :math:`e^{V/2T}`, so that far above T a metre-sized body would be a point; with our
    energies that lifts quiet geostationary potentials from 17-19 V to 25-30 V, away from
    the observed 2-15 V (memory), so it is left out.

    Examples
    --------
    >>> round(point_source_weight(sheath_of(85e-6, 4.2), 1.0), 3)
    0.05
    """
    s2 = sheath.debye_length_m**2
    return s2 / (s2 + radius_m**2)


def photo_escape(
    potential_V: Array,
    material: Material,
    spectrum: SolarSpectrum,
    *,
    radius_m: float,
    geometry: str = "auto",
) -> Array:
    """Share of the photoelectrons of a surface that leave, 1 where nothing is emitted.

    Parameters
    ----------
    potential_V : ndarray
        Height that must be climbed [V].
    material : Material
    spectrum : SolarSpectrum
    radius_m : float
        Radius of the body [m], for "auto".
    geometry : str
        One of `PHOTO_GEOMETRIES`.

    Returns
    -------
    ndarray
        0…1, the shape of `potential_V`.
    """
    sheath, curve = photo_sheath(material, spectrum), material.photoyield
    if sheath is None or curve is None:
        if curve is not None and curve.temperature_K > 0.0:  # what a warm metal emits below
            return np.exp(-np.maximum(potential_V, 0.0) * e / (k * curve.temperature_K))
        return np.ones_like(potential_V)
    energy = spectrum.photon_energy_eV
    weight = escaping_weights(energy, spectrum.photon_flux_m2_s, curve)
    peak = low_energy_peak(material)

    def limit(which: Literal["planar", "point source"]) -> Array:
        if curve.energies is not None:
            return curve.energies.escape(potential_V, which)
        return escape_fraction(
            potential_V, energy, weight, curve.threshold_eV, geometry=which, peak=peak
        )

    if geometry == "planar":
        return limit("planar")
    if geometry == "point source":
        return limit("point source")
    plane = limit("planar")
    share = point_source_weight(sheath, radius_m)
    return np.asarray(plane + share * (limit("point source") - plane))
