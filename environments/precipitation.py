"""Auroral electron precipitation along the oval: averages, and where severe events may stand.

Averages are an order of magnitude and more below what charges spacecraft: charging belongs to
discrete arcs, which a case brings as an event with its own distribution ("ECSS auroral worst
case", "inverted-V arc, low polar orbit"). `severe_share` says where such an event may stand.
"""

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import e
from scipy.constants import m_e as electron_mass

from environments.auroral_oval import oval_share
from environments.coefficients import Coefficient
from environments.population_series import PopulationSeries, smoothstep
from environments.species import ELECTRON

Array = NDArray[np.float64]

_PEAK: Final = (
    "night side peak conductances of Hardy, Gussenhoven, Raistrick & McNeil 1987, J. Geophys. "
    "Res. 92, 12275 (abstract), turned into energy and energy flux by Robinson et al. 1987, "
    "J. Geophys. Res. 92, 2565 (formulas from memory)"
)

COEFFICIENTS: Final = (
    Coefficient("Kp of the table", (0.0, 6.0), "1", "derived", _PEAK),
    Coefficient("mean energy of the flux", (3520.0, 6030.0), "eV", "derived", _PEAK),
    Coefficient("energy flux", (0.39, 7.36), "erg cm-2 s-1", "derived", _PEAK),
    Coefficient("degraded electrons: flux over that of the primaries, temperature",
                (1.0, 100.0), "1, eV", "assumed",
                "power-law part of Fontheim et al. 1982, J. Geophys. Res. 87, 3469, of the "
                "primaries' number flux"),
    Coefficient("day side: number flux and mean energy over those of the night side",
                (0.5, 0.3), "1", "assumed",
                "softer and weaker precipitation near noon: trend of Hardy et al. 1985, "
                "J. Geophys. Res. 90, 4229"),
    Coefficient("local times of charging arcs", (20.0, 2.0), "h", "memory",
                "Frooninckx & Sojka 1992, J. Geophys. Res. 97, 2985"),
    Coefficient("soft edge of these local times", (1.0,), "h", "assumed", "our own"),
)  # fmt: skip
"""Figures of this module."""

_ERG_CM2: Final = 1e-7 * 1e4 / e  # erg cm-2 to eV m-2


def average_precipitation(local_time_h: ArrayLike, kp: ArrayLike) -> tuple[Array, Array]:
    """Average precipitation in the middle of the oval.

    Parameters
    ----------
    local_time_h, kp : array_like
        Magnetic local time [h]; planetary index, held above 6.

    Returns
    -------
    number_flux_m2_s, temperature_eV : ndarray
        One-sided flux of the primaries, and the temperature of the Maxwellian that carries
        it (half the mean energy of the flux).

    Notes
    -----
    Long-term averages; in one pass fluxes are log-normal about them, ten times more or less
    (Gentile et al. 2008, abstract). Mean energy and energy flux grow exponentially with Kp
    between both ends of the table.

    Examples
    --------
    >>> flux, temperature = average_precipitation(0.0, [0.0, 6.0])
    >>> (1e6 * e * flux).round(2).tolist(), temperature.round(6).tolist()
    ([0.11, 1.22], [1760.0, 3015.0])
    """
    index = np.asarray(kp, dtype=np.float64)
    ends, energy, power = (c.value for c in COEFFICIENTS[:3])
    mean = np.exp(np.interp(index, ends, np.log(energy)))
    energy_flux = _ERG_CM2 * np.exp(np.interp(index, ends, np.log(power)))
    fewer, softer = COEFFICIENTS[4].value
    hour = np.radians(15.0) * np.asarray(local_time_h, dtype=np.float64)
    noon = 0.5 * (1.0 - np.cos(hour))
    flux = energy_flux / mean * fewer**noon
    return np.asarray(flux), np.asarray(0.5 * mean * softer**noon)


def precipitation_series(
    share: Array, local_time_h: Array, kp: Array
) -> tuple[PopulationSeries, ...]:
    """Average precipitating electrons as populations.

    Parameters
    ----------
    share : ndarray, shape (T,)
        Of the oval, 0 to 1, as of `environments.auroral_oval.oval_share`.
    local_time_h, kp : ndarray, shape (T,)
        Magnetic local time [h]; planetary index.

    Returns
    -------
    tuple of PopulationSeries
        Primaries and degraded electrons, isotropic: the emptied upward loss cone is left out.
    """
    flux, temperature = average_precipitation(local_time_h, kp)
    ratio, soft = COEFFICIENTS[3].value
    source = "Hardy et al. 1987; Robinson et al. 1987; Fontheim et al. 1982"
    rows = (
        ("auroral electrons", flux, temperature),
        ("degraded auroral electrons", ratio * flux, np.full_like(temperature, soft)),
    )
    return tuple(
        PopulationSeries(
            ELECTRON, "maxwellian", None,
            share * amount / np.sqrt(e * kT / (2.0 * np.pi * electron_mass)), kT, None,
            label, source, "assumed",
        )
        for label, amount, kT in rows
    )  # fmt: skip


def severe_share(latitude_deg: ArrayLike, local_time_h: ArrayLike, kp: ArrayLike) -> Array:
    """Where a severe event of the aurora may stand.

    Parameters
    ----------
    latitude_deg, local_time_h, kp : array_like
        Magnetic latitude [deg] and local time [h]; planetary index.

    Returns
    -------
    ndarray
        1 within the oval from 20 to 02 h, 0 outside of it and at other hours, smooth between:
        the share by which an event's distribution replaces the plasma of the place.

    Examples
    --------
    >>> severe_share([66.0, 66.0, 50.0], [23.0, 12.0, 23.0], 3.0).tolist()
    [1.0, 0.0, 0.0]
    """
    first, last = COEFFICIENTS[5].value
    soft = COEFFICIENTS[6].first
    middle, half = 0.5 * (first + last + 24.0), 0.5 * (last + 24.0 - first)
    away = np.abs((np.asarray(local_time_h, dtype=np.float64) - middle + 12.0) % 24.0 - 12.0)
    window = 1.0 - smoothstep(away, half, half + soft)
    return np.asarray(window * oval_share(latitude_deg, local_time_h, kp))
