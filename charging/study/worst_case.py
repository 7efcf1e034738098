"""Search for the worst case within bounds: many starts, each climbing along the axes.

Starting points come from a low-discrepancy sequence; each then tries a step up and down every
axis, moves to the best, and halves its step where none is better (compass search; Hooke &
Jeeves 1961, J. ACM 8, 212). All trials of all starts of a round are one block of members.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from math import ceil, log2

import numpy as np
from numpy.typing import NDArray

from charging.study.assess import against_limits, severities
from charging.study.hands import Hands, solved_trials
from charging.study.plan import Plan
from charging.study.solve import trials

Array = NDArray[np.float64]

FIRST_STEP, LAST_STEP = 0.25, 1.0 / 256.0
Function = Callable[[Array], Array]


@dataclass(frozen=True, slots=True)
class Worst:
    """Where the search ended.

    place : ndarray [k], 0…1; value; evaluations; starts : how many; agreeing : starts that
    ended within 1 percent of the best value; converged : every start reached the last step.
    """

    place: Array
    value: float
    evaluations: int
    starts: int
    agreeing: int
    converged: bool


@dataclass(frozen=True, slots=True)
class WorstPlace:
    """The worst case of a study: what the search found, and the limit that is worst there."""

    search: Worst
    limit: str
    value_there: float
    allowed: float


def compass_search(
    function: Function, dimensions: int, *, starts: int, evaluations: int, seed: int
) -> Worst:
    """Largest value of a function on the unit cube.

    Parameters
    ----------
    function : callable
        Of places [N, k], returns values [N]; nan counts as lowest.
    dimensions : int
    starts : int
        Starting points; centre and corners of all axes low and all high are among them.
    evaluations : int
        At most.
    seed : int

    Examples
    --------
    >>> found = compass_search(lambda x: -((x - 0.3) ** 2).sum(axis=1), 2, starts=4,
    ...                        evaluations=400, seed=0)
    >>> found.place.round(2).tolist()
    [0.3, 0.3]
    """
    from scipy.stats import qmc

    rng = np.random.Generator(np.random.PCG64([seed, dimensions]))
    power = ceil(log2(max(2, starts)))
    at = qmc.Sobol(dimensions, scramble=True, rng=rng).random_base2(power)[:starts]
    fixed = [np.full(dimensions, 0.5), np.zeros(dimensions), np.ones(dimensions)]
    for i, point in enumerate(fixed[:starts]):
        at[i] = point
    best = _known(function(at))
    used = len(at)
    step = np.full(len(at), FIRST_STEP)
    while True:
        active = np.flatnonzero(step >= LAST_STEP)
        room = (evaluations - used) // (2 * dimensions)
        active = active[np.argsort(-best[active], kind="stable")][:room]
        if not active.size:
            break
        trials = np.repeat(at[active], 2 * dimensions, axis=0)
        for j in range(dimensions):
            trials[2 * j :: 2 * dimensions, j] += step[active]
            trials[2 * j + 1 :: 2 * dimensions, j] -= step[active]
        trials = np.clip(trials, 0.0, 1.0)
        value = _known(function(trials)).reshape(len(active), -1)
        used += len(trials)
        for row, start in enumerate(active):
            winner = int(np.argmax(value[row]))
            if value[row, winner] > best[start]:
                best[start] = value[row, winner]
                at[start] = trials[row * 2 * dimensions + winner]
            else:
                step[start] *= 0.5
    top = int(np.argmax(best))
    agreeing = int((best >= best[top] - 0.01 * abs(best[top])).sum())
    return Worst(at[top], float(best[top]), used, len(at), agreeing, bool((step < LAST_STEP).all()))


def _known(values: Array) -> Array:
    return np.where(np.isfinite(values), values, -np.inf)


def search_worst(plan: Plan, hands: Hands, choice: int, block: int) -> WorstPlace | None:
    """Worst case of a choice over the searched numbers, properties as recorded.

    The value is the largest severity over all limits.
    """
    wanted = plan.file.worst_case
    if wanted is None:
        return None
    found = compass_search(
        searched_severity(plan, hands, choice, block), len(plan.searched), starts=wanted.starts,
        evaluations=wanted.evaluations, seed=plan.file.seed,
    )  # fmt: skip
    ((_, part),) = solved_trials(hands, trials(choice, found.place[None], 1, searched=True))
    rows = against_limits(plan.choices[choice].loaded, part, plan.file.surfaces)
    if not rows:
        return WorstPlace(found, "no limit concerns the surfaces of the study", 0.0, float("inf"))
    most = max(rows, key=lambda row: float(np.nan_to_num(row.severity[0])))
    return WorstPlace(found, most.text, float(most.value[0]), most.requirement.limit)


def searched_severity(plan: Plan, hands: Hands, choice: int, block: int) -> Function:
    """Largest severity over all limits as a function of places of the searched numbers."""
    loaded = plan.choices[choice].loaded

    def severity(places: Array) -> Array:
        found = [
            severities(against_limits(loaded, part, plan.file.surfaces), len(trial.rows))
            for trial, part in solved_trials(hands, trials(choice, places, block, searched=True))
        ]
        return np.concatenate(found)

    return severity
