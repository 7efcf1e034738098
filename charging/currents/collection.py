r"""Collection of a Maxwellian population by a charged surface.

All functions work on the reduced potential :math:`u = |q\varphi|/T \ge 0`
of an attracted species and give the factor by which the one-sided thermal
current density is multiplied. A repelled species has :math:`e^{-u}` in every
geometry (Liouville's theorem with an isotropic Maxwellian).
"""

from collections.abc import Callable
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import erfcx

Array = NDArray[np.float64]


def plane_factor(u: Array) -> Array:
    """Thin sheath: every particle that crosses the sheath edge arrives, factor 1.

    Lower bound of the current of an attracted species. `u` has any shape.
    """
    return np.ones_like(u)


def sphere_factor(u: Array) -> Array:
    r"""Thick-sheath (OML) sphere, :math:`1 + u`.

    Upper bound of the current of an attracted species; valid for a sheath much
    larger than the body.

    References
    ----------
    Mott-Smith & Langmuir (1926), Phys. Rev. 28, 727 (equation from memory).
    """
    return 1.0 + u


def cylinder_factor(u: Array) -> Array:
    r"""Thick-sheath (OML) cylinder, :math:`2\sqrt{u/\pi} + e^u \mathrm{erfc}\sqrt{u}`.

    The average of :math:`(2/\pi)[\sqrt{w} + (1+w)\arctan(1/\sqrt{w})]`,
    :math:`w = |q\varphi|/E`, over a Maxwellian flux.

    References
    ----------
    Mott-Smith & Langmuir (1926), Phys. Rev. 28, 727 (equation from memory).
    """
    root = np.sqrt(u)
    return np.asarray(2.0 / np.sqrt(np.pi) * root + erfcx(root), dtype=np.float64)


def _plane_slope(u: Array) -> Array:
    return np.zeros_like(u)


def _sphere_slope(u: Array) -> Array:
    return np.ones_like(u)


def _cylinder_slope(u: Array) -> Array:
    # d/du [2 sqrt(u/pi) + erfcx(sqrt u)] = erfcx(sqrt u), exactly
    return np.asarray(erfcx(np.sqrt(u)), dtype=np.float64)


class Geometry(NamedTuple):
    """Collection factor of a body shape, its slope, and its factor per energy.

    `factor(u)` and `slope(u)` belong to a Maxwellian; `per_energy(w)` with
    w = |q phi|/E to one energy, as needed under an integral over energies.
    """

    factor: Callable[[Array], Array]
    slope: Callable[[Array], Array]
    per_energy: Callable[[Array], Array]


def _cylinder_per_energy(w: Array) -> Array:
    root = np.sqrt(w)
    return 2.0 / np.pi * (root + (1.0 + w) * np.arctan2(1.0, root))


PLANE = Geometry(plane_factor, _plane_slope, np.ones_like)
SPHERE = Geometry(sphere_factor, _sphere_slope, lambda w: 1.0 + w)
CYLINDER = Geometry(cylinder_factor, _cylinder_slope, _cylinder_per_energy)

COLLECTIONS = ("auto", "sphere", "cylinder", "plane")


def thick_geometry(collection: str) -> Geometry:
    """Return the thick-sheath limit that belongs to a `collection` keyword."""
    return CYLINDER if collection == "cylinder" else SPHERE


ROUNDING_V, ROUNDING_OF_T = 0.05, 0.25
"""Half-width of the rounded corner at 0 V [V], and the most as a share of the temperature."""
COLD_EV = 10.0
"""Temperature from which the corner stays: what hotter plasmas bring hardly bends at 0 V."""


