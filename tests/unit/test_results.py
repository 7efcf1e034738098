"""Result files: structure, conventions, a second reader, repeatability, peaks, the folder."""

from __future__ import annotations

import csv
import hashlib
import json
import os
from pathlib import Path

import netCDF4
import numpy as np
import pytest
import xarray as xr
from numpy.typing import NDArray

from charging.case import load_case_text
from charging.dataset import ALL_MECHANISMS, VARIABLES, mode_dataset, read_result
from charging.errors import InputError
from charging.orbit_run import CaseRun, run_case
from charging.result_folder import check_target, result_folder
from charging.results import write_results
from charging.review.check import load_case_or_result
from charging.summary import case_summaries

Array = NDArray[np.float64]

STRUCTURE = {
    "potential": ("surface", "time"),
    "structure_potential": ("time",),
    "differential_potential": ("surface", "time"),
    "current_density": ("mechanism", "surface", "time"),
    "charge_residual": ("node", "time"),
    "illumination": ("time",),
    "illuminated_fraction": ("surface", "time"),
    "incidence_cosine": ("surface", "time"),
    "position": ("axis", "time"),
    "sun_direction": ("axis", "time"),
    "region": ("time",),
}
UNITS = {
    "potential": "V",
    "structure_potential": "V",
    "differential_potential": "V",
    "current_density": "A m-2",
    "charge_residual": "C",
    "position": "m",
}
MECHANISMS = (
    "electron_collection",
    "ion_collection",
    "secondary_electron",
    "ion_induced_secondary",
    "backscatter",
    "photoemission",
    "conduction",
    "bias_or_emitter",
)
LABELS = {
    "surface_name": "surface",
    "mechanism_name": "mechanism",
    "node_name": "node",
    "population_name": "population",
}

SMALL = """\
title = "Two surfaces"
[orbit]
kind = "fixed"
illumination = 1.0
sun_direction = [0.0, 0.0, 1.0]
duration_h = {hours}
[time]
output_step_s = {step}
[plasma]
use = "ECSS geostationary worst case"
[[plasma.event]]
onset_h = 0.1
rise_min = 1.0
hold_min = 2.0
decay_min = 0.5
use = "NASA geostationary 90 percent"
[body]
radius_m = 1.0
[[surface]]
name = "body"
material = "gold"
area_m2 = 4.0
normal = [0.0, 0.0, -1.0]
[[surface]]
name = "film"
material = "polyimide film"
area_m2 = 1.0
thickness_m = 5e-5
temperature_K = 300.0
normal = [0.0, 0.0, 1.0]
[[mode]]
name = "dark"
alternative = true
illumination = 0.0
"""


def small(step: float = 20.0, hours: float = 0.25) -> CaseRun:
    return run_case(load_case_text(SMALL.format(step=step, hours=hours)))


# --- structure of result.nc ---------------------------------------------------------------


@pytest.mark.parametrize("name", STRUCTURE)
def test_variables_have_their_dimensions(demo_folder: Path, name: str) -> None:
    with netCDF4.Dataset(demo_folder / "result.nc") as file:
        assert file[name].dimensions == STRUCTURE[name]
        assert file[name].long_name
        if name in UNITS:
            assert file[name].units == UNITS[name]


def test_dimensions_and_labels(demo_folder: Path, demo_day: CaseRun) -> None:
    with xr.open_dataset(demo_folder / "result.nc", engine="netcdf4") as dataset:
        assert set(dataset.sizes) == {"surface", "time", "mechanism", "node", "population", "axis"}
        for label, dimension in LABELS.items():
            assert dataset[label].dims == (dimension,)
            assert label in dataset.coords
        assert tuple(dataset["mechanism_name"].values) == MECHANISMS == ALL_MECHANISMS
        assert tuple(dataset["surface_name"].values) == demo_day.loaded.case.names
        assert dataset["node_name"].values[0] == "structure"
        chosen = dataset.set_xindex("surface_name").sel(surface_name="array cover glass")
        assert np.array_equal(chosen["potential"], dataset["potential"].values[0])
        assert "member" not in dataset.sizes
    with netCDF4.Dataset(demo_folder / "result.nc") as file:
        time = file["time"]
        assert time.units.startswith("seconds since 2031-03-20")
        assert time.units_metadata == "leap_seconds: none"
        assert "_FillValue" not in time.ncattrs()
        assert file.Conventions == "CF-1.11"


