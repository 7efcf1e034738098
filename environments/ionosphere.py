r"""Ionosphere from 150 to 2000 km: electrons, O+, He+ and H+ with their temperatures.

A climatology gives the electron density at the F2 peak, at 150 and at 600 km. Above the peak
stands diffusive equilibrium: an :math:`\alpha` Chapman layer whose reduced height counts the
scale height of all ions together,

.. math:: \zeta = 2\int_{h_m}^h \frac{m_+ g}{e(T_e + T_i)}\,dh, \qquad
          n = n_m \frac{(T_e+T_i)_m}{T_e+T_i}\, e^{(1 - \zeta - e^{-\zeta})/2},

with light ions growing against oxygen as :math:`\exp\int (m_O - m_H) g/(eT_i)\,dh` from the
height where both are equal. By day plasma streams up and the layer is thinner than that: up to
600 km a correction linear in height takes it to the climatology, and is held above.
"""

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import e

from environments.coefficients import Coefficient
from environments.earth_axes import turning_with_earth_m_s
from environments.ionosphere_climatology import (
    F107_RANGE,
    TABLE,
    Layer,
    cell,
    electron_layer,
)
from environments.magnetosphere import MEAN_RADIUS_M, magnetic_place
from environments.population_series import PopulationSeries, smoothstep
from environments.species import ELECTRON, HELIUM_ION, HYDROGEN_ION, OXYGEN_ION
from environments.vectors import as_vectors, length

Array = NDArray[np.float64]

_TEMPERATURES: Final = (
    "round mid-latitude numbers after the International Reference Ionosphere and Kelley, The "
    "Earth's Ionosphere; 40 percent"
)

COEFFICIENTS: Final = (
    TABLE,
    Coefficient("altitudes of the temperatures",
                (100.0, 200.0, 300.0, 400.0, 500.0, 600.0, 800.0, 1000.0, 1500.0, 2000.0), "km",
                "memory", _TEMPERATURES),
    Coefficient("electron temperature by day",
                (0.02, 0.13, 0.17, 0.19, 0.21, 0.22, 0.25, 0.27, 0.30, 0.32), "eV", "memory",
                _TEMPERATURES),
    Coefficient("electron temperature by night",
                (0.02, 0.07, 0.08, 0.08, 0.09, 0.10, 0.12, 0.14, 0.18, 0.20), "eV", "memory",
                _TEMPERATURES),
    Coefficient("ion temperature by day",
                (0.02, 0.08, 0.09, 0.10, 0.11, 0.13, 0.17, 0.20, 0.25, 0.28), "eV", "memory",
                _TEMPERATURES),
    Coefficient("ion temperature by night",
                (0.02, 0.065, 0.07, 0.07, 0.08, 0.08, 0.10, 0.12, 0.16, 0.18), "eV", "memory",
                _TEMPERATURES),
    Coefficient("height where light ions equal O+: solar minimum night, day; maximum night, day",
                (500.0, 800.0, 900.0, 1400.0), "km", "memory",
                "International Reference Ionosphere climatology, 200 km"),
    Coefficient("the same poleward of the closed, filled field lines: higher by, from, to",
                (300.0, 50.0, 65.0), "km, deg", "assumed",
                "H+ flows out along open and emptied field lines (polar wind)"),
    Coefficient("He+ over H+", (0.15,), "1", "memory",
                "Craven, Gallagher & Comfort 1997; as in the plasmasphere"),
    Coefficient("join to the plasmasphere", (1000.0, 2000.0), "km", "assumed", "our own"),
    Coefficient("sine of the solar elevation, night to day", (-0.29, 0.15), "1", "assumed",
                "the Sun sets at 300 km when it stands 17 deg below the horizon"),
    Coefficient("local time fades towards the pole from, to", (75.0, 90.0), "deg", "assumed",
                "our own"),
)  # fmt: skip
"""Figures of this module; the first holds the sizes of the table in its file."""

ALTITUDE_RANGE_KM: Final = (150.0, 2000.0)
"""Below, molecular ions and the E region count, which the model leaves out."""

_GRID_KM: Final = (100.0, 2000.0, 20.0)
_FOOT_KM: Final = 150.0
_ANCHOR_KM: Final = 600.0
_MAX_DECLINATION: Final = 0.39777  # sine of the obliquity, 23.44 deg
_GM: Final = 3.986004418e14


class Ionosphere(NamedTuple):
    """Ionosphere at T places, arrays of shape (T,).

    Attributes
    ----------
    electron_density_m3, oxygen_density_m3, helium_density_m3, hydrogen_density_m3 : ndarray
        Electrons; O+, He+, H+, which add to them [m-3].
    electron_temperature_eV, ion_temperature_eV : ndarray
        [eV].
    altitude_km : ndarray
        Above a sphere of 6371.2 km.
    share : ndarray
        1 below 1000 km to 0 from 2000 km, where the plasmasphere has taken over.
    """

    electron_density_m3: Array
    oxygen_density_m3: Array
    helium_density_m3: Array
    hydrogen_density_m3: Array
    electron_temperature_eV: Array
    ion_temperature_eV: Array
    altitude_km: Array
    share: Array


