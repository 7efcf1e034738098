"""The Moon's place against DE421, and its shadow on spacecraft."""

import datetime
import warnings

import numpy as np
import pytest

from environments.moon import MOON_RADIUS_M, find_moon_eclipses, moon_position_m
from environments.orbit import KeplerOrbit
from environments.sun import illumination, sun_path, sun_position_m
from environments.timescales import utc_at
from environments.trajectory import KeplerTrajectory

DATES = np.arange(
    np.datetime64("1975-01-05", "h"), np.datetime64("2049-06-01", "h"), np.timedelta64(1511, "h")
).astype("datetime64[ns]")


def skyfield_place(name, dates):
    """Geocentric apparent place (light time, aberration), GCRS axes, by DE421 [m]."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # tables of leap seconds past their date
        from skyfield.api import load, load_file
        from skyfield_data import get_skyfield_data_path

        scale = load.timescale(builtin=True)
        planets = load_file(f"{get_skyfield_data_path()}/de421.bsp")
        moments = scale.from_datetimes(
            [d.astype("datetime64[us]").item().replace(tzinfo=datetime.UTC) for d in dates]
        )
        place = planets["earth"].at(moments).observe(planets[name]).apparent(deflectors=())
        planets.close()
        return place.position.m


def apart(ours, theirs):
    size = np.linalg.norm(ours, axis=0), np.linalg.norm(theirs, axis=0)
    across = np.linalg.norm(np.cross(ours, theirs, axis=0), axis=0)
    return np.degrees(across / size[0] / size[1]) * 3600.0, np.abs(size[0] - size[1])


def test_moon_within_20_arcsec_and_60_km():
    angle, distance = apart(moon_position_m(DATES), skyfield_place("moon", DATES))
    assert angle.max() < 20.0
    assert distance.max() < 60e3


def test_sun_by_a_second_library():
    angle, distance = apart(sun_position_m(DATES), skyfield_place("sun", DATES))
    assert angle.max() < 0.001 * 3600.0
    assert distance.max() < 1e-5 * 1.5e11


def test_eclipses_by_the_moon_of_the_geostationary_ring():
    """Against every 30 s of the free share of the Sun, with DE421's Moon and Sun."""
    from scipy.interpolate import CubicSpline

    start = np.datetime64("2026-08-10", "ns")  # solar eclipse of 12 August
    trajectory = KeplerTrajectory(KeplerOrbit(start, 42164.17, 0.0, 0.0, 0.0, 0.0, 147.0))
    end = 5 * 86400.0
    found = find_moon_eclipses(
        lambda t: trajectory.position_velocity(t)[0], start, 0.0, end,
        speed_limit_m_s=trajectory.speed_limit_m_s,
    )  # fmt: skip
    hours = np.arange(-1, 5 * 24 + 2) * 3600.0
    moon = CubicSpline(hours, skyfield_place("moon", utc_at(start, hours)), axis=1)
    sun = CubicSpline(hours, skyfield_place("sun", utc_at(start, hours)), axis=1)
    seconds = np.arange(0.0, end, 30.0)
    place = trajectory.position_velocity(seconds)[0]
    share = illumination(place - moon(seconds), sun(seconds) - moon(seconds), MOON_RADIUS_M)
    dim = np.flatnonzero(np.diff((share < 1.0).astype(int)))
    edges = [t for one in found for t in (one.penumbra_start, one.penumbra_end)]
    assert len(edges) == dim.size >= 2
    assert np.abs(np.array(edges) - seconds[dim] - 15.0).max() < 15.0 + 30.0
    assert all(one.body == "moon" for one in found)


def test_counts_of_a_year_are_as_reported():
    """The ring sees some Moon eclipses a year, irregular, up to about 2 h (1982 abstract)."""
    start = np.datetime64("2031-01-01", "ns")
    trajectory = KeplerTrajectory(KeplerOrbit(start, 42164.17, 0.0, 0.0))
    found = find_moon_eclipses(
        lambda t: trajectory.position_velocity(t)[0], start, 0.0, 365.0 * 86400.0,
        speed_limit_m_s=trajectory.speed_limit_m_s,
    )  # fmt: skip
    lengths = [one.penumbra_end - one.penumbra_start for one in found]
    assert 1 <= len(found) <= 8
    assert max(lengths) < 2.5 * 3600.0
    middle = np.array([0.5 * (one.penumbra_start + one.penumbra_end) for one in found])
    moon, sun = moon_position_m(utc_at(start, middle)), sun_path(start)(middle)
    # only near new moon
    assert apart(moon, sun)[0].max() < 9.0 * 3600.0


def test_refuses_what_is_no_time():
    with pytest.raises(ValueError, match="times"):
        moon_position_m([1.0])
