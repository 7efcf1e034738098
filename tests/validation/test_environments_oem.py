"""Orbit ephemeris messages: round trip, a third-party reader, and files that are refused."""

import warnings

import numpy as np
import pytest

from environments.errors import EnvironmentDataError
from environments.oem import read_oem, write_oem
from environments.orbit import KeplerOrbit, period_s, position_velocity
from environments.trajectory import geometry, starting_at

EPOCH = np.datetime64("2031-03-20T00:00:00", "ns")
ORBITS = {
    "low": KeplerOrbit(EPOCH, 6878.137, 0.001, 51.6, 20.0, 30.0, 40.0),
    "geostationary": KeplerOrbit(EPOCH, 42164.17, 0.0002, 0.05),
    "eccentric": KeplerOrbit(EPOCH, 24400.0, 0.72, 7.0, 100.0, 180.0),
}


def write(path, orbit, step_s=60.0, count=181, **more):
    seconds = np.arange(count) * step_s
    position, velocity = position_velocity(orbit, seconds)
    write_oem(
        path, orbit.epoch, seconds, position, velocity, object_name="TESTBED",
        object_id="2031-001A", creation_date=EPOCH, **more,
    )  # fmt: skip
    return seconds


@pytest.mark.parametrize("name", ORBITS)
@pytest.mark.parametrize(
    ("method", "degree"), [("hermite", 3), ("hermite", 7), ("hermite", 11), ("lagrange", 7)]
)
def test_round_trip(tmp_path, name, method, degree):
    orbit = ORBITS[name]
    file = tmp_path / "a.oem"
    seconds = write(file, orbit, method=method, degree=degree)
    trajectory = read_oem(file)
    assert trajectory.epoch == EPOCH
    assert trajectory.span_s == (0.0, seconds[-1])
    assert f"{method} interpolation of degree {degree}" in trajectory.source
    at = np.random.default_rng(5).uniform(600.0, seconds[-1] - 600.0, 500)
    for times, metres in ((seconds, 1e-5), (at, 2.0 if degree == 3 else 0.05)):
        ours, theirs = trajectory.position_velocity(times), position_velocity(orbit, times)
        assert np.abs(ours[0] - theirs[0]).max() < metres
        assert np.abs(ours[1] - theirs[1]).max() < 0.05
    # the estimate bounds the truth
    true = trajectory.position_velocity(at)[0] - position_velocity(orbit, at)[0]
    assert np.linalg.norm(true, axis=0).max() < 3.0 * trajectory.interpolation_error_m + 1e-5


@pytest.mark.parametrize(("method", "degree"), [("hermite", 7), ("lagrange", 5)])
def test_third_party_reader_agrees(tmp_path, method, degree):
    from astropy.time import Time, TimeDelta
    from astropy.utils import iers
    from oem import OrbitEphemerisMessage

    orbit = KeplerOrbit(np.datetime64("2024-03-20T00:00:00", "ns"), 6878.137, 0.001, 51.6)
    file = tmp_path / "a.oem"
    seconds = write(file, orbit, method=method, degree=degree)
    trajectory = read_oem(file)
    with iers.conf.set_temp("auto_download", False), warnings.catch_warnings():
        warnings.simplefilter("ignore")  # its own deprecations
        theirs = OrbitEphemerisMessage.open(file)
        for state, t in zip(theirs.states, seconds, strict=True):
            ours = trajectory.position_velocity([t])
            assert np.abs(ours[0][:, 0] - state.position * 1e3).max() < 1e-4
            assert np.abs(ours[1][:, 0] - state.velocity * 1e3).max() < 1e-6
        start = Time("2024-03-20T00:00:00", scale="utc")
        for t in (1234.5, 5000.25, 9990.0):
            state = theirs(start + TimeDelta(t, format="sec"))
            ours = trajectory.position_velocity([t])
            # its own windows differ by a row; both are right to below a metre
            assert np.abs(ours[0][:, 0] - state.position * 1e3).max() < 0.5
            assert np.abs(ours[1][:, 0] - state.velocity * 1e3).max() < 0.05


@pytest.mark.parametrize(("scale", "shift"), [("TAI", 37.0), ("TT", 69.184), ("GPS", 18.0)])
def test_time_systems(tmp_path, scale, shift):
    file = tmp_path / "a.oem"
    write(file, ORBITS["low"])
    text = file.read_text().replace("TIME_SYSTEM = UTC", f"TIME_SYSTEM = {scale}")
    file.write_text(text)
    trajectory = read_oem(file)
    assert (EPOCH - trajectory.epoch) / np.timedelta64(1, "ms") == pytest.approx(1e3 * shift)


