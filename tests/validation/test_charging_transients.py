"""A run is a real initial-value problem: slopes, relaxations, closed forms, another integrator.

Every expected number here is worked out apart from the kernels: from material values and
plasma figures with plain quadrature, or by scipy's integrators.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from math import exp, expm1, pi, sqrt

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.constants import e, epsilon_0, m_e, m_p
from scipy.integrate import quad, solve_ivp
from scipy.optimize import brentq, minimize_scalar

from charging.audit import charge_audit
from charging.case import load_case_text
from charging.currents.emission import SECONDARY_LAWS
from charging.network.march import Tolerance, march
from charging.network.rosenbrock import RODAS
from charging.orbit_run import CaseRun, ModeRun, run_case, solve_mode
from environments.catalogue import load_plasma
from environments.plasma import Plasma
from materials import load_material
from materials.library import library_text as material_text
from materials.record import Material

Array = NDArray[np.float64]
ECSS = "ECSS geostationary worst case"

# --- an independent current balance of a dark surface on a sphere -------------------------


def secondary_at_angle(material: Material, law: str) -> Callable[[float, float], float]:
    """δ(E, μ) of true secondaries from the published forms, maximum found by search."""
    peak = material.value("secondary_yield_peak")
    e_max = material.value("secondary_yield_peak_energy_eV")
    if material.values["secondary_yield_peak"].holds == "total":
        peak -= material.value("backscatter_high_energy") - material.get(
            "backscatter_low_energy_drop", 0.0
        ) * exp(-e_max / material.get("backscatter_drop_energy_eV", 1.0))
    if law == "sanders_inouye_1979":

        def shape(x: float) -> float:
            return exp(-x / 4.3) - exp(-x / 0.367)

        found = minimize_scalar(lambda x: -shape(x), bounds=(0.5, 2.0), method="bounded",
                                options={"xatol": 1e-12})  # fmt: skip
        place, top = float(found.x), -float(found.fun)
        t = 0.2755 * (np.log(material.value("mean_atomic_number")) - 1.658)
        b = exp(t - sqrt(t**2 + 0.0228))

        def delta(energy: float, mu: float) -> float:
            x = energy / e_max
            onset = (1.0 - exp(-x)) ** 2
            return peak * shape(place * x) / top * (1.0 + (exp(b * (1.0 - mu)) - 1.0) * onset)

        return delta
    r = brentq(lambda r: (1.0 - 1.0 / 1.67) * expm1(r) - r, 0.5, 3.0)

    def power_law(energy: float, mu: float) -> float:
        x = energy / e_max
        return peak * x**-0.67 * -expm1(-r * x**1.67 * mu) / mu / -expm1(-r)

    return power_law


def isotropic(yield_at: Callable[[float, float], float], energy: float) -> float:
    return 2.0 * float(quad(lambda mu: mu * yield_at(energy, mu), 0.0, 1.0, epsrel=1e-8)[0])


def dark_current(material: Material, plasma: Plasma, potential: float, law: str) -> float:
    """Net current density [A m-2] of a dark surface below the plasma, thick sheath."""
    delta = secondary_at_angle(material, law)
    c = 7.37 * material.value("mean_atomic_number") ** -0.56875
    high, drop = (material.value("backscatter_high_energy"),
                  material.get("backscatter_low_energy_drop", 0.0))  # fmt: skip
    scale = material.get("backscatter_drop_energy_eV", 1.0)

    def eta(energy: float, mu: float) -> float:
        return (high - drop * exp(-energy / scale)) * exp(c * (1.0 - mu))

    g_max, g_energy = material.value("ion_yield_peak"), material.value("ion_yield_peak_energy_eV")
    total = 0.0
    for p in plasma.populations:
        t_eV = p.temperature_eV
        if p.species.charge_number < 0:
            thermal = e * p.density_m3 * sqrt(e * t_eV / (2.0 * pi * m_e))

            def released(log_t: float, t_eV: float = t_eV) -> float:
                t = exp(log_t)
                out = isotropic(delta, t_eV * t) + isotropic(eta, t_eV * t)
                return t**2 * exp(-t) * out

            mean = quad(released, np.log(1e-7), np.log(60.0), epsrel=1e-6, limit=200)[0]
            total -= thermal * exp(potential / t_eV) * (1.0 - mean)
        else:
            thermal = e * p.density_m3 * sqrt(e * t_eV / (2.0 * pi * m_p))
            u = -potential / t_eV

            def impact(log_t: float, t_eV: float = t_eV, u: float = u) -> float:
                t = exp(log_t)
                x = (t_eV * t - potential) / g_energy
                # yield at normal incidence, as the model states
                return t**2 * exp(-t) * (1.0 + u / t) * 2.0 * g_max * sqrt(x) / (1.0 + x)

            total += thermal * (1.0 + u)
            total += thermal * quad(impact, np.log(1e-12), np.log(60.0), epsrel=1e-8, limit=200)[0]
    return float(total)


FILM_CASE = """\
title = "A small dark film on a large structure"
[orbit]
kind = "fixed"
illumination = 0.0
sun_direction = [0.0, 0.0, 1.0]
duration_h = {hours}
[time]
output_step_s = 1.0
[plasma]
use = "{plasma}"
[body]
radius_m = 1.0
collection = "sphere"
[emission]
secondary_law = "both"
[[surface]]
name = "body"
material = "{body}"
area_m2 = 12.0
normal = [0.0, 0.0, 1.0]
[[surface]]
name = "film"
material = "{film}"
area_m2 = 1e-4
thickness_m = {thickness}
temperature_K = 298.15
normal = [0.0, 0.0, 1.0]
"""
FILM = "FEP film, silvered"


def film_run(thickness: float = 127e-6, hours: float = 0.002) -> ModeRun:
    text = FILM_CASE.format(
        plasma=ECSS, film=FILM, body="oxidised aluminium", thickness=thickness, hours=hours
    )
    return solve_mode(load_case_text(text))


def settled_slope(mode: ModeRun, member: int) -> tuple[float, float, float]:
    """Differential slope [V/s] just after structure has settled, structure [V], differential."""
    path = mode.trajectories[member]
    times = np.linspace(0.4, 0.8, 21)
    y = path(times)
    assert np.ptp(y[:, 0]) < 1e-3 * abs(y[-1, 0]), "structure has not settled"
    return float(np.polyfit(times, y[:, 1], 1)[0]), float(y[:, 0].mean()), float(y[:, 1].mean())


@pytest.mark.parametrize("member", [0, 1], ids=SECONDARY_LAWS)
def test_dark_film_starts_at_current_over_capacitance(member: int) -> None:
    mode = film_run()
    slope, structure, differential = settled_slope(mode, member)
    assert structure < -3000.0
    assert 0.5 < abs(differential) < 0.01 * 400.0  # against the colder electrons of the plasma
    material = load_material(FILM)
    current = dark_current(
        material, load_plasma(ECSS), structure + differential, SECONDARY_LAWS[member]
    )
    capacitance = epsilon_0 * material.value("relative_permittivity") / 127e-6
    print(f"slope over J/C - 1: {slope * capacitance / current - 1.0:.1e}")
    assert slope == pytest.approx(current / capacitance, rel=0.01)


@pytest.mark.parametrize("member", [0, 1], ids=SECONDARY_LAWS)
def test_doubling_the_thickness_doubles_the_slope(member: int) -> None:
    thin, thick = (settled_slope(film_run(d), member)[0] for d in (127e-6, 254e-6))
    assert thick / thin == pytest.approx(2.0, rel=5e-3)


def test_first_instants_charge_structure_at_the_thermal_current() -> None:
    """Before anything is repelled the body charges at ΣJ(0) A/C of its free space."""
    mode = film_run()
    path = mode.trajectories[0]
    free = 4.0 * pi * epsilon_0 * 1.0
    material = load_material("oxidised aluminium")
    current = dark_current(material, load_plasma(ECSS), -1e-6, SECONDARY_LAWS[0]) * 12.0
    time = 2e-6
    assert path(np.array([time]))[0, 0] / time == pytest.approx(current / free, rel=0.02)


def leaky_film() -> str:
    """Record of the film with a resistivity of 1e10 ohm m."""
    record = material_text(FILM)
    assert record.count("value  = 1e18") == 1
    return record.replace("value  = 1e18", "value  = 1e10").replace("low = 1e17", "low = 1e9")


def test_leaky_film_relaxes_with_its_own_time_constant() -> None:
    """V(t) = V_end (1 - exp(-t/RC)), RC = ε0 εr ρ, whatever the thickness."""
    resistivity = 1e10
    text = FILM_CASE.format(
        plasma=ECSS, film="leaky.toml", body="oxidised aluminium", thickness=1e-3, hours=0.0006
    )
    loaded = load_case_text(text, material_texts={"leaky.toml": leaky_film()})
    mode = solve_mode(loaded)
    path = mode.trajectories[0]
    material = load_material(FILM)
    tau = epsilon_0 * material.value("relative_permittivity") * resistivity
    assert tau == pytest.approx(0.1815, rel=1e-3)
    end = float(path(np.array([2.0]))[0, 1])
    structure = float(path(np.array([2.0]))[0, 0])
    current = dark_current(material, load_plasma(ECSS), structure + end, SECONDARY_LAWS[0])
    assert end == pytest.approx(current * resistivity * 1e-3, rel=0.01)
    times = np.linspace(0.1, 0.6, 26)
    left = np.log(1.0 - path(times)[:, 1] / end)
    rate, offset = np.polyfit(times, left, 1)
    assert -1.0 / rate == pytest.approx(tau, rel=0.01)
    assert offset == pytest.approx(0.0, abs=0.08)  # the milliseconds in which structure settles


EMPTY = """\
name = "next to nothing"
title = "A plasma without effect"
source = "a test"
basis = "assumed"
[[population]]
species = "electron"
law = "maxwellian"
density_m3 = 1.0
temperature_eV = 1.0
[[population]]
species = "H+"
law = "maxwellian"
density_m3 = 1.0
temperature_eV = 1.0
"""


def test_charged_film_without_plasma_discharges_exponentially() -> None:
    text = FILM_CASE.format(
        plasma="empty.toml", film="leaky.toml", body="gold", thickness=127e-6, hours=0.001
    )
    mode = solve_mode(
        load_case_text(
            text, plasma_texts={"empty.toml": EMPTY}, material_texts={"leaky.toml": leaky_film()}
        )
    )
    tau = epsilon_0 * load_material(FILM).value("relative_permittivity") * 1e10
    end = 3.0 * tau
    start = np.tile([0.0, 1e-2], (2, 1))  # 79 V/m: enhancement and plasma below 1e-4
    paths = march(mode.balance, start, span_s=(0.0, end), tolerance=Tolerance(1e-8, 0.0))
    times = np.linspace(0.0, end, 200)
    for path in paths:
        assert path(times)[:, 1] == pytest.approx(1e-2 * np.exp(-times / tau), rel=3e-4)


def test_warm_film_discharges_faster_by_the_arrhenius_factor() -> None:
    material = load_material(FILM)
    slopes = []
    for temperature in (298.15, 313.15):
        text = FILM_CASE.format(
            plasma="empty.toml", film=FILM, body="gold", thickness=127e-6, hours=0.001
        ).replace("temperature_K = 298.15", f"temperature_K = {temperature}")
        mode = solve_mode(load_case_text(text, plasma_texts={"empty.toml": EMPTY}))
        flows = mode.balance.flows(0, np.zeros(1), np.array([[0.0, 1e-2]]))
        slopes.append(flows.film_A_m2[0, 0])
    boltzmann_eV = 8.617333262e-5
    expected = exp(
        material.value("activation_energy_eV") / boltzmann_eV * (1.0 / 298.15 - 1.0 / 313.15)
    )
    assert slopes[1] / slopes[0] == pytest.approx(expected, rel=1e-4)


# --- a bare sphere: closed-form currents --------------------------------------------------

SPHERE = """\
title = "Bare sphere"
[orbit]
kind = "fixed"
illumination = 1.0
sun_direction = [0.0, 0.0, 1.0]
duration_h = 0.001
[plasma]
use = "{plasma}"
[body]
radius_m = 0.8
collection = "sphere"
[[surface]]
name = "sphere"
material = "bare collector"
area_m2 = 8.0
normal = [0.0, 0.0, 1.0]
"""


@pytest.mark.parametrize("name", [ECSS, "quiet geostationary", "substorm, 3 keV class"])
def test_bare_sphere_charges_as_its_closed_form(name: str) -> None:
    mode = solve_mode(load_case_text(SPHERE.format(plasma=name)))
    plasma = load_plasma(name)

    def rate(_: float, v: Array) -> Array:
        total = 0.0
        for p in plasma.populations:
            mass, t = p.species.mass_kg, p.temperature_eV
            thermal = e * p.density_m3 * sqrt(e * t / (2.0 * pi * mass))
            sign = float(p.species.charge_number)
            pull = -sign * v[0] / t
            total += sign * thermal * (1.0 + pull if pull > 0.0 else exp(pull))
        return np.array([total * 8.0 / (4.0 * pi * epsilon_0 * 0.8)])

    for path in mode.trajectories:
        times = np.concatenate([path.start_s + path.step_s, np.geomspace(1e-6, 3.6, 300)])
        times = np.unique(np.minimum(times, 3.6))
        found = solve_ivp(rate, (0.0, 3.6), [0.0], method="Radau", rtol=1e-10, atol=1e-9,
                          t_eval=times)  # fmt: skip
        ours = path(times)[:, 0]
        error = np.abs(ours - found.y[0]) / np.maximum(0.1, 1e-3 * np.abs(found.y[0]))
        print(f"{name}: worst {error.max():.2f} of the bar")
        assert error.max() < 1.0
        assert abs(rate(0.0, path.y_end[-1])[0]) < 1e-6 * abs(rate(0.0, np.zeros(1))[0])


# --- conservation of charge ---------------------------------------------------------------


def test_charge_audit_closes(demo_day: CaseRun, static_case: CaseRun) -> None:
    for run in (demo_day, static_case):
        for mode in run.modes:
            for member, path in enumerate(mode.trajectories):
                assert charge_audit(mode.balance, member, path).relative < 1e-4


def test_audit_finds_charge_that_vanished(static_case: CaseRun) -> None:
    mode = static_case.modes[1]
    path = mode.trajectories[0]
    wrong = replace(path, y_end=path.y_end * 1.001)
    assert charge_audit(mode.balance, 0, wrong).relative > 1e-4


@pytest.mark.parametrize("which", ["demo", "static"])
def test_every_step_stores_what_its_stages_brought(
    demo_day: CaseRun, static_case: CaseRun, which: str
) -> None:
    """Discrete identity M Δy = h Σ b_i (f_i + J Σ γ_ij k_j + γ_i h f_t) to 1e-9.

    The steps are repeated in the textbook form of a Rosenbrock method (Hairer & Wanner 1996,
    eq. IV.7.4), with α, γ, b recovered from the coefficients of the implementation.
    """
    mode = (demo_day if which == "demo" else static_case).modes[-1]
    a = np.zeros((6, 6))
    c = np.zeros((6, 6))
    for i in range(6):
        c[i, : len(RODAS.c[i])] = RODAS.c[i]
        a[i, : len(RODAS.a[i])] = RODAS.a[i]
    gamma = np.linalg.inv(np.eye(6) / RODAS.gamma - c)  # Γ⁻¹ = diag(1/γ) - C
    alpha = a @ gamma
    weights = np.append(RODAS.a[5], 1.0) @ gamma  # y1 = y0 + Σ m_i u_i, u = Γ k
    assert weights.sum() == pytest.approx(1.0, abs=1e-12)
    assert alpha.sum(axis=1) == pytest.approx(np.array(RODAS.alpha), abs=1e-10)
    assert gamma.sum(axis=1) == pytest.approx(np.array(RODAS.gamma_t), abs=1e-10)
    balance, mass = mode.balance, mode.balance.mass
    path = mode.trajectories[0]
    one = np.array([0])
    worst_state, worst_charge = 0.0, 0.0
    rounding = 4.0 * np.finfo(np.float64).eps * np.abs(mass)  # of y, seen as charge
    for step in range(1, len(path.step_s), max(1, len(path.step_s) // 60)):
        t, h, y = path.start_s[step], path.step_s[step], path.y_start[step]
        _, jacobian = balance.rhs_and_jacobian(one, np.array([t]), y[None])
        matrix = jacobian[0]
        delta = 1e-4 * h
        f_t = (
            balance.rhs(one, np.array([t + delta]), y[None])
            - balance.rhs(one, np.array([t]), y[None])
        )[0] / delta
        slopes = np.zeros((6, len(y)))
        brought = np.zeros_like(y)
        throughput = np.zeros_like(y)
        for i in range(6):
            state = y + alpha[i] @ slopes
            f = balance.rhs(one, np.array([t + RODAS.alpha[i] * h]), state[None])[0]
            known = h * f + h * matrix @ (gamma[i] @ slopes) + RODAS.gamma_t[i] * h**2 * f_t
            slopes[i] = np.linalg.solve(mass - h * RODAS.gamma * matrix, known)
            arrived = known + h * matrix @ (RODAS.gamma * slopes[i])
            brought += weights[i] * arrived
            flows = balance.flows(0, np.array([t + RODAS.alpha[i] * h]), state[None])
            gross = np.abs(flows.surface_A_m2[0]).sum(axis=-1) * balance.net.area_m2
            throughput += abs(weights[i]) * h * (balance.net.moves @ gross)
        change = path.y_end[step] - y
        again = weights @ slopes
        size = np.maximum(1e-3, np.abs(path.y_end[step]).max())
        worst_state = max(worst_state, float(np.abs(again - change).max() / size))
        missing = np.abs(mass @ change - brought) - rounding @ np.abs(path.y_end[step])
        worst_charge = max(worst_charge, float((missing / throughput).max()))
    print(f"state {worst_state:.1e}, charge {worst_charge:.1e} of the throughput")
    assert worst_state < 1e-9
    assert worst_charge < 1e-9


def test_two_runs_of_a_case_are_the_same_to_the_last_bit(static_case: CaseRun) -> None:
    again = run_case(static_case.loaded)
    for old, new in zip(static_case.modes, again.modes, strict=True):
        for one, other in zip(old.trajectories, new.trajectories, strict=True):
            assert np.array_equal(one.y_end, other.y_end)
            assert np.array_equal(one.start_s, other.start_s)


def test_equilibrium_start_is_where_the_uncharged_run_ends(static_case: CaseRun) -> None:
    text = static_case.loaded.text.replace(
        "[time]\nduration_h = 24.0", '[time]\nstart = "equilibrium"\nduration_h = 1.0'
    )
    mode = run_case(load_case_text(text)).modes[1]
    for member, path in enumerate(mode.trajectories):
        rates = np.ptp(np.concatenate([path.y_start, path.y_end]), axis=0)
        assert (rates < 1.0).all()
        settled = static_case.modes[1].trajectories[member].y_end[-1]
        assert path.y_end[-1, 0] == pytest.approx(settled[0], rel=0.02)
