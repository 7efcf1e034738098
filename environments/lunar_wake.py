"""The hole that the Moon leaves in a stream of plasma."""

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.constants import e, m_p

from environments.coefficients import Coefficient
from environments.moon import MOON_RADIUS_M
from environments.population_series import smoothstep
from environments.vectors import direction, length

Array = NDArray[np.float64]

COEFFICIENTS: Final = (
    Coefficient("density in the centre of the wake over that outside", (0.01,), "1", "memory",
                "Ogilvie et al. 1996; Halekas et al. 2005, 2011 (0.001 to 0.05)"),
    Coefficient("adiabatic index of the ions in the sound speed", (3.0,), "1", "derived",
                "one-dimensional expansion"),
    Coefficient("way behind the limb over which the wake begins", (0.1,), "lunar radii",
                "assumed", "6 deg of the surface, so that the terminator is no jump"),
)  # fmt: skip
"""Figures of this module."""


class Wake(NamedTuple):
    """The wake at N places.

    Attributes
    ----------
    share : ndarray
        0 in the stream to 1 in the centre of the wake.
    density_factor : ndarray
        Density over that of the stream, 1 - share (1 - 0.01).
    """

    share: Array
    density_factor: Array


def lunar_wake(from_moon_m: Array, stream_m_s: Array, electron_eV: Array, proton_eV: Array) -> Wake:
    """How far places lie in the wake of the Moon.

    Parameters
    ----------
    from_moon_m : ndarray, shape (3, N)
        Place from the Moon's centre [m].
    stream_m_s : ndarray, shape (3, N)
        Velocity of the plasma against the Moon [m s-1], not zero.
    electron_eV, proton_eV : ndarray, shape (N,)
        Temperatures of the stream [eV].

    Returns
    -------
    Wake
        Density n0 exp(-(1 + d/(c t))) where d is the depth inside of the Moon's shadow in the
        stream and t the time since the plasma passed its limb, down to 0.01 of the stream.

    Notes
    -----
    Expansion into empty space at the ion sound speed c, one-dimensional from every limb, the
    field's direction not counted; the wake closes after some 10 lunar radii. The published
    density "falls exponentially from edge to centre". Electrons: see `filtered_electrons`.

    References
    ----------
    Samir, Wright & Stone (1983), Rev. Geophys. 21, 1631 (self-similar expansion); Ogilvie et
    al. (1996), Geophys. Res. Lett. 23, 1255 (used for the Moon).
    """
    along = direction(stream_m_s)
    behind = np.sum(from_moon_m * along, axis=0)
    across = length(from_moon_m - behind * along)
    sound = np.sqrt(e * (electron_eV + COEFFICIENTS[1].first * proton_eV) / m_p)
    reach = sound * np.maximum(behind, 0.0) / length(stream_m_s)
    depth = MOON_RADIUS_M - across
    # -1 where the rarefaction has not arrived; a place at the terminator has reach 0
    passed = np.where(reach > 0.0, depth / np.where(reach > 0.0, reach, 1.0), -1.0)
    floor = COEFFICIENTS[0].first
    begun = smoothstep(behind, 0.0, COEFFICIENTS[2].first * MOON_RADIUS_M)
    left = np.maximum(np.exp(-begun * np.clip(1.0 + passed, 0.0, 700.0)), floor)
    return Wake((1.0 - left) / (1.0 - floor), left)


def filtered_electrons(
    core_m3: Array,
    core_eV: Array,
    halo_m3: Array,
    halo_eV: Array,
    kappa: float,
    density_factor: Array,
) -> tuple[Array, Array, Array]:
    r"""Core and halo electrons behind the potential that thins them out.

    Parameters
    ----------
    core_m3, core_eV, halo_m3, halo_eV : ndarray, shape (N,)
        Maxwellian core and kappa halo of the stream [m-3], [eV].
    kappa : float
        Index of the halo, > 1.5.
    density_factor : ndarray, shape (N,)
        Electrons left over those of the stream, 0 to 1.

    Returns
    -------
    core_m3, halo_m3, potential_V : ndarray, shape (N,)
        Densities in the wake, and its potential below the stream, >= 0. The core keeps its
        temperature; that of the halo grows by potential / (kappa - 3/2).

    Notes
    -----
    Electrons in a repelling potential :math:`\phi`, collisionless, isotropic: a Maxwellian
    thins as :math:`e^{-\phi/T}`, a kappa distribution as
    :math:`(1 + \phi/((\kappa - 3/2) T))^{1/2 - \kappa}`. The halo gets through, which is why
    electrons in the wake are hotter.

    References
    ----------
    Pierrard & Lazar (2010), Solar Phys. 267, 153 (kappa in a potential, from memory); Halekas
    et al. (2005), J. Geophys. Res. 110, A07222 (in the lunar wake).

    Examples
    --------
    >>> one = np.ones(1)
    >>> found = filtered_electrons(0.955 * one, 10 * one, 0.045 * one, 60 * one, 4.0, 0.01 * one)
    >>> [float(x[0].round(4)) for x in found]
    [0.0003, 0.0097, 82.2424]
    """
    width = (kappa - 1.5) * halo_eV
    power = 0.5 - kappa
    if bool(np.all(density_factor == 1.0)):
        return core_m3, halo_m3, np.zeros_like(core_m3)
    by_core = -core_eV * np.log(density_factor)
    by_halo = width * (density_factor ** (1.0 / power) - 1.0)
    low, high = np.minimum(by_core, by_halo), np.maximum(by_core, by_halo)
    wanted = density_factor * (core_m3 + halo_m3)
    for _ in range(52):
        middle = 0.5 * (low + high)
        left = core_m3 * np.exp(-middle / core_eV) + halo_m3 * (1.0 + middle / width) ** power
        low, high = np.where(left > wanted, middle, low), np.where(left > wanted, high, middle)
    phi = 0.5 * (low + high)
    return core_m3 * np.exp(-phi / core_eV), halo_m3 * (1.0 + phi / width) ** power, phi
