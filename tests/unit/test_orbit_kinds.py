"""Orbits of a case from every kind of source, there and back through files."""

from __future__ import annotations

import hashlib
import json
import warnings
from pathlib import Path

import netCDF4
import numpy as np
import pytest
import xarray as xr
from numpy.typing import NDArray

from charging.case import LoadedCase, load_case, load_case_text
from charging.dataset import mode_dataset
from charging.errors import InputError
from charging.flight import contacts, eclipses_of, moments, path, trajectory_of
from charging.orbit_run import CaseRun, run_case
from charging.orbit_view import orbit_dataset, orbit_report, write_orbit
from charging.review.check import load_case_or_result
from charging.surroundings import output_times, surroundings
from environments.eclipse import find_eclipses
from environments.oem import write_oem
from environments.orbit import KeplerOrbit, position_velocity
from environments.sun import earth_shadow_radii_m, sun_path
from environments.tle import tle_trajectory

Array = NDArray[np.float64]

GEO = """\
kind = "kepler"
epoch = 2031-03-20T09:00:00Z
semi_major_axis_km = 42164.17
eccentricity = 0.0002
inclination_deg = 0.05
raan_deg = 0.0
argument_of_perigee_deg = 0.0
mean_anomaly_deg = 135.0
"""
LEO = """\
kind = "kepler"
epoch = 2031-03-20T00:00:00Z
semi_major_axis_km = 6878.137
eccentricity = 0.001
inclination_deg = 51.6
raan_deg = 10.0
argument_of_perigee_deg = 0.0
mean_anomaly_deg = 0.0
"""
ISS = (
    "1 25544U 98067A   08264.51782528 -.00002182  00000-0 -11606-4 0  2927",
    "2 25544  51.6416 247.4627 0006703 130.5360 325.0288 15.72125391563537",
)
SPACECRAFT = """\
[plasma]
use = "quiet geostationary"
accept_assumed = "a test"
{event}
[body]
radius_m = 1.0
[[surface]]
name = "front"
material = "polyimide film"
area_m2 = 2.0
thickness_m = 25e-6
normal = [0.0, 0.0, -1.0]
temperature_K = 280.0
[[surface]]
name = "ring"
material = "oxidised aluminium"
area_m2 = 1.0
normal = [1.0, 0.0, 0.0]
"""
EVENT = """\
[[plasma.event]]
onset_h = 2.0
rise_min = 5.0
hold_min = 30.0
decay_min = 20.0
use = "substorm, 3 keV class"
"""


def case_text(orbit: str, time: str = "duration_h = 5.0\noutput_step_s = 60.0", event: str = EVENT,
              more: str = "") -> str:  # fmt: skip
    return (
        f'title = "Orbit"\n[orbit]\n{orbit}[time]\n{time}\n'
        '[emission]\nsecondary_law = "sanders_inouye_1979"\n'
        + SPACECRAFT.format(event=event)
        + more
    )


def written(folder: Path, text: str, name: str = "case.toml") -> LoadedCase:
    (folder / name).write_text(text, encoding="utf-8")
    return load_case(folder / name)


def potentials(run: CaseRun, times: Array) -> Array:
    (mode,) = run.modes
    return np.asarray(mode.net.potentials(mode.trajectories[0](times)))


def close(one: CaseRun, two: CaseRun) -> None:
    """Within 0.1 V or 0.1 % at every output time of the first."""
    times = one.modes[0].times_s
    a, b = potentials(one, times), potentials(two, times)
    assert (np.abs(a - b) <= np.maximum(0.1, 1e-3 * np.abs(a))).all(), np.abs(a - b).max()


def refused(folder: Path, text: str) -> InputError:
    with pytest.raises(InputError) as caught:
        written(folder, text)
    return caught.value


# --- there and back -----------------------------------------------------------------------


@pytest.mark.parametrize("orbit", [GEO, LEO], ids=["GEO", "LEO"])
def test_the_written_orbit_runs_to_the_same_potentials(tmp_path: Path, orbit: str) -> None:
    kepler = written(tmp_path, case_text(orbit))
    write_orbit(kepler, tmp_path / "orbit.nc")
    table = 'kind = "table"\nfile = "orbit.nc"\n'
    loaded = written(tmp_path, case_text(table, "output_step_s = 60.0"), "table.toml")
    assert loaded.case.epoch == kepler.case.epoch
    assert loaded.case.duration_s == pytest.approx(5.0 * 3600.0, abs=1e-6)
    close(run_case(kepler), run_case(loaded))


