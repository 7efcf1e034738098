"""One comparison with something outside the project, and what came of it."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from math import isfinite
from typing import Literal, SupportsFloat

Measure = Literal["relative", "absolute", "factor"]
Basis = Literal["closed form", "measured", "handbook", "derived", "memory", "calibration"]

COUNTED: tuple[Basis, ...] = ("closed form", "measured", "handbook", "derived")
"""Bases that may count: closed forms, and figures of sources seen."""

MOST_PER_FORMULA = 5
"""Counted rows of one formula; more of them would say nothing new."""


@dataclass(frozen=True, slots=True)
class Check:
    """A quantity, the figure published for it, and how to compute ours.

    Attributes
    ----------
    quantity : str
    formula : str
        Law or model under test; rows of one formula are counted five times at most.
    published : float
        From the source, never from this project; for a closed form worked out apart from it.
    unit : str
    tolerance : float
        Largest deviation in the sense of `measure`.
    source : str
        Publication, or the formula and how it was worked out.
    basis : str
        "closed form": by hand or by another program from the formula; "measured", "handbook":
        in the source named; "derived": by another calculation from published figures;
        "memory": nobody looked at the page; "calibration": the model was set from it.
    ours : callable
        Computes the figure.
    measure : {"relative", "absolute", "factor"}
        Factor: the larger over the smaller.
    independent : bool
        False where the figure was known before ours was fixed, or shares an input with it.
    """

    quantity: str
    formula: str
    published: float
    unit: str
    tolerance: float
    source: str
    basis: Basis
    ours: Callable[[], SupportsFloat]
    measure: Measure = "relative"
    independent: bool = True

    @property
    def counted(self) -> bool:
        """Whether agreement says something about the model."""
        return self.independent and self.basis in COUNTED


@dataclass(frozen=True, slots=True)
class Row:
    """A check with its result; `deviation` in the sense of the check's measure."""

    quantity: str
    formula: str
    published: float
    ours: float
    deviation: float
    unit: str
    tolerance: float
    measure: Measure
    source: str
    basis: Basis
    counted: bool
    ok: bool


def deviation(check: Check, ours: float) -> float:
    """Distance of a computed figure from the published one.

    Examples
    --------
    >>> one = Check("x", "x", 2.0, "1", 0.1, "by hand", "closed form", lambda: 2.1)
    >>> round(deviation(one, 2.1), 12)
    0.05
    """
    if check.measure == "absolute":
        return abs(ours - check.published)
    if check.measure == "factor":
        ratio = ours / check.published
        return max(ratio, 1.0 / ratio) if ratio > 0.0 else float("inf")
    return abs(ours / check.published - 1.0)


def evaluate(checks: Iterable[Check]) -> list[Row]:
    """Recompute checks in their order."""
    rows = []
    for check in checks:
        ours = float(check.ours())
        off = deviation(check, ours) if isfinite(ours) else float("inf")
        rows.append(
            Row(
                quantity=check.quantity,
                formula=check.formula,
                published=check.published,
                ours=ours,
                deviation=off,
                unit=check.unit,
                tolerance=check.tolerance,
                measure=check.measure,
                source=check.source,
                basis=check.basis,
                counted=check.counted,
                ok=off <= check.tolerance,
            )
        )
    return rows
