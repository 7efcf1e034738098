"""Blocks of members on one or several processes: variants in, worst values out."""

from __future__ import annotations

import hashlib
import pickle
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import Future, ProcessPoolExecutor
from dataclasses import dataclass, field, replace
from multiprocessing import get_context
from types import TracebackType

import numpy as np

from charging.case import LoadedCase
from charging.currents.ensemble import EscapeCurves
from charging.currents.ensemble_tables import is_scalable
from charging.errors import NoSolutionError
from charging.members import Member
from charging.network.rosenbrock import RODAS3
from charging.orbit_run import ENSEMBLE_TOLERANCE, solve_mode, surroundings_of
from charging.review.extremes import Extremes, Quantity, extremes
from charging.review.scenes import Scene
from charging.review.space import Variant, Workshop
from charging.spacecraft import surface_materials
from charging.surroundings import Surroundings

BLOCK, FULL_BLOCK, FEWEST = 256, 24, 4
"""Members in one block: with coarse tables, with full ones, along an orbit with its plasma."""

SCREENING = replace(ENSEMBLE_TOLERANCE, method=RODAS3)
"""Of members with coarse tables: a third cheaper than the method of single runs."""

LEAST_BLOCK = 16
"""Members below which a block is not worth splitting between processes."""

PARTS = 4
"""Points looked at in every step of the march."""

MOST_KEPT = 8
"""Cases whose members and surroundings a process keeps at hand."""


@dataclass(frozen=True, slots=True)
class Job:
    """One block: a case by the hash of its pickle, and what to run."""

    case: str
    scene: Scene
    variants: tuple[Variant, ...]
    wanted: tuple[Quantity, ...]


@dataclass(slots=True)
class _Kept:
    loaded: LoadedCase
    workshop: Workshop
    around: dict[Scene, Surroundings] = field(default_factory=dict)


class Bench:
    """What one process keeps between its jobs."""

    def __init__(self) -> None:
        self._curves = EscapeCurves()
        self._kept: dict[str, _Kept] = {}

    def knows(self, case: str) -> bool:
        """Whether a case was given before."""
        return case in self._kept

    def keep(self, case: str, loaded: LoadedCase) -> None:
        """Keep a case; the oldest ones make room."""
        while len(self._kept) >= MOST_KEPT:
            del self._kept[next(iter(self._kept))]
        self._kept[case] = _Kept(loaded, Workshop.of(loaded))

    def run(self, job: Job) -> tuple[list[list[float]], list[list[float]]]:
        """Worst values and times, [m][Q]; nan where a member finds no solution."""
        kept = self._kept[job.case]
        if job.scene not in kept.around:
            kept.around[job.scene] = surroundings_of(kept.loaded, job.scene.table)
        members = [kept.workshop.member(variant) for variant in job.variants]
        found: list[tuple[list[float], list[float]]] = [([], [])] * len(members)
        for rows in _alike(members, kept.around[job.scene], job.scene):
            answers = self._solved(kept, job, [members[i] for i in rows])
            for i, answer in zip(rows, answers, strict=True):
                found[i] = answer
        return [value for value, _ in found], [time for _, time in found]

    def _solved(
        self, kept: _Kept, job: Job, members: Sequence[Member]
    ) -> Iterator[tuple[list[float], list[float]]]:
        try:
            run = solve_mode(
                kept.loaded,
                job.scene.table,
                members=members,
                around=kept.around[job.scene],
                curves=self._curves,
                tolerance=SCREENING,
            )
        except NoSolutionError:
            if len(members) == 1:
                nothing = [float("nan")] * len(job.wanted)
                yield nothing, nothing
                return
            for member in members:
                yield from self._solved(kept, job, [member])
            return
        for i, (member, path) in enumerate(zip(members, run.trajectories, strict=True)):
            value, time = extremes(
                member.case, run.balance.net.of(i), path, job.wanted, parts=PARTS
            )
            yield value.tolist(), time.tolist()


def _alike(members: Sequence[Member], around: Surroundings, scene: Scene) -> list[list[int]]:
    """Members in blocks: those of the coarse tables together, the others a few at a time.

    One member that the coarse tables do not know would cost its whole block the full ones,
    which are large: 10 MB a member, and far more along an orbit with its own plasma.
    """
    coarse: list[int] = []
    others: list[int] = []
    for i, member in enumerate(members):
        maxwellian = all(
            population.distribution is None
            for plasma in member.plasmas_of(scene.table, around.basis)
            for population in plasma.populations
        )
        known = maxwellian and around.along is None and member.collection != "cylinder"
        known = known and all(is_scalable(material) for material in surface_materials(
            member.case, member.materials
        ))  # fmt: skip
        (coarse if known else others).append(i)
    few = FULL_BLOCK if around.along is None else FEWEST
    pieces = [others[k : k + few] for k in range(0, len(others), few)]
    return [*([coarse] if coarse else []), *pieces]


