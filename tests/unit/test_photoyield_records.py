"""Records of yield laws, reflectance, X-ray policy and surface states; what they refuse."""

from __future__ import annotations

import copy
import pickle
from collections.abc import Mapping
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from materials import MaterialError, library_text, load_material, read_material
from materials.photo_laws import fowler_dubridge, law_yield
from materials.photoemission import photo_current_density, yield_per_photon
from materials.photoyield_reader import photoyield_from
from materials.surface_state import (
    AGED_FROM,
    STATES,
    aged_photoyield,
    in_state,
    normalised_to_current,
    shift_barrier,
)
from materials.work_function import element_work_function_eV

HEAD = {
    "source": "a curve of the test",
    "basis": "assumed",
    "level": "as published",
    "spread_factor": 2.0,
}
TABLE: Mapping[str, Any] = {
    **HEAD,
    "photon_energy_eV": [5.0, 6.0, 10.0, 100.0],
    "electrons_per_photon": [0.0, 1e-4, 2e-2, 5e-2],
}
X_RAY = {
    "photon_energy_eV": [50.0, 100.0, 1000.0],
    "mass_absorption_m2_kg": [2000.0, 1000.0, 1.0],
    "source": "a straight line of the test",
    "basis": "assumed",
}
FOWLER: Mapping[str, Any] = {
    **HEAD,
    "law": "fowler_dubridge",
    "threshold_eV": 4.5,
    "electrons_per_photon_at_1_eV": 1e-5,
    "upper_photon_energy_eV": 7.0,
    "temperature_K": 1500.0,
}
POWER: Mapping[str, Any] = {
    **HEAD,
    "law": "power",
    "threshold_eV": 9.0,
    "electrons_per_photon_at_1_eV": 1e-3,
    "exponent": 2.5,
    "upper_photon_energy_eV": 20.0,
}


def test_table_holds_its_last_value_unless_x_rays_are_given() -> None:
    held = photoyield_from(TABLE)
    assert yield_per_photon([100.0, 1e4], held).tolist() == pytest.approx([5e-2, 5e-2])
    x_ray = photoyield_from({**TABLE, "above_last_point": "x-ray absorption", "x_ray": X_RAY})
    # E mu: 1000 eV * 1 against 100 eV * 1000; then E^-3, so E mu as E^-2
    assert yield_per_photon([100.0, 1000.0, 1e4], x_ray) == pytest.approx(
        [5e-2, 5e-2 / 100.0, 5e-2 / 1e4], rel=1e-12
    )
    assert yield_per_photon(50.0, x_ray) == yield_per_photon(50.0, held)


def test_fowler_dubridge_record() -> None:
    curve = photoyield_from(FOWLER)
    energy = np.linspace(3.0, 7.0, 41)
    expected = fowler_dubridge(
        energy, threshold_eV=4.5, electrons_per_photon_at_1_eV=1e-5, temperature_K=1500.0
    )
    assert yield_per_photon(energy, curve) == pytest.approx(expected, rel=1e-13)
    assert float(yield_per_photon(4.4, curve)) > 0.0  # a warm metal emits below its threshold
    cold = photoyield_from({**FOWLER, "temperature_K": 0.0})
    assert float(yield_per_photon(4.4, cold)) == 0.0
    assert float(yield_per_photon(5.5, cold)) == pytest.approx(1e-5)
    assert float(yield_per_photon(9.0, cold)) == pytest.approx(1e-5 * 2.5**2)  # held above 7 eV


def test_power_record() -> None:
    curve = photoyield_from(POWER)
    assert curve.threshold_eV == 9.0
    assert float(yield_per_photon(13.0, curve)) == pytest.approx(1e-3 * 4.0**2.5)
    # its points are samples of the law for pictures
    sampled = law_yield(curve.photon_energy_eV, 9.0, 1e-3, exponent=2.5)
    assert curve.electrons_per_photon == pytest.approx(sampled)
    assert pickle.loads(pickle.dumps(curve)).exponent == 2.5


def test_reflected_photons_do_not_emit_when_absorbed_ones_are_counted() -> None:
    mirror = {
        "photon_energy_eV": [5.0, 20.0],
        "share": [0.4, 0.1],
        "source": "s",
        "basis": "assumed",
    }
    counted = photoyield_from({**TABLE, "counts": "absorbed photons", "reflectance": mirror})
    plain = photoyield_from({**TABLE, "reflectance": mirror})
    energy = np.array([7.0, 12.5, 50.0])
    share = 1.0 - np.interp(energy, [5.0, 20.0], [0.4, 0.1])
    assert yield_per_photon(energy, plain) == pytest.approx(
        yield_per_photon(energy, photoyield_from(TABLE))
    )
    assert yield_per_photon(energy, counted) == pytest.approx(
        share * yield_per_photon(energy, plain), rel=1e-13
    )


