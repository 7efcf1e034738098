"""Networks against closed forms: capacitors, resistors, films, isolated conductors.

Matrices and formulas are written down here by hand, apart from the network's own.
"""

from __future__ import annotations

from dataclasses import replace
from math import pi

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.constants import epsilon_0
from scipy.linalg import expm

from charging.case import load_case_text
from charging.network.charge_balance import ChargeBalance
from charging.network.march import Tolerance, march
from charging.network.nodes import Face, network
from charging.orbit_run import solve_mode

Array = NDArray[np.float64]
RADIUS_M = 1.0
ECSS = "ECSS geostationary worst case"

HEAD = """\
title = "A network without plasma"
[orbit]
kind = "fixed"
illumination = 0.0
sun_direction = [0.0, 0.0, 1.0]
duration_h = 0.001
[plasma]
use = "{plasma}"
[body]
radius_m = 1.0
[emission]
secondary_law = "lin_joy_2005"
"""
FILM = """\
[[surface]]
name = "{name}"
material = "polyimide film"
area_m2 = {area}
thickness_m = {thickness}
attached_to = "{below}"
temperature_K = 298.15
normal = [0.0, 0.0, 1.0]
"""
PLATE = """\
[[surface]]
name = "plate"
material = "gold"
area_m2 = {area}
floating = true
capacitance_F = {capacitance}
normal = [0.0, 0.0, 1.0]
"""
BODY = """\
[[surface]]
name = "body"
material = "gold"
area_m2 = 10.0
normal = [0.0, 0.0, 1.0]
"""
GUN = """\
[[emitter]]
name = "gun"
current_A = {current}
energy_eV = 1000.0
"""


def balance_of(*parts: str, plasma: bool = False) -> ChargeBalance:
    """Charge balance in the dark; without a plasma nothing arrives from outside."""
    text = HEAD.format(plasma=ECSS) + "".join(parts)
    balance = solve_mode(load_case_text(text)).balance
    if plasma:
        return balance
    nothing = np.zeros_like(balance.table.coefficients)
    return replace(balance, table=replace(balance.table, coefficients=nothing))


def marched(balance: ChargeBalance, start: Array, times: Array, volts: float = 1e-7) -> Array:
    """Node potentials [T, n]."""
    (path,) = march(
        balance,
        start[None],
        span_s=(0.0, float(times[-1])),
        tolerance=Tolerance(volts, 1e-9),
        first_step_s=1e-9,
    )
    return balance.net.potentials(path(times))


# --- capacitance matrix -------------------------------------------------------------------


def test_two_spheres_share_charge_by_the_off_diagonal() -> None:
    """A current charges one of two distant conducting spheres; the other follows by induction.

    Two spheres of radii a, b at a distance d >> a, b have the coefficients of potential
    p11 = 1/4πε0 a, p22 = 1/4πε0 b, p12 = 1/4πε0 d (Maxwell), correct to (a/d)^3. The second
    carries no charge and takes the potential p12 Q, a share a/d of the first.
    """
    a, b, d = 1.0, 0.2, 5.0
    current = 1e-9
    k = 1.0 / (4.0 * pi * epsilon_0)
    potential = k * np.array([[1.0 / a, 1.0 / d], [1.0 / d, 1.0 / b]])
    base = balance_of(BODY, PLATE.format(area=0.1, capacitance=1e-18), GUN.format(current=current))
    faces = (Face("body", "structure", 10.0),
             Face("plate", "structure", 0.1, isolated_capacitance_F=1e-18))  # fmt: skip
    times = np.linspace(1e-4, 2e-3, 8)
    found = {}
    for name, matrix in (("coupled", np.linalg.inv(potential)), ("default", None)):
        net = network(faces, (), RADIUS_M, matrix)
        found[name] = marched(replace(base, net=net, mass=net.mass), np.zeros(2), times)
    charge = current * times
    assert found["coupled"][:, 0] == pytest.approx(charge * k / a, rel=1e-5)
    assert found["coupled"][:, 1] == pytest.approx(charge * k / d, rel=1e-5)
    # without the off-diagonal the second sphere feels nothing
    assert np.abs(found["default"][:, 1]).max() < 1e-4 * found["coupled"][-1, 1]


def test_charge_goes_where_the_matrix_says() -> None:
    """A film's outer face gains the charge that its capacitance and the matrix ask for."""
    thickness, area, current = 1e-3, 0.5, 1e-9
    matrix = 1e-11 * np.array([[9.0, -2.0], [-2.0, 4.0]])
    base = balance_of(
        BODY, FILM.format(name="film", area=area, thickness=thickness, below="structure"),
        GUN.format(current=current),
    )  # fmt: skip
    faces = (Face("body", "structure", 10.0),
             Face("film", "structure", area, thickness, 3.4, 1e30, 0.0))  # fmt: skip
    net = network(faces, (), RADIUS_M, matrix)
    c = epsilon_0 * 3.4 * area / thickness
    whole = matrix + c * np.array([[1.0, -1.0], [-1.0, 1.0]])
    assert net.capacitance_F == pytest.approx(whole, rel=1e-12)
    times = np.array([1e-3, 3e-3])
    volts = marched(replace(base, net=net, mass=net.mass), np.zeros(2), times)
    expected = np.linalg.solve(whole, np.array([current, 0.0])) * times[:, None]
    assert volts == pytest.approx(expected, rel=1e-6)


# --- films, resistors, isolated conductors ------------------------------------------------


