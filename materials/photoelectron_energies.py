r"""Energies of the electrons that one photon frees: closed forms, no checks.

A photon of energy hv leaves at most W = hv - threshold to an electron. Two parts:

- electrons that come out as excited: :math:`p(E) = (n+1)(n+2) E (W-E)^n/W^{n+2}`, with
  its maximum at W/(n+1) = 0.3 W, the middle of the measured 0.2 to 0.4 W;
- electrons that collided before: the low-energy peak of secondaries, with the energies
  that the material's secondaries have, cut off at W.

The share of the second comes from the cascade of electrons in a solid of constant
density of states, see `collided_share`. All functions take arrays that broadcast.
"""

from __future__ import annotations

from typing import Final, Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

MAXIMUM_AT: Final = 0.3
"""Place of the maximum of p(E) in units of W (Feuerbacher & Fitton 1972, J. Appl. Phys. 43,
1563; Grard 1973, J. Geophys. Res. 78, 2885: "0.2 to 0.4", from memory; we take the middle)."""

EXPONENT: Final = 1.0 / MAXIMUM_AT - 1.0
"""n of p(E)."""

_RISING: Final = 0.5 * (1.0 + 17.0**0.5)
_FALLING: Final = 1.0 - _RISING


class LowEnergyPeak(NamedTuple):
    """Energies of electrons that collided on their way out.

    law : "chung_everhart_1974" for conductors, :math:`E/(E+W_0)^4` with the work function;
    "maxwellian" for others, :math:`E e^{-E/T}`. scale_eV is the work function or T.
    """

    law: Literal["chung_everhart_1974", "maxwellian"]
    scale_eV: float


def collided_share(photon_energy_eV: Array, threshold_eV: float) -> Array:
    r"""Share of the emitted electrons that collided at least once before they left.

    With k = hv/threshold and u the energy above the Fermi level over hv, the density of
    excited electrons is 1 as excited (constant density of states) and

    .. math:: D(u) = a u^{r} + (1-a) u^{1-r}, \quad r = (1+\sqrt{17})/2,\ a = (r-1)/(2r-1)

    with all collisions: it solves :math:`D = 1 + \int_u^1 4(u'-u)/u'^2 D(u')\,du'`, in
    which an electron of energy u' makes two below it, spread as the phase space of two
    electrons and a hole demands. Electrons at u leave in proportion to the escape cone
    (u - 1/k) and the collision length :math:`u^{-2}`.

    Returns
    -------
    ndarray
        0 at the threshold, towards 1 for X-rays: 0.17 at 10.2 eV, 0.47 at 21.2 eV and
        0.70 at 40.8 eV for a threshold of 4.6 eV.

    Notes
    -----
    No parameter besides the threshold. Derived for metals; for other solids, where the
    gap forbids collisions below it, used as it stands (assumed).

    References
    ----------
    Berglund & Spicer (1964), Phys. Rev. 136, A1030 (random-k excitation and collision);
    Wolff (1954), Phys. Rev. 95, 56 (cascade); Quinn (1962), Phys. Rev. 126, 1453
    (collision length); all from memory, the solution is ours.
    """
    k = np.maximum(photon_energy_eV / threshold_eV, 1.0)
    part = (_RISING - 1.0) / (_RISING - _FALLING)

    def leaving(power: float) -> Array:  # int_{1/k}^1 (u - 1/k) u^(power - 2) du
        return (1.0 - k**-power) / power - (1.0 - k ** (1.0 - power)) / (power - 1.0) / k

    small = k - 1.0 < 1e-3
    direct = np.log(k) - 1.0 + 1.0 / k
    total = part * leaving(_RISING) + (1.0 - part) * leaving(_FALLING)
    # near k = 1: D - 1 = 2 (1-u)^2, average 2 (k-1)^2 / 6 with the weight (u - 1/k)
    share = 1.0 - direct / np.where(small, 1.0, total)
    return np.asarray(np.where(small, (k - 1.0) ** 2 / 3.0, share))


def direct_escape(v: Array, planar: bool) -> Array:
    """Share of uncollided electrons that escape, v = V/W in 0…1."""
    rest = 1.0 - v
    if planar:
        return np.asarray(rest ** (EXPONENT + 2.0))
    return np.asarray(rest ** (EXPONENT + 1.0) * (1.0 + (EXPONENT + 1.0) * v))