def test_leap_second_inside_a_file(tmp_path):
    orbit = KeplerOrbit(np.datetime64("2016-12-31T23:00:00", "ns"), 6878.137, 0.001, 51.6)
    file = tmp_path / "a.oem"
    seconds = write(file, orbit, step_s=20.0, count=360)
    assert "2016-12-31T23:59:60.000000000" in file.read_text()  # 3600 s after 23 h
    assert "2017-01-01T00:00:19.000000000" in file.read_text()
    at = np.arange(3500.0, 3700.0, 0.5)
    np.testing.assert_allclose(
        read_oem(file).position_velocity(at)[0], position_velocity(orbit, at)[0], atol=1e-3
    )
    assert read_oem(file).span_s[1] == seconds[-1]


def test_segments_usable_times_and_rejection_outside(tmp_path):
    orbit = ORBITS["low"]
    file = tmp_path / "a.oem"
    write(file, orbit)
    head, _, rest = file.read_text().partition("META_START")
    meta, _, rows = rest.partition("META_STOP")
    rows = rows.strip().split("\n")
    # two segments of which only the inner times may be used, joined at 01:00
    use = "USEABLE_START_TIME = 2031-03-20T0{}:00\nUSEABLE_STOP_TIME = 2031-03-20T0{}:00\n"
    one = meta.replace("T03:00:00", "T01:30:00") + use.format("0:05", "1:00")
    two = meta.replace("T00:00:00", "T00:30:00") + use.format("1:00", "2:50")
    first, second = "\n".join(rows[:91]), "\n".join(rows[30:])
    body = f"META_START{one}META_STOP\n{first}\nCOVARIANCE_START\nEPOCH = x\n1\nCOVARIANCE_STOP\n"
    file.write_text(f"{head}{body}META_START{two}META_STOP\n{second}\n")
    trajectory = read_oem(file)
    assert len(trajectory.segments) == 2
    assert trajectory.epoch == EPOCH + np.timedelta64(300, "s")
    assert trajectory.span_s == (0.0, 9900.0)
    at = np.linspace(0.0, 9900.0, 777)
    expected = position_velocity(orbit, at + 300.0)[0]
    np.testing.assert_allclose(trajectory.position_velocity(at)[0], expected, atol=0.05)
    with pytest.raises(EnvironmentDataError, match=r"does not cover .*02:50:01.000Z"):
        trajectory.position_velocity([9901.0])
    later = starting_at(trajectory, EPOCH + np.timedelta64(3600, "s"))
    np.testing.assert_allclose(
        later.position_velocity([60.0])[0], position_velocity(orbit, [3660.0])[0], atol=0.05
    )
    assert geometry(later, [0.0, 60.0]).illumination.shape == (2,)
    with pytest.raises(EnvironmentDataError, match="does not cover"):
        starting_at(trajectory, EPOCH)
    # a gap between the two is refused
    key = "USEABLE_START_TIME = 2031-03-20T01:0"
    file.write_text(file.read_text().replace(f"{key}0:00", f"{key}1:00"))
    with pytest.raises(EnvironmentDataError, match="leaves a gap"):
        read_oem(file)


def line_of(text, start):
    return next(k for k, line in enumerate(text.split("\n"), 1) if line.startswith(start))


def drop(start):
    return lambda text: "\n".join(x for x in text.split("\n") if not x.startswith(start))


def swap(text):
    lines = text.split("\n")
    k = line_of(text, "2031-03-20T00:10:00") - 1
    lines[k], lines[k + 1] = lines[k + 1], lines[k]
    return "\n".join(lines)


ROW = "2031-03-20T00:10:00"
BAD = {
    "cut within a row": (lambda t: t[: t.index(ROW) + 60], "truncated", ROW),
    "cut after a row": (lambda t: t[: t.index(ROW)], "truncated", "2031-03-20T00:09:00"),
    "cut within metadata": (lambda t: t[: t.index("REF_FRAME")], "truncated", "CENTER_NAME"),
    "first row missing": (drop("2031-03-20T00:00:00"), "rows are missing", "2031-03-20T00:01"),
    "gap": (drop(ROW), "gap of 120 s", "2031-03-20T00:11:00"),
    "unsorted": (swap, "goes back", ROW),
    "duplicate": (lambda t: t.replace("T00:11:00.", "T00:10:00."), "repeats", ROW),
    "frame": (lambda t: t.replace("EME2000", "ITRF2020"), "REF_FRAME", "REF_FRAME"),
    "centre": (lambda t: t.replace("= EARTH", "= MOON"), "CENTER_NAME", "CENTER_NAME"),
    "time scale": (lambda t: t.replace("= UTC", "= UT1"), "TIME_SYSTEM", "TIME_SYSTEM"),
    "degree": (lambda t: t.replace("DEGREE = 7", "DEGREE = 8"), "odd", "INTERPOLATION_DEGREE"),
    "no degree": (drop("INTERPOLATION_DEGREE"), "without INTERP", "INTERPOLATION"),
    "method": (lambda t: t.replace("HERMITE", "HERMIT"), 'nearest: "HERMITE"', "INTERPOLATION"),
    "no frame": (drop("REF_FRAME"), "without REF_FRAME", "META_START"),
    "unknown": (lambda t: t.replace("OBJECT_ID", "OBJECT_IDD"), "OBJECT_ID", "OBJECT_IDD"),
    "version": (lambda t: t.replace("VERS = 2.0", "VERS = 9.0"), "version", "CCSDS"),
    "not an OEM": (lambda t: "a,b\n1,2\n", "no CCSDS OEM", "a,b"),
}  # fmt: skip


