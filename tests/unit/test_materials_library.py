"""Records of the material library and the reader that checks them."""

from __future__ import annotations

import copy
import pickle
import re
import tomllib
from typing import Any

import numpy as np
import pytest

from materials import (
    PROPERTIES,
    MaterialError,
    library_text,
    load_material,
    material_names,
    read_material,
)
from materials.backscatter import isotropic_backscatter
from materials.photoyield import yield_per_photon
from materials.record import BASES, NAME_PATTERN

NAMES = (
    "bare collector",
    "oxidised aluminium",
    "gold",
    "gold, air-exposed",
    "silver",
    "copper",
    "stainless steel",
    "titanium",
    "graphite",
    "carbon-fibre composite",
    "ITO coating",
    "black polyimide film",
    "polyimide film",
    "FEP film, silvered",
    "PTFE",
    "cover glass",
    "cover glass, MgF2-coated",
    "cover glass, ITO-coated",
    "fused silica",
    "white paint, zinc oxide-silicone",
    "black paint, carbon-polyurethane",
    "epoxy-glass",
    "anodised aluminium",
    "alumina",
    "lunar regolith",
)
CONDUCTORS = {
    "bare collector",
    "oxidised aluminium",
    "gold",
    "gold, air-exposed",
    "silver",
    "copper",
    "stainless steel",
    "titanium",
    "graphite",
    "carbon-fibre composite",
    "ITO coating",
    "black polyimide film",
    "black paint, carbon-polyurethane",
    "cover glass, ITO-coated",
}
EMITTING = [name for name in NAMES if name != "bare collector"]


def gold() -> dict[str, Any]:
    return tomllib.loads(library_text("gold"))


def test_names_are_complete() -> None:
    assert set(material_names()) == set(NAMES)
    assert list(material_names()) == sorted(NAMES)


@pytest.mark.parametrize("name", NAMES)
def test_every_number_carries_source_basis_and_spread(name: str) -> None:
    # read from the text, so that a gap cannot hide behind the reader
    document = tomllib.loads(library_text(name))
    records = {key: entry for key, entry in document.items() if isinstance(entry, dict)}
    states = records.pop("surface_state", {})
    samples = [v for v in records.get("photoyield", {}).values() if isinstance(v, dict)]
    for record in (*states.values(), *samples):
        assert len(record["source"]) > 10, name
        assert record["basis"] in BASES, name
    for key, record in records.items():
        assert len(record["source"]) > 10, (name, key)
        assert record["basis"] in BASES, (name, key)
        if key != "photoyield":
            assert set(record["spread"]) == {"law", "low", "high"}, (name, key)
            assert record["spread"]["low"] <= record["value"] <= record["spread"]["high"]
            assert record["spread"]["low"] < record["spread"]["high"], (name, key)
    assert set(records) - {"photoyield"} <= set(PROPERTIES)


@pytest.mark.parametrize("name", NAMES)
def test_a_figure_said_to_be_from_memory_does_not_rank_as_measured(name: str) -> None:
    for key, record in load_material(name).values.items():
        if record.basis == "measured":
            assert "abstract" in record.source or "et al." in record.source, (name, key)
        if "no published number found" in record.source or "no number found" in record.source:
            assert record.basis == "assumed", (name, key)


@pytest.mark.parametrize("name", NAMES)
def test_kind(name: str) -> None:
    expected = "conductor" if name in CONDUCTORS else "dielectric"
    assert load_material(name).kind == expected


def test_bare_collector_emits_nothing() -> None:
    material = load_material("bare collector")
    assert not material.emits
    assert material.photoyield is None
    assert not material.values


@pytest.mark.parametrize("name", EMITTING)
def test_threshold_of_the_curve_is_that_of_the_record(name: str) -> None:
    material = load_material(name)
    key = "work_function_eV" if material.kind == "conductor" else "photoelectric_threshold_eV"
    spread = material.values[key].spread
    assert material.photoyield is not None
    assert spread.low <= material.photoyield.threshold_eV <= spread.high


@pytest.mark.parametrize("name", EMITTING)
def test_isotropic_backscatter_stays_below_one(name: str) -> None:
    material = load_material(name)
    eta = isotropic_backscatter(
        np.geomspace(1.0, 2e5, 200),
        high_energy=material.value("backscatter_high_energy"),
        low_energy_drop=material.get("backscatter_low_energy_drop", 0.0),
        drop_energy_eV=material.get("backscatter_drop_energy_eV", 4000.0),
        mean_atomic_number=material.value("mean_atomic_number"),
    )
    assert np.all((eta >= 0.0) & (eta < 1.0))


@pytest.mark.parametrize("name", EMITTING)
def test_calibrated_curves_say_so(name: str) -> None:
    curve = load_material(name).photoyield
    assert curve is not None
    if curve.level == "set from the published saturation current":
        assert "calibration, not validation" in curve.note
    if curve.level == "carried over by analogy":
        assert curve.basis == "assumed"
        assert "factor 1" in curve.source


