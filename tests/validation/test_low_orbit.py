"""Potentials in low orbit against observed ones: calm ionosphere and auroral charging."""

import numpy as np
import pytest
from scipy.constants import e, epsilon_0
from scipy.optimize import brentq

from charging.currents.collection import sheath_weight
from charging.currents.flow import flow_current, plane_limit, wake_assessable
from environments.ionosphere import ionosphere
from environments.magnetosphere import MEAN_RADIUS_M
from environments.species import HELIUM_ION, HYDROGEN_ION, OXYGEN_ION
from environments.thermal_flux import one_sided_maxwellian_current

MASS = np.array([s.mass_kg for s in (OXYGEN_ION, HELIUM_ION, HYDROGEN_ION)])
RADIUS_M, SPEED = 1.0, 7450.0


def _ions(potential, density, te, ti, cosine, speed=SPEED):
    """Ion current density [A m-2] of a patch, all species."""
    debye = np.sqrt(epsilon_0 * te / (e * np.sum(density)))
    found = sheath_weight(
        np.asarray(potential), debye_length_m=debye, temperature_eV=np.asarray(te),
        radius_m=RADIUS_M, collection="auto",
    )  # fmt: skip
    where = (potential, density, ti, MASS, 1, speed, cosine)
    return float(np.sum(flow_current(*where, thick_weight=found.weight).current_A_m2))


def _floats(density, te, ti, cosine, hot_current=0.0, hot_temperature=6000.0):
    """Potential of an unemitting dark patch [V]."""

    def net(potential):
        cold = one_sided_maxwellian_current(np.sum(density), te) * np.exp(potential / te)
        hot = hot_current * np.exp(potential / hot_temperature)
        return _ions(potential, density, te, ti, cosine) + float(cold) - hot

    return brentq(net, -1e5, 0.0)


def _hot(flux_above_14_keV_cm2_s_sr, temperature_eV=6000.0):
    """Current density of a Maxwellian with that integral flux above 14 keV [A m-2]."""
    x = 14e3 / temperature_eV
    return e * np.pi * 1e4 * flux_above_14_keV_cm2_s_sr / ((1.0 + x) * np.exp(-x))


def test_bare_body_in_the_day_ionosphere():
    """-0.7 V class in O+ with ram flow; calm bodies -0.2 to -2 V (derived from ram currents).

    Electron temperature 0.19 eV and O+ 0.10 eV at 400 km by day (IRI, Kelley; memory).
    """
    node, weight = np.polynomial.legendre.leggauss(8)
    density, te, ti = np.array([1e12, 0.0, 0.0]), 0.19, 0.10

    def net(potential):
        ions = [_ions(potential, density, te, ti, c, 7670.0) for c in node]
        cold = one_sided_maxwellian_current(1e12, te) * np.exp(potential / te)
        return 0.5 * float(np.sum(weight * ions)) + float(cold)

    found = brentq(net, -5.0, 0.0)
    assert found == pytest.approx(-0.7, abs=0.05)


def test_cold_estimate_of_the_bare_body():
    """The same from T ln(4 random electrons / n u), ions as a cold beam on the cross-section."""
    random = 1e12 * np.sqrt(e * 0.19 / (2.0 * np.pi * 9.109e-31))
    assert -0.19 * np.log(4.0 * random / (1e12 * 7670.0)) == pytest.approx(-0.70, abs=0.02)


# DMSP conditions: thermal density below 1e4 cm-3 and integral flux above 14 keV above
# 1e8 cm-2 s-1 sr-1 at a dark craft (Gussenhoven et al. 1985, memory); necessary, not sufficient.
@pytest.mark.parametrize("density_cm3", [100.0, 1e3, 3e3])
@pytest.mark.parametrize("flux", [1e9, 3e9])
def test_dark_wake_charges_where_density_is_low_and_flux_high(density_cm3, flux):
    """Observed -46 to -1430 V, to -2000 V in the cycle (factor 3)."""
    density = density_cm3 * 1e6 * np.array([0.9, 0.01, 0.09])
    found = _floats(density, 0.12, 0.10, -1.0, _hot(flux))
    assert -3.0 * 2000.0 < found < -46.0


@pytest.mark.parametrize(
    ("density_cm3", "flux"),
    [(1e5, 1e9), (1e6, 1e9), (1e6, 3e9), (1e3, 1e7), (1e4, 1e7), (1e6, 1e8)],
)
def test_no_charging_outside_of_these_conditions(density_cm3, flux):
    density = density_cm3 * 1e6 * np.array([0.9, 0.01, 0.09])
    assert _floats(density, 0.12, 0.10, -1.0, _hot(flux)) > -46.0


def test_wake_side_leads():
    """Wake below flank below ram at the same plasma, in every case that charges."""
    for density_cm3 in (100.0, 1e3):
        density = density_cm3 * 1e6 * np.array([0.9, 0.01, 0.09])
        wake, flank, ram = (_floats(density, 0.12, 0.10, c, _hot(1e9)) for c in (-1.0, 0.0, 1.0))
        assert wake < flank < ram < 0.0


def test_light_ions_decide_the_wake():
    """Without them the orbit model alone would give several times the voltage: not assessable."""
    mixed, alone = 1e9 * np.array([0.9, 0.01, 0.09]), np.array([1e9, 0.0, 0.0])
    speed_ratio = SPEED / np.sqrt(2.0 * e * 0.10 / MASS)
    assert wake_assessable(mixed, MASS, speed_ratio, -1.0)
    assert not wake_assessable(alone, MASS, speed_ratio, -1.0)
    ratio = _floats(alone, 0.12, 0.10, -1.0, _hot(1e9)) / _floats(
        mixed, 0.12, 0.10, -1.0, _hot(1e9)
    )
    assert ratio > 3.0


def test_one_integral_flux_against_ram_oxygen():
    """1e8 cm-2 s-1 sr-1 is 0.50 uA m-2, ram O+ at 1e4 cm-3 12 uA m-2 (derived)."""
    assert e * np.pi * 1e12 == pytest.approx(0.50e-6, rel=0.01)
    ram = plane_limit(0.0, 1e10, 0.2, MASS[0], 1, 7450.0, 1.0).current_A_m2
    assert float(ram) == pytest.approx(12e-6, rel=0.01)


def test_winter_night_and_day_of_one_orbit_differ():
    """The plasma of a polar orbit at 840 km, F10.7 75: low only in the winter night."""
    times = np.full(2, np.datetime64("2031-12-21T12:00:00", "ns"))
    sun = 1.5e11 * np.array([[0.0, 0.0], [-0.917, -0.917], [-0.398, -0.398]])
    radius = MEAN_RADIUS_M + 840e3
    night = [0.0, np.cos(np.radians(68.0)), np.sin(np.radians(68.0))]
    day = [0.0, -1.0, 0.0]
    found = ionosphere(times, radius * np.array([night, day]).T, sun, 75.0)
    assert found.electron_density_m3[0] < 3e9 < 1e10 < found.electron_density_m3[1]