def direct_escape_slope(v: Array, planar: bool) -> Array:
    """Derivative of `direct_escape` with respect to v."""
    rest = 1.0 - v
    if planar:
        return np.asarray(-(EXPONENT + 2.0) * rest ** (EXPONENT + 1.0))
    return np.asarray(-(EXPONENT + 1.0) * (EXPONENT + 2.0) * v * rest**EXPONENT)


DIRECT_MEAN: Final = 2.0 / (EXPONENT + 3.0)
"""Mean energy of uncollided electrons over W."""


def peak_escape(held: Array, excess: Array, peak: LowEnergyPeak, planar: bool) -> Array:
    """Share of collided electrons that escape; 0 <= held <= excess [eV]."""
    climb = held if planar else np.zeros_like(held)
    return np.asarray(_above(held, excess, climb, peak) / _norm(excess, peak))


def peak_escape_slope(held: Array, excess: Array, peak: LowEnergyPeak, planar: bool) -> Array:
    """Derivative of `peak_escape` with respect to `held`, 1/eV."""
    scale = peak.scale_eV
    if peak.law == "chung_everhart_1974":
        if planar:
            slope = ((excess + scale) ** -3 - (held + scale) ** -3) / 3.0
        else:
            slope = -held / (held + scale) ** 4
    elif planar:
        slope = -(np.exp(-held / scale) - np.exp(-excess / scale)) / scale
    else:
        slope = -held / scale**2 * np.exp(-held / scale)
    return np.asarray(slope / _norm(excess, peak))


def peak_mean(excess: Array, peak: LowEnergyPeak) -> Array:
    """Mean energy of collided electrons [eV]."""
    scale = peak.scale_eV
    ratio = excess / scale
    if peak.law == "chung_everhart_1974":
        # int x^2/(1+x)^4 = x^3/(3 (1+x)^3), int x/(1+x)^4 = x^2 (3+x)/(6 (1+x)^3)
        return np.asarray(scale * 2.0 * ratio / (3.0 + ratio))
    small = ratio < 1e-3
    x = np.where(small, 1.0, ratio)
    tail = np.exp(-x)
    mean = (2.0 - tail * (2.0 + 2.0 * x + x**2)) / (1.0 - tail * (1.0 + x))
    return np.asarray(scale * np.where(small, ratio * (2.0 / 3.0 - ratio / 18.0), mean))


def _norm(excess: Array, peak: LowEnergyPeak) -> Array:
    """Integral of the unnormalised law from 0 to W; by series where W is small."""
    scale = peak.scale_eV
    x = excess / scale
    if peak.law == "chung_everhart_1974":
        return np.asarray(x**2 * (3.0 + x) / (6.0 * (1.0 + x) ** 3) / scale**2)
    small = x < 1e-3
    safe = np.where(small, 1.0, x)
    whole = -np.expm1(-safe) - safe * np.exp(-safe)
    return np.asarray(np.where(small, x**2 * (0.5 - x / 3.0), whole))


def _above(held: Array, excess: Array, climb: Array, peak: LowEnergyPeak) -> Array:
    """Integral of (E - climb) times the rest of the law over held < E < excess."""
    scale = peak.scale_eV
    span = excess - held
    if peak.law == "chung_everhart_1974":
        # with a = held + scale, b = excess + scale: exact, no cancellation
        a, b = held + scale, excess + scale
        half = span * (a + b) / (2.0 * a**2 * b**2)
        third = span * (a**2 + a * b + b**2) / (3.0 * a**3 * b**3)
        offset = scale + climb
        return np.asarray(half - offset * third)
    x, y = held / scale, span / scale
    small = y < 1e-3
    safe = np.where(small, 1.0, y)
    plane = np.where(small, y**2 * (0.5 - y / 3.0), -np.expm1(-safe) - safe * np.exp(-safe))
    level = np.where(small, y * (1.0 - 0.5 * y), -np.expm1(-safe))
    return np.asarray(np.exp(-x) * (plane + (x - climb / scale) * level))