@pytest.mark.parametrize(
    ("name", "origin", "pivot_eV"),
    [
        ("silver", "gold", 7.0),
        ("copper", "stainless steel", 7.0),
        ("titanium", "stainless steel", 7.0),
        ("cover glass", "fused silica", None),
        ("cover glass, MgF2-coated", "fused silica", 21.2),
        ("alumina", "fused silica", None),
        ("anodised aluminium", "fused silica", None),
        ("epoxy-glass", "polyimide film", None),
        ("white paint, zinc oxide-silicone", "polyimide film", None),
        ("black paint, carbon-polyurethane", "black polyimide film", None),
        ("cover glass, ITO-coated", "ITO coating", None),
        ("PTFE", "FEP film, silvered", None),
    ],
)
def test_curve_by_analogy_follows_its_stated_rule(
    name: str, origin: str, pivot_eV: float | None
) -> None:
    curve, base = load_material(name).photoyield, load_material(origin).photoyield
    assert curve is not None
    assert base is not None
    assert curve.electrons_per_photon.tolist() == base.electrons_per_photon.tolist()
    energy = base.photon_energy_eV
    if pivot_eV is not None:
        assert f"about {pivot_eV:g} eV" in curve.source
        factor = (pivot_eV - curve.threshold_eV) / (pivot_eV - base.threshold_eV)
        energy = np.where(energy < pivot_eV, pivot_eV - (pivot_eV - energy) * factor, energy)
    assert curve.photon_energy_eV == pytest.approx(energy, abs=1e-4)


def test_air_exposed_gold_emits_more_in_the_near_ultraviolet_only() -> None:
    exposed, clean = load_material("gold, air-exposed").photoyield, load_material("gold").photoyield
    assert exposed is not None
    assert clean is not None
    near = [4.5, 4.8, 5.5, 6.2]
    assert np.all(yield_per_photon(near, exposed) > 1.5 * yield_per_photon(near, clean))
    far = [7.0, 10.2, 40.0]
    assert yield_per_photon(far, exposed) == pytest.approx(yield_per_photon(far, clean))


def test_no_trade_names() -> None:
    trade = r"kapton|teflon|mylar|tefzel|aquadag|dag ?213|pyrex|macor|chemglaze|aeroglaze|z306|s13g"
    for name in NAMES:
        assert re.search(trade, library_text(name).lower()) is None, name


def test_resistivities_state_their_method() -> None:
    for name in NAMES:
        record = load_material(name).values.get("bulk_resistivity_ohm_m")
        if record is not None:
            assert record.measurement_method, name
            assert record.spread.law == "log_uniform", name


def test_material_is_read_only_and_shared() -> None:
    material = load_material("gold")
    assert load_material("gold") is material
    with pytest.raises(TypeError):
        material.values["density_kg_m3"] = None  # type: ignore[index]
    assert material.photoyield is not None
    with pytest.raises(ValueError, match="read-only"):
        material.photoyield.electrons_per_photon[1] = 1.0


def test_material_survives_pickling() -> None:
    material = pickle.loads(pickle.dumps(load_material("polyimide film")))
    original = load_material("polyimide film")
    assert dict(material.values) == dict(original.values)
    assert material.photoyield is not None
    assert original.photoyield is not None
    assert (
        material.photoyield.photon_energy_eV.tolist()
        == original.photoyield.photon_energy_eV.tolist()
    )
    assert not material.photoyield.photon_energy_eV.flags.writeable


def test_missing_value_names_material_and_key() -> None:
    with pytest.raises(MaterialError, match=r'activation_energy_eV .*"gold"'):
        load_material("gold").value("activation_energy_eV")
    assert load_material("gold").get("activation_energy_eV", 0.5) == 0.5


def test_unknown_name_offers_the_nearest() -> None:
    with pytest.raises(MaterialError) as caught:
        load_material("polyimid")
    assert caught.value.nearest == "polyimide film"
    assert caught.value.value == "polyimid"
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize("name", ["", "../gold", "gold.toml", "Gold", "gold air exposed", "/etc"])
def test_a_name_is_never_a_path(name: str) -> None:
    with pytest.raises(MaterialError):
        load_material(name)


def test_text_of_the_library_reads_back() -> None:
    for name in NAMES:
        assert read_material(tomllib.loads(library_text(name))).name == name
        assert NAME_PATTERN.fullmatch(name)


def set_path(document: dict[str, Any], path: tuple[str | int, ...], entry: object) -> None:
    table: Any = document
    for part in path[:-1]:
        table = table[part]
    if entry is ...:
        del table[path[-1]]
    else:
        table[path[-1]] = entry


