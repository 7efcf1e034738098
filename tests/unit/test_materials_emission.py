"""Kernels of yield, backscatter, escape and ion impact: limits, closed forms, errors."""

from __future__ import annotations

import math
from collections.abc import Callable
from itertools import pairwise
from typing import Any

import numpy as np
import pytest
from mpmath import mp  # type: ignore[import-untyped]
from numpy.typing import NDArray
from scipy.integrate import quad
from scipy.optimize import minimize_scalar

from materials import MaterialError, load_material
from materials.angle import (
    backscatter_angle_coefficient,
    exponential_angle_factor,
    secondary_angle_coefficient,
)
from materials.backscatter import (
    hunger_kuchler_1979,
    isotropic_backscatter,
    maxwellian_backscatter,
    prokopenko_laframboise_1980,
)
from materials.ion_impact import whipple_1981
from materials.secondary import (
    YIELD_LAWS,
    draine_salpeter_1979,
    isotropic_yield,
    lin_joy_2005,
    maxwellian_isotropic_yield,
    maxwellian_yield,
    sanders_inouye_1979,
    secondary_escape_fraction,
    secondary_escape_slope,
    sternglass_1954,
    true_secondary_peak,
)

Law = Callable[..., NDArray[np.float64]]
LAWS: dict[str, Law] = {
    "sanders_inouye_1979": sanders_inouye_1979,
    "lin_joy_2005": lin_joy_2005,
    "sternglass_1954": sternglass_1954,
    "draine_salpeter_1979": draine_salpeter_1979,
}
PEAK: dict[str, Any] = {"peak_yield": 2.4, "peak_energy_eV": 350.0}


@pytest.mark.parametrize("law", LAWS)
def test_maximum_is_the_stated_yield_at_the_stated_energy(law: str) -> None:
    kernel = LAWS[law]
    assert float(kernel(350.0, **PEAK)) == pytest.approx(2.4, rel=1e-14)
    found = minimize_scalar(
        lambda energy: -float(kernel(energy, **PEAK)), bracket=(200.0, 340.0, 600.0), tol=1e-12
    )
    assert found.x == pytest.approx(350.0, rel=1e-6)


@pytest.mark.parametrize("law", LAWS)
def test_yield_at_zero_energy_is_zero_and_rises_linearly(law: str) -> None:
    kernel = LAWS[law]
    assert float(kernel(0.0, **PEAK)) == 0.0
    tiny = kernel([1e-6, 2e-6], **PEAK)
    # the square root in the exponent of Sternglass bends the start by 1e-4
    assert float(tiny[1] / tiny[0]) == pytest.approx(2.0, rel=1e-4)


def test_sanders_inouye_against_thirty_digits() -> None:
    with mp.workdps(30):
        slow, fast = mp.mpf("4.3"), mp.mpf("0.367")
        place = mp.log(slow / fast) / (1 / fast - 1 / slow)

        def shape(x: Any) -> Any:
            return mp.exp(-x * place / slow) - mp.exp(-x * place / fast)

        for energy in (1e-3, 1.0, 70.0, 350.0, 3500.0, 35000.0):
            expected = mp.mpf("2.4") * shape(mp.mpf(energy) / 350) / shape(mp.mpf(1))
            assert float(sanders_inouye_1979(energy, **PEAK)) == pytest.approx(
                float(expected), rel=1e-12
            )


def test_lin_joy_against_thirty_digits() -> None:
    with mp.workdps(30):
        n = mp.mpf("1.67")
        r = mp.findroot(lambda r: (1 - 1 / n) * (mp.exp(r) - 1) - r, 1.6)
        for energy in (1e-3, 1.0, 70.0, 350.0, 3500.0, 35000.0):
            x = mp.mpf(energy) / 350
            normal = x ** (1 - n) * (1 - mp.exp(-r * x**n)) / (1 - mp.exp(-r))
            assert float(lin_joy_2005(energy, **PEAK)) == pytest.approx(
                2.4 * float(normal), rel=1e-12
            )
            average = mp.quad(
                lambda mu, x=x: 2 * x ** (1 - n) * (1 - mp.exp(-r * x**n * mu)) / (1 - mp.exp(-r)),
                [0, 1],
            )
            ours = isotropic_yield(energy, law="lin_joy_2005", mean_atomic_number=10.0, **PEAK)
            assert float(ours) == pytest.approx(2.4 * float(average), rel=1e-12)


@pytest.mark.parametrize("z", [6.0, 13.0, 79.0])
@pytest.mark.parametrize("energy", [20.0, 350.0, 5000.0])
def test_isotropic_sanders_inouye_is_the_average_of_its_angle_form(z: float, energy: float) -> None:
    b = float(secondary_angle_coefficient(z))
    onset = (1.0 - math.exp(-energy / 350.0)) ** 2

    def integrand(mu: float) -> float:
        return 2.0 * mu * (1.0 + math.expm1(b * (1.0 - mu)) * onset)

    average = quad(integrand, 0.0, 1.0, epsabs=0.0, epsrel=1e-12)[0]
    normal = float(sanders_inouye_1979(energy, **PEAK))
    ours = float(isotropic_yield(energy, mean_atomic_number=z, **PEAK))
    assert ours == pytest.approx(normal * average, rel=1e-11)


