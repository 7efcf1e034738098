"""Choices of a study in order: which keeps the limits, how likely, and what drives it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from charging.study.assess import Against, against_limits, severities
from charging.study.intervals import Probability, half_width, probability, rank_products
from charging.study.plan import Plan
from charging.study.solve import Results

Array = NDArray[np.float64]
Index = NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class LimitRow:
    """One limit of one choice.

    limit : in a few words; requirement_id; worst : worst value of all draws, with sign;
    middle : median of the draws; allowed; exceed : probability, draws without solution count;
    beyond : draws with a value beyond the limit.
    """

    limit: str
    requirement_id: str
    surface: str
    kind: str
    worst: float
    middle: float
    allowed: float
    exceed: Probability
    beyond: int


@dataclass(frozen=True, slots=True)
class ChoiceRow:
    """One choice.

    Attributes
    ----------
    choice : str
    number : int
        Of the choice in the study.
    worst_V : float
        Largest differential of any draw, with sign.
    kind, surface : str
        Of that differential.
    exceed : Probability
        That any limit is exceeded; a draw without solution counts as exceeding.
    failed : int
        Draws without solution.
    drivers : tuple of (str, float)
        Factors whose rank correlation with the severity is more than chance, strongest first.
    limits : tuple of LimitRow
    """

    choice: str
    number: int
    worst_V: float
    kind: str
    surface: str
    exceed: Probability
    failed: int
    drivers: tuple[tuple[str, float], ...]
    limits: tuple[LimitRow, ...]

    @property
    def driver(self) -> str | None:
        """Strongest factor, None where the draws tell none."""
        return self.drivers[0][0] if self.drivers else None


def ranked(
    plan: Plan, results: Sequence[Results], names: Sequence[str], replicate: Index
) -> tuple[ChoiceRow, ...]:
    """Rank choices by the probability that a limit is exceeded, then by the worst differential.

    Parameters
    ----------
    plan : Plan
    results : sequence of Results
        One per choice, first axis the draws.
    names : sequence of str
        Factors, the columns of ``factor_value``.
    replicate : ndarray of int [draws]
    """
    rows = [_row(plan, number, found, names, replicate) for number, found in enumerate(results)]
    return tuple(
        sorted(rows, key=lambda row: (row.exceed.value, row.exceed.high, abs(row.worst_V)))
    )


def _row(
    plan: Plan, number: int, results: Results, names: Sequence[str], replicate: Index
) -> ChoiceRow:
    choice = plan.choices[number]
    against = against_limits(choice.loaded, results, plan.file.surfaces)
    severity = severities(against, len(replicate))
    failed = ~np.isfinite(severity)
    confidence = plan.file.confidence
    exceed = probability((severity > 1.0) | failed, replicate, confidence)
    kind, surface, worst = _worst(choice.loaded.case.names, results, plan.file.surfaces)
    return ChoiceRow(
        choice=choice.label,
        number=number,
        worst_V=worst,
        kind=kind,
        surface=surface,
        exceed=exceed,
        failed=int(failed.sum()),
        drivers=_drivers(results["factor_value"], severity, names, replicate, confidence),
        limits=tuple(_limit(one, replicate, confidence) for one in against),
    )


def _limit(one: Against, replicate: Index, confidence: float) -> LimitRow:
    failed = ~np.isfinite(one.value)
    solved = one.value[~failed]
    at = int(np.argmax(np.abs(solved))) if solved.size else 0
    return LimitRow(
        limit=one.text,
        requirement_id=one.requirement.requirement_id,
        surface=one.quantity.surface,
        kind=one.requirement.kind,
        worst=float(solved[at]) if solved.size else float("nan"),
        middle=float(np.median(solved)) if solved.size else float("nan"),
        allowed=one.requirement.limit,
        exceed=probability((one.severity > 1.0) | failed, replicate, confidence),
        beyond=int((one.severity > 1.0).sum()),
    )


def _worst(
    names: Sequence[str], results: Results, chosen: Sequence[str] | None
) -> tuple[str, str, float]:
    """Kind, surface and value of the largest differential of any draw."""
    wanted = [i for i, name in enumerate(names) if chosen is None or name in chosen]
    surfaces = [names[i] for i in wanted]
    low = np.nanmin(results["lowest_V"][..., wanted], axis=(0, 1, 2), initial=0.0)
    high = np.nanmax(results["highest_V"][..., wanted], axis=(0, 1, 2), initial=0.0)
    a, b = int(np.argmin(low)), int(np.argmax(high))
    if -low[a] >= high[b]:
        return "normal", surfaces[a], float(low[a])
    return "inverted", surfaces[b], float(high[b])


def _drivers(
    values: Array, severity: Array, names: Sequence[str], replicate: Index, confidence: float
) -> tuple[tuple[str, float], ...]:
    """Factors whose rank correlation with the severity is more than chance, strongest first.

    Few points of one sequence in many dimensions hang together, so chance is judged by how
    much the replicates differ; it is shared among the factors (Bonferroni).
    """
    solved = np.isfinite(severity)
    own = values[solved]
    varied = [
        i for i in range(len(names)) if np.isfinite(own[:, i]).all() and len(own) > 2
        and np.ptp(own[:, i]) > 0.0
    ]  # fmt: skip
    found = []
    for i in varied:
        products = rank_products(own[:, i], severity[solved])
        each = 1.0 - (1.0 - confidence) / len(varied)
        half = half_width(products, replicate[solved], each)
        correlation = float(products.mean())
        if abs(correlation) > half:
            found.append((names[i], correlation))
    return tuple(sorted(found, key=lambda pair: -abs(pair[1])))
