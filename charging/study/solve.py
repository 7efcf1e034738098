"""One block of a study: members of one choice, solved side by side, their worst values out."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from charging.case import LoadedCase, Mode
from charging.currents.ensemble import EscapeCurves
from charging.errors import NoSolutionError
from charging.members import Member
from charging.network.charge_balance import ChargeBalance
from charging.network.nodes import Network
from charging.orbit_run import ENSEMBLE_TOLERANCE, laws_of, solve_mode, surroundings_of
from charging.review.extremes import neighbours
from charging.review.space import Variant, Workshop
from charging.study.choices import with_numbers
from charging.study.draws import MemberMaker, factor_names, places, value_in
from charging.study.plan import Plan
from charging.study.watch import Watch
from charging.surroundings import Surroundings
from materials.secondary import YieldLaw

Array = NDArray[np.float64]
Results = dict[str, NDArray[np.float64]]

HISTORY_POINTS = 289
"""Times of a kept history, evenly over the run."""


@dataclass(frozen=True, slots=True)
class Block:
    """Members `first` to `last` (excluded) of the study, all of one choice."""

    number: int
    choice: int
    first: int
    last: int


@dataclass(frozen=True, slots=True)
class Trial:
    """Members of a choice at places 0…1 of its factors, or of the searched numbers."""

    choice: int
    rows: tuple[tuple[float, ...], ...]
    searched: bool = False


Task: TypeAlias = Block | Trial


def trials(choice: int, places: Array, size: int, *, searched: bool = False) -> list[Trial]:
    """Cut places [N, k] into trials of at most `size` members."""
    return [
        Trial(choice, tuple(map(tuple, places[first : first + size].tolist())), searched)
        for first in range(0, len(places), size)
    ]


def blocks(plan: Plan, size: int) -> tuple[Block, ...]:
    """Cut a study into blocks of at most `size` members; none spans two choices."""
    found: list[Block] = []
    for choice in range(len(plan.choices)):
        start, end = choice * plan.draws, (choice + 1) * plan.draws
        for first in range(start, end, size):
            found.append(Block(len(found), choice, first, min(first + size, end)))
    return tuple(found)


class Solver:
    """Solves blocks of one study; what blocks share is made once."""

    def __init__(self, plan: Plan) -> None:
        self.plan = plan
        self.names = factor_names(plan)
        self.places, self.replicate = places(plan, len(self.names))
        self._curves = EscapeCurves()
        self._makers: dict[int, MemberMaker] = {}
        self._around: dict[tuple[object, str | None], Surroundings] = {}

    def run(self, task: Task) -> Results:
        """Worst values of the members of a block or trial."""
        if isinstance(task, Block):
            return self.solve(task)
        if task.searched:
            return self._at_searched(task)
        return self.answers(task.choice, task.rows)

    def _at_searched(self, trial: Trial) -> Results:
        """Worst values at places of the searched numbers, properties as recorded."""
        loaded = self.plan.choices[trial.choice].loaded
        return self.solved_cases(
            loaded,
            [
                with_numbers(
                    loaded,
                    [
                        (one.target, value_in(one, place))
                        for one, place in zip(self.plan.searched, row, strict=True)
                    ],
                )
                for row in trial.rows
            ],
        )

    def solve(self, block: Block) -> Results:
        """Worst values of the members of a block.

        Returns
        -------
        dict of ndarray
            Dimensions as in `dataset.VARIABLES`; nan where a member finds no solution.
        """
        maker = self._maker(block.choice)
        draws = range(block.first - block.choice * self.plan.draws,
                      block.last - block.choice * self.plan.draws)  # fmt: skip
        columns = [self.names.index(name) for name in maker.factors.names]
        rows = [self.places[draw, columns].tolist() for draw in draws]
        values = np.full((len(rows), len(self.names)), np.nan)
        for i, row in enumerate(rows):
            values[i, columns] = maker.values(row)
        found = self.answers(block.choice, rows)
        return {**found, "factor_value": values}

    def answers(self, choice: int, rows: Sequence[Sequence[float]]) -> Results:
        """Worst values of members at places of the factors of a choice."""
        maker = self._maker(choice)

        def members(law: YieldLaw) -> list[Member]:
            return [maker.member(row, law) for row in rows]

        return self._answers(self.plan.choices[choice].loaded, members)

    def solved_cases(self, loaded: LoadedCase, cases: Sequence[LoadedCase]) -> Results:
        """Worst values of cases that differ from one in numbers, properties as recorded."""
        age, collection = self.plan.file.age, loaded.case.body.collection

        def members(law: YieldLaw) -> list[Member]:
            return [Workshop.of(one).member(Variant(age, law, collection)) for one in cases]

        return self._answers(loaded, members)

    def _answers(
        self, loaded: LoadedCase, members_of: Callable[[YieldLaw], list[Member]]
    ) -> Results:
        """Results [members, mode, law, …] for members made for each law."""
        parts = []
        for mode in (None, *loaded.case.alternatives):
            by_law = []
            for law in laws_of(loaded):
                members = members_of(law)
                by_law.append(self._solved(loaded, mode, law, members))
            parts.append({k: np.stack([one[k] for one in by_law], axis=1) for k in by_law[0]})
        return {k: np.stack([part[k] for part in parts], axis=1) for k in parts[0]}

    def _maker(self, choice: int) -> MemberMaker:
        if choice not in self._makers:
            self._makers[choice] = MemberMaker.of(self.plan, self.plan.choices[choice])
        return self._makers[choice]

    def _solved(
        self, loaded: LoadedCase, mode: Mode | None, law: YieldLaw, members: Sequence[Member]
    ) -> Results:
        """Results [members, …] of one mode and law."""
        watch: list[Watch] = []

        def record(balance: ChargeBalance, start: Array) -> Watch:
            watch.append(Watch(balance, start, _pairs(loaded, balance.net), self._grid(loaded)))
            return watch[0]

        try:
            solve_mode(
                loaded,
                mode,
                members=members,
                around=self._surroundings(loaded, mode),
                tolerance=ENSEMBLE_TOLERANCE,
                curves=self._curves,
                record=record,
            )
        except NoSolutionError:
            if len(members) == 1:
                return _nothing(loaded, self.plan.file.histories)
            # halves find the few that have none; no member's numbers depend on its company
            middle = len(members) // 2
            halves = [
                self._solved(loaded, mode, law, part)
                for part in (members[:middle], members[middle:])
            ]
            return {k: np.concatenate([half[k] for half in halves]) for k in halves[0]}
        return watch[0].results()

    def _grid(self, loaded: LoadedCase) -> Array | None:
        if not self.plan.file.histories:
            return None
        return np.linspace(0.0, loaded.case.duration_s, HISTORY_POINTS)

    def _surroundings(self, loaded: LoadedCase, mode: Mode | None) -> Surroundings:
        case = loaded.case
        geometry = case.model_copy(
            update={
                "surface": tuple(
                    s.model_copy(
                        update={
                            "material": "", "area_m2": 1.0, "thickness_m": None,
                            "capacitance_F": None, "surface_state": "as recorded",
                        }
                    )
                    for s in case.surface
                ),
                "link": (), "limit": (),
            }
        )  # fmt: skip
        key = (geometry.model_dump_json(), None if mode is None else mode.name)
        if key not in self._around:
            self._around[key] = surroundings_of(loaded, mode)
        return self._around[key]


def _pairs(loaded: LoadedCase, net: Network) -> NDArray[np.intp]:
    names = loaded.case.names
    found = [(names.index(a), names.index(b)) for a, b in neighbours(loaded.case)]
    return np.asarray(net.surface_node[np.array(found, dtype=np.intp).reshape(-1, 2)])


def _nothing(loaded: LoadedCase, histories: bool) -> Results:
    """Results [1, …] of a member without solution."""
    surfaces = np.full((1, len(loaded.case.surface)), np.nan)
    pairs = np.full((1, len(neighbours(loaded.case))), np.nan)
    one = np.full(1, np.nan)
    found = {
        "lowest_V": surfaces, "lowest_time_s": surfaces, "highest_V": surfaces,
        "highest_time_s": surfaces, "final_V": surfaces, "pair_lowest_V": pairs,
        "pair_highest_V": pairs, "structure_lowest_V": one, "structure_highest_V": one,
        "structure_final_V": one, "largest_field_V_m": surfaces, "largest_energy_J": surfaces,
    }  # fmt: skip
    if histories:
        found["history_V"] = np.full((*surfaces.shape, HISTORY_POINTS), np.nan)
    return found
