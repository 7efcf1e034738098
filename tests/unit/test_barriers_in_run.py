"""Barriers inside the charge balance and in whole runs."""

import re
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray

from charging.barriers import _on_sphere, barriers, overcount, without_barrier
from charging.case import LoadedCase, load_case, load_case_text
from charging.cautions import cautions
from charging.currents.barrier import escape_height
from charging.dataset import mode_dataset
from charging.orbit_run import CaseRun, ModeRun, run_case
from charging.spacecraft import spacecraft_network

Array = NDArray[np.float64]
DAY = Path(__file__).parents[2] / "cases" / "geo_substorm_day.toml"

HALVES = """
title = "A sphere, half of it lit"
[orbit]
kind = "fixed"
illumination = 1.0
sun_direction = [1.0, 0.0, 0.0]
duration_h = 24.0
[time]
output_step_s = 600.0
[emission]
secondary_law = "sanders_inouye_1979"
[plasma]
use = "ECSS geostationary worst case"
[body]
radius_m = 1.0
[[surface]]
name = "lit half"
material = "gold, air-exposed"
area_m2 = 6.283185
normal = [1.0, 0.0, 0.0]
[[surface]]
name = "dark half"
"""
FILM = """material = "polyimide film"
thickness_m = 127e-6
temperature_K = 290.0
area_m2 = 6.283185
normal = [-1.0, 0.0, 0.0]
"""
METAL = """material = "gold, air-exposed"
area_m2 = 6.283185
normal = [-1.0, 0.0, 0.0]
"""
MORE = """
[[surface]]
name = "radiator"
material = "fused silica"
thickness_m = 150e-6
temperature_K = 290.0
area_m2 = 1.2
normal = [0.0, 1.0, 0.0]
[[surface]]
name = "tag"
material = "oxidised aluminium"
floating = true
capacitance_F = 1e-9
area_m2 = 0.3
normal = [0.0, 1.0, 0.2]
[[surface]]
name = "wing"
material = "cover glass"
thickness_m = 100e-6
temperature_K = 300.0
area_m2 = 4.0
tracks_sun = true
side = "front"
[[link]]
between = ["tag", "structure"]
resistance_ohm = 1e9
"""


def loaded(folder: Path, text: str) -> LoadedCase:
    path = folder / "case.toml"
    path.write_text(text)
    return load_case(path)


def solved(folder: Path, text: str) -> CaseRun:
    return run_case(loaded(folder, text))


def ends(mode: ModeRun) -> Array:
    return np.asarray(mode.net.potentials(mode.trajectories[0](np.array([86400.0])))[0])


@pytest.fixture(scope="module")
def several(tmp_path_factory: pytest.TempPathFactory) -> CaseRun:
    text = HALVES.replace("duration_h = 24.0", "duration_h = 0.2").replace("6.283185", "2.5")
    return solved(tmp_path_factory.mktemp("several"), text + FILM.replace("6.283185", "3.5") + MORE)


@pytest.fixture(scope="module")
def dark_film(tmp_path_factory: pytest.TempPathFactory) -> ModeRun:
    return solved(tmp_path_factory.mktemp("film"), HALVES + FILM).modes[0]


# --- the sphere of Besse & Rubin (1980) -----------------------------------------------------


def test_a_dark_film_drives_the_lit_half_far_negative(dark_film: ModeRun) -> None:
    structure, film = ends(dark_film)
    assert structure < -500.0
    # the closed form of two half spheres: a barrier in front of the lit half begins where its
    # slope along the axis vanishes, V_lit/V_dark = (1 - g)/g with g = d(cap + 1/x)... at x = 1
    x = 1.0 + np.geomspace(1e-5, 100.0, 200_001)
    cap = (x + 1.0) / (2.0 * x) - (x * x - 1.0) / (2.0 * x * np.hypot(x, 1.0))
    lowest = float((film * (1.0 / x - cap) + structure * cap).min())
    height = structure - lowest
    assert 0.0 < height < 20.0  # volts on kilovolts: the lit half rides on its barrier
    end = np.array([86400.0])
    state, (setting, _) = dark_film.trajectories[0](end), dark_film.around.at(end)
    found = dark_film.balance.heights(np.zeros(1, dtype=np.intp), state, setting)[0, 0]
    assert float(found) == pytest.approx(height, abs=0.1)


