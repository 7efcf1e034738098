"""Conduction through a dielectric: temperature, field and dose rate."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import e, epsilon_0, k

from materials.errors import finite_array

LARGEST_FIELD_V_m = 1e9
"""Above this field the enhancement law is refused: every film has broken down."""

REFERENCE_TEMPERATURE_K = 298.15
"""Temperature to which the library's resistivities belong."""

COLDEST_K = 50.0
"""Below this temperature the laws are refused: conduction is by hopping there."""

_JUMP_DISTANCE_M = 1e-9


def arrhenius_conductivity(
    temperature_K: ArrayLike,
    *,
    resistivity_ohm_m: ArrayLike,
    activation_energy_eV: ArrayLike,
    reference_temperature_K: float = REFERENCE_TEMPERATURE_K,
) -> NDArray[np.float64]:
    r"""Dark conductivity at low field and the film's own temperature.

    :math:`\sigma = \rho_0^{-1}\exp[-(E_a/k)(1/T - 1/T_0)]`.

    Parameters
    ----------
    temperature_K : array_like
        Temperature of the film [K], >= 50.
    resistivity_ohm_m : array_like
        Resistivity at the reference temperature [ohm m], > 0.
    activation_energy_eV : array_like
        Activation energy [eV], >= 0.
    reference_temperature_K : float, optional
        Temperature of the resistivity [K].

    Returns
    -------
    ndarray
        Conductivity [S m-1], broadcast shape; it may underflow to zero
        for a cold film of high activation energy.

    Raises
    ------
    ValueError
        An argument is not finite or out of its range.

    Notes
    -----
    Below 250-270 K polymers turn to variable-range hopping and conduct more
    than this law gives (Dennison & Brunson 2008, IEEE Trans. Plasma Sci. 36,
    2246, from memory): a cold film then charges less than computed.

    Examples
    --------
    >>> float(arrhenius_conductivity(298.15, resistivity_ohm_m=1e16, activation_energy_eV=1.0))
    1e-16
    """
    t = finite_array("temperature_K", temperature_K, at_least=COLDEST_K)
    t0 = finite_array("reference_temperature_K", reference_temperature_K, at_least=COLDEST_K)
    rho = finite_array("resistivity_ohm_m", resistivity_ohm_m, above=0.0)
    energy = finite_array("activation_energy_eV", activation_energy_eV, at_least=0.0)
    return np.asarray(np.exp(-(energy * e / k) * (1.0 / t - 1.0 / t0)) / rho)


def adamec_calderwood_1981_factor(
    field_V_m: ArrayLike,
    temperature_K: ArrayLike,
    relative_permittivity: ArrayLike,
    *,
    jump_distance_m: float = _JUMP_DISTANCE_M,
) -> NDArray[np.float64]:
    r"""Factor by which a field raises the conductivity of a dielectric.

    :math:`\frac{2 + \cosh(\beta_F F^{1/2}/2kT)}{3}\,\frac{\sinh y}{y}`,
    :math:`y = eFd/2kT`, :math:`\beta_F = (e^3/\pi\epsilon_0\epsilon_r)^{1/2}`:
    field-assisted release of carriers times field-assisted jumps.

    Parameters
    ----------
    field_V_m : array_like
        Field in the film [V m-1]; its sign does not matter.
    temperature_K : array_like
        Temperature [K], >= 50.
    relative_permittivity : array_like
        At least 1.
    jump_distance_m : float, optional
        Mean jump d [m]; 1 nm is the value commonly taken (memory).

    Returns
    -------
    ndarray
        Dimensionless, >= 1, broadcast shape.

    Raises
    ------
    ValueError
        \|field\| above 1e9 V/m, temperature below 50 K, or not finite.

    Notes
    -----
    Negligible below 1e6 V/m, decisive above 3e7 V/m. Films break down near
    1e8 to 3e8 V/m; up to 1e9 V/m the factor is huge but finite.

    References
    ----------
    Adamec & Calderwood (1981), J. Phys. D 14, 1487 (from memory).

    Examples
    --------
    >>> adamec_calderwood_1981_factor([0.0, 1e7, 1e8], 298.15, 3.4).round(1).tolist()
    [1.0, 2.8, 885.4]
    """
    field, t, permittivity, jump = _checked(
        field_V_m, temperature_K, relative_permittivity, jump_distance_m
    )
    return enhancement_kernel(field, t, permittivity, jump)[0]