def test_two_films_and_a_bleed_resistor_against_the_matrix_exponential() -> None:
    """structure - film 1; structure = R = plate; plate - film 2: four linear equations."""
    resistance, own = 3e9, 2e-9
    d, area = (5e-5, 1e-4), (0.5, 0.3)
    rho, permittivity = 1e10, 3.4
    balance = balance_of(
        BODY,
        PLATE.format(area=0.1, capacitance=own),
        FILM.format(name="one", area=area[0], thickness=d[0], below="structure"),
        FILM.format(name="two", area=area[1], thickness=d[1], below="plate"),
        f'[[link]]\nbetween = ["plate", "structure"]\nresistance_ohm = {resistance}\n',
    )
    assert balance.net.node_names == ("structure", "plate", "one", "two")
    net = replace(
        balance.net,
        film_resistivity_ohm_m=np.array([rho, rho]),
        film_permittivity=np.array([permittivity, permittivity]),
    )
    c1, c2 = (epsilon_0 * permittivity * s / t for s, t in zip(area, d, strict=True))
    g1, g2 = (s / (rho * t) for s, t in zip(area, d, strict=True))
    total = 10.0 + 0.1 + sum(area)
    free = [4.0 * pi * epsilon_0 * RADIUS_M * s / total for s in (10.0, 0.1, *area)]

    def stamped(pairs: list[tuple[int, int, float]], diagonal: list[float]) -> Array:
        matrix = np.diag(np.array(diagonal))
        for i, j, value in pairs:
            matrix[i, i] += value
            matrix[j, j] += value
            matrix[i, j] -= value
            matrix[j, i] -= value
        return matrix

    capacitance = stamped([(0, 1, own), (0, 2, c1), (1, 3, c2)], free)
    conductance = stamped([(0, 1, 1.0 / resistance), (0, 2, g1), (1, 3, g2)], [0.0] * 4)
    net = replace(net, capacitance_F=capacitance)
    # millivolts: 20 V/m at most, where field enhancement is below 1e-4
    start_V = np.array([2e-4, -3e-4, 8e-4, 1e-3])
    start = np.linalg.solve(net.ancestry, start_V)
    times = np.array([0.01, 0.1, 0.5, 2.0, 6.0])
    volts = marched(replace(balance, net=net, mass=net.mass), start, times, 1e-11)
    rate = -np.linalg.solve(capacitance, conductance)
    for t, v in zip(times, volts, strict=True):
        exact = expm(rate * t) @ start_V
        assert np.abs(v - exact).max() < 1e-4 * 1e-3, t


@pytest.mark.parametrize("grounded", [True, False])
def test_backing_of_a_film_grounded_or_not(grounded: bool) -> None:
    """A dark film charges; an ungrounded metal backing takes its share as capacitors in series.

    The backing itself collects next to nothing. What flows onto the face passes on through
    both capacitances: y_face/y_backing = C_backing/C_film; with a grounded backing the whole
    voltage is the film's.
    """
    thickness, area, own = 1e-4, 0.01, 7e-10
    c_film = epsilon_0 * 3.4 * area / thickness
    below = "structure" if grounded else "plate"
    balance = balance_of(
        BODY,
        PLATE.format(area=1e-9, capacitance=own),
        FILM.format(name="film", area=area, thickness=thickness, below=below),
        plasma=True,
    )
    net = replace(balance.net, film_permittivity=np.array([3.4]),
                  film_resistivity_ohm_m=np.array([1e30]))  # fmt: skip
    c = net.capacitance_F.copy()
    face, base = net.film_node[0], net.film_parent[0]
    assert -c[face, base] == pytest.approx(c_film, rel=0.2)  # the library's permittivity
    for i, j, sign in ((face, face, 1), (base, base, 1), (face, base, -1), (base, face, -1)):
        c[i, j] += sign * (c_film + balance.net.capacitance_F[face, base])
    net = replace(net, capacitance_F=c)
    (path,) = march(
        replace(balance, net=net, mass=net.mass), np.zeros((1, 3)), span_s=(0.0, 1.0),
        tolerance=Tolerance(1e-4, 1e-7),
    )  # fmt: skip
    y = path(np.array([0.3, 1.0]))
    slope = (y[1] - y[0]) / 0.7
    plate, film = 1, 2
    if grounded:
        assert abs(slope[plate]) < 1e-2 * abs(slope[film])
    else:
        # the face also charges the free space around it, 4e-5 of the film
        assert slope[film] / slope[plate] == pytest.approx(own / c_film, rel=1e-3)


def test_isolated_conductor_between_two_films() -> None:
    """structure - film - conductor - film, all lossless: potentials divide like 1/C, 1/C."""
    current = 2e-9
    lower, upper = 4e-10, 3e-10
    area = 0.01
    base = balance_of(
        BODY,
        PLATE.format(area=1e-9, capacitance=lower),
        FILM.format(name="film", area=area, thickness=1e-4, below="plate"),
        GUN.format(current=current),
    )
    # the upper film touches a large body in free space: a face of 1 nF to the plasma
    far = 1e-9
    matrix = np.diag([1e-12, 0.0, far])
    thickness = epsilon_0 * 3.4 * area / upper
    faces = (Face("body", "structure", 10.0),
             Face("plate", "structure", 1e-9, isolated_capacitance_F=lower),
             Face("film", "plate", area, thickness, 3.4, 1e30, 0.0))  # fmt: skip
    net = network(faces, (), RADIUS_M, matrix)
    time = 0.5
    volts = marched(replace(base, net=net, mass=net.mass), np.zeros(3), np.array([time]))[0]
    series = 1.0 / (1.0 / lower + 1.0 / upper + 1.0 / far)
    structure = current * time / (1e-12 + series)
    through = structure * series  # charge in the chain
    assert volts[0] == pytest.approx(structure, rel=1e-5)
    assert volts[1] == pytest.approx(structure - through / lower, rel=1e-5)
    assert volts[2] == pytest.approx(through / far, rel=1e-5)
