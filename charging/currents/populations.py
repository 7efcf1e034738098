"""The populations of all plasmas of a case, side by side, and their electrons' sheath."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.constants import e, epsilon_0

import environments.signs
from charging.errors import InputError
from environments.errors import EnvironmentDataError
from environments.plasma import Plasma, population_current, population_moments

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Populations:
    """Populations of all plasmas of a case, electrons or ions.

    Attributes
    ----------
    temperature_eV, density_m3, thermal_current_A_m2 : ndarray [K]
        Temperature (two thirds of the mean energy); density and signed one-sided current at
        full strength.
    charge_number : ndarray [K]
        Magnitude of the charge in units of e.
    plasma : ndarray of int [K]
        Which plasma a population belongs to.
    debye_temperature_eV : ndarray [K]
        What stands for the temperature in the Debye length.
    maxwellian : ndarray of int [M]
        Which populations have closed forms; the others have a `SpectrumTable` each.
    """

    temperature_eV: Array
    density_m3: Array
    thermal_current_A_m2: Array
    charge_number: Array
    plasma: NDArray[np.intp]
    debye_temperature_eV: Array
    maxwellian: NDArray[np.intp]


def populations(plasmas: Sequence[Plasma], *, electrons: bool) -> Populations:
    """Gather the electron (or ion) populations of several plasmas."""
    chosen = [
        (p, i)
        for i, plasma in enumerate(plasmas)
        for p in plasma.populations
        if (p.species.charge_number < 0) == electrons
    ]
    found = [p for p, _ in chosen]
    return Populations(
        temperature_eV=np.array([p.temperature_eV for p in found]),
        density_m3=np.array([p.density_m3 for p in found]),
        thermal_current_A_m2=np.array([population_current(p) for p in found]),
        charge_number=np.array([float(abs(p.species.charge_number)) for p in found]),
        plasma=np.array([i for _, i in chosen], dtype=np.intp),
        debye_temperature_eV=np.array([population_moments(p).debye_temperature_eV for p in found]),
        maxwellian=np.array([k for k, p in enumerate(found) if p.distribution is None], np.intp),
    )


def refuse_one_sided(plasmas: Sequence[Plasma]) -> None:
    """Refuse plasmas without charges of both signs; see `environments.signs`.

    Raises
    ------
    InputError
        Names the plasma and what it lacks, or the negative ions.
    """
    for plasma in plasmas:
        try:
            environments.signs.refuse_one_sided(plasma)
        except EnvironmentDataError as error:
            raise InputError(
                f'plasma = "{plasma.name}" {error.problem}',
                key=("plasma",),
                value=plasma.name,
                allowed=error.allowed,
            ) from None


def electron_sheath(electrons: Populations, strength: Array) -> tuple[Array, Array]:
    r"""Electron Debye length [m] and the temperature [eV] that belongs to it, each [...].

    :math:`\lambda_D^{-2} = \sum n e/(\varepsilon_0 T)` over the electrons as printed, with
    :math:`1/\langle 1/2E\rangle` for T where a population is no Maxwellian; the temperature
    returned is the harmonic one, :math:`\sum n/\sum(n/T)`.
    """
    density = electrons.density_m3 * strength[..., electrons.plasma]
    stiffness = (density / electrons.debye_temperature_eV).sum(axis=-1)
    return np.sqrt(epsilon_0 / (e * stiffness)), density.sum(axis=-1) / stiffness
