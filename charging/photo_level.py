"""A photoyield scaled to a measured current, where its record asks for that."""

from __future__ import annotations

from dataclasses import replace

from environments.spectrum import solar_spectrum
from materials.errors import MaterialError
from materials.photoyield_reader import LARGEST_YIELD
from materials.record import Material
from materials.surface_state import normalised_to_current


def levelled(material: Material) -> Material:
    """Apply ``[photoyield.normalised_to]`` of a record; without one, the same object.

    Parameters
    ----------
    material : Material

    Returns
    -------
    Material
        Level of its curve: "normalised to a measured current".

    Raises
    ------
    MaterialError
        The curve gives no current in sunlight, or would exceed what a record may hold.

    Examples
    --------
    >>> from materials import load_material
    >>> levelled(load_material("gold")) is load_material("gold")
    True
    """
    curve = material.photoyield
    if curve is None or curve.normalised_to is None:
        return material
    wanted, sun = curve.normalised_to, solar_spectrum(f107=curve.normalised_to.f107)
    key = ("photoyield", "normalised_to", "saturation_current_uA_m2")
    try:
        scaled = normalised_to_current(
            curve,
            sun.photon_energy_eV,
            sun.photon_flux_m2_s,
            saturation_current_A_m2=1e-6 * wanted.saturation_current_uA_m2,
            source=f"measured at F10.7 {wanted.f107:g}: {wanted.source}",
        )
    except ValueError:
        raise MaterialError(
            key, wanted.saturation_current_uA_m2, "cannot be met: the curve gives no current"
        ) from None
    largest = float(scaled.electrons_per_photon.max())
    if largest > LARGEST_YIELD:
        raise MaterialError(
            key,
            wanted.saturation_current_uA_m2,
            f"would need {largest:.3g} electrons per photon",
            allowed=f"a current that needs at most {LARGEST_YIELD:g}",
        )
    return replace(material, photoyield=scaled)
