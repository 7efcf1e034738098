"""Populations of a plasma as functions of time."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.errors import EnvironmentDataError
from environments.species import Species

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class PopulationSeries:
    """One population at T times.

    Attributes
    ----------
    species : Species
        What the particles are.
    law : str
        "maxwellian" or "kappa".
    kappa : float or None
        Index of a kappa distribution, > 1.5, its temperature being two thirds of the mean
        energy.
    density_m3 : ndarray, shape (T,)
        [m-3], >= 0; already times the share of the region it belongs to.
    temperature_eV : ndarray, shape (T,)
        kT [eV], > 0, also where the density is zero.
    velocity_m_s : ndarray, shape (3, T), or None
        Bulk velocity against the centre of the position's axes [m s-1]; None: no drift that
        counts beside the thermal speed.
    label : str
        One line for people, such as "plasma sheet electrons".
    source, basis : str
        Where the moments come from; the weakest basis among them.

    Raises
    ------
    EnvironmentDataError
        Shapes that do not fit, negative density, temperature not > 0, not finite, kappa
        missing or <= 1.5.
    """

    species: Species
    law: str
    kappa: float | None
    density_m3: Array
    temperature_eV: Array
    velocity_m_s: Array | None
    label: str
    source: str
    basis: str

    def __post_init__(self) -> None:
        shape = self.density_m3.shape
        if len(shape) != 1 or self.temperature_eV.shape != shape:
            raise EnvironmentDataError("density and temperature differ in shape", key=(self.label,))
        if self.velocity_m_s is not None and self.velocity_m_s.shape != (3, *shape):
            raise EnvironmentDataError("velocity must have the shape (3, T)", key=(self.label,))
        if not bool(np.all(np.isfinite(self.density_m3) & (self.density_m3 >= 0.0))):
            raise EnvironmentDataError("has a density that is negative or nan", key=(self.label,))
        if not bool(np.all(np.isfinite(self.temperature_eV) & (self.temperature_eV > 0.0))):
            raise EnvironmentDataError("has a temperature that is not > 0", key=(self.label,))
        if self.law not in ("maxwellian", "kappa"):
            raise EnvironmentDataError(
                "is not a law of a series", key=(self.label, "law"), value=self.law,
                allowed="maxwellian, kappa",
            )  # fmt: skip
        if (self.law == "kappa") != (self.kappa is not None and self.kappa > 1.5):
            raise EnvironmentDataError("needs kappa > 1.5", key=(self.label,), value=self.kappa)


def smoothstep(x: ArrayLike, low: ArrayLike, high: ArrayLike) -> Array:
    """Smooth step, 0 at and below `low`, 1 at and above `high`, without slope at both.

    Parameters
    ----------
    x, low, high : array_like
        Any shapes that broadcast; low < high.

    Returns
    -------
    ndarray
        3 t^2 - 2 t^3 with t from 0 to 1.

    Examples
    --------
    >>> smoothstep([0.0, 1.0, 1.5, 2.0, 3.0], 1.0, 2.0).tolist()
    [0.0, 0.0, 0.5, 1.0, 1.0]
    """
    lower = np.asarray(low, dtype=np.float64)
    t = np.clip((np.asarray(x) - lower) / (np.asarray(high) - lower), 0.0, 1.0)
    return np.asarray(t * t * (3.0 - 2.0 * t), dtype=np.float64)
