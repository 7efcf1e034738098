"""The common interface: flattened shadow, blocks, interpolation, errors."""

import tracemalloc

import numpy as np
import pytest

from environments.eclipse import find_eclipses
from environments.ephemeris import Segment, check_times, sampled_trajectory
from environments.errors import EnvironmentDataError
from environments.interpolation import interpolate, rows_needed
from environments.orbit import KeplerOrbit, drift_rates_rad_s
from environments.sun import earth_shadow_radii_m, illumination, sun_path
from environments.timescales import tai_from_utc
from environments.trajectory import KeplerTrajectory, geometry, geometry_blocks, starting_at

EPOCH = np.datetime64("2031-03-20T00:00:00", "ns")
GEO = KeplerTrajectory(KeplerOrbit(EPOCH, 42164.17, 0.0002, 0.05))
POLAR = KeplerTrajectory(
    KeplerOrbit(np.datetime64("2030-12-21", "ns"), 7178.137, 0.001, 98.6, 335.0, 90.0)
)


def eclipses(trajectory, height=0.0, end=86400.0):
    equatorial, polar = earth_shadow_radii_m(height)
    return find_eclipses(
        lambda t: trajectory.position_velocity(t)[0], sun_path(trajectory.epoch), 0.0, end,
        body_radius_m=equatorial, polar_radius_m=polar,
    )  # fmt: skip


@pytest.mark.parametrize("trajectory", [GEO, POLAR], ids=["GEO", "grazed"])
@pytest.mark.parametrize("height", [0.0, 150e3])
def test_every_second_of_a_flattened_shadow_is_found(trajectory, height):
    seconds = np.arange(0.0, 86400.0, 1.0)
    light = geometry(trajectory, seconds, absorbing_height_m=height).illumination
    dim = np.zeros(seconds.size, bool)
    found = eclipses(trajectory, height)
    for one in found:
        begin = 0.0 if one.penumbra_start is None else one.penumbra_start
        dim |= (seconds >= begin) & (seconds < (one.penumbra_end or 86400.0))
    # rounding of the contact, and the cone's axis from the Earth's centre instead of the craft
    assert (dim != (light < 1.0)).sum() <= len(found) // 2
    assert dim.any()


def test_flattened_earth_lets_more_light_over_the_pole():
    sun = [[1.5e11], [0.0], [0.0]]
    equatorial, polar = earth_shadow_radii_m()
    behind = [[-7e6, -7e6], [0.0, 6.37e6], [6.37e6, 0.0]]
    round_, flat = (illumination(behind, sun, equatorial, polar_radius_m=p) for p in (None, polar))
    assert flat[0] > round_[0] + 0.1  # over the pole
    assert flat[1] == pytest.approx(round_[1], abs=1e-12)  # over the equator
    for p in (7e6, 0.0, np.nan):
        with pytest.raises(ValueError, match="polar_radius_m"):
            illumination(behind, sun, equatorial, polar_radius_m=p)
    with pytest.raises(ValueError, match="absorbing_height_m"):
        earth_shadow_radii_m(-1.0)


def test_blocks_are_the_whole_and_memory_stays_bounded():
    whole = geometry(GEO, np.append(np.arange(0.0, 86400.0, 70.0), 86400.0))
    parts = list(geometry_blocks(GEO, 86400.0, 70.0, block=333))
    for k in range(len(whole)):
        np.testing.assert_array_equal(np.concatenate([p[k] for p in parts], axis=-1), whole[k])
    tracemalloc.start()
    peaks = []
    for days in (20.0, 200.0):
        tracemalloc.reset_peak()
        count = sum(p.seconds.size for p in geometry_blocks(GEO, days * 86400.0, 60.0, block=5000))
        assert count == days * 1440 + 1
        peaks.append(tracemalloc.get_traced_memory()[1])
    tracemalloc.stop()
    assert peaks[1] < 1.2 * peaks[0]
    with pytest.raises(ValueError, match="step_s"):
        next(geometry_blocks(GEO, 1.0, 0.0))


def test_trajectories_from_another_epoch():
    later = starting_at(GEO, EPOCH + np.timedelta64(1, "D"))
    again = starting_at(later, EPOCH)
    at = np.array([0.0, 100.0])
    np.testing.assert_array_equal(
        later.position_velocity(at)[0], GEO.position_velocity(at + 86400.0)[0]
    )
    np.testing.assert_array_equal(again.position_velocity(at)[0], GEO.position_velocity(at)[0])
    assert "Kepler" in later.source


def test_drift_against_textbook_rates():
    # sun-synchronous at 800 km, 98.6 deg: 360 deg a year; Molniya: the perigee stands still;
    # ISS-like orbit -5.0 deg a day (Vallado 2013, Wertz 1999; from memory)
    node, _, _ = drift_rates_rad_s(KeplerOrbit(EPOCH, 7178.137, 0.0, 98.603))
    assert np.degrees(node) * 86400.0 == pytest.approx(360.0 / 365.2422, rel=2e-3)
    _, perigee, _ = drift_rates_rad_s(KeplerOrbit(EPOCH, 26560.0, 0.74, 63.4349))
    assert abs(np.degrees(perigee)) * 86400.0 < 1e-5
    node, perigee, _ = drift_rates_rad_s(KeplerOrbit(EPOCH, 6778.137, 0.0, 51.6))
    assert np.degrees(node) * 86400.0 == pytest.approx(-5.0, abs=0.05)


