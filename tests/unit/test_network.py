"""Nodes, capacitances, links; the right-hand side, its Jacobian and charge conservation."""

from __future__ import annotations

from math import pi

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.constants import e, epsilon_0, k

from charging.case import load_case_text
from charging.network.charge_balance import ChargeBalance
from charging.network.nodes import Face, Network, network
from charging.orbit_run import CaseRun, solve_mode

Array = NDArray[np.float64]

FACES = (
    Face("panel", "structure", 3.0),
    Face("glass", "structure", 2.0, 1e-4, 5.0, 1e13, 0.7),
    Face("plate", "structure", 0.5, isolated_capacitance_F=2e-9),
    Face("tape", "plate", 0.25, 5e-5, 3.4, 1e15, 1.0),
    Face("strip", "panel", 0.75, 2.5e-5, 2.0, 1e16, 0.5),
    Face("cap", "plate", 0.1),
)
LINKS = (("plate", "structure", 1e9), ("plate", "panel", 4e9))
RADIUS_M = 1.5


@pytest.fixture(scope="module")
def net() -> Network:
    return network(FACES, LINKS, RADIUS_M)


def test_nodes_are_structure_films_and_isolated_conductors(net: Network) -> None:
    assert net.node_names == ("structure", "glass", "plate", "tape", "strip")
    assert net.surface_node.tolist() == [0, 1, 2, 3, 4, 2]
    assert net.film_node.tolist() == [1, 3, 4]
    assert net.film_parent.tolist() == [0, 2, 0]
    assert net.film_surface.tolist() == [1, 3, 4]


def test_capacitance_is_symmetric_and_its_rows_sum_to_the_free_space_part(net: Network) -> None:
    c = net.capacitance_F
    assert np.array_equal(c, c.T)
    area = {"structure": 3.0, "glass": 2.0, "plate": 0.6, "tape": 0.25, "strip": 0.75}
    total = sum(area.values())
    free = [4.0 * pi * epsilon_0 * RADIUS_M * a / total for a in area.values()]
    # the rows lose microfarads against microfarads: compare on their scale
    assert c.sum(axis=1) == pytest.approx(free, abs=1e-15 * np.abs(c).max())
    assert c.sum() == pytest.approx(4.0 * pi * epsilon_0 * RADIUS_M, rel=1e-4)


def test_off_diagonals_are_minus_the_films_and_the_isolated_capacitance(net: Network) -> None:
    expected = np.zeros((5, 5))
    for i, j, value in (
        (0, 1, epsilon_0 * 5.0 * 2.0 / 1e-4),
        (0, 2, 2e-9),
        (2, 3, epsilon_0 * 3.4 * 0.25 / 5e-5),
        (0, 4, epsilon_0 * 2.0 * 0.75 / 2.5e-5),
    ):
        expected[i, j] = expected[j, i] = -value
    off = net.capacitance_F - np.diag(np.diag(net.capacitance_F))
    assert off == pytest.approx(expected, rel=1e-14)


def test_capacitance_is_positive_definite(net: Network) -> None:
    assert np.linalg.eigvalsh(net.mass).min() > 0.0


def test_state_holds_differences_against_what_a_surface_is_attached_to(net: Network) -> None:
    y = np.array([[-100.0, 7.0, -3.0, 0.5, 11.0], [1.0, 0.0, 2.0, 4.0, 8.0]])
    v = net.potentials(y)
    assert v.tolist() == [[-100.0, -93.0, -103.0, -102.5, -89.0], [1.0, 1.0, 3.0, 7.0, 9.0]]
    assert v[:, 1] - v[:, 0] == pytest.approx(y[:, 1])
    assert v[:, 3] - v[:, 2] == pytest.approx(y[:, 3])
    energy = 0.5 * np.einsum("mi,ij,mj->m", v, net.capacitance_F, v)
    assert 0.5 * np.einsum("mi,ij,mj->m", y, net.mass, y) == pytest.approx(energy, rel=1e-12)