def ionosphere(
    times: ArrayLike, position_m: ArrayLike, sun_m: ArrayLike, f107: ArrayLike
) -> Ionosphere:
    """Ionosphere at times and places.

    Parameters
    ----------
    times : array_like of datetime64, shape (T,)
        UTC.
    position_m, sun_m : array_like, shape (3, T)
        Of the place and the Sun from the Earth's centre [m], GCRS-like.
    f107 : array_like
        Solar radio flux, 1e-22 W m-2 Hz-1, scalar or shape (T,).

    Returns
    -------
    Ionosphere
        Outside of 100 to 2000 km the nearest altitude's; `share` is 0 above.

    Raises
    ------
    ValueError
        Shapes that do not fit.

    Notes
    -----
    A monthly median: single passes differ by a factor 2, storms and the winter trough at high
    latitude by 3 to 10. The figures hold for the middle of a season and all longitudes together.

    References
    ----------
    Chapman (1931); Angerami & Thomas (1964), J. Geophys. Res. 69, 4537 (mixed ions in diffusive
    equilibrium); Rishbeth & Garriott (1969), Introduction to Ionospheric Physics (from memory).

    Examples
    --------
    >>> noon = np.array(["2031-03-20T12:00:00"], "datetime64[ns]")
    >>> found = ionosphere(noon, [[6.7712e6], [0.0], [0.0]], [[1.5e11], [0.0], [0.0]], 150.0)
    >>> bool(1e11 < found.electron_density_m3[0] < 1e13), found.share.tolist()
    (True, [1.0])
    """
    stamps = np.asarray(times).astype("datetime64[ns]")
    position, sun = as_vectors(position_m, "position_m"), as_vectors(sun_m, "sun_m")
    place = magnetic_place(position, sun, stamps)
    r = length(position)
    altitude = (r - MEAN_RADIUS_M) / 1e3
    distance = length(sun)
    up = np.clip(np.sum(position * sun, axis=0) / (r * distance), -1.0, 1.0)
    day = smoothstep(up, *COEFFICIENTS[10].value)
    latitude = place.dipole_latitude_deg
    season = sun[2] / distance / _MAX_DECLINATION * np.sign(latitude)
    hour = (
        12.0 + np.degrees(np.arctan2(position[1], position[0]) - np.arctan2(sun[1], sun[0])) / 15.0
    ) % 24.0
    flux = np.broadcast_to(np.asarray(f107, dtype=np.float64), r.shape)
    # at the pole all hours meet
    polar = np.degrees(np.arcsin(np.clip(np.abs(position[2]) / r, 0.0, 1.0)))
    hourly = 1.0 - smoothstep(polar, *COEFFICIENTS[11].value)
    layer = electron_layer(np.abs(latitude), hour, np.clip(season, -1.0, 1.0), flux, hourly)
    return profile(altitude, layer, day, transition_height_km(day, flux, latitude))


def transition_height_km(day: Array, f107: Array, latitude_deg: Array) -> Array:
    """Altitude where light ions equal O+.

    Parameters
    ----------
    day : ndarray
        0 night, 1 day.
    f107 : ndarray
        70 is solar minimum, 200 maximum; held outside of 65 to 250.
    latitude_deg : ndarray
        Magnetic latitude [deg].

    Returns
    -------
    ndarray
        [km].
    """
    low_night, low_day, high_night, high_day = COEFFICIENTS[6].value
    x = (np.clip(f107, *F107_RANGE) - 70.0) / 130.0
    night = low_night + x * (high_night - low_night)
    lit = low_day + x * (high_day - low_day)
    more, first, last = COEFFICIENTS[7].value
    raised = more * smoothstep(np.abs(latitude_deg), first, last)
    return np.asarray((1.0 - day) * night + day * lit + raised)


