"""Choices about photoemission that a person can reach: records, cases, commands."""

from __future__ import annotations

import json
import subprocess
import sys
import tomllib
from pathlib import Path
from typing import Any, get_args

import numpy as np
import pytest

from charging.arguments import as_material
from charging.case import load_case_text
from charging.case_tables import SolarBand
from charging.currents.photo_escape import photo_escape, photo_sheath
from charging.dataset import photoyields
from charging.errors import InputError
from charging.orbit_run import spectrum_of
from charging.photo_float import sunlit_potentials
from charging.photo_table import photoyield_table, retarding_curves
from charging.point import floating_point
from charging.spacecraft import surface_materials
from environments.spectrum import BANDS, solar_spectrum
from materials import MaterialError, library_text, load_material, read_material
from materials.photoemission import (
    low_energy_peak,
    maxwellian_escape,
    photo_current_density,
    two_exponential_escape,
    yield_per_photon,
)
from materials.surface_state import AGED_FROM, aged_photoyield, in_state

CASE = Path(__file__).parents[2] / "cases" / "geo_static_worst_case.toml"
QUIET = "quiet geostationary"


def gold_record(**photoyield: Any) -> dict[str, Any]:
    document = tomllib.loads(library_text("gold"))
    document["photoyield"] |= photoyield
    return document


