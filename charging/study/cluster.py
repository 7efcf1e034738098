"""Blocks of a study on a Dask cluster; needs the `cluster` extra.

A scheduler runs the code that it is given: use one on a trusted network only.
"""

from __future__ import annotations

import pickle
from collections.abc import Iterator, Sequence
from concurrent.futures import CancelledError
from contextlib import contextmanager
from dataclasses import dataclass
from importlib import import_module
from typing import Any

from charging.errors import InputError
from charging.study.hands import MOST_LOSSES, work
from charging.study.plan import Plan
from charging.study.solve import Results, Task

LOCAL = "local"


@dataclass(slots=True)
class Cluster:
    """Solves tasks on a Dask scheduler.

    A worker that is lost costs the blocks it was solving: the scheduler gives them to others.
    Tasks that the scheduler gives up are handed to it again, `MOST_LOSSES` times.
    """

    plan: Plan
    client: Any

    def solved(self, tasks: Sequence[Task]) -> Iterator[tuple[int, Results]]:
        """Yield the number of each task and its results, in the order in which they finish.

        Raises
        ------
        InputError
            Workers were lost again and again.
        """
        distributed: Any = import_module("distributed")
        pickled = pickle.dumps(self.plan)
        open_ = dict(enumerate(tasks))
        for _ in range(MOST_LOSSES):
            kept = self.client.scatter(pickled, broadcast=True, hash=False)
            waiting = {
                self.client.submit(work, self.plan.sha256, kept, task, pure=False): number
                for number, task in open_.items()
            }
            for finished in distributed.as_completed(list(waiting)):
                number = waiting.pop(finished)
                try:
                    found = finished.result()
                except (distributed.KilledWorker, CancelledError):
                    continue
                del open_[number]
                yield number, found
            if not open_:
                return
        raise InputError(
            f"workers of the scheduler were lost {MOST_LOSSES} times",
            next_step="See to them, and go on with --resume.",
        )


@contextmanager
def on_cluster(plan: Plan, workers: int, scheduler: str) -> Iterator[Cluster]:
    """Connect to a scheduler, or start a cluster on this machine for "local".

    Raises
    ------
    InputError
        Dask is not installed, or the scheduler does not answer.
    """
    try:
        distributed: Any = import_module("distributed")
    except ImportError:
        raise InputError(
            "a scheduler needs the cluster extra", next_step="pip install 'halflit[cluster]'"
        ) from None
    cluster = None
    try:
        if scheduler == LOCAL:
            cluster = distributed.LocalCluster(
                n_workers=max(1, workers), threads_per_worker=1, dashboard_address=None
            )
        client = distributed.Client(scheduler if cluster is None else cluster, timeout="10s")
    except (OSError, ValueError) as error:
        raise InputError(
            f"scheduler {scheduler} does not answer: {str(error).lower() or 'no connection'}",
            allowed='an address such as tcp://host:8786, or "local"',
        ) from None
    try:
        yield Cluster(plan, client)
    finally:
        client.close()
        if cluster is not None:
            cluster.close()
