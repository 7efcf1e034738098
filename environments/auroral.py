"""Energy distributions of precipitating electrons."""

from dataclasses import dataclass
from math import sqrt
from typing import ClassVar

import numpy as np
from scipy.constants import e

from environments.energy_panels import E_FOLDS
from environments.errors import EnvironmentDataError
from environments.isotropic import (
    DENSITY_RANGE_M3,
    ENERGY_RANGE_EV,
    FLUX_RANGE,
    TEMPERATURE_RANGE_EV,
    Array,
    Numbers,
)


@dataclass(frozen=True, slots=True)
class Fontheim:
    r"""Auroral electrons: power law, Maxwellian and Gaussian between two cut-offs.

    .. math:: j = A (E/1\,\mathrm{eV})^{-\alpha} + B (E/W) e^{-E/W} + C e^{-((E - E_g)/D)^2}

    for low_cutoff <= E <= high_cutoff, nothing outside. Isotropic over all pitch
    angles (stated, not measured). Papers differ in whether a factor pi, 1/W or E/W is
    inside the coefficients: these are directional fluxes, the form is the one above.

    Attributes
    ----------
    power_coefficient_m2_s_sr_eV, power_exponent : float
        A, flux at 1 eV; alpha.
    maxwellian_coefficient_m2_s_sr_eV, maxwellian_energy_eV : float
        B; W, whose flux peaks at W.
    gaussian_coefficient_m2_s_sr_eV, gaussian_energy_eV, gaussian_width_eV : float
        C; centre and width D of the beam.
    low_cutoff_eV, high_cutoff_eV : float

    References
    ----------
    Fontheim et al. (1982), J. Geophys. Res. 87, 3469 (form, from memory).
    """

    power_coefficient_m2_s_sr_eV: float
    power_exponent: float
    maxwellian_coefficient_m2_s_sr_eV: float
    maxwellian_energy_eV: float
    gaussian_coefficient_m2_s_sr_eV: float
    gaussian_energy_eV: float
    gaussian_width_eV: float
    low_cutoff_eV: float
    high_cutoff_eV: float
    law: ClassVar[str] = "fontheim"
    numbers: ClassVar[Numbers] = {
        "power_coefficient_m2_s_sr_eV": FLUX_RANGE,
        "power_exponent": (0.0, 10.0),
        "maxwellian_coefficient_m2_s_sr_eV": FLUX_RANGE,
        "maxwellian_energy_eV": TEMPERATURE_RANGE_EV,
        "gaussian_coefficient_m2_s_sr_eV": FLUX_RANGE,
        "gaussian_energy_eV": ENERGY_RANGE_EV,
        "gaussian_width_eV": ENERGY_RANGE_EV,
        "low_cutoff_eV": ENERGY_RANGE_EV,
        "high_cutoff_eV": ENERGY_RANGE_EV,
    }
    arrays: ClassVar[Numbers] = {}

    def __post_init__(self) -> None:
        if not self.low_cutoff_eV < self.high_cutoff_eV:
            raise EnvironmentDataError(
                "is not above low_cutoff_eV",
                key=("high_cutoff_eV",),
                value=self.high_cutoff_eV,
                allowed=f"a number above {self.low_cutoff_eV:g}",
            )
        levels = (
            self.power_coefficient_m2_s_sr_eV,
            self.maxwellian_coefficient_m2_s_sr_eV,
            self.gaussian_coefficient_m2_s_sr_eV,
        )
        if not max(levels) > 0.0:
            raise EnvironmentDataError(
                "is zero like the other coefficients",
                key=("power_coefficient_m2_s_sr_eV",),
                value=self.power_coefficient_m2_s_sr_eV,
                allowed="at least one coefficient > 0",
            )

    def flux(self, energy_eV: Array, mass_kg: float) -> Array:
        """Directional differential number flux [m-2 s-1 sr-1 eV-1]; the mass has no effect."""
        inside = (energy_eV >= self.low_cutoff_eV) & (energy_eV <= self.high_cutoff_eV)
        E = np.where(inside, energy_eV, self.low_cutoff_eV)
        x = E / self.maxwellian_energy_eV
        beam = (E - self.gaussian_energy_eV) / self.gaussian_width_eV
        total = (
            self.power_coefficient_m2_s_sr_eV * E**-self.power_exponent
            + self.maxwellian_coefficient_m2_s_sr_eV * x * np.exp(-x)
            + self.gaussian_coefficient_m2_s_sr_eV * np.exp(-(beam**2))
        )
        return np.where(inside, total, 0.0)

    @property
    def marks_eV(self) -> tuple[float, ...]:
        """Cut-offs, and the beam from -8 to +8 sigma."""
        sigma = self.gaussian_width_eV / sqrt(2.0)
        beam = [self.gaussian_energy_eV + s * sigma for s in (-8, -6, -4.5, -3, -2, -1, 0,
                                                               1, 2, 3, 4.5, 6, 8)]  # fmt: skip
        inside = [x for x in beam if self.low_cutoff_eV < x < self.high_cutoff_eV]
        if self.gaussian_coefficient_m2_s_sr_eV == 0.0:
            inside = []
        return (self.low_cutoff_eV, *inside, self.high_cutoff_eV)

    @property
    def edges_eV(self) -> tuple[float, ...]:
        """Where W or the flank of a beam is short against the energy at a cut-off."""
        low, high = self.low_cutoff_eV, self.high_cutoff_eV
        beam, width = self.gaussian_energy_eV, self.gaussian_width_eV
        edges = [low + n * self.maxwellian_energy_eV for n in E_FOLDS]
        # outside the cut-offs only a flank remains, of slope 2 (E - E_g)/D^2
        if beam < low:
            edges += [low + n * width**2 / (2.0 * (low - beam)) for n in E_FOLDS]
        if beam > high:
            edges += [high - n * width**2 / (2.0 * (beam - high)) for n in E_FOLDS]
        return tuple(x for x in edges if low < x < high)

    @property
    def cutoff_eV(self) -> float:
        """The upper cut-off."""
        return self.high_cutoff_eV

    @property
    def top_eV(self) -> float:
        """The upper cut-off."""
        return self.high_cutoff_eV

    @property
    def scale_eV(self) -> float:
        """The lower cut-off or W."""
        return min(self.low_cutoff_eV, self.maxwellian_energy_eV)


