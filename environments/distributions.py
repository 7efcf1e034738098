"""Isotropic energy distributions of one population, one class per law.

A further law is one more class with the members of `isotropic.Distribution`, entered in
`DISTRIBUTIONS`.
"""

from collections.abc import Mapping
from dataclasses import dataclass
from math import inf, sqrt
from types import MappingProxyType
from typing import ClassVar, Final

import numpy as np
from scipy.constants import e
from scipy.special import gammaln

from environments.auroral import FlatAndMaxwellian, Fontheim
from environments.energy_panels import E_FOLDS
from environments.errors import EnvironmentDataError
from environments.isotropic import (
    DENSITY_RANGE_M3,
    ENERGY_RANGE_EV,
    REACH_EV,
    TEMPERATURE_RANGE_EV,
    Array,
    Distribution,
    Moments,
    Numbers,
)


@dataclass(frozen=True, slots=True)
class Maxwellian:
    r"""Thermal equilibrium, :math:`f \propto e^{-E/T}`.

    Attributes
    ----------
    density_m3, temperature_eV : float
        Number density [m-3]; kT [eV].
    """

    density_m3: float
    temperature_eV: float
    law: ClassVar[str] = "maxwellian"
    numbers: ClassVar[Numbers] = {
        "density_m3": DENSITY_RANGE_M3,
        "temperature_eV": TEMPERATURE_RANGE_EV,
    }
    arrays: ClassVar[Numbers] = {}

    def flux(self, energy_eV: Array, mass_kg: float) -> Array:
        """Directional differential number flux [m-2 s-1 sr-1 eV-1]."""
        T = self.temperature_eV
        one_sided = self.density_m3 * sqrt(e * T / (2.0 * np.pi * mass_kg))
        return np.asarray(one_sided / (np.pi * T**2) * energy_eV * np.exp(-energy_eV / T))

    @property
    def marks_eV(self) -> tuple[float, ...]:
        """None: the law is smooth."""
        return ()

    @property
    def edges_eV(self) -> tuple[float, ...]:
        """None: T is the scale everywhere."""
        return ()

    @property
    def cutoff_eV(self) -> float:
        """No end."""
        return np.inf

    @property
    def top_eV(self) -> float:
        """60 T: beyond lies 1e-24 of the flux."""
        return 60.0 * self.temperature_eV

    @property
    def scale_eV(self) -> float:
        """T."""
        return self.temperature_eV


@dataclass(frozen=True, slots=True)
class Kappa:
    r"""Power-law tail, :math:`f \propto (1 + E/((\kappa - 3/2) T))^{-\kappa - 1}`.

    T is the moment temperature: the mean energy is 3T/2 for every kappa. The energy flux
    through a plane diverges for kappa <= 2 and is then inf; currents are finite for all.

    Attributes
    ----------
    density_m3, temperature_eV, kappa : float
        Number density [m-3]; T [eV]; index > 3/2 (files: from 1.501).

    References
    ----------
    Vasyliunas (1968), J. Geophys. Res. 73, 2839; Pierrard & Lazar (2010), Solar Phys.
    267, 153 (normalisation, from memory; density and pressure are checked by quadrature).
    """

    density_m3: float
    temperature_eV: float
    kappa: float
    law: ClassVar[str] = "kappa"
    numbers: ClassVar[Numbers] = {
        "density_m3": DENSITY_RANGE_M3,
        "temperature_eV": TEMPERATURE_RANGE_EV,
        "kappa": (1.501, 200.0),  # at 3/2 the mean energy diverges
    }
    arrays: ClassVar[Numbers] = {}

    def flux(self, energy_eV: Array, mass_kg: float) -> Array:
        """Directional differential number flux [m-2 s-1 sr-1 eV-1]."""
        k = self.kappa
        a = (k - 1.5) * self.temperature_eV
        shape = energy_eV * np.exp(-(k + 1.0) * np.log1p(energy_eV / a))
        return np.asarray(self._one_sided(mass_kg) * k * (k - 1.0) / (np.pi * a**2) * shape)

    def _one_sided(self, mass_kg: float) -> float:
        k, T = self.kappa, self.temperature_eV
        ratio = sqrt(k - 1.5) * float(np.exp(gammaln(k - 1.0) - gammaln(k - 0.5)))
        return self.density_m3 * sqrt(e * T / (2.0 * np.pi * mass_kg)) * ratio

    def moments(self, mass_kg: float) -> Moments:
        r"""Closed forms; the energy flux :math:`2(\kappa - 3/2)T/(\kappa - 2)` per particle."""
        k, T = self.kappa, self.temperature_eV
        crossing = 2.0 * (k - 1.5) * T / (k - 2.0) if k > 2.0 else inf
        flux = self._one_sided(mass_kg)
        debye = T * (2.0 * k - 3.0) / (2.0 * k - 1.0)
        return Moments(self.density_m3, flux, 1.5 * T, crossing * flux, debye)

    @property
    def marks_eV(self) -> tuple[float, ...]:
        """None: the law is smooth."""
        return ()

    @property
    def edges_eV(self) -> tuple[float, ...]:
        """None: T is the scale everywhere."""
        return ()

    @property
    def cutoff_eV(self) -> float:
        """No end."""
        return np.inf

    @property
    def top_eV(self) -> float:
        """Beyond lies 1e-15 of the flux, also of one retarded by `REACH_EV`."""
        start = self.kappa * self.temperature_eV + REACH_EV
        return start * float(10.0 ** (15.0 / (self.kappa - 1.0)))

    @property
    def scale_eV(self) -> float:
        """T, or the width of the core when kappa is small."""
        return min(1.0, self.kappa - 1.5) * self.temperature_eV


