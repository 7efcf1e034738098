"""Currents of a surface against adaptive quadrature, and the cost per right-hand side.

Run on one core: ``OMP_NUM_THREADS=1 python tests/benchmarks/currents_ratio.py``.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from itertools import pairwise

import numpy as np
from scipy.integrate import quad

from charging.currents.collection import SPHERE
from charging.currents.emission import emitter
from charging.currents.lookup import net_currents
from charging.currents.spectra import attracted_averages, repelled_averages
from charging.currents.surface import MECHANISMS, Setting, surface_currents, surface_models
from environments.catalogue import load_plasma
from environments.plasma import ELECTRON, population_moments
from environments.spectrum import solar_spectrum
from materials import load_material, material_names

MEMBERS, SURFACES = 1000, 12


def best(call: Callable[[], object], times: int = 20) -> float:
    """Shortest time of several calls [s]."""
    found = []
    for _ in range(times):
        began = time.perf_counter()
        call()
        found.append(time.perf_counter() - began)
    return min(found)


def adaptive() -> tuple[float, float, float]:
    """Time per potential by `quad`, by our tables, and the largest relative difference.

    Secondary current of one surface in the ECSS auroral spectrum, at 200 potentials.
    """
    plasma = load_plasma("ECSS auroral worst case")
    hot = plasma.populations[0]
    assert hot.distribution is not None
    free = emitter(load_material("polyimide film"), "sanders_inouye_1979").secondary
    flux = population_moments(hot).number_flux_m2_s
    potential = np.concatenate([-np.geomspace(1e4, 1.0, 100), np.geomspace(1.0, 1e4, 100)])

    def one(volts: float) -> float:
        lost = max(-volts, 0.0)
        gain = max(volts, 0.0)

        def inside(x: float) -> float:
            energy = np.array([x + lost])
            j = hot.distribution.flux(energy, ELECTRON.mass_kg)[0]
            factor = x / (x + lost) if lost else 1.0 + gain / x
            return float(np.pi * j * factor * free(np.array([x + gain]))[0] / flux)

        edges = [1e-6, 10.0, 300.0, 3e3, 17440.0 - lost, 4e4, 2.5e5]
        pieces = pairwise(edges)
        return sum(quad(inside, a, b, epsrel=1e-9, limit=200)[0] for a, b in pieces)

    began = time.perf_counter()
    slow = np.array([one(float(v)) for v in potential])
    per_quad = (time.perf_counter() - began) / len(potential)
    model = surface_models(
        [load_material("polyimide film")], [plasma], solar_spectrum(),
        laws=["sanders_inouye_1979"], radius_m=1.0, collection="sphere",
    )[0]  # fmt: skip
    v = np.repeat(potential, 50)[:, None]
    dark = Setting(np.ones((len(v), 1)), np.zeros((len(v), 1)))
    per_table = best(lambda: surface_currents(model, v, dark)) / len(v)
    repelled = repelled_averages(hot.distribution, ELECTRON.mass_kg, [free], -potential[:100])
    attracted = attracted_averages(
        hot.distribution, ELECTRON.mass_kg, [free], potential[100:], (SPHERE,)
    )
    direct = np.concatenate([repelled[1][0], attracted[1][0, 0]])
    return per_quad, per_table, float(np.abs(direct / slow - 1.0).max())


def block() -> tuple[float, float]:
    """Cost [ns] per surface of current with Jacobian and of current alone, 1000 × 12."""
    models = surface_models(
        [load_material(name) for name in material_names()[:SURFACES]],
        [load_plasma("quiet geostationary"), load_plasma("ECSS geostationary worst case")],
        solar_spectrum(),
        laws=["sanders_inouye_1979"],
        radius_m=1.6,
    )
    table = net_currents(models)
    random = np.random.default_rng(1)
    v = -(10.0 ** random.uniform(0.0, 4.0, (MEMBERS, SURFACES)))
    v[:, ::3] *= -1e-3
    share = random.uniform(0.0, 1.0, MEMBERS)
    setting = Setting(
        np.stack([1.0 - share, share], axis=-1), random.uniform(0.0, 1.0, (MEMBERS, SURFACES))
    )
    which = np.zeros(MEMBERS, dtype=np.intp)
    count = 1e-9 * MEMBERS * SURFACES
    both = best(lambda: table.current_and_slope(which, v, setting), 50) / count
    alone = best(lambda: table.current(which, v, setting), 50) / count
    return both, alone


def main() -> None:
    """Print ratio and costs."""
    per_quad, per_table, difference = adaptive()
    print(f"quad {1e6 * per_quad:.0f} us for one mechanism at one potential; all "
          f"{len(MECHANISMS)} mechanisms and the slope {1e9 * per_table:.0f} ns: "
          f"ratio {per_quad / per_table:.0f}; largest difference {difference:.1e}")  # fmt: skip
    both, alone = block()
    print(f"blocks of {MEMBERS} x {SURFACES}: {both:.0f} ns per surface with Jacobian, "
          f"{alone:.0f} ns without (design note: 280 ns with everything around it)")  # fmt: skip


if __name__ == "__main__":
    main()
