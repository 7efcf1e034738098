"""True secondary electrons set free by electrons, and their escape.

Every law is normalised so that its maximum is exactly the stated yield at
exactly the stated energy. No law is right to better than 10-20 percent, and
above about ten times the peak energy the choice of the law is the largest
uncertainty of a charging threshold: run one exponential and one power law.
"""

from __future__ import annotations

from functools import cache
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.optimize import brentq

from materials.angle import exponential_angle_factor, secondary_angle_coefficient
from materials.backscatter import prokopenko_laframboise_1980
from materials.errors import finite_array
from materials.record import Material
from materials.secondary_escape import secondary_escape_fraction, secondary_escape_slope

__all__ = [
    "YIELD_LAWS",
    "YieldLaw",
    "isotropic_yield",
    "lin_joy_2005",
    "maxwellian_isotropic_yield",
    "maxwellian_yield",
    "sanders_inouye_1979",
    "secondary_escape_fraction",
    "secondary_escape_slope",
    "true_secondary_peak",
]

YieldLaw = Literal["sanders_inouye_1979", "lin_joy_2005"]
YIELD_LAWS: tuple[YieldLaw, ...] = ("sanders_inouye_1979", "lin_joy_2005")

# Sanders & Inouye 1979 in x = E/E_max: slow and fast decay lengths.
_SLOW, _FAST = 4.3, 0.367
_RANGE_EXPONENT = 1.67  # Lin & Joy 2005


@cache
def _sanders_inouye_peak() -> tuple[float, float]:
    """Place (in E_max) and height of the maximum of the printed form."""
    x = float(np.log(_SLOW / _FAST) / (1.0 / _FAST - 1.0 / _SLOW))
    return x, float(np.exp(-x / _SLOW) - np.exp(-x / _FAST))


@cache
def _constant_loss_r(n: float) -> float:
    """Root r > 0 of (1 - 1/n)(e^r - 1) = r: the maximum lies at x = 1."""
    return float(brentq(lambda r: (1.0 - 1.0 / n) * np.expm1(r) - r, 1e-3, 20.0, xtol=1e-15))


def sanders_inouye_1979(
    energy_eV: ArrayLike, *, peak_yield: ArrayLike, peak_energy_eV: ArrayLike
) -> NDArray[np.float64]:
    r"""Secondary yield at normal incidence, exponential tail.

    :math:`\delta = c\,[e^{-E/a} - e^{-E/b}]`, a/b = 4.3/0.367, with a and c set
    so that the maximum is `peak_yield` at `peak_energy_eV`. (As printed,
    a = 4.3 E_max and c = 1.37, the maximum is 0.996 at 0.9875 E_max.)

    Parameters
    ----------
    energy_eV : array_like
        Electron energy at the surface [eV], >= 0.
    peak_yield, peak_energy_eV : array_like
        Maximum yield of true secondaries; its energy [eV], > 0.

    Returns
    -------
    ndarray
        Electrons per incident electron, broadcast shape.

    Raises
    ------
    ValueError
        An argument is not finite or out of its range.

    Notes
    -----
    Used from about 20 eV to 10 E_max; above, it falls faster than data.

    References
    ----------
    Sanders & Inouye (1979), Spacecraft Charging Technology 1978, NASA CP-2071,
    747 (from memory).

    Examples
    --------
    >>> sanders_inouye_1979([300.0, 3000.0], peak_yield=2.5, peak_energy_eV=300.0).round(3).tolist()
    [2.5, 0.346]
    """
    x, peak = _checked(energy_eV, peak_yield, peak_energy_eV)
    return np.asarray(peak * _sanders_inouye(x))


def _sanders_inouye(x: NDArray[np.float64]) -> NDArray[np.float64]:
    place, height = _sanders_inouye_peak()
    y = x * place
    # exp(-y/a) - exp(-y/b) without cancellation at small y
    return np.asarray(-np.exp(-y / _SLOW) * np.expm1(-y * (1.0 / _FAST - 1.0 / _SLOW)) / height)


