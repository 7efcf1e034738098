"""Low orbit among the regions: ionosphere, auroral oval and polar cap beneath 2000 km."""

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from environments.activity import ActivityAt
from environments.auroral_oval import oval_cautions, oval_share, poleward_edge_deg
from environments.ionosphere import (
    Ionosphere,
    ionosphere,
    ionosphere_cautions,
    ionosphere_series,
)
from environments.population_series import PopulationSeries, smoothstep
from environments.precipitation import precipitation_series
from environments.region_places import EarthShares

Array = NDArray[np.float64]

_BLOCK: Final = 4096  # places at once: each holds a column of altitudes
_TOP_RE: Final = 1.0 + 2000.0 / 6371.2


class LowOrbit(NamedTuple):
    """Low orbit at T times.

    Attributes
    ----------
    ionosphere, auroral_oval, polar_cap : ndarray, shape (T,)
        Shares; the regions of the high magnetosphere have the rest.
    populations : tuple of PopulationSeries
        Their densities hold the shares.
    cautions : tuple of str
        What to know of the models used.
    """

    ionosphere: Array
    auroral_oval: Array
    polar_cap: Array
    populations: tuple[PopulationSeries, ...]
    cautions: tuple[str, ...]

    @property
    def share(self) -> Array:
        """Of the three together: 1 below 1000 km, 0 above 2000 km."""
        return self.ionosphere + self.auroral_oval + self.polar_cap


def low_orbit(
    stamps: NDArray[np.datetime64],
    position_m: Array,
    sun_m: Array,
    now: ActivityAt,
    places: EarthShares,
) -> LowOrbit | None:
    """Low orbit's plasma, or None where no place is below 2000 km.

    Parameters
    ----------
    stamps : ndarray of datetime64[ns], shape (T,)
        UTC.
    position_m, sun_m : ndarray, shape (3, T)
        From the Earth's centre [m], GCRS-like.
    now : ActivityAt
        Activity.
    places : EarthShares
        For the magnetic coordinates.

    Returns
    -------
    LowOrbit or None
        Thermal plasma everywhere, and in the oval the average precipitation on top; the
        polar cap is the ionosphere poleward of the oval.
    """
    low = np.flatnonzero(places.radius_re < _TOP_RE)
    if not low.size:
        return None
    count = stamps.size
    columns: list[list[Array]] = [[] for _ in Ionosphere._fields]
    for first in range(0, low.size, _BLOCK):
        here = low[first : first + _BLOCK]
        part = ionosphere(stamps[here], position_m[:, here], sun_m[:, here], now.f107[here])
        for column, values in zip(columns, part, strict=True):
            column.append(values)
    found = Ionosphere(*(np.concatenate(column) for column in columns))
    lat, hour, kp = places.latitude_deg[low], places.local_time_h[low], now.kp[low]
    oval = oval_share(lat, hour, kp)
    edge = poleward_edge_deg(hour, kp)
    cap = (1.0 - oval) * smoothstep(np.abs(lat), edge - 0.5, edge + 0.5)
    shares = [
        _spread(found.share * part, low, count) for part in (1.0 - oval - cap, oval, cap)
    ]  # fmt: skip
    series = (
        *ionosphere_series(found, position_m[:, low]),
        *precipitation_series(found.share * oval, hour, kp),
    )
    cautions = list(ionosphere_cautions(found, now.f107[low]))
    if bool(np.any(found.share * oval > 0.0)):
        cautions += oval_cautions(kp)
    everywhere = tuple(_everywhere(one, low, count) for one in series)
    return LowOrbit(shares[0], shares[1], shares[2], everywhere, tuple(cautions))


def _spread(values: Array, low: NDArray[np.intp], count: int, fill: float = 0.0) -> Array:
    found = np.full((*values.shape[:-1], count), fill)
    found[..., low] = values
    return found


def _everywhere(one: PopulationSeries, low: NDArray[np.intp], count: int) -> PopulationSeries:
    """The same series at all times: no density and the temperature of 1 eV elsewhere."""
    velocity = None if one.velocity_m_s is None else _spread(one.velocity_m_s, low, count)
    return PopulationSeries(
        one.species, one.law, one.kappa, _spread(one.density_m3, low, count),
        _spread(one.temperature_eV, low, count, 1.0), velocity, one.label, one.source, one.basis,
    )  # fmt: skip
