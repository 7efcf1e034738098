"""Photocurrents of materials in sunlight, and how positive potential holds them back."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import TypedDict, Unpack

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import e
from scipy.optimize import brentq

from charging.arguments import (
    as_choice,
    as_material,
    as_number,
    from_environment,
    in_surface_state,
)
from charging.currents.emission import photo_saturation_A_m2
from charging.currents.photo_escape import (
    PHOTO_GEOMETRIES,
    PhotoSheath,
    photo_escape,
    photo_sheath,
    point_source_weight,
)
from environments.errors import EnvironmentDataError
from environments.spectrum import BANDS, NM_EV, SolarSpectrum, photon_flux, solar_spectrum
from materials.photo_laws import incidence_factor
from materials.photoyield import emission_spectrum, yield_per_photon
from materials.record import Material

Array = NDArray[np.float64]

LARGEST_RADIUS_M = 1000.0


@dataclass(frozen=True, slots=True)
class BandShare:
    """What one band of the solar spectrum gives.

    Attributes
    ----------
    band : str
        Name in `environments.spectrum.BANDS`.
    current_A_m2 : float
        Its part of the saturation current [A m-2].
    share : float
        The same over the whole, 0…1.
    """

    band: str
    current_A_m2: float
    share: float


@dataclass(frozen=True, slots=True, kw_only=True)
class PhotoRow:
    """Photoemission of one material; None where nothing is emitted.

    Attributes
    ----------
    material, surface_state : str
    threshold_eV, threshold_nm : float or None
        Photon energy [eV] and wavelength [nm] at which emission begins.
    saturation_current_A_m2 : float
        Current density with every electron escaping, incidence cosine included [A m-2], >= 0.
    potential_at_1_percent_V, potential_at_0p1_percent_V : float or None
        Potential of the surface [V] at which this share still escapes.
    mean_energy_eV : float or None
        Mean kinetic energy of the emitted electrons [eV].
    upper_photon_energy_eV : float or None
        Last point of the yield curve [eV].
    basis, level, source : str or None
        How the curve is known, how its absolute level was found, and where it comes from.
    spread_factor : float or None
        Factor either way by which the yield is uncertain.
    above_last_point : str or None
        What holds above the last point: "hold" or "x-ray absorption".
    electron_energies : str or None
        "photons", or the law that the record prescribes.
    photo_escape : str
        Geometry of escape: auto, planar, point source.
    photoelectron_debye_length_m, photoelectron_density_m3 : float or None
        Of the photoelectrons in front of the surface at normal incidence [m], [m-3].
    point_source_share : float or None
        Share of point-source escape, 0…1; the rest is planar.
    bands : tuple of BandShare
    """

    material: str
    surface_state: str
    threshold_eV: float | None = None
    threshold_nm: float | None = None
    saturation_current_A_m2: float
    potential_at_1_percent_V: float | None = None
    potential_at_0p1_percent_V: float | None = None
    mean_energy_eV: float | None = None
    upper_photon_energy_eV: float | None = None
    basis: str | None = None
    level: str | None = None
    source: str | None = None
    spread_factor: float | None = None
    above_last_point: str | None = None
    electron_energies: str | None = None
    photo_escape: str
    photoelectron_debye_length_m: float | None = None
    photoelectron_density_m3: float | None = None
    point_source_share: float | None = None
    bands: tuple[BandShare, ...] = ()


class SunlightOptions(TypedDict, total=False):
    """The attributes of `Sunlight` as keywords."""

    distance_au: float
    f107: float
    incidence_cosine: float
    surface_state: str
    photo_escape: str
    radius_m: float
    flare: Mapping[str, float]


@dataclass(frozen=True, slots=True, kw_only=True)
class Sunlight:
    """How materials are lit and what holds their photoelectrons; keywords of this module.

    Attributes
    ----------
    distance_au : float
        Distance from the Sun [AU], 0.01 to 100.
    f107 : float
        Solar radio flux at 10.7 cm and its 81-day mean [1e-22 W m-2 Hz-1], 50 to 500.
    incidence_cosine : float
        Cosine of the angle of incidence, 0 to 1; scales the current only.
    surface_state : str
        "as recorded", "clean", "air-exposed" or "aged", see `materials.surface_state`.
    photo_escape : {"planar", "point source", "auto"}
        Geometry of escape; auto: between the two by Debye length and `radius_m`.
    radius_m : float
        Radius of the body [m], above 0, up to 1000; for auto.
    flare : mapping of str to float
        Factor on the photons by band of the spectrum.
    """

    distance_au: float = 1.0
    f107: float = 150.0
    incidence_cosine: float = 1.0
    surface_state: str = "as recorded"
    photo_escape: str = "auto"
    radius_m: float = 1.0
    flare: Mapping[str, float] = field(default_factory=dict)

    def __post_init__(self) -> None:
        as_number("incidence_cosine", self.incidence_cosine, at_least=0.0, high=1.0)
        as_number("radius_m", self.radius_m, above=0.0, high=LARGEST_RADIUS_M)
        as_choice("photo_escape", self.photo_escape, PHOTO_GEOMETRIES)

    def spectrum(self) -> SolarSpectrum:
        """Return the solar spectrum; InputError for a distance or activity out of range."""
        try:
            return solar_spectrum(
                f107=self.f107, distance_au=self.distance_au, band_factors=self.flare
            )
        except EnvironmentDataError as error:
            raise from_environment(error) from None

    def material(self, given: Material | str) -> Material:
        """Return a material in the state asked for; InputError where it has none."""
        return in_surface_state(as_material(given), self.surface_state)

    def current_A_m2(self, material: Material, spectrum: SolarSpectrum) -> float:
        """Return the saturation current density with the angle of incidence."""
        growth = 1.0 if material.photoyield is None else material.photoyield.largest_angle_growth
        factor = incidence_factor(self.incidence_cosine, largest_growth=growth)
        return photo_saturation_A_m2(material, spectrum) * float(factor)


def photoyield_table(
    materials: Sequence[Material | str], **sunlight: Unpack[SunlightOptions]
) -> tuple[PhotoRow, ...]:
    """Tabulate the photoemission of materials under the solar spectrum.

    Parameters
    ----------
    materials : sequence of Material or str
        Objects, library names, or files (end in .toml or hold a slash).
    **sunlight : optional
        Attributes of `Sunlight`.

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
    light = Sunlight(**sunlight)
    spectrum = light.spectrum()
    return tuple(_row(light.material(given), spectrum, light) for given in materials)


