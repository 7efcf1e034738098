"""Coarse tables of an ensemble against the direct path and against full runs."""

from __future__ import annotations

from dataclasses import replace
from functools import partial
from pathlib import Path

import numpy as np
import pytest

from charging.case import LoadedCase, load_case
from charging.currents.collection import PLANE, SPHERE
from charging.currents.ensemble import (
    EnsembleCurrents,
    EscapeCurves,
    Question,
    ensemble_currents,
    fits_ensemble,
)
from charging.currents.surface import Setting, surface_currents, surface_model
from charging.currents.tables import average_yields
from charging.currents.yield_scaling import scaled_knots, scaled_yield
from charging.members import Member
from charging.orbit_run import ENSEMBLE_TOLERANCE, solve_mode, surroundings_of
from environments.catalogue import load_plasma
from environments.plasma import Plasma
from environments.spectrum import SolarSpectrum, solar_spectrum
from materials import load_material, material_names
from materials.angle import exponential_angle_factor, secondary_angle_coefficient
from materials.record import Material
from materials.secondary import YIELD_LAWS, YieldLaw, isotropic_yield

CASE = Path(__file__).parents[2] / "cases" / "geo_substorm_day.toml"
LAWS: tuple[YieldLaw, ...] = ("sanders_inouye_1979", "lin_joy_2005")
NAMES = material_names()


def drawn(material: Material, rng: np.random.Generator) -> Material:
    """A material with every number moved by up to 20 percent."""
    values = {
        key: replace(value, value=value.value * float(rng.uniform(0.8, 1.2)))
        for key, value in material.values.items()
    }
    curve = material.photoyield
    if curve is not None:
        curve = replace(curve, level_factor=float(rng.uniform(0.5, 2.0)))
    return replace(material, values=values, photoyield=curve)


def plasmas() -> list[Plasma]:
    return [load_plasma(name) for name in ("quiet geostationary", "ECSS geostationary worst case")]


def question(materials: list[Material], law: YieldLaw, spectrum: SolarSpectrum) -> Question:
    return Question(materials, plasmas(), spectrum, law, 1.6, "auto", "auto")


@pytest.mark.parametrize("law", YIELD_LAWS)
def test_scaled_yields_are_the_averages(law: YieldLaw) -> None:
    rng = np.random.default_rng(5)
    temperature = np.exp(rng.uniform(np.log(0.2), np.log(3e4), 6))
    peak_energy = rng.uniform(100.0, 1000.0, 6)
    number = 13.0
    growth = np.full(6, exponential_angle_factor(secondary_angle_coefficient(number)) - 1.0)
    found = scaled_yield(law, temperature / peak_energy, growth)
    x = scaled_knots()
    for i in range(6):
        exact = average_yields(
            [
                partial(
                    isotropic_yield, law=law, peak_yield=1.0, peak_energy_eV=peak_energy[i],
                    mean_atomic_number=number,
                )
            ],
            float(temperature[i]), x * peak_energy[i], (PLANE, SPHERE),
        )[0]  # fmt: skip
        assert found.plane[i] == pytest.approx(exact[0], abs=1e-6)
        gain = 1.0 + x * peak_energy[i] / temperature[i]
        assert found.thick[i] / gain == pytest.approx(exact[1] / gain, abs=1e-6)