@pytest.mark.parametrize("law", YIELD_LAWS)
def test_isotropic_ratio_goes_to_one_at_low_energy(law: Any) -> None:
    kernel = LAWS[law]
    for energy, tolerance in ((0.1, 2e-3), (1e-3, 2e-5)):
        ratio = float(
            isotropic_yield(energy, law=law, mean_atomic_number=10.0, **PEAK)
            / kernel(energy, **PEAK)
        )
        assert ratio == pytest.approx(1.0, abs=tolerance)
    assert float(isotropic_yield(0.0, law=law, mean_atomic_number=10.0, **PEAK)) == 0.0


@pytest.mark.parametrize("temperature", [0.1, 10.0, 300.0, 3e3, 1e5])
def test_maxwellian_closed_forms_against_quadrature(temperature: float) -> None:
    def average(function: Callable[[float], float]) -> float:
        # t = E/T; the yield changes on the scale of the peak energy
        corner = min(40.0, 350.0 / temperature)
        edges = np.unique(np.clip([0.0, 0.1 * corner, corner, 6.0 * corner, 60.0], 0.0, 60.0))
        parts = (
            quad(
                lambda t: t * np.exp(-t) * function(t * temperature),
                low,
                high,
                epsabs=0.0,
                epsrel=1e-11,
                limit=400,
            )[0]
            for low, high in pairwise(edges)
        )
        return math.fsum(parts)

    normal = average(lambda energy: float(sanders_inouye_1979(energy, **PEAK)))
    assert float(maxwellian_yield(temperature, **PEAK)) == pytest.approx(normal, rel=1e-8)
    kwargs = {**PEAK, "mean_atomic_number": 10.6}
    isotropic = average(lambda energy: float(isotropic_yield(energy, **kwargs)))
    assert float(maxwellian_isotropic_yield(temperature, **kwargs)) == pytest.approx(
        isotropic, rel=1e-8
    )
    metal = {"high_energy": 0.48, "low_energy_drop": 0.35, "drop_energy_eV": 2400.0}
    eta = average(lambda energy: float(prokopenko_laframboise_1980(energy, **metal)))
    assert float(maxwellian_backscatter(temperature, **metal)) == pytest.approx(eta, rel=1e-8)


def test_exponential_angle_factor_is_smooth_across_its_series() -> None:
    with mp.workdps(40):
        for c in (1e-12, 1e-4, 0.05, 0.0999999, 0.1, 0.1000001, 3.0):
            exact = 2 * (mp.exp(mp.mpf(c)) - 1 - mp.mpf(c)) / mp.mpf(c) ** 2
            assert float(exponential_angle_factor(c)) == pytest.approx(float(exact), rel=1e-13)


def test_isotropic_backscatter_is_the_average_of_its_angle_form() -> None:
    c = float(backscatter_angle_coefficient(29.0))
    average = quad(lambda mu: 2.0 * mu * np.exp(c * (1.0 - mu)), 0.0, 1.0)[0]
    material = {"high_energy": 0.31, "low_energy_drop": 0.2, "drop_energy_eV": 4e3}
    normal = prokopenko_laframboise_1980(2e3, **material)
    ours = isotropic_backscatter(2e3, mean_atomic_number=29.0, **material)
    assert float(ours) == pytest.approx(float(normal) * average, rel=1e-10)


def test_true_secondaries_leave_backscatter_out() -> None:
    gold = load_material("gold")
    eta = 0.48 - 0.35 * np.exp(-800.0 / 2400.0)
    assert true_secondary_peak(gold) == pytest.approx(1.4 - eta, rel=1e-12)
    with pytest.raises(MaterialError, match="bare collector"):
        true_secondary_peak(load_material("bare collector"))


@pytest.mark.parametrize(
    ("kind", "scale"),
    [("conductor", {"work_function_eV": 4.5}), ("dielectric", {"secondary_energy_eV": 2.0})],
)
def test_secondary_escape_is_the_share_of_normal_energies_above(
    kind: str, scale: dict[str, float]
) -> None:
    # cosine law: of the electrons of energy E the share 1 - V/E passes V
    def spectrum(energy: float) -> float:
        if kind == "conductor":
            w = 4.5
            return 6.0 * w**2 * energy / (energy + w) ** 4
        return energy / 4.0 * float(np.exp(-energy / 2.0))

    for v in (0.5, 2.0, 10.0):
        expected = quad(
            lambda energy, v=v: spectrum(energy) * (1.0 - v / energy), v, np.inf, epsrel=1e-11
        )[0]
        ours = float(secondary_escape_fraction(v, kind=kind, **scale))
        assert ours == pytest.approx(expected, rel=1e-8)


