"""Ephemerides in CSV and NetCDF: values, units, and files that are refused."""

import netCDF4
import numpy as np
import pytest

from environments.ephemeris_table import (
    read_ephemeris_csv,
    read_ephemeris_netcdf,
    write_orbit_netcdf,
)
from environments.errors import EnvironmentDataError
from environments.orbit import KeplerOrbit, position_velocity
from environments.trajectory import KeplerTrajectory, Trajectory, geometry_blocks

EPOCH = np.datetime64("2031-03-20T00:00:00", "ns")
ORBIT = KeplerOrbit(EPOCH, 7078.137, 0.01, 51.6, 20.0, 30.0, 40.0)
SECONDS = np.arange(100) * 60.0
NOTES = "# frame = GCRF\n# center = earth\n# time_scale = UTC\n"


def csv_text(unit="km", velocity=True, notes=NOTES, mark="Z"):
    position, speed = position_velocity(ORBIT, SECONDS)
    factor = 1e-3 if unit == "km" else 1.0
    columns = [f"{a}_{unit}" for a in "xyz"]
    states = position * factor
    if velocity:
        columns += [f"v{a}_{unit}_s" for a in "xyz"]
        states = np.vstack((states, speed * factor))
    times = EPOCH + (SECONDS * 1e9).astype("timedelta64[ns]")
    rows = [
        ",".join([str(t)[:23] + mark, *(repr(float(x)) for x in row)])
        for t, row in zip(times, states.T, strict=True)
    ]
    return notes + "# made by hand\n" + ",".join(["time", *columns]) + "\n" + "\n".join(rows) + "\n"


@pytest.mark.parametrize("unit", ["m", "km"])
@pytest.mark.parametrize("velocity", [True, False])
def test_csv_gives_the_orbit_back(tmp_path, unit, velocity):
    file = tmp_path / "a.csv"
    file.write_text(csv_text(unit, velocity))
    trajectory = read_ephemeris_csv(file)
    assert isinstance(trajectory, Trajectory)
    assert isinstance(KeplerTrajectory(ORBIT), Trajectory)
    at = np.linspace(600.0, 5000.0, 301)
    expected = position_velocity(ORBIT, at)
    place, speed = trajectory.position_velocity(at)
    assert np.abs(place - expected[0]).max() < (0.05 if velocity else 1.0)
    assert np.abs(speed - expected[1]).max() < 0.05
    fastest = np.linalg.norm(expected[1], axis=0).max()
    assert fastest < trajectory.speed_limit_m_s < 1.2 * fastest


def test_notes_may_come_from_outside_but_not_contradict(tmp_path):
    file = tmp_path / "a.csv"
    file.write_text(csv_text(notes="# frame = GCRF\n", mark=""))
    trajectory = read_ephemeris_csv(file, center="earth", time_scale="TAI")
    assert trajectory.epoch == EPOCH - np.timedelta64(37, "s")
    with pytest.raises(EnvironmentDataError, match="does not say its center"):
        read_ephemeris_csv(file, time_scale="TAI")
    with pytest.raises(EnvironmentDataError, match="contradicts frame"):
        read_ephemeris_csv(file, frame="TEME", center="earth", time_scale="TAI")


def test_teme_is_turned(tmp_path):
    file = tmp_path / "a.csv"
    file.write_text(csv_text())
    plain = read_ephemeris_csv(file).position_velocity([600.0])[0]
    file.write_text(csv_text(notes=NOTES.replace("GCRF", "TEME")))
    turned = read_ephemeris_csv(file).position_velocity([600.0])[0]
    apart = np.linalg.norm(turned - plain) / np.linalg.norm(plain)
    assert np.degrees(apart) == pytest.approx(0.4, abs=0.15)  # 31 years of precession


ROW = "2031-03-20T00:10:00.000Z"
BAD = {
    "frame": (lambda t: t.replace("GCRF", "ITRF"), "no frame", None),
    "centre": (lambda t: t.replace("= earth", "= moon"), "center", None),
    "time scale": (lambda t: t.replace("= UTC", "= UT1"), "time_scale", None),
    "no Z": (lambda t: t.replace(ROW, ROW[:-1]), "without Z", ROW[:-1]),
    "unit": (lambda t: t.replace("x_km", "x_mile"), "names the columns", "time,"),
    "mixed units": (lambda t: t.replace("vx_km_s", "vx_m_s"), "names the columns", "time,"),
    "column twice": (lambda t: t.replace("y_km", "x_km", 1), "column twice", "time,"),
    "cut": (lambda t: t[: t.index(ROW) + 40], "truncated", ROW),
    "empty": (lambda t: t[: t.index("2031")], "truncated", None),
    "gap": (lambda t: "\n".join(x for x in t.split("\n") if not x.startswith(ROW)),
            "gap of 120 s", "2031-03-20T00:11"),
    "duplicate": (lambda t: t.replace("T00:11:00.000Z", "T00:10:00.000Z"), "repeats", None),
    "unsorted": (lambda t: t.replace("T00:11:00.000Z", "T00:08:00.000Z"), "goes back", None),
    "nan": (lambda t: t.replace(ROW + ",", ROW + ",nan"), "not a finite", ROW),
    "note twice": (lambda t: NOTES + t, "second time", None),
    "unknown note": (lambda t: "# fram = GCRF\n" + t, 'nearest: "frame"', None),
    "interpolation": (lambda t: "# interpolation = cubic\n" + t, "interpolation", None),
    "degree": (lambda t: "# degree = x\n" + t, "whole number", None),
}  # fmt: skip


