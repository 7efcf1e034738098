"""Ram and wake currents against integrals and closed forms written apart."""

import mpmath
import numpy as np
import pytest
from scipy.constants import e
from scipy.special import erf

from charging.currents.collection import plane_factor, sphere_factor
from charging.currents.flow import (
    drifting_flux,
    flow_current,
    plane_limit,
    thick_limit,
    wake_assessable,
)
from charging.currents.focus import focused_flux
from charging.currents.focus_table import focus_table
from environments.species import HYDROGEN_ION, OXYGEN_ION
from environments.thermal_flux import one_sided_maxwellian_current

O_KG, H_KG = OXYGEN_ION.mass_kg, HYDROGEN_ION.mass_kg


def _arriving(potential, temperature, mass, speed, cosine):
    """Flux per unit density of those whose normal energy suffices, by mpmath."""
    mpmath.mp.dps = 30
    w = mpmath.sqrt(2 * mpmath.mpf(e) * temperature / mpmath.mpf(mass))
    drift = mpmath.mpf(speed) * cosine
    least = mpmath.sqrt(max(potential, 0) * 2 * mpmath.mpf(e) / mpmath.mpf(mass))

    def integrand(v):
        return v * mpmath.exp(-(((v - drift) / w) ** 2)) / (w * mpmath.sqrt(mpmath.pi))

    top = max(drift, least) + 14 * w
    edges = sorted({least, max(least, drift), least + w, least + 4 * w, top})
    return mpmath.quad(integrand, edges)


@pytest.mark.parametrize("potential", [-300.0, 0.0, 0.4, 3.0, 9.0])
@pytest.mark.parametrize(("mass", "temperature"), [(O_KG, 0.1), (H_KG, 0.2), (H_KG, 8.0)])
@pytest.mark.parametrize("cosine", [1.0, 0.2, 0.0, -0.6, -1.0])
def test_plane_against_quadrature(potential, mass, temperature, cosine):
    speed = 7500.0
    found = plane_limit(potential, 1e10, temperature, mass, 1, speed, cosine)
    exact = e * 1e10 * _arriving(potential, temperature, mass, speed, cosine)
    assert float(found.current_A_m2) == pytest.approx(float(exact), rel=1e-10)
    if potential > 0.0:
        h = 1e-8
        rise = _arriving(potential + h, temperature, mass, speed, cosine) - _arriving(
            potential - h, temperature, mass, speed, cosine
        )
        assert float(found.slope_A_m2_V) == pytest.approx(
            float(e * 1e10 * rise / (2 * h)), rel=1e-7
        )


def test_at_rest_the_fluxes_are_those_of_collection():
    potential = np.array([-500.0, -3.0, 0.0, 0.3])
    random = one_sided_maxwellian_current(1e10, 0.1, mass_kg=O_KG, charge_number=1)
    u = np.maximum(-potential / 0.1, 0.0)
    held = np.exp(-np.maximum(potential / 0.1, 0.0))
    where = (potential, 1e10, 0.1, O_KG, 1, 0.0, -0.3)
    np.testing.assert_allclose(
        plane_limit(*where).current_A_m2, random * plane_factor(u) * held, rtol=1e-12
    )
    np.testing.assert_allclose(
        thick_limit(*where).current_A_m2, random * sphere_factor(u) * held, rtol=1e-9
    )


def test_fast_ions_bring_n_u_cos():
    """Drifting plate for S >> 1: n u cos(theta) (kinetic theory)."""
    angle = np.radians([0.0, 30.0, 60.0])
    found = plane_limit(-1.0, 1e10, 0.01, O_KG, 1, 7500.0, np.cos(angle)).current_A_m2
    np.testing.assert_allclose(found, e * 1e10 * 7500.0 * np.cos(angle), rtol=1e-6)


def test_ram_current_of_the_auroral_standard():
    """149.2 nA m-2 for 125 cm-3 O+ at 7450 m/s, derived from ECSS-E-ST-10-04C clause 8.2.3 b."""
    found = plane_limit(0.0, 125e6, 0.2, O_KG, 1, 7450.0, 1.0).current_A_m2
    assert float(found) * 1e9 == pytest.approx(149.2, abs=0.1)


