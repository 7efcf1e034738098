"""Speed of ensembles, as ratios in one run, and the rate that they give.

Members of ``cases/ensemble_speed_study.toml``, a day with twelve surfaces: side by side against
one by one, two workers against one, and the memory of a worker. Run on a quiet machine:
``OMP_NUM_THREADS=1 python tests/benchmarks/sweep_rate.py [MEMBERS]``.
"""

from __future__ import annotations

import resource
import sys
import tempfile
import time
from pathlib import Path

from charging.study.hands import hands_of
from charging.study.plan import Plan, load_study
from charging.study.solve import Block, Solver
from charging.study.sweep import sweep

STUDY = Path(__file__).parents[2] / "cases" / "ensemble_speed_study.toml"
ALONE = 3


def main() -> None:
    """Print rates and ratios."""
    members = int(sys.argv[1]) if len(sys.argv) > 1 else 2048
    with tempfile.TemporaryDirectory() as folder:
        study = _smaller(Path(folder), members)
        solver = Solver(study)
        solver.solve(Block(0, 0, 0, 1))  # loads modules and shares geometry
        began = time.process_time()
        for number in range(ALONE):
            solver.solve(Block(0, 0, number, number + 1))
        alone = (time.process_time() - began) / ALONE
        block = min(512, members)
        began = time.process_time()
        solver.solve(Block(0, 0, 0, block))
        together = (time.process_time() - began) / block
        print(
            f"processor time of a member: alone {1e3 * alone:.0f} ms, "
            f"in a block of {block} {1e3 * together:.1f} ms, ratio {alone / together:.0f}"
        )
        seconds = [_wall_s(study, Path(folder) / str(n), n) for n in (1, 2)]
        print(
            f"{members} members: one worker {seconds[0]:.1f} s, two {seconds[1]:.1f} s, ratio "
            f"{seconds[0] / seconds[1]:.2f}; {members / seconds[1]:.0f} members a second"
        )
    own, children = (
        resource.getrusage(who).ru_maxrss / 1024**2
        for who in (resource.RUSAGE_SELF, resource.RUSAGE_CHILDREN)
    )
    print(f"largest memory: {own:.2f} GiB here, {children:.2f} GiB in a worker")


def _smaller(folder: Path, members: int) -> Plan:
    case = STUDY.parent / "ensemble_speed_day.toml"
    (folder / case.name).write_text(case.read_text(encoding="utf-8"), encoding="utf-8")
    text = STUDY.read_text(encoding="utf-8").replace("members = 10000", f"members = {members}")
    (folder / "study.toml").write_text(text, encoding="utf-8")
    return load_study(folder / "study.toml")


def _wall_s(study: Plan, folder: Path, workers: int) -> float:
    began = time.perf_counter()
    with hands_of(study, workers) as hands:
        sweep(study, folder, hands=hands)
    return time.perf_counter() - began


if __name__ == "__main__":
    main()