def test_every_variable_of_the_table_is_written_and_no_other(demo_folder: Path) -> None:
    with xr.open_dataset(demo_folder / "result.nc", engine="netcdf4") as dataset:
        assert set(dataset.data_vars) == set(VARIABLES)
        for name, variable in VARIABLES.items():
            assert dataset[name].dims == variable.dims
            assert np.isfinite(dataset[name].values.astype(np.float64)).all(), name


def test_values_hang_together(demo_folder: Path, demo_day: CaseRun) -> None:
    with xr.open_dataset(demo_folder / "result.nc", engine="netcdf4") as dataset:
        dataset.load()
    difference = dataset["potential"] - dataset["structure_potential"]
    assert dataset["differential_potential"].values == pytest.approx(
        difference.transpose("surface", "time").values, abs=1e-9
    )
    length = np.sqrt((dataset["sun_direction"].values ** 2).sum(axis=0))
    assert length == pytest.approx(np.ones_like(length))
    radius = np.sqrt((dataset["position"].values ** 2).sum(axis=0))
    assert radius == pytest.approx(np.full_like(radius, 4.2164e7), rel=1e-3)
    assert (dataset["illuminated_fraction"].values == 1.0).all()
    flags = dataset["region"]
    assert flags.attrs["flag_meanings"].split() == [
        "penumbra",
        "umbra",
        "plasma_event",
        "mode_interval",
    ]
    assert flags.attrs["flag_masks"].tolist() == [1, 2, 4, 8]
    light = dataset["illumination"].values
    assert np.array_equal(flags.values & 2 > 0, light == 0.0)
    assert np.array_equal(flags.values & 1 > 0, (light > 0.0) & (light < 1.0))
    # thickness times field is the differential of a film on structure
    i = demo_day.loaded.case.names.index("north radiator")
    thickness = demo_day.loaded.case.surface[i].thickness_m
    assert thickness is not None
    across = dataset["electric_field"].values[i] * thickness
    assert across == pytest.approx(dataset["differential_potential"].values[i], abs=1e-6)


def test_signs_of_the_currents(demo_folder: Path) -> None:
    with xr.open_dataset(demo_folder / "result.nc", engine="netcdf4") as dataset:
        by = {
            str(name): dataset["current_density"].values[i]
            for i, name in enumerate(dataset["mechanism_name"].values)
        }
    assert by["electron_collection"].max() < 0.0
    for name in ("ion_collection", "secondary_electron", "ion_induced_secondary", "backscatter"):
        # a spline through values near zero may swing below it by nothing that matters
        assert by[name].min() > -1e-30
    assert by["photoemission"].min() >= 0.0
    assert np.abs(by["bias_or_emitter"]).max() == 0.0


def test_attributes_let_the_run_be_repeated(demo_folder: Path, demo_day: CaseRun) -> None:
    attrs = read_result(demo_folder).attrs
    text = demo_day.loaded.path.read_text(encoding="utf-8")
    assert attrs["case_text"] == text
    assert attrs["case_sha256"] == hashlib.sha256(text.encode()).hexdigest()
    for kind in ("material", "plasma"):
        texts = json.loads(attrs[f"{kind}_texts"])
        sums = json.loads(attrs[f"{kind}_sha256"])
        assert {k: hashlib.sha256(v.encode()).hexdigest() for k, v in texts.items()} == sums
    assert set(json.loads(attrs["material_texts"])) == {
        s.material for s in demo_day.loaded.case.surface
    }
    assert {"halflit_version", "seeds", "warnings", "march_relative_tolerance"} <= set(attrs)
    again = load_case_or_result(demo_folder)
    assert again.case == demo_day.loaded.case


def test_second_reader_agrees(demo_folder: Path) -> None:
    with (
        xr.open_dataset(demo_folder / "result.nc", engine="netcdf4") as one,
        xr.open_dataset(demo_folder / "result.nc", engine="h5netcdf") as other,
    ):
        xr.testing.assert_identical(one.load(), other.load())