def test_links_see_the_voltage_between_their_ends(net: Network) -> None:
    y = np.array([-100.0, 7.0, -3.0, 0.5, 11.0])
    assert net.link_nodes == ((2, 0), (2, 0))
    assert (net.link_rows * y).sum(axis=-1).tolist() == [-3.0, -3.0]
    assert net.link_conductance_S.tolist() == [1e-9, 0.25e-9]


CASE = """\
title = "Three levels"
[orbit]
kind = "fixed"
illumination = 0.6
sun_direction = [0.0, 0.6, 0.8]
duration_h = 0.01
[plasma]
use = "ECSS geostationary worst case"
[body]
radius_m = 1.2
[[surface]]
name = "panel"
material = "oxidised aluminium"
area_m2 = 3.0
normal = [0.0, 0.0, 1.0]
[[surface]]
name = "glass"
material = "cover glass"
area_m2 = 2.0
thickness_m = 1e-4
temperature_K = 300.0
normal = [0.0, 0.0, 1.0]
[[surface]]
name = "plate"
material = "gold"
area_m2 = 0.5
floating = true
capacitance_F = 2e-9
normal = [0.0, 0.0, -1.0]
[[surface]]
name = "tape"
material = "polyimide film"
area_m2 = 0.25
thickness_m = 5e-5
attached_to = "plate"
temperature_K = 320.0
normal = [0.0, 1.0, 0.0]
[[link]]
between = ["plate", "structure"]
resistance_ohm = 1e9
"""


@pytest.fixture(scope="module")
def balance() -> ChargeBalance:
    return solve_mode(load_case_text(CASE)).balance


STATES = np.array(
    [
        [-3000.0, -400.0, 55.0, 900.0],
        [-30.0, 900.0, -200.0, -1500.0],
        [6.0, -3.0, 1.5, -2.0],
        [-8000.0, 5000.0, 3000.0, -2500.0],
        [150.0, -40.0, 30.0, 20.0],
    ]
)


@pytest.mark.parametrize("member", [0, 1])
@pytest.mark.parametrize("row", range(len(STATES)))
def test_jacobian_against_finite_differences(balance: ChargeBalance, row: int, member: int) -> None:
    y = STATES[row : row + 1]
    one, time = np.array([member]), np.array([1.0])
    rate, jacobian = balance.rhs_and_jacobian(one, time, y)
    assert np.array_equal(rate, balance.rhs(one, time, y))
    n = y.shape[1]
    numeric = np.zeros((n, n))
    for j in range(n):
        # central differences, Richardson; steps scale with the absolute potentials
        estimates = []
        for h in (2e-3, 1e-3):
            step = np.zeros((1, n))
            step[0, j] = h * max(1.0, abs(balance.net.potentials(y)[0, j])) ** 0.5
            up, down = balance.rhs(one, time, y + step), balance.rhs(one, time, y - step)
            estimates.append((up - down)[0] / (2.0 * step[0, j]))
        numeric[:, j] = (4.0 * estimates[1] - estimates[0]) / 3.0
    scale = np.abs(numeric).max(axis=1, keepdims=True)
    assert np.abs(jacobian[0] - numeric).max() <= 1e-6 * np.abs(numeric).max()
    assert (np.abs(jacobian[0] - numeric) <= 1e-5 * scale).all()


@pytest.mark.parametrize("member", [0, 1])
def test_currents_between_nodes_cancel(balance: ChargeBalance, member: int) -> None:
    time = np.zeros(len(STATES))
    flows = balance.flows(member, time, STATES)
    into = balance.node_currents(flows)
    plasma = (flows.surface_A_m2.sum(axis=-1) * balance.net.area_m2).sum(axis=-1)
    size = np.abs(into).sum(axis=-1)
    assert (np.abs(flows.link_A) > 0.0).all()
    assert (np.abs(into.sum(axis=-1) - plasma) <= 1e-14 * size).all()