def halflit(*words: str, code: int = 0) -> tuple[str, str]:
    done = subprocess.run(
        [sys.executable, "-W", "error", "-m", "charging", *words],
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode == code, done.stderr
    return done.stdout, done.stderr


def with_state(state: str) -> str:
    head, mark, tail = CASE.read_text(encoding="utf-8").partition("\nmaterial = ")
    return f'{head}\nsurface_state = "{state}"{mark}{tail}'


# --- the aged state ------------------------------------------------------------------------------


@pytest.mark.parametrize("name", ["PTFE", "fused silica", "graphite", "oxidised aluminium"])
def test_aged_surfaces_become_alike_and_emit_more_at_every_potential(name: str) -> None:
    material, sun = load_material(name), solar_spectrum()
    aged, gold = in_state(material, "aged"), in_state(load_material("gold"), "aged")
    assert low_energy_peak(aged) == low_energy_peak(gold)
    v = np.array([0.0, 1.0, 5.0, 10.0, 20.0])
    assert material.photoyield is not None
    full = float(
        photo_current_density(sun.photon_energy_eV, sun.photon_flux_m2_s, material.photoyield)
    )
    aged_full = float(
        photo_current_density(sun.photon_energy_eV, sun.photon_flux_m2_s, aged_photoyield())
    )
    before = full * photo_escape(v, material, sun, radius_m=1.0, geometry="planar")
    after = aged_full * photo_escape(v, aged, sun, radius_m=1.0, geometry="planar")
    assert np.all(after > before)
    other = photo_escape(v, gold, sun, radius_m=1.0)
    assert photo_escape(v, aged, sun, radius_m=1.0) == pytest.approx(other, rel=1e-14, abs=0.0)


def test_aged_curve_is_the_envelope_in_x_rays_too() -> None:
    aged, energy = aged_photoyield(), np.geomspace(100.0, 2.4e4, 300)
    curves = [load_material(name).photoyield for name in AGED_FROM]
    largest = np.max([yield_per_photon(energy, c) for c in curves if c is not None], axis=0)
    # sharp absorption edges fall between two points
    assert yield_per_photon(energy, aged) == pytest.approx(largest, rel=0.06, abs=0.0)
    assert min(aged.spread_factor, aged.near_threshold_factor, aged.high_energy_factor) >= 3.0


def test_air_exposed_gold_is_the_same_by_name_and_by_state() -> None:
    by_state = photoyield_table(["gold"], surface_state="air-exposed")[0]
    by_name = photoyield_table(["gold, air-exposed"])[0]
    for key in ("saturation_current_A_m2", "potential_at_1_percent_V", "mean_energy_eV"):
        assert getattr(by_state, key) == pytest.approx(getattr(by_name, key), rel=1e-12, abs=0.0)


def test_a_result_keeps_every_record_that_a_state_needs() -> None:
    loaded = load_case_text(with_state("aged"))
    assert set(AGED_FROM) <= set(loaded.material_texts)
    first = photoyields(loaded)[0]
    assert (first["state"], first["level"]) == ("aged", "largest of laboratory curves")
    assert first["spread_factor"] == 3.0
    kept = dict(loaded.material_texts)
    again = load_case_text(loaded.text, material_texts=kept, plasma_texts=loaded.plasma_texts)
    assert again.material_texts == loaded.material_texts
    curve = surface_materials(again.case, again.materials)[0].photoyield
    assert curve is not None
    assert curve.electrons_per_photon == pytest.approx(aged_photoyield().electrons_per_photon)
    # the kept record rules, not the library of the day
    text = library_text("oxidised aluminium")
    values = tomllib.loads(text)["photoyield"]["electrons_per_photon"]
    start = text.index("electrons_per_photon = [")
    end = text.index("]", start) + 1
    tripled_values = f"electrons_per_photon = {[3.0 * value for value in values]}"
    kept["oxidised aluminium"] = text[:start] + tripled_values + text[end:]
    changed = load_case_text(loaded.text, material_texts=kept, plasma_texts=loaded.plasma_texts)
    tripled = surface_materials(changed.case, changed.materials)[0].photoyield
    assert tripled is not None
    assert float(yield_per_photon(10.2, tripled)) > 2.0 * float(yield_per_photon(10.2, curve))


# --- two records of one name ---------------------------------------------------------------------


def test_two_records_of_one_name_keep_their_own_curves(tmp_path: Path) -> None:
    values = gold_record()["photoyield"]["electrons_per_photon"]
    halved = read_material(gold_record(electrons_per_photon=[0.5 * value for value in values]))
    one, two = retarding_curves(["gold", halved], np.array([0.0, 3.0]))
    assert one is not None
    assert two is not None
    assert two[0] == pytest.approx(0.5 * one[0], rel=1e-12, abs=0.0)
    mine = tmp_path / "mine.toml"
    text = library_text("gold")
    mine.write_text(text.replace("0.0, 1e-6, 6e-6", "0.0, 1e-3, 6e-3"), encoding="utf-8")
    rows = json.loads(halflit("photoyield", "gold", str(mine), "--json")[0])
    for row in rows:
        curve = row["retarding_curve"]["current_A_m2"]
        assert 0.0 < curve[0] < row["saturation_current_A_m2"]
    assert rows[0]["retarding_curve"] != rows[1]["retarding_curve"]
    assert f"gold ({mine})" in halflit("photoyield", "gold", str(mine))[0]


# --- prescribed energies, measured current, flare ------------------------------------------------

TWO = {
    "law": "two exponentials",
    "current_uA_m2": [80.0, 3.0],
    "scale_V": [2.0, 7.5],
    "source": "Pedersen 1995, Ann. Geophys. 13, 118",
    "basis": "memory",
}
MAXWELLIAN = {"law": "maxwellian", "temperature_eV": 1.5, "source": "own", "basis": "assumed"}


def test_prescribed_energies_replace_those_from_photons() -> None:
    v, sun = np.array([0.0, 1.0, 6.0]), solar_spectrum()
    warm = read_material(gold_record(electron_energies=MAXWELLIAN))
    ours = photo_escape(v, warm, sun, radius_m=1.0, geometry="planar")
    expected = maxwellian_escape(v, temperature_eV=1.5)
    assert ours == pytest.approx(expected, rel=1e-14, abs=0.0)
    sheath = photo_sheath(warm, sun)
    assert sheath is not None
    assert sheath.mean_energy_eV == pytest.approx(3.0)
    fitted = read_material(gold_record(electron_energies=TWO))
    ours = photo_escape(v, fitted, sun, radius_m=1.0)
    expected = two_exponential_escape(v, current_A_m2=[80e-6, 3e-6], scale_V=[2.0, 7.5])
    assert ours == pytest.approx(expected, rel=1e-14, abs=0.0)
    row = photoyield_table([fitted])[0]
    assert row.electron_energies == "two exponentials"
    assert photoyield_table(["gold"])[0].electron_energies == "photons"
    # and they reach the floating potential: the tail of the fit lifts it
    low, high = sunlit_potentials([warm, fitted], QUIET)
    assert high > low


@pytest.mark.parametrize(
    ("entry", "key"),
    [
        ({**MAXWELLIAN, "law": "box"}, ("law",)),
        ({**MAXWELLIAN, "temperature_eV": 0.0}, ("temperature_eV",)),
        ({**MAXWELLIAN, "scale_V": [1.0, 2.0]}, ("scale_V",)),
        ({**TWO, "scale_V": [1.0]}, ("scale_V",)),
        ({**TWO, "current_uA_m2": [1.0, -2.0]}, ("current_uA_m2", 1)),
        ({k: x for k, x in TWO.items() if k != "source"}, ("source",)),
    ],
)
def test_unusable_energies_are_refused(entry: Any, key: tuple[str | int, ...]) -> None:
    with pytest.raises(MaterialError) as caught:
        read_material(gold_record(electron_energies=entry))
    assert caught.value.key == ("photoyield", "electron_energies", *key)


def test_a_record_may_ask_for_a_measured_current() -> None:
    wanted = {"saturation_current_uA_m2": 50.0, "f107": 100.0, "source": "own bench"}
    mine = as_material(read_material(gold_record(normalised_to=wanted)))
    row = photoyield_table([mine], f107=100.0)[0]
    assert row.saturation_current_A_m2 == pytest.approx(50e-6, rel=1e-12, abs=0.0)
    assert row.level == "normalised to a measured current"
    assert mine.photoyield is not None
    assert "own bench" in mine.photoyield.note
    for current in (0.0, 5e3):
        document = gold_record(normalised_to={**wanted, "saturation_current_uA_m2": current})
        with pytest.raises((MaterialError, InputError), match="saturation_current_uA_m2"):
            as_material(read_material(document))


def test_flare_factors_reach_spectrum_table_and_case() -> None:
    assert get_args(SolarBand) == tuple(BANDS)
    plain, flared = (photoyield_table(["gold"], flare=flare)[0] for flare in ({}, {"EUV": 10.0}))
    part = {s.band: s.current_A_m2 for s in plain.bands}
    gain = flared.saturation_current_A_m2 - plain.saturation_current_A_m2
    assert gain == pytest.approx(9.0 * part["EUV"], rel=1e-12, abs=0.0)
    assert floating_point("gold", QUIET, sunlit=True, flare={"EUV": 10.0}).reached_V > (
        floating_point("gold", QUIET, sunlit=True).reached_V
    )
    text = CASE.read_text(encoding="utf-8")
    assert text.count("[sun]\n") == 1
    loaded = load_case_text(text.replace("[sun]\n", '[sun]\nflare = {"X-ray" = 100.0}\n'))
    sun = spectrum_of(loaded.case)
    quiet = spectrum_of(load_case_text(text).case)
    x_ray = np.array([band == "X-ray" for band in sun.band])
    ratio = sun.photon_flux_m2_s / quiet.photon_flux_m2_s
    assert ratio == pytest.approx(np.where(x_ray, 100.0, 1.0))
    with pytest.raises(InputError, match="flare") as caught:
        load_case_text(text.replace("[sun]\n", "[sun]\nflare = {gamma = 2.0}\n"), file="c.toml")
    assert caught.value.line is not None
    out = json.loads(halflit("spectrum", "--flare", "X-ray=100", "--json")[0])
    assert out["flare"] == {"X-ray": 100.0}
    for word in ("X-ray", "X-ray=much", "gamma=2", "X-ray=-1"):
        assert "--flare" in halflit("spectrum", "--flare", word, code=2)[1]


# --- refusals at file, line and key ---------------------------------------------------------------


@pytest.mark.parametrize(
    ("old", "new", "key"),
    [
        ('curve_of = "gold, air-exposed"', 'curve_of = "unobtainium"', "curve_of"),
        ('curve_of = "gold, air-exposed"', 'curve_of = "bare collector"', "curve_of"),
        ('curve_of = "gold, air-exposed"', "barrier_shift_eV = 2.9", "barrier_shift_eV"),
        ("0.0, 1e-6, 6e-6", "0.0, 1e-320, 6e-6", "electrons_per_photon"),
        ("    4.8, 5.0,", "    0.5, 5.0,", "photon_energy_eV"),
        ("near_threshold_to_eV = 8.0", "near_threshold_to_eV = -8.0", "near_threshold_to_eV"),
    ],
)
def test_unusable_record_files_name_file_line_and_key(
    tmp_path: Path, old: str, new: str, key: str
) -> None:
    text = library_text("gold")
    assert text.count(old) == 1
    mine = tmp_path / "mine.toml"
    mine.write_text(text.replace(old, new), encoding="utf-8")
    for call in (
        lambda: photoyield_table([str(mine)], surface_state="air-exposed"),
        lambda: floating_point(str(mine), QUIET, sunlit=True),
    ):
        with pytest.raises(InputError, match=key) as caught:
            call()
        assert caught.value.file == str(mine)
        assert caught.value.line is not None


def test_a_law_may_not_give_more_than_a_table() -> None:
    law = {
        "law": "fowler_dubridge",
        "threshold_eV": 4.5,
        "electrons_per_photon_at_1_eV": 0.1,
        "upper_photon_energy_eV": 30.0,
        "source": "s",
        "basis": "assumed",
        "level": "as published",
        "spread_factor": 2.0,
    }
    document = {**gold_record(), "photoyield": law}
    with pytest.raises(MaterialError, match="electrons per photon"):
        read_material(document)
    law["upper_photon_energy_eV"] = 14.0
    assert read_material(document).photoyield is not None


def test_a_threshold_above_all_photons_gives_nothing_everywhere() -> None:
    hard = read_material(
        gold_record(
            photon_energy_eV=[3e4, 4e4, 5e4],
            electrons_per_photon=[0.0, 0.1, 0.2],
            above_last_point="hold",
        )
    )
    row = photoyield_table([hard])[0]
    assert row.saturation_current_A_m2 == 0.0
    assert row.mean_energy_eV is None
    assert floating_point(hard, QUIET, sunlit=True).current_density_A_m2["photoemission"] == 0.0
    assert sunlit_potentials([hard], QUIET)[0] == floating_point(hard, QUIET).reached_V


# --- pictures and defaults -----------------------------------------------------------------------


def test_pictures_without_current_or_without_emitters(tmp_path: Path) -> None:
    target = tmp_path / "dark.png"
    _, err = halflit("photoyield", "gold", "--incidence-cosine", "0", "--plot", str(target))
    assert target.exists()
    assert "Warning" not in err
    _, err = halflit("photoyield", "bare collector", "--plot", str(target), code=2)
    assert "nothing to draw" in err


def test_photoyield_and_point_give_one_answer() -> None:
    out, _ = halflit("photoyield", "gold", "--plasma", QUIET, "--json")
    asked = json.loads(halflit("point", "--material", "gold", "--plasma", QUIET, "--sunlit",
                               "--json")[0])  # fmt: skip
    assert json.loads(out)[0]["floating_potential_V"] == asked["reached_V"]
    assert "escape auto, body radius 1 m" in halflit("photoyield", "gold")[0]
