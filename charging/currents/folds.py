"""Where floating potentials appear or vanish as the plasma changes.

At a fold two roots of the current balance meet. Beyond it a surface that sat on one of
them jumps to another branch: the threshold of charging, and of its end, which differ.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np

from charging.currents.balance import FloatingPotentials, floating_potentials
from charging.currents.surface import SurfaceModel

PRECISION = 1e-6


@dataclass(frozen=True, slots=True)
class Fold:
    """A pair of roots that appears or vanishes.

    Attributes
    ----------
    parameter : float
        Value at which the two roots meet, to 1e-6 of itself.
    potential_V : float
        Where they meet.
    appears : bool
        True when the pair exists above the value, False when it exists below.
    """

    parameter: float
    potential_V: float
    appears: bool


def fold_points(
    model_at: Callable[[float], SurfaceModel], values: Sequence[float], light: float = 0.0
) -> tuple[Fold, ...]:
    """Find the folds of one surface along a parameter of its plasma.

    Parameters
    ----------
    model_at : callable
        Surface model for a value of the parameter, such as a density factor
        (`with_density`) or a temperature.
    values : sequence of float
        Rising, positive; folds are looked for between neighbours, each of which may hide
        one change of the number of roots.
    light : float, optional
        Illumination times incidence cosine, 0…1.

    Returns
    -------
    tuple of Fold, by rising parameter

    Raises
    ------
    NoSolutionError
        The balance has no root at all for one of the values.
    """

    def solve(value: float) -> FloatingPotentials:
        return floating_potentials(model_at(value), light)

    folds = []
    known = [(value, solve(value)) for value in values]
    for (low, before), (high, after) in pairwise(known):
        while len(before.roots) != len(after.roots):
            middle = float(np.sqrt(low * high))
            if high - low <= PRECISION * high:
                appears = len(after.roots) > len(before.roots)
                folds.append(Fold(middle, _meeting(after if appears else before), appears))
                break
            between = solve(middle)
            if len(between.roots) == len(before.roots):
                low, before = middle, between
            else:
                high, after = middle, between
    return tuple(folds)


def _meeting(found: FloatingPotentials) -> float:
    """Middle of the closest two neighbours, measured on the scale of asinh."""
    volts = np.array([root.potential_V for root in found.roots])
    k = int(np.argmin(np.diff(np.arcsinh(volts))))
    return float(0.5 * (volts[k] + volts[k + 1]))


def with_density(model: SurfaceModel, factor: float, population: int) -> SurfaceModel:
    """Return a model with one Maxwellian electron population made denser by a factor.

    Parameters
    ----------
    model : SurfaceModel
    factor : float
        Multiplies density and current of the population.
    population : int
        Index among the electron populations of the model.
    """
    electrons = model.electrons
    if population not in electrons.maxwellian:
        raise ValueError("only a Maxwellian population can be made denser here")
    scale = np.ones_like(electrons.density_m3)
    scale[population] = factor
    denser = replace(
        electrons,
        density_m3=electrons.density_m3 * scale,
        thermal_current_A_m2=electrons.thermal_current_A_m2 * scale,
    )
    return replace(model, electrons=denser)