def test_without_the_barrier_the_lit_half_stays_near_zero(tmp_path: Path) -> None:
    text = HALVES.replace("radius_m = 1.0", "radius_m = 1.0\nbarrier = false")
    mode = solved(tmp_path, text + FILM).modes[0]
    structure, film = ends(mode)
    assert 0.0 < structure < 20.0
    assert film < -5000.0
    assert mode.balance.barriers is None


def test_a_conducting_lit_sphere_stays_positive(tmp_path: Path) -> None:
    mode = solved(tmp_path, HALVES + METAL).modes[0]
    assert 0.0 < ends(mode)[0] < 20.0


# --- charge balance -------------------------------------------------------------------------


def states(mode: ModeRun, count: int) -> Array:
    """Random states: volts and kilovolts, onsets of barriers and potentials at 0 V."""
    random = np.random.default_rng(4)
    n = len(mode.net.node_names)
    y = random.normal(size=(count, n)) * 10.0 ** random.uniform(-0.5, 3.3, (count, 1))
    y *= random.choice([1.0, 0.02], (count, n))
    y[::3, 0] -= 500.0
    y[::5, 0] = random.uniform(-0.06, 0.06, len(y[::5]))
    y[1::9, 1] = -y[1::9, 0]  # a film at the plasma's potential
    return np.asarray(y)


@pytest.mark.parametrize("count", [150, pytest.param(1000, marks=pytest.mark.slow)])
def test_jacobian_with_barriers(several: CaseRun, count: int) -> None:
    mode = several.modes[0]
    y = states(mode, count)
    member = np.zeros(count, dtype=np.intp)
    time = np.full(count, 100.0)
    rate, jacobian = mode.balance.rhs_and_jacobian(member, time, y)
    assert rate == pytest.approx(mode.balance.rhs(member, time, y), rel=1e-12, abs=1e-22)
    scale = np.abs(jacobian).max(axis=(1, 2))
    off = []
    for j in range(y.shape[1]):

        def at(shift: float, j: int = j) -> Array:
            moved = y.copy()
            moved[:, j] += shift
            return mode.balance.rhs(member, time, moved)

        h = 5e-4
        both = (8.0 * (at(h) - at(-h)) - at(2.0 * h) + at(-2.0 * h)) / (12.0 * h)
        # beside an edge where a rounded corner begins only one side is smooth
        sides = [
            d * (-11.0 * at(0.0) + 18.0 * at(d * h) - 9.0 * at(2 * d * h) + 2.0 * at(3 * d * h))
            / (6.0 * h)
            for d in (-1.0, 1.0)
        ]  # fmt: skip
        errors = [np.abs(one - jacobian[:, :, j]).max(axis=1) for one in (both, *sides)]
        off.append(np.min(errors, axis=0) / scale)
    worst = np.sort(np.max(off, axis=0))
    assert worst[int(0.99 * count)] < 1e-5
    assert worst[-1] < 1e-3


def test_neighbours_act_through_the_barrier(several: CaseRun) -> None:
    mode = several.modes[0]
    with_rows = states(mode, 60)
    member, time = np.zeros(60, dtype=np.intp), np.full(60, 100.0)
    free = replace(mode.balance, barriers=None)
    ours = mode.balance.rhs_and_jacobian(member, time, with_rows)[1]
    without = free.rhs_and_jacobian(member, time, with_rows)[1]
    film = mode.net.node_names.index("dark half")
    glass = mode.net.node_names.index("radiator")
    assert np.abs(without[:, glass, film]).max() < 1e-20
    assert np.abs(ours[:, glass, film]).max() > 1e-12


def test_tables_and_direct_path_agree_with_barriers(several: CaseRun) -> None:
    mode = several.modes[0]
    y = states(mode, 200)
    member, time = np.zeros(200, dtype=np.intp), np.full(200, 100.0)
    flows = mode.balance.flows(0, time, y)
    direct = mode.balance.node_currents(flows) @ mode.net.ancestry
    gross = (np.abs(flows.surface_A_m2).sum(axis=-1) * mode.net.area_m2).sum(axis=-1)
    table = mode.balance.rhs(member, time, y)
    assert (np.abs(table - direct).max(axis=1) < 1e-6 * gross + 1e-9 * np.abs(y).max(axis=1)).all()


