r"""Currents of drifting Maxwellian populations on patches: ram, flank and wake.

A craft moves at speed u through a species at rest elsewhere. With :math:`w = \sqrt{2eT/m}`
and the speed ratio :math:`S = u/w`, oxygen ions in low orbit have S near 5, hydrogen
near 1.2: only light ions fill a wake by their own motion. Two limits bracket the rest:

* thin sheath: what crosses the undisturbed edge arrives, whatever the attracting potential;
* thick sheath: ions follow Kepler orbits in the Coulomb field of the charged body, a sphere.
  They are focused on the ram side and bent round into the wake (the deflected ions).

Both are closed problems without a fitted number; the sheath weight blends them.
"""

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import atomic_mass, e
from scipy.special import erfc, erfcx

from charging.currents.focus import focused_flux

Array = NDArray[np.float64]

_HEAVY_KG: Final = 8.0 * atomic_mass


class FlowCurrent(NamedTuple):
    """Current density [A m-2] and its derivative by potential [A m-2 V-1], same shape."""

    current_A_m2: Array
    slope_A_m2_V: Array


def drifting_flux(speed_ratio: ArrayLike) -> Array:
    r"""One-sided flux of a drifting Maxwellian in units of the flux at rest.

    :math:`e^{-S^2} + \sqrt\pi\,S\,(1 + \mathrm{erf}\,S)`, S the drift towards the plane over
    the thermal speed.

    Parameters
    ----------
    speed_ratio : array_like
        S, positive towards the plane (ram), negative away from it (wake).

    Returns
    -------
    ndarray
        1 at rest, 2 sqrt(pi) S for S >> 1; keeps its relative accuracy in the wake down to
        1e-300.

    References
    ----------
    Bird (1994), Molecular Gas Dynamics, sec. 4.2 (section from memory).

    Examples
    --------
    >>> drifting_flux([-2.0, 0.0, 5.0]).round(6).tolist()
    [0.001734, 1.0, 17.724539]
    """
    S = np.asarray(speed_ratio, dtype=np.float64)
    return _drifting(S, np.zeros_like(S))


def plane_limit(
    potential_V: ArrayLike,
    density_m3: ArrayLike,
    temperature_eV: ArrayLike,
    mass_kg: ArrayLike,
    charge_number: ArrayLike,
    speed_m_s: ArrayLike,
    cosine: ArrayLike,
) -> FlowCurrent:
    r"""Thin sheath: current of a drifting Maxwellian on a patch.

    Attracted: the flux through the sheath's edge, independent of the potential. Repelled:
    those whose energy along the normal suffices,
    :math:`J = q n \frac{w}{2\sqrt\pi}[e^{-(c-S)^2} + \sqrt\pi S\,\mathrm{erfc}(c - S)]`,
    :math:`c = \sqrt{q\varphi/eT}`.

    Parameters
    ----------
    potential_V : array_like
        Against the plasma [V].
    density_m3, temperature_eV : array_like
        Undisturbed, temperature > 0.
    mass_kg, charge_number : array_like
        Of one particle; signed charge in e.
    speed_m_s : array_like
        Speed of the craft through the species, >= 0 [m s-1].
    cosine : array_like
        Outward normal times direction of the craft's motion through the species: 1 ram,
        -1 wake.

    Returns
    -------
    FlowCurrent
        Arguments broadcast; positive = positive charge arriving.

    Notes
    -----
    Valid: sheath thin against the patch, no field along it, non-relativistic. Equals the
    planar limit of a population at rest at speed 0. Below the thermal flux in the wake it is
    the lower bound of an attracted species: no ion is bent.

    References
    ----------
    Whipple (1981), Rep. Prog. Phys. 44, 1197, sec. 3 (section from memory).
    """
    q = np.asarray(charge_number, dtype=np.float64)
    T = np.asarray(temperature_eV, dtype=np.float64)
    w = np.sqrt(2.0 * e * T / np.asarray(mass_kg))
    S = np.asarray(speed_m_s) * np.asarray(cosine) / w
    barrier = np.asarray(potential_V) * q / T
    c = np.sqrt(np.maximum(barrier, 0.0))
    scale = e * q * np.asarray(density_m3) * w / (2.0 * np.sqrt(np.pi))
    S, c = np.broadcast_arrays(S, c)
    current = scale * _drifting(S, c)
    # the derivative of the bracket by c is -2 c exp(-(c-S)^2), and 2 c dc = q dphi/T
    slope = np.where(barrier > 0.0, -scale * np.exp(-((c - S) ** 2)) * q / T, 0.0)
    return FlowCurrent(current, np.broadcast_to(slope, current.shape))


