"""Cold, dense plasma: the corner at 0 V, shielded barriers, wakes without light ions, regions."""

import json
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from typer.testing import CliRunner

from charging.case import load_case_text
from charging.cli import app
from charging.currents.barrier import escape_height
from charging.currents.barrier_field import Heights
from charging.currents.collection import ROUNDING_V, rounded_pull
from charging.currents.shielding import shielded, shielded_height, vacuum_share
from charging.orbit_run import CaseRun, solve_mode
from charging.results import mode_document
from charging.summary import mode_summary
from charging.wakes import heavy_plasmas

CASES = Path(__file__).parents[2] / "cases"

LOW_ORBIT = """
title = "a wake side in oxygen"
[orbit]
kind = "kepler"
epoch = 2031-03-20T12:00:00Z
semi_major_axis_km = 6730.0
eccentricity = 0.0
inclination_deg = 10.0
raan_deg = 0.0
argument_of_perigee_deg = 0.0
mean_anomaly_deg = 0.0
[time]
duration_h = 0.05
output_step_s = 60.0
[sun]
f107 = 200.0
[attitude]
law = "nadir"
[plasma]
model = "regions"
accept_assumed = "a test"
[body]
radius_m = 1.0
[emission]
secondary_law = "sanders_inouye_1979"
[[surface]]
name = "ram"
material = "oxidised aluminium"
area_m2 = 3.0
normal = [1.0, 0.0, 0.0]
[[surface]]
name = "lee film"
material = "polyimide film"
area_m2 = 3.0
thickness_m = 25e-6
temperature_K = 290.0
normal = [-1.0, 0.0, 0.0]
"""


def test_rounded_corner_is_smooth_and_exact_outside() -> None:
    pull = np.linspace(-0.08, 0.08, 1601)
    for temperature in (0.1, 0.5, 3.0):
        half = min(ROUNDING_V, 0.25 * temperature)
        value, slope = rounded_pull(pull, np.array(temperature))
        outside = np.abs(pull) >= half
        assert np.array_equal(value[outside], np.maximum(pull, 0.0)[outside])
        assert (value >= np.maximum(pull, 0.0)).all()
        assert (value - np.maximum(pull, 0.0)).max() <= 0.137 * half
        h = 1e-6
        up, down = (rounded_pull(pull + d, np.array(temperature))[0] for d in (h, -h))
        assert slope == pytest.approx((up - down) / (2.0 * h), abs=1e-6)
        # the attracting and the repelling part add up to the potential
        assert value - rounded_pull(-pull, np.array(temperature))[0] == pytest.approx(pull)
    hot = rounded_pull(pull, np.array(50.0))[0]
    assert np.array_equal(hot, np.maximum(pull, 0.0))


def test_barriers_fade_with_the_debye_length() -> None:
    share = vacuum_share(np.array([[0.005], [0.1], [0.3], [1.0], [9.0]]) ** 2, np.ones((5, 1)))
    assert share.ravel()[[0, 1]].tolist() == [0.0, 0.0]
    assert 0.0 < share[2, 0] < 1.0
    assert share.ravel()[[3, 4]].tolist() == [1.0, 1.0]
    own, whole = np.full((5, 1), 0.5), np.full((5, 1), 4.0)
    height = shielded_height(own, whole, share)
    assert height[0, 0] == 0.5
    assert height[4, 0] == 4.0
    found = Heights(whole, 0.0 * own, np.arange(5), np.zeros(5, dtype=np.intp), np.ones((5, 2)))
    part = shielded(found, (own, own), share)
    assert part.rows[:, 0] == pytest.approx(share.ravel())
    assert part.height_V == pytest.approx(height)


@pytest.fixture(scope="module")
def low_orbit() -> CaseRun:
    loaded = load_case_text(LOW_ORBIT)
    return CaseRun(loaded, (solve_mode(loaded),))


def test_no_barrier_stands_in_the_dense_ionosphere(low_orbit: CaseRun) -> None:
    (mode,) = low_orbit.modes
    times = np.array([60.0, 120.0])
    setting, _ = mode.around.at(times)
    state = mode.trajectories[0](times)
    heights = mode.balance.heights(np.zeros(2, dtype=np.intp), state, setting)
    potential = mode.net.potentials(state)[:, mode.net.surface_node]
    assert mode.balance.barriers is not None
    assert np.array_equal(heights, escape_height(potential)[0])


