"""The solar wind and how it thins and cools with distance from the Sun."""

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.activity import ALPHA_FRACTION, ActivityAt
from environments.coefficients import Coefficient

Array = NDArray[np.float64]

COEFFICIENTS: Final = (
    Coefficient("exponent of density", (-2.0,), "1", "derived", "conservation of mass"),
    Coefficient("exponent of electron temperature", (-0.5,), "1", "handbook",
                "0.31 fast to 0.74 slow: Pilipp et al. 1990; Issautier et al. 1998; Stverak et "
                "al. 2015; Maksimovic et al. 2020"),
    Coefficient("exponent of halo temperature", (-0.4,), "1", "handbook",
                "0.5 slow, 0.3 fast: Stverak et al. 2015"),
    Coefficient("exponent of proton temperature", (-0.9,), "1", "memory",
                "0.7 fast to 1.0 slow: Marsch et al. 1982; Hellinger et al. 2011, 2013"),
    Coefficient("share and relative temperature of core electrons", (0.955, 10.0 / 12.0), "1",
                "memory", "Feldman et al. 1975; Stverak et al. 2009, J. Geophys. Res. 114, A05104"),
    Coefficient("share, relative temperature and kappa of halo electrons", (0.045, 5.0, 4.0), "1",
                "memory", "Maksimovic et al. 1997; Stverak et al. 2009"),
    Coefficient("alpha particles over protons", (ALPHA_FRACTION,), "1", "memory",
                "Feldman et al. 1977, 0.01 to 0.08"),
    Coefficient("alpha over proton temperature", (4.0,), "1", "assumed",
                "equal thermal speeds, as often observed in fast wind"),
    Coefficient("moments at 1 AU", (6.5, 440.0, 8.0, 12.0), "cm-3, km s-1, eV, eV", "memory",
                "Feldman et al. 1977; Newbury et al. 1998; OMNI statistics"),
)  # fmt: skip
"""Figures of this module."""

FITTED_AU: Final = (0.3, 10.0)
"""Distances for which the exponents were found; beyond, they are extrapolated."""


class SolarWind(NamedTuple):
    """Moments at N places.

    Attributes
    ----------
    proton_density_m3, alpha_density_m3, core_density_m3, halo_density_m3 : ndarray
        [m-3]; electrons neutralise protons and alpha particles.
    proton_temperature_eV, alpha_temperature_eV, core_temperature_eV, halo_temperature_eV
        [eV].
    """

    proton_density_m3: Array
    alpha_density_m3: Array
    core_density_m3: Array
    halo_density_m3: Array
    proton_temperature_eV: Array
    alpha_temperature_eV: Array
    core_temperature_eV: Array
    halo_temperature_eV: Array


HALO_KAPPA: Final = COEFFICIENTS[5].value[2]
"""Index of the halo electrons."""


def solar_wind(distance_au: ArrayLike, activity: ActivityAt) -> SolarWind:
    """Moments of the wind.

    Parameters
    ----------
    distance_au : array_like, shape (N,)
        From the Sun; the exponents hold for 0.3 to 10 AU.
    activity : ActivityAt
        Moments at 1 AU.

    Returns
    -------
    SolarWind
        Speed is taken as constant (to 10 % beyond 0.3 AU). Beyond 5 AU the protons are warmer
        than this because of picked-up interstellar ions.

    References
    ----------
    See `COEFFICIENTS`.

    Examples
    --------
    >>> from environments.activity import Activity
    >>> now = Activity().at(np.array(["2031-03-20"], "datetime64[ns]"))
    >>> float(solar_wind([0.5], now).proton_density_m3[0] / 1e6)
    26.0
    """
    r = np.asarray(distance_au, dtype=np.float64)
    core_share, core_ratio = COEFFICIENTS[4].value
    halo_share, halo_ratio, _ = COEFFICIENTS[5].value
    protons = activity.density_m3 * r ** COEFFICIENTS[0].first
    electrons = protons * (1.0 + 2.0 * ALPHA_FRACTION)
    cooled = activity.electron_temperature_eV * r ** COEFFICIENTS[1].first
    proton_T = activity.proton_temperature_eV * r ** COEFFICIENTS[3].first
    return SolarWind(
        protons, ALPHA_FRACTION * protons, core_share * electrons, halo_share * electrons,
        proton_T, COEFFICIENTS[7].first * proton_T, core_ratio * cooled,
        halo_ratio * activity.electron_temperature_eV * r ** COEFFICIENTS[2].first,
    )  # fmt: skip


def solar_wind_cautions(distance_au: Array) -> tuple[str, ...]:
    """What to know of distances outside the range of the exponents.

    Examples
    --------
    >>> solar_wind_cautions(np.array([1.0]))
    ()
    """
    low, high = FITTED_AU
    found = []
    if distance_au.size and distance_au.min() < low:
        found.append(
            f"solar wind at {distance_au.min():.3g} AU: extrapolated inside {low:g} AU, where the "
            "wind is slower, denser in proportion and cools more steeply"
        )
    if distance_au.size and distance_au.max() > high:
        found.append(f"solar wind at {distance_au.max():.3g} AU: extrapolated beyond {high:g} AU")
    return tuple(found)