@pytest.mark.parametrize("what", BAD)
def test_bad_files_are_refused_with_line(tmp_path, what):
    change, problem, at = BAD[what]
    file = tmp_path / "bad.oem"
    write(file, ORBITS["low"])
    text = change(file.read_text())
    file.write_text(text)
    with pytest.raises(EnvironmentDataError, match=problem) as caught:
        read_oem(file)
    error = caught.value
    assert error.file == str(file)
    lines = text.split("\n")
    assert error.line is not None
    # the line named holds what the error is about
    assert lines[error.line - 1].startswith(at) or (
        what in ("cut within metadata", "duplicate", "unsorted") and abs(
            error.line - line_of(text, at)) <= 1
    )  # fmt: skip
    assert str(error).startswith(f"{file}:{error.line}: ")


@pytest.mark.parametrize("word", ["NaN", "inf", "1e999", "0x1p3", "1_000.0", "1,5"])
def test_numbers_that_are_none(tmp_path, word):
    file = tmp_path / "bad.oem"
    write(file, ORBITS["low"])
    text = file.read_text()
    k = line_of(text, ROW)
    lines = text.split("\n")
    parts = lines[k - 1].split()
    lines[k - 1] = " ".join([parts[0], word, *parts[2:]])
    file.write_text("\n".join(lines))
    with pytest.raises(EnvironmentDataError, match="not a finite number") as caught:
        read_oem(file)
    assert caught.value.line == k


@pytest.mark.parametrize(
    ("place", "speed", "problem"),
    [(1e3, 1e3, "wrong unit"), (1e-3, 1e-3, "wrong unit"), (1.0, 1e3, "gravity"),
     (0.3048, 0.3048, "wrong unit"), (1.609, 1.609, "gravity")],
)  # fmt: skip
def test_wrong_units_show_in_the_motion(tmp_path, place, speed, problem):
    file = tmp_path / "bad.oem"
    orbit = ORBITS["geostationary"]
    seconds = np.arange(100) * 300.0
    position, velocity = position_velocity(orbit, seconds)
    write_oem(
        file, EPOCH, seconds, position * place, velocity * speed, object_name="X",
        object_id="X", creation_date=EPOCH,
    )  # fmt: skip
    if (place, speed) == (0.3048, 0.3048):
        problem = "gravity"
    with pytest.raises(EnvironmentDataError, match=problem):
        read_oem(file)


def test_a_frame_that_turns_with_the_earth_shows_in_the_motion(tmp_path):
    file = tmp_path / "bad.oem"
    seconds = np.arange(200) * 60.0
    position, velocity = position_velocity(ORBITS["eccentric"], seconds)
    rate = 7.292115e-5
    c, s = np.cos(rate * seconds), np.sin(rate * seconds)

    def turn(v):
        return np.stack((c * v[0] + s * v[1], -s * v[0] + c * v[1], v[2]))

    fixed = turn(position)
    moving = turn(velocity) - rate * np.stack((-fixed[1], fixed[0], 0.0 * c))
    write_oem(
        file, EPOCH, seconds, fixed, moving, object_name="X", object_id="X", creation_date=EPOCH
    )
    with pytest.raises(EnvironmentDataError, match="gravity"):
        read_oem(file)


def test_rows_too_far_apart(tmp_path):
    file = tmp_path / "bad.oem"
    write(file, ORBITS["low"], step_s=0.3 * period_s(ORBITS["low"]), count=20)
    with pytest.raises(EnvironmentDataError, match="too far apart"):
        read_oem(file)


def test_too_few_rows(tmp_path):
    file = tmp_path / "bad.oem"
    write(file, ORBITS["low"])
    text = file.read_text().replace("T03:00:00.000000000\nINT", "T00:02:00.0\nINT")
    file.write_text(text[: text.index("2031-03-20T00:03:00")])
    with pytest.raises(EnvironmentDataError, match="3 rows, but hermite"):
        read_oem(file)
