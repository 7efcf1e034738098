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
JUMP, COARSE = 1.0, 1e-3  # move of a root, asinh, that is looked into, and how closely


@dataclass(frozen=True, slots=True)
class Fold:
    """A pair of roots that appears or vanishes.

    Attributes
    ----------
    parameter : float
        Value at which the two roots meet, to 1e-6 of itself by default.
    potential_V : float
        Where they meet.
    appears : bool
        True when the pair exists above the value, False when it exists below.
    """

    parameter: float
    potential_V: float
    appears: bool


def fold_points(
    model_at: Callable[[float], SurfaceModel],
    values: Sequence[float],
    light: float = 0.0,
    *,
    precision: float = PRECISION,
) -> tuple[Fold, ...]:
    """Find the folds of one surface along a parameter of its plasma.

    Parameters
    ----------
    model_at : callable
        Surface model for a value of the parameter, such as a density factor
        (`with_density`) or a temperature.
    values : sequence of float
        Rising, positive; folds are looked for between neighbours whose roots differ in number
        or lie far apart: behind a jump two folds may hide.
    light : float, optional
        Illumination times incidence cosine, 0…1.
    precision : float, optional
        Of the parameter, as a share of itself.

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

    folds: list[Fold] = []
    known = [(value, solve(value)) for value in values]
    open_pairs = list(pairwise(known))[::-1]
    while open_pairs:
        (low, before), (high, after) = open_pairs.pop()
        same = len(before.roots) == len(after.roots)
        if same and (_farthest(before, after) < JUMP or high - low <= COARSE * high):
            continue
        middle = float(np.sqrt(low * high))
        if high - low <= precision * high:
            appears = len(after.roots) > len(before.roots)
            more, fewer = (after, before) if appears else (before, after)
            folds.append(Fold(middle, _meeting(more, fewer), appears))
            continue
        between = middle, solve(middle)
        open_pairs += [(between, (high, after)), ((low, before), between)]
    return tuple(folds)


def _farthest(before: FloatingPotentials, after: FloatingPotentials) -> float:
    """Largest move of a root, on the scale of asinh."""
    first, second = (np.arcsinh([r.potential_V for r in f.roots]) for f in (before, after))
    return float(np.abs(first - second).max())


def _meeting(more: FloatingPotentials, fewer: FloatingPotentials) -> float:
    """Middle of the two neighbours that vanish, by what remains on the scale of asinh."""
    volts = np.array([root.potential_V for root in more.roots])
    scaled = np.arcsinh(volts)
    left = np.arcsinh([root.potential_V for root in fewer.roots])
    gaps = np.diff(scaled)
    if len(left) == len(scaled) - 2:
        pairs = range(len(gaps))
        moved = [np.abs(np.delete(scaled, (k, k + 1)) - left).sum() + gaps[k] for k in pairs]
        k = int(np.argmin(moved))
    else:  # a double root met exactly, or two folds in one place
        k = int(np.argmin(gaps))
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
