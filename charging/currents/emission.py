"""What a material answers to electrons, ions and photons, tabulated for a march.

Yields come from `materials`, distributions from `environments`; here the two meet
and every integral over energy is done once, before the march.
"""

from collections.abc import Hashable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from charging.currents.collection import PLANE, Geometry
from charging.currents.photo_escape import photo_escape
from charging.currents.splines import segmented_knots
from charging.currents.tables import Yield, YieldTable, average_yields, knot_scale, knots
from environments.spectrum import SolarSpectrum
from materials.backscatter import (
    BACKSCATTER_LAWS,
    hunger_kuchler_held,
    isotropic_backscatter,
    isotropic_by_atomic_number,
    prokopenko_laframboise_1980,
    substrate_share,
)
from materials.ion_impact import whipple_1981
from materials.photoyield import emission_spectrum, photo_current_density
from materials.record import Material
from materials.secondary import (
    LAW_FACTS,
    YIELD_LAWS,
    YieldLaw,
    isotropic_yield,
    normal_yield,
    true_secondary_peak,
)
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


def law_of(material: Material, asked: YieldLaw) -> YieldLaw:
    """Return the law that stands for the one asked, where the record chooses its own.

    A verdict runs an exponential law and one with a tail E^-0.67. The law of a record takes
    the place of the one with the slow tail if it has such a tail itself, else of the other;
    a law asked for that is none of these two holds for every material.

    Examples
    --------
    >>> from materials import load_material
    >>> law_of(load_material("gold"), "lin_joy_2005")
    'lin_joy_2005'
    """
    own = material.laws.get("secondary_law")
    if own is None or asked not in SECONDARY_LAWS:
        return asked
    known = next(law for law in YIELD_LAWS if law == own)
    slow = LAW_FACTS["lin_joy_2005"].tail
    same_kind = (LAW_FACTS[known].tail == slow) == (LAW_FACTS[asked].tail == slow)
    return known if same_kind else asked


def backscatter_law(material: Material) -> str:
    """Name of the backscatter law of a record.

    Examples
    --------
    >>> from materials import load_material
    >>> backscatter_law(load_material("gold"))
    'prokopenko_laframboise_1980'
    """
    return material.laws.get("backscatter_law", BACKSCATTER_LAWS[0])


def backscatter_yield(material: Material, *, isotropic: bool = True) -> Yield:
    """Backscatter of a material by the law of its record, coating included.

    `isotropic` False gives normal incidence.
    """
    number = material.value("mean_atomic_number")
    levels = {
        "high_energy": material.value("backscatter_high_energy"),
        "low_energy_drop": material.get("backscatter_low_energy_drop", 0.0),
        "drop_energy_eV": material.get("backscatter_drop_energy_eV", 1.0),
    }

    def by_number(energy_eV: Array, z: float) -> Array:
        if isotropic:
            return isotropic_by_atomic_number(energy_eV, mean_atomic_number=z)
        return hunger_kuchler_held(energy_eV, mean_atomic_number=z)

    def surface(energy_eV: Array) -> Array:
        if backscatter_law(material) == "hunger_kuchler_1979":
            return by_number(energy_eV, number)
        if isotropic:
            return isotropic_backscatter(energy_eV, mean_atomic_number=number, **levels)
        return prokopenko_laframboise_1980(energy_eV, **levels)

    if "coating_thickness_m" not in material.values:
        return surface
    thickness = material.value("coating_thickness_m")
    density = material.value("density_kg_m3")
    below = material.value("substrate_atomic_number")

    def coated(energy_eV: Array) -> Array:
        share = substrate_share(energy_eV, thickness_m=thickness, density_kg_m3=density)
        return (1.0 - share) * surface(energy_eV) + share * by_number(energy_eV, below)

    return coated


