"""Closed averages of the Sanders-Inouye yield over a Maxwellian flux."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from materials.angle import exponential_angle_factor, secondary_angle_coefficient
from materials.arguments import atomic_number, maximum, temperature
from materials.yield_laws import FAST, SLOW, sanders_inouye_peak


def maxwellian_yield(
    temperature_eV: ArrayLike, *, peak_yield: ArrayLike, peak_energy_eV: ArrayLike
) -> NDArray[np.float64]:
    r"""`sanders_inouye_1979` averaged over a Maxwellian flux, normal incidence.

    Weight :math:`E\,e^{-E/T}/T^2`, and :math:`\langle e^{-E/a}\rangle =
    (1 + T/a)^{-2}`. A repelling potential leaves the weight as it is.

    Parameters
    ----------
    temperature_eV : array_like
        Electron temperature [eV], > 0.
    peak_yield, peak_energy_eV : array_like
        As in `sanders_inouye_1979`, whose result and errors these are too.

    Examples
    --------
    >>> round(float(maxwellian_yield(1e3, peak_yield=2.5, peak_energy_eV=300.0)), 3)
    1.069
    """
    t, peak, a, b, height = _maxwellian_arguments(temperature_eV, peak_yield, peak_energy_eV)
    return np.asarray(peak / height * (_mean_exp(t / a) - _mean_exp(t / b)))


def maxwellian_isotropic_yield(
    temperature_eV: ArrayLike,
    *,
    peak_yield: ArrayLike,
    peak_energy_eV: ArrayLike,
    mean_atomic_number: ArrayLike,
) -> NDArray[np.float64]:
    r"""`isotropic_yield` of "sanders_inouye_1979" averaged over a Maxwellian flux.

    Closed form: yield and onset are sums of exponentials.

    Arguments as `maxwellian_yield`, with the mean Z, 4 to 100.

    Examples
    --------
    >>> round(float(maxwellian_isotropic_yield(
    ...     1e3, peak_yield=2.5, peak_energy_eV=300.0, mean_atomic_number=10.6)), 3)
    1.428
    """
    t, peak, a, b, height = _maxwellian_arguments(temperature_eV, peak_yield, peak_energy_eV)
    z = atomic_number(mean_atomic_number)
    growth = exponential_angle_factor(secondary_angle_coefficient(z)) - 1.0
    e_max = np.asarray(peak_energy_eV, dtype=np.float64)
    total = np.zeros(np.broadcast_shapes(t.shape, e_max.shape))
    grown = total.copy()
    # onset (1 - e^-x)^2 = 1 - 2 e^-x + e^-2x
    for order, weight in ((0, 1.0), (1, -2.0), (2, 1.0)):
        extra = order * t / e_max
        pair = _mean_exp(t / a + extra) - _mean_exp(t / b + extra)
        grown = grown + weight * pair
        if order == 0:
            total = total + pair
    return np.asarray(peak / height * (total + growth * grown))


def _mean_exp(ratio: NDArray[np.float64]) -> NDArray[np.float64]:
    """<exp(-E k)> over E exp(-E/T)/T^2 with ratio = k T."""
    return np.asarray((1.0 + ratio) ** -2.0)


def _maxwellian_arguments(
    temperature_eV: ArrayLike, peak_yield: ArrayLike, peak_energy_eV: ArrayLike
) -> tuple[
    NDArray[np.float64], NDArray[np.float64], NDArray[np.float64], NDArray[np.float64], float
]:
    t = temperature(temperature_eV)
    peak, e_max = maximum(peak_yield, peak_energy_eV)
    place, height = sanders_inouye_peak()
    return t, peak, np.asarray(SLOW * e_max / place), np.asarray(FAST * e_max / place), height
