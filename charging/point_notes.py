"""What a reader of the answer for one surface must know before using it."""

from collections.abc import Iterator, Mapping

import numpy as np
from scipy.constants import physical_constants

from charging.currents.balance import Root
from charging.currents.uncharged import CHARGED_V, what_decides
from environments.plasma import Plasma, moments, warnings_of
from materials.record import EMISSION_NEEDED, EMISSION_OPTIONAL, Material
from materials.secondary import YieldLaw, fitted_range_eV

PROTON_MASS_kg = physical_constants["proton mass"][0]
HEAVY = 2.0  # ions of more than so many proton masses


def angle_notes(
    material: Material,
    plasma: Plasma,
    law: YieldLaw,
    light: float,
    radius_m: float,
    collection: str,
) -> Iterator[str]:
    """Say when only the average over directions leaves a dark surface uncharged."""
    if light == 0.0:
        yield from what_decides(
            material, plasma, radius_m=radius_m, collection=collection, laws=[law]
        )


def law_notes(
    material: Material,
    plasma: Plasma,
    law: YieldLaw,
    reached_V: float,
    others: Mapping[str, float | None],
) -> Iterator[str]:
    """What the choice of the secondary law means here, and of the spectra."""
    for other, volts in others.items():
        if volts is None or (reached_V < CHARGED_V) == (volts < CHARGED_V):
            continue
        charges, leaves = (law, other) if reached_V < CHARGED_V else (other, law)
        worst = min(reached_V, volts)
        yield (
            f"{charges} charges it to {worst:.0f} V, {leaves} leaves it uncharged: the law "
            "decides, take the worse"
        )
    if material.emits:
        low, high = fitted_range_eV(law, material.value("secondary_yield_peak_energy_eV"))
        arriving = [
            energy
            for energy, p in zip(
                moments(plasma)["flux_mean_energy_eV"], plasma.populations, strict=True
            )
            if p.species.charge_number < 0
        ]
        if max(arriving) > high:
            hot = max(arriving)
            words = f"{hot:.3g} eV on average" if np.isfinite(hot) else "infinite mean energy flux"
            yield (
                f"electrons of {words}: beyond the {low:.3g} to "
                f"{high:.3g} eV to which {law} was fitted"
            )
    yield from (f'plasma "{plasma.name}": {warning}' for warning in warnings_of(plasma))


def general_notes(
    material: Material, plasma: Plasma, roots: tuple[Root, ...], light: float, collection: str
) -> tuple[str, ...]:
    """Say what is assumed, from memory or left out."""
    notes = []
    if sum(root.stable for root in roots) > 1:
        notes.append("several stable potentials: the history of the surface decides")
    for basis, words in (("assumed", "assumed"), ("memory", "from memory, unchecked")):
        keys = [
            key
            for key in (*EMISSION_NEEDED, *EMISSION_OPTIONAL)
            if key in material.values and material.values[key].basis == basis
        ]
        if light > 0.0 and material.photoyield is not None and material.photoyield.basis == basis:
            keys.append("photoyield")
        if keys:
            notes.append(f'material "{material.name}": {words}: {", ".join(keys)}')
    if light > 0.0 and material.photoyield is not None:
        notes.append(f"level of the photoyield curve: {material.photoyield.level}")
    if plasma.basis in ("assumed", "memory"):
        words = "assumed" if plasma.basis == "assumed" else "from memory, unchecked"
        notes.append(f'plasma "{plasma.name}": its figures are {words}')
    heavy = sorted(
        {p.species.name for p in plasma.populations if p.species.mass_kg > HEAVY * PROTON_MASS_kg}
    )
    if heavy and material.emits:
        notes.append(
            f"{', '.join(heavy)} release electrons as protons of the same energy would: too many "
            "below about 1 keV"
        )
    if collection == "auto":
        notes.append("the blend of plane and sphere by sheath length is assumed")
    notes.append(
        "one-sided patch: no conduction, no barrier raised by neighbours, no exchange of electrons"
    )
    return tuple(notes)
