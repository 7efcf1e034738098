"""Who solves the blocks of a study: this process, or processes of this machine.

Whoever solves a block, its numbers are the same: blocks are cut before, and members do not
depend on their company.
"""

from __future__ import annotations

import os
import pickle
import signal
from collections.abc import Iterator, Sequence
from concurrent.futures import Future, ProcessPoolExecutor, as_completed
from concurrent.futures.process import BrokenProcessPool
from contextlib import contextmanager
from dataclasses import dataclass
from multiprocessing import active_children, get_context
from typing import Protocol

from charging.errors import InputError
from charging.study.plan import Plan
from charging.study.solve import Results, Solver, Task, Trial

ONE_THREAD = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS")

MOST_LOSSES = 5
"""How often lost workers are replaced before a sweep gives up."""


class Hands(Protocol):
    """Solves tasks."""

    def solved(self, tasks: Sequence[Task]) -> Iterator[tuple[int, Results]]:
        """Yield the number of each task and its results, in the order in which they finish."""
        ...


def solved_trials(hands: Hands, tasks: Sequence[Trial]) -> list[tuple[Trial, Results]]:
    """Trials with their results, in the order asked."""
    found = dict(hands.solved(tasks))
    return [(task, found[number]) for number, task in enumerate(tasks)]


@dataclass(slots=True)
class Here:
    """Solves one task after the other in this process."""

    solver: Solver

    def solved(self, tasks: Sequence[Task]) -> Iterator[tuple[int, Results]]:
        """Yield the number of each task and its results, in the order asked."""
        for number, task in enumerate(tasks):
            yield number, self.solver.run(task)


@dataclass(slots=True)
class _Kept:
    key: str
    solver: Solver


_KEPT: list[_Kept] = []  # of a worker process: what tasks of one study share


def work(key: str, pickled: bytes, task: Task) -> Results:
    """Solve a task in a worker process, which keeps what the tasks of a study share."""
    if not _KEPT or _KEPT[0].key != key:
        _KEPT[:] = [_Kept(key, Solver(pickle.loads(pickled)))]
    return _KEPT[0].solver.run(task)


@dataclass(slots=True)
class Processes:
    """Solves tasks on processes of this machine; one that is lost is replaced."""

    plan: Plan
    workers: int

    def solved(self, tasks: Sequence[Task]) -> Iterator[tuple[int, Results]]:
        """Yield the number of each task and its results, in the order in which they finish.

        Raises
        ------
        InputError
            Workers were lost again and again.
        """
        pickled = pickle.dumps(self.plan)
        open_ = dict(enumerate(tasks))
        for _ in range(MOST_LOSSES):
            try:
                with _pool(min(self.workers, len(open_) or 1)) as pool:
                    with _one_thread():
                        waiting: dict[Future[Results], int] = {
                            pool.submit(work, self.plan.sha256, pickled, task): number
                            for number, task in open_.items()
                        }
                    for finished in as_completed(waiting):
                        found = finished.result()
                        del open_[waiting[finished]]
                        yield waiting[finished], found
            except BrokenProcessPool:
                continue  # what was finished stays; the rest goes to new processes
            return
        raise InputError(
            f"worker processes were ended from outside {MOST_LOSSES} times",
            next_step="Often memory ran out: try fewer --workers, and go on with --resume.",
        )


@contextmanager
def _pool(workers: int) -> Iterator[ProcessPoolExecutor]:
    before = set(active_children())
    pool = ProcessPoolExecutor(
        workers, mp_context=get_context("spawn"), initializer=_deaf_to_interrupts
    )
    try:
        yield pool
    except BaseException:
        pool.shutdown(wait=False, cancel_futures=True)
        for child in active_children():
            if child not in before:
                child.terminate()  # nobody waits for the rest of its block
        raise
    pool.shutdown()


def _deaf_to_interrupts() -> None:
    # Ctrl-C goes to every process of a terminal; the first one ends the others
    signal.signal(signal.SIGINT, signal.SIG_IGN)


@contextmanager
def _one_thread() -> Iterator[None]:
    """Processes begun inside have one thread for linear algebra: more would get in the way."""
    before = {name: os.environ.get(name) for name in ONE_THREAD}
    os.environ.update(dict.fromkeys(ONE_THREAD, "1"))
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                os.environ.pop(name, None)
            else:
                os.environ[name] = value


@contextmanager
def hands_of(plan: Plan, workers: int = 1, scheduler: str | None = None) -> Iterator[Hands]:
    """Hands for a study.

    Parameters
    ----------
    plan : Plan
    workers : int, optional
        Processes of this machine.
    scheduler : str, optional
        Address of a Dask scheduler, or "local" for a cluster on this machine; needs the
        `cluster` extra.

    Raises
    ------
    InputError
        No scheduler answers.
    """
    if scheduler is not None:
        from charging.study.cluster import on_cluster

        with on_cluster(plan, workers, scheduler) as found:
            yield found
    elif workers < 2:
        yield Here(Solver(plan))
    else:
        yield Processes(plan, workers)