@pytest.mark.parametrize("law", LAWS)
def test_currents_of_every_material_against_the_direct_path(law: YieldLaw) -> None:
    rng = np.random.default_rng(3)
    spectrum = solar_spectrum()
    materials = [drawn(load_material(name), rng) for name in NAMES]
    coarse = ensemble_currents([question(materials, law, spectrum)], EscapeCurves())
    model = surface_model(materials, plasmas(), spectrum, law=law, radius_m=1.6)
    m, surfaces = 1500, len(materials)
    size = np.exp(rng.uniform(np.log(0.1), np.log(2e4), (m, surfaces)))
    potential = np.where(rng.random((m, surfaces)) < 0.7, -size, 0.05 * size)
    share = rng.random(m)
    light = rng.random((m, surfaces)) * (rng.random((m, surfaces)) < 0.5)
    setting = Setting(np.stack([1.0 - share, share], -1), light, np.ones((m, 1)))
    found, slope = coarse.current_and_slope(np.zeros(m, dtype=np.intp), potential, setting)
    direct = surface_currents(model, potential, setting)
    gross = np.abs(direct.by_mechanism).sum(axis=-1)
    error = np.abs(found - direct.by_mechanism.sum(axis=-1)) / gross
    assert error.max() < 4e-3
    assert np.sqrt((error**2).mean()) < 3e-4
    # slope of the table itself, by central differences inside cells
    step = 1e-6 * np.abs(potential)
    zero = np.zeros(m, dtype=np.intp)
    up, down = (coarse.current(zero, potential + s * step, setting) for s in (1.0, -1.0))
    numeric = (up - down) / (2.0 * step)
    scale = np.abs(slope) + 1e-3 * gross / np.abs(potential)
    assert np.quantile(np.abs(numeric - slope) / scale, 0.98) < 1e-4


def test_a_member_does_not_depend_on_its_company() -> None:
    rng = np.random.default_rng(11)
    spectrum = solar_spectrum()
    names = ["polyimide film", "cover glass", "gold", "black polyimide film"]
    questions = [
        question([drawn(load_material(n), rng) for n in names], LAWS[i % 2], spectrum)
        for i in range(7)
    ]
    block = ensemble_currents(questions, EscapeCurves())
    alone = ensemble_currents([questions[4]], EscapeCurves())
    assert np.array_equal(block.coefficients[4], alone.coefficients[0])
    potential = rng.normal(0.0, 300.0, (7, 4))
    setting = Setting(np.tile([0.3, 0.7], (7, 1)), rng.random((7, 4)), np.ones((7, 1)))
    together = block.current(np.arange(7), potential, setting)
    single = alone.current(
        np.zeros(1, np.intp),
        potential[4:5],
        Setting(setting.strength[4:5], setting.light[4:5], np.ones((1, 1))),
    )
    assert np.array_equal(together[4], single[0])


def test_what_coarse_tables_do_not_know_is_told() -> None:
    spectrum = solar_spectrum()
    plain = question([load_material("gold")], LAWS[0], spectrum)
    assert fits_ensemble([plain])
    assert not fits_ensemble([replace(plain, collection="cylinder")])
    assert not fits_ensemble([replace(plain, plasmas=[load_plasma("ECSS auroral worst case")])])
    gold = load_material("gold")
    by_number = replace(gold, laws={**gold.laws, "backscatter_law": "hunger_kuchler_1979"})
    assert not fits_ensemble([replace(plain, materials=[by_number])])


@pytest.fixture(scope="module")
def loaded() -> LoadedCase:
    return load_case(CASE)


def test_worst_differentials_of_an_ensemble_against_full_tables(loaded: LoadedCase) -> None:
    rng = np.random.default_rng(2)
    members = [
        Member(
            loaded.case,
            {name: drawn(material, rng) for name, material in loaded.materials.items()},
            loaded.plasmas,
            law,
        )
        for law in LAWS
    ]
    around = surroundings_of(loaded)
    full = solve_mode(loaded, members=members, around=around)
    fast = solve_mode(
        loaded,
        members=members,
        around=around,
        curves=EscapeCurves(),
        tolerance=ENSEMBLE_TOLERANCE,
    )
    assert isinstance(fast.balance.table, EnsembleCurrents)
    late = full.times_s[full.times_s > 1.0]
    for exact, coarse in zip(full.trajectories, fast.trajectories, strict=True):
        for worst in (np.min, np.max):
            a, b = worst(exact(late), axis=0), worst(coarse(late), axis=0)
            assert np.all(np.abs(a - b) <= np.maximum(1.0, 0.01 * np.abs(a)))