_BENCH = Bench()  # of a worker process


def _work(job: Job, pickled: bytes) -> tuple[list[list[float]], list[list[float]]]:
    if not _BENCH.knows(job.case):
        _BENCH.keep(job.case, pickle.loads(pickled))
    return _BENCH.run(job)


class Runner:
    """Runs blocks here, or on `workers` processes; the numbers are the same.

    `progress` is told how many members have been run of how many; `members` counts them.
    """

    def __init__(
        self, workers: int = 1, progress: Callable[[int, int], None] | None = None
    ) -> None:
        self.members = 0
        self.workers = workers
        self._planned = 0
        self._progress = progress
        self._bench = Bench()
        self._pickles: dict[int, tuple[LoadedCase, str, bytes]] = {}
        self._pool: ProcessPoolExecutor | None = None

    def __enter__(self) -> Runner:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        if self._pool is not None:
            self._pool.shutdown(wait=True, cancel_futures=True)
            self._pool = None

    def expect(self, members: int) -> None:
        """Say how many more members will be asked for, as far as that is known."""
        self._planned = self.members + members

    def each(self, work: Callable[..., bytes], rows: Sequence[tuple[object, ...]]) -> list[bytes]:
        """Results of a function of a module for rows of arguments, on the processes."""
        return [f.result() for f in [self._started().submit(work, *row) for row in rows]]

    def solve(
        self,
        loaded: LoadedCase,
        asked: Sequence[tuple[Scene, Sequence[Variant]]],
        wanted: Sequence[Quantity],
    ) -> list[Extremes]:
        """Worst values of variants, scene by scene, with the tables of ensembles.

        They lie within some 0.15 V or 0.15 % of those of a single run.

        Parameters
        ----------
        loaded : LoadedCase
        asked : sequence of (Scene, variants)
        wanted : sequence of Quantity

        Returns
        -------
        list of Extremes
            In the order asked; nan where a member finds no solution.
        """
        token, pickled = self._token(loaded)
        count = sum(len(variants) for _, variants in asked)
        self._planned = max(self._planned, self.members + count)
        jobs, orders = [], []
        for scene, variants in asked:
            alike: dict[frozenset[str], list[int]] = {}
            for i, variant in enumerate(variants):
                alike.setdefault(variant.bonded, []).append(i)
            order = []
            for same in alike.values():
                order += same
                # even blocks: no process waits for a full one while another has a sliver
                for rows in np.array_split(same, self._pieces(len(same), count)):
                    chosen = tuple(variants[i] for i in rows)
                    jobs.append(Job(token, scene, chosen, tuple(wanted)))
            orders.append(order)
        answers = iter(self._answers(jobs, loaded, pickled))
        found = []
        for (_, variants), order in zip(asked, orders, strict=True):
            value: list[list[float]] = []
            time: list[list[float]] = []
            while len(value) < len(variants):
                part = next(answers)
                value += part[0]
                time += part[1]
            shape = (len(variants), len(wanted))
            back = np.argsort(order)
            found.append(
                Extremes(np.array(value).reshape(shape)[back], np.array(time).reshape(shape)[back])
            )
        return found

    def _pieces(self, count: int, whole: int) -> int:
        """Number of blocks: no larger than they may be, and work for every process."""
        largest = min(BLOCK, max(-(-whole // self.workers), LEAST_BLOCK))
        return -(-count // largest)

    def _answers(
        self, jobs: Sequence[Job], loaded: LoadedCase, pickled: bytes
    ) -> list[tuple[list[list[float]], list[list[float]]]]:
        if self.workers < 2 or len(jobs) < 2:
            if jobs and not self._bench.knows(jobs[0].case):
                self._bench.keep(jobs[0].case, loaded)
            return [self._told(job, self._bench.run(job)) for job in jobs]
        pool = self._started()
        futures: list[Future[tuple[list[list[float]], list[list[float]]]]] = [
            pool.submit(_work, job, pickled) for job in jobs
        ]
        return [self._told(job, future.result()) for job, future in zip(jobs, futures, strict=True)]

    def _started(self) -> ProcessPoolExecutor:
        if self._pool is None:
            self._pool = ProcessPoolExecutor(self.workers, mp_context=get_context("spawn"))
        return self._pool

    def _told(
        self, job: Job, answer: tuple[list[list[float]], list[list[float]]]
    ) -> tuple[list[list[float]], list[list[float]]]:
        self.members += len(job.variants)
        if self._progress is not None:
            self._progress(self.members, max(self._planned, self.members))
        return answer

    def _token(self, loaded: LoadedCase) -> tuple[str, bytes]:
        if id(loaded) not in self._pickles:
            pickled = pickle.dumps(loaded)
            self._pickles[id(loaded)] = (loaded, hashlib.sha256(pickled).hexdigest(), pickled)
        return self._pickles[id(loaded)][1:]
