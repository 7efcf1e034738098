"""Hot plasma of the plasma sheet, from its inner edge to the distance of the Moon."""

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.coefficients import Coefficient
from environments.population_series import smoothstep

Array = NDArray[np.float64]

_TREND: Final = (
    "smooth values after the trends of Korth et al. 1999, J. Geophys. Res. 104, 25047 and Denton "
    "et al. 2005, J. Geophys. Res. 110, A03223; factor 2"
)


def _row(name: str, unit: str, *value: float) -> Coefficient:
    return Coefficient(name, value, unit, "assumed", _TREND)


# geostationary moments at 0, 3, ... 21 h of magnetic local time
_QUIET: Final = (
    _row("electron density, Kp 1", "cm-3", 0.8, 0.8, 0.6, 0.4, 0.3, 0.2, 0.2, 0.4),
    _row("electron temperature, Kp 1", "keV", 0.8, 1.2, 1.2, 1.0, 0.8, 0.6, 0.4, 0.5),
    _row("ion density, Kp 1", "cm-3", 0.9, 0.8, 0.7, 0.6, 0.6, 0.7, 0.8, 0.9),
    _row("ion temperature, Kp 1", "keV", 6.0, 5.0, 5.0, 6.0, 8.0, 9.0, 9.0, 7.0),
)
_ACTIVE: Final = (
    _row("electron density, Kp 5", "cm-3", 1.5, 1.5, 1.2, 0.8, 0.5, 0.4, 0.5, 1.0),
    _row("electron temperature, Kp 5", "keV", 2.0, 3.0, 3.5, 3.0, 2.0, 1.5, 1.5, 1.5),
    _row("ion density, Kp 5", "cm-3", 1.5, 1.2, 1.0, 0.9, 0.9, 1.0, 1.2, 1.5),
    _row("ion temperature, Kp 5", "keV", 10.0, 9.0, 8.0, 9.0, 11.0, 12.0, 13.0, 12.0),
)
_EDGE: Final = (
    Coefficient("Kp of the inner edge", (0.0, 2.0, 4.0, 6.0, 8.0), "1", "assumed", _TREND),
    Coefficient("inner edge", (9.0, 7.6, 6.4, 5.4, 4.8), "L", "assumed",
                "moves inwards by about 0.66 RE a Kp like the ions' edge of Cao et al. 2015"),
    Coefficient("farthest inner edge, width", (6.3, 1.0), "L", "assumed",
                "geostationary moments count in full, being averages of all that is met there"),
)  # fmt: skip
_TAIL: Final = (
    Coefficient("distance in the tail", (6.6, 15.0, 30.0, 60.0), "RE", "memory",
                "central sheet 10 to 30 RE; orbit of the Moon 60 RE"),
    Coefficient("electron density in the tail", (0.4, 0.2), "cm-3", "memory",
                "Baumjohann, Paschmann & Cattell 1989, J. Geophys. Res. 94, 6597 (0.1 to 1); "
                "at 60 RE Halekas et al. 2011, Troshichev et al. 1999, factor 3"),
    Coefficient("electron temperature in the tail", (0.8, 0.3), "keV", "memory",
                "as the density: 0.3 to 2.5 keV"),
    Coefficient("ion temperature in the tail", (5.0, 2.0), "keV", "memory",
                "as the density: 2 to 12 keV"),
)  # fmt: skip
_FORM: Final = (
    Coefficient("kappa of electrons", (6.0,), "1", "memory",
                "Christon et al. 1988 to 1991, J. Geophys. Res., 4 to 9"),
    Coefficient("O+ over H+", (0.045, 0.17, 0.01), "1", "memory",
                "Young, Balsiger & Geiss 1982, J. Geophys. Res. 87, 9077"),
)  # fmt: skip

COEFFICIENTS: Final = (*_QUIET, *_ACTIVE, *_EDGE, *_TAIL, *_FORM)
"""Figures of this module."""

TABULATED_KP: Final = (1.0, 5.0)
"""Kp of the two tables; in between and beyond, logarithms are linear in Kp."""

ELECTRON_KAPPA: Final = 6.0
"""Index of the electrons' distribution."""

_HOURS: Final = np.arange(0.0, 27.0, 3.0)


class SheetMoments(NamedTuple):
    """Moments at N places.

    Attributes
    ----------
    electron_density_m3, electron_temperature_eV : ndarray
        [m-3], [eV]; the temperature is two thirds of the mean energy.
    ion_density_m3, ion_temperature_eV : ndarray
        All ions together.
    oxygen_share : ndarray
        O+ over all ions, by number.
    """

    electron_density_m3: Array
    electron_temperature_eV: Array
    ion_density_m3: Array
    ion_temperature_eV: Array
    oxygen_share: Array


