"""Sobol indices of the strongest factors of one choice, with intervals.

Which share of the variance of the severity a factor explains alone (first order) and with all
its interactions (total). Estimators: Saltelli et al. (2010), Comput. Phys. Commun. 181, 259,
equation (b) of table 2 for the first order, (f) for the total (Jansen 1999).
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from math import ceil, log2

import numpy as np
from numpy.typing import NDArray
from scipy.special import stdtrit

from charging.study.assess import against_limits, severities
from charging.study.draws import factors_of
from charging.study.hands import Hands, solved_trials
from charging.study.plan import Plan
from charging.study.ranking import ChoiceRow
from charging.study.solve import trials

Array = NDArray[np.float64]

REPLICATES = 16


@dataclass(frozen=True, slots=True)
class Index:
    """Indices of one factor with the half-widths of their intervals."""

    factor: str
    first: float
    first_half_width: float
    total: float
    total_half_width: float


Function = Callable[[Array], Array]
"""From places [N, k] to values [N]."""


def sobol_indices(
    function: Function, names: Sequence[str], *, base: int, seed: int, confidence: float
) -> tuple[Index, ...]:
    """First-order and total indices of a function of independent uniform numbers.

    Parameters
    ----------
    function : callable
        Of places in 0…1 [N, k], returns values [N].
    names : sequence of str
        Of the k factors.
    base : int
        Points in all; the function is evaluated ``base (k + 2)`` times.
    seed : int
    confidence : float
        Of the intervals, from `REPLICATES` independently scrambled sequences.

    Examples
    --------
    >>> found = sobol_indices(lambda x: x[:, 0] + 2.0 * x[:, 1], ["a", "b"], base=4096, seed=1,
    ...                       confidence=0.95)
    >>> [(one.factor, round(one.first, 2)) for one in found]
    [('b', 0.8), ('a', 0.2)]
    """
    from scipy.stats import qmc

    k = len(names)
    each = max(2, 2 ** ceil(log2(max(2, base // REPLICATES))))
    points = []
    for r in range(REPLICATES):
        rng = np.random.Generator(np.random.PCG64([seed, r, k]))
        both = qmc.Sobol(2 * k, scramble=True, rng=rng).random_base2(int(log2(each)))
        a, b = both[:, :k], both[:, k:]
        points.append(a)
        points.append(b)
        for i in range(k):
            mixed = a.copy()
            mixed[:, i] = b[:, i]
            points.append(mixed)
    value = function(np.concatenate(points)).reshape(REPLICATES, k + 2, each)
    known = np.isfinite(value)
    centre = float(value[known].mean())
    value = np.where(known, value, centre) - centre
    f_a, f_b, mixed = value[:, 0], value[:, 1], value[:, 2:]
    variance = (value**2).mean(axis=(1, 2))
    found = []
    for i, name in enumerate(names):
        first = (f_b * (mixed[:, i] - f_a)).mean(axis=-1)
        total = (0.5 * (f_a - mixed[:, i]) ** 2).mean(axis=-1)
        found.append(
            Index(name, *_ratio(first, variance, confidence), *_ratio(total, variance, confidence))
        )
    return tuple(sorted(found, key=lambda one: -one.total))


def _ratio(part: Array, variance: Array, confidence: float) -> tuple[float, float]:
    """Ratio of two sums over replicates, and the half-width of its interval.

    The interval is that of the jackknife, one replicate left out at a time: the variance is
    uncertain too.
    """
    if variance.sum() == 0.0:
        return 0.0, 0.0
    count = len(part)
    without = (part.sum() - part) / (variance.sum() - variance)
    spread = float(np.sqrt((count - 1) / count * ((without - without.mean()) ** 2).sum()))
    student = float(stdtrit(count - 1, 0.5 + 0.5 * confidence))
    return float(part.sum() / variance.sum()), student * spread


def choice_indices(plan: Plan, hands: Hands, row: ChoiceRow, block: int) -> tuple[Index, ...]:
    """Indices of the strongest factors of a choice; the others stay at their medians."""
    wanted = plan.file.indices
    strongest = [] if wanted is None else [name for name, _ in row.drivers[: wanted.factors]]
    if wanted is None or not strongest:
        return ()
    own = list(factors_of(plan, plan.choices[row.number]).names)
    columns = [own.index(name) for name in strongest]
    loaded = plan.choices[row.number].loaded

    def severity(places: Array) -> Array:
        rows = np.full((len(places), len(own)), 0.5)
        rows[:, columns] = places
        parts = [
            severities(against_limits(loaded, part, plan.file.surfaces), len(trial.rows))
            for trial, part in solved_trials(hands, trials(row.number, rows, block))
        ]
        return np.concatenate(parts)

    return sobol_indices(
        severity, strongest, base=wanted.base, seed=plan.file.seed,
        confidence=plan.file.confidence,
    )  # fmt: skip
