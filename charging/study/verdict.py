"""What a finished sweep says about its choices, and what it does not say.

The share of draws beyond a limit is one statement, the verdict another. A draw beyond a limit
shows that the corner of the spreads is beyond it, so the limit is exceeded, however rare such
draws are, unless the case accepts a statistical pass. Where no draw is beyond, the corner was
still not run: a sweep alone says "within" only where the case accepts that too.
"""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from charging.case import LoadedCase
from charging.errors import InputError
from charging.review.assess import LEAST_DRAWS, MOST_FAILED, qualifications
from charging.review.extremes import judged
from charging.review.limits import Verdict, requirements
from charging.review.space import properties
from charging.schedule import plasma_names
from charging.study.intervals import Probability
from charging.study.plan import Plan
from charging.study.ranking import ChoiceRow
from charging.study.store import BLOCKS, MANIFEST, Store

RANKING = "ranking.json"


@dataclass(frozen=True, slots=True)
class ChoiceVerdict:
    """Verdict on one choice.

    Attributes
    ----------
    verdict : Verdict
    reason : str
    probabilistic : str
        Whether the limits are kept with the study's confidence: "yes", "no" or "open".
    qualifications : tuple of str
        What goes with it.
    """

    verdict: Verdict
    reason: str
    probabilistic: str
    qualifications: tuple[str, ...]


def choice_verdict(plan: Plan, row: ChoiceRow, draws: int) -> ChoiceVerdict:
    """Judge a choice by its draws.

    Parameters
    ----------
    plan : Plan
    row : ChoiceRow
    draws : int
        Of the choice, those without solution included.
    """
    loaded = plan.choices[row.number].loaded
    statistical = loaded.case.review.statistical
    probabilistic = kept_with_confidence(row.exceed, plan.file.confidence)
    reasons = _reasons(plan, loaded, row, draws)
    beyond = [one for one in row.limits if one.beyond]
    if beyond and (statistical is None or probabilistic != "yes"):
        most = max(beyond, key=lambda one: one.beyond)
        verdict: Verdict = "exceeded"
        reason = (
            f"{most.beyond} of {draws} draws are beyond {most.requirement_id} ({most.limit}), so "
            "the corner of the spreads is"
        )
    elif reasons:
        verdict, reason = "not assessable", "; ".join(reasons)
    elif _bonded(row):
        verdict, reason = "within", "zero by construction: bonded"
    elif statistical is None:
        verdict = "not assessable"
        reason = (
            f"none of {draws} draws is beyond a limit, but the corner of the spreads was not run: "
            "review the case with this choice"
        )
    elif probabilistic != "yes":
        verdict, reason = "not assessable", "the interval is too wide: more draws are needed"
    else:
        verdict = "within"
        reason = (
            f"the probability of exceeding a limit is at most {row.exceed.high:.2g}, and the case "
            f"accepts a statistical pass: {statistical}"
        )
    with_it = qualifications(loaded)
    if plan.file.surfaces is not None:
        with_it = (f"only limits of {', '.join(plan.file.surfaces)} were judged", *with_it)
    return ChoiceVerdict(verdict, reason, probabilistic, with_it)


def _bonded(row: ChoiceRow) -> bool:
    """Whether nothing that a limit speaks of can differ: every surface is bonded."""
    return bool(row.limits) and all(one.worst == 0.0 for one in row.limits) and not row.failed


def kept_with_confidence(exceed: Probability, confidence: float) -> str:
    """Whether limits are kept with a confidence: "yes", "no", or "open" where draws are too few.

    Examples
    --------
    >>> kept_with_confidence(Probability(0.0, 0.0, 0.02), 0.95)
    'yes'
    >>> kept_with_confidence(Probability(0.04, 0.01, 0.07), 0.95)
    'open'
    """
    allowed = 1.0 - confidence
    if exceed.high <= allowed:
        return "yes"
    return "no" if exceed.low > allowed else "open"


