"""Draws of a study: places in the spreads of properties and in ranges, the same for the same seed.

Every factor of any choice has a dimension of its own in one low-discrepancy sequence, so that
choices are compared on the same draws. The sequence is scrambled independently several times:
how much the answers of these replicates differ gives their intervals.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import ceil, exp, log, log2

import numpy as np
from numpy.typing import NDArray

from charging.members import Member
from charging.review.space import Key, Property, Variant, Workshop, properties, varied
from charging.study.choices import Choice, with_numbers
from charging.study.plan import Plan, Range
from materials.secondary import YieldLaw

Array = NDArray[np.float64]
Index = NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class Factors:
    """What is drawn for one choice.

    Attributes
    ----------
    spreads : tuple of Property
        Properties within their spreads.
    ranges : tuple of Range
    """

    spreads: tuple[Property, ...]
    ranges: tuple[Range, ...]

    @property
    def names(self) -> tuple[str, ...]:
        """Names, spreads first."""
        return (*(spread_name(p.name) for p in self.spreads), *(r.target.text for r in self.ranges))


def spread_name(key: Key) -> str:
    """Path of a property, as a study file writes it."""
    return f"material.{key[0]}.{key[1]}"


def factors_of(plan: Plan, choice: Choice) -> Factors:
    """Factors of a choice; a property with a range of its own is not drawn from its spread."""
    spreads: tuple[Property, ...] = ()
    if plan.file.draw == "spreads":
        taken = {r.target.text for r in plan.ranges} | set(choice.values)
        spreads = tuple(
            p
            for p in varied(properties(choice.loaded, plan.file.age))
            if spread_name(p.name) not in taken
        )
    return Factors(spreads, plan.ranges)


def factor_names(plan: Plan) -> tuple[str, ...]:
    """Names of the factors of all choices, sorted: the dimensions of the sequence."""
    return tuple(sorted({n for choice in plan.choices for n in factors_of(plan, choice).names}))


def places(plan: Plan, dimensions: int) -> tuple[Array, Index]:
    """Places 0…1 [draws, dimensions] and the replicate of every draw.

    Raises
    ------
    ValueError
        More dimensions than the sequence has (21201).
    """
    from scipy.stats import qmc  # a second to load

    count = plan.draws
    replicates = min(plan.file.replicates, count)
    replicate = np.arange(count) * replicates // count
    out = np.empty((count, dimensions))
    if dimensions == 0:
        return out, replicate
    for r in range(replicates):
        rows = np.flatnonzero(replicate == r)
        rng = np.random.Generator(np.random.PCG64([plan.file.seed, r]))
        if plan.file.method == "sobol":
            power = max(0, ceil(log2(len(rows))))
            sequence = qmc.Sobol(dimensions, scramble=True, rng=rng)
            out[rows] = sequence.random_base2(power)[: len(rows)]
        else:
            out[rows] = qmc.LatinHypercube(dimensions, rng=rng).random(len(rows))
    return out, replicate


def value_in(one: Range, place: float) -> float:
    """Number at a place of a range.

    Examples
    --------
    >>> from charging.study.targets import Target
    >>> one = Range(Target("x", "case", ("x",)), 1.0, 100.0, "log_uniform")
    >>> round(value_in(one, 0.5), 9)
    10.0
    """
    if one.law == "log_uniform":
        return min(max(exp(log(one.low) + place * log(one.high / one.low)), one.low), one.high)
    return one.low + place * (one.high - one.low)


@dataclass(slots=True)
class MemberMaker:
    """Makes the members of one choice from places in its factors."""

    plan: Plan
    choice: Choice
    factors: Factors
    _workshop: Workshop

    @classmethod
    def of(cls, plan: Plan, choice: Choice) -> MemberMaker:
        """Prepare a choice."""
        return cls(plan, choice, factors_of(plan, choice), Workshop.of(choice.loaded))

    def member(self, places_of: Sequence[float], law: YieldLaw) -> Member:
        """Member with its factors at places 0…1, in the order of `factors.names`."""
        spreads, ranges = self.factors.spreads, self.factors.ranges
        settings = tuple((p.name, float(x)) for p, x in zip(spreads, places_of, strict=False))
        body = self.choice.loaded.case.body
        variant = Variant(self.plan.file.age, law, body.collection, settings)
        if not ranges:
            return self._workshop.member(variant)
        numbers = [
            (one.target, value_in(one, float(x)))
            for one, x in zip(ranges, places_of[len(spreads) :], strict=True)
        ]
        return Workshop.of(with_numbers(self.choice.loaded, numbers)).member(variant)

    def values(self, places_of: Sequence[float]) -> list[float]:
        """Values of the factors at places 0…1."""
        spreads, ranges = self.factors.spreads, self.factors.ranges
        return [
            *(p.at(float(x)) for p, x in zip(spreads, places_of, strict=False)),
            *(
                value_in(r, float(x))
                for r, x in zip(ranges, places_of[len(spreads) :], strict=True)
            ),
        ]
