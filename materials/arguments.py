"""Checks of the arguments that many laws share; each says in one line what is wrong."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from materials.errors import finite_array

Array = NDArray[np.float64]


def impact_energy(energy_eV: ArrayLike) -> Array:
    """Energy at the surface [eV], >= 0."""
    return finite_array("energy_eV", energy_eV, at_least=0.0)


def temperature(temperature_eV: ArrayLike) -> Array:
    """Temperature [eV], > 0."""
    return finite_array("temperature_eV", temperature_eV, above=0.0)


def atomic_number(mean_atomic_number: ArrayLike) -> Array:
    """Mean Z, 4 to 100.

    Examples
    --------
    >>> atomic_number(3)
    Traceback (most recent call last):
    ...
    ValueError: mean_atomic_number must be >= 4 and <= 100
    """
    return finite_array("mean_atomic_number", mean_atomic_number, at_least=4.0, at_most=100.0)


def maximum(peak_yield: ArrayLike, peak_energy_eV: ArrayLike) -> tuple[Array, Array]:
    """Largest yield, >= 0, and the energy where it is reached [eV], > 0."""
    return (
        finite_array("peak_yield", peak_yield, at_least=0.0),
        finite_array("peak_energy_eV", peak_energy_eV, above=0.0),
    )


def backscatter_levels(
    high_energy: ArrayLike, low_energy_drop: ArrayLike, drop_energy_eV: ArrayLike
) -> tuple[Array, Array, Array]:
    """A of 0 to 1, B of -1 to 1, energy scale of the drop [eV], > 0."""
    return (
        finite_array("high_energy", high_energy, at_least=0.0, at_most=1.0),
        finite_array("low_energy_drop", low_energy_drop, at_least=-1.0, at_most=1.0),
        finite_array("drop_energy_eV", drop_energy_eV, above=0.0),
    )
