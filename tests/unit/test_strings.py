"""Strings of solar cells: collection along the string, where structure floats, the Jacobian.

The array of two parts is worked out apart here, from Boltzmann electrons, cold ions of thin
sheaths and a straight potential, without the network.
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.constants import e, m_e, m_u
from scipy.integrate import quad
from scipy.optimize import brentq

from charging.audit import charge_audit
from charging.case import LoadedCase, load_case_text
from charging.cautions import cautions
from charging.currents.ensemble import EscapeCurves
from charging.dataset import ALL_MECHANISMS, mode_dataset
from charging.errors import InputError
from charging.flight import moments, path
from charging.members import member_of
from charging.network.strings import LEAST_SPAN_V, along
from charging.orbit_run import (
    ENSEMBLE_TOLERANCE,
    ModeRun,
    run_case,
    solve_mode,
    surroundings_of,
)
from environments.magnetic_field import field_T

Array = NDArray[np.float64]
DENSITY, TEMPERATURE = 1e11, 0.15
AREA, SHARE = 12.0, 0.05

PLASMA = f"""\
title = "a plasma of low orbit"
source = "this test"
basis = "assumed"
[[population]]
species = "electron"
law = "maxwellian"
density_m3 = {DENSITY}
temperature_eV = {TEMPERATURE}
[[population]]
species = "O+"
law = "maxwellian"
density_m3 = {DENSITY}
temperature_eV = {TEMPERATURE}
"""
MATERIAL = """\
name = "bare collector"
kind = "conductor"
emits = false
"""
CASE = """\
title = "A bare string"
[orbit]
kind = "fixed"
illumination = {light}
sun_direction = [0.0, 0.0, 1.0]
duration_h = 0.02
[plasma]
use = "low.toml"
[body]
radius_m = 1.0
collection = "plane"
barrier = false
[emission]
secondary_law = "sanders_inouye_1979"
[[surface]]
name = "front"
material = "bare collector"
area_m2 = 12.0
floating = true
capacitance_F = 1e-9
normal = [0.0, 0.0, 1.0]
[[surface]]
name = "bus"
material = "bare collector"
area_m2 = {bus}
normal = [0.0, 0.0, -1.0]
[[string]]
name = "wing"
surface = "front"
material = "bare collector"
exposed_share = 0.05
voltage_V = {voltage}
grounded = "{grounded}"
"""


def case_of(
    light: float = 1.0, bus: float = 0.3, voltage: float = 100.0, grounded: str = "negative",
    more: str = "",
) -> LoadedCase:  # fmt: skip
    text = CASE.format(light=light, bus=bus, voltage=voltage, grounded=grounded) + more
    return load_case_text(text, plasma_texts={"low.toml": PLASMA})


def structure(mode: ModeRun) -> float:
    return float(mode.trajectories[0].y_end[-1, 0])


def density_A_m2(volts: float) -> float:
    """Random flux of attracted species in a thin sheath, Boltzmann's factor on repelled ones."""

    def random(mass: float) -> float:
        return e * DENSITY * np.sqrt(e * TEMPERATURE / (2.0 * np.pi * mass))

    ions = random(15.995 * m_u) * min(1.0, np.exp(-max(volts, 0.0) / TEMPERATURE))
    electrons = random(m_e) * min(1.0, np.exp(min(volts, 0.0) / TEMPERATURE))
    return float(ions - electrons)


def balance_A(structure_V: float, bus: float, low: float, high: float) -> float:
    """Current onto structure and onto a string between two potentials above it."""
    a, b = structure_V + low, structure_V + high
    points = [0.0] if a < 0.0 < b else None
    along_string = quad(density_A_m2, a, b, points=points, limit=400, epsabs=1e-12)[0] / (b - a)
    return bus * density_A_m2(structure_V) + SHARE * AREA * along_string


@pytest.mark.parametrize(("bus", "voltage"), [(0.0001, 100.0), (0.3, 160.0), (20.0, 100.0)])
def test_negative_ground_floats_where_the_areas_say(bus: float, voltage: float) -> None:
    mode = run_case(case_of(bus=bus, voltage=voltage)).modes[0]
    high = float(np.hypot(voltage, LEAST_SPAN_V))
    expected = brentq(balance_A, -voltage, 0.0, args=(bus, 0.0, high), xtol=1e-9)
    assert structure(mode) == pytest.approx(expected, abs=0.05)
    assert charge_audit(mode.balance, 0, mode.trajectories[0]).relative < 1e-4