@pytest.mark.parametrize(
    ("path", "entry", "reported", "problem"),
    [
        (("name",), ..., ("name",), "missing"),
        (("name",), "a\nb", ("name",), "usable name"),
        (("name",), "x" * 65, ("name",), "usable name"),
        (("kind",), "metal", ("kind",), "not allowed"),
        (("emits",), "yes", ("emits",), "truth value"),
        (("emits",), False, ("secondary_yield_peak",), "emits = false"),
        (("photoyield",), ..., ("photoyield",), "missing"),
        (("work_funktion_eV",), {}, ("work_funktion_eV",), "unknown key"),
        (("work_function_eV",), ..., ("work_function_eV",), "missing"),
        (("work_function_eV",), 5.1, ("work_function_eV",), "no table"),
        (("work_function_eV", "source"), " ", ("work_function_eV", "source"), "no text"),
        (("work_function_eV", "basis"), "guess", ("work_function_eV", "basis"), "not allowed"),
        (("work_function_eV", "spread"), ..., ("work_function_eV", "spread"), "missing"),
        (("work_function_eV", "value"), "5.1", ("work_function_eV", "value"), "no number"),
        (("work_function_eV", "value"), True, ("work_function_eV", "value"), "no number"),
        (("work_function_eV", "value"), float("nan"), ("work_function_eV", "value"), "finite"),
        (("work_function_eV", "value"), 10**400, ("work_function_eV", "value"), "finite"),
        (("work_function_eV", "value"), 0.5, ("work_function_eV", "value"), "out of range"),
        (("work_function_eV", "value"), 6.0, ("work_function_eV", "spread"), "does not hold"),
        (("work_function_eV", "spread", "low"), -9.0, ("work_function_eV", "spread"), "range"),
        (("secondary_yield_peak", "holds"), ..., ("secondary_yield_peak", "holds"), "missing"),
        (
            ("backscatter_drop_energy_eV",),
            ...,
            ("backscatter_drop_energy_eV",),
            "missing beside",
        ),
        (
            ("photoyield", "electrons_per_photon", 0),
            0.1,
            ("photoyield", "electrons_per_photon", 0),
            "is not 0",
        ),
        (
            ("photoyield", "photon_energy_eV", 3),
            2.0,
            ("photoyield", "photon_energy_eV", 3),
            "does not rise",
        ),
        (
            ("photoyield", "electrons_per_photon"),
            [0.0, 0.1],
            ("photoyield", "electrons_per_photon"),
            "number of points",
        ),
        (("photoyield", "photon_energy_eV"), "4", ("photoyield", "photon_energy_eV"), "no list"),
        (("photoyield", "level"), "guess", ("photoyield", "level"), "not allowed"),
        (("photoyield", "spread_factor"), 0.5, ("photoyield", "spread_factor"), "out of range"),
    ],
)
def test_bad_record_is_refused_with_its_key(
    path: tuple[str | int, ...], entry: object, reported: tuple[str | int, ...], problem: str
) -> None:
    document = copy.deepcopy(gold())
    set_path(document, path, entry)
    with pytest.raises(MaterialError, match=problem) as caught:
        read_material(document)
    assert caught.value.key == reported
    assert "\n" not in str(caught.value)


def test_unknown_key_offers_the_nearest() -> None:
    document = gold() | {"work_funktion_eV": {}}
    with pytest.raises(MaterialError) as caught:
        read_material(document)
    assert caught.value.nearest == "work_function_eV"


def test_dielectric_needs_permittivity_and_no_work_function() -> None:
    film = tomllib.loads(library_text("polyimide film"))
    with pytest.raises(MaterialError, match="relative_permittivity is missing"):
        read_material({key: entry for key, entry in film.items() if key != "relative_permittivity"})
    with pytest.raises(MaterialError, match="does not belong to a dielectric"):
        read_material(film | {"work_function_eV": gold()["work_function_eV"]})


def test_negative_backscatter_is_refused() -> None:
    document = gold()
    document["backscatter_low_energy_drop"] |= {
        "value": 0.55,
        "spread": {"law": "uniform", "low": 0.2, "high": 0.6},
    }
    with pytest.raises(MaterialError, match="negative"):
        read_material(document)


def test_log_uniform_spread_needs_a_positive_end() -> None:
    document = gold()
    document["backscatter_low_energy_drop"]["spread"] = {
        "law": "log_uniform",
        "low": 0.0,
        "high": 0.4,
    }
    with pytest.raises(MaterialError, match="logarithm"):
        read_material(document)


def test_error_survives_pickling() -> None:
    error = MaterialError(("kind",), "metal", "is wrong", allowed="conductor", nearest="conductor")
    assert str(pickle.loads(pickle.dumps(error))) == str(error)


def test_spread_factor_by_photon_energy() -> None:
    curve = load_material("gold").photoyield
    assert curve is not None
    assert curve.spread_factor_at([5.0, 20.0, 90.0]).tolist() == [10.0, 2.0, 3.0]


def test_every_property_has_unit_range_and_meaning() -> None:
    for key, (unit, low, high, meaning) in PROPERTIES.items():
        assert low < high
        assert meaning
        if unit != "1":
            assert key.endswith("_" + unit.replace(" ", "_").replace("-", "").replace("m1", "m"))
