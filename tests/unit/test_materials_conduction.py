"""Conductivity against temperature and field."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from mpmath import mp  # type: ignore[import-untyped]
from scipy.constants import e, epsilon_0, k

from materials.conduction import (
    adamec_calderwood_1981_factor,
    adamec_calderwood_1981_slope,
    arrhenius_conductivity,
)


def exact_factor(field: Any, temperature: float, permittivity: float) -> Any:
    """Evaluate the published form with mpmath; the caller sets the digits."""
    charge, thermal = mp.mpf(e), mp.mpf(k) * mp.mpf(temperature)
    beta = mp.sqrt(charge**3 / (mp.pi * mp.mpf(epsilon_0) * mp.mpf(permittivity)))
    y = charge * field * mp.mpf("1e-9") / (2 * thermal)
    return (2 + mp.cosh(beta * mp.sqrt(field) / (2 * thermal))) / 3 * mp.sinh(y) / y


@pytest.mark.parametrize("temperature", [50.0, 223.0, 298.15, 400.0])
@pytest.mark.parametrize("permittivity", [1.0, 2.05, 9.4])
def test_factor_and_slope_against_thirty_digits(temperature: float, permittivity: float) -> None:
    with mp.workdps(40):
        for field in (1e-3, 1.0, 1e4, 3e6, 1.4e7, 1e8, 1e9):
            expected = float(exact_factor(mp.mpf(field), temperature, permittivity))
            ours = float(adamec_calderwood_1981_factor(field, temperature, permittivity))
            assert ours == pytest.approx(expected, rel=1e-12)
            slope = float(
                mp.diff(lambda x: exact_factor(x, temperature, permittivity), mp.mpf(field))
            )
            ours = float(adamec_calderwood_1981_slope(field, temperature, permittivity))
            assert ours == pytest.approx(slope, rel=1e-9)


def test_factor_is_even_and_one_without_field() -> None:
    assert float(adamec_calderwood_1981_factor(0.0, 298.0, 3.4)) == 1.0
    pair = adamec_calderwood_1981_factor([-3e7, 3e7], 298.0, 3.4)
    assert pair[0] == pair[1] > 1.0


def test_slope_at_zero_field_is_the_one_towards_positive_fields() -> None:
    # factor = 1 + (beta/2kT)^2 F/6 to first order
    expected = e**3 / (np.pi * epsilon_0 * 3.4) / (2 * k * 298.0) ** 2 / 6
    assert float(adamec_calderwood_1981_slope(0.0, 298.0, 3.4)) == pytest.approx(
        expected, rel=1e-12
    )


def test_arrhenius_at_reference_and_without_barrier() -> None:
    sigma = arrhenius_conductivity(
        [250.0, 298.15], resistivity_ohm_m=1e14, activation_energy_eV=[[0.0], [1.0]]
    )
    assert sigma.shape == (2, 2)
    assert sigma[0].tolist() == [1e-14, 1e-14]
    assert sigma[1, 1] == 1e-14
    assert sigma[1, 0] < 1e-14


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: adamec_calderwood_1981_factor(1.1e9, 298.0, 3.4), "field_V_m"),
        (lambda: adamec_calderwood_1981_factor(np.nan, 298.0, 3.4), "finite"),
        (lambda: adamec_calderwood_1981_factor(1e7, 20.0, 3.4), "temperature_K"),
        (lambda: adamec_calderwood_1981_factor(1e7, 298.0, 0.5), "relative_permittivity"),
        (
            lambda: arrhenius_conductivity(298.0, resistivity_ohm_m=0.0, activation_energy_eV=1.0),
            "resistivity_ohm_m",
        ),
    ],
)
def test_unusable_arguments_are_refused(call: Callable[[], object], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        call()