def test_deep_wake_keeps_its_accuracy():
    """One-sided flux out of the far tail, 1/(2 S^2) exp(-S^2), by mpmath."""
    mpmath.mp.dps = 60
    for S in (-3.0, -10.0, -25.0):
        exact = mpmath.exp(-(S**2)) + mpmath.sqrt(mpmath.pi) * S * mpmath.erfc(-mpmath.mpf(S))
        assert float(drifting_flux(S)) == pytest.approx(float(exact), rel=1e-9)


@pytest.mark.parametrize(
    ("S", "u"), [(0.4, 3.0), (1.3, 2000.0), (5.0, 0.0), (5.0, 40.0), (8.0, 9e3)]
)
def test_average_over_the_sphere_is_orbit_limited(S, u):
    """Average of the orbit-limited current of a sphere in a drifting Maxwellian.

    <v> + (2 e phi/m)<1/v> of a drifting Maxwellian times n/4: Kanal 1962, Whipple 1981.
    """
    node, weight = np.polynomial.legendre.leggauss(64)
    flux, slope = focused_flux(S, node, u)
    mean = np.exp(-(S**2)) / np.sqrt(np.pi) + (S + 0.5 / S) * erf(S)
    exact = (mean + u * erf(S) / S) * np.sqrt(np.pi) / 2.0
    assert 0.5 * np.sum(flux * weight) == pytest.approx(exact, rel=1e-8)
    exact_slope = erf(S) / S * np.sqrt(np.pi) / 2.0
    assert 0.5 * np.sum(slope * weight) == pytest.approx(exact_slope, rel=1e-7)


def _before(normal, velocity, pull):
    """Velocity at infinity of orbits through the unit sphere, from the conserved vectors.

    Time reversed: the hyperbola leaves along its asymptote, found from energy, angular momentum
    and the eccentricity vector.
    """
    v = -velocity
    momentum = np.cross(normal, v)
    eccentric = np.cross(v, momentum) / pull - normal
    size = np.linalg.norm(eccentric, axis=-1, keepdims=True)
    speed = np.sqrt(np.sum(v**2, axis=-1, keepdims=True) - 2.0 * pull)
    first = eccentric / size
    h = np.linalg.norm(momentum, axis=-1, keepdims=True)
    second = np.cross(momentum / h, first)
    # true anomaly of the outgoing asymptote: cos = -1/e
    direction = -first / size + np.sqrt(1.0 - 1.0 / size**2) * second
    return -speed * direction


@pytest.mark.parametrize(("S", "mu", "u"), [(1.2, -1.0, 30.0), (2.0, -0.5, 4.0), (3.0, 0.7, 60.0)])
def test_focus_against_three_dimensional_sum(S, mu, u):
    """Liouville at the surface, midpoint sum over all arriving velocities (units of w)."""
    n = 96
    y = np.sqrt(u + (np.arange(n) + 0.5) / n * (S + 5.0) ** 2)
    dy2 = (S + 5.0) ** 2 / n
    c = (np.arange(n) + 0.5) / n
    azimuth = (np.arange(n) + 0.5) / n * 2.0 * np.pi
    Y, C, A = np.meshgrid(y, c, azimuth, indexing="ij")
    s = np.sqrt(1.0 - C**2)
    velocity = Y[..., None] * np.stack((s * np.cos(A), s * np.sin(A), -C), axis=-1)
    far = _before(np.array([0.0, 0.0, 1.0]), velocity, 0.5 * u)
    drift = S * np.array([np.sqrt(1.0 - mu**2), 0.0, -mu])
    f = np.exp(-np.sum((far - drift) ** 2, axis=-1)) / np.pi**1.5
    # c y f y^2 dy dc dA, dy = d(y^2)/(2y)
    total = np.sum(C * Y**2 * f) * 0.5 * dy2 / n * 2.0 * np.pi / n
    flux, _ = focused_flux(S, mu, u)
    assert float(flux) == pytest.approx(total * 2.0 * np.sqrt(np.pi), rel=3e-3)


