"""The magnetosheath: shocked solar wind between bow shock and magnetopause."""

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import e, m_p

from environments.activity import ALPHA_FRACTION, ActivityAt
from environments.coefficients import Coefficient

Array = NDArray[np.float64]

COEFFICIENTS: Final = (
    Coefficient("density over that of the wind, 0, 45, 90, 135, 180 deg from the nose",
                (4.0, 3.4, 2.3, 1.5, 1.1), "1", "assumed",
                "4 is the strong-shock limit for 5/3; the fall to the flanks follows the "
                "gas-dynamic pictures of Spreiter, Summers & Alksne 1966 (from memory)"),
    Coefficient("speed over that of the wind, same angles", (0.2, 0.4, 0.65, 0.85, 0.95), "1",
                "assumed", "as the density"),
    Coefficient("ion over electron temperature", (6.0,), "1", "memory",
                "Wang et al. 2012; Phan et al. 1994 (5 to 10)"),
)  # fmt: skip
"""Figures of this module."""

_ANGLES: Final = np.radians([0.0, 45.0, 90.0, 135.0, 180.0])


class Magnetosheath(NamedTuple):
    """Moments at N places.

    Attributes
    ----------
    electron_density_m3, proton_density_m3, alpha_density_m3 : ndarray
        [m-3].
    electron_temperature_eV, proton_temperature_eV : ndarray
        [eV].
    speed_m_s : ndarray
        Bulk speed [m s-1].
    """

    electron_density_m3: Array
    proton_density_m3: Array
    alpha_density_m3: Array
    electron_temperature_eV: Array
    proton_temperature_eV: Array
    speed_m_s: Array


def magnetosheath(angle_rad: ArrayLike, activity: ActivityAt) -> Magnetosheath:
    """Moments of the magnetosheath, the same from shock to magnetopause.

    Parameters
    ----------
    angle_rad : array_like, shape (N,)
        From the direction that the wind comes from [rad].
    activity : ActivityAt
        The wind.

    Returns
    -------
    Magnetosheath
        What the flow loses in bulk energy it gains as enthalpy, 5/2 k(T_i + T_e) a proton;
        the field's energy is left out. Published: 5 to 60 cm-3, ions 80 to 500 eV, electrons
        20 to 100 eV.

    References
    ----------
    Conservation of energy along a stream line; Spreiter, Summers & Alksne (1966), Planet.
    Space Sci. 14, 223 (gas-dynamic flow, from memory).

    Examples
    --------
    >>> from environments.activity import Activity
    >>> now = Activity().at(np.array(["2031-03-20"], "datetime64[ns]"))
    >>> there = magnetosheath([0.0], now)
    >>> (there.electron_density_m3 / 1e6).round(1).tolist()
    [28.1]
    """
    angle = np.asarray(angle_rad, dtype=np.float64)
    squeeze = np.interp(angle, _ANGLES, COEFFICIENTS[0].value)
    slowing = np.interp(angle, _ANGLES, COEFFICIENTS[1].value)
    ratio = COEFFICIENTS[2].first
    lost_eV = 0.5 * m_p * activity.speed_m_s**2 * (1.0 - slowing**2) / e
    both = activity.proton_temperature_eV + activity.electron_temperature_eV + 0.4 * lost_eV
    protons = squeeze * activity.density_m3
    return Magnetosheath(
        protons * (1.0 + 2.0 * ALPHA_FRACTION), protons, ALPHA_FRACTION * protons,
        both / (1.0 + ratio), both * ratio / (1.0 + ratio), slowing * activity.speed_m_s,
    )  # fmt: skip
