"""Conductivity by radiation: the law, a film that leaks by it, regions, what a run says."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.constants import epsilon_0

from charging.case import load_case_text
from charging.cautions import cautions
from charging.errors import InputError
from charging.network.march import Tolerance, march
from charging.orbit_run import run_case, solve_mode, surroundings_of
from materials.conduction import radiation_induced_conductivity
from materials.library import load_material, material_names

CASE = """\
title = "A film under a dose rate"
[orbit]
kind = "fixed"
illumination = 0.0
sun_direction = [0.0, 0.0, 1.0]
duration_h = 0.01
[emission]
secondary_law = "sanders_inouye_1979"
[plasma]
use = "ECSS geostationary worst case"
[body]
radius_m = 1.0
barrier = false
[[surface]]
name = "body"
material = "gold"
area_m2 = 4.0
normal = [0.0, 0.0, 1.0]
[[surface]]
name = "film"
material = "{material}"
area_m2 = 1.0
thickness_m = 1e-4
temperature_K = 220.0
normal = [0.0, 0.0, -1.0]
[radiation]
{radiation}
"""


def test_power_law() -> None:
    """Fowler (1956): k D^Delta; Delta 1/2 gives ten times for a hundred times the dose rate."""
    found = radiation_induced_conductivity(
        [0.0, 1e-4, 1e-2], at_1_rad_s_S_m=2e-14, exponent=[0.5, 0.5, 0.5]
    )
    assert found == pytest.approx([0.0, 2e-16, 2e-15], rel=1e-12)
    with pytest.raises(ValueError, match="dose_rate_rad_s"):
        radiation_induced_conductivity(-1.0, at_1_rad_s_S_m=1e-14, exponent=0.7)


def test_records_hold_both_figures_with_spreads() -> None:
    count = 0
    for name in material_names():
        values = load_material(name).values
        both = [k in values for k in ("radiation_conductivity_S_m",
                                      "radiation_conductivity_exponent")]  # fmt: skip
        assert both[0] == both[1]
        if both[0]:
            count += 1
            assert 0.5 <= values["radiation_conductivity_exponent"].value <= 1.0
            assert values["radiation_conductivity_S_m"].basis in ("memory", "assumed")
    assert count == 9


def test_a_film_leaks_with_eps_over_sigma() -> None:
    """Without plasma the voltage over a film falls as exp(-t sigma/eps), sigma by hand.

    The dark conductivity of the record at 220 K is less than 1e-4 of it.
    """
    loaded = load_case_text(CASE.format(material="PTFE", radiation="dose_rate_rad_s = 100.0"))
    balance = solve_mode(loaded).balance
    dark = np.zeros_like(balance.table.coefficients)
    balance = replace(balance, table=replace(balance.table, coefficients=dark))
    sigma = 1e-14 * 100.0**0.7
    tau = epsilon_0 * loaded.materials["PTFE"].value("relative_permittivity") / sigma
    (path,) = march(
        balance,
        np.array([[0.0, -10.0]]),
        span_s=(0.0, 2.0 * tau),
        tolerance=Tolerance(1e-6, 1e-8),
        first_step_s=1e-3,
    )
    times = np.linspace(0.0, 2.0 * tau, 9)
    assert path(times)[:, 1] == pytest.approx(-10.0 * np.exp(-times / tau), rel=2e-3)
    # Jacobian: the induced part has no field enhancement
    y = np.array([[-3.0, -4000.0]])
    one = np.zeros(1, dtype=np.intp)
    _, jacobian = balance.rhs_and_jacobian(one, np.zeros(1), y)
    up, down = (balance.rhs(one, np.zeros(1), y + np.array([[0.0, d]])) for d in (0.01, -0.01))
    assert jacobian[0, 1, 1] == pytest.approx(float((up - down)[0, 1] / 0.02), rel=1e-6)


def test_dose_rates_by_region_follow_the_orbit() -> None:
    text = CASE.replace('kind = "fixed"\nillumination = 0.0\nsun_direction = [0.0, 0.0, 1.0]\n'
                        "duration_h = 0.01", 'kind = "kepler"\nepoch = 2031-03-20T00:00:00Z\n'
                        "semi_major_axis_km = 26600.0\neccentricity = 0.7\ninclination_deg = 10.0\n"
                        "raan_deg = 0.0\nargument_of_perigee_deg = 0.0\nmean_anomaly_deg = 0.0\n"
                        "[time]\nduration_h = 5.0\noutput_step_s = 600.0"
                        ).replace('use = "ECSS geostationary worst case"',
                                  'model = "regions"\nkp = 2.0')  # fmt: skip
    table = 'dose_rate_rad_s = 1e-4\nby_region = {"plasmasphere" = 0.02}'
    loaded = load_case_text(text.format(material="polyimide film", radiation=table))
    around = surroundings_of(loaded)
    times = np.linspace(0.0, 18000.0, 400)
    dose = around.dose_rate_rad_s(times)
    assert around.along is not None
    names = [around.along.name_at(t) for t in times]
    assert dose.min() >= 1e-4 * (1.0 - 1e-12)
    assert dose.max() == pytest.approx(0.02)
    inside = np.array([n == "plasmasphere" for n in names])
    assert inside.any()
    assert not inside.all()
    assert dose[inside].min() > 0.0079
    assert dose[~inside].max() < 0.0121


def test_a_run_says_what_the_figures_are_worth() -> None:
    loaded = load_case_text(
        CASE.format(material="anodised aluminium", radiation="dose_rate_rad_s = 0.1")
    )
    solved = run_case(loaded)
    said = "\n".join(cautions(loaded, solved.modes[0]))
    assert "order of magnitude" in said
    assert "no figure for the conductivity that radiation adds to anodised aluminium" in said


def test_refused() -> None:
    for radiation, words in (
        ("dose_rate_rad_s = -1.0", "dose_rate_rad_s"),
        ('by_region = {"plasmasphere" = 0.1}', "regions"),
    ):
        with pytest.raises(InputError, match=words):
            load_case_text(CASE.format(material="polyimide film", radiation=radiation))