def test_an_oem_runs_to_the_same_potentials_and_eclipses(tmp_path: Path) -> None:
    kepler = written(tmp_path, case_text(LEO))
    oem(tmp_path / "leo.oem", kepler)
    loaded = written(tmp_path, case_text('kind = "oem"\nfile = "leo.oem"\n'), "oem.toml")
    one, two = eclipses_of(kepler.case), eclipses_of(loaded.case, loaded.files)
    assert len(one) == len(two) >= 3
    for a, b in zip(one, two, strict=True):
        assert contacts(a) == pytest.approx(contacts(b), abs=1e-3)
    close(run_case(kepler), run_case(loaded))


def oem(file: Path, loaded: LoadedCase, end_s: float = 18000.0) -> None:
    trajectory = trajectory_of(loaded.case)
    assert trajectory is not None
    seconds = np.arange(0.0, end_s + 1.0, 60.0)
    write_oem(
        file, trajectory.epoch, seconds, *trajectory.position_velocity(seconds),
        object_name="SAMPLE-1", object_id="2031-000A",
        creation_date=np.datetime64("2031-01-01T00:00:00"),
    )  # fmt: skip


def test_elements_give_the_positions_of_their_model(tmp_path: Path) -> None:
    (tmp_path / "iss.tle").write_text("\n".join(ISS) + "\n", encoding="ascii")
    start = "start = 2008-09-20T13:00:00Z\n"
    loaded = written(
        tmp_path, case_text('kind = "tle"\nfile = "iss.tle"\n' + start, "duration_h = 2.0", "")
    )
    model = tle_trajectory(*ISS)
    epoch = np.datetime64("2008-09-20T13:00:00", "ns")
    shift = float((epoch - model.epoch) / np.timedelta64(1, "ns")) * 1e-9
    times = np.linspace(0.0, 7200.0, 37)
    shot = path(loaded.case, None, loaded.files).snapshot(times)
    assert np.abs(shot.position_m - model.position_velocity(times + shift)[0]).max() < 1e-3
    assert orbit_report(loaded).period_s == pytest.approx(86400.0 / 15.72125391, rel=2e-3)
    (mode,) = run_case(loaded).modes
    assert len(mode.around.eclipses) >= 1


def test_csv_gives_start_and_length_of_the_run(tmp_path: Path) -> None:
    kepler = written(tmp_path, case_text(GEO))
    trajectory = trajectory_of(kepler.case)
    assert trajectory is not None
    times = np.arange(0.0, 7201.0, 300.0)
    place, speed = trajectory.position_velocity(times)
    rows = [
        f"{stamp}Z," + ",".join(f"{x:.9f}" for x in (*p, *v))
        for stamp, p, v in zip(
            moments(kepler.case, times).astype("datetime64[s]"), place.T / 1e3, speed.T / 1e3,
            strict=True,
        )
    ]  # fmt: skip
    notes = "# frame = GCRF\n# center = earth\n# time_scale = UTC\n"
    head = "time,x_km,y_km,z_km,vx_km_s,vy_km_s,vz_km_s\n"
    (tmp_path / "o.csv").write_text(notes + head + "\n".join(rows) + "\n", encoding="ascii")
    loaded = written(tmp_path, case_text('kind = "table"\nfile = "o.csv"\n', "", event=""))
    assert loaded.case.epoch == kepler.case.epoch
    assert loaded.case.duration_s == pytest.approx(7200.0, abs=1e-6)
    assert loaded.files.texts["o.csv"] == (tmp_path / "o.csv").read_text()
    middle = np.linspace(0.0, 7200.0, 100)
    assert np.abs(
        path(loaded.case, None, loaded.files).snapshot(middle).position_m
        - trajectory.position_velocity(middle)[0]
    ).max() < 1.0  # fmt: skip


# --- orbit.nc -----------------------------------------------------------------------------


