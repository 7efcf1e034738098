"""Laws of photoemission that hold for every argument."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import brentq

from charging.currents.photo_escape import photo_escape, point_source_weight, sheath_of
from environments.rebin import rebin
from environments.spectrum import photon_flux, solar_spectrum
from materials import load_material, material_names
from materials.photo_laws import (
    fowler_dubridge,
    fowler_function,
    incidence_factor,
    law_yield,
)
from materials.photoemission import (
    GEOMETRIES,
    EscapeGeometry,
    LowEnergyPeak,
    collided_share,
    escape_fraction,
    escape_slope,
    escaping_weights,
    photo_current_density,
    yield_per_photon,
)
from materials.photoyield_reader import photoyield_from

EMITTING = [name for name in material_names() if load_material(name).photoyield is not None]
peaks = st.builds(
    LowEnergyPeak,
    st.sampled_from(["chung_everhart_1974", "maxwellian"]),
    st.floats(0.3, 10.0),
)
geometries = st.sampled_from(GEOMETRIES)
lights = st.lists(st.tuples(st.floats(4.81, 4000.0), st.floats(1e-3, 1e3)), min_size=1, max_size=8)
LAW_RECORD = {"source": "a law of the test", "basis": "assumed", "level": "as published"}


@given(name=st.sampled_from(EMITTING), factor=st.floats(1e-6, 1e6))
@settings(deadline=None)
def test_current_is_proportional_to_intensity(name: str, factor: float) -> None:
    curve, sun = load_material(name).photoyield, solar_spectrum()
    assert curve is not None
    one = photo_current_density(sun.photon_energy_eV, sun.photon_flux_m2_s, curve)
    many = photo_current_density(sun.photon_energy_eV, factor * sun.photon_flux_m2_s, curve)
    assert float(many) == pytest.approx(factor * float(one), rel=1e-12, abs=0.0)


@given(
    photon=st.floats(5.0, 3000.0),
    step=st.floats(0.01, 50.0),
    weight=st.floats(1e-9, 1e20),
    geometry=geometries,
    peak=peaks,
)
@settings(deadline=None)
def test_stopping_potential_is_linear_in_photon_energy_whatever_the_intensity(
    photon: float, step: float, weight: float, geometry: EscapeGeometry, peak: LowEnergyPeak
) -> None:
    # Lenard 1902, Einstein 1905: e V_stop = hv - threshold
    def stopping(energy: float) -> float:
        def still_escapes(v: float) -> float:
            left = escape_fraction(v, [energy], [weight], 4.8, geometry=geometry, peak=peak)
            return 1.0 if float(left) > 0.0 else -1.0

        return brentq(still_escapes, 0.0, 2.0 * energy, xtol=1e-12)

    v0, v1 = stopping(photon), stopping(photon + step)
    # the share vanishes as (1 - v)^(n + 2): it underflows within 1e-9 W of the end
    assert v0 == pytest.approx(photon - 4.8, rel=1e-6)
    assert v1 - v0 == pytest.approx(step, rel=1e-4, abs=1e-6 * photon)


@given(light=lights, geometry=geometries, peak=peaks)
@settings(deadline=None)
def test_escape_is_monotone_and_one_at_or_below_zero(
    light: list[tuple[float, float]], geometry: EscapeGeometry, peak: LowEnergyPeak
) -> None:
    photons, weights = np.array(light).T
    v = np.concatenate([[-1e5, -1e-9, 0.0], np.geomspace(1e-6, 5e3, 200)])
    share = escape_fraction(v, photons, weights, 4.8, geometry=geometry, peak=peak)
    assert share[:3].tolist() == [1.0, 1.0, 1.0]
    assert np.all(np.diff(share) <= 1e-12)
    assert np.all((share >= -1e-15) & (share <= 1.0 + 1e-12))
    assert np.all(escape_slope(v, photons, weights, 4.8, geometry=geometry, peak=peak) <= 1e-15)
    assert share[-1] == 0.0


@given(light=lights, geometry=geometries, peak=peaks, v=st.floats(0.01, 500.0))
@settings(deadline=None)
def test_slope_is_the_derivative(
    light: list[tuple[float, float]], geometry: EscapeGeometry, peak: LowEnergyPeak, v: float
) -> None:
    photons, weights = np.array(light).T
    h = 1e-3 * v
    # the curves bend at W of a photon; stay off those points
    if np.any(np.abs(photons - 4.8 - v) < 4.0 * h):
        return

    def curve(x: float) -> float:
        return float(escape_fraction(x, photons, weights, 4.8, geometry=geometry, peak=peak))

    # Richardson: error of order h^4
    numeric = (8.0 * (curve(v + h) - curve(v - h)) - (curve(v + 2 * h) - curve(v - 2 * h))) / (
        12.0 * h
    )
    slope = float(escape_slope(v, photons, weights, 4.8, geometry=geometry, peak=peak))
    assert slope == pytest.approx(numeric, rel=2e-5, abs=1e-11 / h)


@given(name=st.sampled_from(EMITTING), excess=st.floats(-1e-9, 1e-9))
@settings(deadline=None)
def test_nothing_but_numbers_at_the_threshold(name: str, excess: float) -> None:
    curve = load_material(name).photoyield
    assert curve is not None
    threshold = curve.threshold_eV
    emitted = yield_per_photon([threshold, threshold + excess], curve)
    assert np.all(np.isfinite(emitted))
    assert emitted[0] == 0.0
    assert np.all(yield_per_photon(np.linspace(0.0, threshold, 50), curve) == 0.0)
    if excess > 0.0 and threshold + excess > threshold:
        share = escape_fraction([0.0, 1e-12, 1.0], [threshold + excess], [1.0], threshold)
        assert np.all(np.isfinite(share))
        assert np.all(np.isfinite(collided_share(np.array([threshold + excess]), threshold)))


@given(
    energy=st.floats(0.0, 30.0),
    threshold=st.floats(2.0, 10.0),
    exponent=st.floats(1.0, 2.5),
    temperature=st.floats(1.0, 2000.0),
)
@settings(deadline=None)
def test_laws_are_zero_below_threshold_when_cold_and_close_to_that_when_warm(
    energy: float, threshold: float, exponent: float, temperature: float
) -> None:
    cold = float(law_yield(energy, threshold, 1e-4, exponent=exponent))
    assert cold == 0.0 if energy <= threshold else cold >= 0.0
    metal = {"threshold_eV": threshold, "electrons_per_photon_at_1_eV": 1e-4}
    still = float(fowler_dubridge(energy, **metal))
    warm = float(fowler_dubridge(energy, temperature_K=temperature, **metal))
    assert still == float(law_yield(energy, threshold, 1e-4, exponent=2.0))
    # Fowler: the warm metal emits more, by (pi kT)^2/3 far above the threshold
    kt = 8.617333262e-5 * temperature
    rise = 1e-4 * (np.pi * kt) ** 2 / 3.0
    assert still * (1.0 - 1e-12) <= warm <= (still + rise) * (1.0 + 1e-9)


@given(x=st.floats(-600.0, 600.0), step=st.floats(1e-6, 10.0))
@settings(deadline=None)
def test_fowler_function_rises_and_keeps_its_identity(x: float, step: float) -> None:
    low, high = fowler_function([x, x + step])
    assert 0.0 <= low <= high
    # dilogarithm: f(x) + f(-x) = pi^2/6 + x^2/2
    both = float(fowler_function(x) + fowler_function(-x))
    assert both == pytest.approx(np.pi**2 / 6.0 + 0.5 * x**2, rel=1e-13)


@given(cosine=st.floats(0.0, 1.0), growth=st.floats(1.0, 5.0))
@settings(deadline=None)
def test_angle_law_lies_between_the_cosine_and_the_cap(cosine: float, growth: float) -> None:
    factor = float(incidence_factor(cosine, largest_growth=growth))
    assert cosine <= factor <= min(1.0, growth * cosine) + 1e-15
    assert float(incidence_factor(1.0, largest_growth=growth)) == 1.0


@given(name=st.sampled_from(EMITTING), radius=st.floats(1e-3, 1e3), distance=st.floats(0.1, 30.0))
@settings(max_examples=40, deadline=None)
def test_blended_escape_is_monotone_between_its_limits(
    name: str, radius: float, distance: float
) -> None:
    material, sun = load_material(name), solar_spectrum(distance_au=distance)
    v = np.concatenate([[-1.0, 0.0], np.linspace(0.01, 60.0, 400), np.geomspace(61.0, 3e4, 60)])
    blend, plane, point = (
        photo_escape(v, material, sun, radius_m=radius, geometry=geometry)
        for geometry in ("auto", "planar", "point source")
    )
    assert blend[:2].tolist() == [1.0, 1.0]
    assert np.all(np.diff(blend) <= 1e-12)
    assert np.all((plane - 1e-12 <= blend) & (blend <= point + 1e-12))


@given(radius=st.floats(1e-3, 1e3), current=st.floats(1e-9, 1e-2), energy=st.floats(0.1, 20.0))
@settings(deadline=None)
def test_large_bodies_are_planes_and_small_ones_points(
    radius: float, current: float, energy: float
) -> None:
    sheath = sheath_of(current, energy)
    weight = point_source_weight(sheath, radius)
    assert 0.0 <= point_source_weight(sheath, 2.0 * radius) <= weight <= 1.0


@given(distance=st.floats(0.3, 10.0), name=st.sampled_from(EMITTING))
@settings(deadline=None)
def test_inverse_square_from_0p3_to_10_au(distance: float, name: str) -> None:
    curve = load_material(name).photoyield
    assert curve is not None
    near, far = solar_spectrum(), solar_spectrum(distance_au=distance)
    at_one = photo_current_density(near.photon_energy_eV, near.photon_flux_m2_s, curve)
    there = photo_current_density(far.photon_energy_eV, far.photon_flux_m2_s, curve)
    assert float(there) * distance**2 == pytest.approx(float(at_one), rel=1e-12, abs=0.0)


@given(
    edges=st.lists(st.floats(0.06, 399.0), min_size=0, max_size=12, unique=True),
    f107=st.floats(60.0, 300.0),
)
@settings(deadline=None)
def test_rebinning_keeps_photons_and_energy(edges: list[float], f107: float) -> None:
    sun = solar_spectrum(f107=f107)
    other = rebin(sun, [0.0, *sorted(edges), 401.0])
    assert other.photon_flux_m2_s.sum() == pytest.approx(sun.photon_flux_m2_s.sum(), rel=1e-12)
    energy = (sun.photon_flux_m2_s * sun.photon_energy_eV).sum()
    moved = (other.photon_flux_m2_s * other.photon_energy_eV).sum()
    assert moved == pytest.approx(energy, rel=1e-12)


@given(f107=st.lists(st.floats(50.0, 500.0), min_size=1, max_size=5))
@settings(deadline=None)
def test_many_activities_at_once_are_the_single_ones(f107: list[float]) -> None:
    together = photon_flux(f107)
    for activity, row in zip(f107, together, strict=True):
        np.testing.assert_array_equal(row, solar_spectrum(f107=activity).photon_flux_m2_s)


@given(
    threshold=st.floats(3.0, 10.0), exponent=st.floats(1.0, 2.5), reflectance=st.floats(0.0, 0.9)
)
@settings(deadline=None)
def test_a_law_record_gives_the_law_times_what_is_absorbed(
    threshold: float, exponent: float, reflectance: float
) -> None:
    curve = photoyield_from(
        {
            **LAW_RECORD,
            "law": "power",
            "threshold_eV": threshold,
            "electrons_per_photon_at_1_eV": 1e-3,
            "exponent": exponent,
            "upper_photon_energy_eV": 30.0,
            "spread_factor": 3.0,
            "counts": "absorbed photons",
            "reflectance": {
                "photon_energy_eV": [3.0, 40.0],
                "share": [reflectance, reflectance],
                "source": "a mirror of the test",
                "basis": "assumed",
            },
        }
    )
    energy = np.linspace(0.0, 30.0, 61)
    expected = (1.0 - reflectance) * law_yield(energy, threshold, 1e-3, exponent=exponent)
    assert yield_per_photon(energy, curve) == pytest.approx(expected, rel=1e-12, abs=0.0)
    assert float(yield_per_photon(99.0, curve)) == pytest.approx(expected[-1], rel=1e-12, abs=0.0)
    weight = escaping_weights(energy, np.ones_like(energy), curve)
    assert np.all(weight[energy <= threshold] == 0.0)
