"""Plasma as sums of Maxwellian populations, and the moments that charging needs."""

from collections.abc import Iterable
from dataclasses import dataclass
from math import isfinite, sqrt
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import atomic_mass, e, epsilon_0, physical_constants
from scipy.constants import m_e as electron_mass

from environments.errors import EnvironmentDataError, nearest_name

# velocity distributions that a population may have
LAWS: Final = ("maxwellian",)
# how far a figure can be trusted, best first
BASES: Final = ("measured", "handbook", "derived", "memory", "assumed")


@dataclass(frozen=True, slots=True)
class Species:
    """A kind of charged particle.

    Attributes
    ----------
    name : str
        "electron", "H+", "He+", "O+", or a text made from mass and charge.
    mass_kg : float
        Mass of one particle [kg], > 0.
    charge_number : int
        Signed charge in units of e: -1 for electrons, +1 for H+; never 0.

    Raises
    ------
    EnvironmentDataError
        Mass not finite or not > 0; charge number 0.
    """

    name: str
    mass_kg: float
    charge_number: int

    def __post_init__(self) -> None:
        if not (isfinite(self.mass_kg) and self.mass_kg > 0.0):
            raise EnvironmentDataError(
                "cannot be a mass in kg", key=("mass_kg",), value=self.mass_kg, allowed="> 0"
            )
        if self.charge_number == 0:
            raise EnvironmentDataError(
                "carries no current", key=("charge_number",), value=0, allowed="any integer but 0"
            )


# Oxygen: mass of the nuclide 16O, atomic mass evaluation AME2020 (Wang et al. 2021, Chinese
# Phys. C 45, 030003), digits from memory; less one electron, binding energy (14 eV) ignored.
_OXYGEN_16_U = 15.994914620

ELECTRON: Final = Species("electron", electron_mass, -1)
"""Electron (CODATA)."""

HYDROGEN_ION: Final = Species("H+", physical_constants["proton mass"][0], +1)
"""Proton (CODATA)."""

HELIUM_ION: Final = Species("He+", physical_constants["alpha particle mass"][0] + electron_mass, +1)
"""Singly charged 4He: alpha particle and one electron (CODATA; binding 54 eV ignored)."""

OXYGEN_ION: Final = Species("O+", _OXYGEN_16_U * atomic_mass - electron_mass, +1)
"""Singly charged 16O, 15.994 u."""

SPECIES: Final = {s.name: s for s in (ELECTRON, HYDROGEN_ION, HELIUM_ION, OXYGEN_ION)}
"""Species by the name that plasma files use."""