def lin_joy_2005(
    energy_eV: ArrayLike, *, peak_yield: ArrayLike, peak_energy_eV: ArrayLike
) -> NDArray[np.float64]:
    r"""Secondary yield at normal incidence, power-law tail E^-0.67.

    :math:`\delta = \delta_m\,x^{1-n}\,(1 - e^{-r x^n})/(1 - e^{-r})`,
    x = E/E_max, n = 1.67 and r the root of (1 - 1/n)(e^r - 1) = r, so that the
    maximum is `peak_yield` at `peak_energy_eV`. (As printed, with 1.28 and
    1.614, it exceeds the stated maximum by 2.5 percent.)

    Parameters
    ----------
    energy_eV : array_like
        Electron energy at the surface [eV], >= 0.
    peak_yield, peak_energy_eV : array_like
        Maximum yield of true secondaries; its energy [eV], > 0.

    Returns
    -------
    ndarray
        Electrons per incident electron, broadcast shape.

    Raises
    ------
    ValueError
        An argument is not finite or out of its range.

    Notes
    -----
    Constant-loss model, fitted by its authors to elements between about 0.1
    and 30 keV.

    References
    ----------
    Lin & Joy (2005), Surf. Interface Anal. 37, 895 (from memory).

    Examples
    --------
    >>> lin_joy_2005([300.0, 3000.0], peak_yield=2.5, peak_energy_eV=300.0).round(3).tolist()
    [2.5, 0.667]
    """
    x, peak = _checked(energy_eV, peak_yield, peak_energy_eV)
    return np.asarray(peak * _lin_joy(x))


def _lin_joy(x: NDArray[np.float64]) -> NDArray[np.float64]:
    r = _constant_loss_r(_RANGE_EXPONENT)
    safe = np.where(x > 0.0, x, 1.0)
    shape = -np.expm1(-r * safe**_RANGE_EXPONENT) * safe ** (1.0 - _RANGE_EXPONENT)
    return np.asarray(np.where(x > 0.0, shape, 0.0) / -np.expm1(-r))


def isotropic_yield(
    energy_eV: ArrayLike,
    *,
    law: YieldLaw = "sanders_inouye_1979",
    peak_yield: ArrayLike,
    peak_energy_eV: ArrayLike,
    mean_atomic_number: ArrayLike,
) -> NDArray[np.float64]:
    r"""Secondary yield averaged over an isotropic flux on a plane.

    :math:`2\int_0^1\delta(E,\theta)\,\mu\,d\mu`, :math:`\mu = \cos\theta`, with
    the angle form that belongs to the law. Its ratio to normal incidence
    goes to 1 well below the peak energy.

    Parameters
    ----------
    energy_eV : array_like
        Electron energy at the surface [eV], >= 0.
    law : {"sanders_inouye_1979", "lin_joy_2005"}, optional
        The normal-incidence law and its angle form.
    peak_yield, peak_energy_eV : array_like
        Maximum yield of true secondaries at normal incidence; its energy [eV].
    mean_atomic_number : array_like
        Mean Z, 4 to 100; used by "sanders_inouye_1979".

    Returns
    -------
    ndarray
        Electrons per incident electron, broadcast shape.

    Raises
    ------
    ValueError
        Unknown law, or an argument that is not finite or out of its range.

    Notes
    -----
    "sanders_inouye_1979": :math:`\delta(E,\theta) = \delta(E,0)\,\{1 +
    (e^{b(1-\mu)} - 1)\,g\}`, b from `secondary_angle_coefficient`. g = (1 - exp(-E/E_max))^2
    is our onset of the angle effect (assumed): Bruining (1954, memory) found
    none below about E_max/2. "lin_joy_2005": the constant-loss model with the
    path to the surface shortened by the cosine, :math:`x^{1-n}(1 -
    e^{-r x^n\mu})/\mu`; its ratio goes to 2 far above E_max, the upper end of
    what smooth surfaces show.

    Examples
    --------
    >>> material = {"peak_yield": 2.5, "peak_energy_eV": 300.0, "mean_atomic_number": 10.6}
    >>> [round(float(isotropic_yield(3e3, law=law, **material)), 3) for law in YIELD_LAWS]
    [0.487, 1.317]
    """
    x, peak = _checked(energy_eV, peak_yield, peak_energy_eV)
    z = finite_array("mean_atomic_number", mean_atomic_number, at_least=4.0, at_most=100.0)
    if law == "sanders_inouye_1979":
        growth = exponential_angle_factor(secondary_angle_coefficient(z)) - 1.0
        onset = np.expm1(-x) ** 2
        return np.asarray(peak * _sanders_inouye(x) * (1.0 + growth * onset))
    if law == "lin_joy_2005":
        return np.asarray(peak * _lin_joy_isotropic(x) + 0.0 * z)
    raise ValueError(f"law {law!r} is unknown; allowed: {', '.join(YIELD_LAWS)}")