def changed(record: Mapping[str, Any], **what: Any) -> dict[str, Any]:
    merged = {**copy.deepcopy(dict(record)), **what}
    return {key: value for key, value in merged.items() if value is not ...}


@pytest.mark.parametrize(
    ("record", "key"),
    [
        (changed(TABLE, law="einstein"), ("photoyield", "law")),
        (changed(TABLE, exponent=2.0), ("photoyield", "exponent")),
        (changed(TABLE, above_last_point="zero"), ("photoyield", "above_last_point")),
        (changed(TABLE, above_last_point="x-ray absorption"), ("photoyield", "x_ray")),
        (
            changed(
                TABLE,
                above_last_point="x-ray absorption",
                x_ray={**X_RAY, "photon_energy_eV": [150.0, 200.0, 1000.0]},
            ),
            ("photoyield", "x_ray", "photon_energy_eV", 0),
        ),
        (
            changed(TABLE, x_ray={**X_RAY, "mass_absorption_m2_kg": [1.0, 2.0]}),
            ("photoyield", "x_ray", "mass_absorption_m2_kg"),
        ),
        (
            changed(TABLE, x_ray={**X_RAY, "mass_absorption_m2_kg": [1.0, -2.0, 1.0]}),
            ("photoyield", "x_ray", "mass_absorption_m2_kg", 1),
        ),
        (
            changed(TABLE, x_ray={**X_RAY, "photon_energy_eV": [50.0, 50.0, 60.0]}),
            ("photoyield", "x_ray", "photon_energy_eV", 1),
        ),
        (changed(TABLE, x_ray={**X_RAY, "Z": 79}), ("photoyield", "x_ray", "Z")),
        (changed(TABLE, x_ray=3.0), ("photoyield", "x_ray")),
        (changed(TABLE, counts="absorbed photons"), ("photoyield", "reflectance")),
        (changed(TABLE, counts="photons"), ("photoyield", "counts")),
        (changed(TABLE, largest_angle_growth=0.5), ("photoyield", "largest_angle_growth")),
        (changed(TABLE, threshold_eV=5.0), ("photoyield", "threshold_eV")),
        (changed(FOWLER, threshold_eV=...), ("photoyield", "threshold_eV")),
        (changed(FOWLER, threshold_eV=0.0), ("photoyield", "threshold_eV")),
        (changed(FOWLER, upper_photon_energy_eV=4.5), ("photoyield", "upper_photon_energy_eV")),
        (changed(FOWLER, temperature_K=-1.0), ("photoyield", "temperature_K")),
        (changed(FOWLER, temperature_K=True), ("photoyield", "temperature_K")),
        (
            changed(FOWLER, electrons_per_photon_at_1_eV=0.0),
            ("photoyield", "electrons_per_photon_at_1_eV"),
        ),
        (changed(FOWLER, exponent=2.0), ("photoyield", "exponent")),
        (changed(POWER, exponent=0.5), ("photoyield", "exponent")),
        (changed(POWER, exponent=2.6), ("photoyield", "exponent")),
        (changed(POWER, exponent=float("nan")), ("photoyield", "exponent")),
    ],
)
def test_unusable_records_are_refused_at_their_key(
    record: dict[str, Any], key: tuple[str | int, ...]
) -> None:
    with pytest.raises(MaterialError) as caught:
        photoyield_from(record)
    assert caught.value.key == key


def gold_with(state: Any) -> dict[str, Any]:
    import tomllib

    return {**tomllib.loads(library_text("gold")), "surface_state": state}


@pytest.mark.parametrize(
    ("state", "key"),
    [
        ({"dirty": {}}, ("surface_state", "dirty")),
        ({"aged": {"source": "s", "basis": "assumed"}}, ("surface_state", "aged")),
        (
            {"aged": {"barrier_shift_eV": -9.0, "source": "s", "basis": "assumed"}},
            ("surface_state", "aged", "barrier_shift_eV"),
        ),
        (
            {"aged": {"barrier_shift_eV": -0.5, "basis": "assumed"}},
            ("surface_state", "aged", "source"),
        ),
        ({"aged": 4}, ("surface_state", "aged")),
    ],
)
def test_unusable_states_are_refused_at_their_key(state: Any, key: tuple[str, ...]) -> None:
    with pytest.raises(MaterialError) as caught:
        read_material(gold_with(state))
    assert caught.value.key == key


def test_a_record_may_bring_its_own_aged_state() -> None:
    own = read_material(
        gold_with({"aged": {"barrier_shift_eV": -0.5, "source": "own film", "basis": "assumed"}})
    )
    aged = in_state(own, "aged").photoyield
    assert aged is not None
    assert aged.threshold_eV == pytest.approx(4.3)
    assert "own film" in aged.note
    assert aged.basis == "assumed"
    assert pickle.loads(pickle.dumps(own)).surface_states["aged"].barrier_shift_eV == -0.5