@pytest.mark.parametrize("member", [0, 1])
def test_charge_rates_are_the_node_currents_by_state(balance: ChargeBalance, member: int) -> None:
    """Virtual work: the rate of y_j is what flows into everything that moves with y_j."""
    time = np.zeros(len(STATES))
    into = balance.node_currents(balance.flows(member, time, STATES))
    rate = balance.rhs(np.full(len(STATES), member), time, STATES)
    size = np.abs(into).max(axis=-1, keepdims=True)
    # rhs goes through the march's tables, flows through the direct path
    assert (np.abs(into @ balance.net.ancestry - rate) <= 5e-5 * size).all()


def test_film_conduction_is_ohms_law_with_temperature_and_field(balance: ChargeBalance) -> None:
    y = STATES[:1]
    film = balance.flows(0, np.zeros(1), y).film_A_m2[0]
    material = {"glass": 1, "tape": 3}
    for i, (thickness, temperature) in enumerate(((1e-4, 300.0), (5e-5, 320.0))):
        field = y[0, list(material.values())[i]] / thickness
        net = balance.net
        sigma = (
            np.exp(-net.film_activation_eV[i] * e / k * (1.0 / temperature - 1.0 / 298.15))
            / net.film_resistivity_ohm_m[i]
        )
        beta = np.sqrt(e**3 / (pi * epsilon_0 * net.film_permittivity[i]))
        x = beta * np.sqrt(abs(field)) / (2.0 * k * temperature)
        jump = e * abs(field) * 1e-9 / (2.0 * k * temperature)
        factor = (2.0 + np.cosh(x)) / 3.0 * np.sinh(jump) / jump
        assert film[i] == pytest.approx(-sigma * factor * field, rel=1e-10)


def test_link_current_lowers_the_first_end_when_it_is_above(balance: ChargeBalance) -> None:
    flows = balance.flows(0, np.zeros(len(STATES)), STATES)
    assert flows.link_A[:, 0] == pytest.approx(STATES[:, 2] / 1e9)
    bare = flows._replace(
        surface_A_m2=np.zeros_like(flows.surface_A_m2), film_A_m2=np.zeros_like(flows.film_A_m2)
    )
    into = balance.node_currents(bare)
    assert into[:, 2] == pytest.approx(-STATES[:, 2] / 1e9)
    assert into[:, 0] == pytest.approx(STATES[:, 2] / 1e9)


def test_states_outside_the_tables_or_the_conduction_law_are_refused(
    balance: ChargeBalance,
) -> None:
    y = np.zeros((4, 4))
    y[1, 0] = 3e5
    y[2, 1] = 1.2e5  # 1.2e9 V/m in 100 µm
    y[3, 0], y[3, 1] = -1.5e5, -6e4
    assert balance.admissible(np.zeros(4, dtype=np.intp), y).tolist() == [True, False, False, False]


def test_error_norm_sees_absolute_and_differential_potentials(balance: ChargeBalance) -> None:
    seen = balance.controlled(STATES)
    assert seen.shape == (5, 7)
    v = balance.net.potentials(STATES)
    assert np.array_equal(seen[:, :4], STATES)
    assert np.array_equal(seen[:, 4:], v[:, 1:])


def test_demo_network_has_a_node_per_film_and_isolated_conductor(demo_day: CaseRun) -> None:
    net = demo_day.modes[0].net
    floating = [
        s.name for s in demo_day.loaded.case.surface if s.thickness_m is not None or s.floating
    ]
    assert net.node_names == ("structure", *floating)
    assert np.array_equal(net.capacitance_F, net.capacitance_F.T)
    radius = demo_day.loaded.case.body.radius_m
    assert net.capacitance_F.sum() == pytest.approx(4.0 * pi * epsilon_0 * radius, rel=1e-4)
