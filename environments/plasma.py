"""Plasma as a sum of populations, and the moments that charging needs."""

from collections.abc import Iterable
from dataclasses import dataclass
from math import isfinite, sqrt
from typing import Final

import numpy as np
from numpy.typing import NDArray
from scipy.constants import e, epsilon_0

from environments.distributions import DISTRIBUTIONS, Maxwellian, Tabulated
from environments.errors import EnvironmentDataError, nearest_name
from environments.isotropic import Distribution, Moments, distribution_moments
from environments.species import (
    ELECTRON,
    HELIUM_ION,
    HYDROGEN_ION,
    OXYGEN_ION,
    SPECIES,
    Species,
)
from environments.thermal_flux import one_sided_maxwellian_current

__all__ = [
    "BASES",
    "ELECTRON",
    "HELIUM_ION",
    "HYDROGEN_ION",
    "LAWS",
    "OXYGEN_ION",
    "SPECIES",
    "Plasma",
    "Population",
    "Species",
    "electron_debye_length_m",
    "electron_to_ion_current_ratio",
    "extrapolated_share",
    "moments",
    "one_sided_maxwellian_current",
    "population_current",
    "population_moments",
    "population_names",
    "population_of",
    "warnings_of",
]

# velocity distributions that a population may have
LAWS: Final = tuple(DISTRIBUTIONS)
# how far a figure can be trusted, best first
BASES: Final = ("measured", "handbook", "derived", "memory", "assumed")


@dataclass(frozen=True, slots=True)
class Population:
    """One part of a plasma: a species with a distribution of its own.

    Attributes
    ----------
    species : Species
        What the particles are.
    law : str
        Energy distribution, one of `LAWS`.
    density_m3 : float
        Number density [m-3], >= 0.
    temperature_eV : float
        kT [eV], > 0; two thirds of the mean energy where the law is no Maxwellian.
    distribution : Distribution, optional
        Needed by every law but "maxwellian"; `population_of` fills the other fields from it.

    Raises
    ------
    EnvironmentDataError
        Unknown law, density < 0, temperature <= 0, or not finite.

    Examples
    --------
    >>> Population(ELECTRON, "maxwellian", 1.5e6, 3000.0).temperature_eV
    3000.0
    """

    species: Species
    law: str
    density_m3: float
    temperature_eV: float
    distribution: Distribution | None = None

    def __post_init__(self) -> None:
        if self.law not in LAWS:
            raise EnvironmentDataError(
                "is not a distribution known here",
                key=("law",),
                value=self.law,
                allowed=", ".join(f'"{law}"' for law in LAWS),
                nearest=nearest_name(self.law, LAWS),
            )
        given = "maxwellian" if self.distribution is None else self.distribution.law
        if given != self.law:
            raise EnvironmentDataError(
                "needs its distribution; see population_of", key=("law",), value=self.law
            )
        if not (isfinite(self.density_m3) and self.density_m3 >= 0.0):
            raise EnvironmentDataError(
                "cannot be a density in m-3",
                key=("density_m3",),
                value=self.density_m3,
                allowed="finite, >= 0",
            )
        if not (isfinite(self.temperature_eV) and self.temperature_eV > 0.0):
            raise EnvironmentDataError(
                "cannot be a temperature in eV",
                key=("temperature_eV",),
                value=self.temperature_eV,
                allowed="finite, > 0",
            )


@dataclass(frozen=True, slots=True)
class Plasma:
    """A plasma environment: populations that are simply added up.

    Populations are used as printed by their source and never neutralised.

    Attributes
    ----------
    name, title : str
        Name in the catalogue, or the title of a file; one line for people.
    source, basis : str
        Publication or standard behind the figures; one of `BASES`.
    clause : str or None
        Clause or table of a standard.
    note : str
        What a user must know; may be empty.
    populations : tuple of Population
        At least one.

    Raises
    ------
    EnvironmentDataError
        No population, or an unknown basis.
    """

    name: str
    title: str
    source: str
    basis: str
    clause: str | None
    note: str
    populations: tuple[Population, ...]

    def __post_init__(self) -> None:
        if not self.populations:
            raise EnvironmentDataError(
                "is empty", key=("population",), allowed="at least one population"
            )
        if self.basis not in BASES:
            raise EnvironmentDataError(
                "is not a basis",
                key=("basis",),
                value=self.basis,
                allowed=", ".join(f'"{basis}"' for basis in BASES),
                nearest=nearest_name(self.basis, BASES),
            )


