"""Fixes for exceeded limits: found by screening, shown only after full reruns.

Screening runs every candidate where the limits of its surface govern. The best of each family
is then run in every mode, plasma, age and law, nominal and at the corners. A fix that pushes
another limit over, or an exceeded one further, is rejected and shown so. What is chosen goes,
all together, through a whole review; only that is called verified.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from charging.case import LoadedCase
from charging.review.assess import Row
from charging.review.blocks import Runner
from charging.review.candidates import FAMILIES, Key, candidates, finer, fits
from charging.review.designs import Change, Design, designed
from charging.review.extremes import Quantity
from charging.review.limits import Verdict, size_of
from charging.review.nominal import Cell
from charging.review.scenes import Scene
from charging.review.space import Variant

Array = NDArray[np.float64]
Status = Literal["solves", "rejected", "not enough", "no solution"]
Again = Callable[[LoadedCase], tuple[Verdict, tuple[Row, ...], int]]

WORSE = 0.05
"""Share of its limit by which an exceeded limit may not get worse."""
MOST_REVIEWS = 2


@dataclass(frozen=True, slots=True)
class Fix:
    """Best of one family for one surface.

    design : changes; status; worst : severity of the surface's own limits with it (above 1:
    exceeded); worsened : other limits that it pushes over or further; tried : candidates.
    """

    surface: str
    family: str
    design: Design
    status: Status
    before: float
    worst: float
    worsened: tuple[str, ...]
    tried: int

    @property
    def text(self) -> str:
        """The changes in words."""
        return "; ".join(change.text for change in self.design) or "none that applies"


@dataclass(frozen=True, slots=True)
class Fixes:
    """All fixes found.

    single : best of each family by surface; chosen : changes that were reviewed together;
    verified : no limit exceeded in a whole review with them; verdict : of that review;
    rows : its rows, None when nothing was chosen; members : runs behind that review.
    """

    single: tuple[Fix, ...]
    chosen: Design
    verified: bool
    verdict: Verdict | None
    rows: tuple[Row, ...] | None
    members: int

    @property
    def text(self) -> str:
        """Answer in one sentence."""
        if not self.single:
            return "No limit is exceeded: no fix is needed."
        if not self.chosen:
            return "No fix found: no candidate keeps the limits of its surface alone."
        names = "; ".join(change.text for change in self.chosen)
        if self.verified:
            return (
                f"Verified by a whole review of the changed design, every mode and plasma rerun "
                f"({self.verdict}): {names}."
            )
        return f"No fix found that keeps all limits; nearest: {names}."

    def first_for(self, surface: str) -> str | None:
        """First fix that solves a surface's limits, in words."""
        for fix in self.single:
            if fix.surface == surface and fix.status == "solves":
                return fix.text
        return None


def find_fixes(
    loaded: LoadedCase,
    cells: Sequence[Cell],
    rows: Sequence[Row],
    runner: Runner,
    again: Again,
) -> Fixes:
    """Look for fixes of every surface with an exceeded limit.

    Parameters
    ----------
    loaded, cells, rows
        Of the review.
    runner : Runner
    again : callable
        Whole review of a changed case.
    """
    bad = [row for row in rows if row.verdict == "exceeded"]
    names = list(dict.fromkeys(name for row in bad for name in _concerned(loaded, row)))
    ladders = {
        (name, family): [c for c in candidates(loaded, name, family) if fits(loaded, (c,))]
        for name in names
        for family in FAMILIES
    }
    ladders = {key: ladder for key, ladder in ladders.items() if ladder}
    screen = _Screen(loaded, cells, rows, runner)
    first = screen.worst(ladders)
    closer = {key: finer(loaded, key, ladders[key], first[key]) for key in ladders}
    second = screen.worst({key: ladder for key, ladder in closer.items() if ladder})
    found = [
        _best(key, screen.before(key[0]), ladders[key], first[key], closer[key], second.get(key))
        for key in ladders
    ]
    found = _rerun(loaded, cells, rows, found, runner)
    return _together(loaded, tuple(found), names, again)