def _reasons(plan: Plan, loaded: LoadedCase, row: ChoiceRow, draws: int) -> list[str]:
    """Why a choice that exceeds nothing cannot be called within."""
    case = loaded.case
    found = []
    concerned = [
        (requirement, quantity)
        for requirement, quantity in judged(case, requirements(case))
        if plan.file.surfaces is None
        or {quantity.surface, quantity.against} & set(plan.file.surfaces)
    ]
    if not concerned:
        found.append("no limit concerns the surfaces of the study")
    unread = dict.fromkeys(r.requirement_id for r, _ in concerned if not r.verified)
    found += [f"the clause behind {name} was not read" for name in unread]
    if case.plasma.accept_assumed is None:
        assumed = [n for n in _plasmas(loaded) if loaded.plasmas[n].basis == "assumed"]
        if assumed:
            found.append(
                f'plasma "{assumed[0]}" rests on assumed figures; accept it with [plasma] '
                'accept_assumed = "reason"'
            )
    if _bonded(row):
        return found  # neither draws nor properties matter
    own = {name for _, quantity in concerned for name in (quantity.surface, quantity.against)}
    nameless = [
        f"{p.key} of {p.material}"
        for p in properties(loaded, plan.file.age)
        if not p.source.strip() and own & set(p.surfaces)
    ]
    if nameless:
        found.append(f"no source for {', '.join(nameless[:4])}")
    ages = [age for age in case.review.ages if age != plan.file.age]
    if ages:
        found.append(f"the {ages[0]} of life was not run")
    if case.review.plasmas:
        found.append(f'plasma "{case.review.plasmas[0]}" of [review] was not run')
    if draws < LEAST_DRAWS:
        found.append(f"{draws} draws are fewer than {LEAST_DRAWS}")
    if row.failed > MOST_FAILED * draws:
        found.append(f"{row.failed} of {draws} draws found no solution")
    return found


def _plasmas(loaded: LoadedCase) -> list[str]:
    modes = (None, *loaded.case.alternatives)
    names = [name for mode in modes for name in plasma_names(loaded.case, mode)]
    return [name for name in dict.fromkeys(names) if name in loaded.plasmas]


def is_sweep(folder: Path) -> bool:
    """Whether a folder holds a sweep, finished or not."""
    return (folder / MANIFEST).is_file() and (folder / BLOCKS).is_dir()


def sweep_review(folder: Path) -> dict[str, Any]:
    """The ranking of a finished sweep with its verdicts, checked against its blocks.

    Raises
    ------
    InputError
        The sweep is not finished, a block is damaged, or the ranking is not that of the blocks.
    """
    manifest = _json(folder / MANIFEST)
    there = Store(folder, manifest).finished()
    if len(there) != len(manifest.get("blocks", ())):
        raise InputError(
            f"the sweep in {folder} is not finished: {len(there)} of "
            f"{len(manifest.get('blocks', ()))} blocks are there",
            next_step="Go on with halflit sweep STUDY --resume.",
        )
    if not (folder / RANKING).is_file():
        raise InputError(
            f"the sweep in {folder} has no {RANKING}",
            next_step="Make it with halflit sweep STUDY --resume.",
        )
    document = _json(folder / RANKING)
    if document.get("blocks_sha256") != block_hashes(there):
        raise InputError(
            f"{folder / RANKING} does not belong to the blocks beside it",
            next_step="Make it again with halflit sweep STUDY --resume.",
        )
    return dict(document)


def block_hashes(there: Mapping[int, Path]) -> list[str]:
    """Hashes of blocks in their order, as their names hold them."""
    return [there[number].stem.partition("-")[2] for number in sorted(there)]


def overall_verdict(rows: Sequence[Mapping[str, Any]]) -> Verdict:
    """Verdict on the first choice of a ranking: whether the study found one that will do."""
    found: Verdict = rows[0]["verdict"] if rows else "not assessable"
    return found


def _json(path: Path) -> Mapping[str, Any]:
    try:
        found = json.loads(path.read_text(encoding="utf-8"))
    except (OSError, ValueError):
        raise InputError(f"{path} cannot be read as JSON of a sweep") from None
    if not isinstance(found, dict):
        raise InputError(f"{path} cannot be read as JSON of a sweep")
    return found
