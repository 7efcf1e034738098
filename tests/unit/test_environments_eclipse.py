"""Eclipses: edges against the disc overlap, closed forms, grazing and odd windows."""

import numpy as np
import pytest

from environments.eclipse import find_eclipses
from environments.orbit import EARTH_GM_M3_S2, EARTH_RADIUS_M, KeplerOrbit, position_velocity
from environments.sun import ASTRONOMICAL_UNIT_M, SOLAR_RADIUS_M, illumination, sun_path

EPOCH = np.datetime64("2031-03-20T00:00:00")
ORBITS = {
    "geostationary": KeplerOrbit(EPOCH, 42164.17, 0.0002, 0.05),
    "low": KeplerOrbit(EPOCH, 6778.137, 0.0005, 51.6, 120.0),
    "sun-synchronous": KeplerOrbit(EPOCH, 7178.137, 0.001, 98.6, 60.0),
    "eccentric": KeplerOrbit(EPOCH, 24400.0, 0.73, 7.0, 100.0, 180.0),
    "high": KeplerOrbit(EPOCH, 26560.0, 0.74, 63.4, 30.0, 270.0),
}
FIXED_SUN = np.array([[ASTRONOMICAL_UNIT_M], [0.0], [0.0]])


def path_of(orbit):
    return lambda t: position_velocity(orbit, t)[0]


def fixed_sun(seconds):
    return np.broadcast_to(FIXED_SUN, (3, seconds.size))


def circle(radius_m, beta):
    """Circular path under a fixed Sun on +x, midnight at t = 0; angle = rate t."""
    rate = np.sqrt(EARTH_GM_M3_S2 / radius_m**3)

    def path(seconds):
        angle = rate * seconds
        x = -radius_m * np.cos(angle) * np.cos(beta)
        return np.stack((x, -radius_m * np.sin(angle), -radius_m * np.cos(angle) * np.sin(beta)))

    return path, rate


def cone_half_width(radius_m, sign):
    """Angle from the shadow's axis at which a circle of that radius meets a cone [rad].

    Cone: r sin(psi -+ alpha) = R with sin(alpha) = (R_sun +- R)/D; + penumbra, - umbra.
    """
    alpha = np.arcsin((SOLAR_RADIUS_M + sign * EARTH_RADIUS_M) / ASTRONOMICAL_UNIT_M)
    return np.arcsin(EARTH_RADIUS_M / radius_m) + sign * alpha


def share(orbit, seconds):
    seconds = np.asarray(seconds)
    return illumination(path_of(orbit)(seconds), sun_path(EPOCH)(seconds), EARTH_RADIUS_M)


@pytest.mark.parametrize("name", ORBITS)
def test_edges_are_where_the_disc_is_touched(name):
    """Within 0.1 s of each contact the illumination changes from or to exactly 1 or 0."""
    orbit = ORBITS[name]
    found = find_eclipses(path_of(orbit), sun_path(EPOCH), 0.0, 86400.0)
    assert found
    for eclipse in found:
        for contact, outwards in ((eclipse.penumbra_start, -1), (eclipse.penumbra_end, 1)):
            if contact is not None:
                outside, inside = share(orbit, [contact + outwards * 0.1, contact - outwards * 0.1])
                assert outside == 1.0
                assert inside < 1.0
        for contact, outwards in ((eclipse.umbra_start, -1), (eclipse.umbra_end, 1)):
            if contact is not None:
                outside, inside = share(orbit, [contact + outwards * 0.1, contact - outwards * 0.1])
                assert outside > 0.0
                assert inside == 0.0


@pytest.mark.parametrize("name", ORBITS)
def test_none_missed_and_none_invented(name):
    """Every second of a day is dark exactly when an eclipse says so."""
    orbit = ORBITS[name]
    seconds = np.arange(0.0, 86400.0, 1.0)
    lit = share(orbit, seconds)
    found = find_eclipses(path_of(orbit), sun_path(EPOCH), 0.0, 86400.0)
    dim = np.zeros(seconds.size, bool)
    dark = np.zeros(seconds.size, bool)
    for one in found:
        begin = 0.0 if one.penumbra_start is None else one.penumbra_start
        end = 86400.0 if one.penumbra_end is None else one.penumbra_end
        dim |= (seconds >= begin) & (seconds < end)
        if one.umbra_s > 0.0:
            begin = 0.0 if one.umbra_start is None else one.umbra_start
            end = 86400.0 if one.umbra_end is None else one.umbra_end
            dark |= (seconds >= begin) & (seconds < end)
            assert one.umbra_s == pytest.approx(end - begin, abs=1e-9)
    np.testing.assert_array_equal(dim, lit < 1.0)
    np.testing.assert_array_equal(dark, lit == 0.0)


@pytest.mark.parametrize("shift_s", [0.0, 0.37, 17.0, 149.99, 211.7])
def test_result_does_not_hang_on_where_the_search_samples(shift_s):
    orbit = ORBITS["low"]
    reference = find_eclipses(path_of(orbit), sun_path(EPOCH), 0.0, 86400.0)
    shifted = find_eclipses(path_of(orbit), sun_path(EPOCH), shift_s, 86400.0 + 3.0 * shift_s)
    starts = [x.penumbra_start for x in reference if x.penumbra_start and x.penumbra_start > 300.0]
    again = [x.penumbra_start for x in shifted if x.penumbra_start and x.penumbra_start > 300.0]
    assert again[: len(starts)] == pytest.approx(starts, abs=1e-6)


