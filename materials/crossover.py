"""Energies at which as many electrons leave as arrive."""

from __future__ import annotations

from collections.abc import Callable
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

LOWEST_EV, HIGHEST_EV = 0.1, 1e6


class Crossovers(NamedTuple):
    """First and second crossover energy [eV]; None where the total yield never passes one."""

    first_eV: float | None
    second_eV: float | None


def crossovers(
    total_yield: Callable[[NDArray[np.float64]], NDArray[np.float64]],
) -> Crossovers:
    """Find where a total yield rises above one and where it falls below for good.

    Parameters
    ----------
    total_yield : callable
        Secondary plus backscattered electrons per incident electron, of energies [eV].

    Returns
    -------
    Crossovers
        Between 0.1 eV and 1 MeV; first None when the yield is above one from the start,
        second None when it stays above to the end, both None when it never reaches one.

    Examples
    --------
    >>> from materials.secondary import sanders_inouye_1979
    >>> found = crossovers(
    ...     lambda E: sanders_inouye_1979(E, peak_yield=2.1, peak_energy_eV=150.0))
    >>> round(found.first_eV), round(found.second_eV)
    (27, 693)
    """
    energy = np.geomspace(LOWEST_EV, HIGHEST_EV, 4001)
    above = total_yield(energy) > 1.0

    def excess(energy_eV: float) -> float:
        return float(total_yield(np.array([energy_eV]))[0]) - 1.0

    rises = np.flatnonzero(~above[:-1] & above[1:])
    falls = np.flatnonzero(above[:-1] & ~above[1:])
    first = None
    if rises.size:
        first = float(brentq(excess, energy[rises[0]], energy[rises[0] + 1], xtol=1e-9))
    second = None
    if falls.size:
        second = float(brentq(excess, energy[falls[-1]], energy[falls[-1] + 1], xtol=1e-9))
    return Crossovers(first, second)