def _concerned(loaded: LoadedCase, row: Row) -> list[str]:
    """Surfaces that a row is about and that have a node to change."""
    surfaces = {s.name: s for s in loaded.case.surface}
    own = [n for n in (row.quantity.surface, row.quantity.against) if n in surfaces]
    return [n for n in own if surfaces[n].floating or surfaces[n].thickness_m is not None]


@dataclass(frozen=True, slots=True)
class _Screen:
    """Runs candidates where the limits of their surface govern, at the corners."""

    loaded: LoadedCase
    cells: Sequence[Cell]
    rows: Sequence[Row]
    runner: Runner

    def own(self, name: str) -> list[Row]:
        """Limits of a surface alone; those of pairs need both, and wait for the whole review."""
        mine = [row for row in self.rows if row.quantity.surface == name]
        alone = [row for row in mine if row.quantity.against not in self.loaded.case.names]
        return [row for row in alone or mine if not row.corner.trivial]

    def before(self, name: str) -> float:
        """Largest severity of a surface's limits as the case stands."""
        return max((row.severity for row in self.own(name)), default=0.0)

    def worst(self, ladders: Mapping[Key, Sequence[Change]]) -> dict[Key, Array]:
        """Largest severity of each candidate over the limits of its surface."""
        asked: dict[Scene, list[Variant]] = {}
        places: dict[Key, list[tuple[Scene, int]]] = {}
        for key, ladder in ladders.items():
            probes = _probes(self.own(key[0]), self.cells)
            places[key] = []
            for scene, variant in probes:
                variants = asked.setdefault(scene, [])
                places[key].append((scene, len(variants)))
                variants += [replace(variant, design=(change,)) for change in ladder]
        wanted = list(dict.fromkeys(row.quantity for row in self.rows))
        solved = dict(
            zip(asked, self.runner.solve(self.loaded, list(asked.items()), wanted), strict=True)
        )
        found = {}
        for key, ladder in ladders.items():
            worst = np.zeros(len(ladder))
            for scene, first in places[key]:
                values = solved[scene].value[first : first + len(ladder)]
                worst = np.maximum(worst, _severity(values, self.own(key[0]), wanted).max(axis=1))
            found[key] = worst
        return found


def _probes(rows: Sequence[Row], cells: Sequence[Cell]) -> list[tuple[Scene, Variant]]:
    """Where rows govern, at their corners."""
    found = [
        (cells[row.corner.scene].scene, replace(row.corner.variant, settings=row.corner.settings))
        for row in rows
        if not row.corner.trivial
    ]
    return list(dict.fromkeys(found))


def _severity(
    values: Array, rows: Sequence[Row], wanted: Sequence[Quantity]
) -> np.ndarray[tuple[int, int], np.dtype[np.float64]]:
    """Value over limit of members [m] and rows [r]; inf without a solution."""
    found = np.zeros((len(values), len(rows)))
    for r, row in enumerate(rows):
        for m, value in enumerate(values[:, wanted.index(row.quantity)]):
            size = size_of(row.quantity.kind, float(value)) / row.requirement.limit
            found[m, r] = np.inf if np.isnan(value) else size
    return found


def _best(
    key: Key,
    before: float,
    ladder: Sequence[Change],
    worst: Array,
    finer: Sequence[Change],
    second: Array | None,
) -> Fix:
    """First candidate of a family that keeps its surface's limits; of coatings, the best."""
    name, family = key
    tried = len(ladder) + len(finer)
    good = np.flatnonzero(worst <= 1.0)
    if not good.size:
        k = int(worst.argmin())
        return Fix(name, family, (ladder[k],), "not enough", before, float(worst[k]), (), tried)
    k = int(good[0]) if family != "alternative coating" else int(good[worst[good].argmin()])
    chosen, size = ladder[k], float(worst[k])
    if second is not None:
        better = np.flatnonzero(second <= 1.0)
        if better.size:
            chosen, size = finer[int(better[0])], float(second[int(better[0])])
    return Fix(name, family, (chosen,), "solves", before, size, (), tried)