def geostationary_sheet(local_time_h: ArrayLike, kp: ArrayLike, f107: ArrayLike) -> SheetMoments:
    """Hot plasma in geostationary orbit.

    Parameters
    ----------
    local_time_h, kp, f107 : array_like, shape (N,)
        Magnetic local time [h], planetary index 0 to 9, solar radio flux.

    Returns
    -------
    SheetMoments
        Factor 2. Logarithms are linear in local time between tables for Kp 1 and 5, and
        extrapolated to Kp 0 and 9.

    References
    ----------
    See `COEFFICIENTS`; O+ after Young, Balsiger & Geiss (1982).

    Examples
    --------
    >>> found = geostationary_sheet([3.0], [5.0], [150.0])
    >>> found.electron_density_m3.round().tolist(), found.electron_temperature_eV.round().tolist()
    ([1500000.0], [3000.0])
    """
    t = np.asarray(local_time_h, dtype=np.float64) % 24.0
    quiet, active = TABULATED_KP
    slope = (np.asarray(kp, dtype=np.float64) - quiet) / (active - quiet)
    scales = (1e6, 1e3, 1e6, 1e3)
    found = []
    for low, high, scale in zip(_QUIET, _ACTIVE, scales, strict=True):
        at_low, at_high = (
            np.interp(t, _HOURS, np.log((*row.value, row.value[0]))) for row in (low, high)
        )
        found.append(scale * np.exp(at_low + slope * (at_high - at_low)))
    base, by_kp, by_flux = _FORM[1].value
    ratio = base * np.exp(by_kp * np.asarray(kp) + by_flux * np.asarray(f107, dtype=np.float64))
    share = np.broadcast_to(ratio / (1.0 + ratio), t.shape)
    return SheetMoments(found[0], found[1], found[2], found[3], np.asarray(share))


def plasma_sheet(
    local_time_h: Array, radius_re: Array, tailward: Array, kp: Array, f107: Array
) -> SheetMoments:
    """Hot plasma of the sheet at any distance.

    Parameters
    ----------
    local_time_h, radius_re, kp, f107 : ndarray, shape (N,)
        Magnetic local time [h], distance in Earth radii, activity.
    tailward : ndarray, shape (N,)
        0 on the day side to 1 at midnight: how far moments go over from those of the
        geostationary orbit to those of the tail beyond 6.6 Earth radii.

    Returns
    -------
    SheetMoments
        Within 6.6 Earth radii the geostationary ones (along field lines an isotropic
        distribution does not change). From 15 to 30 and at 60 Earth radii the published
        averages, which know no Kp here; logarithms linear in that of the distance between.

    Examples
    --------
    >>> one = np.ones(1)
    >>> moon = plasma_sheet(0 * one, 60 * one, one, 2 * one, 150 * one)
    >>> moon.electron_density_m3.round().tolist(), moon.electron_temperature_eV.round().tolist()
    ([200000.0], [300.0])
    """
    near = geostationary_sheet(local_time_h, kp, f107)
    first, second, third, last = np.log(_TAIL[0].value)
    s = np.log(np.maximum(radius_re, _TAIL[0].value[0]))
    leaving = np.clip((s - first) / (second - first), 0.0, 1.0) * tailward
    far = np.clip((s - third) / (last - third), 0.0, 1.0)

    def mixed(here: Array, row: Coefficient, scale: float) -> Array:
        middle, moon = np.log(scale * np.array(row.value))
        tail = middle + far * (moon - middle)
        return np.asarray(np.exp((1.0 - leaving) * np.log(here) + leaving * tail))

    return SheetMoments(
        mixed(near.electron_density_m3, _TAIL[1], 1e6),
        mixed(near.electron_temperature_eV, _TAIL[2], 1e3),
        mixed(near.ion_density_m3, _TAIL[1], 1e6),
        mixed(near.ion_temperature_eV, _TAIL[3], 1e3),
        near.oxygen_share,
    )


def inner_edge_l(kp: ArrayLike) -> Array:
    """L where the sheet's electrons are there in full, coming from outside.

    Parameters
    ----------
    kp : array_like
        Planetary index; the edge of Kp 8 is held beyond.

    Returns
    -------
    ndarray
        L, at most 6.3.

    Examples
    --------
    >>> inner_edge_l([2.0, 6.0]).tolist()
    [6.3, 5.4]
    """
    edge = np.interp(np.asarray(kp, dtype=np.float64), _EDGE[0].value, _EDGE[1].value)
    return np.asarray(np.minimum(edge, _EDGE[2].value[0]))


def sheet_share(l_shell: Array, kp: Array) -> Array:
    """Share of the sheet's plasma, 0 one L inside of its inner edge, 1 outside.

    Examples
    --------
    >>> sheet_share(np.array([4.3, 5.4, 6.6]), np.array([6.0, 6.0, 6.0])).tolist()
    [0.0, 1.0, 1.0]
    """
    edge = inner_edge_l(kp)
    return smoothstep(l_shell, edge - _EDGE[2].value[1], edge)