@dataclass(frozen=True, slots=True)
class Tabulated:
    """A measured spectrum: log-log between channels, isotropic.

    Below the first channel the phase-space density stays what it is there (j grows as E);
    above the last there is nothing.

    Attributes
    ----------
    energy_eV : tuple of float
        Rising [eV], at least three.
    flux_m2_s_sr_eV : tuple of float
        Directional differential number flux, > 0; leave empty channels out.
    """

    energy_eV: tuple[float, ...]
    flux_m2_s_sr_eV: tuple[float, ...]
    law: ClassVar[str] = "tabulated"
    numbers: ClassVar[Numbers] = {}
    arrays: ClassVar[Numbers] = {"energy_eV": ENERGY_RANGE_EV, "flux_m2_s_sr_eV": (1e-30, 1e30)}

    def __post_init__(self) -> None:
        energy, flux = np.array(self.energy_eV), np.array(self.flux_m2_s_sr_eV)
        if len(energy) != len(flux):
            raise EnvironmentDataError(
                "has another length than energy_eV",
                key=("flux_m2_s_sr_eV",),
                value=len(flux),
                allowed=f"{len(energy)} values",
            )
        if not 3 <= len(energy) <= 2000:
            raise EnvironmentDataError(
                "is no spectrum", key=("energy_eV",), value=len(energy), allowed="3 to 2000 values"
            )
        for key, values in (("energy_eV", energy), ("flux_m2_s_sr_eV", flux)):
            low, high = self.arrays[key]
            out = values[~((values >= low) & (values <= high))]  # nan is out of range too
            if out.size:
                raise EnvironmentDataError(
                    "is out of range",
                    key=(key,),
                    value=float(out[0]),
                    allowed=f"numbers from {low:g} to {high:g}; leave empty channels out",
                )
        if not (np.diff(energy) > 0.0).all():
            raise EnvironmentDataError(
                "does not rise", key=("energy_eV",), allowed="rising energies above 0"
            )

    def flux(self, energy_eV: Array, mass_kg: float) -> Array:
        """Directional differential number flux [m-2 s-1 sr-1 eV-1]; the mass has no effect."""
        x, y = np.log(self.energy_eV), np.log(self.flux_m2_s_sr_eV)
        first, last = self.energy_eV[0], self.energy_eV[-1]
        inside = np.clip(energy_eV, first, last)
        found = np.exp(np.interp(np.log(inside), x, y)) * np.minimum(energy_eV / first, 1.0)
        return np.where(energy_eV <= last, found, 0.0)

    @property
    def marks_eV(self) -> tuple[float, ...]:
        """The channels."""
        return self.energy_eV

    @property
    def edges_eV(self) -> tuple[float, ...]:
        """Within segments over which the flux changes by more than a few e-folds."""
        x, y = np.log(self.energy_eV), np.log(self.flux_m2_s_sr_eV)
        slope = np.diff(y) / np.maximum(np.diff(x), 1e-300)
        # counted from the end of a segment that holds the particles
        start = np.where(slope < 0.0, x[:-1], x[1:])
        found = start[:, None] - np.array(E_FOLDS) / np.where(slope, slope, 1e-300)[:, None]
        inside = (found > x[:-1, None]) & (found < x[1:, None])
        return tuple(float(edge) for edge in np.exp(found[inside]))

    @property
    def cutoff_eV(self) -> float:
        """The last channel."""
        return self.energy_eV[-1]

    @property
    def top_eV(self) -> float:
        """The last channel."""
        return self.energy_eV[-1]

    @property
    def scale_eV(self) -> float:
        """The first channel."""
        return self.energy_eV[0]


DISTRIBUTIONS: Final[Mapping[str, type[Distribution]]] = MappingProxyType(
    {c.law: c for c in (Maxwellian, Kappa, Fontheim, FlatAndMaxwellian, Tabulated)}
)
"""Laws by the name that plasma files use."""
