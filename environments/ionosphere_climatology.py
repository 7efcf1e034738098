"""Electron density of the ionosphere at three heights, from a climatology."""

import tomllib
from functools import cache
from importlib.resources import files
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.coefficients import Coefficient

Array = NDArray[np.float64]

TABLE: Final = Coefficient(
    "table: F2 peak and its height, densities at 150 and 600 km, by radio flux, "
    "season, latitude, local time",
    (4.0, 2.0, 3.0, 9.0, 8.0),
    "1",
    "derived",
    "International Reference Ionosphere climatology (CCIR maps), computed with the "
    "open package PyIRI 0.1.7; data/ionosphere_density.toml",
)
"""Where its figures come from; it holds the sizes of the table."""

F107_RANGE: Final = (65.0, 250.0)
"""Radio flux for which the peak is interpolated or extrapolated; held beyond."""

_ROWS: Final = (
    "peak_log10_density_m3",
    "peak_height_km",
    "log10_density_150_km_m3",
    "log10_density_600_km_m3",
)
_SEASONS: Final = ("winter", "equinox", "summer")


class Layer(NamedTuple):
    """Electron density at T places: peak [m-3] and its height [km], at 150 and 600 km [m-3]."""

    peak_m3: Array
    height_km: Array
    at_150_km_m3: Array
    at_600_km_m3: Array


def electron_layer(
    latitude_deg: Array, local_time_h: Array, season: Array, f107: Array, hourly: ArrayLike = 1.0
) -> Layer:
    """Electron density of the climatology, at its peak and two altitudes.

    Parameters
    ----------
    latitude_deg : ndarray
        Size of the magnetic latitude [deg], 0 to 90; that of 80 holds beyond.
    local_time_h : ndarray
        Solar local time [h].
    season : ndarray
        -1 local winter solstice, 0 equinox, 1 local summer solstice.
    f107 : ndarray
        Radio flux; held outside of 65 to 250.
    hourly : array_like, optional
        1 the value of the local time, 0 the mean of the day.

    Returns
    -------
    Layer
        Linear in every argument, densities in their logarithm.

    Examples
    --------
    >>> one = np.ones(1)
    >>> found = electron_layer(0.0 * one, 12.0 * one, 0.0 * one, 200.0 * one)
    >>> (found.peak_m3 / 1e12).round(2).tolist(), found.height_km.tolist()
    ([2.14], [443.0])
    """
    table, fluxes, latitudes = _table()
    level = np.clip(f107, *F107_RANGE)
    x = (level - fluxes[0]) / (fluxes[1] - fluxes[0])
    a, p = cell((latitude_deg / latitudes[1]), len(latitudes))
    b, q = cell(season + 1.0, 3)
    t = local_time_h / 3.0 % 8.0
    k = np.minimum(t.astype(np.intp), 7)
    r = t - k
    value = np.zeros((4, *np.shape(t)))
    for df, wf in ((0, 1.0 - x), (1, x)):
        for ds, ws in ((0, 1.0 - q), (1, q)):
            for dl, wl in ((0, 1.0 - p), (1, p)):
                rows = table[:, df, b + ds, a + dl]
                now = (1.0 - r) * table[:, df, b + ds, a + dl, k]
                now = now + r * table[:, df, b + ds, a + dl, (k + 1) % 8]
                mean = np.mean(rows, axis=-1)
                value = value + wf * ws * wl * (mean + hourly * (now - mean))
    return Layer(10.0 ** value[0], value[1], 10.0 ** value[2], 10.0 ** value[3])


def cell(x: Array, size: int) -> tuple[NDArray[np.intp], Array]:
    """Left knot of a unit grid and the distance from it, ends held.

    Examples
    --------
    >>> k, part = cell(np.array([-1.0, 0.25, 7.0]), 4)
    >>> k.tolist(), part.tolist()
    ([0, 0, 2], [0.0, 0.25, 1.0])
    """
    held = np.clip(x, 0.0, size - 1.0)
    k = np.minimum(held.astype(np.intp), size - 2)
    return k, np.asarray(held - k)


@cache
def _table() -> tuple[Array, Array, Array]:
    """Rows of `Layer` [4, flux, season, latitude, hour], fluxes, latitudes."""
    path = files("environments").joinpath("data", "ionosphere_density.toml")
    document = tomllib.loads(path.read_text(encoding="utf-8"))
    fluxes = np.array(document["f107"], dtype=np.float64)
    table = np.array(
        [[[document[f"f107_{f:.0f}"][s][key] for s in _SEASONS] for f in fluxes] for key in _ROWS],
        dtype=np.float64,
    )
    return table, fluxes, np.array(document["latitude_deg"], dtype=np.float64)