def emitter(material: Material, law: YieldLaw, *, isotropic: bool = True) -> Emitter:
    """Collect the yields of a material: isotropic for electrons, normal for ions.

    Parameters
    ----------
    material : Material
    law : str
        One of `YIELD_LAWS`; see `law_of`.
    isotropic : bool, optional
        False: electrons at normal incidence too.
    """
    if not material.emits:
        return Emitter("nothing", _nothing, _nothing, _nothing)
    chosen = law_of(material, law)
    peak = true_secondary_peak(material)
    peak_energy = material.value("secondary_yield_peak_energy_eV")
    number = material.value("mean_atomic_number")
    ion_peak = material.value("ion_yield_peak")
    ion_energy = material.value("ion_yield_peak_energy_eV")

    def secondary(energy_eV: Array) -> Array:
        if not isotropic:
            return normal_yield(energy_eV, law=chosen, peak_yield=peak, peak_energy_eV=peak_energy)
        return isotropic_yield(
            energy_eV,
            law=chosen,
            peak_yield=peak,
            peak_energy_eV=peak_energy,
            mean_atomic_number=number,
        )

    def ion(energy_eV: Array) -> Array:
        return whipple_1981(energy_eV, peak_yield=ion_peak, peak_energy_eV=ion_energy)

    electron = tuple(material.get(key, 0.0) for key in (*_BACKSCATTER_KEYS, "density_kg_m3"))
    key = (chosen, peak, peak_energy, number, *electron, ion_peak, ion_energy,
           material.laws.get("backscatter_law"), isotropic)  # fmt: skip
    return Emitter(key, secondary, backscatter_yield(material, isotropic=isotropic), ion)


_BACKSCATTER_KEYS = (
    "backscatter_high_energy",
    "backscatter_low_energy_drop",
    "backscatter_drop_energy_eV",
    "coating_thickness_m",
    "substrate_atomic_number",
)


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
    tables = [table for key, _ in rows for table in known[key]]
    values = np.stack(tables) if tables else np.zeros((0, len(grid), 2 * width))
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


STRONG_LINE = 0.05  # share of the photoelectrons that makes the end of a line matter


def line_ends_V(materials: Sequence[Material], spectrum: SolarSpectrum) -> tuple[float, ...]:
    """Potentials that hold back the last electron of a strong spectral line."""
    energy = spectrum.photon_energy_eV
    ends: set[float] = set()
    for curve in {id(m): m.photoyield for m in materials}.values():
        if curve is not None and curve.energies is None:
            emitted = emission_spectrum(energy, spectrum.photon_flux_m2_s, curve)
            strong = emitted > STRONG_LINE * emitted.sum()
            ends.update(np.round(energy[strong] - curve.threshold_eV, 9).tolist())
    return tuple(sorted(v for v in ends if v > 0.0))


def escape_tables(
    surfaces: Sequence[Material],
    spectrum: SolarSpectrum,
    *,
    radius_m: float,
    photo_geometry: str = "auto",
) -> YieldTable:
    """Shares of photo- and secondary electrons that leave above a barrier height.

    Parameters
    ----------
    surfaces : sequence of Material
    spectrum : SolarSpectrum
    radius_m : float
        Radius of the body [m], for the escape of photoelectrons.
    photo_geometry : str
        One of `photo_escape.PHOTO_GEOMETRIES`.

    Returns
    -------
    YieldTable
        L = number of surfaces; columns: photoelectrons, secondary electrons (planar:
        normal energy of Lambert emission).
    """
    breaks = line_ends_V(surfaces, spectrum)
    height = segmented_knots(knots(ESCAPE_SCALE_V, ESCAPE_SPACING), breaks)
    unique = {id(material): material for material in surfaces}
    columns = {
        key: np.stack(
            [
                photo_escape(height, m, spectrum, radius_m=radius_m, geometry=photo_geometry),
                _secondary_escape(height, m),
            ],
            axis=-1,
        )
        for key, m in unique.items()
    }
    values = np.stack([columns[id(material)] for material in surfaces])
    return YieldTable.on(height, values, breaks)


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