def test_jacobian_holds_at_0_V(low_orbit: CaseRun) -> None:
    balance = low_orbit.modes[0].balance
    member, time = np.zeros(1, dtype=np.intp), np.array([60.0])
    for volts in (-0.03, 0.0, 0.02):
        y = np.array([[volts, 0.01]])
        _, jacobian = balance.rhs_and_jacobian(member, time, y)
        for k, step in enumerate(1e-6 * np.eye(2)):
            change = balance.rhs(member, time, y + step) - balance.rhs(member, time, y - step)
            assert jacobian[0, :, k] == pytest.approx(change[0] / 2e-6, rel=1e-4)


def test_no_voltage_is_given_in_a_wake_of_oxygen_alone(low_orbit: CaseRun) -> None:
    (mode,) = low_orbit.modes
    along = mode.around.along
    assert along is not None
    assert along.unfed_wakes().tolist() == [False, True]
    document = mode_document(low_orbit.loaded, mode, mode_summary(low_orbit.loaded, mode))
    ram, lee = document["surfaces"]
    assert ram["lowest_V"] < 0.0
    assert lee["lowest_V"] is None
    assert lee["worst_normal_V"] is None
    assert lee["verdict"] == "not assessable"
    assert "wake ion current not assessable" in " ".join(document["sentences"])


def test_orbit_command_lists_the_regions() -> None:
    done = CliRunner().invoke(app, ["orbit", str(CASES / "gto_transfer.toml"), "--json"])
    assert done.exit_code == 0, done.output
    regions = json.loads(done.stdout)["regions"]
    names = [stay["region"] for stay in regions]
    # perigee in the ionosphere, apogee in the plasma sheet, and the same way back
    assert names == names[::-1]
    assert names[0] == "ionosphere"
    assert names[len(names) // 2] == "plasma sheet"
    for stay, following in pairwise(regions):
        assert stay["end"] == following["start"]


@pytest.mark.parametrize(
    ("before", "after", "where"),
    [
        ("0.728,0.250,0.125", "nan,0.250,0.125", "measured_moments.csv:4"),
        ("0.728,0.250,0.125", "-0.728,0.250,0.125", "measured_moments.csv:4"),
        ("electron_density_cm3", "elektron_density_cm3", "measured_moments.csv:3"),
        ("2031-09-23T18:05:00Z", "2031-09-23T18:00:01Z", "gap"),
    ],
    ids=["nan", "negative", "name", "gap"],
)
def test_a_bad_timeline_ends_the_command_with_its_line(
    tmp_path: Path, before: str, after: str, where: str
) -> None:
    name = "anomaly_measured_moments.toml"
    (tmp_path / name).write_text((CASES / name).read_text(encoding="utf-8"), encoding="utf-8")
    rows = (CASES / "measured_moments.csv").read_text(encoding="utf-8")
    if where == "gap":  # four rows fewer
        lines = rows.splitlines(keepends=True)
        rows, where = "".join([*lines[:4], *lines[8:]]), "measured_moments.csv:5"
    else:
        assert before in rows
        rows = rows.replace(before, after, 1)
    (tmp_path / "measured_moments.csv").write_text(rows, encoding="utf-8")
    done = CliRunner().invoke(app, ["case", "check", str(tmp_path / name)])
    said = done.output + (str(done.exception) if done.exception else "")
    assert done.exit_code != 0
    assert where in said


def test_a_plasma_of_oxygen_alone_is_named_in_low_orbit() -> None:
    low = LOW_ORBIT.replace(
        'model = "regions"\naccept_assumed = "a test"', 'use = "ECSS auroral worst case"'
    )
    loaded = load_case_text(low)
    assert heavy_plasmas(solve_mode(loaded)) == ("ECSS auroral worst case",)
    high = load_case_text(low.replace("6730.0", "42164.0"))
    assert heavy_plasmas(solve_mode(high)) == ()