def population_of(species: Species, distribution: Distribution) -> Population:
    """Population with density and temperature from the moments of its distribution.

    Examples
    --------
    >>> from environments.distributions import Kappa
    >>> hot = population_of(ELECTRON, Kappa(1e6, 500.0, 5.0))
    >>> hot.law, round(hot.density_m3, 3), round(hot.temperature_eV, 6)
    ('kappa', 1000000.0, 500.0)
    """
    if isinstance(distribution, Maxwellian):
        return Population(
            species, distribution.law, distribution.density_m3, distribution.temperature_eV
        )
    found = distribution_moments(distribution, species.mass_kg)
    return Population(
        species, distribution.law, found.density_m3, found.mean_energy_eV / 1.5, distribution
    )


def population_moments(population: Population) -> Moments:
    """Moments of one population; closed forms for a Maxwellian, else integrals.

    Examples
    --------
    >>> population_moments(Population(ELECTRON, "maxwellian", 1e6, 1e3)).mean_energy_eV
    1500.0
    """
    if population.distribution is not None:
        return distribution_moments(population.distribution, population.species.mass_kg)
    n, T = population.density_m3, population.temperature_eV
    flux = n * sqrt(e * T / (2.0 * np.pi * population.species.mass_kg))
    return Moments(n, flux, 1.5 * T, 2.0 * T * flux, T)


def population_current(population: Population) -> float:
    """Random current density of one population onto one side of a plane.

    Returns
    -------
    float
        Current density [A m-2]; positive = positive charge arriving.

    Examples
    --------
    >>> round(population_current(Population(HYDROGEN_ION, "maxwellian", 1e6, 1e3)) * 1e9, 2)
    19.78
    """
    flux = population_moments(population).number_flux_m2_s
    return population.species.charge_number * e * flux


def extrapolated_share(population: Population) -> float:
    """Share of the one-sided current that lies below the first channel of a table, 0…1.

    0 for every law but "tabulated".
    """
    spectrum = population.distribution
    if not isinstance(spectrum, Tabulated):
        return 0.0
    # j = j1 E/E1 below the first channel
    below = np.pi * spectrum.flux_m2_s_sr_eV[0] * spectrum.energy_eV[0] / 2.0
    return float(below / population_moments(population).number_flux_m2_s)


LARGEST_EXTRAPOLATED_SHARE: Final = 0.1


def warnings_of(plasma: Plasma) -> tuple[str, ...]:
    """What a report must say about the spectra of a plasma; empty when all is well.

    Examples
    --------
    >>> from environments.distributions import Tabulated
    >>> steep = population_of(ELECTRON, Tabulated((100.0, 200.0, 400.0), (1e9, 1e6, 1e3)))
    >>> warnings_of(Plasma("a", "a", "x", "assumed", None, "", (steep,)))
    ('electron: 82 % of the current lies below the first channel (extrapolated)',)
    """
    names = population_names(plasma.populations)
    shares = [extrapolated_share(p) for p in plasma.populations]
    return tuple(
        f"{name}: {100.0 * share:.0f} % of the current lies below the first channel (extrapolated)"
        for name, share in zip(names, shares, strict=True)
        if share > LARGEST_EXTRAPOLATED_SHARE
    )


def electron_debye_length_m(plasma: Plasma) -> float:
    r"""Debye length of the electrons as printed, all populations together.

    :math:`\lambda_D = (\sum_k n_k e / \varepsilon_0 T_k)^{-1/2}` over the electron
    populations, T in eV: the coldest dense population dominates. In place of T stands
    :math:`1/\langle 1/2E\rangle`, the linear response of any isotropic distribution;
    for kappa this is :math:`T (2\kappa - 3)/(2\kappa - 1)`.

    Parameters
    ----------
    plasma : Plasma
        Needs at least one electron population with density > 0.

    Returns
    -------
    float
        Length [m].

    Raises
    ------
    EnvironmentDataError
        The plasma has no electrons.

    Notes
    -----
    Valid: potentials small against the electron energies. Ions, which move little
    within the sheath time of electrons, are left out.

    References
    ----------
    Lieberman & Lichtenberg (2005), Principles of Plasma Discharges, sec. 2.4
    (section from memory); the sum over populations follows from the linear response.

    Examples
    --------
    >>> cold = Population(ELECTRON, "maxwellian", 1e6, 1.0)
    >>> plasma = Plasma("a", "a", "example", "assumed", None, "", (cold,))
    >>> round(electron_debye_length_m(plasma), 3)
    7.434
    """
    inverse_square = sum(
        p.density_m3 * e / (epsilon_0 * population_moments(p).debye_temperature_eV)
        for p in plasma.populations
        if p.species.name == ELECTRON.name
    )
    if inverse_square <= 0.0:
        raise EnvironmentDataError(
            "holds no electrons, so it has no electron Debye length",
            key=("population",),
            allowed="at least one electron population with density > 0",
        )
    return 1.0 / sqrt(inverse_square)


