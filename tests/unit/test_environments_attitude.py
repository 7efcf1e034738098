"""Axes of a nadir-pointing body and the Sun on its faces."""

import numpy as np
import pytest

from environments.attitude import incidence_cosine, nadir_axes, to_body, tracking_cosine
from environments.orbit import KeplerOrbit, position_velocity
from environments.vectors import direction

GEO = KeplerOrbit(np.datetime64("2031-03-20"), 42164.17, 0.0, 0.0)
ELLIPSE = KeplerOrbit(np.datetime64("2031-03-20"), 24400.0, 0.7, 63.0, 10.0, 20.0, 30.0)


@pytest.mark.parametrize("orbit", [GEO, ELLIPSE])
def test_axes_are_right_handed_and_point_where_they_say(orbit):
    position, velocity = position_velocity(orbit, np.linspace(0.0, 80000.0, 37))
    x, y, z = nadir_axes(position, velocity)
    np.testing.assert_allclose(np.cross(x, y, axis=0), z, atol=1e-14)
    np.testing.assert_allclose(np.sum(x * y, axis=0), 0.0, atol=1e-14)
    np.testing.assert_allclose(z, -direction(position), atol=1e-15)
    assert (np.sum(x * velocity, axis=0) > 0.0).all()
    # velocity has no part along y: x lies in the orbit plane
    np.testing.assert_allclose(np.sum(y * direction(velocity), axis=0), 0.0, atol=1e-14)


def test_plus_y_is_south_on_a_prograde_equatorial_orbit():
    axes = nadir_axes(*position_velocity(GEO, np.array([0.0, 30000.0])))
    np.testing.assert_allclose(axes[1], [[0, 0], [0, 0], [-1, -1]], atol=1e-14)


def test_body_components_round_trip():
    axes = nadir_axes(*position_velocity(ELLIPSE, np.linspace(0.0, 1e4, 5)))
    sun = np.tile(direction([[0.3], [-0.5], [0.8]]), (1, 5))
    body = to_body(axes, sun)
    np.testing.assert_allclose(np.einsum("in,ijn->jn", body, axes), sun, atol=1e-14)


def test_sun_on_the_faces_of_a_cube_through_a_day():
    seconds = np.linspace(0.0, 86164.1, 97)
    position, velocity = position_velocity(GEO, seconds)
    sun = np.tile([[1.0], [0.0], [0.0]], (1, seconds.size))
    body = to_body(nadir_axes(position, velocity), sun)
    faces = np.vstack((np.eye(3), -np.eye(3)))
    cosine = incidence_cosine(body, faces)
    # start at noon: the Sun is at the zenith, on -z; six hours later on one of the x sides
    assert cosine[:, 0] == pytest.approx([0, 0, 0, 0, 0, 1], abs=1e-12)
    assert cosine[3, 24] == pytest.approx(1.0, abs=1e-3)
    np.testing.assert_allclose(cosine[[1, 4]], 0.0, atol=1e-12)  # north and south: grazing
    # squares of the lit faces add up to one
    np.testing.assert_allclose(np.sum(cosine**2, axis=0), 1.0, rtol=1e-12)
    np.testing.assert_allclose(tracking_cosine(body), 1.0, rtol=1e-12)


def test_normals_need_no_unit_length():
    sun = direction([[1.0], [2.0], [2.0]])
    np.testing.assert_allclose(incidence_cosine(sun, [[0, 0, 5.0]]), [[2.0 / 3.0]])


def test_tracking_wing():
    sun = direction([[0.3, 0.0], [0.4, 1.0], [0.5, 0.0]])
    np.testing.assert_allclose(tracking_cosine(sun), np.sqrt(1.0 - sun[1] ** 2), atol=1e-12)
    assert (tracking_cosine(sun, "back") == 0.0).all()
    with pytest.raises(ValueError, match='"front", "back"'):
        tracking_cosine(sun, "side")


def test_refusals():
    with pytest.raises(ValueError, match="orbit plane"):
        nadir_axes([[7e6], [0], [0]], [[1e3], [0], [0]])
    with pytest.raises(ValueError, match="same shape"):
        nadir_axes(np.ones((3, 2)), np.ones((3, 1)))
    with pytest.raises(ValueError, match="normals"):
        incidence_cosine([[1.0], [0.0], [0.0]], [1.0, 0.0, 0.0])
    with pytest.raises(ValueError, match="length zero"):
        incidence_cosine([[1.0], [0.0], [0.0]], [[0.0, 0.0, 0.0]])
    with pytest.raises(ValueError, match="sun_direction_body"):
        incidence_cosine([1.0, 0.0, 0.0], [[1.0, 0.0, 0.0]])
    with pytest.raises(ValueError, match="finite"):
        nadir_axes([[np.nan], [0], [0]], [[1e3], [0], [0]])