def rounded_pull(pull_V: Array, temperature_eV: Array) -> tuple[Array, Array]:
    r"""Attracting part of a potential [V] and its derivative, the corner at 0 V rounded.

    The thin-sheath current of a Maxwellian has a corner at 0 V, where attraction begins; an
    implicit integrator freezes on it. With the half-width d = min(`ROUNDING_V`, T/4), 0 from
    `COLD_EV` on, this is exactly max(pull, 0) outside ±d, and inside a polynomial with three
    continuous derivatives, at most 0.137 d above it. The repelling part is what is left,
    :math:`r = a - pull \ge 0`, so nothing is counted twice; the current errs by 3.4 percent at
    most, at 0 V, and by 0.7 percent for 1 eV.

    Examples
    --------
    >>> [x.tolist() for x in rounded_pull(np.array([-0.1, 0.0, 0.1]), np.array(1.0))]
    [[0.0, 0.0068359375, 0.1], [0.0, 0.5, 1.0]]
    """
    value = np.maximum(pull_V, 0.0)
    slope = np.asarray(pull_V > 0.0, dtype=np.float64)
    if not bool((np.abs(pull_V) < ROUNDING_V).any()):
        return np.asarray(value), slope
    d = np.minimum(ROUNDING_V, ROUNDING_OF_T * temperature_eV)
    d = np.where(temperature_eV < COLD_EV, d, 0.0)
    inside = np.abs(pull_V) < d
    if not bool(inside.any()):
        return np.asarray(value), slope
    s = np.where(inside, pull_V, 0.0) / np.where(d > 0.0, d, 1.0)
    s2 = s * s
    # the integral of the odd polynomial that joins -1/2 to 1/2 with three flat derivatives
    rise = s * (35.0 - s2 * (35.0 - s2 * (21.0 - 5.0 * s2))) / 32.0
    even = (4.375 + s2 * (17.5 - s2 * (8.75 - s2 * (3.5 - 0.625 * s2)))) / 32.0
    return (
        np.where(inside, d * (even + 0.5 * s), value),
        np.where(inside, 0.5 + rise, slope),
    )


class SheathWeight(NamedTuple):
    """Length [m], thick-sheath share 0…1 and its derivative by potential [1/V]."""

    length_m: Array
    weight: Array
    slope: Array


def sheath_weight(
    potential_V: Array,
    *,
    debye_length_m: Array,
    temperature_eV: Array,
    radius_m: float | Array,
    collection: str,
) -> SheathWeight:
    r"""Share of the thick-sheath limit in the collection of an attracted species.

    :math:`w = s^2/(s^2 + R^2)` with the sheath length
    :math:`s = \max(\lambda_D, \tfrac{\sqrt2}{3}\lambda_D (2|\varphi|/T)^{3/4})`;
    then :math:`J = (1-w) J_{plane} + w J_{thick}`. The Child-Langmuir length is
    published physics; the blend is this project's own (`assumed`). `collection`
    other than "auto" sets w to 0 (plane) or 1 (sphere, cylinder).

    Parameters
    ----------
    potential_V : ndarray
        Potential against the plasma [V], any shape.
    debye_length_m, temperature_eV : ndarray
        Electron Debye length and the electron temperature that belongs to it,
        broadcast against `potential_V`.
    radius_m : float or ndarray
        Radius of the body [m].
    collection : {"auto", "sphere", "cylinder", "plane"}

    References
    ----------
    Lieberman & Lichtenberg (2005), Principles of Plasma Discharges, sec. 6.3
    (Child law sheath; section from memory).
    """
    u = 2.0 * np.abs(potential_V) / temperature_eV
    child = np.sqrt(2.0) / 3.0 * u**0.75
    grows = child > 1.0
    length = debye_length_m * np.where(grows, child, 1.0)
    if collection != "auto":
        fixed = 0.0 if collection == "plane" else 1.0
        return SheathWeight(length, np.full_like(length, fixed), np.zeros_like(length))
    s2 = length**2
    weight = s2 / (s2 + radius_m**2)
    # dw/ds = 2 s R^2/(s^2+R^2)^2 and ds/dphi = 0.75 s/phi where the Child length rules
    safe = np.where(grows, potential_V, 1.0)
    slope = np.where(grows, 1.5 * weight * (1.0 - weight) / safe, 0.0)
    return SheathWeight(length, weight, slope)
