"""Emitters on structure: cut-off, schedule, charge, what the output shows."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray

from charging.case import load_case_text
from charging.dataset import ALL_MECHANISMS, mode_dataset
from charging.errors import InputError
from charging.network.emitters import leaving_share
from charging.orbit_run import CaseRun, run_case
from charging.results import sentences
from charging.summary import mode_summary

Array = NDArray[np.float64]

CASE = """\
title = "Emitter"
[orbit]
kind = "fixed"
illumination = 0.0
sun_direction = [0.0, 0.0, 1.0]
[time]
duration_h = 2.0
output_step_s = 60.0
[emission]
secondary_law = "sanders_inouye_1979"
[plasma]
use = "ECSS geostationary worst case"
[body]
radius_m = 1.0
[[surface]]
name = "body"
material = "gold"
area_m2 = 4.0
normal = [0.0, 0.0, 1.0]
[[surface]]
name = "panel"
material = "oxidised aluminium"
area_m2 = 2.0
normal = [0.0, 1.0, 0.0]
[[surface]]
name = "film"
material = "polyimide film"
area_m2 = 1.0
thickness_m = 5e-5
temperature_K = 300.0
normal = [0.0, 0.0, -1.0]
"""
EMITTER = """\
[[emitter]]
name = "cathode"
current_A = {current}
energy_eV = {energy}
{more}
"""


def run(current: float, energy: float = 200.0, more: str = "") -> CaseRun:
    text = CASE + EMITTER.format(current=current, energy=energy, more=more)
    return run_case(load_case_text(text))


def structure(solved: CaseRun, times: Array) -> Array:
    mode = solved.modes[0]
    return np.asarray(mode.net.potentials(mode.trajectories[0](times))[:, 0])


@pytest.mark.parametrize("energy", [0.2, 5.0, 200.0, 3e4])
def test_no_current_leaves_above_the_energy_and_the_slope_is_the_derivative(energy: float) -> None:
    volts = np.concatenate([np.linspace(-1e5, 2.0 * energy, 401), [energy, 0.0]])
    share, slope = leaving_share(volts, np.array(energy))
    assert (share[volts >= energy] == 0.0).all()
    assert (share[volts <= 0.0] == 1.0).all()
    assert (np.diff(share[:401]) <= 0.0).all()
    inner = energy - np.linspace(1e-3, 0.999, 97) * min(max(0.05 * energy, 0.5), energy)
    step = 1e-6 * energy
    above, below = (leaving_share(inner + s, np.array(energy))[0] for s in (step, -step))
    numeric = (above - below) / (2.0 * step)
    assert leaving_share(inner, np.array(energy))[1] == pytest.approx(numeric, rel=1e-4, abs=1e-7)
    assert slope.max() <= 0.0


def test_jacobian_holds_the_emitter() -> None:
    (mode,) = run(1e-4).modes
    balance = mode.balance
    time, member = np.array([3000.0]), np.zeros(1, dtype=np.intp)
    for volts in (-2000.0, 150.0, 193.0, 197.5, 250.0):
        y = np.array([[volts, 3.0]])
        _, jacobian = balance.rhs_and_jacobian(member, time, y)
        for k in range(2):
            step = np.zeros((1, 2))
            step[0, k] = 1e-4
            up, down = (balance.rhs(member, time, y + s * step) for s in (1.0, -1.0))
            numeric = (up - down)[0] / 2e-4
            scale = np.abs(jacobian).max()
            assert jacobian[0, :, k] == pytest.approx(numeric, abs=2e-4 * scale)


def test_a_strong_emitter_holds_structure_just_below_its_energy() -> None:
    dark = run_case(load_case_text(CASE))
    end = np.array([7200.0])
    assert structure(dark, end)[0] < -5000.0
    held = structure(run(1e-2), end)[0]
    assert 190.0 < held < 200.0  # within the 5 % of the cut-off


def test_a_weak_emitter_adds_its_current_to_the_balance() -> None:
    """Net current without it at the potential reached is what it gives."""
    current = 1.5e-6
    solved = run(current)
    (mode,) = solved.modes
    end = np.array([7200.0])
    state = mode.trajectories[0](end)
    flows = mode.balance.flows(0, end, state)
    assert flows.emitter_A[0] == pytest.approx([current])
    surfaces = (flows.surface_A_m2.sum(axis=-1) * mode.net.area_m2)[0, :2].sum()
    film = float(flows.film_A_m2[0, 0] * mode.net.area_m2[2])
    assert surfaces - film == pytest.approx(-current, rel=0.02)
    raised = structure(solved, end)[0] - structure(run_case(load_case_text(CASE)), end)[0]
    assert raised > 100.0


def test_schedule_and_modes_switch_emitters() -> None:
    solved = run(1e-3, more="from_h = 0.5\nto_h = 1.0")
    (mode,) = solved.modes
    times = np.array([1790.0, 1800.0, 3590.0, 3600.0])
    assert mode.around.emitting(times).tolist() == [[0.0], [1.0], [1.0], [0.0]]
    assert {1800.0, 3600.0} <= set(mode.around.breaks_s)
    volts = structure(solved, np.array([1799.0, 3599.0, 7200.0]))
    assert volts[0] < -1000.0
    assert 190.0 < volts[1] < 200.0
    assert volts[2] < -1000.0
    more = '[[mode]]\nname = "off"\nfrom_h = 0.75\nto_h = 1.5\nemitters = []\n'
    off = run(1e-3, more=more).modes[0].around
    assert off.emitting(np.array([0.0, 2700.0, 5400.0])).tolist() == [[1.0], [0.0], [1.0]]
    on = '[[mode]]\nname = "on"\nalternative = true\nemitters = ["cathode"]\n'
    base, alternative = run(1e-3, more="from_h = 1.0\n" + on).modes
    assert base.around.emitting(np.array([0.0])).tolist() == [[0.0]]
    assert alternative.around.emitting(np.array([0.0])).tolist() == [[1.0]]


def test_output_shows_the_emitter_and_charge_is_kept() -> None:
    solved = run(1e-3, more="from_h = 0.5\nto_h = 1.0")
    (mode,) = solved.modes
    dataset = mode_dataset(solved, mode)
    assert dataset.attrs["charge_audit_relative"] < 1e-4
    bias = dataset.current_density[ALL_MECHANISMS.index("bias_or_emitter")]
    area = dataset.surface_area.values
    given = (bias.values * area[:, None]).sum(axis=0)
    assert given == pytest.approx(dataset.emitter_current.values, rel=1e-12, abs=1e-18)
    # on the faces that are structure, evenly by area; none on the film
    assert (bias.values[2] == 0.0).all()
    assert bias.values[0] == pytest.approx(bias.values[1])
    before = (dataset.time.values - dataset.time.values[0]) / np.timedelta64(1, "s") < 1800.0
    assert (dataset.emitter_current.values[before] == 0.0).all()
    # the beam first lifts structure at its full current
    assert dataset.emitter_current.values.max() == pytest.approx(1e-3)


def test_sentences_name_the_emitter() -> None:
    solved = run(2e-6)
    (mode,) = solved.modes
    summary = mode_summary(solved.loaded, mode)
    said = " ".join(sentences(solved.loaded, mode, summary))
    assert "emitter 'cathode' gives structure +2 µA" in said


@pytest.mark.parametrize(
    ("emitter", "words"),
    [
        ('name = "e"\ncurrent_A = -1e-6\nenergy_eV = 100.0', "out of range"),
        ('name = "e"\ncurrent_A = 1e-6\nenergy_eV = 0.0', "out of range"),
        ('name = "e"\ncurrent_A = 1e-6\nenergy = "3 V"', "no unit of energy"),
        ('name = "e"\ncurrent_A = 1e-6\nenergy_eV = 10.0\nfrom_h = 3.0', "no time of the run"),
        ('name = "e"\ncurrent_A = 1e-6', "energy_eV is missing"),
    ],
)
def test_refused_emitters(emitter: str, words: str) -> None:
    with pytest.raises(InputError, match=words) as caught:
        load_case_text(CASE + "[[emitter]]\n" + emitter + "\n")
    assert caught.value.line is not None
