"""How electron yields grow with the angle of incidence, averaged over an isotropic flux."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from materials.arguments import atomic_number
from materials.errors import finite_array


def exponential_angle_factor(coefficient: ArrayLike) -> NDArray[np.float64]:
    r"""Isotropic average of the angle law exp[c (1 - cos theta)].

    :math:`2\int_0^1 e^{c(1-\mu)}\mu\,d\mu = 2(e^c - 1 - c)/c^2`.

    Parameters
    ----------
    coefficient : array_like
        c, any shape, 0 to 100 (0: the yield does not depend on the angle).

    Returns
    -------
    ndarray
        Factor on the yield at normal incidence, >= 1.

    Raises
    ------
    ValueError
        c below 0, above 100, or not finite.

    References
    ----------
    Bruining (1954), Physics and Applications of Secondary Electron Emission
    (form of the law, from memory).

    Examples
    --------
    >>> exponential_angle_factor([0.0, 1.0, 2.0]).round(5).tolist()
    [1.0, 1.43656, 2.19453]
    """
    c = finite_array("coefficient", coefficient, at_least=0.0, at_most=100.0)
    safe = np.where(c < 0.1, 1.0, c)
    closed = 2.0 * (np.expm1(safe) - safe) / safe**2
    # 2 sum c^k/(k+2)!: below c = 0.1 nine terms are exact to rounding
    series = np.zeros_like(c)
    for k in range(9, 0, -1):
        series = (series + 1.0) * c / (k + 2.0)
    return np.asarray(np.where(c < 0.1, 1.0 + series, closed))


def backscatter_angle_coefficient(mean_atomic_number: ArrayLike) -> NDArray[np.float64]:
    r"""Coefficient c of eta(theta) = eta(0) exp[c (1 - cos theta)].

    :math:`c = 7.37\,Z^{-0.56875}`.

    Parameters
    ----------
    mean_atomic_number : array_like
        Mean Z, 4 to 100.

    Returns
    -------
    ndarray
        c, dimensionless, same shape.

    Raises
    ------
    ValueError
        Z outside 4 to 100.

    References
    ----------
    Laframboise & Kamitsuma (1983), AFGL-TR-83-0046, 293, fit to Darlington &
    Cosslett (1972), J. Phys. D 5, 1969 (coefficients from memory).

    Examples
    --------
    >>> backscatter_angle_coefficient([13, 79]).round(3).tolist()
    [1.714, 0.614]
    """
    z = atomic_number(mean_atomic_number)
    return np.asarray(7.37 * z**-0.56875)


def secondary_angle_coefficient(mean_atomic_number: ArrayLike) -> NDArray[np.float64]:
    r"""Coefficient b of delta(theta) = delta(0) exp[b (1 - cos theta)].

    :math:`b = e^\zeta,\ \zeta = t - \sqrt{t^2 + 0.0228},\
    t = 0.2755\,(\ln Z - 1.658)`.

    Argument and errors as `backscatter_angle_coefficient`; b lies between 0.78 and 1.

    Notes
    -----
    Smooth surfaces well above the peak energy. The total yield of a cleaned
    silver sample grew only as b = 0.4 to 0.54 up to 60 degrees (measurement
    distributed with an electron-emission library, 2018); rough surfaces less.

    References
    ----------
    Laframboise & Kamitsuma (1983), AFGL-TR-83-0046, 293, fit to Darlington &
    Cosslett (1972), J. Phys. D 5, 1969 (coefficients from memory).

    Examples
    --------
    >>> secondary_angle_coefficient([6, 79]).round(3).tolist()
    [0.888, 0.985]
    """
    z = atomic_number(mean_atomic_number)
    t = 0.2755 * (np.log(z) - 1.658)
    return np.asarray(np.exp(t - np.sqrt(t**2 + 0.0228)))
