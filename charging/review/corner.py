"""Sensitivities, the deterministic corner of every quantity, and the draws that check it.

The corner takes every property to the end of its spread that makes the quantity worse when it
alone is moved. Random draws over all spreads then try to beat it; where one does by more than
5 %, the corner is extended until none does.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from charging.case import LoadedCase
from charging.review.blocks import Runner
from charging.review.extremes import Extremes, Quantity, bonded
from charging.review.limits import size_of
from charging.review.nominal import Cell, Place
from charging.review.sensitivity import (
    Corner,
    Draws,
    Ensemble,
    Sensitivity,
    sensitivities_of,
)
from charging.review.space import (
    HIGH,
    LOW,
    Key,
    Settings,
    Variant,
    draw,
    properties,
    varied,
)

Array = NDArray[np.float64]
Combo = tuple[int, Variant]
"""Cell and variant without settings."""

BEATEN = 0.05
"""Share by which a draw may exceed the corner before the corner is extended."""

NEGLIGIBLE = 0.01
"""Changes below this share of the limit are not told apart from none."""

NEAR = 0.05
"""A quantity may be searched where its nominal value is this share short of its worst, so that
few combinations serve all quantities; its corner is run where it is worst as well."""

MOST_ROUNDS = 3
TRIED_AGAIN = 12
"""Properties, the most effective first, that an extension turns around once more."""


def corners(
    loaded: LoadedCase,
    cells: Sequence[Cell],
    places: Sequence[Place],
    wanted: Sequence[Quantity],
    floors: Sequence[float],
    options: Ensemble,
    runner: Runner,
    enough: Sequence[float] | None = None,
) -> tuple[Corner, ...]:
    """Find and check the corner of every quantity.

    Parameters
    ----------
    loaded : LoadedCase
    cells : sequence of Cell
    places : sequence of Place
        Nominal worst place of each quantity.
    wanted : sequence of Quantity
    floors : sequence of float
        Changes of each quantity below which nothing is told apart.
    options : Ensemble
    runner : Runner
    enough : sequence of float, optional
        Sizes; where the first corner of any quantity is beyond, nothing is drawn.
    """
    search = _Search(loaded, cells, places, wanted, floors, options, runner)
    search.sensitivities()
    search.first_corners()
    if enough is not None and search.beyond(enough):
        return search.found()
    search.draws()
    for _ in range(MOST_ROUNDS):
        if not search.extend():
            break
    return search.found()


def serving(sizes: Array) -> list[int]:
    """Few combinations that serve all quantities: the one of each, from sizes [C, Q].

    Examples
    --------
    >>> serving(np.array([[1.0, 0.98, 0.1], [0.5, 1.0, 0.2], [0.0, 0.0, 0.3]]))
    [0, 0, 2]
    """
    near = sizes >= (1.0 - NEAR) * sizes.max(axis=0)
    left = np.ones(sizes.shape[1], dtype=np.bool_)
    chosen: list[int] = []
    while left.any():
        chosen.append(int((near & left).sum(axis=1).argmax()))
        left &= ~near[chosen[-1]]
    return [max(chosen, key=lambda c: float(sizes[c, q])) for q in range(sizes.shape[1])]


class _Search:
    def __init__(
        self,
        loaded: LoadedCase,
        cells: Sequence[Cell],
        places: Sequence[Place],
        wanted: Sequence[Quantity],
        floors: Sequence[float],
        options: Ensemble,
        runner: Runner,
    ) -> None:
        self.loaded, self.cells, self.places = loaded, cells, places
        self.wanted, self.floors, self.options, self.runner = wanted, floors, options, runner
        self.live = [q for q, one in enumerate(wanted) if not bonded(loaded.case, one)]
        # a quantity that is nowhere above its floor governs nothing; others' draws watch it
        heard = [q for q in self.live if self._size(q, places[q].value) > floors[q]]
        self.homes = self._homes(heard or self.live[:1])
        combos: dict[Combo, list[int]] = {}
        for q, home in self.homes.items():
            combos.setdefault(home, []).append(q)
        self.combos = combos
        runner.expect(
            sum(
                1 + options.draws + 2 * len(varied(properties(loaded, variant.age)))
                for _, variant in combos
            )
        )
        self.effects: dict[int, tuple[Sensitivity, ...]] = {}
        self.settings: dict[int, Settings] = dict.fromkeys(self.live, ())
        self.value = {q: places[q].value for q in self.live}
        self.at = {q: (places[q].cell, self._combo(q)[1], places[q].time_s) for q in self.live}
        self.by_cell: dict[int, Array] = {}
        self.first: dict[int, float] = {}
        self.drawn: list[tuple[int, Variant, list[Settings], Extremes]] = []
        self.extended: set[int] = set()

    def _homes(self, heard: Sequence[int]) -> dict[int, Combo]:
        """Combination to search each quantity in: few that come near the worst of all."""
        size = {
            (c, variant): np.array([self._size(q, float(cell.worst.value[v, q])) for q in heard])
            for c, cell in enumerate(self.cells)
            for v, variant in enumerate(cell.variants)
        }
        combos = list(size)
        homes = serving(np.array([size[combo] for combo in combos]))
        return {q: combos[home] for q, home in zip(heard, homes, strict=True)}

    def _combo(self, q: int) -> Combo:
        """Where a quantity is worst at the values of the records."""
        place = self.places[q]
        return place.cell, self.cells[place.cell].variants[place.variant]

    def _size(self, q: int, value: float) -> float:
        return size_of(self.wanted[q].kind, value)

    def sensitivities(self) -> None:
        """Move every property alone to both ends of its spread, in each governing combination."""
        asked = []
        for cell, variant in self.combos:
            space = varied(properties(self.loaded, variant.age))
            variants = [variant]
            for one in space:
                variants += [replace(variant, settings=((one.name, end),)) for end in (LOW, HIGH)]
            asked.append((self.cells[cell].scene, variants))
        solved = self.runner.solve(self.loaded, asked, self.wanted)
        for ((_, variant), rows), found in zip(self.combos.items(), solved, strict=True):
            space = varied(properties(self.loaded, variant.age))
            for q in rows:
                nominal = float(found.value[0, q])
                self.effects[q] = sensitivities_of(
                    space, nominal, found.value[1:, q], self.wanted[q], self.floors[q]
                )
                self.settings[q] = self._pushed(q)

    def _pushed(self, q: int) -> Settings:
        """Every property at the end that alone makes the quantity worse."""
        ends: dict[Key, float] = {}
        for effect in self.effects[q]:
            low, high, now = (self._size(q, v) for v in (effect.low, effect.high, effect.nominal))
            if max(low, high) > now:
                ends[effect.of.name] = HIGH if high >= low else LOW
        return tuple(sorted(ends.items()))

    def first_corners(self) -> None:
        """Run the corner of every quantity in every scene at every age."""
        self._run_corners(self.live)
        self.first = dict(self.value)

    def beyond(self, enough: Sequence[float]) -> bool:
        """Whether the size of any quantity at its corner is more than enough."""
        return any(self._size(q, self.value[q]) > enough[q] for q in self.live)

    def _run_corners(self, rows: Sequence[int]) -> None:
        """Run settings of rows in every scene and age with the law and collection that govern."""
        ages = self.loaded.case.review.ages
        plans = {q: self._plan(q) for q in rows}
        variants = list(dict.fromkeys(variant for plan in plans.values() for variant in plan))
        asked = []
        for cell in self.cells:
            collections = {v.collection for v in cell.variants}
            asked.append((cell.scene, [v for v in variants if v.collection in collections]))
        solved = self.runner.solve(self.loaded, asked, self.wanted)
        for q in rows:
            table = self.by_cell.get(q, np.zeros((len(self.cells), len(ages))))
            for c, ((_, run), found) in enumerate(zip(asked, solved, strict=True)):
                for variant in plans[q]:
                    if variant not in run:
                        continue
                    row, a = run.index(variant), ages.index(variant.age)
                    value = float(found.value[row, q])
                    if self._size(q, value) >= self._size(q, float(table[c, a])):
                        table[c, a] = value
                    if self._size(q, value) > self._size(q, self.value[q]):
                        self.value[q] = value
                        self.at[q] = (c, variant, float(found.time_s[row, q]))
            self.by_cell[q] = table

    def _plan(self, q: int) -> list[Variant]:
        """Corner of a quantity at every age, as searched and where it is worst without it."""
        at = dict.fromkeys(
            (v.law, v.collection)
            for v in (self.at[q][1], self._combo(q)[1], self.homes.get(q, self._combo(q))[1])
        )
        return [
            Variant(age, law, collection, self.settings[q])
            for law, collection in at
            for age in self.loaded.case.review.ages
        ]

    def draws(self) -> None:
        """Solve the same random draws in every governing combination."""
        asked, settings = [], []
        for cell, variant in self.combos:
            space = properties(self.loaded, variant.age)
            drawn = draw(varied(space), self.options.draws, self.options.seed)
            settings.append(drawn)
            asked.append(
                (self.cells[cell].scene, [replace(variant, settings=one) for one in drawn])
            )
        solved = self.runner.solve(self.loaded, asked, self.wanted)
        self.drawn = [
            (cell, variant, drawn, found)
            for (cell, variant), drawn, found in zip(self.combos, settings, solved, strict=True)
        ]

    def _worst_draw(self, q: int) -> tuple[float, int, int]:
        """Largest size of a quantity among the draws: size, combination, number."""
        best = (0.0, 0, 0)
        for k, (_, _, _, found) in enumerate(self.drawn):
            sizes = np.array([self._size(q, v) for v in found.value[:, q]])
            sizes = np.where(np.isfinite(sizes), sizes, 0.0)
            if sizes.size and sizes.max() > best[0]:
                best = (float(sizes.max()), k, int(sizes.argmax()))
        return best

    def _own_draws(self, q: int, worst: int) -> Array:
        """Values of a quantity in the combination that it is searched in, else where worst."""
        if not self.drawn:
            return np.zeros(0)
        k = list(self.combos).index(self.homes[q]) if q in self.homes else worst
        values = self.drawn[k][3].value[:, q]
        return np.asarray(values[np.isfinite(values)])

    def extend(self) -> bool:
        """Extend the corners that a draw beats; True when one was."""
        beaten = []
        for q in self.live:
            size, k, number = self._worst_draw(q)
            now = self._size(q, self.value[q])
            if size > (1.0 + BEATEN) * now and size > now + self.floors[q]:
                beaten.append((q, k, number))
        if not beaten:
            return False
        self.extended |= {q for q, _, _ in beaten}
        plans = [self._turned(*one) for one in beaten]
        sizes = self._sizes(beaten, [tried for _, tried in plans])
        again = []
        for (names, tried), found in zip(plans, sizes, strict=True):
            # every single turn that helped, together
            best = dict(tried[int(found[:2].argmax())])
            for i, name in enumerate(names):
                low, high = found[2 + 2 * i], found[3 + 2 * i]
                if max(low, high) > found[0]:
                    best[name] = HIGH if high >= low else LOW
            again.append([best, tried[int(found.argmax())]])
        for (q, k, _), candidates, found in zip(
            beaten, again, self._sizes(beaten, again), strict=True
        ):
            self.settings[q] = tuple(sorted(candidates[int(found.argmax())].items()))
            self.at[q] = (*self.drawn[k][:2], self.at[q][2])
        self._run_corners([q for q, _, _ in beaten])
        return True

    def _turned(self, q: int, k: int, number: int) -> tuple[list[Key], list[dict[Key, float]]]:
        """Properties to turn around a draw, and settings: the draw, pushed, each turned."""
        start = dict(self.drawn[k][2][number])
        if q in self.effects:
            names = [e.of.name for e in self.effects[q][:TRIED_AGAIN]]
            pushed = {**start, **dict(self._pushed(q))}
        else:  # nothing moved the quantity from its nominal place: look around the draw
            names, pushed = list(start), start
        tried = [start, pushed]
        for name in names:
            tried += [{**start, name: LOW}, {**start, name: HIGH}]
        return names, tried

    def _sizes(
        self,
        beaten: Sequence[tuple[int, int, int]],
        tried: Sequence[Sequence[dict[Key, float]]],
    ) -> list[Array]:
        """Sizes of each beaten quantity with the settings tried, all in one go."""
        asked: dict[int, list[Variant]] = {}
        first = []
        for (_, k, _), settings in zip(beaten, tried, strict=True):
            variants = asked.setdefault(k, [])
            first.append(len(variants))
            variants += [
                replace(self.drawn[k][1], settings=tuple(sorted(one.items()))) for one in settings
            ]
        combos = list(asked)
        solved = self.runner.solve(
            self.loaded,
            [(self.cells[self.drawn[k][0]].scene, asked[k]) for k in combos],
            [self.wanted[q] for q, _, _ in beaten],
        )
        found = []
        for i, (q, k, _) in enumerate(beaten):
            own = solved[combos.index(k)].value[first[i] : first[i] + len(tried[i]), i]
            sizes = np.array([self._size(q, value) for value in own])
            found.append(np.where(np.isfinite(sizes), sizes, 0.0))
        return found

    def found(self) -> tuple[Corner, ...]:
        """Corner of every quantity, trivial ones included."""
        ages = self.loaded.case.review.ages
        failed = sum(int(np.isnan(f.value[:, 0]).sum()) for *_, f in self.drawn)
        count = sum(len(f.value) for *_, f in self.drawn)
        nothing = Draws(0, 0, 0.0, np.zeros(0))
        result = []
        for q, quantity in enumerate(self.wanted):
            cell, variant = self._combo(q)
            if q not in self.live:
                result.append(
                    Corner(quantity, True, (), 0.0, 0.0, cell, variant,
                           np.zeros((len(self.cells), len(ages))), (), nothing, False, 0.0)
                )  # fmt: skip
                continue
            size, k, number = self._worst_draw(q)
            largest = float(self.drawn[k][3].value[number, q]) if size else 0.0
            where, variant, time_s = self.at[q]
            result.append(
                Corner(
                    quantity=quantity,
                    trivial=False,
                    settings=self.settings[q],
                    value=self.value[q],
                    time_s=time_s,
                    scene=where,
                    variant=variant,
                    by_cell=self.by_cell[q],
                    sensitivities=self.effects.get(q, ()),
                    draws=Draws(count - failed, failed, largest, self._own_draws(q, k)),
                    extended=q in self.extended,
                    first=self.first[q],
                )
            )
        return tuple(result)