@pytest.mark.parametrize(
    ("kind", "scale"),
    [("conductor", {"work_function_eV": 4.5}), ("semiconductor", {"secondary_energy_eV": 2.0})],
)
def test_secondary_escape_slope(kind: str, scale: dict[str, float]) -> None:
    v, h = np.array([0.1, 3.0, 30.0]), 1e-4

    def fraction(x: NDArray[np.float64]) -> NDArray[np.float64]:
        return secondary_escape_fraction(x, kind=kind, **scale)

    near, far = fraction(v + h) - fraction(v - h), fraction(v + 2 * h) - fraction(v - 2 * h)
    numeric = (8 * near - far) / (12 * h)
    assert secondary_escape_slope(v, kind=kind, **scale) == pytest.approx(numeric, rel=1e-7)
    assert float(secondary_escape_slope(-1.0, kind=kind, **scale)) == 0.0
    assert fraction(np.array([-1e5, 0.0])).tolist() == [1.0, 1.0]


def test_ion_yield_peaks_where_stated() -> None:
    energies = np.array([8e4, 9e4, 1e5])
    gamma = whipple_1981(energies, peak_yield=4.3, peak_energy_eV=9e4)
    assert float(gamma[1]) == 4.3
    assert np.all(gamma[[0, 2]] < 4.3)
    # symmetric in ln E about the peak
    pair = whipple_1981([9e3, 9e5], peak_yield=4.3, peak_energy_eV=9e4)
    assert float(pair[0]) == pytest.approx(float(pair[1]), rel=1e-14)


def test_arguments_broadcast() -> None:
    energy = np.geomspace(1.0, 1e4, 7)
    peak = np.array([[1.0], [2.0]])
    result = isotropic_yield(energy, peak_yield=peak, peak_energy_eV=300.0, mean_atomic_number=10.0)
    assert result.shape == (2, 7)
    assert result[1] == pytest.approx(2.0 * result[0])
    grid = maxwellian_isotropic_yield(
        np.ones((3, 1, 1)), peak_yield=peak, peak_energy_eV=[300.0, 400.0], mean_atomic_number=10.0
    )
    assert grid.shape == (3, 2, 2)


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: sanders_inouye_1979(-1.0, **PEAK), "energy_eV"),
        (lambda: lin_joy_2005(np.nan, **PEAK), "finite"),
        (lambda: lin_joy_2005(1.0, peak_yield=1.0, peak_energy_eV=0.0), "peak_energy_eV"),
        (lambda: isotropic_yield(1.0, law="flat", mean_atomic_number=9.0, **PEAK), "flat"),  # type: ignore[arg-type]
        (lambda: isotropic_yield(1.0, mean_atomic_number=1.0, **PEAK), "mean_atomic_number"),
        (lambda: maxwellian_yield(0.0, **PEAK), "temperature_eV"),
        (lambda: hunger_kuchler_1979(0.0, mean_atomic_number=13), "energy_eV"),
        (lambda: exponential_angle_factor(-1.0), "coefficient"),
        (lambda: whipple_1981(-1.0, peak_yield=1.0, peak_energy_eV=1.0), "energy_eV"),
        (lambda: secondary_escape_fraction(1.0, kind="conductor"), "work_function_eV"),
        (lambda: secondary_escape_fraction(1.0, kind="dielectric"), "secondary_energy_eV"),
        (lambda: secondary_escape_fraction(1.0, kind="metal"), "metal"),
    ],
)
def test_unusable_arguments_are_refused(call: Callable[[], object], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        call()


@pytest.mark.parametrize(
    ("z", "secondary", "backscatter"),
    # fit of Laframboise & Kamitsuma 1983 evaluated apart from this code, three digits
    [
        (4, 0.784, 3.350),
        (6, 0.888, 2.660),
        (13, 0.959, 1.714),
        (29, 0.977, 1.086),
        (79, 0.985, 0.614),
    ],
)
def test_angle_coefficients(z: int, secondary: float, backscatter: float) -> None:
    assert float(secondary_angle_coefficient(z)) == pytest.approx(secondary, abs=6e-4)
    assert float(backscatter_angle_coefficient(z)) == pytest.approx(backscatter, abs=6e-4)


def test_hunger_kuchler_exponent_and_level() -> None:
    # worked by hand for copper: L = 3.3673; level 0.3335; exponent 0.1382 - 0.9211/5.38516
    one, ten = hunger_kuchler_1979([1e3, 1e4], mean_atomic_number=29)
    level = 0.1904 - 0.2235 * 3.3672958 + 0.1292 * 11.338681 - 0.01491 * 38.180693
    assert float(one) == pytest.approx(level, rel=1e-6)
    assert math.log10(float(ten / one)) == pytest.approx(0.1382 - 0.9211 / 5.3851648, rel=1e-6)
