"""Solving a study: every block that is not finished yet, kept as it finishes.

One process writes, whoever solves.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

from charging.study.hands import Hands, Here
from charging.study.plan import Plan
from charging.study.solve import Solver, blocks
from charging.study.store import Store, manifest_of

BLOCK = 512
"""Members of a block: enough to share the cost of a step, few enough for 100 MB of tables."""


@dataclass(frozen=True, slots=True)
class Progress:
    """How far a sweep is."""

    done: int
    members: int
    rate_per_s: float
    left_s: float


Tell = Callable[[Progress], None]


def sweep(
    plan: Plan,
    folder: Path,
    *,
    resume: bool = False,
    hands: Hands | None = None,
    block_size: int | None = None,
    tell: Tell | None = None,
) -> Store:
    """Solve every block of a study that is not finished yet.

    Parameters
    ----------
    plan : Plan
    folder : Path
        Holds manifest and blocks.
    resume : bool, optional
        Go on with what is there.
    hands : Hands, optional
        From `hands_of`; default: this process.
    block_size : int, optional
        Default: `usual_block` of the study.
    tell : callable, optional
        Told of the blocks that are there at the start, and of every finished one.

    Returns
    -------
    Store
        With every block finished.

    Raises
    ------
    InputError
        The folder cannot be used, or what is in it differs from the study.
    KeyboardInterrupt
        Finished blocks stay.
    """
    cut = blocks(plan, usual_block(plan) if block_size is None else block_size)
    store = Store(folder, manifest_of(plan, cut))
    with store.opened(resume=resume):
        there = store.finished()
        open_ = [block for block in cut if block.number not in there]
        done = plan.members - sum(b.last - b.first for b in open_)
        started, before = time.monotonic(), done
        if tell is not None and done:
            tell(Progress(done, plan.members, 0.0, float("nan") if open_ else 0.0))
        if not open_:
            return store
        hands = Here(Solver(plan)) if hands is None else hands
        for number, results in hands.solved(open_):
            store.write(open_[number], results)
            done += open_[number].last - open_[number].first
            if tell is not None:
                rate = (done - before) / max(time.monotonic() - started, 1e-9)
                tell(Progress(done, plan.members, rate, (plan.members - done) / rate))
    return store


def usual_block(plan: Plan) -> int:
    """Members of a block of a study: fewer where a choice has few, so that blocks are even."""
    parts = -(-plan.draws // BLOCK)
    if plan.draws >= BLOCK:
        parts += parts % 2  # two processes get as many each
    return -(-plan.draws // parts)