def retarding_curves(
    materials: Sequence[Material | str], potential_V: Array, **sunlight: Unpack[SunlightOptions]
) -> tuple[Array | None, ...]:
    """Photocurrent density that still escapes at positive potentials.

    Parameters
    ----------
    materials, **sunlight
        As in `photoyield_table`.
    potential_V : ndarray [N]
        Potential of the surface [V].

    Returns
    -------
    tuple of (ndarray [N] or None)
        [A m-2], >= 0, in the order of `materials`; None for one that emits nothing.

    Examples
    --------
    >>> (curve,) = retarding_curves(["gold"], np.array([0.0, 5.0]))
    >>> bool(curve[0] > 10.0 * curve[1] > 0.0)
    True
    """
    light = Sunlight(**sunlight)
    spectrum = light.spectrum()
    return tuple(
        None
        if material.photoyield is None
        else light.current_A_m2(material, spectrum)
        * _escape(potential_V, material, spectrum, light)
        for material in map(light.material, materials)
    )


def photocurrent_grid(
    materials: Sequence[Material | str],
    *,
    incidence_cosine: ArrayLike,
    f107: ArrayLike,
    distance_au: float = 1.0,
) -> Array:
    """Saturation currents of many materials, angles and solar activities at once.

    Parameters
    ----------
    materials : sequence of Material or str, length M
    incidence_cosine : array_like [C]
        0 to 1.
    f107 : array_like [A]
        Solar radio flux at 10.7 cm and its 81-day mean, 50 to 500.
    distance_au : float, optional

    Returns
    -------
    ndarray [M, C, A]
        [A m-2], >= 0.

    Examples
    --------
    >>> grid = photocurrent_grid(["gold", "PTFE"], incidence_cosine=[1.0], f107=[80.0, 200.0])
    >>> grid.shape, bool(grid[0, 0, 1] / grid[0, 0, 0] < 1.7 < grid[1, 0, 1] / grid[1, 0, 0])
    ((2, 1, 2), True)
    """
    records = [as_material(given) for given in materials]
    cosine = np.atleast_1d(np.asarray(incidence_cosine, dtype=np.float64))
    try:
        energy = solar_spectrum(distance_au=distance_au).photon_energy_eV
        flux = photon_flux(np.atleast_1d(f107)) / distance_au**2
    except EnvironmentDataError as error:
        raise from_environment(error) from None
    grid = np.zeros((len(records), len(cosine), len(flux)))
    for i, record in enumerate(records):
        if record.photoyield is not None:
            current = e * (flux * yield_per_photon(energy, record.photoyield)).sum(-1)
            factor = incidence_factor(cosine, largest_growth=record.photoyield.largest_angle_growth)
            grid[i] = factor[:, np.newaxis] * current
    return grid


