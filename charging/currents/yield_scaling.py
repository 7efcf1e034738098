r"""Average yields of attracted Maxwellians for any peak energy and temperature at once.

A law's shape depends on x = E/E_max alone, so its average over electrons of temperature T
that a potential V attracts depends on V/E_max and T/E_max alone. Tabulated once per law on
a grid fixed for ever, members of an ensemble that differ in peak energy or temperature
interpolate it, and none of them depends on its company.
"""

from __future__ import annotations

from functools import cache
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import make_interp_spline

from charging.currents.tables import flux_nodes
from materials.yield_laws import NORMAL_SHAPES, YieldLaw, lin_joy_isotropic_shape

Array = NDArray[np.float64]
Index = NDArray[np.intp]

SCALE, SPACING, LARGEST = 1e-5, 0.1, 1e4
"""Knots x_k = SCALE sinh^2(k SPACING), up to LARGEST."""

TEMPERATURE_STEP = 0.15
"""Step of ln(T/E_max) between tabulated temperatures."""

STENCIL = 6
"""Temperatures that an interpolation uses."""


@cache
def scaled_knots() -> Array:
    """V/E_max [K] from 0, read-only."""
    last = np.arcsinh(np.sqrt(LARGEST / SCALE))
    grid: Array = SCALE * np.sinh(SPACING * np.arange(int(np.ceil(last / SPACING)) + 1)) ** 2
    grid.flags.writeable = False
    return grid


class ScaledYield(NamedTuple):
    """Averages [m, K] of a shape, per unit of the one-sided current, and slopes by V/E_max.

    plane, thick : the two limits of the sheath; `d_` marks slopes.
    """

    plane: Array
    d_plane: Array
    thick: Array
    d_thick: Array


def scaled_yield(
    law: YieldLaw, temperature_over_peak: Array, growth: Array, knots: Array | None = None
) -> ScaledYield:
    """Isotropic yield of peak 1 averaged over attracted Maxwellians.

    Parameters
    ----------
    law : YieldLaw
    temperature_over_peak : ndarray [m]
        T/E_max, 1e-8 to 1e8.
    growth : ndarray [m]
        Growth of the isotropic over the normal yield far above E_max (see
        `materials.secondary.isotropic_yield`); without effect for "lin_joy_2005".
    knots : ndarray [K], optional
        V/E_max, some of `scaled_knots`; default: all.

    Returns
    -------
    ScaledYield
    """
    wanted = np.arange(len(scaled_knots()))
    if knots is not None:
        wanted = np.searchsorted(scaled_knots(), knots)
    place = np.log(temperature_over_peak) / TEMPERATURE_STEP
    first = np.floor(place).astype(np.intp) - (STENCIL // 2 - 1)
    weight = _lagrange(place - first)
    total = np.zeros((4, len(place), len(wanted)))
    for start in np.unique(first):
        here = first == start
        for j in range(STENCIL):
            shape, grown = (part[:, wanted] for part in _nodes(law, int(start) + j))
            w = weight[here, j, None]
            total[:, here] += w * (shape[:, None] + growth[here, None] * grown[:, None])
    return ScaledYield(*total)


def _lagrange(place: Array) -> Array:
    """Weights [m, STENCIL] of values at 0, 1, … for the abscissae `place` [m]."""
    weight = np.ones((len(place), STENCIL))
    for j in range(STENCIL):
        for i in range(STENCIL):
            if i != j:
                weight[:, j] *= (place - i) / (j - i)
    return weight


@cache
def _nodes(law: YieldLaw, number: int) -> tuple[Array, Array]:
    """Averages [4, K] of the shape and of its growth at the temperature of a number."""
    temperature = float(np.exp(TEMPERATURE_STEP * number))
    x = scaled_knots()
    t, weight = flux_nodes()
    energy = temperature * t + x[:, None]
    over = x[:, None] / (temperature * t)
    if law == "lin_joy_2005":
        kinds = [lin_joy_isotropic_shape(energy), np.zeros_like(energy)]
    else:
        shape = NORMAL_SHAPES[law](energy)
        kinds = [shape, shape * np.expm1(-energy) ** 2]
    found = []
    for kind in kinds:
        rows = []
        for factor in (np.ones_like(over), 1.0 + over):
            value = (kind * factor * weight).sum(axis=-1)
            # smooth in the square root of x, which the knots follow
            spline = make_interp_spline(np.arange(len(x)), value, k=5)
            slope = spline(np.arange(len(x)), nu=1)
            stretch = SCALE * SPACING * np.sinh(2.0 * SPACING * np.arange(len(x)))
            slope[1:] /= stretch[1:]
            slope[0] = (value[1] - value[0]) / x[1]
            rows += [value, slope]
        table = np.stack(rows)
        table.flags.writeable = False
        found.append(table)
    return found[0], found[1]
