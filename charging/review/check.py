"""The differential-charging check: every limit in every mode, plasma and age of a case."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
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
from charging.review.sensitivity import Corner, Ensemble
from charging.summary import worst

FLOOR = 0.01
"""Share of the smallest limit of a quantity below which its changes are not told apart."""


@dataclass(frozen=True, slots=True)
class Options:
    """How a review is run.

    draws : random draws per governing combination; None: as the case says (at least 500).
    fixes : whether fixes are looked for; workers : processes; progress : told how many
    members have been run.
    """

    draws: int | None = None
    fixes: bool = True
    workers: int = 1
    progress: Callable[[int], None] | None = None


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
        if not options.fixes:
            return found[0]
        return _with_fixes(*found, options, runner)


def _review(
    loaded: LoadedCase, options: Options, runner: Runner
) -> tuple[Review, tuple[Corner, ...]]:
    case = loaded.case
    limits = requirements(case)
    pairs = judged(case, limits)
    wanted = list(dict.fromkeys(quantity for _, quantity in pairs))
    shown = list(dict.fromkeys((*wanted, *informative(case))))
    asked = scenes(loaded)
    cells = nominal_cells(loaded, asked, shown)
    places = governing(cells, shown)
    floors = [FLOOR * min(r.limit for r, q in pairs if q == one) for one in wanted]
    ensemble = Ensemble(
        case.review.draws if options.draws is None else options.draws, case.review.seed
    )
    before = runner.members
    found = corners(loaded, cells, places[: len(wanted)], wanted, floors, ensemble, runner)
    nominal = sum(len(cell.variants) for cell in cells)
    by_quantity: dict[Quantity, tuple[Place, Corner]] = {
        one: (place, corner) for one, place, corner in zip(wanted, places, found, strict=False)
    }
    rows = assessed(loaded, cells, [(r, q, *by_quantity[q]) for r, q in pairs])
    review = Review(
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
    return review, found


def overall(rows: Sequence[Row]) -> Verdict:
    """Overall verdict; a case without any limit cannot be assessed."""
    return worst([row.verdict for row in rows]) if rows else "not assessable"


def _with_fixes(
    review: Review, found: tuple[Corner, ...], options: Options, runner: Runner
) -> Review:
    def again(changed: LoadedCase) -> tuple[Verdict, tuple[Row, ...], int]:
        result, _ = _review(changed, options, runner)
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
