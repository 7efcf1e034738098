"""Backscattered electrons: those that leave a surface with more than 50 eV.

Coefficients are electrons per incident electron. The two laws here are
independent: one carries three coefficients per material, the other knows
the atomic number alone.
"""

from __future__ import annotations

from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from materials.angle import backscatter_angle_coefficient, exponential_angle_factor
from materials.arguments import (
    atomic_number,
    backscatter_levels,
    impact_energy,
    temperature,
)
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
    energy = impact_energy(energy_eV)
    a, b, scale = backscatter_levels(high_energy, low_energy_drop, drop_energy_eV)
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

    Result and errors as `prokopenko_laframboise_1980`.

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
    z = atomic_number(mean_atomic_number)
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

    Arguments and errors as that law, with the mean Z, 4 to 100, which sets the growth towards
    grazing incidence. Not capped: with values no real surface has, it can exceed 1.

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

    Temperature [eV], > 0; the rest as `prokopenko_laframboise_1980`.

    Examples
    --------
    >>> float(maxwellian_backscatter(2e3, high_energy=0.4, low_energy_drop=0.4,
    ...                              drop_energy_eV=2e3).round(3))
    0.3
    """
    t = temperature(temperature_eV)
    a, b, scale = backscatter_levels(high_energy, low_energy_drop, drop_energy_eV)
    return np.asarray(a - b / (1.0 + t / scale) ** 2)


BackscatterLaw = Literal["prokopenko_laframboise_1980", "hunger_kuchler_1979"]
BACKSCATTER_LAWS: tuple[BackscatterLaw, ...] = (
    "prokopenko_laframboise_1980",
    "hunger_kuchler_1979",
)

AngleLaw = Literal["darlington_cosslett_1972", "darlington_1975"]
ANGLE_LAWS: tuple[AngleLaw, ...] = ("darlington_cosslett_1972", "darlington_1975")

HELD_BELOW_EV = 1000.0


def hunger_kuchler_held(
    energy_eV: ArrayLike, *, mean_atomic_number: ArrayLike
) -> NDArray[np.float64]:
    r"""`hunger_kuchler_1979` carried to all energies.

    The power of the energy grows without limit towards 0 in light elements, far below the
    4 keV where the fit ends; :math:`\sqrt{E^2 + (1\,\mathrm{keV})^2}` in place of E levels it
    off (assumed; less than 3 percent at 4 keV).

    Examples
    --------
    >>> hunger_kuchler_held([0.0, 4e3, 2e4], mean_atomic_number=6.0).round(3).tolist()
    [0.119, 0.085, 0.058]
    """
    energy = impact_energy(energy_eV)
    return hunger_kuchler_1979(
        np.hypot(energy, HELD_BELOW_EV), mean_atomic_number=mean_atomic_number
    )


def oblique_backscatter(
    normal: ArrayLike,
    cosine: ArrayLike,
    *,
    angle: AngleLaw = "darlington_cosslett_1972",
    mean_atomic_number: ArrayLike,
) -> NDArray[np.float64]:
    r"""Backscatter coefficient at an angle of incidence.

    "darlington_cosslett_1972": :math:`\eta_0 e^{c(1-\mu)}` with c of
    `backscatter_angle_coefficient`; "darlington_1975": :math:`0.891\,(\eta_0/0.891)^\mu`.

    Parameters
    ----------
    normal : array_like
        Coefficient at normal incidence, 0 to 0.891 for the second law.
    cosine : array_like
        Cosine of the angle from the normal, 0 to 1.
    angle : str, optional
        One of `ANGLE_LAWS`.
    mean_atomic_number : array_like
        Mean Z, 4 to 100; used by the first law.

    Raises
    ------
    ValueError
        Unknown law, or an argument not finite or out of its range.

    References
    ----------
    Darlington & Cosslett (1972), J. Phys. D 5, 1969, as fitted by Laframboise & Kamitsuma
    (1983); Darlington (1975), J. Phys. D 8, 85 (both memory).

    Examples
    --------
    >>> [round(float(oblique_backscatter(0.16, 0.5, angle=a, mean_atomic_number=13)), 3)
    ...  for a in ANGLE_LAWS]
    [0.377, 0.378]
    """
    eta = finite_array("normal", normal, at_least=0.0, at_most=1.0)
    mu = finite_array("cosine", cosine, at_least=0.0, at_most=1.0)
    if angle == "darlington_cosslett_1972":
        return np.asarray(
            eta * np.exp(backscatter_angle_coefficient(mean_atomic_number) * (1.0 - mu))
        )
    if angle == "darlington_1975":
        return np.asarray(_GRAZING * (eta / _GRAZING) ** mu)
    raise ValueError(f"angle law {angle!r} is unknown; allowed: {', '.join(ANGLE_LAWS)}")


_GRAZING = 0.891  # Darlington 1975: coefficient at grazing incidence, every element


def isotropic_by_atomic_number(
    energy_eV: ArrayLike,
    *,
    mean_atomic_number: ArrayLike,
    angle: AngleLaw = "darlington_cosslett_1972",
) -> NDArray[np.float64]:
    r"""Backscatter averaged over an isotropic flux, from the atomic number alone.

    `hunger_kuchler_held` with :math:`2\int_0^1 \eta(\mu)\,\mu\,d\mu` of `oblique_backscatter`.

    Parameters
    ----------
    energy_eV : array_like
        [eV], >= 0.
    mean_atomic_number : array_like
        Mean Z, 4 to 100.
    angle : str, optional
        One of `ANGLE_LAWS`.

    Raises
    ------
    ValueError
        As `oblique_backscatter`.

    Examples
    --------
    >>> [round(float(isotropic_by_atomic_number(2e4, mean_atomic_number=13, angle=a)), 3)
    ...  for a in ANGLE_LAWS]
    [0.293, 0.3]
    """
    normal = hunger_kuchler_held(energy_eV, mean_atomic_number=mean_atomic_number)
    if angle == "darlington_cosslett_1972":
        coefficient = backscatter_angle_coefficient(mean_atomic_number)
    elif angle == "darlington_1975":
        # 0.891 (eta/0.891)^mu is exponential too, with this coefficient; 0 matters only
        # beyond 1e9 eV, where the fit of heavy elements would pass 0.891
        coefficient = np.maximum(np.log(_GRAZING / normal), 0.0)
    else:
        raise ValueError(f"angle law {angle!r} is unknown; allowed: {', '.join(ANGLE_LAWS)}")
    return np.asarray(normal * exponential_angle_factor(coefficient))


def substrate_share(
    energy_eV: ArrayLike, *, thickness_m: float, density_kg_m3: float
) -> NDArray[np.float64]:
    r"""Share of the backscatter that comes from below a thin coating.

    :math:`e^{-(3\rho d/R)^2}` with the practical range :math:`R = 4\cdot10^{-5}\,
    E^{1.75}` kg m-2, E in keV: electrons turn back within a third of their range. The form
    is ours (assumed), the range is published.

    Parameters
    ----------
    energy_eV : array_like
        [eV], >= 0.
    thickness_m, density_kg_m3 : float
        Of the coating, > 0.

    Returns
    -------
    ndarray
        0 at low energy, 1 at high.

    References
    ----------
    Everhart & Hoff (1971), J. Appl. Phys. 42, 5837 (range, 5 to 25 keV, memory).

    Examples
    --------
    >>> substrate_share([1e3, 5e3, 3e4], thickness_m=1e-7, density_kg_m3=2500.0).round(3).tolist()
    [0.0, 0.284, 0.998]
    """
    energy_keV = impact_energy(energy_eV) / 1e3
    thickness = finite_array("thickness_m", thickness_m, above=0.0)
    density = finite_array("density_kg_m3", density_kg_m3, above=0.0)
    turns = 3.0 * density * thickness / 4e-5
    # below 1 eV the quotient would overflow, and the share is 0 long before
    return np.asarray(np.exp(-((turns / np.maximum(energy_keV, 1e-3) ** 1.75) ** 2)))
