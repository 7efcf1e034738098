"""Whether a dark surface leaves 0 V for kilovolts, and which assumption decides it.

Below 0 V electrons are repelled, so their mean yields need one integral each; no table is
built. A surface counts as charged when the current stays negative down to `CHARGED_V`.
"""

from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from charging.currents.collection import PLANE, Geometry, sheath_weight, thick_geometry
from charging.currents.emission import SECONDARY_LAWS, Emitter, emitter, law_of
from charging.currents.populations import electron_sheath, populations
from charging.currents.spectra import attracted_averages, repelled_averages
from charging.currents.tables import Yield, average_yields
from environments.plasma import Plasma, Population, population_current
from materials.record import Material
from materials.secondary import YieldLaw

Array = NDArray[np.float64]

CHARGED_V = -100.0
"""Below this a surface counts as charged when assumptions are compared."""

POTENTIALS_V = -np.concatenate([[0.0], np.geomspace(0.01, -CHARGED_V, 24)])


def what_decides(
    material: Material,
    plasma: Plasma,
    *,
    radius_m: float,
    collection: str = "auto",
    laws: Sequence[YieldLaw] = SECONDARY_LAWS,
) -> Iterator[str]:
    """Yield a sentence for each assumption that alone leaves a dark surface uncharged.

    The secondary-emission law, where others of `laws` charge it; the average over all
    directions, where electrons at normal incidence would.

    Parameters
    ----------
    material : Material
    plasma : Plasma
        With electrons and positive ions.
    radius_m, collection
        As in `sheath_weight`.
    laws : sequence of YieldLaw, optional
        Each stands for what `law_of` gives.
    """
    if not material.emits:
        return
    chosen = tuple(dict.fromkeys(law_of(material, law) for law in laws))
    ions = _ions(emitter(material, chosen[0]), plasma, radius_m, collection)

    def charged(law: YieldLaw, *, isotropic: bool) -> bool:
        surface = emitter(material, law, isotropic=isotropic)
        return bool((_electrons(surface, plasma) < -ions).all())

    every = {law: charged(law, isotropic=True) for law in chosen}
    left = [law for law, is_charged in every.items() if not is_charged]
    if left and len(left) < len(every):
        others = ", ".join(law for law in chosen if law not in left)
        yield (
            f"{', '.join(left)} leaves it uncharged, {others} charges it: the law decides, take "
            "the worse"
        )
    by_angle = [law for law in left if charged(law, isotropic=False)]
    if by_angle:
        yield (
            f"uncharged by {', '.join(by_angle)} only because yields are averaged over all "
            "directions; at normal incidence it charges: the angle factor decides"
        )


def _electrons(surface: Emitter, plasma: Plasma) -> Array:
    """Net current density [K] of electrons, emission taken off, at `POTENTIALS_V` [A m-2]."""
    total = np.zeros_like(POTENTIALS_V)
    yields = [surface.secondary, surface.backscatter]
    for p in plasma.populations:
        if p.species.charge_number > 0:
            continue
        if p.distribution is None:
            share = np.exp(POTENTIALS_V / p.temperature_eV)
            mean = average_yields(yields, p.temperature_eV, np.zeros(1), (PLANE,))[:, 0, 0]
            stays = share * (1.0 - mean.sum())
        else:
            arrives, released = repelled_averages(
                p.distribution, p.species.mass_kg, yields, -POTENTIALS_V
            )
            stays = arrives - released.sum(axis=0)
        total = total + population_current(p) * stays
    return total


def _ions(surface: Emitter, plasma: Plasma, radius_m: float, collection: str) -> Array:
    """Current density [K] of ions and of what they release at `POTENTIALS_V` [A m-2]."""
    debye, temperature = electron_sheath(populations([plasma], electrons=True), np.ones(1))
    weight = sheath_weight(
        POTENTIALS_V,
        debye_length_m=debye,
        temperature_eV=temperature,
        radius_m=radius_m,
        collection=collection,
    ).weight
    geometries = (PLANE, thick_geometry(collection))
    total = np.zeros_like(POTENTIALS_V)
    for p in plasma.populations:
        if p.species.charge_number > 0:
            plane, thick = _of_ions(p, [surface.ion], geometries)
            total = total + population_current(p) * (plane + weight * (thick - plane))
    return total


def _of_ions(
    population: Population, yields: Sequence[Yield], geometries: Sequence[Geometry]
) -> Array:
    """Charge that crosses the surface [G, K] per charge that arrives at 0 V."""
    size = population.species.charge_number
    gained = -POTENTIALS_V * size
    if population.distribution is None:
        T = population.temperature_eV
        collected = np.stack([g.factor(gained / T) for g in geometries])
        released = average_yields(yields, T, gained, geometries)[0]
    else:
        collected, every = attracted_averages(
            population.distribution, population.species.mass_kg, yields, gained, geometries
        )
        released = every[0]
    return np.asarray(collected + released / size)
