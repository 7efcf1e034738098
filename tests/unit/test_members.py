"""Members of a block: each is the spacecraft it says, whatever its company."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations

import numpy as np
import pytest

from charging.case import LoadedCase, load_case_text
from charging.currents.emission import SECONDARY_LAWS
from charging.members import Member, member_of
from charging.network.march import Tolerance, Trajectory
from charging.orbit_run import ModeRun, solve_mode, surroundings_of

LOOSE = Tolerance(absolute=0.3, relative=3e-3)

CASE = """\
title = "A block"
[orbit]
kind = "fixed"
illumination = 1.0
sun_direction = [0.0, 0.0, 1.0]
duration_h = 0.2
[plasma]
use = "{plasma}"
[[plasma.event]]
onset_h = 0.05
rise_min = 1.0
hold_min = 5.0
decay_min = 2.0
use = "ECSS geostationary worst case"
[body]
radius_m = {radius}
[emission]
secondary_law = "both"
[[surface]]
name = "panel"
material = "{panel}"
area_m2 = {area}
normal = [0.0, 0.0, 1.0]
[[surface]]
name = "glass"
material = "{glass}"
area_m2 = 2.0
thickness_m = {thickness}
temperature_K = 290.0
normal = [0.0, 0.0, -1.0]
[[surface]]
name = "plate"
material = "gold"
area_m2 = 0.2
floating = true
capacitance_F = {capacitance}
normal = [0.0, 0.0, -1.0]
[[emitter]]
name = "gun"
current_A = {current}
energy_eV = 200.0
from_h = 0.1
to_h = 0.15
{links}
"""
PLAIN = {
    "plasma": "quiet geostationary",
    "radius": 1.2,
    "panel": "oxidised aluminium",
    "area": 3.0,
    "glass": "cover glass",
    "thickness": 1e-4,
    "capacitance": 2e-9,
    "current": 1e-5,
    "links": "",
}
LINK = '[[link]]\nbetween = ["plate", "structure"]\nresistance_ohm = 1e9\n'


def loaded_case(**changes: object) -> LoadedCase:
    return load_case_text(CASE.format(**(PLAIN | changes)))


@pytest.fixture(scope="module")
def members() -> list[Member]:
    """Spacecraft that differ in all that may differ."""
    law, other = SECONDARY_LAWS
    return [
        member_of(loaded_case(), law),
        member_of(loaded_case(), other),
        member_of(loaded_case(glass="polyimide film", thickness=25e-6), law),
        member_of(loaded_case(radius=0.4, area=0.9), law),
        member_of(loaded_case(panel="black paint, carbon-polyurethane", links=LINK), other),
        member_of(loaded_case(plasma="substorm, 3 keV class"), law),
        member_of(loaded_case(), law, collection="plane"),
        member_of(loaded_case(capacitance=5e-9, current=1e-7), law, collection="cylinder"),
    ]


def solved(members: Sequence[Member]) -> ModeRun:
    return solve_mode(loaded_case(), members=members, tolerance=LOOSE)


@pytest.fixture(scope="module")
def block(members: list[Member]) -> ModeRun:
    return solved(members)


def assert_same(one: Trajectory, other: Trajectory) -> None:
    assert one.attempts == other.attempts
    for name in ("start_s", "step_s", "y_start", "y_end", "c2", "c3"):
        assert np.array_equal(getattr(one, name), getattr(other, name)), name


def test_every_member_is_another_spacecraft(block: ModeRun) -> None:
    ends = [path.y_end[-1] for path in block.trajectories]
    for one, other in combinations(ends, 2):
        assert np.abs(one - other).max() > 1e-3
    assert block.net.area_m2.shape == (8, 3)
    assert block.net.film_thickness_m.shape == (8, 1)
    assert block.balance.mass.shape == (8, 3, 3)
    assert block.net.link_conductance_S.ravel().tolist() == [0, 0, 0, 0, 1e-9, 0, 0, 0]


@pytest.mark.parametrize("number", [2, 4, 6])
def test_alone_as_in_company_bit_for_bit(
    members: list[Member], block: ModeRun, number: int
) -> None:
    (alone,) = solved([members[number]]).trajectories
    assert_same(alone, block.trajectories[number])


def test_order_and_number_of_members_change_nothing(members: list[Member], block: ModeRun) -> None:
    order = [5, 1, 7, 3]
    for place, path in zip(order, solved([members[i] for i in order]).trajectories, strict=True):
        assert_same(path, block.trajectories[place])


def test_the_laws_of_a_case_are_members_like_others(members: list[Member]) -> None:
    loaded = loaded_case()
    plain = solve_mode(loaded, tolerance=LOOSE)
    assert plain.laws == ("sanders_inouye_1979", "lin_joy_2005")
    given = solve_mode(loaded, members=members[:2], around=surroundings_of(loaded), tolerance=LOOSE)
    for one, other in zip(plain.trajectories, given.trajectories, strict=True):
        assert_same(one, other)


def test_members_that_differ_in_the_network_share_a_table() -> None:
    cases = [loaded_case(), loaded_case(capacitance=5e-9), loaded_case(thickness=2e-4)]
    run = solved([member_of(case, "lin_joy_2005") for case in cases])
    assert run.balance.table.table.tolist() == [0, 0, 0]
    assert len(run.balance.table.coefficients) == 1


def test_members_with_other_nodes_are_refused(members: list[Member]) -> None:
    text = CASE.format(**PLAIN).replace("floating = true\ncapacitance_F = 2e-09\n", "")
    other = member_of(load_case_text(text), "lin_joy_2005")
    with pytest.raises(ValueError, match="same node_names"):
        solved([members[0], other])


def test_members_with_fewer_plasmas_are_refused(members: list[Member]) -> None:
    text = CASE.format(**PLAIN)
    event = text[text.index("[[plasma.event]]") : text.index("[body]")]
    other = member_of(load_case_text(text.replace(event, "")), "lin_joy_2005")
    with pytest.raises(ValueError, match="as many plasmas"):
        solved([members[0], other])
