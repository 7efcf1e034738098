r"""Yields of true secondary electrons against energy: four published laws, one shape each.

A shape is a function of x = E/E_max with maximum exactly 1 at exactly x = 1. No law is
right to better than 10-20 percent, and above about ten E_max the choice of the law is the
largest uncertainty of a charging threshold. Tails that fall as slowly as E^-0.35 are not
offered: averaged over a keV plasma they put thresholds 3 to 30 times too high.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from functools import cache
from types import MappingProxyType
from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

Array = NDArray[np.float64]

YieldLaw = Literal["sanders_inouye_1979", "lin_joy_2005", "sternglass_1954", "draine_salpeter_1979"]
YIELD_LAWS: tuple[YieldLaw, ...] = (
    "sanders_inouye_1979",
    "lin_joy_2005",
    "sternglass_1954",
    "draine_salpeter_1979",
)

# Sanders & Inouye 1979 in x = E/E_max: slow and fast decay lengths.
SLOW, FAST = 4.3, 0.367
RANGE_EXPONENT = 1.67  # Lin & Joy 2005


class LawFacts(NamedTuple):
    """What is known of a law.

    fitted_low, fitted_high : float or None
        Range of E/E_max over which it follows data.
    low_eV, high_eV : float or None
        The same as energies [eV], where it was stated that way.
    tail : str
        How it falls far above E_max: "exponential", "E^-0.67", "E^-2".
    basis, source : str
    """

    fitted_low: float | None
    fitted_high: float | None
    low_eV: float | None
    high_eV: float | None
    tail: str
    basis: str
    source: str


LAW_FACTS: Mapping[YieldLaw, LawFacts] = MappingProxyType(
    {
        "sternglass_1954": LawFacts(
            0.1, 10.0, None, None, "exponential", "memory",
            "Sternglass 1954, Westinghouse Research Laboratories, Scientific Paper 1772; "
            "the range in E_max is ours, from where it leaves later data",
        ),
        "sanders_inouye_1979": LawFacts(
            None, 10.0, 20.0, None, "exponential", "memory",
            "Sanders & Inouye 1979, Spacecraft Charging Technology 1978, NASA CP-2071, 747; "
            "the range is ours, from where it leaves later data",
        ),
        "draine_salpeter_1979": LawFacts(
            0.1, 10.0, None, None, "E^-2", "assumed",
            "Draine & Salpeter 1979, Astrophys. J. 231, 77; made for grains, range not stated: "
            "taken as that of the data it was drawn through",
        ),
        "lin_joy_2005": LawFacts(
            None, None, 100.0, 30e3, "E^-0.67", "memory",
            "Lin & Joy 2005, Surf. Interface Anal. 37, 895: elements between 0.1 and 30 keV",
        ),
    }
)  # fmt: skip
"""Facts about every law, by name."""


def fitted_range_eV(law: YieldLaw, peak_energy_eV: float) -> tuple[float, float]:
    """Return the energies [eV] between which a law follows data, for a peak energy [eV].

    Examples
    --------
    >>> fitted_range_eV("sanders_inouye_1979", 300.0), fitted_range_eV("lin_joy_2005", 300.0)
    ((20.0, 3000.0), (100.0, 30000.0))
    """
    facts = LAW_FACTS[law]
    low = facts.low_eV if facts.low_eV is not None else (facts.fitted_low or 0.0) * peak_energy_eV
    if facts.high_eV is not None:
        return low, facts.high_eV
    return low, (facts.fitted_high or np.inf) * peak_energy_eV


class PrintedForm(NamedTuple):
    """How a law was published, before it was normalised here.

    formula : str
        Of x = E/E_max, for a stated maximum of 1.
    height, place : float
        Its maximum, over the stated one, and where that lies, in stated E_max. The printed
        form is the shape of this package with both parameters multiplied by these.
    """

    formula: str
    height: float
    place: float


@cache
def printed_form(law: YieldLaw) -> PrintedForm:
    """Return the printed form of a law; coefficients as far as they were printed.

    Examples
    --------
    >>> printed_form("draine_salpeter_1979").place
    0.5
    >>> [round(printed_form(law).height, 4) for law in YIELD_LAWS]
    [0.996, 1.0252, 1.0015, 1.1852]
    """
    if law == "sternglass_1954":
        return PrintedForm("7.4 x exp(-2 sqrt x)", 7.4 / float(np.exp(2.0)), 1.0)
    if law == "draine_salpeter_1979":
        return PrintedForm("8 x/(1 + x)^3", 32.0 / 27.0, 0.5)
    if law == "lin_joy_2005":
        # 1.614 is the root r to four digits
        height = 1.28 * -float(np.expm1(-constant_loss_r(RANGE_EXPONENT)))
        return PrintedForm("1.28 x^-0.67 (1 - exp(-1.614 x^1.67))", height, 1.0)
    place, top = sanders_inouye_peak()
    return PrintedForm("1.37 (exp(-x/4.3) - exp(-x/0.367))", 1.37 * top, place)


@cache
def sanders_inouye_peak() -> tuple[float, float]:
    """Place (in E_max) and height of the maximum of the printed form."""
    x = float(np.log(SLOW / FAST) / (1.0 / FAST - 1.0 / SLOW))
    return x, float(np.exp(-x / SLOW) - np.exp(-x / FAST))


@cache
def constant_loss_r(n: float) -> float:
    """Root r > 0 of (1 - 1/n)(e^r - 1) = r: the maximum lies at x = 1."""
    return float(brentq(lambda r: (1.0 - 1.0 / n) * np.expm1(r) - r, 1e-3, 20.0, xtol=1e-15))


def _sternglass(x: Array) -> Array:
    # printed 7.4 x exp(-2 sqrt x), whose maximum is 7.4/e^2 = 1.0015
    return np.asarray(x * np.exp(2.0 - 2.0 * np.sqrt(x)))


def _sanders_inouye(x: Array) -> Array:
    place, height = sanders_inouye_peak()
    y = x * place
    # exp(-y/a) - exp(-y/b) without cancellation at small y
    return np.asarray(-np.exp(-y / SLOW) * np.expm1(-y * (1.0 / FAST - 1.0 / SLOW)) / height)


def _draine_salpeter(x: Array) -> Array:
    # printed 8 x/(1+x)^3 peaks at x = 1/2 with 32/27: (27/4) y/(1+y)^3 with y = x/2 does at 1
    y = 0.5 * x
    return np.asarray(6.75 * y / (1.0 + y) ** 3)


def _lin_joy(x: Array) -> Array:
    r = constant_loss_r(RANGE_EXPONENT)
    safe = np.where(x > 0.0, x, 1.0)
    shape = -np.expm1(-r * safe**RANGE_EXPONENT) * safe ** (1.0 - RANGE_EXPONENT)
    return np.asarray(np.where(x > 0.0, shape, 0.0) / -np.expm1(-r))


NORMAL_SHAPES: Mapping[YieldLaw, Callable[[Array], Array]] = MappingProxyType(
    {
        "sanders_inouye_1979": _sanders_inouye,
        "lin_joy_2005": _lin_joy,
        "sternglass_1954": _sternglass,
        "draine_salpeter_1979": _draine_salpeter,
    }
)
"""Shapes at normal incidence, of x = E/E_max."""


def lin_joy_isotropic_shape(x: Array) -> Array:
    """Average over an isotropic flux of the constant-loss model, of x = E/E_max."""
    r = constant_loss_r(RANGE_EXPONENT)
    safe = np.where(x > 0.0, x, 1.0)
    z = r * safe**RANGE_EXPONENT
    small = z < 0.1
    large_z = np.where(small, 1.0, z)
    closed = 1.0 + np.expm1(-large_z) / large_z
    # 1 - (1 - e^-z)/z = sum_k (-1)^(k+1) z^k/(k+1)!, exact to rounding below 0.1
    series, small_z = np.zeros_like(z), np.where(small, z, 0.0)
    for k in range(9, 0, -1):
        series = (1.0 - series) * small_z / (k + 1.0)
    shape = 2.0 * safe ** (1.0 - RANGE_EXPONENT) * np.where(small, series, closed)
    return np.asarray(np.where(x > 0.0, shape, 0.0) / -np.expm1(-r))