def test_fast_beam_follows_the_hyperbola():
    """A cold beam: n u b db/(sin a da), b from the orbit that reaches the sphere at angle a."""
    S, u = 40.0, 3200.0
    angle = np.radians([5.0, 40.0, 90.0, 115.0])
    kappa = u / (2.0 * S**2)
    sine, cosine = np.sin(angle), np.cos(angle)
    root = np.sqrt(sine**2 + 4.0 * kappa * (1.0 - cosine))
    b = 0.5 * (sine + root)
    db = 0.5 * (cosine + (sine * cosine + 2.0 * kappa * sine) / root)
    flux, _ = focused_flux(S, cosine, u)
    np.testing.assert_allclose(flux / (2.0 * np.sqrt(np.pi) * S), b * db / sine, rtol=3e-3)
    # beyond the orbit that grazes, tan of half its turn = kappa-limited: nothing arrives
    eccentricity = np.sqrt(1.0 + (1.0 + 2.0 * kappa) / kappa**2)
    graze = np.pi - np.arccos(1.0 / eccentricity)
    assert focused_flux(S, np.cos(graze + 0.3), u)[0] < 1e-6 * flux.min()


def test_slope_by_potential_and_blend():
    S, mu = np.array([0.5, 1.3, 5.0]), np.array([-1.0, -0.4, 0.3])
    u, h = 20.0, 1e-4
    rise = (focused_flux(S, mu, u + h)[0] - focused_flux(S, mu, u - h)[0]) / (2.0 * h)
    np.testing.assert_allclose(focused_flux(S, mu, u)[1], rise, rtol=1e-5, atol=1e-12)

    def at(potential):
        weight = 1e-4 * potential**2
        return flow_current(
            potential, 1e9, 0.1, H_KG, 1, 7500.0, -0.8,
            thick_weight=weight, thick_weight_slope=2e-4 * potential,
        )  # fmt: skip

    step = 1e-4
    rise = (at(-7.0 + step).current_A_m2 - at(-7.0 - step).current_A_m2) / (2.0 * step)
    assert float(at(-7.0).slope_A_m2_V) == pytest.approx(float(rise), rel=1e-6)


def test_limits_meet_at_zero_and_members_stand_alone():
    mu = np.linspace(-1.0, 1.0, 9)
    where = (1e10, 0.1, np.array([[O_KG], [H_KG]]), 1, 7500.0, mu)
    plane, thick = plane_limit(-1e-9, *where), thick_limit(-1e-9, *where)
    np.testing.assert_allclose(thick.current_A_m2, plane.current_A_m2, rtol=1e-5, atol=1e-14)
    block = focused_flux(np.linspace(1.0, 5.0, 40), -0.5, 10.0)[0]
    assert float(focused_flux(np.linspace(1.0, 5.0, 40)[17], -0.5, 10.0)[0]) == block[17]


def test_table_follows_the_direct_path():
    table = focus_table([4.8, 1.2], [5.2, 1.4], [1e4, 1e4])
    rng = np.random.default_rng(3)
    S = np.stack((rng.uniform(4.8, 5.2, 200), rng.uniform(1.2, 1.4, 200)), axis=-1)
    mu = np.cos(rng.uniform(0.0, np.pi, (200, 2)))
    u = np.expm1(rng.uniform(0.0, np.log1p(1e4), (200, 2)))
    flux, slope = table.flux(S, mu, u)
    exact, exact_slope = focused_flux(S, mu, u)
    counts = exact > 1e-3
    error = (flux / exact - 1.0)[counts]
    assert np.sqrt(np.mean(error**2)) < 2e-3
    assert np.max(np.abs(error)) < 0.04
    h = 1e-5 * (1.0 + u)
    rise = (table.flux(S, mu, u + h)[0] - table.flux(S, mu, np.maximum(u - h, 0.0))[0]) / (
        u + h - np.maximum(u - h, 0.0)
    )
    smooth = np.abs(rise - slope) <= 1e-3 * np.abs(slope) + 1e-5 * flux
    assert np.mean(smooth) > 0.99
    assert np.all(np.isfinite(exact_slope))


def test_wake_of_oxygen_alone_is_not_assessable():
    mass, speed = [O_KG, H_KG], [5.0, 1.3]
    assert not wake_assessable([1e9, 0.0], mass, speed, -1.0)
    assert wake_assessable([1e9, 0.0], mass, speed, 0.5)
    assert wake_assessable([9e8, 1e8], mass, speed, -1.0)
