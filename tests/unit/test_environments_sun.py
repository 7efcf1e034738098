"""Illumination of a spacecraft against an exact integral, and the Sun's geometry."""

import mpmath
import numpy as np
import pytest
from scipy.integrate import quad

from environments.orbit import EARTH_RADIUS_M
from environments.sun import (
    ASTRONOMICAL_UNIT_M,
    SOLAR_RADIUS_M,
    _segment,
    beta_angle_deg,
    distance_au,
    illumination,
    sun_path,
    sun_position_m,
)


def free_share_by_rings(a, b, c):
    """Share of the solar disc outside a cap of radius b, by rings on the sphere.

    A ring of angular radius p about the Sun's centre is covered where
    cos(b) < cos(c) cos(p) + sin(c) sin(p) cos(azimuth).
    """

    def covered(p):
        if np.sin(c) * np.sin(p) == 0.0:
            return float(abs(c - p) < b)
        cosine = (np.cos(b) - np.cos(c) * np.cos(p)) / (np.sin(c) * np.sin(p))
        return np.arccos(np.clip(cosine, -1.0, 1.0)) / np.pi

    kink = min(max(abs(c - b), 0.0), a)
    area = sum(
        quad(lambda p: covered(p) * np.sin(p), low, high, limit=200)[0]
        for low, high in ((0.0, kink), (kink, a))
        if high > low
    )
    return 1.0 - area / (1.0 - np.cos(a))


def place(radius_m, angle):
    """Position whose body centre is seen `angle` from the Sun's centre, Sun far on +x."""
    return np.array([[-radius_m * np.cos(angle)], [radius_m * np.sin(angle)], [0.0]])


@pytest.mark.parametrize(
    "radius_m", [6.4e6, 6.778e6, 4.2164e7, 3.8e8, 2.0e9], ids=lambda r: f"{r / 1e3:.0f} km"
)
@pytest.mark.parametrize("step", [-0.98, -0.7, -0.2, 0.0, 0.3, 0.6, 0.95])
def test_share_against_rings_on_the_sphere(radius_m, step):
    sun = np.array([[ASTRONOMICAL_UNIT_M], [0.0], [0.0]])
    b = np.arcsin(EARTH_RADIUS_M / radius_m)
    a = SOLAR_RADIUS_M / ASTRONOMICAL_UNIT_M
    position = place(radius_m, max(b, a) + step * min(a, b))
    to_sun = (sun - position)[:, 0]
    a = np.arcsin(SOLAR_RADIUS_M / np.linalg.norm(to_sun))
    c = np.arccos(to_sun @ -position[:, 0] / np.linalg.norm(to_sun) / radius_m)
    ours = illumination(position, sun, EARTH_RADIUS_M)[0]
    # a^2 = 2e-5: the disc is flat in ours, curved on the sphere
    assert ours == pytest.approx(free_share_by_rings(a, b, c), abs=3e-5)


def test_ring_at_the_tip_of_the_shadow():
    sun = np.array([[ASTRONOMICAL_UNIT_M], [0.0], [0.0]])
    behind = np.array([[-2e9], [0.0], [0.0]])
    a = SOLAR_RADIUS_M / (ASTRONOMICAL_UNIT_M + 2e9)
    b = EARTH_RADIUS_M / 2e9
    assert illumination(behind, sun, EARTH_RADIUS_M)[0] == pytest.approx(1 - (b / a) ** 2, rel=1e-4)


def test_continuous_through_every_contact():
    sun = np.array([[ASTRONOMICAL_UNIT_M], [0.0], [0.0]])
    for radius in (6.6e6, 4.2164e7, 1.0e9, 2.0e9):
        angle = np.linspace(0.0, 1.6, 400001)
        # steps of 4e-6 rad, a two-thousandth of the disc's width
        position = np.stack((-radius * np.cos(angle), radius * np.sin(angle), np.zeros_like(angle)))
        share = illumination(position, sun, EARTH_RADIUS_M)
        assert share.min() >= 0.0
        assert share.max() == 1.0
        assert np.abs(np.diff(share)).max() < 2e-3
        assert (np.diff(share) >= -1e-12).all()


@pytest.mark.parametrize("half_angle", [1e-12, 1e-5, 0.01, 0.049999, 0.050001, 1.0, np.pi])
def test_segment_area_keeps_its_digits(half_angle):
    with mpmath.workdps(40):
        p = mpmath.mpf(half_angle)
        expected = float(p - mpmath.sin(p) * mpmath.cos(p))
    assert _segment(np.array([half_angle]))[0] == pytest.approx(expected, rel=1e-12)


def test_half_the_sun_at_the_limb():
    sun = np.array([[ASTRONOMICAL_UNIT_M], [0.0], [0.0]])
    # Sun's centre on the limb: a little less than half is covered, as the limb is curved
    radius = 4.2164e7
    b = np.arcsin(EARTH_RADIUS_M / radius)
    # parallax of the Sun: aim so that the limb passes the Sun's centre seen from there
    angle = b
    for _ in range(3):
        p = place(radius, angle)
        to_sun = (sun - p)[:, 0]
        angle += b - np.arccos(to_sun @ -p[:, 0] / np.linalg.norm(to_sun) / radius)
    share = illumination(place(radius, angle), sun, EARTH_RADIUS_M)[0]
    assert 0.5 < share < 0.51


def test_illumination_refuses():
    sun = np.array([[ASTRONOMICAL_UNIT_M], [0.0], [0.0]])
    with pytest.raises(ValueError, match="inside the body"):
        illumination([[1e6], [0.0], [0.0]], sun, EARTH_RADIUS_M)
    with pytest.raises(ValueError, match="inside the Sun"):
        illumination(sun, sun, EARTH_RADIUS_M)
    with pytest.raises(ValueError, match="body_radius_m"):
        illumination([[7e6], [0.0], [0.0]], sun, 0.0)
    with pytest.raises(ValueError, match="position_m"):
        illumination([7e6, 0.0, 0.0], sun, EARTH_RADIUS_M)


def test_beta_angle_has_the_sign_of_the_orbit_normal():
    position, velocity = [[7e6], [0.0], [0.0]], [[0.0], [7.5e3], [0.0]]
    up = [[0.0], [np.cos(0.3) * 1.5e11], [np.sin(0.3) * 1.5e11]]
    assert beta_angle_deg(position, velocity, up)[0] == pytest.approx(np.degrees(0.3))
    backwards = [[0.0], [-7.5e3], [0.0]]
    assert beta_angle_deg(position, backwards, up)[0] == pytest.approx(-np.degrees(0.3))


def test_sun_path_counts_from_its_epoch():
    epoch = np.datetime64("2031-03-20T06:00:00")
    times = np.array(["2031-03-20T06:00:00", "2031-03-20T07:00:00.5"], "datetime64[ns]")
    np.testing.assert_allclose(
        sun_path(epoch)(np.array([0.0, 3600.5])), sun_position_m(times), rtol=1e-13
    )


def test_distance_at_perihelion_and_aphelion():
    # 0.9833 and 1.0167 AU: 1 -+ eccentricity 0.0167 of the Earth's orbit
    times = np.array(["2029-01-03", "2029-07-05"], "datetime64[ns]")
    np.testing.assert_allclose(distance_au(sun_position_m(times)), [0.9833, 1.0167], atol=2e-4)


@pytest.mark.parametrize(
    "times", [np.datetime64("2031-01-01"), [1.0], np.array(["NaT"], "datetime64[ns]")]
)
def test_sun_position_refuses(times):
    with pytest.raises(ValueError, match="times"):
        sun_position_m(times)
