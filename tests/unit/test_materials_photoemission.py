"""Photoyield, saturation current and the retarding curve."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from mpmath import mp  # type: ignore[import-untyped]
from scipy.constants import e

from materials import load_material
from materials.photoemission import (
    GEOMETRIES,
    LowEnergyPeak,
    collided_share,
    emission_spectrum,
    escape_fraction,
    escape_slope,
    maxwellian_escape,
    mean_photoelectron_energy,
    photo_current_density,
    potential_at_escape,
    two_exponential_escape,
    yield_per_photon,
)
from materials.record import PhotoYield

CURVE = PhotoYield(
    np.array([5.0, 6.0, 8.0, 16.0]),
    np.array([0.0, 1e-4, 1e-2, 4e-2]),
    source="test",
    basis="assumed",
    level="as published",
    spread_factor=2.0,
    near_threshold_factor=10.0,
    near_threshold_to_eV=8.0,
    high_energy_factor=3.0,
    high_energy_from_eV=12.0,
)
PHOTONS = np.array([6.0, 10.2, 21.0, 31.0, 60.0])
WEIGHTS = np.array([0.2, 1.0, 0.5, 0.4, 0.3])


def test_yield_between_points_below_threshold_and_above_the_table() -> None:
    energy = [0.0, 4.9, 5.0, 5.5, 6.0, np.sqrt(48.0), 16.0, 1e4]
    expected = [0.0, 0.0, 0.0, 2.5e-5, 1e-4, 1e-3, 4e-2, 4e-2]
    assert yield_per_photon(energy, CURVE) == pytest.approx(expected, rel=1e-12)


def test_saturation_current_is_charge_times_flux_times_yield() -> None:
    flux = np.array([1e18, 4e15])
    current = photo_current_density([6.0, 8.0], flux, CURVE)
    assert float(current) == pytest.approx(e * (1e18 * 1e-4 + 4e15 * 1e-2), rel=1e-14)
    assert emission_spectrum([4.0, 6.0], flux, CURVE)[0] == 0.0
    stacked = photo_current_density([6.0, 8.0], np.stack([flux, 2.0 * flux]), CURVE)
    assert stacked == pytest.approx([float(current), 2.0 * float(current)])


PEAKS = (LowEnergyPeak("chung_everhart_1974", 4.8), LowEnergyPeak("maxwellian", 2.0))


def exact_escape(v: float, photon: float, threshold: float, geometry: str, peak: Any) -> Any:
    """Integrate over energy and direction, 30 digits, without the closed forms."""
    w = mp.mpf(photon) - mp.mpf(threshold)
    share = mp.mpf(float(collided_share(np.array(photon), threshold)))
    n, scale = mp.mpf(7) / 3, mp.mpf(peak.scale_eV)

    def passes(energy: Any) -> Any:
        # cosine law: P(cos^2 > V/E) = 1 - V/E
        return 1 - v / energy if geometry == "planar" else mp.mpf(1)

    def second(x: Any) -> Any:
        return x / (x + scale) ** 4 if peak.law.startswith("chung") else x * mp.exp(-x / scale)

    if v >= w:
        return mp.mpf(0)
    norm = mp.quad(lambda x: x * (w - x) ** n, [0, w])
    first = mp.quad(lambda x: x * (w - x) ** n * passes(x), [v, w]) / norm
    rest = mp.quad(lambda x: second(x) * passes(x), [v, w]) / mp.quad(second, [0, w])
    return (1 - share) * first + share * rest


@pytest.mark.parametrize("geometry", GEOMETRIES)
@pytest.mark.parametrize("peak", PEAKS, ids=lambda peak: peak.law)
@pytest.mark.parametrize("v", [1e-3, 0.7, 3.0, 9.0, 30.0])
def test_escape_against_integration_over_energy_and_direction(
    geometry: Any, peak: LowEnergyPeak, v: float
) -> None:
    with mp.workdps(30):
        total = sum(
            weight * exact_escape(v, photon, 4.8, geometry, peak)
            for weight, photon in zip(WEIGHTS, PHOTONS, strict=True)
        )
        expected = float(total) / WEIGHTS.sum()
    ours = float(escape_fraction(v, PHOTONS, WEIGHTS, 4.8, geometry=geometry, peak=peak))
    assert ours == pytest.approx(expected, rel=1e-10)


def test_fitted_curves_against_published_forms() -> None:
    # Grard 1973: exp(-V/T) from a plane, (1 + V/T) exp(-V/T) from a point source
    v = np.array([-1.0, 0.0, 1.0, 4.0])
    held = np.maximum(v, 0.0)
    plane = maxwellian_escape(v, temperature_eV=1.5)
    point = maxwellian_escape(v, temperature_eV=1.5, geometry="point source")
    assert plane == pytest.approx(np.exp(-held / 1.5), rel=1e-14)
    assert point == pytest.approx((1 + held / 1.5) * np.exp(-held / 1.5), rel=1e-14)
    two = two_exponential_escape(v, current_A_m2=[8e-5, 3e-6], scale_V=[2.0, 7.5])
    expected = (80.0 * np.exp(-held / 2.0) + 3.0 * np.exp(-held / 7.5)) / 83.0
    assert two == pytest.approx(expected, rel=1e-14)


def test_wide_low_energy_peak_becomes_the_maxwellian_curve() -> None:
    # all collided (photon far above the threshold), T small against W
    v, photon = np.array([0.0, 0.3, 1.0]), [1e6]
    peak = LowEnergyPeak("maxwellian", 0.5)
    ours = escape_fraction(v, photon, [1.0], 0.01, peak=peak)
    assert ours == pytest.approx(maxwellian_escape(v, temperature_eV=0.5), abs=1e-6)


@pytest.mark.parametrize("k", [1.02, 1.5, 2.2, 4.6, 9.0, 30.0])
def test_collided_share_against_the_cascade_by_generations(k: float) -> None:
    # the integral equation D = 1 + int_u^1 4 (u'-u)/u'^2 D du', summed generation by generation
    u = np.linspace(1.0 / k, 1.0, 4001)
    step = u[1] - u[0]
    total, layer = np.ones_like(u), np.ones_like(u)
    for _ in range(60):
        # int_u^1 (u'-u) g du' by two running integrals from above
        g = layer / u**2
        first = np.concatenate([np.cumsum((0.5 * (g[1:] + g[:-1]) * step)[::-1])[::-1], [0.0]])
        layer = 4.0 * np.concatenate(
            [np.cumsum((0.5 * (first[1:] + first[:-1]) * step)[::-1])[::-1], [0.0]]
        )
        total = total + layer
    leaving = (u - 1.0 / k) / u**2
    expected = 1.0 - np.trapezoid(leaving, u) / np.trapezoid(leaving * total, u)
    assert float(collided_share(np.array(k * 4.6), 4.6)) == pytest.approx(expected, rel=2e-3)


def test_everything_escapes_at_or_below_zero() -> None:
    for geometry in GEOMETRIES:
        fraction = escape_fraction([-1e5, -1.0, 0.0], PHOTONS, WEIGHTS, 4.8, geometry=geometry)
        assert fraction == pytest.approx(1.0, rel=1e-14)


@pytest.mark.parametrize("geometry", GEOMETRIES)
@pytest.mark.parametrize("peak", PEAKS, ids=lambda peak: peak.law)
def test_slope_against_richardson(geometry: Any, peak: LowEnergyPeak) -> None:
    # away from the ends V = W of the bins, where the third derivative jumps
    v, h = np.array([0.05, 0.8, 2.5, 8.0, 20.0]), 1e-3

    def fraction(x: Any) -> Any:
        return escape_fraction(x, PHOTONS, WEIGHTS, 4.8, geometry=geometry, peak=peak)

    near, far = fraction(v + h) - fraction(v - h), fraction(v + 2 * h) - fraction(v - 2 * h)
    difference = 8 * near - far
    slope = escape_slope(v, PHOTONS, WEIGHTS, 4.8, geometry=geometry, peak=peak)
    assert slope == pytest.approx(difference / (12 * h), rel=1e-8)
    assert escape_slope([-1.0, 0.0], PHOTONS, WEIGHTS, 4.8).tolist() == [0.0, 0.0]


def test_mean_energy_is_the_area_under_the_point_source_curve() -> None:
    # for a point source R(V) is the share above V, so its integral is the mean energy
    v = np.linspace(0.0, 120.0, 240_001)
    curve = escape_fraction(v, PHOTONS, WEIGHTS, 4.8, geometry="point source")
    area = float(np.trapezoid(curve, v))
    assert mean_photoelectron_energy(PHOTONS, WEIGHTS, 4.8) == pytest.approx(area, rel=1e-6)


@pytest.mark.parametrize("geometry", GEOMETRIES)
@pytest.mark.parametrize("share", [0.01, 0.001])
def test_potential_at_escape_is_the_inverse(geometry: Any, share: float) -> None:
    v = potential_at_escape(share, PHOTONS, WEIGHTS, 4.8, geometry=geometry)
    back = float(escape_fraction(v, PHOTONS, WEIGHTS, 4.8, geometry=geometry))
    assert back == pytest.approx(share, rel=1e-7)


def test_shape_of_the_result_is_that_of_the_potential() -> None:
    v = np.zeros((2, 3)) + 1.0
    assert escape_fraction(v, PHOTONS, WEIGHTS, 4.8).shape == (2, 3)
    assert escape_fraction(1.0, PHOTONS, WEIGHTS, 4.8).shape == ()
    alone = escape_fraction(1.0, PHOTONS, WEIGHTS, 4.8)
    assert escape_fraction(v, PHOTONS, WEIGHTS, 4.8)[1, 2] == alone


def test_bins_that_emit_nothing_do_not_matter() -> None:
    photons, weights = np.append(PHOTONS, [3.0, 7.0]), np.append(WEIGHTS, [0.0, 0.0])
    assert float(escape_fraction(2.0, photons, weights, 4.8)) == pytest.approx(
        float(escape_fraction(2.0, PHOTONS, WEIGHTS, 4.8)), rel=1e-14
    )


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: yield_per_photon(-1.0, CURVE), "photon_energy_eV"),
        (lambda: photo_current_density([6.0], [np.inf], CURVE), "photon_flux_m2_s"),
        (lambda: escape_fraction(1.0, PHOTONS, WEIGHTS, 4.8, geometry="box"), "box"),  # type: ignore[arg-type]
        (lambda: escape_fraction(1.0, PHOTONS, 0.0 * WEIGHTS, 4.8), "nothing is emitted"),
        (lambda: escape_fraction(1.0, PHOTONS, WEIGHTS, 6.5), "threshold"),
        (lambda: escape_fraction(np.nan, PHOTONS, WEIGHTS, 4.8), "potential_V"),
        (lambda: escape_fraction(1.0, [PHOTONS], [WEIGHTS], 4.8), "one axis"),
        (
            lambda: escape_fraction(
                1.0, PHOTONS, WEIGHTS, 4.8, peak=LowEnergyPeak("maxwellian", 0.0)
            ),
            "scale",
        ),
        (lambda: two_exponential_escape(1.0, current_A_m2=[1.0], scale_V=[1.0, 2.0]), "length"),
        (lambda: two_exponential_escape(1.0, current_A_m2=[0.0], scale_V=[1.0]), "nothing"),
        (lambda: maxwellian_escape(1.0, temperature_eV=0.0), "temperature_eV"),
        (lambda: potential_at_escape(1.0, PHOTONS, WEIGHTS, 4.8), "fraction"),
    ],
)
def test_unusable_arguments_are_refused(call: Callable[[], object], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        call()


def test_lyman_alpha_alone_emits_from_metals_but_not_from_fluoropolymer() -> None:
    metal, polymer = load_material("gold").photoyield, load_material("PTFE").photoyield
    assert metal is not None
    assert polymer is not None
    assert float(yield_per_photon(10.2, metal)) > 0.0
    assert float(yield_per_photon(10.2, polymer)) == 0.0
