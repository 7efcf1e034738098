"""The march against scipy's Radau on the same right-hand side.

Within 0.1 V or 0.1 % at every output time outside of one output step around the jumps
that a run reports itself; a jump that is not reported is not excused.
"""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.integrate import solve_ivp

from charging.case import load_case, load_case_text
from charging.currents.emission import SECONDARY_LAWS
from charging.network.charge_balance import ChargeBalance
from charging.network.jumps import Jump, branch_jumps
from charging.network.march import Tolerance, march
from charging.orbit_run import TOLERANCE, CaseRun, ModeRun, solve_mode

Array = NDArray[np.float64]
CASES = Path(__file__).parents[2] / "cases"


def radau(
    balance: ChargeBalance, member: int, start: Array, marks: Array, times: Array, rtol: float
) -> Array:
    """States [T, n] at `times` by scipy's Radau, restarted at every mark (the kinks)."""
    one = np.array([member])
    solve = np.linalg.inv(balance.mass)

    def rate(t: float, y: Array) -> Array:
        return np.asarray(solve @ balance.rhs(one, np.array([t]), y[None])[0])

    def jacobian(t: float, y: Array) -> Array:
        return np.asarray(solve @ balance.rhs_and_jacobian(one, np.array([t]), y[None])[1][0])

    states = np.empty((len(times), len(start)))
    y = start
    for begin, end in pairwise(marks.tolist()):
        inside = (times >= begin) & (times <= end)
        found = solve_ivp(rate, (begin, end), y, method="Radau", jac=jacobian, rtol=rtol,
                          atol=1e-6 * rtol / 1e-8, dense_output=True)  # fmt: skip
        assert found.success, found.message
        if inside.any():
            states[inside] = found.sol(times[inside]).T
        y = found.y[:, -1]
    return states


def share_of_bar(balance: ChargeBalance, ours: Array, exact: Array) -> Array:
    """Largest error over absolute and differential potentials [T], 1 = 0.1 V or 0.1 %."""
    a, b = balance.controlled(ours), balance.controlled(exact)
    return np.asarray((np.abs(a - b) / np.maximum(0.1, 1e-3 * np.abs(b))).max(axis=-1))


def near_jumps(jumps: Sequence[Jump], times: Array) -> NDArray[np.bool_]:
    """Times [T] within an output step (60 s) of a jump that the run reports."""
    near = np.zeros(times.shape, dtype=np.bool_)
    for jump in jumps:
        near |= np.abs(times - jump.time_s) <= 60.0
    return near


def compare_with_radau(mode: ModeRun, member: int, begin: float, end: float, rtol: float) -> Array:
    path = mode.trajectories[member]
    breaks = [b for b in mode.around.breaks_s if begin < b < end]
    marks = np.array([begin, *breaks, end])
    times = mode.times_s[(mode.times_s >= begin) & (mode.times_s <= end)]
    start = path(np.array([begin]))[0]
    single = mode.balance.of(member)
    # the march runs anew from the same state, so that both solve the same problem
    (ours,) = march(single, start[None], span_s=(begin, end), breaks_s=breaks, tolerance=TOLERANCE)
    exact = radau(single, 0, start, marks, times, rtol)
    # jumps that are not reported are not excused
    jump = near_jumps(branch_jumps(single, 0, ours), times)
    error = share_of_bar(single, ours(times), exact)
    # near a jump the potential may be late or early by 1 s
    early, late = (np.clip(times + d, begin, end) for d in (-1.0, 1.0))
    a, b, c = (single.controlled(ours(t)) for t in (early, times, late))
    swing = np.maximum(np.maximum(np.abs(a - b), np.abs(c - b)), 0.1)
    shifted = (np.abs(b - single.controlled(exact)) / swing).max(axis=-1)
    print(
        f"worst {error[~jump].max():.3f} of the bar, "
        f"at {times[~jump][error[~jump].argmax()]:.0f} s; "
        f"near jumps {error[jump].max(initial=0.0):.3f}, {shifted[jump].max(initial=0.0):.3f} of "
        f"what 1 s moves; {jump.sum()} of {len(times)} times near a jump"
    )
    assert jump.mean() <= 0.05
    assert (shifted[jump] < 1.0).all()
    return np.asarray(error[~jump])


def test_eclipse_exit_inside_the_substorm_against_radau(demo_day: CaseRun) -> None:
    """Around the end of umbra, the stiffest stretch of the day."""
    mode = demo_day.modes[0]
    end = mode.around.eclipses[0].umbra_end
    assert end is not None
    assert compare_with_radau(mode, 1, end - 60.0, end + 200.0, 1e-7).max() < 1.0


@pytest.mark.slow
@pytest.mark.timeout(1800)
@pytest.mark.parametrize("member", [0, 1], ids=SECONDARY_LAWS)
def test_whole_demo_day_against_radau(demo_day: CaseRun, member: int) -> None:
    mode = demo_day.modes[0]
    assert compare_with_radau(mode, member, 0.0, 86400.0, 1e-10).max() < 1.0


OTHERS = sorted(
    path.name
    for path in CASES.glob("*.toml")
    if path.name != "geo_substorm_day.toml" and not path.stem.endswith("_study")
)


