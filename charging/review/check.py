"""The differential-charging check: every limit in every mode, plasma and age of a case."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from time import perf_counter
from typing import Any

from charging.case import LoadedCase, load_case, load_case_text
from charging.errors import InputError
from charging.review.assess import Row, assessed, qualifications
from charging.review.blocks import Runner
from charging.review.corner import corners
from charging.review.extremes import Quantity, informative, judged
from charging.review.fixes import Fixes, find_fixes
from charging.review.limits import Requirement, Verdict, requirements
from charging.review.nominal import Cell, Place, governing, nominal_cells
from charging.review.scenes import Scene, scenes
from charging.review.sensitivity import Corner, Ensemble, unsearched
from charging.review.space import properties, varied
from charging.summary import worst

FLOOR = 0.01
"""Share of the smallest limit of a quantity below which its changes are not told apart."""


@dataclass(frozen=True, slots=True)
class Options:
    """How a review is run.

    draws : random draws per governing combination; None: as the case says (at least 500).
    fixes : whether fixes are looked for; workers : processes; progress : told how many
    members have been run, of how many as far as known; notes : told what takes long.
    corners : whether spreads of properties are run; None: yes, unless the plasma changes along
    the orbit, where a single run takes seconds and a search hours.
    """

    draws: int | None = None
    fixes: bool = True
    workers: int = 1
    progress: Callable[[int, int], None] | None = None
    notes: Callable[[str], None] | None = None
    corners: bool | None = None


@dataclass(frozen=True, slots=True)
class Review:
    """Verdict of a case and everything behind it.

    Attributes
    ----------
    loaded : LoadedCase
    limits : tuple of Requirement
    scenes : tuple of Scene
    cells : tuple of Cell
        Nominal runs, one per scene.
    shown : tuple of Quantity
        Quantities of the nominal runs, whether a limit speaks of them or not.
    rows : tuple of Row
        The worst first.
    verdict : Verdict
    qualifications : tuple of str
        What goes with the verdict.
    fixes : Fixes or None
        None when none was looked for.
    options, ensemble
        As run.
    members : int
        Runs along the whole timeline behind the verdict.
    """

    loaded: LoadedCase
    limits: tuple[Requirement, ...]
    scenes: tuple[Scene, ...]
    cells: tuple[Cell, ...]
    shown: tuple[Quantity, ...]
    rows: tuple[Row, ...]
    verdict: Verdict
    qualifications: tuple[str, ...]
    fixes: Fixes | None
    options: Options
    ensemble: Ensemble
    members: int

    @property
    def searched(self) -> bool:
        """Whether corners of the spreads were looked for."""
        return all(row.corner.searched for row in self.rows)


def review_case(loaded: LoadedCase, options: Options | None = None) -> Review:
    """Run and judge every mode, plasma and age of a case.

    Parameters
    ----------
    loaded : LoadedCase
    options : Options, optional

    Returns
    -------
    Review

    Raises
    ------
    NoSolutionError
        The march found no step in a nominal run.
    """
    options = options or Options()
    with Runner(options.workers, options.progress) as runner:
        found = _review(loaded, options, runner)
        if not options.fixes or not found.searched:
            return found
        return _with_fixes(found, options, runner)


def _review(loaded: LoadedCase, options: Options, runner: Runner, *, trial: bool = False) -> Review:
    """Review a case; as a trial of a design it ends where a first corner exceeds a limit."""
    case = loaded.case
    limits = requirements(case)
    pairs = judged(case, limits)
    wanted = list(dict.fromkeys(quantity for _, quantity in pairs))
    shown = list(dict.fromkeys((*wanted, *informative(case))))
    asked = scenes(loaded)
    started = perf_counter()
    cells = nominal_cells(loaded, asked, shown, runner)
    nominal = sum(len(cell.variants) for cell in cells)
    each_s = (perf_counter() - started) / nominal
    places = governing(cells, shown)
    floors = [FLOOR * min(r.limit for r, q in pairs if q == one) for one in wanted]
    ensemble = Ensemble(
        case.review.draws if options.draws is None else options.draws, case.review.seed
    )
    before = runner.members
    along = loaded.case.plasma.changes
    found: tuple[Corner, ...]
    if options.corners is False or (options.corners is None and along):
        found = unsearched(loaded, cells, places[: len(wanted)], wanted)
    else:
        if along and options.notes is not None:
            fewest = ensemble.draws + 2 * len(varied(properties(loaded, "end")))
            options.notes(
                f"the plasma changes along the orbit, so every run takes as long as a single one: "
                f"at least {fewest} runs of about {each_s:.1f} s, "
                f"{fewest * each_s / 60.0 / runner.workers:.0f} min on {runner.workers} processes; "
                "--no-corners leaves them out"
            )
        least = [floor / FLOOR for floor in floors] if trial else None
        of_limits = places[: len(wanted)]
        found = corners(loaded, cells, of_limits, wanted, floors, ensemble, runner, least)
    by_quantity: dict[Quantity, tuple[Place, Corner]] = {
        one: (place, corner) for one, place, corner in zip(wanted, places, found, strict=False)
    }
    rows = assessed(loaded, cells, [(r, q, *by_quantity[q]) for r, q in pairs])
    return Review(
        loaded=loaded,
        limits=limits,
        scenes=asked,
        cells=cells,
        shown=tuple(shown),
        rows=rows,
        verdict=overall(rows),
        qualifications=qualifications(loaded),
        fixes=None,
        options=options,
        ensemble=ensemble,
        members=runner.members - before + nominal,
    )


def overall(rows: Sequence[Row]) -> Verdict:
    """Overall verdict; a case without any limit cannot be assessed."""
    return worst([row.verdict for row in rows]) if rows else "not assessable"


def _with_fixes(review: Review, options: Options, runner: Runner) -> Review:
    def again(changed: LoadedCase) -> tuple[Verdict, tuple[Row, ...], int]:
        result = _review(changed, options, runner, trial=True)
        return result.verdict, result.rows, result.members

    fixes = find_fixes(review.loaded, review.cells, review.rows, runner, again)
    return replace(review, fixes=fixes)


def load_case_or_result(path: Path, *, allow_outside: bool = False) -> LoadedCase:
    """Load a case file, or the case kept inside a result file, a review.json or their folder.

    Raises
    ------
    InputError
        Nothing of that kind, or one that cannot be used.
    """
    if path.is_dir():
        for name in ("result.nc", "review.json"):
            if (path / name).is_file():
                path = path / name
                break
    if path.suffix == ".json":
        return _kept(path, *_from_review(path))
    if path.suffix != ".nc":
        return load_case(path, allow_outside=allow_outside)
    from charging.dataset import read_result

    attributes = read_result(path).attrs
    return _kept(path, attributes, {k: json.loads(attributes.get(k, "{}")) for k in KEPT_TEXTS})


KEPT_TEXTS = ("material_texts", "plasma_texts", "file_texts", "file_sha256")


def _from_review(path: Path) -> tuple[Mapping[str, Any], Mapping[str, Any]]:
    try:
        document = json.loads(path.read_text(encoding="utf-8"))
        kept = document["inputs"]
        texts = {key: dict(kept[key]) for key in KEPT_TEXTS}
    except (OSError, ValueError, KeyError, TypeError) as error:
        raise InputError("is no review.json of halflit with its inputs", file=str(path)) from error
    return kept, texts


def _kept(path: Path, head: Mapping[str, Any], texts: Mapping[str, Any]) -> LoadedCase:
    if not isinstance(head.get("case_text"), str):
        raise InputError("no attribute case_text, so this is no result", file=str(path))
    return load_case_text(head["case_text"], file=f"{path}: case_text", **texts)
