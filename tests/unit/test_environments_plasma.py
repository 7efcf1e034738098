"""Populations, their moments and what is refused."""

import numpy as np
import pytest
from scipy.constants import e, epsilon_0, m_e
from scipy.integrate import quad

from environments.errors import EnvironmentDataError
from environments.plasma import (
    ELECTRON,
    HELIUM_ION,
    HYDROGEN_ION,
    OXYGEN_ION,
    Plasma,
    Population,
    Species,
    electron_debye_length_m,
    electron_to_ion_current_ratio,
    moments,
    one_sided_maxwellian_current,
    population_names,
)


def plasma_of(*populations: Population) -> Plasma:
    return Plasma("test", "test", "none", "assumed", None, "", populations)


@pytest.mark.parametrize("species", [ELECTRON, HYDROGEN_ION, HELIUM_ION, OXYGEN_ION])
@pytest.mark.parametrize("temperature_eV", [0.1, 3000.0])
def test_current_is_the_integral_over_velocity(species, temperature_eV):
    # q n int_0^inf v (m / 2 pi T)^(1/2) exp(-m v^2 / 2T) dv, in units of sqrt(2T/m)
    fastest = np.sqrt(2.0 * e * temperature_eV / species.mass_kg)
    integral = quad(lambda s: s * np.exp(-s * s) / np.sqrt(np.pi), 0.0, 12.0, epsrel=1e-12)[0]
    expected = species.charge_number * e * 1.3e6 * fastest * integral
    ours = one_sided_maxwellian_current(
        1.3e6, temperature_eV, mass_kg=species.mass_kg, charge_number=species.charge_number
    )
    assert float(ours) == pytest.approx(expected, rel=1e-10)


def test_moments_follow_from_integrals_over_energy():
    temperature = 250.0
    population = Population(HYDROGEN_ION, "maxwellian", 2e6, temperature)
    found = moments(plasma_of(population))

    def weight(power):  # flux weight E exp(-E/T) with one more power of E each
        return quad(lambda x: x**power * np.exp(-x), 0.0, 60.0, epsrel=1e-12)[0]

    assert found["flux_mean_energy_eV"][0] == pytest.approx(
        temperature * weight(2) / weight(1), rel=1e-9
    )
    assert found["mean_energy_eV"][0] == pytest.approx(
        temperature * weight(1.5) / weight(0.5), rel=1e-7
    )
    assert found["energy_flux_eV_m2_s"][0] == pytest.approx(
        found["number_flux_m2_s"][0] * found["flux_mean_energy_eV"][0], rel=1e-12
    )
    assert found["current_density_A_m2"][0] > 0.0
    assert found["number_flux_m2_s"][0] > 0.0


def test_electron_number_flux_is_positive_and_current_negative():
    found = moments(plasma_of(Population(ELECTRON, "maxwellian", 1e6, 1e3)))
    assert found["current_density_A_m2"][0] < 0.0 < found["number_flux_m2_s"][0]


def test_debye_length_adds_electrons_and_leaves_ions_out():
    cold = Population(ELECTRON, "maxwellian", 1e6, 100.0)
    hot = Population(ELECTRON, "maxwellian", 1e5, 3e3)
    ions = Population(HYDROGEN_ION, "maxwellian", 1e6, 1.0)
    expected = (1e6 * e / (epsilon_0 * 100.0) + 1e5 * e / (epsilon_0 * 3e3)) ** -0.5
    assert electron_debye_length_m(plasma_of(cold, hot, ions)) == pytest.approx(expected)
    with pytest.raises(EnvironmentDataError, match="no electrons"):
        electron_debye_length_m(plasma_of(ions))


def test_ratio_needs_ions():
    electrons = Population(ELECTRON, "maxwellian", 1e6, 1e3)
    with pytest.raises(EnvironmentDataError, match="no positive ions"):
        electron_to_ion_current_ratio(plasma_of(electrons))


def test_negative_ions_are_no_electrons_in_the_ratio():
    electrons = Population(ELECTRON, "maxwellian", 1e6, 1e3)
    ions = Population(OXYGEN_ION, "maxwellian", 1e6, 1e3)
    negative = Population(Species("O-", OXYGEN_ION.mass_kg, -1), "maxwellian", 1e6, 1e3)
    ratio = electron_to_ion_current_ratio(plasma_of(electrons, negative, ions))
    # equal densities and temperatures: the root of the ratio of masses
    assert ratio == pytest.approx(np.sqrt(OXYGEN_ION.mass_kg / ELECTRON.mass_kg))
    with pytest.raises(EnvironmentDataError, match="no electrons"):
        electron_to_ion_current_ratio(plasma_of(negative, ions))


def test_names_tell_populations_apart():
    electrons = Population(ELECTRON, "maxwellian", 1e6, 1e3)
    ions = Population(OXYGEN_ION, "maxwellian", 1e6, 1e3)
    assert population_names((electrons, ions, electrons)) == ("electron 1", "O+", "electron 2")


@pytest.mark.parametrize("density", [-1.0, np.nan, np.inf])
def test_current_refuses_density(density):
    with pytest.raises(ValueError, match="density_m3"):
        one_sided_maxwellian_current([1e6, density], 1.0)


@pytest.mark.parametrize("temperature", [0.0, -1.0, np.nan, np.inf])
def test_current_refuses_temperature(temperature):
    with pytest.raises(ValueError, match="temperature_eV"):
        one_sided_maxwellian_current(1.0, [1.0, temperature])


def test_current_refuses_mass():
    with pytest.raises(ValueError, match="mass_kg"):
        one_sided_maxwellian_current(1.0, 1.0, mass_kg=0.0)


def test_unknown_law_names_the_allowed_ones():
    with pytest.raises(EnvironmentDataError) as caught:
        Population(ELECTRON, "kapa", 1e6, 1e3)
    assert caught.value.key == ("law",)
    assert caught.value.nearest == "kappa"
    with pytest.raises(EnvironmentDataError, match="needs its distribution"):
        Population(ELECTRON, "kappa", 1e6, 1e3)


@pytest.mark.parametrize(("density", "temperature"), [(-1.0, 1.0), (np.nan, 1.0), (1.0, 0.0)])
def test_population_refuses(density, temperature):
    with pytest.raises(EnvironmentDataError):
        Population(ELECTRON, "maxwellian", density, temperature)


@pytest.mark.parametrize(("mass", "charge"), [(0.0, 1), (np.inf, 1), (m_e, 0)])
def test_species_refuses(mass, charge):
    with pytest.raises(EnvironmentDataError):
        Species("x", mass, charge)


def test_plasma_refuses_emptiness_and_odd_basis():
    with pytest.raises(EnvironmentDataError, match="empty"):
        plasma_of()
    population = Population(ELECTRON, "maxwellian", 1e6, 1e3)
    with pytest.raises(EnvironmentDataError) as caught:
        Plasma("a", "a", "x", "guess", None, "", (population,))
    assert caught.value.key == ("basis",)