def test_members_with_other_areas_have_barriers_of_their_own(several: CaseRun) -> None:
    case = several.loaded.case
    larger = case.model_copy(
        update={
            "surface": tuple(
                s.model_copy(update={"area_m2": 1.5 * s.area_m2}) for s in case.surface
            )
        }
    )
    net = several.modes[0].net
    both = barriers([case, larger, case], net.surface_node, len(net.node_names))
    assert both is not None
    assert both.which.tolist() == [0, 1, 0]
    v = net.potentials(states(several.modes[0], 30))
    surface = v[:, net.surface_node]
    member = np.arange(30) % 3
    found = both.heights_and_slopes(member, v, surface)
    assert np.array_equal(found.height_V, both.heights(member, v, surface))
    for m in (0, 1):
        own = both.of(m).heights(np.zeros(10, dtype=np.intp), v[m::3], surface[m::3])
        assert np.array_equal(found.height_V[m::3], own)


# --- what a run says ------------------------------------------------------------------------


def test_run_writes_heights_and_says_what_is_left_out(several: CaseRun) -> None:
    mode = several.modes[0]
    dataset = mode_dataset(several, mode)
    height, potential = dataset["barrier_height"].values, dataset["potential"].values
    wing = several.loaded.case.names.index("wing")
    assert height[wing] == pytest.approx(escape_height(potential[wing])[0], abs=1e-9)
    assert (height >= np.maximum(potential, 0.0) - 1e-12).all()
    assert without_barrier(several.loaded.case) == ("wing",)
    said = cautions(several.loaded, mode)
    assert any("no barrier is worked out" in text and "wing" in text for text in said)


def test_share_of_electrons_that_a_barrier_would_turn_back(several: CaseRun) -> None:
    electrons = several.modes[0].balance.models[0].electrons
    strength = np.ones((1, 1))
    surface = np.array([[-50.0, 5.0]])
    found = overcount(electrons, strength, surface, np.array([[0.0, 105.0]]))
    hot = electrons.debye_temperature_eV
    thermal = np.abs(electrons.thermal_current_A_m2)
    expected = float(((1.0 - np.exp(-100.0 / hot)) * thermal).sum() / thermal.sum())
    assert found.surface == 1
    assert found.share == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize("name", ["nadir panel", "launch ring"])
def test_a_divided_surface_has_the_weights_of_the_whole(name: str) -> None:
    """Films or conductors alike that look the same way are one cap however they are divided."""
    text = DAY.read_text(encoding="utf-8")
    whole = load_case(DAY).case
    parts = re.split(r"(?m)^(?=\[\[?)", text)
    (own,) = [p for p in parts if f'name = "{name}"' in p]
    area = float(re.findall(r"area_m2 = ([\d.]+)", own)[0])
    first = own.replace(f"area_m2 = {area}", f"area_m2 = {0.3 * area!r}")
    second = own.replace(f"area_m2 = {area}", f"area_m2 = {0.7 * area!r}").replace(
        f'"{name}"', f'"{name} b"', 1
    )
    assert first != own
    divided = load_case_text(text.replace(own, first + second)).case
    found = {}
    for label, case in (("whole", whole), ("divided", divided)):
        net = spacecraft_network(case, load_case(DAY).materials)
        on_sphere = [(i, s.normal) for i, s in enumerate(case.surface) if s.normal is not None]
        rows, _, weights = _on_sphere(case, on_sphere, net.surface_node, len(net.node_names))
        found[label] = {
            case.surface[i].name: dict(zip(net.node_names, w.T, strict=True))
            for i, w in zip(rows, weights, strict=True)
        }
    for surface, by_node in found["whole"].items():
        other = found["divided"][surface]
        for node, w in by_node.items():
            pieces = w * 0.0 + other[node]
            if f"{node} b" in other:
                pieces = pieces + other[f"{node} b"]
            np.testing.assert_allclose(pieces, w, atol=1e-12, err_msg=f"{surface}, {node}")