@dataclass(frozen=True, slots=True)
class Population:
    """One part of a plasma: a species with a distribution of its own.

    Attributes
    ----------
    species : Species
        What the particles are.
    law : str
        Velocity distribution; "maxwellian" is the only one so far.
    density_m3 : float
        Number density [m-3], >= 0.
    temperature_eV : float
        kT [eV], > 0.

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

    def __post_init__(self) -> None:
        if self.law not in LAWS:
            raise EnvironmentDataError(
                "is not a distribution known here",
                key=("law",),
                value=self.law,
                allowed=", ".join(f'"{law}"' for law in LAWS),
                nearest=nearest_name(self.law, LAWS),
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


def one_sided_maxwellian_current(
    density_m3: ArrayLike,
    temperature_eV: ArrayLike,
    *,
    mass_kg: float = electron_mass,
    charge_number: int = -1,
) -> NDArray[np.float64]:
    r"""Current density a Maxwellian plasma sends onto one side of a plane.

    :math:`J = q n \sqrt{e T / 2\pi m}`: random flux at plasma potential,
    before a sheath attracts or repels the species.

    Parameters
    ----------
    density_m3, temperature_eV : array_like
        Number density [m-3], temperature [eV]; broadcast together.
    mass_kg, charge_number : optional
        Mass [kg]; signed charge in units of e. Default: electron.

    Returns
    -------
    ndarray
        Current density [A m-2]; positive = positive charge arriving,
        so electrons give a negative value.

    Raises
    ------
    ValueError
        density < 0, temperature <= 0, mass <= 0, or not finite.

    Notes
    -----
    Valid: isotropic, no drift, non-relativistic (electrons below ~50 keV).

    References
    ----------
    Lieberman & Lichtenberg (2005), Principles of Plasma Discharges,
    sec. 2.4 (section from memory).

    Examples
    --------
    >>> round(float(one_sided_maxwellian_current(1e6, 1e3)) * 1e6, 3)  # uA m-2
    -0.848
    """
    density = np.asarray(density_m3, dtype=np.float64)
    temperature = np.asarray(temperature_eV, dtype=np.float64)
    if not (np.isfinite(density).all() and (density >= 0.0).all()):
        raise ValueError("density_m3 must be finite and not negative")
    if not (np.isfinite(temperature).all() and (temperature > 0.0).all()):
        raise ValueError("temperature_eV must be finite and positive")
    if not (isfinite(mass_kg) and mass_kg > 0.0):
        raise ValueError("mass_kg must be finite and positive")
    flux = density * np.sqrt(e * temperature / (2.0 * np.pi * mass_kg))
    return np.asarray(charge_number * e * flux, dtype=np.float64)


def population_current(population: Population) -> float:
    """Random current density of one population onto one side of a plane.

    Parameters
    ----------
    population : Population

    Returns
    -------
    float
        Current density [A m-2]; positive = positive charge arriving.

    Examples
    --------
    >>> round(population_current(Population(HYDROGEN_ION, "maxwellian", 1e6, 1e3)) * 1e9, 2)
    19.78
    """
    return float(
        one_sided_maxwellian_current(
            population.density_m3,
            population.temperature_eV,
            mass_kg=population.species.mass_kg,
            charge_number=population.species.charge_number,
        )
    )


def electron_debye_length_m(plasma: Plasma) -> float:
    r"""Debye length of the electrons as printed, all populations together.

    :math:`\lambda_D = (\sum_k n_k e / \varepsilon_0 T_k)^{-1/2}` over the electron
    populations, T in eV: the coldest dense population dominates.

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
    Valid: Maxwellian electrons, potentials small against T. Ions, which move little
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
        p.density_m3 * e / (epsilon_0 * p.temperature_eV)
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

    Parameters
    ----------
    plasma : Plasma

    Returns
    -------
    dict of str to ndarray, each of shape (population,)
        ``density_m3`` [m-3]; ``temperature_eV`` [eV]; ``current_density_A_m2`` one-sided
        random current [A m-2], positive = positive charge arriving; ``number_flux_m2_s``
        one-sided [m-2 s-1]; ``mean_energy_eV`` of the particles in a volume, 3T/2 [eV];
        ``flux_mean_energy_eV`` of the particles that cross a plane, 2T [eV];
        ``energy_density_eV_m3`` [eV m-3]; ``energy_flux_eV_m2_s`` one-sided [eV m-2 s-1].
        The order is that of ``plasma.populations``; see `population_names`.

    Examples
    --------
    >>> hot = Population(ELECTRON, "maxwellian", 1e6, 1000.0)
    >>> plasma = Plasma("a", "a", "example", "assumed", None, "", (hot,))
    >>> moments(plasma)["mean_energy_eV"].tolist()
    [1500.0]
    """
    populations = plasma.populations
    density = np.array([p.density_m3 for p in populations], dtype=np.float64)
    temperature = np.array([p.temperature_eV for p in populations], dtype=np.float64)
    current = np.array([population_current(p) for p in populations], dtype=np.float64)
    charge = np.array([p.species.charge_number for p in populations], dtype=np.float64) * e
    number_flux = current / charge
    return {
        "density_m3": density,
        "temperature_eV": temperature,
        "current_density_A_m2": current,
        "number_flux_m2_s": number_flux,
        "mean_energy_eV": 1.5 * temperature,
        "flux_mean_energy_eV": 2.0 * temperature,
        "energy_density_eV_m3": 1.5 * density * temperature,
        "energy_flux_eV_m2_s": 2.0 * temperature * number_flux,
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
        The plasma holds no ions.

    Examples
    --------
    >>> both = tuple(Population(s, "maxwellian", 1e6, 1e3) for s in (ELECTRON, HYDROGEN_ION))
    >>> round(electron_to_ion_current_ratio(Plasma("a", "a", "x", "assumed", None, "", both)), 2)
    42.85
    """
    currents = [population_current(p) for p in plasma.populations]
    ion = sum(j for j in currents if j > 0.0)
    electron = -sum(j for j in currents if j < 0.0)
    if ion <= 0.0:
        raise EnvironmentDataError("holds no positive ions", key=("population",))
    return electron / ion
