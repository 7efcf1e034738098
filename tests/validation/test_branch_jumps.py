"""Triple roots of the Lin-Joy law: branches kept, jumps found at the folds of the balance.

The folds are found apart from the march: by minimising the net current of the direct path
over the potential and searching the strength of the injection at which the extremum is zero.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.constants import epsilon_0
from scipy.optimize import brentq, minimize_scalar

from charging.case import load_case_text
from charging.currents.surface import Setting, surface_currents
from charging.jump_rows import jump_rows
from charging.orbit_run import ModeRun, solve_mode

RISE_S, HOLD_S, DECAY_S = 600.0, 300.0, 1200.0
CASE = f"""\
title = "A dark sphere in an injection and its decay"
[orbit]
kind = "fixed"
illumination = 0.0
sun_direction = [0.0, 0.0, 1.0]
duration_h = 1.5
[plasma]
use = "quiet geostationary"
[[plasma.event]]
onset_h = 0.0
rise_min = {RISE_S / 60.0}
hold_min = {HOLD_S / 60.0}
decay_min = {DECAY_S / 60.0}
use = "ECSS geostationary worst case"
[body]
radius_m = 1.0
collection = "sphere"
[emission]
secondary_law = "lin_joy_2005"
[[surface]]
name = "sphere"
material = "oxidised aluminium"
area_m2 = 12.566
normal = [0.0, 0.0, 1.0]
"""


@pytest.fixture(scope="module")
def run() -> ModeRun:
    return solve_mode(load_case_text(CASE))


def net_current(run: ModeRun, volts: float, strength: float) -> float:
    """Net current density [A m-2] by the direct path."""
    setting = Setting(np.array([[1.0 - strength, strength]]), np.zeros((1, 1)))
    found = surface_currents(run.balance.models[0], np.array([[volts]]), setting)
    return float(found.by_mechanism.sum())


def fold(run: ModeRun, low_V: float, high_V: float, sign: float, between: tuple[float, float]
         ) -> tuple[float, float]:  # fmt: skip
    """Strength at which the extremum of the current inside a span is zero, and where it lies."""
    place = 0.0

    def extremum(strength: float) -> float:
        nonlocal place
        volts = np.linspace(low_V, high_V, 60)
        rough = [sign * net_current(run, float(v), strength) for v in volts]
        k = int(np.clip(np.argmin(rough), 1, len(volts) - 2))
        found = minimize_scalar(
            lambda v: sign * net_current(run, v, strength),
            bounds=(volts[k - 1], volts[k + 1]), method="bounded", options={"xatol": 1e-6},
        )  # fmt: skip
        place = float(found.x)
        return float(found.fun)

    strength = float(brentq(extremum, *between, xtol=1e-9))
    return strength, place


def passage_s(run: ModeRun, strength: float, volts: float, strength_rate: float) -> float:
    """How long after a fold the potential runs away [s].

    Near the fold C dV/dt = A (J_s s' t + J_VV (V - V_f)²/2), a Riccati equation whose solution
    on the branch that ends becomes infinite at 2.338 (first zero of the Airy function) over the
    cube root of (A/C)² |J_s s' J_VV|/2.
    """
    step, ds = 0.5 * max(1.0, abs(volts) / 100.0), 1e-4
    bend = (
        sum(w * net_current(run, volts + k * step, strength) for k, w in ((-1, 1), (0, -2), (1, 1)))
        / step**2
    )
    by_strength = (
        net_current(run, volts, strength + ds) - net_current(run, volts, strength - ds)
    ) / (2.0 * ds)
    ratio = 12.566 / (4.0 * np.pi * epsilon_0 * 1.0)
    return float(2.33811 / np.cbrt(ratio**2 * abs(by_strength * strength_rate * bend) / 2.0))


def test_three_roots_in_the_middle_of_the_injection(run: ModeRun) -> None:
    volts = np.concatenate([-np.geomspace(2e4, 1e-2, 400), np.geomspace(1e-2, 50.0, 100)])
    current = np.array([net_current(run, float(v), 0.2) for v in volts])
    assert (current[:-1] * current[1:] < 0.0).sum() == 3


def test_jumps_are_found_at_the_folds_and_the_right_branch_is_kept(run: ModeRun) -> None:
    down, up = run.jumps(0)
    # rising injection: the root near 0 V ends where the largest current above it is zero
    first, place = fold(run, -60.0, 0.5, -1.0, (0.25, 0.6))
    rising = first * RISE_S + passage_s(run, first, place, 1.0 / RISE_S)
    # fading injection: the kilovolt root ends where the smallest current around it is zero
    last, place = fold(run, -1500.0, -100.0, 1.0, (0.05, 0.2))
    fading = RISE_S + HOLD_S - DECAY_S * np.log(last)
    end = fading + passage_s(run, last, place, last / DECAY_S)
    print(
        f"folds {first * RISE_S:.2f} s, {fading:.2f} s; passed {rising:.2f} s, {end:.2f} s; "
        f"jumps {down.time_s:.2f} s, {up.time_s:.2f} s"
    )
    assert down.time_s == pytest.approx(rising, abs=1.0)
    assert up.time_s == pytest.approx(end, abs=1.0)
    path = run.trajectories[0]
    # between the folds three roots exist; which one holds depends on where it came from
    assert path(np.array([rising - 30.0]))[0, 0] > -20.0
    assert path(np.array([rising + 5.0]))[0, 0] < -2000.0
    assert path(np.array([end - 60.0]))[0, 0] < -300.0
    assert path(np.array([end + 5.0]))[0, 0] > 0.0
    for jump, before, after in ((down, -5.0, -2500.0), (up, -400.0, 1.0)):
        v = jump.before_V[jump.node], jump.after_V[jump.node]
        assert v[0] == pytest.approx(before, rel=0.7, abs=20.0)
        assert v[1] == pytest.approx(after, rel=0.3, abs=3.0)


def test_jumps_are_rows_of_the_summary(run: ModeRun) -> None:
    loaded = load_case_text(CASE)
    rows = jump_rows(loaded, run, 0)
    assert [row["surface"] for row in rows] == ["structure", "structure"]
    assert rows[0]["after_V"] < -1000.0 < rows[1]["after_V"]
    assert rows[0]["time"].endswith("Z")
    assert rows[0]["law"] == "lin_joy_2005"
