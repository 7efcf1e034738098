"""A substorm's injection into the plasma sheet: rise, hold, decay, drift towards dawn."""

from dataclasses import dataclass
from math import isfinite
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.coefficients import Coefficient
from environments.errors import EnvironmentDataError
from environments.population_series import smoothstep

Array = NDArray[np.float64]

COEFFICIENTS: Final = (
    Coefficient("rise, hold, decay", (10.0, 40.0, 90.0), "min", "assumed",
                "expansion 10 to 30 min, recovery 1 to 2 h are textbook phases"),
    Coefficient("electron density and temperature", (1.12, 12.0), "cm-3, keV", "memory",
                "severe geostationary case, 90th percentile: Purvis, Garrett, Whittlesey & "
                "Stevens 1984, NASA TP-2361"),
    Coefficient("ion density and temperature", (0.236, 29.5), "cm-3, keV", "memory",
                "as the electrons, an independent percentile"),
    Coefficient("half width of the injection", (3.0, 2.0), "h", "assumed",
                "full within the first figure of local time around its centre, none beyond the "
                "sum"),
    Coefficient("drift of 20 keV electrons at L 6.6", (4.2,), "h of local time per h", "derived",
                "gradient and curvature drift in a dipole, 90 deg of pitch, period 5.7 h; "
                "proportional to energy, corotation left out"),
)  # fmt: skip
"""Figures of this module."""

_RISE, _HOLD, _DECAY = COEFFICIENTS[0].value


@dataclass(frozen=True, slots=True)
class Substorm:
    """An injection around midnight.

    Attributes
    ----------
    onset : numpy.datetime64
        UTC.
    rise_min, hold_min, decay_min : float
        Linear rise, whole strength, time constant of the decay [min]; decay > 0.
    local_time_h : float
        Centre at onset, 0 to 24.
    electron_density_m3, electron_temperature_eV, ion_density_m3, ion_temperature_eV : float
        Moments at full strength, protons [m-3], [eV].

    Raises
    ------
    EnvironmentDataError
        A figure not finite or out of range.
    """

    onset: np.datetime64
    rise_min: float = _RISE
    hold_min: float = _HOLD
    decay_min: float = _DECAY
    local_time_h: float = 0.0
    electron_density_m3: float = 1e6 * COEFFICIENTS[1].value[0]
    electron_temperature_eV: float = 1e3 * COEFFICIENTS[1].value[1]
    ion_density_m3: float = 1e6 * COEFFICIENTS[2].value[0]
    ion_temperature_eV: float = 1e3 * COEFFICIENTS[2].value[1]

    def __post_init__(self) -> None:
        if np.isnat(self.onset):
            raise EnvironmentDataError("is not a time", key=("onset",))
        for name in ("rise_min", "hold_min", "electron_density_m3", "ion_density_m3"):
            _require(name, getattr(self, name), zero=True)
        for name in ("decay_min", "electron_temperature_eV", "ion_temperature_eV"):
            _require(name, getattr(self, name), zero=False)
        if not 0.0 <= self.local_time_h <= 24.0:
            raise EnvironmentDataError(
                "is no local time", key=("local_time_h",), value=self.local_time_h,
                allowed="0 to 24",
            )  # fmt: skip


def _require(name: str, value: float, *, zero: bool) -> None:
    if not (isfinite(value) and (value > 0.0 or (zero and value == 0.0))):
        raise EnvironmentDataError(
            "is out of range", key=(name,), value=value,
            allowed="0 or more" if zero else "above 0",
        )  # fmt: skip


def substorm_strength(substorm: Substorm, times: ArrayLike, local_time_h: ArrayLike) -> Array:
    """Share of the injected plasma in the sheet.

    Parameters
    ----------
    substorm : Substorm
        The injection.
    times : array_like of datetime64, shape (T,)
        UTC.
    local_time_h : array_like, shape (T,)
        Magnetic local time [h].

    Returns
    -------
    ndarray, shape (T,)
        0 to 1: linear rise, hold, exponential decay, times the window of local time. Its
        eastern side moves towards dawn with the drift of electrons of the mean energy, 3/2
        of the temperature, at most round to the western side; the western one stays, since
        slower electrons stay behind.

    Examples
    --------
    >>> one = Substorm(np.datetime64("2031-03-20T00:00"))
    >>> at = np.datetime64("2031-03-20T00:00") + np.arange(0, 180, 45).astype("timedelta64[m]")
    >>> substorm_strength(one, at, np.zeros(4)).round(3).tolist()
    [0.0, 1.0, 0.641, 0.389]
    """
    stamps = np.asarray(times).astype("datetime64[ns]")
    onset = substorm.onset.astype("datetime64[ns]")
    minutes = (stamps - onset).astype(np.int64).astype(np.float64) / 60e9
    rise, hold = substorm.rise_min, substorm.hold_min
    growing = np.where(minutes >= 0.0, np.clip(minutes / max(rise, 1e-9), 0.0, 1.0), 0.0)
    after = np.maximum(minutes - rise - hold, 0.0)
    history = growing * np.exp(-after / substorm.decay_min)
    full, slope = COEFFICIENTS[3].value
    mean_keV = 1.5e-3 * substorm.electron_temperature_eV
    pace = COEFFICIENTS[4].first * mean_keV / 20.0
    drifted = pace * np.maximum(minutes, 0.0) / 60.0
    east = (np.asarray(local_time_h) - substorm.local_time_h + 12.0) % 24.0 - 12.0
    # counted eastward from the western side of the window, once round
    from_west = (east + full + slope) % 24.0
    length = np.minimum(2.0 * full + slope + drifted, 24.0 - slope)
    entering = smoothstep(from_west, 0.0, slope)
    leaving = 1.0 - smoothstep(from_west, length, length + slope)
    return np.asarray(history * entering * leaving)