@pytest.mark.parametrize("radius_m", [6.778137e6, 4.216417e7])
@pytest.mark.parametrize("inside", [1e-3, 1e-5, 1e-7, 1e-9])
def test_grazing_passages_are_found(radius_m, inside):
    """The plane cuts the penumbra by a sliver; the closed form says how long."""
    half = cone_half_width(radius_m, +1)
    beta = half - inside
    path, rate = circle(radius_m, beta)
    period = 2.0 * np.pi / rate
    found = find_eclipses(path, fixed_sun, -0.4 * period, 0.45 * period)
    assert len(found) == 1
    # cos(half) = cos(beta) cos(angle) at the contacts; difference form of the cosine
    sine2 = np.sin(inside / 2.0) * np.sin(half - inside / 2.0) / np.cos(beta)
    contact = 2.0 * np.arcsin(np.sqrt(sine2)) / rate
    # the sliver 1e-9 rad deep is known to 1e-16/1e-9 only
    assert found[0].penumbra_end == pytest.approx(contact, rel=1e-6)
    assert found[0].penumbra_start == pytest.approx(-contact, rel=1e-6)
    assert (found[0].umbra_s == 0.0) == (inside < half - cone_half_width(radius_m, -1))
    # an umbra that is only grazed within a full penumbra, too
    path, _ = circle(radius_m, cone_half_width(radius_m, -1) - inside)
    assert find_eclipses(path, fixed_sun, -0.4 * period, 0.45 * period)[0].umbra_s > 0.0


@pytest.mark.parametrize("radius_m", [6.778137e6, 4.216417e7])
@pytest.mark.parametrize("outside", [1e-9, 1e-6])
def test_near_misses_are_none(radius_m, outside):
    path, rate = circle(radius_m, cone_half_width(radius_m, +1) + outside)
    assert find_eclipses(path, fixed_sun, 0.0, 2.0 * np.pi / rate) == ()
    path, _ = circle(radius_m, cone_half_width(radius_m, -1) + outside)
    (only,) = find_eclipses(path, fixed_sun, -3000.0, 3000.0)
    assert (only.umbra_start, only.umbra_end, only.umbra_s) == (None, None, 0.0)


def test_windows_that_cut_an_eclipse():
    path, rate = circle(4.216417e7, 0.0)
    penumbra = cone_half_width(4.216417e7, +1) / rate
    umbra = cone_half_width(4.216417e7, -1) / rate
    (cut,) = find_eclipses(path, fixed_sun, 0.0, 7000.0)
    assert cut.penumbra_start is None
    assert cut.umbra_start is None
    assert cut.umbra_end == pytest.approx(umbra, abs=1e-4)
    assert cut.umbra_s == pytest.approx(umbra, abs=1e-4)
    assert cut.penumbra_end == pytest.approx(penumbra, abs=1e-4)
    (deep,) = find_eclipses(path, fixed_sun, -100.0, 100.0)
    assert (deep.penumbra_start, deep.umbra_start, deep.umbra_end, deep.penumbra_end) == (None,) * 4
    assert deep.umbra_s == 200.0
    (late,) = find_eclipses(path, fixed_sun, -7000.0, -umbra - 10.0)
    assert late.penumbra_start == pytest.approx(-penumbra, abs=1e-4)
    assert (late.umbra_start, late.umbra_s, late.penumbra_end) == (None, 0.0, None)
    assert find_eclipses(path, fixed_sun, 7000.0, 9000.0) == ()


def test_absorbing_height_lengthens_the_umbra():
    path, rate = circle(6.778137e6, 0.0)
    period = 2.0 * np.pi / rate
    (bare,) = find_eclipses(path, fixed_sun, -0.5 * period, 0.5 * period)
    (more,) = find_eclipses(
        path, fixed_sun, -0.5 * period, 0.5 * period, body_radius_m=EARTH_RADIUS_M + 150e3
    )
    extra = np.arcsin((EARTH_RADIUS_M + 150e3) / 6.778137e6) - np.arcsin(
        EARTH_RADIUS_M / 6.778137e6
    )
    assert more.umbra_s - bare.umbra_s == pytest.approx(2.0 * extra / rate, rel=1e-3)


def test_refusals():
    path, _ = circle(4.216417e7, 0.0)
    with pytest.raises(ValueError, match="start_s < end_s"):
        find_eclipses(path, fixed_sun, 1.0, 1.0)
    with pytest.raises(ValueError, match="through the body"):
        find_eclipses(lambda t: 0.1 * path(t), fixed_sun, 0.0, 1000.0)
    with pytest.raises(ValueError, match="faster than"):
        find_eclipses(lambda t: path(100.0 * t), fixed_sun, 0.0, 1000.0)
    # the same path with its speed declared: 100 times as fast
    (fast,) = find_eclipses(
        lambda t: path(100.0 * t), fixed_sun, -100.0, 100.0, speed_limit_m_s=4e5
    )
    (slow,) = find_eclipses(path, fixed_sun, -1e4, 1e4)
    assert 100.0 * fast.umbra_s == pytest.approx(slow.umbra_s, abs=1e-4)
