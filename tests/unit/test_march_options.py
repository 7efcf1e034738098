"""The cheaper method, extremes gathered on the way, and what a march says when it fails."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray

from charging.case import load_case_text
from charging.errors import NoSolutionError
from charging.network.march import Tolerance, march
from charging.network.peaks import Peaks
from charging.network.rosenbrock import RODAS, RODAS3, Method
from charging.orbit_run import ModeRun, solve_mode

Array = NDArray[np.float64]

CASE = """\
title = "A film in an injection"
[orbit]
kind = "fixed"
illumination = 0.2
sun_direction = [0.0, 0.0, 1.0]
duration_h = 0.2
[plasma]
use = "quiet geostationary"
[[plasma.event]]
onset_h = 0.05
rise_min = 1.0
hold_min = 3.0
decay_min = 2.0
use = "ECSS geostationary worst case"
[body]
radius_m = 1.0
[emission]
secondary_law = "both"
[[surface]]
name = "panel"
material = "oxidised aluminium"
area_m2 = 3.0
normal = [0.0, 0.0, 1.0]
[[surface]]
name = "film"
material = "polyimide film"
area_m2 = 1.0
thickness_m = 5e-5
temperature_K = 290.0
normal = [0.0, 0.0, -1.0]
"""


@pytest.mark.parametrize("method", [RODAS, RODAS3], ids=lambda m: m.name)
def test_order_conditions_up_to_three(method: Method) -> None:
    """Conditions of a Rosenbrock method with α, β = α + γ (Hairer & Wanner 1996, table IV.7.1)."""
    s = len(method.alpha)
    a, c = np.zeros((2, s, s))
    for i in range(s):
        a[i, :i], c[i, :i] = method.a[i], method.c[i]
    gamma = np.linalg.inv(np.eye(s) / method.gamma - c)
    alpha = a @ gamma
    beta = alpha + gamma
    weights = np.append(method.a[-1], 1.0) @ gamma
    assert alpha.sum(axis=1) == pytest.approx(np.array(method.alpha), abs=1e-10)
    assert gamma.sum(axis=1) == pytest.approx(np.array(method.gamma_t), abs=1e-10)
    assert weights.sum() == pytest.approx(1.0, abs=1e-12)
    assert weights @ beta.sum(axis=1) == pytest.approx(1.0 / 2.0, abs=1e-12)
    assert weights @ alpha.sum(axis=1) ** 2 == pytest.approx(1.0 / 3.0, abs=1e-10)
    assert weights @ beta @ beta.sum(axis=1) == pytest.approx(1.0 / 6.0, abs=1e-10)
    # stiffly accurate: infinitely stiff modes end at zero (L-stable with R(∞) = 0)
    assert weights @ np.linalg.solve(beta, np.ones(s)) == pytest.approx(1.0, abs=1e-10)


@pytest.mark.parametrize("method", [RODAS, RODAS3], ids=lambda m: m.name)
def test_dense_output_fulfils_the_conditions_of_order_two(method: Method) -> None:
    s = len(method.alpha)
    a, c = np.zeros((2, s, s))
    for i in range(s):
        a[i, :i], c[i, :i] = method.a[i], method.c[i]
    gamma = np.linalg.inv(np.eye(s) / method.gamma - c)
    beta = a @ gamma + gamma
    end = np.append(method.a[-1], 1.0)
    for x in (0.2, 0.5, 0.9):
        bend = np.array(method.dense_2) + x * np.array(method.dense_3)
        weights = (x * end + x * (1.0 - x) * bend) @ gamma
        assert weights.sum() == pytest.approx(x, abs=1e-9)
        assert weights @ beta.sum(axis=1) == pytest.approx(x**2 / 2.0, abs=1e-9)


@pytest.fixture(scope="module")
def run() -> ModeRun:
    return solve_mode(load_case_text(CASE))


def test_the_cheap_method_stays_within_a_volt_or_a_percent(run: ModeRun) -> None:
    balance = run.balance
    start = np.zeros((2, len(balance.net.node_names)))
    times = np.linspace(1.0, 720.0, 300)
    for method in (RODAS, RODAS3):
        paths = march(balance, start, span_s=(0.0, 720.0), breaks_s=run.around.breaks_s,
                      tolerance=Tolerance(0.1, 1e-3, method))  # fmt: skip
        for rough, fine in zip(paths, run.trajectories, strict=True):
            a, b = balance.controlled(rough(times)), balance.controlled(fine(times))
            assert (np.abs(a - b) <= np.maximum(1.0, 0.01 * np.abs(b))).all(), method.name
            assert rough.attempts < fine.attempts


def test_extremes_gathered_on_the_way_are_those_of_the_steps(run: ModeRun) -> None:
    kept: list[Peaks] = []

    def record(balance: object, start: Array) -> Peaks:
        kept.append(Peaks(run.balance.controlled, start))
        return kept[0]

    without = solve_mode(load_case_text(CASE), record=record)
    assert without.trajectories == ()
    (peaks,) = kept
    for m, path in enumerate(run.trajectories):
        k = np.repeat(np.arange(len(path.step_s)), 6)
        theta = np.tile(np.arange(6) / 5.0, len(path.step_s))
        seen = run.balance.controlled(path.inside(k, theta))
        assert peaks.lowest[m] == pytest.approx(seen.min(axis=0), rel=1e-12, abs=1e-9)
        assert peaks.highest[m] == pytest.approx(seen.max(axis=0), rel=1e-12, abs=1e-9)
        assert np.array_equal(peaks.end[m], path.y_end[-1])
        assert peaks.count[m] == len(path.step_s)
        at = run.balance.controlled(path(peaks.lowest_s[m]))
        assert np.diag(at) == pytest.approx(peaks.lowest[m], rel=1e-6, abs=1e-6)


def test_a_march_without_a_step_says_when_where_and_what_to_try() -> None:
    with pytest.raises(NoSolutionError) as caught:
        solve_mode(load_case_text(CASE), tolerance=Tolerance(1e-40, 0.0))
    text = str(caught.value)
    assert caught.value.time is not None
    assert caught.value.time.endswith("Z")
    assert caught.value.surface in ("structure", "film")
    for part in ('mode "base"', "no step at", "residual current", "Try: halflit point"):
        assert part in text, text
