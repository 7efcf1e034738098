"""SGP4 verification rows through our path, and the turn from TEME against astropy."""

import sys
import warnings
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
import sgp4

from environments.earth_axes import teme_to_j2000
from environments.errors import EnvironmentDataError
from environments.tle import read_tle, tle_trajectory

# Rows of Vallado, Crawford, Hujsak & Kelso (2006), AIAA 2006-6753, as distributed.
FOLDER = Path(sgp4.__file__).parent
VANGUARD = (
    "1 00005U 58002B   00179.78495062  .00000023  00000-0  28098-4 0  4753",
    "2 00005  34.2682 348.7242 1859667 331.7664  19.3264 10.82419157413667",
)


def verification_rows():
    lines = {}
    text = (FOLDER / "SGP4-VER.TLE").read_text().splitlines()
    for one, two in pairwise(text):
        if one.startswith("1 ") and two.startswith("2 "):
            lines.setdefault(one[2:7].lstrip("0"), (one[:69], two[:69]))
    rows, number = {}, None
    for line in (FOLDER / "tcppver.out").read_text().splitlines():
        parts = line.split()
        if len(parts) == 2 and parts[1] == "xx":
            number = parts[0]
        elif len(parts) >= 7:
            rows.setdefault(number, []).append([float(x) for x in parts[:7]])
    return lines, rows


LINES, ROWS = verification_rows()
# near-Earth, deep space, resonant 12 h and 24 h, Lyddane, high drag, retrograde
OBJECTS = ["5", "4632", "6251", "8195", "9880", "9998", "11801", "14128", "16925", "20413",
           "21897", "22312", "23177", "23599", "24208", "25954", "26900", "28057", "28129",
           "28350", "28623", "28626", "29141"]  # fmt: skip


@pytest.mark.parametrize("number", OBJECTS)
def test_published_rows(number):
    rows = np.array(ROWS[number])
    days = np.abs(rows[:, 0]).max() / 1440.0 + 1.0
    trajectory = tle_trajectory(*LINES[number], longest_days=days)
    position, velocity = trajectory.teme(rows[:, 0] * 60.0)
    # the rows hold 1e-8 km; our epoch is an integer of nanoseconds, 1e-9 s of 10 km/s
    np.testing.assert_allclose(position.T / 1e3, rows[:, 1:4], atol=5e-6, rtol=0.0)
    np.testing.assert_allclose(velocity.T / 1e3, rows[:, 4:7], atol=5e-9, rtol=0.0)


def test_row_from_the_paper():
    position, _ = tle_trajectory(*VANGUARD).teme([0.0, 360.0 * 60.0])
    assert position[:, 0] / 1e3 == pytest.approx([7022.46529266, -1400.08296755, 0.03995155])
    assert position[:, 1] / 1e3 == pytest.approx([-7154.03120202, -3783.17682504, -3536.19412294])


@pytest.mark.parametrize("year", [2001, 2010, 2019, 2026])
def test_teme_against_astropy(year):
    from astropy import units as u
    from astropy.coordinates import GCRS, TEME, CartesianRepresentation
    from astropy.time import Time
    from astropy.utils import iers

    times = np.array([f"{year}-0{m}-0{m}T0{m}:00:00" for m in range(1, 10)], "datetime64[ns]")
    vectors = np.random.default_rng(year).normal(size=(3, times.size))
    vectors *= 4.2e7 / np.linalg.norm(vectors, axis=0)
    with iers.conf.set_temp("auto_download", False), warnings.catch_warnings():
        warnings.simplefilter("ignore")
        moments = Time(times.astype(str), scale="utc")
        place = TEME(CartesianRepresentation(vectors * u.m), obstime=moments)
        # geocentric without aberration: positions, not directions of light
        theirs = place.transform_to(GCRS(obstime=moments)).cartesian.xyz.to_value("m")
    ours = teme_to_j2000(vectors, times)
    apart = np.linalg.norm(ours - theirs, axis=0) / 4.2e7 * 206265.0
    assert apart.max() < 1.0  # arcsec
    assert np.linalg.norm(vectors - theirs, axis=0).max() / 4.2e7 * 206265.0 > 40.0


