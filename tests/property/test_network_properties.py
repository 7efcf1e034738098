"""Invariants of networks: order and splitting of surfaces; the Jacobian at random states."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from charging.case import load_case_text
from charging.orbit_run import TOLERANCE, ModeRun, solve_mode

HEAD = """\
title = "Four surfaces"
[orbit]
kind = "fixed"
illumination = 0.3
sun_direction = [0.0, 0.6, 0.8]
duration_h = 0.3
[plasma]
use = "ECSS geostationary worst case"
[body]
radius_m = 1.2
barrier = false
[emission]
secondary_law = "sanders_inouye_1979"
"""


def surface(name: str, area: float, normal: str, *more: str, material: str) -> str:
    return "\n".join(
        ["[[surface]]", f'name = "{name}"', f'material = "{material}"', f"area_m2 = {area}",
         f"normal = {normal}", *more, ""]
    )  # fmt: skip


PANEL = surface("panel", 3.0, "[0.0, 0.0, -1.0]", material="oxidised aluminium")
GLASS = surface("glass", 2.0, "[0.0, 0.0, 1.0]", "thickness_m = 1e-4", "temperature_K = 300.0",
                material="cover glass")  # fmt: skip
FILM = ("thickness_m = 5e-5", "temperature_K = 320.0")
TAPE = surface("tape", 0.5, "[0.0, 1.0, 0.0]", *FILM, material="polyimide film")
HALVES = surface("tape 1", 0.2, "[0.0, 1.0, 0.0]", *FILM, material="polyimide film") + surface(
    "tape 2", 0.3, "[0.0, 1.0, 0.0]", *FILM, material="polyimide film"
)
PLATE = surface("plate", 0.5, "[0.0, 0.0, -1.0]", "floating = true", "capacitance_F = 2e-9",
                material="gold")  # fmt: skip
LINK = '[[link]]\nbetween = ["plate", "structure"]\nresistance_ohm = 1e9\n'
STRIP = surface("strip", 0.4, "[0.0, 0.2, 1.0]", material="oxidised aluminium")
TIMES = np.array([1e-3, 0.1, 5.0, 100.0, 600.0, 1080.0])


def run_of(*parts: str, barrier: bool = False) -> ModeRun:
    head = HEAD.replace("barrier = false\n", "") if barrier else HEAD
    return solve_mode(load_case_text(head + "".join(parts) + LINK))


def by_name(run: ModeRun, name: str) -> np.ndarray:
    volts = run.net.potentials(run.trajectories[0](TIMES))
    return np.asarray(volts[:, run.net.node_names.index(name)])


@pytest.fixture(scope="module")
def plain() -> ModeRun:
    return run_of(PANEL, GLASS, PLATE, TAPE)


def allowed(volts: np.ndarray) -> np.ndarray:
    """What two runs within the march's accuracy may differ: 0.1 V or 0.1 %."""
    return np.asarray(np.maximum(0.1, 1e-3 * np.abs(volts)))


def test_order_of_surfaces_changes_nothing(plain: ModeRun) -> None:
    other = run_of(TAPE, PLATE, GLASS, PANEL)
    assert other.net.node_names != plain.net.node_names
    for name in plain.net.node_names:
        a, b = by_name(plain, name), by_name(other, name)
        assert (np.abs(a - b) <= allowed(a)).all(), name


@pytest.fixture(scope="module")
def walled() -> ModeRun:
    """With barriers, and a panel beside the glass that it closes off."""
    return run_of(PANEL, GLASS, PLATE, TAPE, STRIP, barrier=True)


def test_order_of_surfaces_changes_nothing_behind_barriers(walled: ModeRun) -> None:
    assert walled.balance.barriers is not None
    y = walled.trajectories[0](TIMES)
    which = np.zeros(len(TIMES), dtype=np.intp)
    volts = walled.net.potentials(y)[:, walled.net.surface_node]
    found = walled.balance.barriers.heights_and_slopes(which, walled.net.potentials(y), volts)
    assert len(found.member)  # barriers act
    other = run_of(STRIP, TAPE, PLATE, GLASS, PANEL, barrier=True)
    for name in walled.net.node_names:
        a, b = by_name(walled, name), by_name(other, name)
        assert (np.abs(a - b) <= allowed(a)).all(), name