def test_a_bare_array_stands_mostly_negative_and_ions_pull_it_up() -> None:
    """80 to 95 % of the voltage for a bare array (textbook figure, from memory)."""
    shares = [-structure(solve_mode(case_of(bus=bus))) / 100.0 for bus in (0.0001, 3.0, 60.0)]
    assert 0.95 < shares[0] < 1.0  # thin sheaths, ions at rest: electrons are 170 times faster
    assert 0.8 < shares[1] < 1.0
    assert shares == sorted(shares, reverse=True)


def test_equilibrium_start_and_coarse_tables_agree() -> None:
    loaded = case_of(more='[time]\nstart = "equilibrium"\n')
    settled = solve_mode(loaded)
    begin = float(settled.trajectories[0].y_start[0, 0])
    assert begin == pytest.approx(structure(settled), abs=0.01)
    coarse = solve_mode(loaded, curves=EscapeCurves(), tolerance=ENSEMBLE_TOLERANCE)
    assert coarse.balance.models == ()
    assert structure(coarse) == pytest.approx(structure(settled), abs=0.1)


def test_positive_ground_floats_near_the_plasma() -> None:
    mode = solve_mode(case_of(grounded="positive"))
    expected = brentq(balance_A, -20.0, 5.0, args=(0.3, -100.0 - LEAST_SPAN_V, 0.0), xtol=1e-9)
    assert structure(mode) == pytest.approx(expected, abs=0.02)
    assert -5.0 < structure(mode) < 0.0


def test_no_light_no_voltage() -> None:
    mode = solve_mode(case_of(light=0.0))
    alone = brentq(density_A_m2, -5.0, 0.0)
    assert structure(mode) == pytest.approx(alone, abs=0.06)
    setting, _ = mode.around.at(np.zeros(1))
    assert mode.balance.strings is not None
    low, high = mode.balance.strings.ends(np.zeros(1, dtype=np.intp), setting, None)
    assert (low[0, 0], high[0, 0]) == (0.0, LEAST_SPAN_V)


def test_points_integrate_across_zero_and_move_with_the_ends() -> None:
    """Integrals of functions with a kink and with a scale of tenths of a volt, closed forms."""
    low, high = np.array([[-120.0, -80.0, 3.0]]), np.array([[40.0, -1.0, 90.0]])
    points = along(low, high, 12)
    v, w = points.potential_V, points.weight_V
    assert (w.sum(axis=1)) == pytest.approx(high - low, rel=1e-6)
    exact = 0.5 * (np.maximum(high, 0.0) ** 2 - np.maximum(low, 0.0) ** 2)
    assert (w * np.maximum(v, 0.0)).sum(axis=1) == pytest.approx(exact, rel=1e-6, abs=1e-9)
    decay = 0.15 * (np.exp(np.minimum(high, 0.0) / 0.15) - np.exp(np.minimum(low, 0.0) / 0.15))
    terms = np.where(v < 0.0, w * np.exp(np.minimum(v, 0.0) / 0.15), 0.0)
    assert terms.sum(axis=1) == pytest.approx(decay, rel=3e-4, abs=1e-6)
    step = 1e-4
    up, down = (along(low + d, high + d, 12) for d in (step, -step))
    for name, slope in (("potential_V", points.d_potential), ("weight_V", points.d_weight)):
        numeric = (getattr(up, name) - getattr(down, name)) / (2.0 * step)
        assert slope == pytest.approx(numeric, rel=1e-5, abs=1e-6)


def test_jacobian_and_company() -> None:
    """Richardson's difference at random states; a member alone equals it in a block."""
    loaded = case_of(more='[[emitter]]\nname = "clamp"\ncurrent_A = 1e-4\nenergy_eV = 30.0\n'
                     "hold_V = -20.0\n[[emitter]]\nname = \"gun\"\ncurrent_A = 1e-4\n"
                     "energy_eV = 300.0\nbelow_V = -40.0\n")  # fmt: skip
    members = [member_of(loaded, law) for law in ("sanders_inouye_1979", "lin_joy_2005")]
    wide = loaded.case.string[0].model_copy(update={"voltage_V": 140.0})
    other = loaded.case.model_copy(update={"string": (wide,)})
    members[1] = member_of(loaded, "sanders_inouye_1979")
    members[1] = type(members[1])(other, members[1].materials, members[1].plasmas, members[1].law)
    mode = solve_mode(loaded, members=members)
    balance, random = mode.balance, np.random.default_rng(3)
    one = np.ones(1, dtype=np.intp)
    for _ in range(60):
        y = np.array([[random.uniform(-150.0, 20.0), random.normal(0.0, 2.0)]])
        time = random.uniform(0.0, 70.0, 1)
        rate, jacobian = balance.rhs_and_jacobian(one, time, y)
        assert rate == pytest.approx(balance.rhs(one, time, y), rel=1e-12, abs=1e-18)
        for k in range(2):

            def slope(h: float, k: int = k, y: Array = y, time: Array = time) -> Array:
                d = np.eye(2)[k] * h
                up, down = (balance.rhs(one, time, y + s * d) for s in (1.0, -1.0))
                return np.asarray((up - down)[0] / (2.0 * h))

            numeric = (4.0 * slope(5e-4) - slope(1e-3)) / 3.0
            size = 3e-6 * np.abs(jacobian).max() + 1e-11 * np.abs(rate).max()
            assert jacobian[0, :, k] == pytest.approx(numeric, abs=size)
    alone = solve_mode(loaded, members=members[1:])
    assert np.array_equal(alone.trajectories[0].y_end, mode.trajectories[1].y_end)