def adamec_calderwood_1981_slope(
    field_V_m: ArrayLike,
    temperature_K: ArrayLike,
    relative_permittivity: ArrayLike,
    *,
    jump_distance_m: float = _JUMP_DISTANCE_M,
) -> NDArray[np.float64]:
    r"""Derivative of `adamec_calderwood_1981_factor` with respect to the field.

    Parameters
    ----------
    field_V_m, temperature_K, relative_permittivity : array_like
        As in `adamec_calderwood_1981_factor`.
    jump_distance_m : float, optional
        Mean jump [m].

    Returns
    -------
    ndarray
        d factor / d field [m V-1]; odd in the field. The factor has a kink
        at 0 (it goes as 1 + \|F\|): there the derivative towards positive
        fields is returned.

    Raises
    ------
    ValueError
        As `adamec_calderwood_1981_factor`.

    Examples
    --------
    >>> slope = adamec_calderwood_1981_slope([-1e7, 1e7], 298.0, 3.4)
    >>> bool(slope[0] == -slope[1])
    True
    """
    field, t, permittivity, jump = _checked(
        field_V_m, temperature_K, relative_permittivity, jump_distance_m
    )
    return enhancement_kernel(field, t, permittivity, jump)[1]


def enhancement_kernel(
    field_V_m: NDArray[np.float64],
    temperature_K: NDArray[np.float64],
    relative_permittivity: NDArray[np.float64],
    jump_distance_m: NDArray[np.float64] | float = _JUMP_DISTANCE_M,
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Factor and slope of `adamec_calderwood_1981_factor` for inner loops: no checks."""
    scales = enhancement_scales(temperature_K, relative_permittivity, jump_distance_m)
    return scaled_enhancement_and_slope(field_V_m, *scales)


def enhancement_factor_kernel(
    field_V_m: NDArray[np.float64],
    temperature_K: NDArray[np.float64],
    relative_permittivity: NDArray[np.float64],
) -> NDArray[np.float64]:
    """Factor of `enhancement_kernel` alone."""
    scales = enhancement_scales(temperature_K, relative_permittivity)
    return scaled_enhancement(np.abs(field_V_m), *scales)


def enhancement_scales(
    temperature_K: NDArray[np.float64],
    relative_permittivity: NDArray[np.float64],
    jump_distance_m: NDArray[np.float64] | float = _JUMP_DISTANCE_M,
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return beta_F/2kT [(m/V)^1/2] and ed/2kT [m/V]."""
    beta = np.sqrt(e**3 / (np.pi * epsilon_0 * relative_permittivity))
    return np.asarray(beta / (2.0 * k * temperature_K)), np.asarray(
        e * jump_distance_m / (2.0 * k * temperature_K)
    )


def scaled_enhancement(
    size_V_m: NDArray[np.float64], release: NDArray[np.float64], jump: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Factor of `enhancement_kernel` alone, of |field| and `enhancement_scales`."""
    factor = (2.0 + np.cosh(release * np.sqrt(size_V_m))) / 3.0
    return np.asarray(factor * _sinh_ratio(jump * size_V_m))


def scaled_enhancement_and_slope(
    field_V_m: NDArray[np.float64], release: NDArray[np.float64], jump: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Factor and slope of `enhancement_kernel`, of the field and `enhancement_scales`."""
    size = np.abs(field_V_m)
    x, y = release * np.sqrt(size), jump * size
    raised, jumps = (2.0 + np.cosh(x)) / 3.0, _sinh_ratio(y)
    # d cosh(b F^1/2)/dF = (b^2/2) sinh(x)/x
    slope = release**2 / 6.0 * _sinh_ratio(x) * jumps + raised * jump * _sinh_ratio_slope(y)
    return raised * jumps, np.where(field_V_m < 0.0, -slope, slope)


def arrhenius_kernel(
    temperature_K: NDArray[np.float64],
    activation_energy_eV: NDArray[np.float64],
    reference_temperature_K: float = REFERENCE_TEMPERATURE_K,
) -> NDArray[np.float64]:
    """Conductivity over its value at the reference temperature, for inner loops: no checks."""
    return np.exp(
        -activation_energy_eV * e / k * (1.0 / temperature_K - 1.0 / reference_temperature_K)
    )


def radiation_induced_conductivity(
    dose_rate_rad_s: ArrayLike,
    *,
    at_1_rad_s_S_m: ArrayLike,
    exponent: ArrayLike,
) -> NDArray[np.float64]:
    r"""Conductivity that a dose rate adds to the dark one.

    :math:`\sigma = k \dot D^\Delta`.

    Parameters
    ----------
    dose_rate_rad_s : array_like
        Dose rate in the dielectric [rad/s], >= 0.
    at_1_rad_s_S_m : array_like
        k: conductivity at 1 rad/s [S m-1], >= 0.
    exponent : array_like
        Delta, > 0: 1/2 with an exponential trap distribution, 1 with a uniform one.

    Returns
    -------
    ndarray
        Conductivity [S m-1], broadcast shape.

    Raises
    ------
    ValueError
        An argument is not finite or out of its range.

    Notes
    -----
    Electrons of keV give their dose to the first micrometres alone: they make the layer that
    they cross conduct, not the film. Through a film of 25 µm go electrons above some 45 keV,
    through 127 µm of fluoropolymer above 160 keV (range of Katz & Penfold 1952, Rev. Mod.
    Phys. 24, 28). Left out: what lasts after the dose, and that k and Delta depend on
    temperature above about 250 K.

    References
    ----------
    Fowler (1956), Proc. R. Soc. A 236, 464; Frederickson (1977), IEEE Trans. Nucl. Sci. 24,
    2532 (both from memory).

    Examples
    --------
    >>> float(radiation_induced_conductivity(0.01, at_1_rad_s_S_m=1e-14, exponent=0.5))
    1e-15
    """
    return radiation_kernel(
        finite_array("dose_rate_rad_s", dose_rate_rad_s, at_least=0.0),
        finite_array("at_1_rad_s_S_m", at_1_rad_s_S_m, at_least=0.0),
        finite_array("exponent", exponent, above=0.0),
    )


def radiation_kernel(
    dose_rate_rad_s: NDArray[np.float64],
    at_1_rad_s_S_m: NDArray[np.float64],
    exponent: NDArray[np.float64],
) -> NDArray[np.float64]:
    """`radiation_induced_conductivity` for inner loops: no checks."""
    return np.asarray(at_1_rad_s_S_m * dose_rate_rad_s**exponent)


def _checked(
    field_V_m: ArrayLike,
    temperature_K: ArrayLike,
    relative_permittivity: ArrayLike,
    jump_distance_m: float,
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    return (
        finite_array(
            "field_V_m", field_V_m, at_least=-LARGEST_FIELD_V_m, at_most=LARGEST_FIELD_V_m
        ),
        finite_array("temperature_K", temperature_K, at_least=COLDEST_K),
        finite_array("relative_permittivity", relative_permittivity, at_least=1.0),
        finite_array("jump_distance_m", jump_distance_m, at_least=0.0, at_most=2e-9),
    )


def _sinh_ratio(y: NDArray[np.float64]) -> NDArray[np.float64]:
    """sinh(y)/y for y >= 0."""
    safe = np.where(y < 1e-4, 1.0, y)
    # next term y^4/120 < 1e-18
    return np.asarray(np.where(y < 1e-4, 1.0 + y**2 / 6.0, np.sinh(safe) / safe))


def _sinh_ratio_slope(y: NDArray[np.float64]) -> NDArray[np.float64]:
    """d/dy of sinh(y)/y for y >= 0."""
    safe = np.where(y < 0.3, 1.0, y)
    closed = (np.cosh(safe) - np.sinh(safe) / safe) / safe
    # sum 2m y^(2m-1)/(2m+1)!, next term below 1e-15 of the sum at y = 0.3
    q = y**2
    series = y / 3.0 * (1.0 + q / 10.0 * (1.0 + q / 28.0 * (1.0 + q / 54.0 * (1.0 + q / 88.0))))
    return np.asarray(np.where(y < 0.3, series, closed))