@pytest.mark.parametrize(("method", "degree"), [("hermite", 5), ("lagrange", 4), ("linear", 1)])
def test_polynomials_of_the_degree_come_back(method, degree):
    rng = np.random.default_rng(3)
    time = np.cumsum(rng.uniform(0.5, 2.0, 12))
    polynomials = [np.polynomial.Polynomial(rng.normal(size=degree + 1)) for _ in range(3)]
    place = np.stack([p(time) for p in polynomials], axis=1)
    speed = np.stack([p.deriv()(time) for p in polynomials], axis=1)
    at = np.linspace(time[0], time[-1], 101)
    for velocity in (speed, None) if method != "hermite" else (speed,):
        found, slope = interpolate(time, place, velocity, at, method=method, degree=degree)
        for k, p in enumerate(polynomials):
            np.testing.assert_allclose(found[k], p(at), rtol=1e-8, atol=1e-6)
            if method != "linear" or velocity is None:
                np.testing.assert_allclose(slope[k], p.deriv()(at), rtol=1e-7, atol=1e-5)


@pytest.mark.parametrize(("method", "degree"), [("hermite", 4), ("hermite", 1), ("linear", 2),
                                                ("lagrange", 0), ("lagrange", 32)])  # fmt: skip
def test_degrees_that_do_not_exist(method, degree):
    with pytest.raises(ValueError, match="must be"):
        rows_needed(method, degree)


def test_irregular_steps_are_no_gaps():
    fine = np.concatenate((np.arange(0, 600, 60), np.arange(600, 660, 1), np.arange(660, 1200, 60)))
    check_times(fine.astype("datetime64[s]").astype("datetime64[ns]"), None, None)
    growing = np.cumsum(1.3 ** np.arange(30) * 1e9).astype("datetime64[ns]")
    check_times(growing, None, None)
    halved = np.concatenate((np.arange(0, 600, 60), np.arange(600, 1200, 120)))
    check_times(halved.astype("datetime64[s]").astype("datetime64[ns]"), None, None)


def test_positions_that_no_spacecraft_has():
    tai = tai_from_utc(EPOCH) + (np.arange(20) * 60).astype("timedelta64[s]")
    place, speed = GEO.position_velocity(np.arange(20) * 60.0)
    for factor, problem in ((0.1, "inside the Earth"), (1e3, "beyond the Lagrange points")):
        with pytest.raises(EnvironmentDataError, match=problem):
            sampled_trajectory([Segment(tai, place.T * factor, speed.T)], "x", file="f")
    with pytest.raises(EnvironmentDataError, match="no states"):
        sampled_trajectory([], "x")


def test_errors_name_their_place_also_below_a_key():
    error = EnvironmentDataError("is odd", key=("a",), value=1, file="f.csv", line=3)
    assert str(error) == "f.csv:3: a = 1 is odd"
    assert str(error.below("orbit")) == "f.csv:3: orbit.a = 1 is odd"
    assert str(EnvironmentDataError("is odd", line=3)) == "line 3: is odd"


@pytest.mark.parametrize("jump_m", [5e3, -50e3])
@pytest.mark.parametrize("rows", [slice(40, 41), slice(60, None)])
def test_a_row_that_jumps_against_its_velocities_is_refused(jump_m, rows):
    """One outlier or a step from one row on: the median of a gravity test cannot see it."""
    seconds = np.arange(100) * 60.0
    position, velocity = POLAR.position_velocity(seconds)
    tai = tai_from_utc(EPOCH) + (seconds * 1e9).astype("timedelta64[ns]")
    sampled_trajectory([Segment(tai, position.T, velocity.T)], "clean")
    bent = position.T.copy()
    bent[rows, 0] += jump_m
    row = rows.start + 1
    with pytest.raises(EnvironmentDataError, match=rf"jumps by .* row {row} of a segment"):
        sampled_trajectory([Segment(tai, bent, velocity.T)], "bent", file="bent.oem")


def test_thrust_of_some_metres_a_second_is_no_jump():
    seconds = np.arange(100) * 60.0
    position, velocity = POLAR.position_velocity(seconds)
    tai = tai_from_utc(EPOCH) + (seconds * 1e9).astype("timedelta64[ns]")
    burn = np.array([3.0, 0.0, 0.0])
    after = seconds > 3000.0
    position = position.T + np.where(after[:, None], (seconds - 3000.0)[:, None] * burn, 0.0)
    velocity = velocity.T + np.where(after[:, None], burn, 0.0)
    assert sampled_trajectory([Segment(tai, position, velocity)], "burn").span_s[1] == 5940.0
