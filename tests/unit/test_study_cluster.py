"""Studies on Dask: the same bits as here, and nothing lost with a worker."""

from __future__ import annotations

import os
import signal
import threading
import time
from pathlib import Path

import numpy as np
import pytest
from distributed import LocalCluster

from charging.errors import InputError
from charging.study.dataset import by_choice
from charging.study.hands import hands_of
from charging.study.plan import Plan, load_study
from charging.study.solve import Results
from charging.study.sweep import Progress, sweep

CASE = (Path(__file__).parent / "two_films.toml").read_text(encoding="utf-8")
STUDY = """
title = "Radii"
case = "case.toml"
seed = 7
members = 16
replicates = 2
[[vary]]
path = "body.radius_m"
low = 0.5
high = 2.0
"""


def plan(folder: Path, study: str = STUDY) -> Plan:
    (folder / "case.toml").write_text(CASE, encoding="utf-8")
    path = folder / "study.toml"
    path.write_text(study, encoding="utf-8")
    return load_study(path)


def same(a: list[Results], b: list[Results]) -> bool:
    return all(
        x.keys() == y.keys() and all(np.array_equal(x[k], y[k], equal_nan=True) for k in x)
        for x, y in zip(a, b, strict=True)
    )


def test_a_scheduler_by_its_address_changes_no_bit(tmp_path: Path) -> None:
    study = plan(tmp_path)
    here = by_choice(study, sweep(study, tmp_path / "here", block_size=4))
    with (
        LocalCluster(
            n_workers=2, threads_per_worker=1, processes=False, dashboard_address=None
        ) as cluster,
        hands_of(study, scheduler=cluster.scheduler_address) as hands,
    ):
        there = by_choice(study, sweep(study, tmp_path / "there", block_size=4, hands=hands))
    assert same(here, there)


def test_no_scheduler_answers(tmp_path: Path) -> None:
    study = plan(tmp_path)
    with (
        pytest.raises(InputError, match=r"scheduler nowhere://1\.2 does not answer"),
        hands_of(study, scheduler="nowhere://1.2"),
    ):
        pass


@pytest.mark.slow
@pytest.mark.timeout(600)
def test_a_lost_worker_loses_no_block(tmp_path: Path) -> None:
    """Worker processes of a local cluster are killed while they solve; the bits are the same."""
    study = plan(tmp_path, STUDY.replace("members = 16", "members = 96"))
    here = by_choice(study, sweep(study, tmp_path / "here", block_size=4))
    told: list[Progress] = []
    with LocalCluster(
        n_workers=2, threads_per_worker=1, processes=True, dashboard_address=None
    ) as cluster:
        stop = threading.Event()

        def kill() -> None:
            for _ in range(3):
                wait = len(told) + 3
                while len(told) < wait and not stop.is_set():
                    time.sleep(0.01)
                if stop.is_set():
                    return
                workers = [nanny for nanny in cluster.workers.values() if nanny.pid]
                os.kill(workers[0].pid, signal.SIGKILL)

        killer = threading.Thread(target=kill)
        killer.start()
        with hands_of(study, scheduler=cluster.scheduler_address) as hands:
            store = sweep(study, tmp_path / "there", block_size=4, hands=hands, tell=told.append)
        stop.set()
        killer.join()
    assert [p.done for p in told] == list(range(4, 97, 4))  # every block once
    assert same(here, by_choice(study, store))


@pytest.mark.slow
@pytest.mark.timeout(600)
def test_every_way_to_solve_gives_the_same_bits(tmp_path: Path) -> None:
    """Here, on one, two and three processes, and on a cluster of this machine."""
    study = plan(tmp_path, STUDY.replace("members = 16", "members = 48"))
    here = by_choice(study, sweep(study, tmp_path / "here", block_size=8))
    for workers, scheduler in ((2, None), (3, None), (2, "local")):
        folder = tmp_path / f"{workers}{scheduler}"
        with hands_of(study, workers, scheduler) as hands:
            assert same(here, by_choice(study, sweep(study, folder, block_size=8, hands=hands)))


@pytest.mark.slow
@pytest.mark.timeout(600)
def test_a_killed_process_of_the_pool_is_replaced(tmp_path: Path) -> None:
    from multiprocessing import active_children

    study = plan(tmp_path, STUDY.replace("members = 16", "members = 48"))
    here = by_choice(study, sweep(study, tmp_path / "here", block_size=4))
    killed = []

    def kill(progress: Progress) -> None:
        if progress.done > 8 and not killed:
            child = active_children()[0]
            assert child.pid is not None
            os.kill(child.pid, signal.SIGKILL)
            killed.append(child.pid)

    with hands_of(study, 2) as hands:
        store = sweep(study, tmp_path / "there", block_size=4, hands=hands, tell=kill)
    assert killed
    assert same(here, by_choice(study, store))
