"""The quasi-steady quick look: balances of all currents, and its estimate of what it leaves out."""

from __future__ import annotations

import json
import sys
from pathlib import Path

import numpy as np
import pytest

from charging import cli
from charging.case import LoadedCase, load_case_text
from charging.currents.surface import Setting, surface_currents
from charging.orbit_run import solve_mode
from charging.quick_look import QuickMode, _lags, quick_document, quick_mode

DARK = """\
title = "A dark sphere with a film in an injection"
[orbit]
kind = "fixed"
illumination = 0.0
sun_direction = [0.0, 0.0, 1.0]
duration_h = 2.0
[plasma]
use = "quiet geostationary"
[[plasma.event]]
onset_h = 0.5
rise_min = 10.0
hold_min = 10.0
decay_min = 20.0
use = "ECSS geostationary worst case"
[body]
radius_m = 1.0
[emission]
secondary_law = "sanders_inouye_1979"
[[surface]]
name = "sphere"
material = "gold"
area_m2 = 12.0
normal = [0.0, 0.0, 1.0]
"""
FILM = """\
[[surface]]
name = "film"
material = "polyimide film"
area_m2 = 1.0
thickness_m = 1e-4
attached_to = "structure"
temperature_K = 300.0
normal = [1.0, 0.0, 0.0]
"""


def test_a_conductor_balances_its_currents_and_lags_by_nothing() -> None:
    """Net current by the direct path; the run as the judge: a sphere charges in milliseconds."""
    loaded = load_case_text(DARK)
    look = quick_mode(loaded)
    run = solve_mode(loaded)
    later = look.times_s > 0.0
    ours, theirs = look.state_V[0, later, 0], run.trajectories[0](look.times_s[later])[:, 0]
    assert ours.min() < -1000.0
    assert np.abs(ours - theirs).max() < 1.0
    lag = look.lag_V[0, later, 0]
    assert np.abs(lag).max() == pytest.approx(np.abs(ours - theirs).max(), rel=0.3)
    strength = run.around.strength(look.times_s)
    setting = Setting(strength, np.zeros((len(strength), 1)), np.zeros((len(strength), 1)))
    found = surface_currents(run.balance.models[0], look.surface_V[0], setting).by_mechanism
    net, gross = found.sum(axis=-1), np.abs(found).sum(axis=-1)
    assert np.abs(net / gross).max() < 1e-5


@pytest.fixture(scope="module")
def filmed() -> tuple[LoadedCase, QuickMode]:
    loaded = load_case_text(DARK + FILM)
    return loaded, quick_mode(loaded)


def test_a_film_lags_as_the_run_says(filmed: tuple[LoadedCase, QuickMode]) -> None:
    """A polyimide film follows an injection late; the estimate is of the right size and sign."""
    loaded, look = filmed
    run = solve_mode(loaded)
    left_out = run.trajectories[0](look.times_s) - look.state_V[0]
    film = left_out[:, 1]
    estimate = look.lag_V[0, :, 1]
    print(np.round(film), np.round(estimate))
    assert np.abs(film).max() > 200.0
    assert np.abs(estimate).max() == pytest.approx(np.abs(film).max(), rel=0.5)
    assert np.abs(estimate - film).max() < 0.5 * np.abs(film).max()
    large = np.abs(film) > 0.3 * np.abs(film).max()
    assert (np.sign(estimate[large]) == np.sign(film[large])).all()


def test_lag_of_a_linear_circuit() -> None:
    """C dV/dt = G (E - V), E rising evenly: V lags by C/G dE/dt in the end (closed form)."""
    times = np.linspace(0.0, 100.0, 201)
    capacitance, conductance, rise = 3.0, 2.0, 0.7
    states = (rise * times)[None, :, None]
    slopes = np.full((1, len(times), 1, 1), -conductance)
    lag = _lags(times, states, slopes, np.array([[[capacitance]]]), np.zeros((1, 1)))
    assert lag[0, -1, 0] == pytest.approx(-rise * capacitance / conductance, rel=1e-12)
    exact = -rise * capacitance / conductance * -np.expm1(-times * conductance / capacitance)
    assert np.abs(lag[0, :, 0] - exact).max() < 0.08 * rise * capacitance / conductance


def test_two_states_keep_to_the_branch_they_come_from() -> None:
    """Lin-Joy: the branch left in the injection differs from the one in its decay."""
    text = DARK.replace("sanders_inouye_1979", "lin_joy_2005").replace(
        '"gold"', '"oxidised aluminium"'
    )
    text = text.replace("[body]\nradius_m = 1.0", '[body]\nradius_m = 1.0\ncollection = "sphere"')
    loaded = load_case_text(text)
    look, run = quick_mode(loaded), solve_mode(loaded)
    jumps = run.jumps(0)
    assert jumps
    away = np.ones(len(look.times_s), dtype=np.bool_)
    for jump in jumps:
        away &= np.abs(look.times_s - jump.time_s) > 60.0
    away &= look.times_s > 0.0
    ours = look.state_V[0, away, 0]
    theirs = run.trajectories[0](look.times_s[away])[:, 0]
    assert np.abs(ours - theirs).max() < 0.1 + 1e-3 * np.abs(theirs).max()


def test_the_document_has_no_verdict_and_is_json(filmed: tuple[LoadedCase, QuickMode]) -> None:
    loaded, look = filmed
    document = quick_document(loaded, [look])
    assert "verdict" not in document
    assert "no verdict" in document["kind"]
    text = json.dumps(document, allow_nan=False)
    assert "largest_lag_V" in text
    row = document["modes"][0]["surfaces"][1]
    assert row["below_structure_V"] <= row["above_structure_V"]
    assert document["largest_lag_share"] > 0.1


@pytest.mark.parametrize("more", [[], ["--json"]])
def test_command(
    more: list[str],
    filmed: tuple[LoadedCase, QuickMode],
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    case = tmp_path / "case.toml"
    case.write_text(DARK + FILM)
    monkeypatch.chdir(tmp_path)
    monkeypatch.setattr("charging.quick_look.quick_mode", lambda *_: filmed[1])
    monkeypatch.setattr(sys, "argv", ["halflit", "run", str(case), "--quick", *more])
    with pytest.raises(SystemExit) as caught:
        cli.main()
    out, _ = capsys.readouterr()
    assert not caught.value.code
    assert list(tmp_path.iterdir()) == [case]
    if more:
        assert json.loads(out)["modes"][0]["surfaces"][1]["surface"] == "film"
    else:
        assert "No verdict" in out
        assert "It is large here" in out


def test_a_quick_look_writes_nothing_and_says_so(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    case = tmp_path / "case.toml"
    case.write_text(DARK)
    target = str(tmp_path / "there")
    monkeypatch.setattr(sys, "argv", ["halflit", "run", str(case), "--quick", "--out", target])
    with pytest.raises(SystemExit) as caught:
        cli.main()
    assert caught.value.code == 2
    assert "--out" in capsys.readouterr().err
