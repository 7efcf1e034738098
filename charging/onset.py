"""Electron temperatures at which a dark surface starts to charge negative."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

from charging.arguments import as_material
from charging.currents.emission import (
    SECONDARY_LAWS,
    backscatter_law,
    backscatter_yield,
    law_of,
)
from charging.currents.tables import Yield, flux_nodes
from materials.crossover import crossovers
from materials.record import Material
from materials.secondary import (
    YIELD_LAWS,
    YieldLaw,
    fitted_range_eV,
    isotropic_yield,
    normal_yield,
    printed_form,
    true_secondary_peak,
)

Array = NDArray[np.float64]

LOWEST_EV, HIGHEST_EV = 0.5, 5e5
GRID_POINTS = 1200
ANGLES = ("isotropic", "normal")


@dataclass(frozen=True, slots=True)
class Onset:
    """Critical and anticritical temperature of one material by one set of laws.

    Attributes
    ----------
    material, law, backscatter, angle : str
        Names; the angle is "isotropic" or "normal".
    critical_temperature_eV : float or None
        Above it more electrons stay than leave; None: at no temperature do as many leave.
    anticritical_temperature_eV : float or None
        Below it as well; None: none above 0.5 eV.
    fitted_to_eV : float or None
        Impact energy up to which the secondary law follows data [eV]; None without emission.
    first_crossover_eV, second_crossover_eV : float or None
        Impact energies between which more electrons leave than arrive; None where absent.
    as_printed_eV : float or None
        Critical temperature with the law as its authors printed it, whose maximum is not
        exactly the stated one.
    """

    material: str
    law: str
    backscatter: str
    angle: str
    critical_temperature_eV: float | None
    anticritical_temperature_eV: float | None
    fitted_to_eV: float | None
    first_crossover_eV: float | None
    second_crossover_eV: float | None
    as_printed_eV: float | None


def onset_temperatures(material: Material | str) -> tuple[Onset, ...]:
    r"""Critical and anticritical temperatures of a material by every secondary law.

    The roots of :math:`\int E e^{-E/T} [\delta(E) + \eta(E)]\,dE = T^2`. The average does
    not depend on a repelling potential, so the upper root is also where a surface jumps
    from one branch to the other. Ions are left out: they move the roots by some percent.

    Parameters
    ----------
    material : Material or str
        Object, library name, or file.

    Returns
    -------
    tuple of Onset
        Isotropic first, the verdict's exponential law first, its other law second.

    Raises
    ------
    InputError
        Unknown name or unusable file.

    Examples
    --------
    >>> first = onset_temperatures("polyimide film")[0]
    >>> first.law, first.angle, 500.0 < first.critical_temperature_eV < 1200.0
    ('sanders_inouye_1979', 'isotropic', True)
    """
    record = as_material(material)
    laws = list(dict.fromkeys([law_of(record, law) for law in SECONDARY_LAWS] + list(YIELD_LAWS)))
    return tuple(_onset(record, law, angle) for angle in ANGLES for law in laws)


def law_spread_eV(rows: Sequence[Onset], angle: str = "isotropic") -> tuple[float, float] | None:
    """Lowest and highest critical temperature over the laws at an angle; None if none has any."""
    found = [
        row.critical_temperature_eV
        for row in rows
        if row.angle == angle and row.critical_temperature_eV is not None
    ]
    return (min(found), max(found)) if found else None


def printed_difference(rows: Sequence[Onset], law: str) -> tuple[float, float] | None:
    """Range of the shares by which a law as printed moves the critical temperature of rows.

    None where no row has both temperatures.
    """
    found = [
        row.as_printed_eV / row.critical_temperature_eV - 1.0
        for row in rows
        if row.law == law and row.critical_temperature_eV and row.as_printed_eV
    ]
    return (min(found), max(found)) if found else None


def roots_of_average(total: Yield) -> tuple[float | None, float | None]:
    """Critical and anticritical temperature [eV] of a total yield; None where absent.

    Parameters
    ----------
    total : callable
        Electrons that leave per electron that arrives, of impact energies [eV].

    Examples
    --------
    >>> from materials.secondary import sanders_inouye_1979
    >>> law = lambda E: sanders_inouye_1979(E, peak_yield=2.0, peak_energy_eV=100.0)
    >>> [round(T) for T in roots_of_average(law)]
    [273, 11]
    """
    t, weight = flux_nodes()

    def excess(temperature_eV: Array) -> Array:
        energy = temperature_eV[:, None] * t
        return np.asarray((total(energy) * weight).sum(axis=-1) - 1.0)

    def root(low: float, high: float) -> float:
        return float(brentq(lambda T: float(excess(np.array([T]))[0]), low, high, rtol=1e-12))

    grid = np.geomspace(LOWEST_EV, HIGHEST_EV, GRID_POINTS)
    above = excess(grid) > 0.0
    falls = np.flatnonzero(above[:-1] & ~above[1:])
    rises = np.flatnonzero(~above[:-1] & above[1:])
    critical = root(grid[falls[-1]], grid[falls[-1] + 1]) if falls.size else None
    anticritical = root(grid[rises[0]], grid[rises[0] + 1]) if rises.size else None
    return critical, anticritical


def _onset(material: Material, law: YieldLaw, angle: str) -> Onset:
    if not material.emits:
        return Onset(material.name, law, "none", angle, None, None, None, None, None, None)
    isotropic = angle == "isotropic"
    peak = true_secondary_peak(material)
    peak_eV = material.value("secondary_yield_peak_energy_eV")
    number = material.value("mean_atomic_number")
    scattered = backscatter_yield(material, isotropic=isotropic)
    printed = printed_form(law)

    def total(energy_eV: Array, height: float = 1.0, place: float = 1.0) -> Array:
        most, where = height * peak, place * peak_eV
        if isotropic:
            free = isotropic_yield(
                energy_eV,
                law=law,
                peak_yield=most,
                peak_energy_eV=where,
                mean_atomic_number=number,
            )
        else:
            free = normal_yield(energy_eV, law=law, peak_yield=most, peak_energy_eV=where)
        return free + scattered(energy_eV)

    critical, anticritical = roots_of_average(total)
    first, second = crossovers(total)
    return Onset(
        material.name,
        law,
        backscatter_law(material),
        angle,
        critical,
        anticritical,
        fitted_range_eV(law, peak_eV)[1],
        first,
        second,
        roots_of_average(lambda E: total(E, printed.height, printed.place))[0],
    )
