"""How active Sun and magnetosphere are: constants or series, with their defaults."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.errors import EnvironmentDataError, nearest_name
from environments.substorm import Substorm
from environments.text_table import increasing_times, number, read_table
from environments.timescales import utc_from_tai

Array = NDArray[np.float64]


class Quantity(NamedTuple):
    """What a quantity of the activity is.

    Attributes
    ----------
    default : float or None
        Where neither a constant nor a series is given; None: derived.
    low, high : float
        Allowed.
    unit : str
        Of the value.
    basis, source : str
        Of the default.
    """

    default: float | None
    low: float
    high: float
    unit: str
    basis: str
    source: str

    @property
    def range(self) -> str:
        """What is allowed, in words."""
        unit = "" if self.unit == "1" else f" {self.unit}"
        return f"{self.low:g} to {self.high:g}{unit}"


_WIND: Final = "typical solar wind at 1 AU: Feldman et al. 1977; OMNI statistics"

QUANTITIES: Final[Mapping[str, Quantity]] = {
    "kp": Quantity(2.0, 0.0, 9.0, "1", "memory", "median of the planetary index, about 2"),
    "f107": Quantity(150.0, 50.0, 500.0, "1e-22 W m-2 Hz-1", "assumed", "middle of a solar cycle"),
    "bz_nT": Quantity(0.0, -100.0, 100.0, "nT", "assumed", "mean of the northward component"),
    "pressure_nPa": Quantity(
        None, 0.02, 200.0, "nPa", "derived", "protons and alpha particles at the wind's speed"
    ),
    "density_cm3": Quantity(6.5, 0.02, 300.0, "cm-3", "memory", _WIND),
    "speed_km_s": Quantity(440.0, 150.0, 3000.0, "km s-1", "memory", _WIND),
    "proton_temperature_eV": Quantity(8.0, 0.05, 2000.0, "eV", "memory", _WIND),
    "electron_temperature_eV": Quantity(
        12.0, 0.5, 500.0, "eV", "memory", "Newbury et al. 1998, J. Geophys. Res. 103, 9553"
    ),
}
"""Quantities of an activity file, wind at 1 AU."""

ALPHA_FRACTION: Final = 0.04
"""Alpha particles over protons, by number (Feldman et al. 1977, 0.01 to 0.08; from memory)."""

_PROTON_KG: Final = 1.67262192e-27
_THREE_HOURS: Final = np.timedelta64(3 * 3600 * 10**9, "ns")


class ActivityAt(NamedTuple):
    """Activity at T times, arrays of shape (T,).

    Attributes
    ----------
    kp, kp_max_24h : ndarray
        Planetary index and its largest value over the 24 h before.
    f107 : ndarray
        Solar radio flux at 10.7 cm, 1e-22 W m-2 Hz-1.
    bz_nT : ndarray
        Northward field of the wind [nT].
    pressure_nPa : ndarray
        Dynamic pressure of the wind at the Earth [nPa].
    density_m3, speed_m_s, proton_temperature_eV, electron_temperature_eV : ndarray
        Of the wind at 1 AU.
    """

    kp: Array
    kp_max_24h: Array
    f107: Array
    bz_nT: Array
    pressure_nPa: Array
    density_m3: Array
    speed_m_s: Array
    proton_temperature_eV: Array
    electron_temperature_eV: Array


@dataclass(frozen=True, slots=True)
class Activity:
    """Activity as constants, with series in place of some of them.

    Attributes
    ----------
    constants : mapping of str to float
        By the names of `QUANTITIES`; what is missing takes its default.
    times : ndarray of datetime64[ns], shape (K,), or None
        UTC of the series, increasing. The largest Kp of 24 h counts only what lies within.
    series : mapping of str to ndarray, shape (K,)
        Kp holds from its time to the next row, the others are interpolated linearly.
    source : str
        Where the figures come from.
    substorms : tuple of Substorm
        Injections into the plasma sheet.

    Raises
    ------
    EnvironmentDataError
        Unknown quantity, value out of range or not finite, series without times.

    Examples
    --------
    >>> now = Activity({"kp": 5.0}).at(np.array(["2031-03-20"], "datetime64[ns]"))
    >>> now.kp.tolist(), now.pressure_nPa.round(2).tolist()
    ([5.0], [2.44])
    """

    constants: Mapping[str, float] = field(default_factory=dict)
    times: NDArray[np.datetime64] | None = None
    series: Mapping[str, Array] = field(default_factory=dict)
    source: str = "defaults"
    substorms: tuple[Substorm, ...] = ()

    def __post_init__(self) -> None:
        for name, value in (*self.constants.items(), *self.series.items()):
            quantity = _known(name)
            figures = np.asarray(value, dtype=np.float64)
            if not bool(np.all((figures >= quantity.low) & (figures <= quantity.high))):
                raise EnvironmentDataError(
                    "is out of range", key=(name,),
                    value=value if isinstance(value, float) else None,
                    allowed=quantity.range,
                )  # fmt: skip
        if self.series:
            if self.times is None or any(v.shape != self.times.shape for v in self.series.values()):
                raise EnvironmentDataError("series and their times differ in length")
            if bool(np.any(np.diff(self.times) <= np.timedelta64(0, "ns"))):
                raise EnvironmentDataError("times of a series must increase")

    def assumed(self) -> tuple[str, ...]:
        """Quantities that nobody gave, so that their default counts."""
        given = {*self.constants, *self.series}
        return tuple(name for name in QUANTITIES if name not in given)

    def at(self, times: ArrayLike) -> ActivityAt:
        """Activity at times.

        Parameters
        ----------
        times : array_like of datetime64, shape (T,)
            UTC.

        Returns
        -------
        ActivityAt

        Raises
        ------
        EnvironmentDataError
            Times outside a series; Kp counts for three hours after its last row.
        """
        stamps = np.asarray(times).astype("datetime64[ns]")
        found = {name: self._values(name, stamps) for name in QUANTITIES}
        density, speed = 1e6 * found["density_cm3"], 1e3 * found["speed_km_s"]
        pressure = found["pressure_nPa"]
        derived = 1e9 * _PROTON_KG * (1.0 + 4.0 * ALPHA_FRACTION) * density * speed**2
        return ActivityAt(
            found["kp"], self._kp_max(stamps), found["f107"], found["bz_nT"],
            np.where(np.isnan(pressure), derived, pressure), density, speed,
            found["proton_temperature_eV"], found["electron_temperature_eV"],
        )  # fmt: skip

    def _values(self, name: str, stamps: NDArray[np.datetime64]) -> Array:
        if name in self.series:
            assert self.times is not None
            last = self.times[-1] + (_THREE_HOURS if name == "kp" else np.timedelta64(0, "ns"))
            if stamps.size and (stamps.min() < self.times[0] or stamps.max() > last):
                raise EnvironmentDataError(
                    "does not cover the times asked for", key=(name,),
                    allowed=f"{self.times[0]}Z to {last}Z",
                )  # fmt: skip
            if name == "kp":
                rows = np.searchsorted(self.times, stamps, side="right") - 1
                return np.asarray(self.series[name][rows], dtype=np.float64)
            origin = self.times[0]
            at, rows_at = (
                (t - origin).astype(np.int64).astype(np.float64) for t in (stamps, self.times)
            )
            return np.asarray(np.interp(at, rows_at, self.series[name]), dtype=np.float64)
        default = QUANTITIES[name].default
        value = self.constants.get(name, np.nan if default is None else default)
        return np.full(stamps.shape, float(value))

    def _kp_max(self, stamps: NDArray[np.datetime64]) -> Array:
        if "kp" not in self.series:
            return self._values("kp", stamps)
        assert self.times is not None
        kp = self.series["kp"]
        last = np.searchsorted(self.times, stamps, side="right") - 1
        day = np.timedelta64(86400 * 10**9, "ns")
        # the row that holds at the beginning of the 24 h counts too
        first = np.maximum(np.searchsorted(self.times, stamps - day, side="right") - 1, 0)
        return _largest_between(kp, first, last)


def read_activity(path: str | Path, constants: Mapping[str, float] | None = None) -> Activity:
    """Read an activity file.

    Parameters
    ----------
    path : str or Path
        Comma-separated columns ``time`` (UTC, ending in Z) and any of `QUANTITIES`.
    constants : mapping of str to float, optional
        Of quantities that the file does not hold.

    Returns
    -------
    Activity

    Raises
    ------
    EnvironmentDataError
        With file and line: unknown column, not a number, out of range, time without Z or not
        after the one before; a quantity given twice.
    """
    table = read_table(path, ())
    if table.columns[0] != "time" or len(table.columns) < 2:
        raise table.error(
            "must begin with the column time and hold a quantity", table.columns_line,
            allowed=", ".join(QUANTITIES),
        )  # fmt: skip
    for name in table.columns[1:]:
        try:
            _known(name)
        except EnvironmentDataError as error:
            raise table.error(
                f'column "{name}" is unknown', table.columns_line, allowed=error.allowed or "",
                nearest=error.nearest or "",
            ) from error  # fmt: skip
        if constants and name in constants:
            raise table.error(f"column {name} is also given as a constant", table.columns_line)
    stamps: list[np.datetime64] = []
    values: list[list[float]] = []
    for stamp, line, cells in increasing_times(table):
        stamps.append(stamp)
        row = [number(cell, line, table.file) for cell in cells[1:]]
        for name, value in zip(table.columns[1:], row, strict=True):
            quantity = QUANTITIES[name]
            if not quantity.low <= value <= quantity.high:
                raise table.error(
                    f"{name} = {value:g} is out of range", line,
                    allowed=quantity.range,
                )  # fmt: skip
        values.append(row)
    columns = np.array(values).T
    series = dict(zip(table.columns[1:], columns, strict=True))
    return Activity(dict(constants or {}), utc_from_tai(np.array(stamps)), series, Path(path).name)


def _largest_between(values: Array, first: NDArray[np.intp], last: NDArray[np.intp]) -> Array:
    """Largest of values[first..last] for many windows, from maxima over powers of two."""
    levels = [values]
    while 2 ** len(levels) <= values.size:
        half, below = 2 ** (len(levels) - 1), levels[-1]
        levels.append(np.maximum(below[:-half], below[half:]))
    level = np.frexp((last - first + 1).astype(np.float64))[1] - 1
    found = np.empty(first.shape)
    for k in np.unique(level):
        here = level == k
        found[here] = np.maximum(levels[k][first[here]], levels[k][last[here] - 2**k + 1])
    return found


def _known(name: str) -> Quantity:
    if name not in QUANTITIES:
        raise EnvironmentDataError(
            "is no quantity of the activity", key=(name,), allowed=", ".join(QUANTITIES),
            nearest=nearest_name(name, QUANTITIES),
        )  # fmt: skip
    return QUANTITIES[name]
