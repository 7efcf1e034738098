"""Processor time of ``halflit --help`` over that of a bare typer program: the bar is 2.

``python tests/benchmarks/start_ratio.py`` prints both, the least of 15 starts each, taken in turn.
"""

from __future__ import annotations

import os
import resource
import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).parents[2]
BARE = """
import typer
app = typer.Typer()
@app.command()
def one(number: int = 1) -> None:
    "One."
@app.command()
def two(number: int = 1) -> None:
    "Two."
app()
"""


def processor_s(arguments: list[str]) -> float:
    """Processor time of a process [s]."""
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    subprocess.run(
        [sys.executable, *arguments],
        check=True,
        stdout=subprocess.DEVNULL,
        cwd=ROOT,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
    )
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    return after.ru_utime - before.ru_utime + after.ru_stime - before.ru_stime


def start_times(starts: int = 15) -> tuple[float, float]:
    """Least processor times [s] of ``halflit --help`` and of the bare program."""
    ours, bare = [], []
    for _ in range(starts):
        ours.append(processor_s(["-m", "charging", "--help"]))
        bare.append(processor_s(["-c", BARE, "--help"]))
    return min(ours), min(bare)


if __name__ == "__main__":
    ours, bare = start_times()
    print(f"halflit --help {ours:.3f} s, bare typer {bare:.3f} s, ratio {ours / bare:.2f}")
