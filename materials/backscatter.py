"""Backscattered electrons: those that leave a surface with more than 50 eV.

Coefficients are electrons per incident electron. The two laws here are
independent: one carries three coefficients per material, the other knows
the atomic number alone.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from materials.angle import backscatter_angle_coefficient, exponential_angle_factor
from materials.errors import finite_array


def prokopenko_laframboise_1980(
    energy_eV: ArrayLike,
    *,
    high_energy: ArrayLike,
    low_energy_drop: ArrayLike = 0.0,
    drop_energy_eV: ArrayLike = 4000.0,
) -> NDArray[np.float64]:
    r"""Backscatter coefficient at normal incidence, three coefficients per material.

    :math:`\eta = A - B\,e^{-E/E_c}` with A `high_energy`, B `low_energy_drop`,
    :math:`E_c` `drop_energy_eV` (the inverse of the published C).

    Parameters
    ----------
    energy_eV : array_like
        Electron energy at the surface [eV], >= 0.
    high_energy : array_like
        Coefficient well above the drop energy, 0 to 1.
    low_energy_drop : array_like, optional
        By how much the coefficient is smaller at zero energy; negative
        where light elements scatter more at low energy.
    drop_energy_eV : array_like, optional
        Energy scale of the drop [eV]; without effect when the drop is 0.

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
    Used from about 0.2 to 50 keV. Below 200 eV "backscattered" and "secondary"
    cannot be told apart and the law is a convention.

    References
    ----------
    Prokopenko & Laframboise (1980), J. Geophys. Res. 85, 4125 (form from memory).

    Examples
    --------
    >>> round(float(prokopenko_laframboise_1980(1e4, high_energy=0.16)), 3)
    0.16
    """
    energy = finite_array("energy_eV", energy_eV, at_least=0.0)
    a = finite_array("high_energy", high_energy, at_least=0.0, at_most=1.0)
    b = finite_array("low_energy_drop", low_energy_drop, at_least=-1.0, at_most=1.0)
    scale = finite_array("drop_energy_eV", drop_energy_eV, above=0.0)
    return np.asarray(a - b * np.exp(-energy / scale))


def hunger_kuchler_1979(
    energy_eV: ArrayLike, *, mean_atomic_number: ArrayLike
) -> NDArray[np.float64]:
    r"""Backscatter coefficient at normal incidence from the atomic number.

    :math:`\eta = (0.1904 - 0.2235 L + 0.1292 L^2 - 0.01491 L^3)\,
    E^{\,0.1382 - 0.9211/\sqrt{Z}}`, L = ln Z, E in keV.

    Parameters
    ----------
    energy_eV : array_like
        Electron energy [eV], > 0; fitted between 4 and 40 keV.
    mean_atomic_number : array_like
        Z of the element, 4 to 100; for compounds use mass fractions on the
        coefficients of the elements, or the mean Z as an approximation.

    Returns
    -------
    ndarray
        Electrons per incident electron, broadcast shape.

    Raises
    ------
    ValueError
        Energy not positive, Z outside 4 to 100, or not finite.

    References
    ----------
    Hunger & Küchler (1979), Phys. Status Solidi A 56, K45 (coefficients as
    carried by open microanalysis software).

    Examples
    --------
    >>> round(float(hunger_kuchler_1979(10e3, mean_atomic_number=79)), 2)
    0.47
    """
    energy_keV = finite_array("energy_eV", energy_eV, above=0.0) / 1e3
    z = finite_array("mean_atomic_number", mean_atomic_number, at_least=4.0, at_most=100.0)
    log_z = np.log(z)
    level = 0.1904 + log_z * (-0.2235 + log_z * (0.1292 - 0.01491 * log_z))
    return np.asarray(level * energy_keV ** (0.1382 - 0.9211 / np.sqrt(z)))


def isotropic_backscatter(
    energy_eV: ArrayLike,
    *,
    high_energy: ArrayLike,
    low_energy_drop: ArrayLike = 0.0,
    drop_energy_eV: ArrayLike = 4000.0,
    mean_atomic_number: ArrayLike,
) -> NDArray[np.float64]:
    """Backscatter coefficient averaged over an isotropic flux on a plane.

    `prokopenko_laframboise_1980` times the average of the angle law.

    Parameters
    ----------
    energy_eV : array_like
        Electron energy at the surface [eV], >= 0.
    high_energy, low_energy_drop, drop_energy_eV : array_like
        As in `prokopenko_laframboise_1980`.
    mean_atomic_number : array_like
        Mean Z, 4 to 100; sets the growth towards grazing incidence.

    Returns
    -------
    ndarray
        Electrons per incident electron, broadcast shape. Not capped: with
        values no real surface has, it can exceed 1.

    Raises
    ------
    ValueError
        An argument is not finite or out of its range.

    References
    ----------
    As `prokopenko_laframboise_1980` and `backscatter_angle_coefficient`.

    Examples
    --------
    >>> round(float(isotropic_backscatter(5e3, high_energy=0.16, mean_atomic_number=13)), 3)
    0.309
    """
    normal = prokopenko_laframboise_1980(
        energy_eV,
        high_energy=high_energy,
        low_energy_drop=low_energy_drop,
        drop_energy_eV=drop_energy_eV,
    )
    return np.asarray(
        normal * exponential_angle_factor(backscatter_angle_coefficient(mean_atomic_number))
    )


def maxwellian_backscatter(
    temperature_eV: ArrayLike,
    *,
    high_energy: ArrayLike,
    low_energy_drop: ArrayLike = 0.0,
    drop_energy_eV: ArrayLike = 4000.0,
) -> NDArray[np.float64]:
    r"""Normal-incidence coefficient averaged over a Maxwellian flux.

    :math:`\langle\eta\rangle = A - B\,(1 + T/E_c)^{-2}`, weight
    :math:`E\,e^{-E/T}/T^2`. Multiply by `exponential_angle_factor` of
    `backscatter_angle_coefficient` for an isotropic flux. A repelling potential leaves
    the weight as it is, so the average does not depend on it.

    Parameters
    ----------
    temperature_eV : array_like
        Electron temperature [eV], > 0.
    high_energy, low_energy_drop, drop_energy_eV : array_like
        As in `prokopenko_laframboise_1980`.

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
    >>> float(maxwellian_backscatter(2e3, high_energy=0.4, low_energy_drop=0.4,
    ...                              drop_energy_eV=2e3).round(3))
    0.3
    """
    t = finite_array("temperature_eV", temperature_eV, above=0.0)
    a = finite_array("high_energy", high_energy, at_least=0.0, at_most=1.0)
    b = finite_array("low_energy_drop", low_energy_drop, at_least=-1.0, at_most=1.0)
    scale = finite_array("drop_energy_eV", drop_energy_eV, above=0.0)
    return np.asarray(a - b / (1.0 + t / scale) ** 2)