@pytest.mark.parametrize("name", ["demo", "static"])
def test_cf_checker_finds_nothing(
    demo_folder: Path, static_folder: Path, tmp_path: Path, name: str,
    monkeypatch: pytest.MonkeyPatch,
) -> None:  # fmt: skip
    monkeypatch.setenv("HOME", str(tmp_path))  # the checker may keep a cache there
    score = checker_report((demo_folder if name == "demo" else static_folder) / "result.nc")
    counts = {key: score[f"{key}_count"] for key in ("high", "medium", "low")}
    assert counts == {"high": 0, "medium": 0, "low": 0}, score["all_priorities"]


def checker_report(path: Path) -> dict[str, object]:
    import warnings

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # the checker's own dependencies
        from compliance_checker.runner import CheckSuite

        suite = CheckSuite()
        suite.load_all_available_checkers()
        dataset = suite.load_dataset(str(path))
        results = suite.run_all(dataset, ["cf:1.11"], [], None)
        groups, _ = results["cf:1.11"]
        out = suite.dict_output("cf:1.11", groups, str(path), 1)
        dataset.close()
    return dict(out) if isinstance(out, dict) else out[0]


# --- summary.json and surfaces.csv --------------------------------------------------------

SURFACE_KEYS = {
    "surface",
    "material",
    "lowest_V",
    "highest_V",
    "worst_normal_V",
    "worst_normal_time",
    "worst_inverted_V",
    "worst_inverted_time",
    "limits",
}
LIMIT_KEYS = {
    "surface",
    "against",
    "kind",
    "requirement_id",
    "mode",
    "plasma",
    "age",
    "value",
    "allowed",
    "unit",
    "margin",
    "margin_dB",
    "time",
    "clause",
    "verdict",
    "reason",
}


def test_summary_has_the_keys_of_the_contract(demo_folder: Path, demo_day: CaseRun) -> None:
    found = json.loads((demo_folder / "summary.json").read_text(encoding="utf-8"))
    assert {
        "title",
        "surfaces",
        "structure",
        "eclipses",
        "charge_audit_relative",
        "warnings",
    } <= set(found)
    assert found["title"] == demo_day.loaded.case.title
    assert [s["surface"] for s in found["surfaces"]] == list(demo_day.loaded.case.names)
    for row in found["surfaces"]:
        assert set(row) >= SURFACE_KEYS
        assert row["lowest_V"] <= row["highest_V"]
        assert row["worst_normal_V"] <= 0.0 <= row["worst_inverted_V"]
        for side in ("normal", "inverted"):
            time = row[f"worst_{side}_time"]
            assert time.endswith("Z") if row[f"worst_{side}_V"] else time is None
        for limit in row["limits"]:
            assert set(limit) >= LIMIT_KEYS
            assert limit["verdict"] in {"within", "exceeded", "not assessable"}
    assert set(found["structure"]) >= {"lowest_V", "highest_V"}
    (eclipse,) = found["eclipses"]
    assert set(eclipse) == {
        "body",
        "penumbra_start",
        "umbra_start",
        "umbra_end",
        "penumbra_end",
        "umbra_s",
    }
    assert found["charge_audit_relative"] < 1e-4


