"""Tables of measured spectra whose neighbouring channels differ by decades."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from mpmath import mp
from numpy.typing import NDArray

from charging.currents.collection import CYLINDER, PLANE, SPHERE
from charging.currents.emission import emitter
from charging.currents.lookup import net_currents
from charging.currents.spectra import attracted_averages, repelled_averages, spectrum_table
from charging.currents.surface import Setting, surface_currents, surface_model
from environments.auroral import Fontheim
from environments.distributions import Tabulated
from environments.plasma import ELECTRON, HYDROGEN_ION, Plasma, Population, population_of
from environments.spectrum import solar_spectrum
from materials import load_material
from materials.secondary import YIELD_LAWS

Array = NDArray[np.float64]
BAR, FLOOR = 1e-8, 1e-14  # of what arrives; of what arrives at 0 V
NEAR = 10.0 ** np.arange(-6.0, -0.5)


def rough(random: np.random.Generator) -> Tabulated:
    """Channels over up to five decades, fluxes scattered by up to four decades (sigma)."""
    low = 10.0 ** random.uniform(-2.0, 3.0)
    high = min(low * 10.0 ** random.uniform(0.3, 5.0), 9e6)
    energy = np.unique(low * (high / low) ** np.sort(random.uniform(size=random.integers(3, 25))))
    flux = 10.0 ** np.clip(8.0 + random.normal(0.0, random.uniform(0.2, 4.0), len(energy)), -9, 25)
    return Tabulated(tuple(energy.tolist()), tuple(flux.tolist()))


def potentials(spectrum: Tabulated, random: np.random.Generator, count: int) -> Array:
    """Anywhere, and close to every channel on both sides."""
    channels = np.array(spectrum.energy_eV)[:, None] * (1.0 + np.concatenate([-NEAR, NEAR]))
    found = np.concatenate([10.0 ** random.uniform(-3.0, 5.3, count), channels.ravel()])
    return np.sort(found[found < 2e5])


def check_tables(seed: int) -> None:
    random = np.random.default_rng([99, seed])
    spectrum = rough(random)
    name = str(random.choice(["gold", "polyimide film", "cover glass, MgF2-coated"]))
    surface = emitter(load_material(name), YIELD_LAWS[random.integers(0, 4)])
    thick = (SPHERE, CYLINDER)[random.integers(0, 2)]
    yields = [surface.secondary, surface.backscatter, surface.ion]
    table = spectrum_table(population_of(ELECTRON, spectrum), 0, [yields], thick)
    lost = potentials(spectrum, random, 40)
    share, released = repelled_averages(spectrum, ELECTRON.mass_kg, yields, lost)
    direct = np.stack([share, *released], axis=-1)
    error = np.abs(table(-lost[:, None])[0][:, 0, 0::2] - direct)
    assert (error <= BAR * share[:, None] + FLOOR).all(), seed
    both, freed = attracted_averages(spectrum, ELECTRON.mass_kg, yields, lost, (PLANE, thick))
    direct = np.concatenate([both[None], freed]).reshape(8, -1).T
    error = np.abs(table(lost[:, None])[0][:, 0] - direct)
    assert (error <= BAR * np.tile(both, (4, 1)).T).all(), seed


@settings(max_examples=12, deadline=None)
@given(st.integers(0, 2**32 - 1))
def test_table_follows_the_integrals(seed: int) -> None:
    check_tables(seed)


@pytest.mark.slow
@pytest.mark.timeout(1800)
def test_table_follows_the_integrals_of_many_spectra() -> None:
    for seed in range(300):
        check_tables(seed)


def collected_by_hand(spectrum: Tabulated, lost: float) -> float:
    """Share that arrives after losing energy: powers of E integrated by hand, 40 digits."""
    mp.dps = 40
    x = [mp.mpf(v) for v in spectrum.energy_eV]
    y = [mp.mpf(v) for v in spectrum.flux_m2_s_sr_eV]

    def power(c: mp.mpf, s: mp.mpf, a: mp.mpf, b: mp.mpf) -> mp.mpf:
        return c * (mp.log(b / a) if s == -1 else (b ** (s + 1) - a ** (s + 1)) / (s + 1))

    def arriving(held: mp.mpf) -> mp.mpf:
        total = mp.mpf(0)
        parts = [(mp.mpf(0), x[0], y[0] / x[0], mp.mpf(1))]
        for k in range(len(x) - 1):
            s = mp.log(y[k + 1] / y[k]) / mp.log(x[k + 1] / x[k])
            parts.append((x[k], x[k + 1], y[k] * x[k] ** -s, s))
        for low, high, c, s in parts:
            a = max(low, held)
            if a < high:  # j (1 - held/E)
                lost_part = held * power(c, s - 1, a, high) if held else 0
                total += power(c, s, a, high) - lost_part
        return total

    return float(arriving(mp.mpf(lost)) / arriving(mp.mpf(0)))


@pytest.mark.parametrize("seed", range(6))
def test_collection_against_integration_by_hand(seed: int) -> None:
    random = np.random.default_rng([97, seed])
    spectrum = rough(random)
    lost = potentials(spectrum, random, 10)[:: 1 + seed]
    found = repelled_averages(spectrum, ELECTRON.mass_kg, [], lost)[0]
    wanted = np.array([collected_by_hand(spectrum, float(v)) for v in lost])
    assert (np.abs(found - wanted) <= BAR * wanted + FLOOR).all()


@pytest.mark.parametrize("seed", range(4))
def test_lookup_of_a_march_follows_the_direct_path(seed: int) -> None:
    random = np.random.default_rng([98, seed])
    electrons, ions = rough(random), rough(random)
    around = Plasma("t", "t", "t", "assumed", None, "", (
        population_of(ELECTRON, electrons), Population(ELECTRON, "maxwellian", 2e6, 30.0),
        population_of(HYDROGEN_ION, ions),
    ))  # fmt: skip
    materials = [load_material(name) for name in ("gold", "polyimide film")]
    model = surface_model(materials, [around], solar_spectrum(), law=YIELD_LAWS[seed],
                          radius_m=40.0)  # fmt: skip
    size = np.concatenate([potentials(s, random, 300) for s in (electrons, ions)])
    v = np.repeat((size * random.choice([-1.0, 1.0], len(size)))[:, None], 2, axis=1)
    dark = Setting(np.ones((len(v), 1)), np.zeros_like(v))
    direct = surface_currents(model, v, dark)
    gross = np.abs(direct.by_mechanism).sum(axis=-1)
    which = np.zeros(len(v), dtype=np.intp)
    net, slope = net_currents([model]).current_and_slope(which, v, dark)
    assert (np.abs(net - direct.by_mechanism.sum(axis=-1)) <= BAR * gross).all()
    assert (np.abs((slope - direct.slope) * v) <= 1e-4 * gross).all()


@pytest.mark.parametrize("width_eV", [500.0, 5.0, 0.05])
def test_a_beam_alone_ends_below_its_cut_off(width_eV: float) -> None:
    """A beam underflows long before the cut-off: nothing there may be 0/0."""
    beam = Fontheim(0.0, 1.2, 0.0, 3e3, 3.5e9, 1e4, width_eV, 50.0, 4e4)
    ions = Population(HYDROGEN_ION, "maxwellian", 1e3, 1e3)
    around = Plasma("x", "x", "x", "assumed", None, "", (population_of(ELECTRON, beam), ions))
    model = surface_model(
        [load_material("gold")], [around], solar_spectrum(), law="lin_joy_2005", radius_m=1.0
    )
    v = -np.concatenate([np.linspace(9e3, 1.2e4, 500), np.geomspace(1.0, 2e5, 500)])
    rows = surface_currents(model, v[:, None], Setting(np.ones((v.size, 1)), np.zeros((v.size, 1))))
    assert np.isfinite(rows.by_mechanism).all()
    assert np.isfinite(rows.slope).all()
    assert np.isfinite(net_currents([model]).coefficients).all()
    # beyond the beam by twenty widths nothing arrives
    electron = rows.by_mechanism[:, 0, 0]
    beyond = v < -(1e4 + 20.0 * width_eV)
    assert np.abs(electron[beyond]).max() < 1e-12 * np.abs(electron).max()
