"""Escape of photoelectrons in the charging room: geometry, states, inverse, tables."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scipy.constants import e, epsilon_0, m_e

from charging.case import load_case, load_case_text
from charging.currents.emission import escape_tables
from charging.currents.lookup import net_currents
from charging.currents.photo_escape import (
    photo_escape,
    photo_sheath,
    point_source_weight,
    sheath_of,
)
from charging.currents.surface import Setting, surface_currents, surface_model
from charging.errors import InputError
from charging.orbit_run import run_case
from charging.photo_float import potential_for_current, sunlit_potentials
from charging.photo_table import photocurrent_grid, photoyield_table, retarding_curves
from charging.point import floating_point
from charging.spacecraft import surface_materials
from environments.catalogue import load_plasma
from environments.rebin import rebin
from environments.spectrum import BANDS, solar_spectrum
from materials import load_material
from materials.photoemission import escape_fraction, low_energy_peak
from materials.photoyield import escaping_weights, photo_current_density

CASE = Path(__file__).parents[2] / "cases" / "geo_static_worst_case.toml"
QUIET = "quiet geostationary"


def test_sheath_is_that_of_a_maxwellian_in_balance() -> None:
    sheath = sheath_of(5e-5, 3.0)
    # one-sided flux of a Maxwellian of the density and temperature is the current
    flux = sheath.density_m3 * np.sqrt(e * 1.5 / (2.0 * np.pi * m_e))
    assert e * flux == pytest.approx(5e-5, rel=1e-12)
    assert sheath.debye_length_m == pytest.approx(
        np.sqrt(epsilon_0 * 1.5 / (sheath.density_m3 * e)), rel=1e-12
    )
    assert photo_sheath(load_material("bare collector"), solar_spectrum()) is None


def test_weight_is_half_where_the_debye_length_is_the_radius() -> None:
    sheath = sheath_of(5e-5, 3.0)
    assert point_source_weight(sheath, sheath.debye_length_m) == pytest.approx(0.5, rel=1e-14)
    assert point_source_weight(sheath, 1e3) < 1e-6
    assert point_source_weight(sheath, 1e-3) > 0.99


@pytest.mark.parametrize("geometry", ["planar", "point source"])
def test_limits_are_those_of_the_material(geometry: Any) -> None:
    material, sun, v = load_material("gold"), solar_spectrum(), np.array([0.5, 3.0, 12.0])
    curve = material.photoyield
    assert curve is not None
    weight = escaping_weights(sun.photon_energy_eV, sun.photon_flux_m2_s, curve)
    expected = escape_fraction(
        v,
        sun.photon_energy_eV,
        weight,
        curve.threshold_eV,
        geometry=geometry,
        peak=low_energy_peak(material),
    )
    ours = photo_escape(v, material, sun, radius_m=1.0, geometry=geometry)
    assert ours == pytest.approx(expected, rel=1e-14)


def test_escape_table_against_direct_evaluation() -> None:
    sun = solar_spectrum()
    surfaces = [load_material(name) for name in ("gold", "PTFE", "bare collector")]
    table = escape_tables(surfaces, sun, radius_m=1.3)
    for volts in (0.01, 0.7, 2.2, 5.9, 14.0, 31.0, 120.0):
        ours = table(np.full(3, volts))[0][:, 0]
        direct = [float(photo_escape(np.array(volts), m, sun, radius_m=1.3)) for m in surfaces]
        assert ours == pytest.approx(direct, abs=2e-6)


def test_two_states_of_one_material_have_their_own_escape() -> None:
    from materials.surface_state import in_state

    polymer = load_material("PTFE")
    table = escape_tables([polymer, in_state(polymer, "aged")], solar_spectrum(), radius_m=1.0)
    fresh, aged = table(np.array([2.0, 2.0]))[0][:, 0]
    assert abs(fresh - aged) > 0.01


def test_photocurrent_of_a_surface_is_saturation_times_escape() -> None:
    material, sun = load_material("ITO coating"), solar_spectrum(distance_au=0.8)
    model = surface_model(
        [material], [load_plasma(QUIET)], sun, law="sanders_inouye_1979", radius_m=2.0
    )
    curve = material.photoyield
    assert curve is not None
    full = float(photo_current_density(sun.photon_energy_eV, sun.photon_flux_m2_s, curve))
    v = np.array([[4.0]])
    photo = surface_currents(model, v, Setting(np.ones((1, 1)), np.full((1, 1), 0.6)))
    share = float(photo_escape(np.array(4.0), material, sun, radius_m=2.0))
    ours = float(photo.by_mechanism[0, 0, -1])
    assert ours == pytest.approx(0.6 * full * share, rel=1e-4, abs=0.0)


def test_angle_growth_reaches_the_currents_and_is_capped() -> None:
    gold = load_material("gold")
    assert gold.photoyield is not None
    grown = replace(gold, photoyield=replace(gold.photoyield, largest_angle_growth=1.5))
    plain = photoyield_table([gold], incidence_cosine=0.5)[0].saturation_current_A_m2
    more = photoyield_table([grown], incidence_cosine=0.5)[0].saturation_current_A_m2
    assert more == pytest.approx(1.5 * plain, rel=1e-12, abs=0.0)
    capped = photoyield_table([grown], incidence_cosine=0.9)[0].saturation_current_A_m2
    assert capped == pytest.approx(2.0 * plain, rel=1e-12, abs=0.0)
    model = surface_model(
        [grown], [load_plasma(QUIET)], solar_spectrum(), law="lin_joy_2005", radius_m=1.0
    )
    v = np.array([[-100.0], [-100.0]])
    light = Setting(np.ones((2, 1)), np.array([[0.5], [0.9]]))
    photo = surface_currents(model, v, light).by_mechanism[:, 0, -1]
    assert photo == pytest.approx([more, capped], rel=1e-12, abs=0.0)
    # penumbra: a tenth of the disc at cosine 0.9; the cap acts on the angle, not on the disc
    shade = Setting(np.ones((1, 1)), np.full((1, 1), 0.09), np.full((1, 1), 0.1))
    half = surface_currents(model, v[:1], shade).by_mechanism[0, 0, -1]
    assert half == pytest.approx(0.1 * capped, rel=1e-12, abs=0.0)
    table = net_currents([model])
    dark = Setting(np.ones((1, 1)), np.zeros((1, 1)), np.full((1, 1), 0.1))
    which = np.zeros(1, dtype=np.intp)
    lit = table.current(which, v[:1], shade) - table.current(which, v[:1], dark)
    assert float(lit[0, 0]) == pytest.approx(0.1 * capped, rel=1e-6, abs=0.0)


def test_floating_potential_balances_the_retarding_curve() -> None:
    options: Any = {"radius_m": 1.0, "photo_escape": "auto"}
    found = floating_point("gold", QUIET, sunlit=True, radius_m=1.0)
    assert sunlit_potentials(["gold"], QUIET, **options) == (found.reached_V,)
    currents = dict(found.current_density_A_m2)
    photo = currents.pop("photoemission")
    assert photo + sum(currents.values()) == pytest.approx(0.0, rel=0.0, abs=1e-8 * photo)
    # the inverse alone: what the other mechanisms collect fixes the potential
    volts = potential_for_current("gold", -sum(currents.values()), **options)
    assert volts == pytest.approx(found.reached_V, abs=2e-3)


def test_inverse_is_the_inverse() -> None:
    for geometry in ("planar", "point source", "auto"):
        for current in (1e-5, 1e-6, 1e-8):
            volts = potential_for_current("gold", current, photo_escape=geometry)
            (curve,) = retarding_curves(["gold"], np.array([volts]), photo_escape=geometry)
            assert curve is not None
            assert curve[0] == pytest.approx(current, rel=1e-6, abs=0.0)
    with pytest.raises(InputError, match="escaping_current_A_m2"):
        potential_for_current("gold", 0.0)


def test_smaller_bodies_float_higher() -> None:
    large, small = (
        sunlit_potentials(["ITO coating"], QUIET, photo_escape="auto", radius_m=r)[0]
        for r in (100.0, 0.01)
    )
    plane = sunlit_potentials(["ITO coating"], QUIET, photo_escape="planar", radius_m=100.0)[0]
    assert plane <= large + 1e-6
    assert small > large


def test_bands_add_up_and_carry_the_photon_threshold() -> None:
    row = photoyield_table(["PTFE"], f107=120.0, incidence_cosine=0.3)[0]
    assert [share.band for share in row.bands] == list(BANDS)
    assert sum(s.share for s in row.bands) == pytest.approx(1.0)
    whole = sum(s.current_A_m2 for s in row.bands)
    assert whole == pytest.approx(row.saturation_current_A_m2, rel=1e-12, abs=0.0)
    by_band = {s.band: s.share for s in row.bands}
    assert by_band["Lyman-alpha"] == 0.0  # 10.2 eV is below its threshold
    assert by_band["EUV"] > 0.9


def test_grid_of_currents_is_the_single_ones() -> None:
    names, cosine, f107 = ["gold", "bare collector", "PTFE"], [0.2, 1.0], [80.0, 150.0, 220.0]
    grid = photocurrent_grid(names, incidence_cosine=cosine, f107=f107, distance_au=0.7)
    assert grid.shape == (3, 2, 3)
    for j, c in enumerate(cosine):
        for k, f in enumerate(f107):
            rows = photoyield_table(names, incidence_cosine=c, f107=f, distance_au=0.7)
            ours = [row.saturation_current_A_m2 for row in rows]
            assert grid[:, j, k] == pytest.approx(ours, rel=1e-12, abs=0.0)
    with pytest.raises(InputError, match="activity"):
        photocurrent_grid(names, incidence_cosine=[1.0], f107=[1e4])


@pytest.mark.parametrize(
    ("options", "word"),
    [
        ({"photo_escape": "box"}, "photo_escape"),
        ({"surface_state": "rusty"}, "surface_state"),
        ({"surface_state": "clean"}, "surface_state"),
        ({"radius_m": 0.0}, "radius_m"),
        ({"incidence_cosine": 2.0}, "incidence_cosine"),
        ({"f107": 9.0}, "f107"),
    ],
)
def test_unusable_options_are_refused(options: Any, word: str) -> None:
    with pytest.raises(InputError, match=word):
        photoyield_table(["PTFE"], **options)


def test_point_reports_the_photoelectron_sheath() -> None:
    lit = floating_point("gold", QUIET, sunlit=True, photo_escape="planar").photoelectrons
    assert lit is not None
    assert lit.point_source_share == 0.0
    assert 0.05 < lit.debye_length_m < 2.0
    assert floating_point("gold", QUIET).photoelectrons is None
    aged = floating_point("gold", QUIET, sunlit=True, surface_state="aged").photoelectrons
    assert aged is not None
    assert aged.density_m3 > lit.density_m3


# --- case files -----------------------------------------------------------------------------------


def with_state(state: str) -> str:
    text = CASE.read_text(encoding="utf-8")
    head, mark, tail = text.partition("\nmaterial = ")
    assert mark
    return f'{head}\nsurface_state = "{state}"{mark}{tail}'


def test_case_takes_a_surface_state_per_surface() -> None:
    loaded = load_case_text(with_state("aged"))
    aged, plain = surface_materials(loaded.case, loaded.materials)[:2]
    assert loaded.case.surface[0].surface_state == "aged"
    assert aged.photoyield is not None
    assert aged.photoyield.level == "largest of laboratory curves"
    assert plain.photoyield is None or plain.photoyield.level != aged.photoyield.level


def test_case_refuses_a_state_its_material_does_not_have() -> None:
    for state, word in (("clean", "not in the record"), ("rusty", "rusty")):
        with pytest.raises(InputError, match=word) as caught:
            load_case_text(with_state(state), file="c.toml")
        assert caught.value.line is not None


def test_escape_geometry_of_a_case_changes_its_lit_potentials() -> None:
    text = CASE.read_text(encoding="utf-8")
    assert "photo_escape" not in text
    results = []
    for word in ("planar", "point source"):
        keyed = (
            text.replace("[emission]\n", f'[emission]\nphoto_escape = "{word}"\n')
            if "[emission]\n" in text
            else f'{text}\n[emission]\nphoto_escape = "{word}"\n'
        )
        run = run_case(load_case_text(keyed))
        results.append(run.modes[0].trajectories[0].y_end[-1])
    assert np.abs(results[0] - results[1]).max() > 0.0
    assert load_case(CASE).case.emission.photo_escape == "auto"


# --- rebinning ------------------------------------------------------------------------------------


def test_rebinning_into_the_own_bins_changes_nothing() -> None:
    sun = solar_spectrum()
    fine = sun.wavelength_low_nm >= 123.0
    edge = np.append(sun.wavelength_low_nm[fine], 400.0)
    again = rebin(sun, edge)
    assert again.photon_flux_m2_s == pytest.approx(sun.photon_flux_m2_s[fine], rel=1e-13)
    assert again.photon_energy_eV == pytest.approx(sun.photon_energy_eV[fine], rel=1e-13)


def test_rebinning_keeps_every_mean_energy_within_its_bin() -> None:
    sun = rebin(solar_spectrum(), np.geomspace(0.04, 401.0, 300))
    filled = sun.photon_flux_m2_s > 0.0
    low, high = (1239.841984 / w for w in (sun.wavelength_high_nm, sun.wavelength_low_nm))
    assert np.all(low[filled] <= sun.photon_energy_eV[filled] * (1 + 1e-9))
    assert np.all(sun.photon_energy_eV[filled] <= high[filled] * (1 + 1e-9))


def test_rebinning_puts_a_line_into_one_bin() -> None:
    sun = rebin(solar_spectrum(), [120.0, 121.5, 122.0, 123.0])
    assert (sun.photon_flux_m2_s > 0.0).tolist() == [False, True, False]
    assert sun.band[1] == "Lyman-alpha"


@pytest.mark.parametrize("edges", [[1.0], [2.0, 1.0], [-1.0, 1.0], [0.0, float("nan")]])
def test_rebinning_refuses(edges: list[float]) -> None:
    with pytest.raises(ValueError, match="edge_nm"):
        rebin(solar_spectrum(), edges)