def test_orbit_file_passes_the_cf_checker(tmp_path: Path) -> None:
    write_orbit(written(tmp_path, case_text(GEO)), tmp_path / "orbit.nc")
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # the checker's own dependencies
        from compliance_checker.runner import CheckSuite

        suite = CheckSuite()
        suite.load_all_available_checkers()
        dataset = suite.load_dataset(str(tmp_path / "orbit.nc"))
        groups, _ = suite.run_all(dataset, ["cf:1.11"], [], None)["cf:1.11"]
        dataset.close()
    assert len(groups) > 20
    short = [group.name for group in groups if group.value[0] < group.value[1]]
    assert short == []


def test_orbit_dataset_holds_geometry_and_magnetic_place(tmp_path: Path) -> None:
    loaded = written(tmp_path, case_text(GEO))
    dataset = orbit_dataset(loaded)
    assert dataset.sizes == {"time": 301, "axis": 3}
    assert float(dataset.illumination.min()) == 0.0
    assert dataset["axis_name"].values.tolist() == ["x", "y", "z"]
    # geostationary: L 6.6 to 7 about the tilted dipole, local time near the hour of the Sun
    assert float(dataset.l_shell.min()) > 6.55
    assert float(dataset.l_shell.max()) < 7.1
    toward = np.arctan2(dataset.sun_direction[1], dataset.sun_direction[0])
    place = np.arctan2(dataset.position[1], dataset.position[0])
    hour = (12.0 + np.degrees(place - toward) / 15.0) % 24.0
    away = (dataset.magnetic_local_time - hour + 12.0) % 24.0 - 12.0
    assert float(np.abs(away).max()) < 1.0
    assert json.loads(dataset.attrs["eclipses"])[0]["body"] == "earth"


def test_years_beyond_the_dipole_leave_it_out(tmp_path: Path) -> None:
    loaded = written(tmp_path, case_text(GEO.replace("2031", "2045")))
    assert "l_shell" not in orbit_dataset(loaded)


def test_an_orbit_may_be_longer_than_a_run(tmp_path: Path) -> None:
    time = "duration_h = 17568.0\noutput_step_s = 7200.0"
    text = case_text(GEO, time, event="")
    (tmp_path / "long.toml").write_text(text, encoding="utf-8")
    with pytest.raises(InputError, match="at most 8784 for a run"):
        load_case(tmp_path / "long.toml")
    loaded = load_case(tmp_path / "long.toml", orbit_only=True)
    write_orbit(loaded, tmp_path / "long.nc")
    with netCDF4.Dataset(tmp_path / "long.nc") as data:
        assert data["time"].size == 8785
    # two years: four seasons of 44 to 46 days
    with_umbra = [e for e in orbit_report(loaded).eclipses if e.umbra_s > 0.0]
    assert 4 * 43 <= len(with_umbra) <= 4 * 47


def test_windows_do_not_cut_or_lose_eclipses() -> None:
    case = load_case_text(case_text(GEO, "duration_h = 1464.0\noutput_step_s = 600.0")).case
    orbit = KeplerOrbit(np.datetime64("2031-03-20T09:00:00"), 42164.17, 2e-4, 0.05, 0.0, 0.0, 135.0)
    equatorial, polar = earth_shadow_radii_m()
    whole = find_eclipses(
        lambda t: position_velocity(orbit, t)[0], sun_path(orbit.epoch), 0.0, 1464.0 * 3600.0,
        body_radius_m=equatorial, polar_radius_m=polar,
    )  # fmt: skip
    parts = eclipses_of(case)
    assert len(parts) == len(whole) > 20
    for a, b in zip(parts, whole, strict=True):
        assert contacts(a) == pytest.approx(contacts(b), abs=1e-5)
        assert a.umbra_s == pytest.approx(b.umbra_s, abs=1e-5)


def test_an_eclipse_across_the_edge_of_a_window_is_one() -> None:
    # windows of a 40-day search meet after 20 days, here amid the eclipse of that day
    start = "2031-03-01T12:00:00Z"
    text = case_text(
        GEO.replace("2031-03-20T09:00:00Z", start).replace("135.0", "161.3"),
        "duration_h = 960.0\noutput_step_s = 600.0",
    )
    found = eclipses_of(load_case_text(text).case)
    edge = 20.0 * 86400.0
    across = [e for e in found if contacts(e)[0] < edge < contacts(e)[-1]]
    assert len(across) == 1
    assert len(contacts(across[0])) == 4
    assert across[0].umbra_s == pytest.approx(4046.0, abs=60.0)