def test_output_carries_the_string_and_says_what_is_missing() -> None:
    solved = run_case(case_of(voltage=250.0, bus=5.0))
    dataset = mode_dataset(solved, solved.modes[0])
    bias = dataset.current_density.values[ALL_MECHANISMS.index("bias_or_emitter")]
    assert bias[1] * 5.0 == pytest.approx(dataset.string_current.values, rel=1e-12)
    last = dataset.current_density.values[: len(ALL_MECHANISMS) - 2, 1, -1].sum() * 5.0
    assert dataset.string_current.values[-1] == pytest.approx(-last, rel=1e-2)  # at rest
    said = "\n".join(cautions(solved.loaded, solved.modes[0]))
    assert "specialist review" in said
    assert "discharges below -100 V" in said
    assert "snap-over" not in said
    # 60 m2 of bare structure bring ions for 0.6 of the string: its upper end stands high
    loaded = case_of(voltage=1000.0, bus=60.0)
    assert "snap-over" in "\n".join(cautions(loaded, solve_mode(loaded)))


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ('surface = "front"', 'surface = "frond"', "is no surface"),
        ('material = "bare collector"\nexposed', 'material = "alumina"\nexposed', "no conductor"),
        ("voltage_V = 100.0", "voltage_V = -5.0", "voltage_V"),
        ('grounded = "negative"', 'grounded = "both"', "negative"),
        ('grounded = "negative"', "negative_end_m = [0.0, 1.0, 0.0]", "positive_end_m"),
    ],
)
def test_refused_strings(old: str, new: str, words: str) -> None:
    text = CASE.format(light=1.0, bus=0.3, voltage=100.0, grounded="negative")
    assert old in text
    with pytest.raises(InputError, match=words):
        load_case_text(text.replace(old, new), plasma_texts={"low.toml": PLASMA})


def test_motion_through_the_field_moves_the_ends() -> None:
    """v x B . L by hand: nadir pointing keeps body y along the normal of the orbit."""
    flying = (
        CASE.replace(
            'kind = "fixed"\nillumination = {light}\nsun_direction = [0.0, 0.0, 1.0]\n'
            "duration_h = 0.02",
            'kind = "kepler"\nepoch = 2031-03-20T00:00:00Z\nsemi_major_axis_km = 6778.0\n'
            "eccentricity = 0.001\ninclination_deg = 51.6\nraan_deg = 40.0\n"
            "argument_of_perigee_deg = 0.0\nmean_anomaly_deg = 0.0\n"
            "[time]\nduration_h = 1.5\noutput_step_s = 600.0",
        )
        + "negative_end_m = [0.0, 2.0, 0.0]\npositive_end_m = [0.0, 12.0, 0.0]\n"
    )
    loaded = load_case_text(
        flying.format(bus=0.3, voltage=100.0, grounded="negative"),
        plasma_texts={"low.toml": PLASMA},
    )
    around, way = surroundings_of(loaded), path(loaded.case, None, loaded.files)
    times = np.linspace(0.0, 5400.0, 31)
    added = around.string_ends_V(times)
    assert added is not None
    assert way.trajectory is not None
    r, v = way.trajectory.position_velocity(times)
    turning = np.cross([0.0, 0.0, 7.292e-5], r.T).T
    field = field_T(r, moments(loaded.case, times))
    aboard = np.cross((v - turning).T, field.T).T
    normal = np.cross(r.T, v.T).T
    normal /= np.sqrt((normal**2).sum(axis=0))
    across = (aboard * normal).sum(axis=0)
    sign = np.sign(added[0, 1] / across[0])  # which way the law of attitude turns y
    assert added[:, 0] == pytest.approx(sign * 2.0 * across, abs=2e-3)
    assert added[:, 1] == pytest.approx(sign * 12.0 * across, abs=1e-2)
    # 7.7 km/s through at most 5e-5 T of vertical field, over 12 m
    assert 1.0 < np.abs(added[:, 1]).max() < 7.7e3 * 5e-5 * 12.0