@pytest.mark.parametrize("what", BAD)
def test_bad_csv(tmp_path, what):
    change, problem, at = BAD[what]
    file = tmp_path / "bad.csv"
    text = change(csv_text())
    file.write_text(text)
    with pytest.raises(EnvironmentDataError, match=problem) as caught:
        read_ephemeris_csv(file)
    assert caught.value.file == str(file)
    if at is not None:
        assert caught.value.line is not None
        assert text.split("\n")[caught.value.line - 1].startswith(at)


def test_files_that_cannot_be_read(tmp_path):
    with pytest.raises(EnvironmentDataError, match="cannot be read"):
        read_ephemeris_csv(tmp_path / "none.csv")
    bad = tmp_path / "latin.csv"
    bad.write_bytes(b"# frame = GCRF\n\xff\n")
    with pytest.raises(EnvironmentDataError, match="UTF-8") as caught:
        read_ephemeris_csv(bad)
    assert caught.value.line == 2


@pytest.fixture
def orbit_file(tmp_path):
    file = tmp_path / "orbit.nc"
    trajectory = KeplerTrajectory(ORBIT)
    blocks = geometry_blocks(trajectory, 7000.0, 60.0, block=50)
    assert write_orbit_netcdf(file, trajectory, blocks, {"history": "test"}) == 118
    assert [x.name for x in tmp_path.iterdir()] == ["orbit.nc"]
    return file


def test_netcdf_round_trip(orbit_file):
    import xarray

    trajectory = read_ephemeris_netcdf(orbit_file)
    assert trajectory.epoch == EPOCH
    assert trajectory.span_s == (0.0, 7000.0)
    at = np.linspace(0.0, 7000.0, 500)
    np.testing.assert_allclose(
        trajectory.position_velocity(at)[0], position_velocity(ORBIT, at)[0], atol=0.5
    )
    with xarray.open_dataset(orbit_file) as dataset:
        assert dataset.sizes == {"axis": 3, "time": 118}
        assert dataset.time.values[1] == EPOCH + np.timedelta64(60, "s")
        assert float(dataset.illumination.min()) == 0.0
        assert dataset.position.attrs["units"] == "m"


def test_a_failed_write_leaves_nothing(tmp_path):
    def broken():
        yield from geometry_blocks(KeplerTrajectory(ORBIT), 600.0, 60.0, block=5)
        raise RuntimeError("stop")

    with pytest.raises(RuntimeError, match="stop"):
        write_orbit_netcdf(tmp_path / "a.nc", KeplerTrajectory(ORBIT), broken())
    assert list(tmp_path.iterdir()) == []


def edit(what):
    def apply(dataset):
        time, place = dataset.variables["time"], dataset.variables["position"]
        match what:
            case "unit":
                place.units = "mile"
            case "kilometres":
                place.units = "km"
            case "frame":
                dataset.frame = "ITRF"
            case "centre":
                dataset.center = "moon"
            case "time scale":
                dataset.time_scale = "TAI"
            case "no frame":
                dataset.delncattr("frame")
            case "nan":
                place[0, 17] = np.nan
            case "duplicate":
                time[17] = time[16]
            case "unsorted":
                time[17] = time[15]
            case "gap":
                time[17:] = time[17:] + 100.0
            case "time units":
                time.units = "fortnights since 2031-03-20"
            case "calendar":
                time.calendar = "noleap"

    return apply


@pytest.mark.parametrize(
    ("what", "problem"),
    [
        ("unit", "no usable unit"),
        ("kilometres", "wrong unit"),
        ("frame", "no frame"),
        ("centre", "center"),
        ("time scale", "time_scale"),
        ("no frame", "does not say its frame"),
        ("nan", "position is missing or not finite"),
        ("duplicate", "row 18 repeats"),
        ("unsorted", "row 18 goes back"),
        ("gap", "row 18 follows after a gap"),
        ("time units", "units of time"),
        ("calendar", "calendar"),
    ],
)
def test_bad_netcdf(orbit_file, what, problem):
    with netCDF4.Dataset(orbit_file, "a") as dataset:
        edit(what)(dataset)
    with pytest.raises(EnvironmentDataError, match=problem) as caught:
        read_ephemeris_netcdf(orbit_file)
    assert caught.value.file == str(orbit_file)


def test_truncated_netcdf(orbit_file):
    data = orbit_file.read_bytes()
    orbit_file.write_bytes(data[: len(data) // 2])
    with pytest.raises(EnvironmentDataError, match="truncated"):
        read_ephemeris_netcdf(orbit_file)