def _rerun(
    loaded: LoadedCase,
    cells: Sequence[Cell],
    rows: Sequence[Row],
    fixes: Sequence[Fix],
    runner: Runner,
) -> list[Fix]:
    """Run fixes in every scene, age and law, and at the corners; see what else they move."""
    if not fixes:
        return []
    live = [row for row in rows if not row.corner.trivial]
    everywhere = [(cell.scene, variant) for cell in cells for variant in cell.variants]
    by_scene: dict[Scene, list[Variant]] = {}
    for scene, variant in dict.fromkeys((*everywhere, *_probes(live, cells))):
        by_scene.setdefault(scene, []).append(variant)
    wanted = list(dict.fromkeys(row.quantity for row in live))
    # the case as it stands comes first: a limit may stand worse at the corner of another one
    designs: list[Design] = [(), *(fix.design for fix in fixes)]
    asked = [
        (scene, [replace(v, design=design) for design in designs for v in variants])
        for scene, variants in by_scene.items()
    ]
    worst = np.zeros((len(designs), len(live)))
    for (_, variants), found in zip(asked, runner.solve(loaded, asked, wanted), strict=True):
        of_scene = _severity(found.value, live, wanted)
        each = of_scene.reshape(len(designs), len(variants) // len(designs), len(live))
        worst = np.maximum(worst, each.max(axis=1))
    before = np.maximum(worst[0], [row.severity for row in live])
    return [
        _judged(loaded, live, fix, before, severities)
        for fix, severities in zip(fixes, worst[1:], strict=True)
    ]


def _judged(loaded: LoadedCase, live: Sequence[Row], fix: Fix, before: Array, worst: Array) -> Fix:
    """Status of a fix after its reruns; pairs with another surface are no fault of its own."""
    if not np.isfinite(worst).all():
        return replace(fix, status="no solution", worst=float("inf"))
    names = loaded.case.names
    own = [
        i
        for i, row in enumerate(live)
        if row.quantity.surface == fix.surface and row.quantity.against not in names
    ]
    size = max((float(worst[i]) for i in own), default=0.0)
    worsened = [
        named(row.quantity, row.requirement.requirement_id)
        for i, row in enumerate(live)
        if i not in own and worst[i] > 1.0 and (before[i] <= 1.0 or worst[i] > before[i] + WORSE)
    ]
    status: Status = "solves" if size <= 1.0 else "not enough"
    if worsened:
        status = "rejected"
    return replace(fix, worst=size, worsened=tuple(dict.fromkeys(worsened)), status=status)


def named(quantity: Quantity, requirement_id: str) -> str:
    """Name a row for people."""
    what = quantity.surface or "structure"
    return f"{what} against {quantity.against}, {quantity.kind} ({requirement_id})"


def _together(
    loaded: LoadedCase, found: tuple[Fix, ...], names: Sequence[str], again: Again
) -> Fixes:
    """Review what solves each surface together; change to other families where that fails."""
    options = {
        name: [fix for fix in found if fix.surface == name and fix.status == "solves"]
        for name in names
    }
    # alone a fix may push a neighbour over that its own fix keeps: rejected alone, tried together
    for name in names:
        options[name] += [
            f for f in found if f.surface == name and f.status == "rejected" and f.worst <= 1.0
        ]
    options = {name: fixes for name, fixes in options.items() if fixes}
    if not options:
        return Fixes(found, (), False, None, None, 0)
    pick = dict.fromkeys(options, 0)
    best: Fixes | None = None
    members = 0
    for _ in range(MOST_REVIEWS):
        design = tuple(c for name in options for c in options[name][pick[name]].design)
        verdict, rows, count = again(designed(loaded, design))
        members += count
        bad = [row for row in rows if row.verdict == "exceeded"]
        result = Fixes(found, design, not bad, verdict, rows, members)
        if best is None or len(bad) < _exceeded(best):
            best = result
        if not bad:
            return result
        moved = False
        for name in {n for row in bad for n in (row.quantity.surface, row.quantity.against)}:
            if name in options and pick[name] + 1 < len(options[name]):
                pick[name] += 1
                moved = True
        if not moved:
            break
    assert best is not None
    return best


def _exceeded(fixes: Fixes) -> int:
    return sum(row.verdict == "exceeded" for row in fixes.rows or ())
