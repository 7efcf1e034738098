"""Emitters on demand and clamps: where they hold structure, their slopes, what is refused."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray

from charging.case import load_case_text
from charging.errors import InputError
from charging.network.emitters import CLAMP_WIDTH_V, clamp_share, demanded_share
from charging.orbit_run import ModeRun, solve_mode

Array = NDArray[np.float64]

CASE = """\
title = "On demand"
[orbit]
kind = "fixed"
illumination = 0.0
sun_direction = [0.0, 0.0, 1.0]
duration_h = 0.1
[time]
output_step_s = 60.0
[emission]
secondary_law = "sanders_inouye_1979"
[plasma]
use = "ECSS geostationary worst case"
[body]
radius_m = 1.0
barrier = false
[[surface]]
name = "body"
material = "gold"
area_m2 = 4.0
normal = [0.0, 0.0, 1.0]
[[emitter]]
name = "gun"
current_A = {current}
energy_eV = 300.0
{more}
"""


def solved(current: float, more: str) -> ModeRun:
    return solve_mode(load_case_text(CASE.format(current=current, more=more)))


def end(mode: ModeRun) -> float:
    return float(mode.trajectories[0].y_end[-1, 0])


def test_slopes_are_derivatives_and_shares_are_those_described() -> None:
    volts, step = np.linspace(-150.0, 50.0, 1001), 1e-5
    for function, level in ((demanded_share, -60.0), (demanded_share, 0.0), (clamp_share, -20.0)):
        at = np.array(level)
        share, slope = function(volts, at)
        up, down = (function(volts + s * step, at)[0] for s in (1.0, -1.0))
        assert slope == pytest.approx((up - down) / (2.0 * step), abs=1e-4)
        assert (slope <= 0.0).all()
        if function is demanded_share:
            assert (share[volts >= level] == 0.0).all()
            assert (share[volts <= level - max(0.05 * abs(level), 0.5)] == 1.0).all()
    assert demanded_share(volts, np.array(np.inf))[0].min() == 1.0
    assert clamp_share(volts, np.array(np.nan))[0].min() == 1.0


def test_a_threshold_holds_structure_at_its_edge_and_rests_above() -> None:
    held = solved(1e-3, "below_V = -100.0")
    assert -105.0 <= end(held) <= -100.0
    flows = held.balance.flows(0, np.array([300.0]), np.array([[-90.0]]))
    assert flows.emitter_A[0, 0] == 0.0
    # too weak a current cannot hold it: it gives all it has
    weak = solved(1e-7, "below_V = -100.0")
    flows = weak.balance.flows(0, np.array([300.0]), np.array([[end(weak)]]))
    assert end(weak) < -1000.0
    assert flows.emitter_A[0, 0] == 1e-7


def test_a_clamp_carries_what_the_plasma_brings() -> None:
    """tanh((target - V)/width) of the largest current is what the surfaces collect."""
    mode = solved(1e-3, "hold_V = -20.0")
    at = np.array([[end(mode)]])
    flows = mode.balance.flows(0, np.array([300.0]), at)
    plasma = float(flows.surface_A_m2.sum() * 4.0)
    assert plasma < 0.0
    assert end(mode) == pytest.approx(-20.0 - CLAMP_WIDTH_V * np.arctanh(-plasma / 1e-3), abs=0.01)
    # and pulls down what stands above
    assert mode.balance.flows(0, np.array([0.0]), np.array([[0.0]])).emitter_A[0, 0] < -9e-4


def test_a_list_of_a_mode_replaces_schedules_but_not_demand() -> None:
    more = 'from_h = 0.09\nbelow_V = -100.0\n[[mode]]\nname = "on"\nalternative = true\n'
    loaded = load_case_text(CASE.format(current=1e-3, more=more + 'emitters = ["gun"]\n'))
    base, on = (solve_mode(loaded, mode) for mode in (None, loaded.case.alternatives[0]))
    early = np.array([200.0])
    assert float(base.trajectories[0](early)[0, 0]) < -1000.0
    assert -105.0 <= float(on.trajectories[0](early)[0, 0]) <= -100.0


@pytest.mark.parametrize(
    ("more", "words"),
    [
        ("below_V = -10.0\nhold_V = -20.0", "beside hold_V"),
        ("hold_V = 200.0", "at most 150"),
        ("below_V = 1e6", "below_V"),
    ],
)
def test_refused(more: str, words: str) -> None:
    with pytest.raises(InputError, match=words):
        load_case_text(CASE.format(current=1e-3, more=more))
