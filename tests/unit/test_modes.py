"""Modes that hold over an interval: what they switch, how the march meets them."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray

from charging.case import load_case_text
from charging.dataset import mode_dataset
from charging.errors import InputError
from charging.flight import path
from charging.orbit_run import CaseRun, run_case
from charging.result_plasma import REGION_MASKS
from charging.results import summary_document
from charging.summary import case_summaries
from charging.surroundings import output_times, surroundings

Array = NDArray[np.float64]

FIXED = """\
title = "Modes"
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
use = "NASA geostationary 90 percent"
[body]
radius_m = 1.0
[[surface]]
name = "body"
material = "gold"
area_m2 = 4.0
normal = [0.0, 0.0, 1.0]
[[surface]]
name = "film"
material = "polyimide film"
area_m2 = 1.0
thickness_m = 5e-5
temperature_K = 300.0
normal = [0.0, 0.0, -1.0]
"""
GEO = """\
[orbit]
kind = "kepler"
epoch = 2031-06-21T00:00:00Z
semi_major_axis_km = 42164.17
eccentricity = 0.0
inclination_deg = 0.0
raan_deg = 0.0
argument_of_perigee_deg = 0.0
mean_anomaly_deg = 0.0
[time]
duration_h = 12.0
"""
FACES = """\
[plasma]
use = "quiet geostationary"
[body]
radius_m = 1.0
[[surface]]
name = "south"
material = "gold"
area_m2 = 1.0
normal = [0.0, 1.0, 0.0]
[[surface]]
name = "front"
material = "gold"
area_m2 = 1.0
tracks_sun = true
side = "front"
[[surface]]
name = "back"
material = "gold"
area_m2 = 1.0
tracks_sun = true
side = "back"
"""


def run(text: str) -> CaseRun:
    return run_case(load_case_text(text))


def states(solved: CaseRun, times: Array, number: int = 0) -> Array:
    mode = solved.modes[number]
    return np.asarray(mode.net.potentials(mode.trajectories[0](times)))


PLASMA = """\
[[mode]]
name = "storm"
from_h = 0.5
to_h = 1.5
plasma = "ECSS geostationary worst case"
"""


def test_an_interval_switches_the_plasma_and_no_other_time_changes() -> None:
    base, switched = run(FIXED), run(FIXED + PLASMA)
    before = np.linspace(0.0, 1800.0, 50)
    one, two = states(base, before), states(switched, before)
    assert np.abs(one - two).max() <= np.maximum(0.1, 1e-3 * np.abs(one)).max()
    share = switched.modes[0].around.strength(
        np.array([0.0, np.nextafter(1800.0, 0.0), 1800.0, np.nextafter(5400.0, 0.0), 5400.0])
    )
    assert share.tolist() == [[1, 0], [1, 0], [0, 1], [0, 1], [1, 0]]
    # a conductor forgets within seconds: structure ends each stretch where a case of that
    # plasma alone stands
    alone = run(FIXED.replace("NASA geostationary 90 percent", "ECSS geostationary worst case"))
    moment = np.array([1795.0])
    assert states(switched, moment)[0, 0] == pytest.approx(states(base, moment)[0, 0], rel=1e-3)
    deep = states(switched, np.array([5390.0]))[0, 0]
    assert deep == pytest.approx(states(alone, np.array([7200.0]))[0, 0], rel=0.05)
    assert abs(deep - states(base, moment)[0, 0]) > 500.0


def test_the_march_steps_onto_the_edges_and_not_over_them() -> None:
    solved = run(FIXED + PLASMA)
    (mode,) = solved.modes
    (trajectory,) = mode.trajectories
    ends = trajectory.start_s + trajectory.step_s
    for edge in (1800.0, 5400.0):
        assert edge in mode.around.breaks_s
        assert edge in trajectory.start_s
        k = int(np.flatnonzero(trajectory.start_s == edge)[0])
        # no crumbling before the jump: the last step is as long as those before it
        assert trajectory.step_s[k - 1] > 10.0
        assert np.isclose(ends[k - 1], edge, rtol=0.0, atol=1e-9)
        assert edge in mode.times_s
    assert trajectory.attempts < 1.3 * len(trajectory.step_s)
    dataset = mode_dataset(solved, mode)
    assert float(dataset.attrs["charge_audit_relative"]) < 1e-4
    flag = REGION_MASKS["mode_interval"]
    held = (dataset.region.values & flag) != 0
    times = (dataset.time.values - dataset.time.values[0]) / np.timedelta64(1, "s")
    assert np.array_equal(held, (times >= 1800.0) & (times < 5400.0))


def test_jump_against_an_implicit_solver() -> None:
    from scipy.integrate import solve_ivp

    solved = run(FIXED + PLASMA)
    (mode,) = solved.modes
    balance = mode.balance
    inverse = np.linalg.inv(balance.mass)

    def rate(t: float, y: Array) -> Array:
        time = np.array([min(max(t, low), high)])
        return np.asarray(inverse @ balance.rhs(np.zeros(1, dtype=np.intp), time, y[None])[0])

    y = np.zeros(2)
    for low, high in ((0.0, np.nextafter(1800.0, 0.0)), (1800.0, np.nextafter(5400.0, 0.0))):
        exact = solve_ivp(rate, (low, high), y, method="Radau", rtol=1e-9, atol=1e-7)
        y = exact.y[:, -1]
        ours = mode.trajectories[0](np.array([high]))[0]
        assert np.abs(ours - y).max() <= max(0.1, 1e-3 * float(np.abs(y).max()))


def test_events_can_be_left_out_of_an_interval() -> None:
    event = """\
