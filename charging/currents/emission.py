"""What a material answers to electrons, ions and photons, tabulated for a march.

Yields come from `materials`, distributions from `environments`; here the two meet
and every integral over energy is done once, before the march.
"""

from collections.abc import Hashable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from charging.currents.collection import PLANE, Geometry
from charging.currents.tables import Yield, YieldTable, average_yields, knot_scale, knots
from environments.spectrum import SolarSpectrum
from materials.backscatter import isotropic_backscatter
from materials.ion_impact import whipple_1981
from materials.photoemission import escape_fraction
from materials.photoyield import emission_spectrum, photo_current_density
from materials.record import Material
from materials.secondary import YieldLaw, isotropic_yield, true_secondary_peak
from materials.secondary_escape import secondary_escape_fraction

Array = NDArray[np.float64]

SECONDARY_LAWS: tuple[YieldLaw, YieldLaw] = ("sanders_inouye_1979", "lin_joy_2005")
"""The exponential and the E^-0.67 law that a verdict compares; the first is the default."""

@dataclass(frozen=True, slots=True)
class Emitter:
    """Yields of one surface as functions of impact energy [eV], electrons per particle.

    `key` tells two surfaces with the same yields that they may share tables.
    """

    key: Hashable
    secondary: Yield
    backscatter: Yield
    ion: Yield


def _nothing(energy_eV: Array) -> Array:
    return np.zeros_like(energy_eV)


def emitter(material: Material, law: YieldLaw) -> Emitter:
    """Collect the yields of a material: isotropic for electrons, normal for ions.

    Parameters
    ----------
    material : Material
    law : str
        One of `SECONDARY_LAWS`.
    """
    if not material.emits:
        return Emitter("nothing", _nothing, _nothing, _nothing)
    peak = true_secondary_peak(material)
    peak_energy = material.value("secondary_yield_peak_energy_eV")
    number = material.value("mean_atomic_number")
    high = material.value("backscatter_high_energy")
    drop = material.get("backscatter_low_energy_drop", 0.0)
    drop_energy = material.get("backscatter_drop_energy_eV", 1.0)
    ion_peak = material.value("ion_yield_peak")
    ion_energy = material.value("ion_yield_peak_energy_eV")

    def secondary(energy_eV: Array) -> Array:
        return isotropic_yield(
            energy_eV,
            law=law,
            peak_yield=peak,
            peak_energy_eV=peak_energy,
            mean_atomic_number=number,
        )

    def backscatter(energy_eV: Array) -> Array:
        return isotropic_backscatter(
            energy_eV,
            high_energy=high,
            low_energy_drop=drop,
            drop_energy_eV=drop_energy,
            mean_atomic_number=number,
        )

    def ion(energy_eV: Array) -> Array:
        return whipple_1981(energy_eV, peak_yield=ion_peak, peak_energy_eV=ion_energy)

    key = (law, peak, peak_energy, number, high, drop, drop_energy, ion_peak, ion_energy)
    return Emitter(key, secondary, backscatter, ion)


def electron_tables(
    emitters: Sequence[Emitter], temperatures_eV: Array, thick: Geometry
) -> YieldTable:
    """Secondary and backscatter averages of S surfaces and K electron populations.

    Returns
    -------
    YieldTable
        L = S·K entries, surface-major; columns: secondary in plane and thick
        geometry, backscatter in plane and thick geometry.
    """
    return _tables(
        [(m.key, (m.secondary, m.backscatter)) for m in emitters], temperatures_eV, thick
    )


def ion_tables(emitters: Sequence[Emitter], temperatures_eV: Array, thick: Geometry) -> YieldTable:
    """Ion-induced emission per ion at normal incidence; columns: plane and thick geometry.

    In a planar sheath attracted ions arrive near normal. In a thick sheath they arrive
    isotropically, and growth as 1/cos would double the yield (Whipple 1981, from memory);
    rough flight surfaces show less. The lower value makes a dark surface more negative: in
    the ECSS worst case by a factor 1.5, which lies inside the spread of the peak yield.
    """
    return _tables([(m.key, (m.ion,)) for m in emitters], temperatures_eV, thick)


def _tables(
    rows: Sequence[tuple[Hashable, tuple[Yield, ...]]], temperatures_eV: Array, thick: Geometry
) -> YieldTable:
    scale = knot_scale(float(np.min(temperatures_eV, initial=np.inf)))
    grid = knots(scale)
    unique = dict(rows)
    flat = [y for yields in unique.values() for y in yields]
    width = len(flat) // len(unique)
    known: dict[Hashable, list[Array]] = {key: [] for key in unique}
    for temperature in temperatures_eV:
        averages = average_yields(flat, float(temperature), grid, (PLANE, thick))
        for i, key in enumerate(unique):
            known[key].append(averages[i * width : (i + 1) * width].reshape(2 * width, -1).T)
    values = np.stack([table for key, _ in rows for table in known[key]])
    return YieldTable.fit(scale, values)


ESCAPE_SCALE_V, ESCAPE_SPACING = 0.5, 0.005


def photo_saturation_A_m2(material: Material, spectrum: SolarSpectrum) -> float:
    """Photocurrent density at normal incidence with every electron escaping [A m-2], >= 0."""
    if material.photoyield is None:
        return 0.0
    return float(
        photo_current_density(
            spectrum.photon_energy_eV, spectrum.photon_flux_m2_s, material.photoyield
        )
    )


def escape_tables(surfaces: Sequence[Material], spectrum: SolarSpectrum) -> YieldTable:
    """Shares of photo- and secondary electrons that leave above a barrier height.

    Returns
    -------
    YieldTable
        L = number of surfaces; columns: photoelectrons, secondary electrons; planar
        geometry (normal energy of Lambert emission).
    """
    height = knots(ESCAPE_SCALE_V, ESCAPE_SPACING)
    unique = {material.name: material for material in surfaces}
    columns = {
        name: np.stack([_photo_escape(height, m, spectrum), _secondary_escape(height, m)], axis=-1)
        for name, m in unique.items()
    }
    values = np.stack([columns[material.name] for material in surfaces])
    return YieldTable.fit(ESCAPE_SCALE_V, values, ESCAPE_SPACING)


def _photo_escape(height_V: Array, material: Material, spectrum: SolarSpectrum) -> Array:
    if material.photoyield is None:
        return np.ones_like(height_V)
    energy, curve = spectrum.photon_energy_eV, material.photoyield
    emitted = emission_spectrum(energy, spectrum.photon_flux_m2_s, curve)
    return escape_fraction(height_V, energy, emitted, curve.threshold_eV)


def _secondary_escape(height_V: Array, material: Material) -> Array:
    if not material.emits:
        return np.ones_like(height_V)
    return secondary_escape_fraction(
        height_V,
        kind=material.kind,
        **{
            key: material.value(key)
            for key in ("work_function_eV", "secondary_energy_eV")
            if key in material.values
        },
    )
