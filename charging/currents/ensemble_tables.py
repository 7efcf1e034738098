"""Coarse tables of surface currents for many members whose materials and plasmas differ.

A march of one case reads splines with a relative error of 1e-8. Thousands of members with
materials of their own would take hours to tabulate that way. Here every member gets cubic
pieces on a few dozen knots, filled from closed forms and from `yield_scaling`; their error,
some 1e-4 of the random current, is what an ensemble of a volt or a percent can bear.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields
from functools import cache

import numpy as np
from numpy.typing import NDArray
from scipy.special import roots_genlaguerre

from charging.currents.emission import backscatter_law, law_of
from charging.currents.yield_scaling import scaled_knots, scaled_yield
from environments.plasma import Plasma, Population, population_current
from materials.angle import (
    backscatter_angle_coefficient,
    exponential_angle_factor,
    secondary_angle_coefficient,
)
from materials.ion_impact import whipple_kernel
from materials.record import Material
from materials.secondary import YieldLaw, true_secondary_peak

Array = NDArray[np.float64]
Index = NDArray[np.intp]

LAGUERRE_POINTS = 12
"""For the average of ion yields, which are smooth."""

BARE_SCALE_V = 300.0
"""Stands for the peak energy of a surface that emits nothing."""

HIGHEST = 1500.0
"""Last knot, V/E_max: hundreds of kilovolts."""

COLUMNS = 4  # per plasma


@dataclass(frozen=True, slots=True)
class Pairs:
    """Emission parameters of N pairs of member and material, as far as the tables need them.

    Attributes
    ----------
    law : YieldLaw or None
        One for all pairs; None: they emit nothing.
    peak, peak_energy_eV, growth : ndarray [N]
        True secondaries: maximum, its energy, growth by angle.
    high, drop, drop_energy_eV : ndarray [N]
        Backscatter, angle average included.
    ion_peak, ion_energy_eV : ndarray [N]
    """

    law: YieldLaw | None
    peak: Array
    peak_energy_eV: Array
    growth: Array
    high: Array
    drop: Array
    drop_energy_eV: Array
    ion_peak: Array
    ion_energy_eV: Array

    def part(self, here: slice) -> Pairs:
        """Some of the pairs."""
        arrays = (getattr(self, field.name)[here] for field in fields(self)[1:])
        return Pairs(self.law, *arrays)


def is_scalable(material: Material) -> bool:
    """Whether the coarse tables know the laws of a material."""
    if not material.emits:
        return True
    plain = "coating_thickness_m" not in material.values
    return plain and backscatter_law(material) == "prokopenko_laframboise_1980"


def pairs_of(materials: Sequence[Material], law: YieldLaw | None) -> Pairs:
    """Gather materials that share a law; `law` None where they emit nothing."""
    if law is None:
        none = np.zeros(len(materials))
        one = np.ones(len(materials))
        return Pairs(None, none, BARE_SCALE_V * one, none, none, none, one, none, one)
    number = np.array([m.value("mean_atomic_number") for m in materials])
    oblique = exponential_angle_factor(backscatter_angle_coefficient(number))
    return Pairs(
        law=law,
        peak=np.array([true_secondary_peak(m) for m in materials]),
        peak_energy_eV=np.array([m.value("secondary_yield_peak_energy_eV") for m in materials]),
        growth=exponential_angle_factor(secondary_angle_coefficient(number)) - 1.0,
        high=oblique * np.array([m.value("backscatter_high_energy") for m in materials]),
        drop=oblique * np.array([m.get("backscatter_low_energy_drop", 0.0) for m in materials]),
        drop_energy_eV=np.array([m.get("backscatter_drop_energy_eV", 1.0) for m in materials]),
        ion_peak=np.array([m.value("ion_yield_peak") for m in materials]),
        ion_energy_eV=np.array([m.value("ion_yield_peak_energy_eV") for m in materials]),
    )


def chosen_law(material: Material, asked: YieldLaw) -> YieldLaw | None:
    """Law of a material in a member that asks for one; None where it emits nothing."""
    return law_of(material, asked) if material.emits else None


def knots_from(lowest: float) -> Array:
    """V/E_max [K]: 0 and the knots of `scaled_knots` from `lowest` to `HIGHEST`."""
    grid = scaled_knots()
    return np.concatenate([[0.0], grid[(grid >= lowest) & (grid <= HIGHEST)]])


CHUNK = 48
"""Pairs filled at once: their arrays then stay in the cache, which is three times faster."""


def cubic_pieces(width: Array, value: Array, slope: Array) -> Array:
    """Cubics through values and slopes.

    Parameters
    ----------
    width : ndarray [N, K-1]
    value, slope : ndarray [..., N, K]

    Returns
    -------
    ndarray [4, ..., N, K-1]
        Coefficients of the distance from the left knot, highest power first.
    """
    rise = (value[..., 1:] - value[..., :-1]) / width
    left, right = slope[..., :-1], slope[..., 1:]
    bend = left + right - 2.0 * rise
    return np.stack([bend / width**2, (rise - left - bend) / width, left, value[..., :-1]])


def pair_tables(pairs: Pairs, plasmas: Sequence[Sequence[Plasma]], knots: Array) -> Array:
    """Tables of N pairs of member and material.

    Parameters
    ----------
    pairs : Pairs
    plasmas : sequence [N] of sequence [P] of Plasma
        Of Maxwellians; the same species in the same order for every pair.
    knots : ndarray [K]
        V/E_max, from `knots_from`.

    Returns
    -------
    ndarray [N, 2(K-1), 4, 4P]
        Cubic pieces in |phi| [V], negative potentials first. Four columns per plasma, as in
        `NetCurrents`: the current collected less the backscattered one [A m-2] in plane and in
        thick sheath, then what secondaries and ions release before its escape, in both.
    """
    count, cells, width = len(pairs.peak), len(knots) - 1, COLUMNS * len(plasmas[0])
    out = np.empty((count, 2, cells, 4, width))
    for first in range(0, count, CHUNK):
        here = slice(first, min(first + CHUNK, count))
        some = pairs.part(here)
        own = plasmas[here]
        volts = some.peak_energy_eV[:, None] * knots
        # side, value or slope, column, plasma, pair, knot
        table = np.zeros((2, 2, COLUMNS, len(own[0]), *volts.shape))
        for p in range(len(own[0])):
            for position in range(len(own[0][p].populations)):
                alike = [one[p].populations[position] for one in own]
                add = _add_electrons if alike[0].species.charge_number < 0 else _add_ions
                add(table[:, :, :, p], some, alike, volts, knots)
        pieces = cubic_pieces(np.diff(volts, axis=1), table[:, 0], table[:, 1])
        # power, side, column, plasma, pair, cell
        moved = pieces.transpose(4, 1, 5, 0, 3, 2)
        out[here] = moved.reshape(*moved.shape[:4], width)
    return out.reshape(count, 2 * cells, 4, width)


def _thermal(alike: Sequence[Population]) -> tuple[Array, Array, float]:
    """Signed current [N, 1], temperature over charge number [N, 1] [V], charge number."""
    known: dict[int, float] = {}
    for one in alike:
        if id(one) not in known:
            known[id(one)] = population_current(one)
    current = np.array([known[id(one)] for one in alike])
    charge = abs(float(alike[0].species.charge_number))
    temperature = np.array([one.temperature_eV for one in alike])
    return current[:, None], (temperature / charge)[:, None], charge


def _add_electrons(
    table: Array, pairs: Pairs, alike: Sequence[Population], volts: Array, knots: Array
) -> None:
    """Add electrons to columns [2, 2, 4, N, K] of one plasma."""
    current, T, _ = _thermal(alike)
    high, drop = pairs.high[:, None], pairs.drop[:, None]
    C = pairs.drop_energy_eV[:, None]
    held = 1.0 / (1.0 + T / C)
    repelled = np.exp(-volts / T)
    back = high - drop * held**2
    for column in (0, 1):
        table[0, 0, column] += current * (1.0 - back) * repelled
        table[0, 1, column] -= current * (1.0 - back) * repelled / T
    u = volts / T
    low = drop * np.exp(-volts / C)
    table[1, 0, 0] += current * (1.0 - high + low * held**2)
    table[1, 1, 0] -= current * low * held**2 / C
    thick = held**2 + u * held
    table[1, 0, 1] += current * ((1.0 - high) * (1.0 + u) + low * thick)
    table[1, 1, 1] += current * ((1.0 - high) / T + low * (held / T - thick / C))
    if pairs.law is None:
        return
    E_max = pairs.peak_energy_eV
    found = scaled_yield(pairs.law, T[:, 0] / E_max, pairs.growth, knots)
    peak = -current * pairs.peak[:, None]
    scale = E_max[:, None]
    for column, value, slope in (
        (2, found.plane, found.d_plane),
        (3, found.thick, found.d_thick),
    ):
        at_rest = peak * found.plane[:, :1]
        table[0, 0, column] += at_rest * repelled
        table[0, 1, column] -= at_rest * repelled / T
        table[1, 0, column] += peak * value
        table[1, 1, column] += peak * slope / scale


def _add_ions(
    table: Array, pairs: Pairs, alike: Sequence[Population], volts: Array, _knots: Array
) -> None:
    """Add ions to columns [2, 2, 4, N, K] of one plasma."""
    current, T, charge = _thermal(alike)
    u = volts / T
    table[0, 0, 0] += current
    table[0, 0, 1] += current * (1.0 + u)
    table[0, 1, 1] += current / T
    repelled = np.exp(-u)
    for column in (0, 1):
        table[1, 0, column] += current * repelled
        table[1, 1, column] -= current * repelled / T
    if pairs.law is None:
        return
    particles = current / charge
    impact = _ion_averages(pairs, charge * T, charge * volts)
    for column, (value, slope) in ((2, impact[0]), (3, impact[1])):
        table[0, 0, column] += particles * value
        table[0, 1, column] += particles * slope * charge
        at_rest = particles * impact[0][0][:, :1]
        table[1, 0, column] += at_rest * repelled
        table[1, 1, column] -= at_rest * repelled / T


@cache
def _laguerre(power: int) -> tuple[tuple[float, float], ...]:
    nodes, weights = roots_genlaguerre(LAGUERRE_POINTS, power)
    return tuple(zip(nodes.tolist(), weights.tolist(), strict=True))


def _ion_averages(
    pairs: Pairs, temperature_eV: Array, energy_eV: Array
) -> tuple[tuple[Array, Array], tuple[Array, Array]]:
    """Electrons per ion in plane and thick sheath [N, K], each with its slope by the energy."""
    plane, d_plane, thick, d_thick = (np.zeros_like(energy_eV) for _ in range(4))
    over = energy_eV / temperature_eV
    for power, add in ((1, True), (0, False)):
        for t, w in _laguerre(power):
            value, slope = _ion_yield(pairs, temperature_eV * t + energy_eV)
            if add:
                plane += w * value
                d_plane += w * slope
                thick += w * value
                d_thick += w * slope
            else:
                thick += w * over * value
                d_thick += w * (over * slope + value / temperature_eV)
    return (plane, d_plane), (thick, d_thick)


def _ion_yield(pairs: Pairs, energy_eV: Array) -> tuple[Array, Array]:
    """Electrons per ion and the slope by its energy; see `whipple_1981`."""
    scale = pairs.ion_energy_eV[:, None]
    value = whipple_kernel(energy_eV, pairs.ion_peak[:, None], scale)
    x = energy_eV / scale
    return value, value * (1.0 - x) / (2.0 * energy_eV * (1.0 + x))
