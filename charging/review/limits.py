"""Design limits as data, and how a predicted value stands against them."""

from dataclasses import dataclass, replace
from math import log10
from typing import Literal

from charging.case import Case, Limit

Kind = Literal["normal", "inverted", "field"]
Verdict = Literal["within", "exceeded", "not assessable"]

KIND_MEANING: dict[Kind, str] = {
    "normal": "surface below structure",
    "inverted": "surface above structure",
    "field": "field in the dielectric",
}
UNITS: dict[Kind, str] = {"normal": "V", "inverted": "V", "field": "V m-1"}


@dataclass(frozen=True, slots=True)
class Requirement:
    """One limit with its origin.

    Attributes
    ----------
    kind : Kind
    allowed : float
        Magnitude [V] or [V m-1] before the margin policy.
    surfaces : tuple of str or None
        None: every surface.
    requirement_id, document, issue, clause, basis : str
        basis: "standard" (text seen), "case" (given by the case file).
    margin_factor : float
        The value must stay below allowed / margin_factor.
    margin_basis : str
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

    @property
    def limit(self) -> float:
        """Magnitude that the value must not exceed."""
        return self.allowed / self.margin_factor

    def covers(self, surface: str) -> bool:
        """Whether the requirement applies to a surface."""
        return self.surfaces is None or surface in self.surfaces


def _ecss(kind: Kind, allowed: float, clause: str) -> Requirement:
    return Requirement(
        kind=kind,
        allowed=allowed,
        surfaces=None,
        requirement_id=f"ECSS-E-ST-20-06C {clause}",
        document="ECSS-E-ST-20-06C",
        issue="31 July 2008",  # Rev.1 of 15 May 2019 replaces it; its text was not seen
        clause=clause,
        basis="standard",
    )


DEFAULTS = (
    _ecss("normal", 1000.0, "6.2.1 a.1"),
    _ecss("field", 1e7, "6.2.1 a.2"),
    _ecss("inverted", 100.0, "6.2.1 a.3"),
)
"""ECSS-E-ST-20-06C (31 July 2008), clause 6.2.1 a: the limits without a case's own."""


def requirements(case: Case) -> tuple[Requirement, ...]:
    """Limits of a case: a ``[[limit]]`` replaces the default of its kind and scope, else adds.

    A limit for all surfaces replaces the default of its kind; one for named surfaces
    replaces it for these surfaces only.
    """
    own = [_own(limit, i) for i, limit in enumerate(case.limit)]
    found = []
    for default in DEFAULTS:
        same = [r for r in own if r.kind == default.kind]
        if any(r.surfaces is None for r in same):
            continue
        taken = {name for r in same for name in r.surfaces or ()}
        rest = tuple(name for name in case.names if name not in taken)
        if not taken:
            found.append(default)
        elif rest:
            found.append(replace(default, surfaces=rest))
    return (*found, *own)


def _own(limit: Limit, number: int) -> Requirement:
    allowed = limit.allowed_V_m if limit.kind == "field" else limit.allowed_V
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
    )


@dataclass(frozen=True, slots=True)
class Standing:
    """A value against a requirement.

    value carries its sign (normal: <= 0); margin = limit - |value|, negative when
    exceeded; margin_dB None where the value is 0.
    """

    requirement: Requirement
    value: float
    margin: float
    margin_dB: float | None
    exceeded: bool


def standing(requirement: Requirement, value: float) -> Standing:
    """Compare a signed worst value with a requirement.

    For "normal" only a negative value, for "inverted" only a positive one counts.
    """
    relevant = {
        "normal": max(0.0, -value),
        "inverted": max(0.0, value),
        "field": abs(value),
    }[requirement.kind]
    limit = requirement.limit
    return Standing(
        requirement=requirement,
        value=value,
        margin=limit - relevant,
        margin_dB=20.0 * log10(limit / relevant) if relevant > 0.0 else None,
        exceeded=relevant > limit,
    )
