"""Populations that are no Maxwellians inside the current model: slopes, lookup, mixtures."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray

from charging.currents.lookup import net_currents
from charging.currents.splines import segmented_knots, segmented_spline
from charging.currents.surface import (
    MECHANISMS,
    Setting,
    SurfaceModel,
    surface_currents,
    surface_model,
)
from environments.auroral import FlatAndMaxwellian, Fontheim
from environments.catalogue import load_plasma
from environments.distributions import Kappa, Tabulated
from environments.plasma import ELECTRON, HYDROGEN_ION, Plasma, Population, Species, population_of
from environments.spectrum import solar_spectrum
from materials import load_material
from materials.secondary import YIELD_LAWS, YieldLaw

Array = NDArray[np.float64]
COLLECTIONS = ("auto", "sphere", "cylinder", "plane")
SUN = solar_spectrum()
ENERGY = np.geomspace(20.0, 3e4, 25)
SPECTRA = {
    "kappa": Kappa(1e6, 900.0, 3.2),
    "fontheim": Fontheim(3e11, 1.1, 1e8, 3e3, 3.5e9, 1e4, 2e3, 50.0, 4e4),
    "flat and maxwellian": FlatAndMaxwellian(3.9e-18, 17440.0, 1.13e6, 3960.0),
    "tabulated": Tabulated(tuple(ENERGY), tuple(1e9 * ENERGY * np.exp(-ENERGY / 2e3))),
}
DOUBLE = Species("He++", 2.0 * HYDROGEN_ION.mass_kg * 2.0, 2)


def plasma(electrons: str) -> Plasma:
    parts = (
        population_of(ELECTRON, SPECTRA[electrons]),
        Population(ELECTRON, "maxwellian", 2e6, 30.0),
        population_of(HYDROGEN_ION, Kappa(1e6, 700.0, 4.0)),
        Population(DOUBLE, "maxwellian", 1e5, 50.0),
    )
    return Plasma("test", "test", "a test", "assumed", None, "", parts)


def model_of(
    electrons: str, law: YieldLaw = "sanders_inouye_1979", collection: str = "auto"
) -> SurfaceModel:
    return surface_model(
        [load_material("gold"), load_material("polyimide film"), load_material("bare collector")],
        [plasma(electrons)],
        SUN,
        law=law,
        radius_m=40.0,
        collection=collection,
    )


def dark(v: Array) -> Setting:
    return Setting(np.ones((len(v), 1)), np.zeros_like(v))


@pytest.mark.parametrize("law", YIELD_LAWS)
@pytest.mark.parametrize("electrons", SPECTRA)
def test_slope_against_richardson(electrons: str, law: YieldLaw) -> None:
    collection = COLLECTIONS[YIELD_LAWS.index(law)]
    model = model_of(electrons, law, collection)
    size = np.geomspace(0.11, 1e5, 61)
    v = np.repeat(np.concatenate([-size[::-1], size])[:, None], 3, axis=1)
    h = 1e-4 * np.abs(v)

    def net(potential: Array) -> Array:
        return surface_currents(model, potential, dark(v)).by_mechanism.sum(axis=-1)

    central = [(net(v + s * h) - net(v - s * h)) / (2.0 * s * h) for s in (1.0, 0.5)]
    numeric = (4.0 * central[1] - central[0]) / 3.0
    found = surface_currents(model, v, dark(v))
    gross = np.abs(found.by_mechanism).sum(axis=-1)
    wrong = np.abs(found.slope - numeric) * np.abs(v) / gross
    # away from the kinks of a spectrum, where a difference straddles two branches
    marks = np.array([m for s in (*model.electron_spectra, *model.ion_spectra) for m in s.breaks_V])
    near = (np.abs(np.abs(v)[..., None] - marks) < 2.0 * h[..., None]).any(axis=-1)
    assert wrong[~near].max() < 1e-6


@pytest.mark.parametrize("collection", COLLECTIONS)
@pytest.mark.parametrize("electrons", SPECTRA)
def test_lookup_against_direct_path(electrons: str, collection: str) -> None:
    model = model_of(electrons, collection=collection)
    table = net_currents([model])
    random = np.random.default_rng(3)
    v = 10.0 ** random.uniform(-2.0, 5.2, (3000, 3)) * random.choice([-1.0, 1.0], (3000, 3))
    direct = surface_currents(model, v, dark(v))
    net, slope = table.current_and_slope(np.zeros(3000, dtype=np.intp), v, dark(v))
    gross = np.abs(direct.by_mechanism).sum(axis=-1)
    worst = (np.abs(net - direct.by_mechanism.sum(axis=-1)) / gross).max()
    bend = (np.abs(slope - direct.slope) * np.abs(v) / gross).max()
    print(f"{worst:.1e} {bend:.1e}")
    assert worst < 1e-8
    assert bend < 1e-5


def test_repelled_is_the_same_in_every_geometry() -> None:
    v = np.array([[-3.0, -300.0, -3000.0]])
    rows = [
        surface_currents(model_of("fontheim", collection=c), v, dark(v)).by_mechanism[0]
        for c in COLLECTIONS
    ]
    for column in ("electron_collection", "secondary_electron", "backscatter"):
        at = MECHANISMS.index(column)
        for row in rows[1:]:
            assert row[:, at] == pytest.approx(rows[0][:, at], rel=1e-12)


def test_nothing_arrives_beyond_the_end_of_a_spectrum() -> None:
    around = Plasma("t", "t", "t", "assumed", None, "", (
        population_of(ELECTRON, SPECTRA["fontheim"]),
        Population(HYDROGEN_ION, "maxwellian", 1e6, 10.0),
    ))  # fmt: skip
    model = surface_model([load_material("gold")], [around], SUN, law="lin_joy_2005", radius_m=1.0)
    v = np.array([[-3.9e4], [-3.999999e4], [-4e4], [-1e5]])
    electron = surface_currents(model, v, dark(v)).by_mechanism[:, 0, 0]
    assert electron[0] < electron[1] < 0.0
    assert electron[2:].tolist() == [0.0, 0.0]


def test_doubly_charged_ions_gain_twice_the_energy() -> None:
    two = Plasma("t", "t", "t", "assumed", None, "", (
        Population(ELECTRON, "maxwellian", 1e6, 100.0), Population(DOUBLE, "maxwellian", 1e6, 50.0),
    ))  # fmt: skip
    kappa = Plasma("t", "t", "t", "assumed", None, "", (
        Population(ELECTRON, "maxwellian", 1e6, 100.0),
        population_of(DOUBLE, Kappa(1e6, 50.0, 200.0)),
    ))  # fmt: skip
    v = np.array([[-500.0]])
    for around, tolerance in ((two, 1e-12), (kappa, 2e-2)):
        model = surface_model(
            [load_material("bare collector")], [around], SUN, law="lin_joy_2005", radius_m=1.0,
            collection="sphere",
        )  # fmt: skip
        row = surface_currents(model, v, dark(v)).by_mechanism[0, 0]
        at_zero = surface_currents(model, 0.0 * v, dark(v)).by_mechanism[0, 0]
        assert row[1] / at_zero[1] == pytest.approx(1.0 + 2.0 * 500.0 / 50.0, rel=tolerance)


def test_shares_of_plasmas_add_up() -> None:
    plasmas = [load_plasma("ECSS auroral worst case"), load_plasma("quiet geostationary")]
    model = surface_model([load_material("gold")], plasmas, SUN, law="lin_joy_2005", radius_m=1.0,
                          collection="sphere")  # fmt: skip
    v = np.full((3, 1), -700.0)
    share = Setting(np.array([[1.0, 0.0], [0.0, 1.0], [0.3, 0.7]]), np.zeros((3, 1)))
    rows = surface_currents(model, v, share).by_mechanism[:, 0]
    assert rows[2] == pytest.approx(0.3 * rows[0] + 0.7 * rows[1], rel=1e-12)


def test_segmented_splines_keep_kinks() -> None:
    base = np.linspace(0.0, 10.0, 101)
    breaks = [np.pi, 7.0, 12.0]
    knots = segmented_knots(base, breaks)
    assert {np.pi, 7.0} <= set(knots.tolist())
    assert (np.diff(knots) > 0.0).all()
    values = np.abs(knots - np.pi) + np.sin(knots)
    c = segmented_spline(knots, values[:, None], breaks)
    x = np.linspace(0.0, 9.99, 777)
    k = np.searchsorted(knots, x, side="right") - 1
    found = sum(c[k, n, 0] * (x - knots[k]) ** (5 - n) for n in range(6))
    assert found == pytest.approx(np.abs(x - np.pi) + np.sin(x), abs=1e-7)
