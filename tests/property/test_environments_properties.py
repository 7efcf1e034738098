"""Laws that hold for any environment."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

from environments.attitude import incidence_cosine, nadir_axes, to_body, tracking_cosine
from environments.catalogue import read_plasma
from environments.eclipse import find_eclipses
from environments.errors import EnvironmentDataError
from environments.orbit import (
    EARTH_GM_M3_S2,
    EARTH_RADIUS_M,
    KeplerOrbit,
    eccentric_anomaly,
    position_velocity,
)
from environments.plasma import one_sided_maxwellian_current
from environments.spectrum import solar_spectrum
from environments.sun import ASTRONOMICAL_UNIT_M, SOLAR_RADIUS_M, illumination

angles = st.floats(0.0, 360.0)


@st.composite
def orbits(draw):
    perigee_km = draw(st.floats(6600.0, 45000.0))
    eccentricity = draw(st.floats(0.0, 0.95))
    return KeplerOrbit(
        np.datetime64("2029-05-01"),
        perigee_km / (1.0 - eccentricity),
        eccentricity,
        draw(st.floats(0.0, 180.0)),
        draw(angles),
        draw(angles),
        draw(angles),
    )


@given(orbits(), st.floats(-1e6, 1e6))
def test_velocity_is_the_derivative_of_position(orbit, second):
    step = 0.5
    t = second + step * np.array([-2.0, -1.0, 1.0, 2.0])
    p = position_velocity(orbit, t)[0]
    derivative = (p[:, 0] - 8.0 * p[:, 1] + 8.0 * p[:, 2] - p[:, 3]) / (12.0 * step)
    velocity = position_velocity(orbit, [second])[1][:, 0]
    # rounding: 1e-9 rad of phase over 1e6 s and 1e-16 of 1e9 m, divided by the step
    np.testing.assert_allclose(derivative, velocity, atol=2e-2)


@given(orbits(), st.floats(0.0, 1e6))
def test_radius_stays_between_perigee_and_apogee(orbit, second):
    radius = float(np.linalg.norm(position_velocity(orbit, [second])[0]))
    a, e = orbit.semi_major_axis_km * 1e3, orbit.eccentricity
    assert a * (1.0 - e) * (1.0 - 1e-9) <= radius <= a * (1.0 + e) * (1.0 + 1e-9)


@given(st.floats(-1e4, 1e4), st.floats(0.0, 0.9999999))
def test_kepler_residual(mean_anomaly, eccentricity):
    E = float(eccentric_anomaly(mean_anomaly, eccentricity))
    assert E - eccentricity * np.sin(E) == pytest.approx(mean_anomaly, abs=1e-11)


@settings(max_examples=60, deadline=None)
@given(
    radius_m=st.floats(6.6e6, 1e8),
    share=st.floats(0.0, 1.3),
    start=st.floats(-0.5, -0.3),
)
def test_eclipses_of_circles_against_the_closed_form(radius_m, share, start):
    """Contacts of a circle under a fixed Sun: cos(half-width) = cos(beta) cos(angle)."""
    rate = np.sqrt(EARTH_GM_M3_S2 / radius_m**3)
    half = {
        sign: np.arcsin(EARTH_RADIUS_M / radius_m)
        + sign * np.arcsin((SOLAR_RADIUS_M + sign * EARTH_RADIUS_M) / ASTRONOMICAL_UNIT_M)
        for sign in (1, -1)
    }
    beta = min(share * half[1], 1.5)

    def path(seconds):
        angle = rate * seconds
        return radius_m * np.stack(
            (-np.cos(angle) * np.cos(beta), -np.sin(angle), -np.cos(angle) * np.sin(beta))
        )

    def sun(seconds):
        return np.outer([ASTRONOMICAL_UNIT_M, 0.0, 0.0], np.ones(seconds.size))

    begin = 2.0 * np.pi * start / rate
    found = find_eclipses(path, sun, begin, begin + 2.0 * np.pi / rate)
    expected = {}
    for sign in (1, -1):
        ratio = np.cos(half[sign]) / np.cos(beta)
        if abs(ratio - 1.0) < 1e-12:
            return  # the closed form itself cannot tell
        expected[sign] = np.arccos(ratio) / rate if ratio < 1.0 else None
    if expected[1] is None:
        assert found == ()
        return
    (only,) = found
    # arccos near 1 loses digits: 1e-16 over the sine of the angle
    for sign, first, last in (
        (1, only.penumbra_start, only.penumbra_end),
        (-1, only.umbra_start, only.umbra_end),
    ):
        t = expected[sign]
        if t is None:
            assert (first, last) == (None, None)
        else:
            tolerance = 1e-6 + 1e-14 / np.sin(rate * t) / rate
            assert last == pytest.approx(t, abs=tolerance)
            assert first == pytest.approx(-t, abs=tolerance)
    if expected[-1] is None:
        assert only.umbra_s == 0.0


@given(
    st.floats(6.4e6, 5e9),
    st.floats(0.0, np.pi),
    st.integers(0, 2**31),
)
def test_illumination_is_a_share_and_knows_no_axes(radius_m, angle, seed):
    sun = np.array([ASTRONOMICAL_UNIT_M, 0.0, 0.0])
    position = radius_m * np.array([-np.cos(angle), np.sin(angle), 0.0])
    turn = Rotation.random(rng=np.random.default_rng(seed))
    share = illumination(position[:, None], sun[:, None], EARTH_RADIUS_M)[0]
    turned = illumination(turn.apply(position)[:, None], turn.apply(sun)[:, None], EARTH_RADIUS_M)[
        0
    ]
    assert 0.0 <= share <= 1.0
    # rounding of the angle, 1e-15, over the width of the disc
    assert turned == pytest.approx(share, abs=1e-9)


@given(
    st.floats(6.4e6, 5e9),
    st.floats(0.0, 3.0),
    st.floats(1e-7, 1e-4),
)
def test_illumination_grows_away_from_the_shadow(radius_m, angle, step):
    sun = np.array([[ASTRONOMICAL_UNIT_M], [0.0], [0.0]])
    both = np.array([angle, angle + step])
    position = radius_m * np.stack((-np.cos(both), np.sin(both), np.zeros(2)))
    near, far = illumination(position, sun, EARTH_RADIUS_M)
    assert far >= near - 1e-9


@given(orbits(), st.floats(0.0, 1e5), st.integers(0, 2**31))
def test_body_axes_keep_lengths_and_lit_sides_add_up(orbit, second, seed):
    axes = nadir_axes(*position_velocity(orbit, [second]))
    sun = Rotation.random(rng=np.random.default_rng(seed)).as_matrix()[:, :1]
    body = to_body(axes, sun)
    assert float(np.linalg.norm(body)) == pytest.approx(1.0, rel=1e-12)
    cosine = incidence_cosine(body, np.vstack((np.eye(3), -np.eye(3))))
    assert float(np.sum(cosine**2)) == pytest.approx(1.0, rel=1e-12)
    assert float(tracking_cosine(body)[0] ** 2 + body[1, 0] ** 2) == pytest.approx(1.0)


@given(st.floats(0.0, 1e12), st.floats(1e-2, 1e5), st.floats(1.0, 100.0))
def test_flux_is_linear_in_density_and_a_root_in_temperature(density, temperature, factor):
    one = float(one_sided_maxwellian_current(density, temperature))
    assert float(one_sided_maxwellian_current(factor * density, temperature)) == pytest.approx(
        factor * one, rel=1e-12
    )
    assert float(one_sided_maxwellian_current(density, factor**2 * temperature)) == pytest.approx(
        factor * one, rel=1e-12
    )


@given(st.floats(60.0, 380.0), st.floats(0.0, 10.0), st.floats(0.05, 30.0))
def test_spectrum_never_falls_with_activity(f107, more, distance):
    low = solar_spectrum(f107=f107, distance_au=distance).photon_flux_m2_s
    high = solar_spectrum(f107=f107 + more, distance_au=distance).photon_flux_m2_s
    assert (low > 0.0).all()
    assert (high >= low).all()


plain = st.none() | st.booleans() | st.integers() | st.floats() | st.text(max_size=20)
documents = st.recursive(
    plain,
    lambda inner: (
        st.lists(inner, max_size=3)
        | st.dictionaries(
            st.sampled_from(
                ["title", "source", "population", "species", "law", "density_m3", "temperature_eV"]
            )
            | st.text(max_size=5),
            inner,
            max_size=6,
        )
    ),
    max_leaves=20,
)


@given(documents)
def test_reader_refuses_junk_with_one_kind_of_error_on_one_line(document):
    message = ""
    try:
        read_plasma(document)
    except EnvironmentDataError as error:
        message = str(error)
    assert "\n" not in message
