"""Kepler orbit, Kepler's equation, and what is refused."""

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from environments.errors import EnvironmentDataError
from environments.orbit import (
    EARTH_GM_M3_S2,
    EARTH_J2,
    EARTH_RADIUS_M,
    KeplerOrbit,
    drift_rates_rad_s,
    eccentric_anomaly,
    period_s,
    position_velocity,
)

EPOCH = np.datetime64("2031-03-20T00:00:00")


@pytest.mark.parametrize("eccentricity", [0.0, 0.1, 0.73, 0.99, 0.999999])
def test_keplers_equation(eccentricity):
    M = np.concatenate((np.linspace(-20.0, 20.0, 4001), [0.0, np.pi, 1e-8, -1e-12]))
    E = eccentric_anomaly(M, eccentricity)
    np.testing.assert_allclose(E - eccentricity * np.sin(E), M, rtol=0.0, atol=2e-14)
    assert (np.abs(E - M) <= eccentricity + 1e-14).all()


def test_shape_of_the_orbit():
    orbit = KeplerOrbit(EPOCH, 24400.0, 0.72, 7.0, 30.0, 60.0, 0.0)
    position, velocity = position_velocity(orbit, [0.0, 0.5 * period_s(orbit)])
    radius, speed = np.linalg.norm(position, axis=0), np.linalg.norm(velocity, axis=0)
    assert radius[0] == pytest.approx(24.4e6 * 0.28, rel=1e-12)
    assert radius[1] == pytest.approx(24.4e6 * 1.72, rel=1e-6)  # drift moves apogee a little
    # vis-viva, but for the speed of the turning orbit itself, rate times radius
    expected = np.sqrt(EARTH_GM_M3_S2 * (2.0 / radius - 1.0 / 24.4e6))
    node, perigee, anomaly = drift_rates_rad_s(orbit)
    turning = radius * (abs(node) + abs(perigee))
    faster = expected * abs(anomaly * period_s(orbit) / (2.0 * np.pi) - 1.0)
    assert (np.abs(speed - expected) <= turning + faster).all()
    assert (turning + faster < 15.0).all()
    # perigee at the node + 60 deg: latitude asin(sin 7 sin 60)
    latitude = np.degrees(np.arcsin(position[2, 0] / radius[0]))
    assert latitude == pytest.approx(
        np.degrees(np.arcsin(np.sin(np.radians(7.0)) * np.sin(np.radians(60.0)))), rel=1e-12
    )


def test_sense_of_motion_and_node():
    orbit = KeplerOrbit(EPOCH, 7000.0, 0.0, 50.0, 40.0, 0.0, 0.0)
    position, velocity = position_velocity(orbit, [0.0])
    assert np.degrees(np.arctan2(position[1, 0], position[0, 0])) == pytest.approx(40.0)
    assert velocity[2, 0] > 0.0  # northbound at the ascending node
    normal = np.cross(position[:, 0], velocity[:, 0])
    tilt = np.degrees(np.arccos(normal[2] / np.linalg.norm(normal)))
    assert tilt == pytest.approx(50.0, abs=0.05)


@pytest.mark.parametrize(
    ("a_km", "eccentricity", "inclination"),
    [(6978.137, 0.001, 51.6), (7178.137, 0.001, 98.6), (12000.0, 0.3, 30.0)],
)
def test_drift_against_integrated_motion(a_km, eccentricity, inclination):
    """Node and perigee-plus-anomaly of a path integrated in the field with J2."""
    orbit = KeplerOrbit(EPOCH, a_km, eccentricity, inclination, 20.0, 50.0, 10.0)

    def pull(_, state):
        r = state[:3]
        d = np.sqrt(r @ r)
        k = 1.5 * EARTH_J2 * EARTH_GM_M3_S2 * EARTH_RADIUS_M**2 / d**5
        s = 5.0 * (r[2] / d) ** 2
        extra = -k * r * np.array([1.0 - s, 1.0 - s, 3.0 - s])
        return np.concatenate((state[3:], -EARTH_GM_M3_S2 * r / d**3 + extra))

    position, velocity = position_velocity(orbit, [0.0])
    revolutions = 20
    end = revolutions * period_s(orbit)
    path = solve_ivp(
        pull,
        (0.0, end),
        np.concatenate((position[:, 0], velocity[:, 0])),
        method="DOP853",
        rtol=1e-10,
        atol=1e-3,
        t_eval=np.linspace(0.0, end, revolutions * 120 + 1),
    )
    normal = np.cross(path.y[:3], path.y[3:], axis=0)
    node = np.unwrap(np.arctan2(normal[0], -normal[1]))
    # means over the first and the last revolution take the short periods out
    slope = (node[-120:].mean() - node[:120].mean()) / (end - end / revolutions)
    # first order in J2, start elements osculating instead of mean: half a percent
    assert slope == pytest.approx(drift_rates_rad_s(orbit)[0], rel=1e-2)


def test_retrograde_equator_and_polar_rates():
    polar = KeplerOrbit(EPOCH, 7000.0, 0.0, 90.0)
    assert drift_rates_rad_s(polar)[0] == pytest.approx(0.0, abs=1e-20)
    frozen = KeplerOrbit(EPOCH, 26560.0, 0.74, float(np.degrees(np.arcsin(np.sqrt(0.8)))))
    assert drift_rates_rad_s(frozen)[1] == pytest.approx(0.0, abs=1e-18)  # critical inclination


def test_epoch_is_kept_in_nanoseconds():
    assert KeplerOrbit(np.datetime64("2031-03-20"), 7000.0, 0.0, 0.0).epoch.dtype == "M8[ns]"


@pytest.mark.parametrize(
    ("key", "value"),
    [
        ("eccentricity", 1.0),
        ("eccentricity", -0.1),
        ("eccentricity", float("nan")),
        ("inclination_deg", 181.0),
        ("inclination_deg", -1.0),
        ("semi_major_axis_km", 6378.0),
        ("semi_major_axis_km", -7000.0),
        ("semi_major_axis_km", float("inf")),
        ("raan_deg", float("inf")),
        ("mean_anomaly_deg", float("nan")),
        ("epoch", np.datetime64("NaT")),
    ],
)
def test_refuses(key, value):
    good = {"epoch": EPOCH, "semi_major_axis_km": 7000.0, "eccentricity": 0.0}
    with pytest.raises(EnvironmentDataError) as caught:
        KeplerOrbit(**{**good, "inclination_deg": 10.0, key: value})
    assert caught.value.key == (key,)


def test_refuses_a_perigee_below_ground():
    with pytest.raises(EnvironmentDataError, match="perigee below ground"):
        KeplerOrbit(EPOCH, 24400.0, 0.74, 7.0)


@pytest.mark.parametrize("seconds", [0.0, [[0.0]], [np.nan]])
def test_refuses_times(seconds):
    with pytest.raises(ValueError, match="seconds"):
        position_velocity(KeplerOrbit(EPOCH, 7000.0, 0.0, 0.0), seconds)