@dataclass(frozen=True, slots=True)
class FlatAndMaxwellian:
    r"""Auroral electrons in two parts: flat phase-space density, then a shifted Maxwellian.

    f is constant up to E0 and :math:`N_0 (m/2\pi e T_0)^{3/2} e^{-(E - E_0)/T_0}` above.
    Isotropic over all pitch angles.

    Attributes
    ----------
    flat_phase_space_density_s3_m6 : float
        f below E0 [s3 m-6].
    flat_up_to_eV : float
        E0 [eV].
    maxwellian_density_m3, maxwellian_temperature_eV : float
        N0 [m-3], T0 [eV].

    References
    ----------
    ECSS-E-ST-10-04C (2008), clause 8.2.3 a. The second branch carries the offset E - E0
    in its exponent: with it the branches meet at E0 to 0.09 percent, without it the
    second would start at 1 percent of the first.
    """

    flat_phase_space_density_s3_m6: float
    flat_up_to_eV: float
    maxwellian_density_m3: float
    maxwellian_temperature_eV: float
    law: ClassVar[str] = "flat and maxwellian"
    numbers: ClassVar[Numbers] = {
        "flat_phase_space_density_s3_m6": (1e-30, 1.0),
        "flat_up_to_eV": ENERGY_RANGE_EV,
        "maxwellian_density_m3": DENSITY_RANGE_M3,
        "maxwellian_temperature_eV": TEMPERATURE_RANGE_EV,
    }
    arrays: ClassVar[Numbers] = {}

    def flux(self, energy_eV: Array, mass_kg: float) -> Array:
        """Directional differential number flux, j = 2 e^2 E f/m^2 [m-2 s-1 sr-1 eV-1]."""
        T = self.maxwellian_temperature_eV
        peak = self.maxwellian_density_m3 * (mass_kg / (2.0 * np.pi * e * T)) ** 1.5
        over = np.maximum(energy_eV - self.flat_up_to_eV, 0.0)
        f = np.where(
            energy_eV <= self.flat_up_to_eV,
            self.flat_phase_space_density_s3_m6,
            peak * np.exp(-over / T),
        )
        return np.asarray(2.0 * e**2 / mass_kg**2 * energy_eV * f)

    @property
    def marks_eV(self) -> tuple[float, ...]:
        """E0, where the branches meet."""
        return (self.flat_up_to_eV,)

    @property
    def edges_eV(self) -> tuple[float, ...]:
        """E0 and some T0, however small T0 is against E0."""
        return tuple(self.flat_up_to_eV + n * self.maxwellian_temperature_eV for n in E_FOLDS)

    @property
    def cutoff_eV(self) -> float:
        """No end."""
        return np.inf

    @property
    def top_eV(self) -> float:
        """E0 + 60 T0."""
        return self.flat_up_to_eV + 60.0 * self.maxwellian_temperature_eV

    @property
    def scale_eV(self) -> float:
        """E0 or T0."""
        return min(self.flat_up_to_eV, self.maxwellian_temperature_eV)