# --- light --------------------------------------------------------------------------------


def test_knots_of_a_low_orbit_and_breaks_at_every_contact(tmp_path: Path) -> None:
    case = load_case_text(case_text(LEO)).case
    around = surroundings(case, None, [])
    trajectory = trajectory_of(case)
    assert trajectory is not None
    place = trajectory.position_velocity(around.knots_s)[0]
    place = place / np.linalg.norm(place, axis=0)
    turn = np.degrees(np.arccos(np.clip((place[:, 1:] * place[:, :-1]).sum(axis=0), -1.0, 1.0)))
    assert turn.max() <= 0.25
    assert len(around.eclipses) == 3
    for eclipse in around.eclipses:
        assert len(contacts(eclipse)) == 4
        for contact in contacts(eclipse):
            assert np.abs(np.array(around.breaks_s) - contact).min() < 1e-6
    times = np.random.default_rng(5).uniform(0.0, case.duration_s, 5000)
    exact = path(case).snapshot(times)
    assert np.abs(around.at(times)[0].light - exact.light.T).max() < 2e-5


def test_every_eclipse_of_a_perigee_pass_is_met_by_an_output_time() -> None:
    heo = GEO.replace("0.0002", "0.72").replace("42164.17", "26600.0").replace("0.05", "63.4")
    case = load_case_text(case_text(heo, "duration_h = 120.0\noutput_step_s = 600.0")).case
    around = surroundings(case, None, [])
    times = output_times(case, around)
    light = path(case).snapshot(times).illumination
    assert len(around.eclipses) >= 5
    for eclipse in around.eclipses:
        first, last = contacts(eclipse)[0], contacts(eclipse)[-1]
        inside = (times > first) & (times < last)
        assert light[inside].min() < 1.0
    outside = np.ones(times.shape, dtype=bool)
    for eclipse in around.eclipses:
        outside &= (times < contacts(eclipse)[0] - 1e-3) | (times > contacts(eclipse)[-1] + 1e-3)
    assert (light[outside] == 1.0).all()


def test_eclipses_by_the_moon_only_on_request() -> None:
    # the solar eclipse of 12 August 2026, from a geostationary place that it crosses
    orbit = GEO.replace("2031-03-20T09:00:00Z", "2026-08-12T00:00:00Z").replace("135.0", "150.0")
    time = "duration_h = 24.0\noutput_step_s = 60.0"
    without = load_case_text(case_text(orbit, time)).case
    assert {e.body for e in eclipses_of(without)} <= {"earth"}
    case = load_case_text(case_text(orbit, time + "\n[sun]\nmoon = true")).case
    around = surroundings(case, None, [])
    (moon,) = [e for e in around.eclipses if e.body == "moon"]
    middle = 0.5 * (contacts(moon)[0] + contacts(moon)[-1])
    deep = path(case).snapshot(np.array([middle]))
    assert deep.illumination[0] < 0.95
    assert path(without).snapshot(np.array([middle])).illumination[0] == 1.0
    assert around.at(np.array([middle]))[0].light[0] == pytest.approx(deep.light[:, 0], abs=2e-5)
    for contact in contacts(moon):
        assert np.abs(np.array(around.breaks_s) - contact).min() < 1e-6


# --- leap second and day boundary ---------------------------------------------------------