def thick_limit(
    potential_V: ArrayLike,
    density_m3: ArrayLike,
    temperature_eV: ArrayLike,
    mass_kg: ArrayLike,
    charge_number: ArrayLike,
    speed_m_s: ArrayLike,
    cosine: ArrayLike,
) -> FlowCurrent:
    """Thick sheath: current of a drifting Maxwellian on a patch of a sphere.

    Attracted particles follow Kepler orbits in the Coulomb field of a sphere at the patch's
    potential; see `focused_flux`. A repelled species takes the planar form, equal to the
    exact one at rest.

    Parameters
    ----------
    potential_V, density_m3, temperature_eV, mass_kg, charge_number, speed_m_s, cosine
        As in `plane_limit`.

    Returns
    -------
    FlowCurrent

    Notes
    -----
    Upper bound of an attracted species. A quadrature per element: tabulate it.
    """
    plane = plane_limit(
        potential_V, density_m3, temperature_eV, mass_kg, charge_number, speed_m_s, cosine
    )
    q = np.asarray(charge_number, dtype=np.float64)
    T = np.asarray(temperature_eV, dtype=np.float64)
    w = np.sqrt(2.0 * e * T / np.asarray(mass_kg))
    u = np.maximum(-np.asarray(potential_V) * q / T, 0.0)
    shape = plane.current_A_m2.shape
    full = [np.broadcast_to(a, shape) for a in (np.asarray(speed_m_s) / w, cosine, u)]
    drawn = full[2] > 0.0
    flux, slope = focused_flux(*(a[drawn] for a in full))
    scale = np.broadcast_to(e * q * np.asarray(density_m3) * w / (2.0 * np.sqrt(np.pi)), shape)
    per_volt = np.broadcast_to(-q / T, shape)
    current, derivative = np.array(plane.current_A_m2), np.array(plane.slope_A_m2_V)
    current[drawn] = scale[drawn] * flux
    derivative[drawn] = scale[drawn] * slope * per_volt[drawn]
    return FlowCurrent(current, derivative)


def flow_current(
    potential_V: ArrayLike,
    density_m3: ArrayLike,
    temperature_eV: ArrayLike,
    mass_kg: ArrayLike,
    charge_number: ArrayLike,
    speed_m_s: ArrayLike,
    cosine: ArrayLike,
    *,
    thick_weight: ArrayLike,
    thick_weight_slope: ArrayLike = 0.0,
) -> FlowCurrent:
    """Current of a drifting Maxwellian on a patch, blended between both sheath limits.

    Parameters
    ----------
    potential_V, density_m3, temperature_eV, mass_kg, charge_number, speed_m_s, cosine
        As in `plane_limit`.
    thick_weight, thick_weight_slope : array_like
        Share of the thick limit, 0 to 1, and its derivative by potential [1/V], as of
        `charging.currents.collection.sheath_weight`.

    Returns
    -------
    FlowCurrent
    """
    where = (density_m3, temperature_eV, mass_kg, charge_number, speed_m_s, cosine)
    plane, thick = plane_limit(potential_V, *where), thick_limit(potential_V, *where)
    gain = thick.current_A_m2 - plane.current_A_m2
    weight = np.asarray(thick_weight)
    more = thick.slope_A_m2_V - plane.slope_A_m2_V
    return FlowCurrent(
        plane.current_A_m2 + weight * gain,
        plane.slope_A_m2_V + weight * more + np.asarray(thick_weight_slope) * gain,
    )


def wake_assessable(
    density_m3: ArrayLike, mass_kg: ArrayLike, speed_ratio: ArrayLike, cosine: ArrayLike
) -> NDArray[np.bool_]:
    """Whether the ion current of a patch rests on more than bent heavy ions.

    Parameters
    ----------
    density_m3, mass_kg, speed_ratio : array_like, shape (..., Q)
        Of the ions; speed of the craft over their w.
    cosine : array_like, shape (..., Q)
        1 ram to -1 wake.

    Returns
    -------
    ndarray of bool, shape (...,)
        False in the wake of a plasma whose ions are all heavier than He+ and faster than
        their thermal speed: nothing but the orbit model then feeds the patch, no light ion
        fills the wake by its own motion, and no voltage is to be given.

    Notes
    -----
    A species counts from a thousandth of all ions. Every measured topside ionosphere holds
    light ions; a plasma without them is an incomplete record.

    Examples
    --------
    >>> oxygen, hydrogen = 2.656e-26, 1.673e-27
    >>> n = [[1e9, 0.0], [1e9, 1e8]]
    >>> wake_assessable(n, [oxygen, hydrogen], [5.0, 1.2], -1.0).tolist()
    [False, True]
    """
    n = np.asarray(density_m3, dtype=np.float64)
    counts = n > 1e-3 * np.sum(n, axis=-1, keepdims=True)
    slow = np.asarray(speed_ratio) * np.asarray(cosine) > -1.0
    feeds = counts & (slow | (np.asarray(mass_kg) < _HEAVY_KG))
    return np.asarray(np.any(feeds, axis=-1))


def _drifting(S: Array, c: Array) -> Array:
    """exp(-(c-S)^2) + sqrt(pi) S erfc(c-S), its two terms cancelling in the wake."""
    d = c - S
    deep = d > 0.0
    safe = np.where(deep, d, 0.0)
    # exp(-d^2) (1 + sqrt(pi) S erfcx(d)): one factor carries the smallness
    inner = 1.0 + np.sqrt(np.pi) * S * erfcx(safe)
    # S = -d with c = 0 and d >> 1 leaves 1/(2 d^2) of 1: the series of erfcx instead
    far = (c == 0.0) & (safe > 30.0)
    d2 = np.where(far, safe, 30.0) ** -2.0
    inner = np.where(far, d2 * (0.5 - d2 * (0.75 - d2 * (1.875 - 6.5625 * d2))), inner)
    direct = np.exp(-(np.where(deep, 0.0, d) ** 2)) + np.sqrt(np.pi) * S * erfc(
        np.where(deep, 0.0, d)
    )
    return np.asarray(np.where(deep, np.exp(-(safe**2)) * inner, direct), dtype=np.float64)