def _lin_joy_isotropic(x: NDArray[np.float64]) -> NDArray[np.float64]:
    r = _constant_loss_r(_RANGE_EXPONENT)
    safe = np.where(x > 0.0, x, 1.0)
    z = r * safe**_RANGE_EXPONENT
    small = z < 0.1
    large_z = np.where(small, 1.0, z)
    closed = 1.0 + np.expm1(-large_z) / large_z
    # 1 - (1 - e^-z)/z = sum_k (-1)^(k+1) z^k/(k+1)!, exact to rounding below 0.1
    series = np.zeros_like(z)
    for k in range(9, 0, -1):
        series = (1.0 - series) * z / (k + 1.0)
    shape = 2.0 * safe ** (1.0 - _RANGE_EXPONENT) * np.where(small, series, closed)
    return np.asarray(np.where(x > 0.0, shape, 0.0) / -np.expm1(-r))


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
        Maximum yield of true secondaries; its energy [eV], > 0.

    Returns
    -------
    ndarray
        Electrons per incident electron, broadcast shape.

    Raises
    ------
    ValueError
        An argument is not finite or out of its range.

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

    Parameters
    ----------
    temperature_eV : array_like
        Electron temperature [eV], > 0.
    peak_yield, peak_energy_eV, mean_atomic_number : array_like
        As in `isotropic_yield`.

    Returns
    -------
    ndarray
        Electrons per incident electron, broadcast shape.

    Raises
    ------
    ValueError
        An argument is not finite or out of its range.

    Examples
    --------
    >>> round(float(maxwellian_isotropic_yield(
    ...     1e3, peak_yield=2.5, peak_energy_eV=300.0, mean_atomic_number=10.6)), 3)
    1.428
    """
    t, peak, a, b, height = _maxwellian_arguments(temperature_eV, peak_yield, peak_energy_eV)
    z = finite_array("mean_atomic_number", mean_atomic_number, at_least=4.0, at_most=100.0)
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


def true_secondary_peak(material: Material) -> float:
    """Maximum yield of true secondaries of a material, at normal incidence.

    A record that holds the total yield has the backscatter coefficient at
    the peak energy taken off, so that backscatter is not counted twice.

    Parameters
    ----------
    material : Material
        With records of yield and backscatter.

    Returns
    -------
    float
        Electrons per incident electron, never below 0.

    Raises
    ------
    MaterialError
        The material does not emit or lacks a record.

    Notes
    -----
    The maxima of total and true yield lie at slightly different energies;
    the difference of the maxima is second order in that.

    Examples
    --------
    >>> from materials import load_material
    >>> round(true_secondary_peak(load_material("polyimide film")), 2)
    1.88
    """
    peak = material.value("secondary_yield_peak")
    if material.values["secondary_yield_peak"].holds != "total":
        return peak
    eta = prokopenko_laframboise_1980(
        material.value("secondary_yield_peak_energy_eV"),
        high_energy=material.value("backscatter_high_energy"),
        low_energy_drop=material.get("backscatter_low_energy_drop", 0.0),
        drop_energy_eV=material.get("backscatter_drop_energy_eV", 4000.0),
    )
    return max(0.0, peak - float(eta))


def _checked(
    energy_eV: ArrayLike, peak_yield: ArrayLike, peak_energy_eV: ArrayLike
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    energy = finite_array("energy_eV", energy_eV, at_least=0.0)
    peak = finite_array("peak_yield", peak_yield, at_least=0.0)
    return energy / finite_array("peak_energy_eV", peak_energy_eV, above=0.0), peak


def _maxwellian_arguments(
    temperature_eV: ArrayLike, peak_yield: ArrayLike, peak_energy_eV: ArrayLike
) -> tuple[
    NDArray[np.float64], NDArray[np.float64], NDArray[np.float64], NDArray[np.float64], float
]:
    t = finite_array("temperature_eV", temperature_eV, above=0.0)
    peak = finite_array("peak_yield", peak_yield, at_least=0.0)
    e_max = finite_array("peak_energy_eV", peak_energy_eV, above=0.0)
    place, height = _sanders_inouye_peak()
    return t, peak, np.asarray(_SLOW * e_max / place), np.asarray(_FAST * e_max / place), height