def test_alternative_modes_have_a_file_each(static_folder: Path, static_case: CaseRun) -> None:
    found = json.loads((static_folder / "summary.json").read_text(encoding="utf-8"))
    assert [(m["mode"], m["result"]) for m in found["modes"]] == [
        ("base", "result.nc"),
        ("eclipse", "result_01.nc"),
    ]
    for mode in found["modes"]:
        assert mode["results_by_law"]["sanders_inouye_1979"] == mode["result"]
        audits = []
        for law, name in mode["results_by_law"].items():
            attrs = read_result(static_folder / name).attrs
            assert (attrs["mode"], attrs["secondary_law"]) == (mode["mode"], law)
            audits.append(attrs["charge_audit_relative"])
        assert max(audits) == pytest.approx(mode["charge_audit_relative"], abs=0.0)
    with (static_folder / "surfaces.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    assert len(rows) == 2 * len(static_case.loaded.case.surface)
    first = found["modes"][1]["surfaces"][0]
    row = next(r for r in rows if r["mode"] == "eclipse" and r["surface"] == first["surface"])
    for key in ("lowest_V", "highest_V", "worst_normal_V", "worst_inverted_V"):
        assert float(row[key]) == first[key]
    assert row["verdict"] == first["verdict"]


def test_same_case_gives_the_same_bytes_and_arrays(tmp_path: Path) -> None:
    folders = [tmp_path / "one", tmp_path / "two"]
    for folder in folders:
        write_results(small(), folder, plots=False)
    for name in ("summary.json", "surfaces.csv"):
        assert (folders[0] / name).read_bytes() == (folders[1] / name).read_bytes()
    for name in ("result.nc", "result_01.nc"):
        xr.testing.assert_identical(read_result(folders[0] / name), read_result(folders[1] / name))


def test_peaks_do_not_depend_on_the_output_grid() -> None:
    fine, coarse = small(5.0), small(450.0)
    for one, other in zip(case_summaries(fine), case_summaries(coarse), strict=True):
        assert one.surfaces == other.surfaces
        assert one.structure_lowest == other.structure_lowest
    # and they are really beyond what the coarse grid sees
    mode, peaks = coarse.modes[1], case_summaries(coarse)[1].surfaces
    grid = np.arange(0.0, coarse.loaded.case.duration_s, 450.0)
    seen = mode.net.potentials(mode.trajectories[0](grid))[:, mode.net.surface_node].T
    assert max(seen[i].min() - p.lowest.value for i, p in enumerate(peaks)) > 10.0
    # the file holds the moments of the extremes, so its own extremes are the peaks
    held = mode_dataset(coarse, mode)["potential"].values
    for i, p in enumerate(peaks):
        if p.lowest.law == mode.laws[0]:
            assert held[i].min() == pytest.approx(p.lowest.value, abs=1e-9)


def test_peaks_bound_what_the_output_grid_shows(demo_day: CaseRun) -> None:
    mode = demo_day.modes[0]
    summary = case_summaries(demo_day)[0]
    for member in range(len(mode.laws)):
        dataset = mode_dataset(demo_day, mode, member)
        potential, difference = (
            dataset["potential"].values,
            dataset["differential_potential"].values,
        )
        for i, peaks in enumerate(summary.surfaces):
            slack = 0.5 + 1e-3 * np.abs(potential[i]).max()  # peaks are sampled in each step
            assert peaks.lowest.value <= potential[i].min() + slack
            assert peaks.highest.value >= potential[i].max() - slack
            assert peaks.normal.value <= difference[i].min() + slack
            assert peaks.inverted.value >= difference[i].max() - slack


def test_charge_residual_in_the_file_is_small(demo_folder: Path) -> None:
    dataset = read_result(demo_folder)
    assert dataset.attrs["charge_audit_relative"] < 1e-4
    # against the charge that moves 3 m2 of 25 um film by 1 kV, 4e-3 C
    assert np.abs(dataset["charge_residual"].values).max() < 4e-5


# --- files that are no results ------------------------------------------------------------


@pytest.mark.parametrize("what", ["missing", "folder", "bytes", "other"])
def test_reading_what_is_no_result(tmp_path: Path, what: str) -> None:
    path = tmp_path / "x.nc"
    if what == "folder":
        path.mkdir()
    elif what == "bytes":
        path.write_bytes(os.urandom(2000))
    elif what == "other":
        xr.Dataset({"a": ("x", [1.0])}).to_netcdf(path, engine="netcdf4")
    with pytest.raises(InputError) as caught:
        read_result(path)
    assert str(path) in str(caught.value)


# --- the result folder --------------------------------------------------------------------


def fill(folder: Path, text: str) -> None:
    summary = json.dumps({"halflit_version": text})
    (folder / "summary.json").write_text(summary, encoding="utf-8")


def filled(folder: Path) -> str:
    return str(json.loads((folder / "summary.json").read_text(encoding="utf-8"))["halflit_version"])


def hidden(parent: Path) -> list[str]:
    return sorted(path.name for path in parent.iterdir() if path.name.startswith("."))


def test_old_result_is_replaced_as_a_whole(tmp_path: Path) -> None:
    target = tmp_path / "day"
    with result_folder(target) as folder:
        fill(folder, "one")
        (folder / "old.png").write_bytes(b"x")
        assert not target.exists()
    with result_folder(target) as folder:
        fill(folder, "two")
        assert filled(target) == "one"
    assert filled(target) == "two"
    assert not (target / "old.png").exists()
    assert hidden(tmp_path) == []


def test_foreign_folder_is_refused_untouched(tmp_path: Path) -> None:
    target = tmp_path / "thesis"
    target.mkdir()
    (target / "chapter.txt").write_text("mine", encoding="utf-8")
    with pytest.raises(InputError, match=r"holds chapter.txt"), result_folder(target):
        pytest.fail("entered")
    assert (target / "chapter.txt").read_text(encoding="utf-8") == "mine"
    assert hidden(tmp_path) == []


def test_result_with_a_note_added_is_not_thrown_away(tmp_path: Path) -> None:
    target = tmp_path / "day"
    with result_folder(target) as folder:
        fill(folder, "one")
    (target / "notes.txt").write_text("mine", encoding="utf-8")
    for use in (check_target, lambda t: result_folder(t).__enter__()):
        with pytest.raises(InputError, match=r"holds notes.txt"):
            use(target)
    assert filled(target) == "one"


def test_summary_of_another_program_is_not_ours(tmp_path: Path) -> None:
    target = tmp_path / "day"
    target.mkdir()
    (target / "summary.json").write_text("{}", encoding="utf-8")
    with pytest.raises(InputError, match="of this program"):
        check_target(target)


def test_link_stays_a_link_to_the_new_result(tmp_path: Path) -> None:
    target, link = tmp_path / "day", tmp_path / "link"
    with result_folder(target) as folder:
        fill(folder, "one")
    link.symlink_to(target)
    with result_folder(link) as folder:
        fill(folder, "two")
    assert link.is_symlink()
    assert filled(target) == "two"
    assert hidden(tmp_path) == []


def test_file_in_the_way_is_refused(tmp_path: Path) -> None:
    target = tmp_path / "day"
    target.write_text("a file", encoding="utf-8")
    with pytest.raises(InputError, match="is a file"), result_folder(target):
        pytest.fail("entered")
    assert target.read_text(encoding="utf-8") == "a file"


def test_empty_folder_may_be_filled(tmp_path: Path) -> None:
    target = tmp_path / "day"
    target.mkdir()
    with result_folder(target) as folder:
        fill(folder, "one")
    assert (target / "summary.json").is_file()


def test_leftovers_of_an_interrupted_run_are_cleared(tmp_path: Path) -> None:
    target = tmp_path / "day"
    partial = tmp_path / ".day.partial"
    partial.mkdir()
    (partial / "result.nc").write_bytes(b"half")
    with result_folder(target) as folder:
        assert not (folder / "result.nc").exists()
        fill(folder, "one")
    assert hidden(tmp_path) == []


def test_result_caught_between_the_renames_is_put_back(tmp_path: Path) -> None:
    target = tmp_path / "day"
    previous = tmp_path / ".day.previous"
    previous.mkdir()
    fill(previous, "kept")

    def fails() -> None:
        with result_folder(target):
            raise RuntimeError("no solution")

    with pytest.raises(RuntimeError):
        fails()
    assert filled(target) == "kept"
    assert hidden(tmp_path) == []


@pytest.mark.parametrize("before", [False, True])
def test_nothing_half_written_on_an_exception(tmp_path: Path, before: bool) -> None:
    target = tmp_path / "day"
    if before:
        with result_folder(target) as folder:
            fill(folder, "one")

    def fails() -> None:
        with result_folder(target) as folder:
            fill(folder, "two")
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        fails()
    assert hidden(tmp_path) == []
    assert target.exists() is before
    if before:
        assert filled(target) == "one"


def test_writing_that_fails_leaves_the_old_result(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    target = tmp_path / "day"
    run = small(hours=0.11)
    write_results(run, target, plots=False)
    before = (target / "summary.json").read_bytes()

    def broken(*_: object) -> str:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("charging.results.surfaces_csv", broken)
    with pytest.raises(InputError, match="No space left"):
        write_results(run, target, plots=False)
    assert (target / "summary.json").read_bytes() == before
    assert hidden(tmp_path) == []


def test_place_that_cannot_hold_a_folder(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("x", encoding="utf-8")
    with (
        pytest.raises(InputError, match="cannot be written"),
        result_folder(tmp_path / "file" / "day"),
    ):
        pytest.fail("entered")