[[plasma.event]]
onset_h = 0.25
rise_min = 1.0
hold_min = 60.0
decay_min = 5.0
use = "ECSS geostationary worst case"
"""
    text = FIXED.replace("[body]", event + "[body]")
    quiet = '[[mode]]\nname = "calm"\nfrom_h = 0.5\nto_h = 0.75\nevents = false\n'
    around = run(text + quiet).modes[0].around
    share = around.strength(np.array([1200.0, 1800.0, 2000.0, 2700.0]))
    assert share[:, 1].tolist() == [1.0, 0.0, 0.0, 1.0]


def test_light_of_a_fixed_case_can_change() -> None:
    sun = '[[mode]]\nname = "sun"\nfrom_h = 1.0\nto_h = 1.5\nillumination = 1.0\n'
    # without the barrier that the film, charged in the dark, raises before the lit body
    free = FIXED.replace("radius_m = 1.0", "radius_m = 1.0\nbarrier = false")
    solved = run(free + sun + "sun_direction = [1.0, 0.0, 1.0]\n")
    (mode,) = solved.modes
    light = mode.around.at(np.array([0.0, 3599.9, 3600.0, 5399.9, 5400.0]))[0].light
    assert light[:, 0] == pytest.approx([0.0, 0.0, np.sqrt(0.5), np.sqrt(0.5), 0.0])
    assert states(solved, np.array([5399.0]))[0, 0] > 0.0 > states(solved, np.array([3599.0]))[0, 0]


# --- attitude and wings ---------------------------------------------------------------------


def cosines(text: str, times: list[float]) -> Array:
    loaded = load_case_text('title = "x"\n' + GEO + FACES + text)
    return path(loaded.case).snapshot(np.array(times)).signed_cosine


def test_attitude_switches_over_an_interval() -> None:
    yaw = '[[mode]]\nname = "yaw"\nfrom_h = 2.0\nto_h = 4.0\nattitude = {law = "yaw steering"}\n'
    one = cosines(yaw, [7199.0, 7200.0, 10000.0, 14400.0])
    tilt = np.sin(np.radians(23.44))
    # nadir: the northern summer's Sun stands 23.4 deg from the orbit plane; yaw steering turns
    # the body so that wings face it fully and y never sees it
    assert one[0] == pytest.approx([-tilt, 0.0, 0.0, -tilt], abs=1e-3)
    assert one[1] == pytest.approx([np.cos(np.radians(23.44)), 1.0, 1.0,
                                    np.cos(np.radians(23.44))], abs=1e-3)  # fmt: skip
    loaded = load_case_text('title = "x"\n' + GEO + FACES + yaw)
    around = surroundings(loaded.case, None, [])
    assert {7200.0, 14400.0} <= set(around.breaks_s)
    edge = np.array([np.nextafter(7200.0, 0.0), 7200.0])
    assert around.at(edge)[0].light[:, 1] == pytest.approx(one[1, :2], abs=2e-5)
    near = output_times(loaded.case, around)
    assert np.diff(near[np.abs(near - 7200.0) <= 30.0]).max() <= 1.0


def test_parked_wings_stand_off_the_sun_or_on_the_body() -> None:
    off = '[[mode]]\nname = "p"\nfrom_h = 1.0\nto_h = 2.0\narray = "parked"\n'
    one = cosines(off + "parked_sun_angle_deg = 60.0\n", [0.0, 4000.0])
    assert one[1, 1] == pytest.approx(0.5 * one[1, 0], rel=1e-4)
    assert one[2] == pytest.approx(-one[1])
    turned = cosines(off + "parked_sun_angle_deg = 180.0\n", [4000.0])
    assert turned[2, 0] > 0.9  # the back
    body = cosines(off + "parked_normal = [0.0, -2.0, 0.0]\n", [0.0, 4000.0])
    assert body[1, 1] == pytest.approx(-body[0, 1])


def test_an_alternative_replaces_what_intervals_say() -> None:
    other = (
        '[[mode]]\nname = "quiet"\nalternative = true\nplasma = "quiet geostationary"\n'
        "illumination = 0.0\n"
    )
    solved = run(FIXED + PLASMA + other)
    assert [mode.name for mode in solved.modes] == ["base", "quiet"]
    assert [p.name for p in solved.modes[1].plasmas] == ["quiet geostationary"]
    assert len(solved.modes[0].plasmas) == 2
    document = summary_document(solved, case_summaries(solved), [0.0, 0.0])
    assert [mode["mode"] for mode in document["modes"]] == ["base", "quiet"]
    said = " ".join(document["sentences"])
    assert "in mode 'storm'" in said


@pytest.mark.parametrize(
    ("mode", "words"),
    [
        ('name = "a"\nfrom_h = 1.0\nplasma = "quiet geostationary"', "to is missing"),
        ('name = "a"\nfrom_h = 1.0\nto_h = 1.0\nevents = false', "not after the begin"),
        ('name = "a"\nfrom_h = 2.5\nto_h = 3.0\nevents = false', "no begin within the run"),
        ('name = "a"\nfrom_h = 0.0\nto_h = 1.0', "changes nothing"),
        ('name = "a"\nfrom_h = 0.0\nto_h = 1.0\nf107 = 100.0', "only with alternative = true"),
        ('name = "a"\nfrom_h = 0.0\nto_h = 1.0\nalternative = true\nevents = false', "beside an"),
        ('name = "a"\nfrom = 2000-01-01T00:10:00\nto_h = 1.0\nevents = false', "time zone"),
        ('name = "a"\nfrom = 2000-01-01T00:10:00Z\nfrom_h = 0\nto_h = 1\nevents = false', "beside"),
        ('name = "a"\nfrom_h = 0.0\nto_h = 1.0\narray = "tracking"', "tracks_sun"),
        ('name = "a"\nfrom_h = 0.0\nto_h = 1.0\narray = "parked"', "further keys"),
        ('name = "a"\nfrom_h = 0.0\nto_h = 1.0\nparked_sun_angle_deg = 3.0\n'
         "events = false", "needs array"),
        ('name = "a"\nfrom_h = 0.0\nto_h = 1.0\nemitters = ["x"]', "is no emitter"),
        ('name = "a"\nfrom_h = 0.0\nto_h = 1.0\nattitude = {law = "sun"}', "only with an orbit"),
        ('name = "a"\nfrom_h = 0.0\nto_h = 1.0\nbegin = 3', 'key "begin" is unknown'),
        ('name = "a"\nfrom_h = 0.0\nto_h = 1.0\nplasma = "quiet geostationary"\n[[mode]]\n'
         'name = "b"\nfrom_h = 0.5\nto_h = 1.5\nplasma = "quiet geostationary"', "overlaps mode"),
    ],
)  # fmt: skip
def test_refused_modes(mode: str, words: str) -> None:
    with pytest.raises(InputError) as caught:
        load_case_text(FIXED + "[[mode]]\n" + mode + "\n", file="m.toml")
    assert words in str(caught.value)
    assert caught.value.line is not None
    assert caught.value.line >= 27


def test_moments_of_a_mode_count_true_seconds() -> None:
    text = GEO.replace("2031-06-21T00:00:00Z", "2016-12-31T20:00:00Z")
    mode = (
        '[[mode]]\nname = "y"\nfrom = 2017-01-01T00:00:00Z\nto = 2017-01-01T01:00:00Z\n'
        'attitude = {law = "yaw steering"}\n'
    )
    case = load_case_text('title = "x"\n' + text + FACES + mode).case
    # four hours and the leap second
    assert surroundings(case, None, []).edges_s == (14401.0, 18001.0)