def moments(plasma: Plasma) -> dict[str, NDArray[np.float64]]:
    """Moments of every population of a plasma.

    Returns
    -------
    dict of str to ndarray, each of shape (population,)
        ``density_m3`` [m-3]; ``temperature_eV`` [eV], two thirds of the mean energy;
        ``current_density_A_m2`` one-sided random current [A m-2], positive = positive charge
        arriving; ``number_flux_m2_s`` one-sided [m-2 s-1]; ``mean_energy_eV`` of the particles
        in a volume [eV]; ``flux_mean_energy_eV`` of the particles that cross a plane [eV];
        ``energy_density_eV_m3`` [eV m-3]; ``energy_flux_eV_m2_s`` one-sided [eV m-2 s-1].
        The order is that of ``plasma.populations``; see `population_names`.

    Examples
    --------
    >>> hot = Population(ELECTRON, "maxwellian", 1e6, 1000.0)
    >>> plasma = Plasma("a", "a", "example", "assumed", None, "", (hot,))
    >>> moments(plasma)["mean_energy_eV"].tolist()
    [1500.0]
    """
    found = [population_moments(p) for p in plasma.populations]
    charge = np.array([p.species.charge_number for p in plasma.populations], dtype=np.float64) * e
    density, flux, energy, energy_flux = (
        np.array([m[i] for m in found], dtype=np.float64) for i in range(4)
    )
    with_particles = np.where(flux > 0.0, flux, 1.0)
    mean_crossing = np.where(flux > 0.0, energy_flux / with_particles, 4.0 / 3.0 * energy)
    return {
        "density_m3": density,
        "temperature_eV": np.array([p.temperature_eV for p in plasma.populations]),
        "current_density_A_m2": flux * charge,
        "number_flux_m2_s": flux,
        "mean_energy_eV": energy,
        "flux_mean_energy_eV": mean_crossing,
        "energy_density_eV_m3": density * energy,
        "energy_flux_eV_m2_s": energy_flux,
    }


def population_names(populations: Iterable[Population]) -> tuple[str, ...]:
    """Name populations apart: species alone, or numbered where a species repeats.

    Examples
    --------
    >>> cold = Population(ELECTRON, "maxwellian", 1e6, 100.0)
    >>> hot = Population(ELECTRON, "maxwellian", 1e5, 3e3)
    >>> ions = Population(HYDROGEN_ION, "maxwellian", 1e6, 100.0)
    >>> population_names((cold, hot, ions))
    ('electron 1', 'electron 2', 'H+')
    """
    species = [p.species.name for p in populations]
    seen: dict[str, int] = {}
    names = []
    for name in species:
        seen[name] = seen.get(name, 0) + 1
        names.append(f"{name} {seen[name]}" if species.count(name) > 1 else name)
    return tuple(names)


def electron_to_ion_current_ratio(plasma: Plasma) -> float:
    """Random electron current over random ion current, a measure of how hard a plasma charges.

    Returns
    -------
    float
        Positive ratio, 1; 43 for protons and electrons of equal density and temperature.

    Raises
    ------
    EnvironmentDataError
        The plasma holds no electrons or no positive ions.

    Examples
    --------
    >>> both = tuple(Population(s, "maxwellian", 1e6, 1e3) for s in (ELECTRON, HYDROGEN_ION))
    >>> round(electron_to_ion_current_ratio(Plasma("a", "a", "x", "assumed", None, "", both)), 2)
    42.85
    """
    currents = [(p.species, population_current(p)) for p in plasma.populations]
    ion = sum(j for _, j in currents if j > 0.0)
    electron = -sum(j for species, j in currents if species == ELECTRON)
    if ion <= 0.0:
        raise EnvironmentDataError("holds no positive ions", key=("population",))
    if electron <= 0.0:
        raise EnvironmentDataError("holds no electrons", key=("population",))
    return electron / ion
