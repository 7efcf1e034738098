"""Kinds of charged particles."""

from dataclasses import dataclass
from math import isfinite
from typing import Final

from scipy.constants import atomic_mass, physical_constants
from scipy.constants import m_e as electron_mass

from environments.errors import EnvironmentDataError


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