def test_states_of_gold() -> None:
    clean, exposed = load_material("gold"), load_material("gold, air-exposed")
    assert in_state(clean, "as recorded") is clean
    to_air, back = in_state(clean, "air-exposed").photoyield, in_state(exposed, "clean").photoyield
    assert to_air is not None
    assert back is not None
    energy = np.geomspace(4.0, 1000.0, 50)
    assert yield_per_photon(energy, to_air) == pytest.approx(
        yield_per_photon(energy, exposed.photoyield)  # type: ignore[arg-type]
    )
    assert yield_per_photon(energy, back) == pytest.approx(
        yield_per_photon(energy, clean.photoyield)  # type: ignore[arg-type]
    )
    assert in_state(clean, "air-exposed").values == clean.values


def test_states_that_are_unknown_or_not_recorded_are_refused() -> None:
    with pytest.raises(MaterialError, match="is unknown"):
        in_state(load_material("gold"), "rusty")
    with pytest.raises(MaterialError, match='not in the record of "PTFE"') as caught:
        in_state(load_material("PTFE"), "air-exposed")
    assert caught.value.allowed == "as recorded, aged"
    bare = load_material("bare collector")
    assert [in_state(bare, state) for state in STATES] == [bare] * 4


def test_aged_state_is_the_envelope_of_laboratory_curves() -> None:
    aged, energy = aged_photoyield(), np.geomspace(3.0, 100.0, 400)
    curves = [load_material(name).photoyield for name in AGED_FROM]
    largest = np.max([yield_per_photon(energy, c) for c in curves if c is not None], axis=0)
    ours = yield_per_photon(energy, aged)
    assert np.all(ours[largest == 0.0] == 0.0)
    # log-log between points meets each quadratic rise within 5 percent from here on
    lit = energy > 4.3
    assert ours[lit] == pytest.approx(largest[lit], rel=0.05)
    assert aged.basis == "assumed"
    assert aged.level == "largest of laboratory curves"


def test_barrier_shift_moves_the_threshold_and_fades() -> None:
    curve = load_material("gold").photoyield
    assert curve is not None
    lower = shift_barrier(curve, -0.6, source="adsorbed water")
    assert lower.threshold_eV == pytest.approx(curve.threshold_eV - 0.6)
    near, far = np.linspace(4.4, 8.0, 30), np.geomspace(10.2, 1000.0, 30)
    assert np.all(yield_per_photon(near, lower) > yield_per_photon(near, curve))
    assert yield_per_photon(far, lower) == pytest.approx(yield_per_photon(far, curve), rel=1e-12)
    again = shift_barrier(lower, 0.0, source="nothing")
    assert again.photon_energy_eV == pytest.approx(lower.photon_energy_eV)
    law = shift_barrier(photoyield_from(POWER), 0.5, source="oxide")
    assert float(yield_per_photon(13.5, law)) == pytest.approx(1e-3 * 4.0**2.5)
    with pytest.raises(ValueError, match="shift_eV"):
        shift_barrier(curve, -4.0, source="too much")


def test_normalisation_is_explicit_and_recorded() -> None:
    curve = load_material("gold").photoyield
    assert curve is not None
    photons, flux = [6.0, 10.2], [1e18, 4e15]
    mine = normalised_to_current(
        curve, photons, flux, saturation_current_A_m2=5e-5, source="own bench"
    )
    assert float(photo_current_density(photons, flux, mine)) == pytest.approx(5e-5, rel=1e-12)
    assert mine.level == "normalised to a measured current"
    assert "own bench" in mine.note
    assert curve.level in ("set from the published saturation current",)
    law = normalised_to_current(
        photoyield_from(POWER), photons, flux, saturation_current_A_m2=1e-6, source="own bench"
    )
    assert float(photo_current_density(photons, flux, law)) == pytest.approx(1e-6, rel=1e-12)
    with pytest.raises(ValueError, match="no current"):
        normalised_to_current(curve, [3.0], [1e18], saturation_current_A_m2=1e-5, source="dark")


def test_library_states_what_holds_above_its_curves() -> None:
    curve = load_material("gold").photoyield
    assert curve is not None
    assert curve.above_last_point == "x-ray absorption"
    assert curve.x_ray is not None
    assert "Henke" in curve.x_ray.source
    # the M edges of gold near 2.2 keV lift the yield
    assert float(yield_per_photon(2400.0, curve)) > 1.5 * float(yield_per_photon(2150.0, curve))
    assert curve.reflectance is not None
    assert max(curve.reflectance.values) < 1.0
    held = replace(curve, above_last_point="hold")
    assert float(yield_per_photon(1e4, held)) == float(yield_per_photon(100.0, held))


def test_unknown_element_is_refused() -> None:
    with pytest.raises(MaterialError, match="no work function"):
        element_work_function_eV("Xx")
