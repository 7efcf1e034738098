"""Design limits of a case, and how a predicted value stands against them."""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from math import log10
from typing import Literal

from charging.case import Case, Limit
from charging.review.criteria import CRITERIA, Criterion, Kind

Verdict = Literal["within", "exceeded", "not assessable"]

KIND_MEANING: dict[Kind, str] = {
    "normal": "surface below structure",
    "inverted": "surface above structure",
    "field": "field in the dielectric",
    "neighbour normal": "dielectric below a neighbouring conductor",
    "neighbour inverted": "dielectric above a neighbouring conductor",
    "neighbour": "difference between neighbours",
    "energy": "energy stored between a surface and what carries it",
    "structure": "structure against the plasma",
}
UNITS: dict[Kind, str] = {
    kind: {"field": "V m-1", "energy": "J"}.get(kind, "V") for kind in KIND_MEANING
}
RUN_KINDS: tuple[Kind, ...] = ("normal", "inverted", "field")
"""Kinds that a run judges; a review judges all."""


@dataclass(frozen=True, slots=True)
class Requirement:
    """One limit with its origin.

    Attributes
    ----------
    kind : Kind
    allowed : float
        Magnitude [V], [V m-1] or [J] before the margin policy.
    surfaces : tuple of str or None
        None: every surface.
    requirement_id, document, issue, clause, basis : str
        basis: "standard", "recollection" (text not seen), "case" (given by the case file).
    margin_factor : float
        The value must stay below allowed / margin_factor.
    margin_basis : str
    verified : bool
        Whether the clause was read; without that nothing is "within" it.
    note : str
    """

    kind: Kind
    allowed: float
    surfaces: tuple[str, ...] | None
    requirement_id: str
    document: str
    issue: str
    clause: str
    basis: str
    margin_factor: float = 1.0
    margin_basis: str = "none"
    verified: bool = True
    note: str = ""

    @property
    def limit(self) -> float:
        """Magnitude that the value must not exceed."""
        return self.allowed / self.margin_factor

    def covers(self, surface: str) -> bool:
        """Whether the requirement applies to a surface."""
        return self.surfaces is None or surface in self.surfaces


def _published(one: Criterion) -> Requirement:
    return Requirement(
        kind=one.kind,
        allowed=one.allowed,
        surfaces=None,
        requirement_id=f"{one.document} {one.clause}".strip(),
        document=one.document,
        issue=one.issue,
        clause=one.clause,
        basis="standard" if one.verified else "recollection",
        verified=one.verified,
        note=one.note,
    )


DEFAULTS = tuple(_published(one) for one in CRITERIA["ECSS"])
"""ECSS-E-ST-20-06C (31 July 2008), clause 6.2.1 a: the limits without a case's own."""


def requirements(
    case: Case, kinds: Sequence[Kind] = tuple(KIND_MEANING)
) -> tuple[Requirement, ...]:
    """Limits of a case: a ``[[limit]]`` replaces the default of its kind and scope, else adds.

    A limit for all surfaces replaces the default of its kind; one for named surfaces
    replaces it for these surfaces only. `kinds` selects.
    """
    own = [_own(limit, i) for i, limit in enumerate(case.limit)]
    found = []
    for default in map(_published, CRITERIA[case.review.criteria]):
        same = [r for r in own if r.kind == default.kind]
        if any(r.surfaces is None for r in same):
            continue
        taken = {name for r in same for name in r.surfaces or ()}
        rest = tuple(name for name in case.names if name not in taken)
        if not taken:
            found.append(default)
        elif rest:
            found.append(replace(default, surfaces=rest))
    return tuple(r for r in (*found, *own) if r.kind in kinds)


def _own(limit: Limit, number: int) -> Requirement:
    allowed = {"field": limit.allowed_V_m, "energy": limit.allowed_J}.get(
        limit.kind, limit.allowed_V
    )
    assert allowed is not None  # the case reader refused a limit without
    policy = limit.margin_policy
    return Requirement(
        kind=limit.kind,
        allowed=allowed,
        surfaces=limit.surfaces,
        requirement_id=limit.requirement_id or f"case limit {number + 1}",
        document=limit.source_document or "case file",
        issue="",
        clause=limit.clause or "",
        basis="case",
        margin_factor=1.0 if policy is None else policy.factor,
        margin_basis="none" if policy is None else policy.basis,
        verified=limit.clause_verified,
        note=limit.reason or "",
    )


@dataclass(frozen=True, slots=True)
class Standing:
    """A value against a requirement.

    value carries its sign (normal: <= 0); margin = limit - |value|, negative when
    exceeded; margin_dB None where the value is 0, 20 log10 of the ratio (energy: 10 log10).
    """

    requirement: Requirement
    value: float
    margin: float
    margin_dB: float | None
    exceeded: bool


def standing(requirement: Requirement, value: float) -> Standing:
    """Compare a signed worst value with a requirement.

    For a normal gradient only a negative value, for an inverted one only a positive counts.
    """
    relevant = size_of(requirement.kind, value)
    limit = requirement.limit
    per_decade = 10.0 if requirement.kind == "energy" else 20.0
    return Standing(
        requirement=requirement,
        value=value,
        margin=limit - relevant,
        margin_dB=per_decade * log10(limit / relevant) if relevant > 0.0 else None,
        exceeded=relevant > limit,
    )


def size_of(kind: Kind, value: float) -> float:
    """Magnitude of a signed value that counts against a limit of a kind, >= 0."""
    if kind in ("normal", "neighbour normal"):
        return max(0.0, -value)
    if kind in ("inverted", "neighbour inverted"):
        return max(0.0, value)
    return abs(value)