def profile(altitude_km: Array, layer: Layer, day: Array, crossing_km: Array) -> Ionosphere:
    """Densities and temperatures at an altitude of given layers.

    Parameters
    ----------
    altitude_km : ndarray, shape (T,)
        Outside of 100 to 2000 km the nearest counts.
    layer : Layer
    day : ndarray, shape (T,)
        0 night, 1 day: mixes the temperatures.
    crossing_km : ndarray, shape (T,)
        Altitude where light ions equal O+.

    Returns
    -------
    Ionosphere
        Below the peak the logarithm of the density is a parabola through peak and 150 km.
    """
    altitude, crossing, height = altitude_km, crossing_km, layer.height_km
    first, last, step = _GRID_KM
    grid = np.arange(first, last + 0.5 * step, step)
    knots = COEFFICIENTS[1].value
    te_day, te_night, ti_day, ti_night = (
        np.interp(grid, knots, c.value) for c in COEFFICIENTS[2:6]
    )
    light = day[:, None]
    te = light * te_day + (1.0 - light) * te_night
    ti = light * ti_day + (1.0 - light) * ti_night
    g = _GM / (MEAN_RADIUS_M + 1e3 * grid) ** 2
    m_o, m_h = OXYGEN_ION.mass_kg, HYDROGEN_ION.mass_kg
    helium = COEFFICIENTS[8].first
    m_light = (m_h + helium * HELIUM_ION.mass_kg) / (1.0 + helium)
    grown = _integral((m_o - m_h) * g / (e * ti), 1e3 * step)
    ratio = np.exp(grown - _at(grown, crossing)[:, None])
    mean = (m_o + ratio * m_light) / (1.0 + ratio)
    reduced = _integral(2.0 * mean * g / (e * (te + ti)), 1e3 * step)
    top = np.full_like(altitude, _ANCHOR_KM)
    above = np.maximum(altitude, height)
    shape = _chapman(reduced, te + ti, height, above)
    missing = np.log(layer.at_600_km_m3 / layer.peak_m3) - _chapman(reduced, te + ti, height, top)
    shape = shape + missing * np.clip((above - height) / (_ANCHOR_KM - height), 0.0, 1.0)
    below = np.maximum(height - np.maximum(altitude, first), 0.0) / (height - _FOOT_KM)
    shape = shape + np.log(layer.at_150_km_m3 / layer.peak_m3) * below**2
    density = layer.peak_m3 * np.exp(shape)
    log_ratio = _at(grown, altitude) - _at(grown, crossing)
    light_share = 1.0 / (1.0 + np.exp(-log_ratio))
    hydrogen = density * light_share / (1.0 + helium)
    share = 1.0 - smoothstep(altitude, *COEFFICIENTS[9].value)
    return Ionosphere(
        density, density * (1.0 - light_share), helium * hydrogen, hydrogen,
        _at(te, altitude), _at(ti, altitude), altitude, share,
    )  # fmt: skip


def ionosphere_series(found: Ionosphere, position_m: ArrayLike) -> tuple[PopulationSeries, ...]:
    """Populations of the ionosphere, turning with the Earth, times their share.

    Parameters
    ----------
    found : Ionosphere
        At T places.
    position_m : array_like, shape (3, T)
        Of these places [m], GCRS-like.

    Returns
    -------
    tuple of PopulationSeries
        Electrons, O+, He+, H+.
    """
    velocity = turning_with_earth_m_s(position_m)
    source = "International Reference Ionosphere climatology; diffusive equilibrium"
    rows = (
        (ELECTRON, found.electron_density_m3, found.electron_temperature_eV),
        (OXYGEN_ION, found.oxygen_density_m3, found.ion_temperature_eV),
        (HELIUM_ION, found.helium_density_m3, found.ion_temperature_eV),
        (HYDROGEN_ION, found.hydrogen_density_m3, found.ion_temperature_eV),
    )
    return tuple(
        PopulationSeries(
            species, "maxwellian", None, found.share * density, temperature, velocity,
            f"ionosphere {'electrons' if species == ELECTRON else species.name}", source, "memory",
        )
        for species, density, temperature in rows
    )  # fmt: skip


def ionosphere_cautions(found: Ionosphere, f107: ArrayLike) -> tuple[str, ...]:
    """What to know of the ionosphere met.

    Parameters
    ----------
    found : Ionosphere
        At the places of the run.
    f107 : array_like
        Radio flux there.

    Returns
    -------
    tuple of str
    """
    met = found.share > 0.0
    if not bool(np.any(met)):
        return ()
    said = [
        "ionosphere: monthly median; single passes differ by a factor 2, storms by 3 to 10, light "
        "ions, which decide wakes, by 10 (their height is known to 200 km)"
    ]
    if bool(np.any(met & (found.altitude_km < ALTITUDE_RANGE_KM[0]))):
        said.append("ionosphere: below 150 km molecular ions and the E region are left out")
    low, high = F107_RANGE
    level = np.asarray(f107, dtype=np.float64)
    if bool(np.any(met & ((level < low) | (level > high)))):
        said.append(f"ionosphere: F10.7 outside of {low:g} to {high:g}, its ends held")
    return tuple(said)


def _chapman(reduced: Array, pressure: Array, height: Array, altitude: Array) -> Array:
    """Logarithm of the density at altitudes over that at the peak; rows [T, G]."""
    zeta = _at(reduced, altitude) - _at(reduced, height)
    falls = np.log(_at(pressure, height) / _at(pressure, altitude))
    return np.asarray(falls + 0.5 * (1.0 - zeta - np.exp(-zeta)))


def _integral(rate: Array, step: float) -> Array:
    """Trapezoidal integral of rows [T, G] from their first column."""
    inner = np.cumsum(0.5 * step * (rate[:, 1:] + rate[:, :-1]), axis=-1)
    return np.concatenate((np.zeros((len(rate), 1)), inner), axis=-1)


def _at(rows: Array, altitude: Array) -> Array:
    """Linear interpolation of rows [T, G] over the altitude grid at (T,) altitudes [km]."""
    first, _, step = _GRID_KM
    k, part = cell((altitude - first) / step, rows.shape[-1])
    row = np.arange(len(rows))
    return np.asarray(rows[row, k] * (1.0 - part) + rows[row, k + 1] * part)
