"""The content of ranking.json."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from charging.review.claims import CAUTIONS
from charging.study.draws import value_in
from charging.study.indices import Index
from charging.study.plan import Plan
from charging.study.ranking import ChoiceRow
from charging.study.verdict import choice_verdict
from charging.study.worst_case import WorstPlace


def ranking_document(
    plan: Plan,
    rows: Sequence[ChoiceRow],
    studied: ChoiceRow,
    indices: Sequence[Index],
    worst: WorstPlace | None,
    blocks_sha256: Sequence[str],
) -> dict[str, Any]:
    """The content of ranking.json; `blocks_sha256` says which blocks it was made from."""
    return {
        "title": plan.file.title,
        "members": plan.members,
        "failed": sum(row.failed for row in rows),
        "seed": plan.file.seed,
        "draws": plan.draws,
        "replicates": min(plan.file.replicates, plan.draws),
        "confidence": plan.file.confidence,
        "conditional_on": conditions(plan),
        "basis_of_screening": "rank correlation of drawn values with the largest |value|/limit",
        "rows": [_row(plan, row) for row in rows],
        "studied_choice": studied.choice,
        "sobol_indices": [
            {
                "factor": one.factor,
                "first": one.first,
                "first_half_width": one.first_half_width,
                "total": one.total,
                "total_half_width": one.total_half_width,
            }
            for one in indices
        ],
        "worst_case": None if worst is None else worst_document(plan, worst),
        "cautions": list(CAUTIONS),
        "blocks_sha256": list(blocks_sha256),
    }


def conditions(plan: Plan) -> str:
    """What the probabilities are conditional on."""
    if plan.file.draw != "spreads" and not plan.ranges:
        return "no draws: each choice was computed once"
    spreads = "spreads of the material records" if plan.file.draw == "spreads" else ""
    ranges = "ranges of the study file" if plan.ranges else ""
    return "conditional on assumed spreads: " + " and ".join(filter(None, (spreads, ranges)))


def worst_document(plan: Plan, worst: WorstPlace) -> dict[str, Any]:
    """The worst case found, as JSON."""
    found = worst.search
    return {
        "severity": found.value,
        "limit": worst.limit,
        "value": worst.value_there,
        "allowed": worst.allowed if np.isfinite(worst.allowed) else None,
        "at": {
            one.target.text: value_in(one, float(x))
            for one, x in zip(plan.searched, found.place, strict=True)
        },
        "evaluations": found.evaluations,
        "starts": found.starts,
        "agreeing_starts": found.agreeing,
        "converged": found.converged,
    }


def _row(plan: Plan, row: ChoiceRow) -> dict[str, Any]:
    judged = choice_verdict(plan, row, plan.draws)
    return {
        "choice": row.choice,
        "worst_V": row.worst_V,
        "kind": row.kind,
        "surface": row.surface,
        "exceed_probability": row.exceed.value,
        "interval": [row.exceed.low, row.exceed.high],
        "verdict": judged.verdict,
        "reason": judged.reason,
        "kept_with_confidence": judged.probabilistic,
        "qualifications": list(judged.qualifications),
        "failed": row.failed,
        "driver": row.driver,
        "drivers": [{"factor": n, "rank_correlation": c} for n, c in row.drivers[:8]],
        "limits": [
            {
                "limit": one.limit,
                "requirement_id": one.requirement_id,
                "surface": one.surface,
                "kind": one.kind,
                "worst": None if np.isnan(one.worst) else one.worst,
                "median": None if np.isnan(one.middle) else one.middle,
                "allowed": one.allowed,
                "exceed_probability": one.exceed.value,
                "interval": [one.exceed.low, one.exceed.high],
                "draws_beyond": one.beyond,
            }
            for one in row.limits
        ],
    }
