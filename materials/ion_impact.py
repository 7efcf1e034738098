"""Electrons that arriving ions set free."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from materials.arguments import impact_energy, maximum


def whipple_1981(
    energy_eV: ArrayLike, *, peak_yield: ArrayLike, peak_energy_eV: ArrayLike
) -> NDArray[np.float64]:
    r"""Electrons per proton at normal incidence.

    :math:`\gamma = 2\gamma_m\sqrt{E/E_m}/(1 + E/E_m)`: the maximum is
    `peak_yield` at `peak_energy_eV`.

    Parameters
    ----------
    energy_eV : array_like
        Ion energy at the surface [eV], >= 0.
    peak_yield, peak_energy_eV : array_like
        Maximum yield and the energy where it is reached [eV], > 0.

    Returns
    -------
    ndarray
        Electrons per incident ion, broadcast shape.

    Raises
    ------
    ValueError
        An argument is not finite or out of its range.

    Notes
    -----
    Normal incidence, because ions attracted through a planar sheath arrive
    near the normal; an isotropic flux gives about twice as many. Fitted to
    protons of 1 to 100 keV. The square root overstates the yield below some
    tens of eV (kinetic emission has a threshold near 1e5 m/s); heavier ions
    below about 1 keV emit far less than the formula gives.

    References
    ----------
    Whipple (1981), Rep. Prog. Phys. 44, 1197 (form from memory).

    Examples
    --------
    >>> whipple_1981([5e3, 90e3], peak_yield=4.28, peak_energy_eV=90e3).round(3).tolist()
    [1.911, 4.28]
    """
    return whipple_kernel(impact_energy(energy_eV), *maximum(peak_yield, peak_energy_eV))


def whipple_kernel(
    energy_eV: NDArray[np.float64],
    peak_yield: NDArray[np.float64],
    peak_energy_eV: NDArray[np.float64],
) -> NDArray[np.float64]:
    """`whipple_1981` without its checks, for arrays that broadcast."""
    x = energy_eV / peak_energy_eV
    return np.asarray(2.0 * peak_yield * np.sqrt(x) / (1.0 + x))