def test_velocity_is_the_derivative_of_position():
    trajectory = tle_trajectory(*VANGUARD)
    at = np.linspace(0.0, 8000.0, 33)
    ahead, behind = (trajectory.position_velocity(at + d)[0] for d in (0.5, -0.5))
    # SGP4's own velocity is its path's derivative to first order in J2 only, about 1e-4
    np.testing.assert_allclose(ahead - behind, trajectory.position_velocity(at)[1], atol=2.0)


def test_files(tmp_path):
    file = tmp_path / "a.tle"
    file.write_text("VANGUARD 1\n" + "\n".join(VANGUARD) + "\n")
    trajectory = read_tle(file)
    assert trajectory.name == "VANGUARD 1"
    assert str(trajectory.epoch)[:19] == "2000-06-27T18:50:19"
    with pytest.raises(EnvironmentDataError, match="does not cover"):
        trajectory.position_velocity([31.0 * 86400.0])
    file.write_text("\n".join(VANGUARD * 2) + "\n")
    with pytest.raises(EnvironmentDataError, match="no epoch says which"):
        read_tle(file)
    assert read_tle(file, epoch=trajectory.epoch).epoch == trajectory.epoch
    file.write_text("\n".join((*VANGUARD, *LINES["4632"])))
    with pytest.raises(EnvironmentDataError, match="2 objects"):
        read_tle(file)


@pytest.mark.parametrize(
    ("text", "problem", "line"),
    [
        (VANGUARD[0] + "\n", "truncated", 2),
        (VANGUARD[0] + "\n" + VANGUARD[1][:50] + "\n", "truncated", 2),
        (VANGUARD[0].replace("58002B", "58003B") + "\n" + VANGUARD[1], "checksum", 1),
        (VANGUARD[0] + "\n" + VANGUARD[1].replace("34.2682", "34.2683"), "checksum", 2),
        ("a\nb\n" + "\n".join(VANGUARD), "neither a name", 2),
        (VANGUARD[0] + "\n" + LINES["4632"][1], "belongs to object", 2),
        ("", "truncated", 1),
    ],
)
def test_bad_files(tmp_path, text, problem, line):
    file = tmp_path / "bad.tle"
    file.write_text(text)
    with pytest.raises(EnvironmentDataError, match=problem) as caught:
        read_tle(file)
    assert (caught.value.file, caught.value.line) == (str(file), line)


def test_decay_is_an_error_not_a_position():
    trajectory = tle_trajectory(*LINES["28872"], longest_days=5.0)
    with pytest.raises(EnvironmentDataError, match="cannot be followed"):
        trajectory.position_velocity([86400.0])


def test_without_the_package(monkeypatch):
    monkeypatch.setitem(sys.modules, "sgp4.api", None)
    with pytest.raises(EnvironmentDataError, match="extra `tle`"):
        tle_trajectory(*VANGUARD)


@pytest.mark.parametrize(
    ("field", "text", "problem"),
    [
        (slice(8, 16), "     nan", "inclination is nan"),
        (slice(8, 16), "251.6416", "inclination is 251.642"),
        (slice(17, 25), "     nan", "node is nan"),
    ],
)
def test_elements_that_a_checksum_does_not_refuse(field, text, problem):
    """A number that is none, or out of range, with a checksum that fits."""
    line1, line2 = VANGUARD[-2:]
    bad = line2[: field.start] + text + line2[field.stop : 68]
    digits = sum(int(c) if c.isdigit() else c == "-" for c in bad)
    with pytest.raises(EnvironmentDataError, match=problem):
        tle_trajectory(line1, bad + str(digits % 10))