def test_a_run_through_a_leap_second() -> None:
    orbit = GEO.replace("2031-03-20T09:00:00Z", "2016-12-31T23:50:00Z")
    event = EVENT.replace("onset_h = 2.0", "onset = 2017-01-01T00:00:00Z")
    text = case_text(orbit, "duration_h = 0.5\noutput_step_s = 0.5", event=event)
    loaded = load_case_text(text)
    assert loaded.case.event_onset_s == (601.0,)  # ten minutes and the leap second
    run = run_case(loaded)
    dataset = mode_dataset(run, run.modes[0])
    stamps = dataset.time.values
    assert (np.diff(stamps) > np.timedelta64(0, "ns")).all()
    # half a second after the leap second's begin has no name of its own in UTC
    second = np.timedelta64(1, "s")
    grid = run.modes[0].times_s
    regular = np.isin(np.arange(3601) * 0.5, grid)  # peaks and first milliseconds stand beside
    assert np.flatnonzero(~regular).tolist() == [1201]
    assert stamps[-1] == np.datetime64("2017-01-01T00:19:59")
    last_named = np.flatnonzero(stamps < np.datetime64("2017-01-01"))[-1]
    assert stamps[last_named] > np.datetime64("2016-12-31T23:59:59.9")
    assert stamps[last_named + 1] == np.datetime64("2017-01-01T00:00:00")
    # true seconds: the place moves at 3.07 km/s through the leap second too
    way = np.linalg.norm(np.diff(dataset.position.values, axis=1), axis=0)
    place = path(loaded.case).snapshot(grid).position_m
    speed = np.linalg.norm(np.diff(place, axis=1), axis=0) / np.diff(grid)
    assert speed == pytest.approx(np.full(speed.shape, 3074.7), rel=1e-3)
    # from the last name before midnight to the first after it: one true second
    assert way[last_named] == pytest.approx(3074.7, rel=1e-3)
    assert stamps[-1] - stamps[0] == 1799 * second


def test_a_table_across_a_leap_second_is_read_back(tmp_path: Path) -> None:
    orbit = GEO.replace("2031-03-20T09:00:00Z", "2016-12-31T23:50:30Z")
    kepler = written(tmp_path, case_text(orbit, "duration_h = 1.0\noutput_step_s = 60.0", event=""))
    write_orbit(kepler, tmp_path / "orbit.nc")
    table = 'kind = "table"\nfile = "orbit.nc"\n'
    loaded = written(tmp_path, case_text(table, "", event=""), "t.toml")
    assert loaded.case.duration_s == pytest.approx(3600.0, abs=1e-6)
    times = np.linspace(0.0, 3600.0, 500)
    one = path(kepler.case).snapshot(times).position_m
    two = path(loaded.case, None, loaded.files).snapshot(times).position_m
    assert np.abs(one - two).max() < 1.0


# --- reruns and refusals ------------------------------------------------------------------


def test_a_result_holds_the_text_of_its_orbit(tmp_path: Path) -> None:
    kepler = written(tmp_path, case_text(LEO, "duration_h = 0.5", event=""))
    oem(tmp_path / "leo.oem", kepler, 7200.0)
    text = case_text('kind = "oem"\nfile = "leo.oem"\n', "duration_h = 0.5", event="")
    run = run_case(written(tmp_path, text, "oem.toml"))
    mode_dataset(run, run.modes[0]).to_netcdf(tmp_path / "result.nc")
    (tmp_path / "leo.oem").unlink()
    again = load_case_or_result(tmp_path / "result.nc")
    assert json.loads(mode_dataset(run, run.modes[0]).attrs["file_sha256"])["leo.oem"]
    two = run_case(again)
    times = run.modes[0].times_s
    assert np.array_equal(potentials(run, times), potentials(two, times))
    assert again.files.sha256 == run.loaded.files.sha256


def test_a_result_says_that_a_binary_orbit_is_needed(tmp_path: Path) -> None:
    kepler = written(tmp_path, case_text(LEO, "duration_h = 0.5", event=""))
    write_orbit(kepler, tmp_path / "orbit.nc")
    digest = hashlib.sha256((tmp_path / "orbit.nc").read_bytes()).hexdigest()
    table = case_text('kind = "table"\nfile = "orbit.nc"\n', "", event="")
    run = run_case(written(tmp_path, table, "table.toml"))
    dataset = mode_dataset(run, run.modes[0])
    assert "orbit.nc" in dataset.attrs["file_comment"]
    assert json.loads(dataset.attrs["file_sha256"]) == {"orbit.nc": digest}
    dataset.to_netcdf(tmp_path / "result.nc")
    with xr.open_dataset(tmp_path / "result.nc") as kept:
        assert "orbit.nc" not in json.loads(kept.attrs["file_texts"])
    with pytest.raises(InputError, match=digest):
        load_case_or_result(tmp_path / "result.nc")


