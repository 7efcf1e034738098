"""The plasma along a way: which region, and the moments of every population in time."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Final, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments import (
    auroral_oval,
    ionosphere,
    lunar_wake,
    magnetopause,
    magnetosheath,
    plasma_sheet,
    plasmasphere,
    precipitation,
    region_places,
    solar_wind,
    substorm,
    tail_lobe,
)
from environments.activity import QUANTITIES, Activity, ActivityAt
from environments.coefficients import Coefficient, share_by_basis
from environments.errors import EnvironmentDataError
from environments.moon import MOON_RADIUS_M, moon_position_m
from environments.population_series import PopulationSeries
from environments.region_low_orbit import low_orbit
from environments.region_places import EarthShares, earth_shares, without
from environments.region_populations import cold_series, hot_series, open_series, stream_series
from environments.sun import ASTRONOMICAL_UNIT_M
from environments.vectors import as_vectors, length

__all__ = ["REGIONS", "Activity", "PopulationSeries", "RegionPlasma", "plasma_along"]

Array = NDArray[np.float64]
IntArray = NDArray[np.int64]
Setting = Literal["earth", "moon", "sun"]

REGIONS: Final = (
    "plasmasphere",
    "plasma trough",
    "plasma sheet",
    "lobe",
    "polar cap",
    "magnetosheath",
    "solar wind",
    "lunar wake",
    "ionosphere",
    "auroral oval",
    "as measured",
)
"""Names of the regions; a flag is an index of this."""

_INDEX: Final = {name: k for k, name in enumerate(REGIONS)}

_COEFFICIENTS: Final[Mapping[str, tuple[Coefficient, ...]]] = {
    "plasmasphere": plasmasphere.COEFFICIENTS,
    "plasma trough": plasmasphere.COEFFICIENTS,
    "plasma sheet": (
        *plasma_sheet.COEFFICIENTS,
        *plasmasphere.COEFFICIENTS,
        *region_places.COEFFICIENTS,
    ),
    "lobe": (*tail_lobe.COEFFICIENTS, *region_places.COEFFICIENTS),
    "polar cap": tail_lobe.COEFFICIENTS,
    "magnetosheath": (*magnetosheath.COEFFICIENTS, *magnetopause.COEFFICIENTS),
    "solar wind": (*solar_wind.COEFFICIENTS, *magnetopause.COEFFICIENTS),
    "lunar wake": lunar_wake.COEFFICIENTS,
    "ionosphere": ionosphere.COEFFICIENTS,
    "auroral oval": (
        *ionosphere.COEFFICIENTS,
        *auroral_oval.COEFFICIENTS,
        *precipitation.COEFFICIENTS,
    ),
    "as measured": (),
}


@dataclass(frozen=True, slots=True)
class RegionPlasma:
    """Plasma at T times.

    Attributes
    ----------
    region : ndarray of int, shape (T,)
        Index into `REGIONS` of the region with the largest share.
    populations : tuple of PopulationSeries
        Of all regions met; their densities add up.
    blend : ndarray, shape (R, T)
        Share of every region of `REGIONS`; adds to 1 at every time.
    cautions : tuple of str
        What to know: models outside of the range they were fitted for, what is left out.
    bases : mapping of str to float
        Share of the figures of the regions met that rest on each basis.
    """

    region: IntArray
    populations: tuple[PopulationSeries, ...]
    blend: Array
    cautions: tuple[str, ...]
    bases: Mapping[str, float]


def plasma_along(
    times: ArrayLike,
    position_m: ArrayLike,
    sun_position_m: ArrayLike | None,
    activity: Activity | None = None,
    *,
    setting: Setting = "earth",
) -> RegionPlasma:
    """Plasma at times and places.

    Parameters
    ----------
    times : array_like of datetime64, shape (T,)
        UTC.
    position_m : array_like, shape (3, T)
        From the centre of Earth, Moon or Sun [m], GCRS-like axes.
    sun_position_m : array_like, shape (3, T), or None
        The Sun from the same centre [m]; ignored for "sun".
    activity : Activity, optional
        Defaults of `environments.activity.QUANTITIES`.
    setting : {"earth", "moon", "sun"}
        Whose centre. "sun" knows only the solar wind.

    Returns
    -------
    RegionPlasma
        Velocities count against the same centre. Between regions distributions are mixed by
        share: density and pressure are the shares' sums, never outside both parents.

    Raises
    ------
    ValueError
        Shapes that do not fit.
    EnvironmentDataError
        Unknown setting, a place inside of the body, activity that does not cover the times.

    References
    ----------
    See the modules of the regions.

    Examples
    --------
    >>> noon = np.array(["2031-03-20T12:00:00"], "datetime64[ns]")
    >>> sun = [[1.5e11], [0.0], [0.0]]
    >>> found = plasma_along(noon, [[1.5e9], [0.0], [0.0]], sun)
    >>> [REGIONS[k] for k in found.region], found.blend.sum(axis=0).tolist()
    (['solar wind'], [1.0])
    """
    stamps = np.asarray(times).astype("datetime64[ns]")
    position = as_vectors(position_m, "position_m")
    if stamps.shape != position.shape[1:]:
        raise ValueError("times and position_m must hold the same number of times")
    given = activity or Activity()
    now = given.at(stamps)
    if setting == "sun":
        return _in_the_wind(position, now, _not_given(given, "density", "speed", "temperature"))
    if setting not in ("earth", "moon"):
        raise EnvironmentDataError(
            "is no setting", key=("setting",), value=setting, allowed="earth, moon, sun"
        )
    if sun_position_m is None:
        raise ValueError("sun_position_m is needed near Earth and Moon")
    sun = as_vectors(sun_position_m, "sun_position_m")
    if sun.shape != position.shape:
        raise ValueError("position_m and sun_position_m must hold the same number of times")
    return _near_earth(stamps, position, sun, now, given, moon=setting == "moon")


def _not_given(activity: Activity, *words: str) -> list[str]:
    """What stands at its default, of quantities whose name holds one of the words."""
    names = [
        f"{name} {quantity.default:g}"
        for name in activity.assumed()
        if (quantity := QUANTITIES[name]).default is not None
        and (not words or any(word in name for word in words))
    ]
    return [f"activity not given, defaults taken: {', '.join(names)}"] if names else []


def _in_the_wind(position: Array, now: ActivityAt, said: list[str]) -> RegionPlasma:
    distance = length(position)
    velocity = now.speed_m_s * position / distance
    distance_au = distance / ASTRONOMICAL_UNIT_M
    share = np.ones(distance.size)
    blend = np.zeros((len(REGIONS), distance.size))
    blend[_INDEX["solar wind"]] = share
    wind = solar_wind.solar_wind(distance_au, now)
    populations = stream_series(share, np.zeros_like(share), wind, None, velocity, velocity, share)
    return _assembled(blend, populations, [*solar_wind.solar_wind_cautions(distance_au), *said])


def _near_earth(
    stamps: NDArray[np.datetime64],
    position: Array,
    sun: Array,
    now: ActivityAt,
    given: Activity,
    *,
    moon: bool,
) -> RegionPlasma:
    from_earth, wake_from = position, None
    sun_from_earth = sun
    radius = length(position)
    if moon:
        if bool(np.any(radius < 0.98 * MOON_RADIUS_M)):
            raise EnvironmentDataError("lies inside of the Moon", key=("position_m",))
        away = moon_position_m(stamps)
        from_earth, sun_from_earth, wake_from = position + away, sun + away, position
    elif bool(np.any(radius < 6.35e6)):
        raise EnvironmentDataError("lies inside of the Earth", key=("position_m",))
    places = earth_shares(stamps, from_earth, sun_from_earth, now)
    low = None if moon else low_orbit(stamps, from_earth, sun_from_earth, now, places)
    if low is not None:
        places = without(places, low.share)
    wind = solar_wind.solar_wind(length(sun_from_earth - from_earth) / ASTRONOMICAL_UNIT_M, now)
    sheath = magnetosheath.magnetosheath(places.angle_rad, now)
    velocity = places.wind_m_s
    sheath_velocity = velocity * (sheath.speed_m_s / now.speed_m_s)
    hidden, left = np.zeros(stamps.size), np.ones(stamps.size)
    if wake_from is not None:
        hidden, left = lunar_wake.lunar_wake(
            wake_from, velocity, now.electron_temperature_eV, now.proton_temperature_eV
        )
    hot = plasma_sheet.plasma_sheet(
        places.local_time_h, places.radius_re, places.tailward, now.kp, now.f107
    )
    blend = _blend(places, hidden)
    if low is not None:
        blend[_INDEX["ionosphere"]] = low.ionosphere
        blend[_INDEX["auroral oval"]] = low.auroral_oval
        blend[_INDEX["polar cap"]] += low.polar_cap
    populations = (
        *(() if low is None else low.populations),
        *stream_series(
            places.solar_wind, places.magnetosheath, wind, sheath, velocity, sheath_velocity, left
        ),
        *hot_series(places, hot, stamps, given.substorms),
        *cold_series(places, hot, from_earth),
        *open_series(places),
    )
    cautions = _cautions(places, blend, now, moon=moon)
    cautions += () if low is None else low.cautions
    cautions += _not_given(given)
    more = substorm.COEFFICIENTS if given.substorms else ()
    return _assembled(blend, populations, cautions, more)


def _blend(places: EarthShares, hidden: Array) -> Array:
    blend = np.zeros((len(REGIONS), hidden.size))
    blend[_INDEX["solar wind"]] = places.solar_wind * (1.0 - hidden)
    blend[_INDEX["magnetosheath"]] = places.magnetosheath * (1.0 - hidden)
    blend[_INDEX["lunar wake"]] = (places.solar_wind + places.magnetosheath) * hidden
    blend[_INDEX["lobe"]] = places.lobe
    blend[_INDEX["polar cap"]] = places.polar_cap
    blend[_INDEX["plasma sheet"]] = places.plasma_sheet
    blend[_INDEX["plasmasphere"]] = places.cold_only * places.cold.plasmasphere_share
    blend[_INDEX["plasma trough"]] = places.cold_only * (1.0 - places.cold.plasmasphere_share)
    return blend


def _assembled(
    blend: Array,
    populations: tuple[PopulationSeries, ...],
    cautions: list[str],
    more: tuple[Coefficient, ...] = (),
) -> RegionPlasma:
    met = [name for name, share in zip(REGIONS, blend, strict=True) if bool(np.any(share > 0.0))]
    figures = {id(c): c for name in met for c in _COEFFICIENTS[name]}
    figures |= {id(c): c for c in more}
    return RegionPlasma(
        np.argmax(blend, axis=0).astype(np.int64),
        tuple(p for p in populations if bool(np.any(p.density_m3 > 0.0))),
        blend,
        tuple(cautions),
        share_by_basis(figures.values()),
    )


def _cautions(places: EarthShares, blend: Array, now: ActivityAt, *, moon: bool) -> list[str]:
    found = []
    inner = places.cold_only + places.plasma_sheet > 0.0
    low, high = plasmasphere.FITTED_L
    cold = places.cold_only > 0.0
    dense = cold | (places.plasma_sheet * (places.l_shell < high) > 0.0)
    if bool(np.any(cold & (places.l_shell < low))):
        found.append(f"plasmasphere: L below {low:g}, where the model has no data, extrapolated")
    if bool(np.any(cold & (places.l_shell > high))):
        found.append(f"plasma trough: L above {high:g}, where the model has no data, extrapolated")
    if bool(np.any(dense & (places.local_time_h > 15.0) & (places.cold.plasmasphere_share < 1.0))):
        found.append(
            "plasma trough: no published law from 15 to 24 h of local time; interpolated to "
            "midnight (assumed)"
        )
    if bool(np.any(inner & (plasmasphere.plasmapause_l(now.kp_max_24h) < low))):
        found.append("plasmapause: Kp above 7.3 puts it inside of the model's data, extrapolated")
    sheet = blend[_INDEX["plasma sheet"]] > 0.0
    lowest, highest = plasma_sheet.TABULATED_KP
    if bool(np.any(sheet & ((now.kp < lowest) | (now.kp > highest)))):
        found.append(
            f"plasma sheet: Kp outside of {lowest:g} to {highest:g}, the tables' range, "
            "extrapolated"
        )
    if bool(np.any(sheet)):
        found.append("plasma sheet: geostationary moments are assumed, factor 2")
    found += _boundary_cautions(places, now)
    if moon and bool(np.any(places.plasma_sheet + places.lobe > 0.0)):
        found.append("Moon in the tail: what its body shields of the hot plasma is not modelled")
    return found


def _boundary_cautions(places: EarthShares, now: ActivityAt) -> list[str]:
    found = []
    for name, values in (("bz_nT", now.bz_nT), ("pressure_nPa", now.pressure_nPa)):
        low, high = magnetopause.FIT_RANGE[name]
        if bool(np.any((values < low) | (values > high))):
            found.append(f"magnetopause: {name} outside of {low:g} to {high:g}, extrapolated")
    if bool(np.any((places.radius_re > 30.0) & (places.angle_rad > 2.2))):
        found.append("magnetopause: beyond 30 Earth radii down the tail its shape is extrapolated")
    return found