def test_a_surface_in_two_pieces_behind_barriers(walled: ModeRun) -> None:
    """Two half tapes at one place are seen as their mixture, here of equal potentials."""
    other = run_of(PANEL, GLASS, PLATE, HALVES, STRIP, barrier=True)
    for name in ("structure", "glass", "plate"):
        a, b = by_name(walled, name), by_name(other, name)
        assert (np.abs(a - b) <= allowed(a)).all(), name


def test_a_surface_in_two_pieces_is_the_same_surface(plain: ModeRun) -> None:
    other = run_of(PANEL, GLASS, PLATE, HALVES)
    for name in ("structure", "glass", "plate"):
        a, b = by_name(plain, name), by_name(other, name)
        assert (np.abs(a - b) <= allowed(a)).all(), name
    whole = by_name(plain, "tape")
    for name in ("tape 1", "tape 2"):
        assert (np.abs(by_name(other, name) - whole) <= allowed(whole)).all(), name


@pytest.mark.parametrize("empty", [False, True], ids=["as it is", "one area zero"])
def test_jacobian_at_a_thousand_random_states(plain: ModeRun, empty: bool) -> None:
    """Central differences with Richardson's extrapolation, signs and sizes of all kinds.

    Every third state has a surface at 0 V, where the escape of emitted electrons is rounded.
    """
    balance = plain.balance
    if empty:
        area = balance.net.area_m2.copy()
        area[1] = 0.0
        balance = replace(balance, net=replace(balance.net, area_m2=area))
    rng = np.random.default_rng(7)
    count, n = 1000, len(balance.net.node_names)
    y = rng.choice([-1.0, 1.0], (count, n)) * 10.0 ** rng.uniform(-1.0, 4.0, (count, n))
    y[::3, 0] = rng.uniform(-0.02, 0.02, len(y[::3]))
    y[::6, 1] = rng.uniform(-0.02, 0.02, len(y[::6]))
    which, times = np.zeros(count, dtype=np.intp), np.full(count, 1.0)
    rate, jacobian = balance.rhs_and_jacobian(which, times, y)
    assert np.abs(rate - balance.rhs(which, times, y)).max() <= 1e-13 * np.abs(rate).max()
    numeric = np.empty_like(jacobian)
    volts = balance.net.potentials(y)
    near = np.abs(volts).min(axis=1)
    h = np.minimum(1e-3 * np.maximum(1.0, near) ** 0.5, 0.02)
    for j in range(n):
        estimates = []
        for step in (h, 0.5 * h):
            move = np.zeros_like(y)
            move[:, j] = step
            up, down = balance.rhs(which, times, y + move), balance.rhs(which, times, y - move)
            estimates.append((up - down) / (2.0 * step[:, None]))
        numeric[:, :, j] = (4.0 * estimates[1] - estimates[0]) / 3.0
    scale = np.abs(numeric).max(axis=(1, 2))
    error = np.abs(jacobian - numeric).max(axis=(1, 2)) / scale
    # rounding of currents that cancel: 1e-16 of the gross current over the step
    gross = np.abs(rate).max(axis=1) * 1e-13 / (h * scale)
    print(f"largest error {error.max():.1e}, median {np.median(error):.1e}")
    # at the ends of the rounded corner (±0.05 V) and where the photoelectrons of a strong line
    # end, the curvature jumps: a difference across such a place errs by what it changes
    assert (error <= 1e-3 + gross).all()
    assert (error <= 2e-6 + gross).mean() > 0.98


def test_tolerance_is_what_the_comparisons_rest_on() -> None:
    assert TOLERANCE.absolute <= 0.1
    assert TOLERANCE.relative <= 1e-3