@pytest.mark.slow
@pytest.mark.timeout(3600)
@pytest.mark.parametrize("name", OTHERS)
def test_every_other_demo_case_against_radau(name: str) -> None:
    loaded = load_case(CASES / name)
    for mode in (None, *loaded.case.alternatives):
        run = solve_mode(loaded, mode)
        for member in range(len(run.members)):
            end = loaded.case.duration_s
            assert compare_with_radau(run, member, 0.0, end, 1e-10).max() < 1.0


# --- random spacecraft --------------------------------------------------------------------

CONDUCTORS = ("oxidised aluminium", "gold", "black paint, carbon-polyurethane", "graphite")
DIELECTRICS = ("cover glass", "polyimide film", "FEP film, silvered", "fused silica",
               "white paint, zinc oxide-silicone")  # fmt: skip
PLASMAS = ("ECSS geostationary worst case", "quiet geostationary", "substorm, 3 keV class",
           "NASA geostationary 90 percent")  # fmt: skip


def random_case(rng: np.random.Generator) -> str:
    """A spacecraft of 2 to 7 surfaces in fixed light with one event; half an hour."""
    lines = [
        'title = "Random spacecraft"',
        "[orbit]",
        'kind = "fixed"',
        f"illumination = {rng.choice([0.0, 1.0, round(float(rng.uniform(0.01, 0.99)), 3)])}",
        "sun_direction = [0.1, 0.3, 0.95]",
        "duration_h = 0.5",
        "[plasma]",
        f'use = "{rng.choice(PLASMAS)}"',
        'accept_assumed = "a test"',
        "[[plasma.event]]",
        "onset_h = 0.1",
        f"rise_min = {rng.uniform(0.5, 5.0):.2f}",
        f"hold_min = {rng.uniform(0.0, 10.0):.2f}",
        f"decay_min = {rng.uniform(1.0, 20.0):.2f}",
        f'use = "{rng.choice(PLASMAS)}"',
        "[body]",
        f"radius_m = {rng.uniform(0.3, 3.0):.3f}",
        "[emission]",
        f'secondary_law = "{rng.choice(SECONDARY_LAWS)}"',
    ]

    def surface(name: str, material: str, *more: str) -> None:
        normal = rng.normal(size=3)
        lines.extend(
            ["[[surface]]", f'name = "{name}"', f'material = "{material}"',
             f"area_m2 = {10.0 ** rng.uniform(-2.0, 1.0):.4f}",
             f"normal = {(normal / np.linalg.norm(normal)).round(6).tolist()}", *more]
        )  # fmt: skip

    surface("body", rng.choice(CONDUCTORS))
    below = ["structure"]
    if rng.random() < 0.5:
        surface("plate", rng.choice(CONDUCTORS), "floating = true",
                f"capacitance_F = {10.0 ** rng.uniform(-10.0, -8.0):.3e}")  # fmt: skip
        below.append("plate")
    for i in range(int(rng.integers(1, 6))):
        surface(
            f"film {i}",
            rng.choice(DIELECTRICS),
            f"thickness_m = {10.0 ** rng.uniform(-4.7, -3.0):.3e}",
            f'attached_to = "{rng.choice(below)}"',
            f"temperature_K = {rng.uniform(180.0, 360.0):.1f}",
        )
    if len(below) > 1 and rng.random() < 0.5:
        lines += ["[[link]]", 'between = ["plate", "structure"]',
                  f"resistance_ohm = {10.0 ** rng.uniform(7.0, 12.0):.3e}"]  # fmt: skip
    return "\n".join(lines) + "\n"


def check_random_spacecraft(seed: int, rtol: float) -> None:
    run = solve_mode(load_case_text(random_case(np.random.default_rng(seed))))
    assert compare_with_radau(run, 0, 0.0, 1800.0, rtol).max() < 1.0


def test_a_random_spacecraft_against_radau() -> None:
    check_random_spacecraft(1, 1e-8)


@pytest.mark.slow
@pytest.mark.timeout(600)
@pytest.mark.parametrize("seed", range(100, 150))
def test_fifty_random_spacecraft_against_radau(seed: int) -> None:
    check_random_spacecraft(seed, 1e-10)


@pytest.mark.slow
def test_error_falls_with_the_tolerance_at_the_order_of_the_method() -> None:
    """Steps grow as tolerance^(-1/4) for order 4, as ^(-1/3) where stiffness takes one order."""
    run = solve_mode(load_case_text(random_case(np.random.default_rng(1))))
    balance = run.balance.of(0)
    start = np.zeros((1, len(balance.net.node_names)))
    times = np.linspace(1.0, 1800.0, 60)
    paths = {
        t: march(balance, start, span_s=(0.0, 1800.0), breaks_s=run.around.breaks_s,
                 tolerance=Tolerance(t, 0.0))[0]
        for t in (1e-6, 1e-4, 1e-2)
    }  # fmt: skip
    best = balance.controlled(paths[1e-6](times))
    errors = [np.abs(balance.controlled(paths[t](times)) - best).max() for t in (1e-4, 1e-2)]
    print(errors, [path.attempts for path in paths.values()])
    assert errors[0] < 0.1 * errors[1]
    ratio = len(paths[1e-6].step_s) / len(paths[1e-2].step_s)
    assert 7.0 < ratio < 30.0  # (1e4)^(1/4) = 10, (1e4)^(1/3) = 21.5
