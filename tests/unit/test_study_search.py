"""Indices and the search for the worst case of a real study."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from charging.study.hands import Here
from charging.study.plan import Plan, load_study
from charging.study.report import report_sweep
from charging.study.solve import Solver
from charging.study.sweep import sweep
from charging.study.worst_case import search_worst, searched_severity

CASE = (Path(__file__).parent / "two_films.toml").read_text(encoding="utf-8")
HOT = "plasma.ECSS geostationary worst case.electron 2"
STUDY = f"""
title = "Films in the dark"
case = "case.toml"
seed = 7
members = 64
replicates = 16
surfaces = ["tag"]
[[vary]]
path = "{HOT}.density_m3"
low = 0.1e6
high = 2.0e6
[[vary]]
path = "link.1.resistance_ohm"
low = 1e9
high = 1e13
law = "log_uniform"
[[vary]]
path = "material.oxidised aluminium.work_function_eV"
low = 3.9
high = 4.1
[indices]
factors = 2
base = 32
[worst_case]
starts = 6
evaluations = 40
[[search]]
path = "{HOT}.density_m3"
low = 0.1e6
high = 2.0e6
law = "log_uniform"
[[search]]
path = "link.1.resistance_ohm"
low = 1e9
high = 1e13
law = "log_uniform"
"""


def plan(folder: Path, study: str = STUDY) -> Plan:
    (folder / "case.toml").write_text(CASE, encoding="utf-8")
    (folder / "study.toml").write_text(study, encoding="utf-8")
    return load_study(folder / "study.toml")


def test_drivers_indices_and_worst_case_of_a_study(tmp_path: Path) -> None:
    study = plan(tmp_path)
    store = sweep(study, tmp_path / "out")
    report = report_sweep(study, store)
    document = json.loads((tmp_path / "out" / "ranking.json").read_text(encoding="utf-8"))
    # the resistor holds the tag near structure or does not; a work function in the dark drives
    # nothing
    assert document["rows"][0]["driver"] == "link.1.resistance_ohm"
    assert "material.oxidised aluminium.work_function_eV" not in [
        one["factor"] for one in document["rows"][0]["drivers"]
    ]
    assert document["sobol_indices"][0]["factor"] == "link.1.resistance_ohm"
    assert {one.factor for one in report.indices} <= {"link.1.resistance_ohm", f"{HOT}.density_m3"}
    # the tag is worst with the largest resistance
    worst = document["worst_case"]
    assert worst["at"]["link.1.resistance_ohm"] == pytest.approx(1e13)
    assert worst["evaluations"] <= 40
    assert worst["limit"].endswith("tag")
    assert abs(worst["value"]) / worst["allowed"] == pytest.approx(worst["severity"], rel=1e-9)
    assert worst["severity"] >= abs(document["rows"][0]["worst_V"]) / 1000.0 * 0.98
    assert (tmp_path / "out" / "drivers.png").read_bytes()[:4] == b"\x89PNG"


@pytest.mark.slow
@pytest.mark.timeout(1800)
def test_search_beats_ten_thousand_random_samples(tmp_path: Path) -> None:
    """The search of a few hundred evaluations against 10 000 random ones, same function."""
    study = plan(tmp_path, STUDY.replace("evaluations = 40", "evaluations = 300"))
    hands = Here(Solver(study))
    worst = search_worst(study, hands, 0, 128)
    assert worst is not None
    found = worst.search
    places = np.random.default_rng(1).random((10_000, 2))
    sampled = searched_severity(study, hands, 0, 1000)(places)
    print(f"search {found.value:.6g} in {found.evaluations}, best of 10 000 {sampled.max():.6g}")
    assert found.value >= sampled.max()
