"""Ruff and mypy are part of the suite, so that one command tells everything."""

import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]


def run(*arguments: str) -> None:
    done = subprocess.run(
        [sys.executable, "-m", *arguments], cwd=ROOT, capture_output=True, text=True, check=False
    )
    assert done.returncode == 0, done.stdout[-4000:] + done.stderr[-1000:]


def test_ruff_finds_nothing() -> None:
    run("ruff", "check", ".")


def test_ruff_would_not_reformat() -> None:
    run("ruff", "format", "--check", ".")


@pytest.mark.timeout(300)
def test_mypy_strict_finds_nothing() -> None:
    run("mypy")