def _escape(
    potential_V: Array, material: Material, spectrum: SolarSpectrum, light: Sunlight
) -> Array:
    return photo_escape(
        potential_V, material, spectrum, radius_m=light.radius_m, geometry=light.photo_escape
    )


def _bands(material: Material, spectrum: SolarSpectrum, light: Sunlight) -> tuple[BandShare, ...]:
    curve = material.photoyield
    assert curve is not None
    emitted = emission_spectrum(spectrum.photon_energy_eV, spectrum.photon_flux_m2_s, curve)
    band = np.array(spectrum.band)
    current = light.current_A_m2(material, spectrum)
    whole = float(emitted.sum())
    shares = [float(emitted[band == name].sum()) / whole if whole else 0.0 for name in BANDS]
    return tuple(
        BandShare(name, share * current, share) for name, share in zip(BANDS, shares, strict=True)
    )


def _row(material: Material, spectrum: SolarSpectrum, light: Sunlight) -> PhotoRow:
    curve = material.photoyield
    if curve is None:
        return PhotoRow(
            material=material.name,
            surface_state=light.surface_state,
            saturation_current_A_m2=0.0,
            photo_escape=light.photo_escape,
        )
    sheath = photo_sheath(material, spectrum)  # None: no photon exceeds the threshold
    lit = sheath is not None
    return PhotoRow(
        material=material.name,
        surface_state=light.surface_state,
        threshold_eV=curve.threshold_eV,
        threshold_nm=NM_EV / curve.threshold_eV,
        saturation_current_A_m2=light.current_A_m2(material, spectrum),
        potential_at_1_percent_V=_potential_at(0.01, material, spectrum, light) if lit else None,
        potential_at_0p1_percent_V=_potential_at(0.001, material, spectrum, light) if lit else None,
        mean_energy_eV=None if sheath is None else sheath.mean_energy_eV,
        upper_photon_energy_eV=float(curve.photon_energy_eV[-1]),
        basis=curve.basis,
        level=curve.level,
        source=curve.source,
        spread_factor=curve.spread_factor,
        above_last_point=curve.above_last_point,
        electron_energies="photons" if curve.energies is None else curve.energies.law,
        photo_escape=light.photo_escape,
        photoelectron_debye_length_m=None if sheath is None else sheath.debye_length_m,
        photoelectron_density_m3=None if sheath is None else sheath.density_m3,
        point_source_share=None if sheath is None else _point_share(sheath, light),
        bands=_bands(material, spectrum, light),
    )


def _point_share(sheath: PhotoSheath, light: Sunlight) -> float:
    if light.photo_escape == "auto":
        return point_source_weight(sheath, light.radius_m)
    return 1.0 if light.photo_escape == "point source" else 0.0


def _potential_at(
    fraction: float, material: Material, spectrum: SolarSpectrum, light: Sunlight
) -> float:
    """Potential [V] at which a share of the photoelectrons still escapes."""

    def excess(volts: float) -> float:
        return float(_escape(np.array(volts), material, spectrum, light)) - fraction

    high = 1.0
    while excess(high) > 0.0:  # ends: nothing escapes above the largest photon energy
        high *= 2.0
    return float(brentq(excess, 0.0, high, xtol=1e-9, rtol=1e-13))