def test_faults_of_an_orbit_file_carry_file_and_line(tmp_path: Path) -> None:
    kepler = written(tmp_path, case_text(LEO))
    oem(tmp_path / "leo.oem", kepler)
    whole = (tmp_path / "leo.oem").read_text().splitlines()
    text = case_text('kind = "oem"\nfile = "leo.oem"\n', "duration_h = 1.0")
    (tmp_path / "leo.oem").write_text("\n".join(whole[:-20]) + "\n")
    error = refused(tmp_path, text)
    assert str(error).startswith(f"{tmp_path / 'leo.oem'}:{len(whole) - 20}:")
    assert "truncated" in str(error)
    for fault, line, words in (
        (("REF_FRAME = EME2000", "REF_FRAME = ITRF2000"), 9, "REF_FRAME"),
        (("CENTER_NAME = EARTH", "CENTER_NAME = MARS"), 8, "CENTER_NAME"),
        (("TIME_SYSTEM = UTC", "TIME_SYSTEM = UT1"), 10, "TIME_SYSTEM"),
    ):
        (tmp_path / "leo.oem").write_text("\n".join(whole).replace(*fault) + "\n")
        error = refused(tmp_path, text)
        assert error.line == line
        assert words in str(error)


@pytest.mark.parametrize(
    ("start", "time", "key"),
    [
        ("", "duration_h = 6.0", "duration_h"),
        ("start = 2031-03-19T23:59:00Z\n", "duration_h = 1.0", "start"),
        ("start = 2031-03-20T04:30:00Z\n", "duration_h = 1.0", "duration_h"),
        ("start = 2031-03-21T00:00:00Z\n", "", "start"),
    ],
)
def test_a_run_outside_the_span_is_refused(tmp_path: Path, start: str, time: str, key: str) -> None:
    oem(tmp_path / "leo.oem", written(tmp_path, case_text(LEO)))
    text = case_text('kind = "oem"\nfile = "leo.oem"\n' + start, time, event="")
    error = refused(tmp_path, text)
    assert error.line is not None
    assert error.key[-1] == key
    assert "2031-03-20T05:00:00.000Z" in str(error) or "missing" in str(error)


def test_files_outside_the_folder_need_permission(tmp_path: Path) -> None:
    inner = tmp_path / "inner"
    inner.mkdir()
    oem(tmp_path / "leo.oem", written(tmp_path, case_text(LEO)))
    text = case_text('kind = "oem"\nfile = "../leo.oem"\n', "duration_h = 1.0", event="")
    error = refused(inner, text)
    assert "outside the folder" in str(error)
    assert "--allow-outside" in str(error)
    assert load_case(inner / "case.toml", allow_outside=True).files.trajectory is not None
    assert "does not exist" in str(refused(inner, text.replace("../leo", "leo")))


def test_events_are_checked_against_the_start_that_the_file_gives(tmp_path: Path) -> None:
    oem(tmp_path / "leo.oem", written(tmp_path, case_text(LEO)))
    late = EVENT.replace("onset_h = 2.0", "onset = 2031-03-20T07:00:00Z")
    error = refused(tmp_path, case_text('kind = "oem"\nfile = "leo.oem"\n', "", event=late))
    assert "not before the end of the run" in str(error)
    soon = EVENT.replace("onset_h = 2.0", "onset = 2031-03-20T01:00:00Z")
    loaded = written(tmp_path, case_text('kind = "oem"\nfile = "leo.oem"\n', "", event=soon))
    assert loaded.case.event_onset_s == (3600.0,)


def test_an_orbit_within_the_absorbing_air_is_refused(tmp_path: Path) -> None:
    oem(tmp_path / "leo.oem", written(tmp_path, case_text(LEO)))
    air = "\n[sun]\nabsorbing_height_km = 600.0"
    for orbit in (LEO, 'kind = "oem"\nfile = "leo.oem"\n'):
        error = refused(tmp_path, case_text(orbit, "duration_h = 4.0" + air))
        assert "comes down to" in str(error)
        assert error.key == ("sun", "absorbing_height_km")
