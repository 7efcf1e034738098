"""Runs that several tests look at, solved once per session."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import pytest

if TYPE_CHECKING:
    from charging.orbit_run import CaseRun

ROOT = Path(__file__).parents[1]


@pytest.fixture(scope="session")
def demo_day() -> CaseRun:
    """Run of the demo day, both emission laws."""
    from charging.case import load_case
    from charging.orbit_run import run_case

    return run_case(load_case(ROOT / "cases" / "geo_substorm_day.toml"))


@pytest.fixture(scope="session")
def static_case() -> CaseRun:
    """Run of the standards' own analysis: sunlit base and mode "eclipse"."""
    from charging.case import load_case
    from charging.orbit_run import run_case

    return run_case(load_case(ROOT / "cases" / "geo_static_worst_case.toml"))


@pytest.fixture(scope="session")
def demo_folder(demo_day: CaseRun, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Result folder of the demo day, without plots."""
    from charging.results import write_results

    target = tmp_path_factory.mktemp("demo") / "day"
    write_results(demo_day, target, plots=False)
    return target


@pytest.fixture(scope="session")
def static_folder(static_case: CaseRun, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Result folder of the static case, without plots."""
    from charging.results import write_results

    target = tmp_path_factory.mktemp("static") / "case"
    write_results(static_case, target, plots=False)
    return target
