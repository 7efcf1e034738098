"""What a material record holds.

Every number comes with its source, the basis on which it is known and the
spread within which it may lie.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field, fields
from types import MappingProxyType
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from materials.errors import MaterialError
from materials.fitted_escape import FittedEnergies
from materials.photoelectron_energies import LowEnergyPeak

KINDS = ("conductor", "dielectric", "semiconductor")
BASES = ("measured", "handbook", "derived", "memory", "assumed")
SPREAD_LAWS = ("uniform", "log_uniform", "triangular")
YIELD_HOLDS = ("total", "true secondaries")
RESISTIVITY_METHODS = ("charge storage", "short-term", "extrapolated", "estimate")
PHOTOYIELD_LEVELS = (
    "as published",
    "set from the published saturation current",
    "estimated, not normalised",
    "carried over by analogy",
    "largest of laboratory curves",
    "normalised to a measured current",
)
PHOTOYIELD_LAWS = ("table", "fowler_dubridge", "power")
ABOVE_LAST_POINT = ("hold", "x-ray absorption")
YIELD_COUNTS = ("incident photons", "absorbed photons")
SURFACE_STATES = ("clean", "air_exposed", "aged")
NAME_PATTERN = re.compile(r"[A-Za-z0-9]([A-Za-z0-9 ,()._+-]{0,62}[A-Za-z0-9)+])?")


class Property(NamedTuple):
    """One property that a record may hold: unit, allowed range, meaning."""

    unit: str
    low: float
    high: float
    meaning: str


PROPERTIES: Mapping[str, Property] = MappingProxyType(
    {
        "work_function_eV": Property(
            "eV", 1.0, 10.0, "work function; photoelectric threshold of a conductor"
        ),
        "photoelectric_threshold_eV": Property(
            "eV", 2.0, 15.0, "lowest photon energy that frees electrons from a non-conductor"
        ),
        "secondary_energy_eV": Property(
            "eV", 0.2, 20.0, "T of the energies E exp(-E/T)/T^2 of secondaries of a non-conductor"
        ),
        "secondary_yield_peak": Property(
            "1", 0.0, 30.0, "largest electron-induced yield, normal incidence"
        ),
        "secondary_yield_peak_energy_eV": Property(
            "eV", 20.0, 5000.0, "electron energy of the largest yield"
        ),
        "mean_atomic_number": Property(
            "1", 4.0, 100.0, "mean atomic number, weighted by mass fraction"
        ),
        "backscatter_high_energy": Property(
            "1", 0.0, 0.7, "backscatter coefficient at keV energies, normal incidence"
        ),
        "backscatter_low_energy_drop": Property(
            "1", -0.3, 0.6, "by how much the backscatter coefficient is smaller at zero energy"
        ),
        "backscatter_drop_energy_eV": Property(
            "eV", 100.0, 50000.0, "electron energy scale of that drop"
        ),
        "coating_thickness_m": Property(
            "m", 1e-9, 1e-4, "thickness of a thin coating; backscatter comes from below it too"
        ),
        "substrate_atomic_number": Property(
            "1", 4.0, 100.0, "mean atomic number of what lies under a thin coating"
        ),
        "ion_yield_peak": Property(
            "1", 0.0, 20.0, "largest proton-induced yield, normal incidence"
        ),
        "ion_yield_peak_energy_eV": Property("eV", 1e3, 1e6, "proton energy of the largest yield"),
        "relative_permittivity": Property("1", 1.0, 1000.0, "static relative permittivity"),
        "bulk_resistivity_ohm_m": Property(
            "ohm m", 1e-9, 1e22, "bulk resistivity near 298 K, dark, low field"
        ),
        "activation_energy_eV": Property(
            "eV", 0.0, 3.0, "activation energy of the dark conductivity"
        ),
        "radiation_conductivity_S_m": Property(
            "S m-1", 0.0, 1e-8, "conductivity that a dose rate of 1 rad/s adds"
        ),
        "radiation_conductivity_exponent": Property(
            "1", 0.3, 1.2, "power of the dose rate to which that conductivity rises"
        ),
        "dielectric_strength_V_m": Property("V m-1", 1e5, 3e9, "field of breakdown"),
        "density_kg_m3": Property("kg m-3", 1.0, 25000.0, "mass density"),
        "typical_thickness_m": Property("m", 1e-9, 0.1, "thickness commonly used"),
    }
)

EMISSION_NEEDED = (
    "secondary_yield_peak",
    "secondary_yield_peak_energy_eV",
    "mean_atomic_number",
    "backscatter_high_energy",
    "ion_yield_peak",
    "ion_yield_peak_energy_eV",
)
EMISSION_OPTIONAL = (
    "work_function_eV",
    "photoelectric_threshold_eV",
    "secondary_energy_eV",
    "backscatter_low_energy_drop",
    "backscatter_drop_energy_eV",
    "coating_thickness_m",
    "substrate_atomic_number",
)

EMISSION_LAWS = MappingProxyType(
    {
        "secondary_law": (
            "sanders_inouye_1979",
            "lin_joy_2005",
            "sternglass_1954",
            "draine_salpeter_1979",
        ),
        "backscatter_law": ("prokopenko_laframboise_1980", "hunger_kuchler_1979"),
    }
)
"""Laws that a record may choose, by key; without a choice the first of each holds."""


@dataclass(frozen=True, slots=True)
class Spread:
    """Range within which a value lies with about 90 percent probability.

    `law` is "uniform", "log_uniform" or "triangular" (with its mode at the
    value); `low` and `high` have the unit of the value.
    """

    law: str
    low: float
    high: float


@dataclass(frozen=True, slots=True)
class Value:
    """One number with where it comes from.

    `source` is "" where a file gives none; records of the library all have one.
    `holds` says what a yield counts ("total" or "true secondaries"),
    `measurement_method` how a resistivity was found; None elsewhere.
    """

    value: float
    source: str
    basis: str
    spread: Spread
    measurement_method: str | None = None
    holds: str | None = None
    note: str = ""


@dataclass(frozen=True, slots=True)
class Samples:
    """A tabulated quantity against photon energy, with its source.

    `values` are mass absorption coefficients [m2 kg-1] or reflectances [1], as the place
    that holds them says; log-log or linear between points accordingly, held outside.
    """

    photon_energy_eV: tuple[float, ...]
    values: tuple[float, ...]
    source: str
    basis: str


@dataclass(frozen=True, slots=True)
class MeasuredCurrent:
    """A saturation current to which a record wants its curve scaled, and why.

    Measured at normal incidence, 1 AU, `f107` [sfu]. Whoever knows the spectrum applies it.
    """

    saturation_current_uA_m2: float
    f107: float
    source: str


@dataclass(frozen=True, slots=True, eq=False)
class PhotoYield:
    """Electrons per photon against photon energy.

    The first point is the threshold, where the yield is 0. `level` says how
    the absolute scale was found: a curve whose level was "set from the
    published saturation current" cannot be checked against that current.
    The yield is uncertain by `spread_factor` either way, by
    `near_threshold_factor` below `near_threshold_to_eV` and by
    `high_energy_factor` above `high_energy_from_eV`.

    `law` is "table" (log-log between the points), "fowler_dubridge" or "power"; with
    the last two the points are samples of the law, for pictures, and the law itself is
    evaluated: `electrons_per_photon_at_1_eV` is the yield 1 eV above the threshold at
    0 K, `exponent` that of the power law, `temperature_K` that of the metal.
    `above_last_point` says what holds beyond the last point: its value ("hold") or
    energy times `x_ray` absorption. Yields that count absorbed photons are multiplied
    by 1 - `reflectance`. `largest_angle_growth` caps the growth of the yield at
    oblique incidence, 1: none. `peak` are the energies of collided electrons where they
    are not those of the material that bears the curve, `energies` a prescribed law
    instead of the energies from photons, `normalised_to` a scaling still to be applied.
    `level_factor` multiplies the whole curve: what a draw from its spread gives.
    """

    photon_energy_eV: NDArray[np.float64]
    electrons_per_photon: NDArray[np.float64]
    source: str
    basis: str
    level: str
    spread_factor: float
    near_threshold_factor: float
    near_threshold_to_eV: float
    high_energy_factor: float
    high_energy_from_eV: float
    note: str = ""
    law: str = "table"
    electrons_per_photon_at_1_eV: float = 0.0
    exponent: float = 2.0
    temperature_K: float = 0.0
    above_last_point: str = "hold"
    x_ray: Samples | None = None
    counts: str = "incident photons"
    reflectance: Samples | None = None
    largest_angle_growth: float = 1.0
    peak: LowEnergyPeak | None = None
    energies: FittedEnergies | None = None
    normalised_to: MeasuredCurrent | None = None
    level_factor: float = 1.0

    def __post_init__(self) -> None:
        for name in ("photon_energy_eV", "electrons_per_photon"):
            array = np.array(getattr(self, name), dtype=np.float64)
            array.setflags(write=False)
            object.__setattr__(self, name, array)

    def __reduce__(self) -> tuple[type[PhotoYield], tuple[object, ...]]:
        return PhotoYield, tuple(getattr(self, entry.name) for entry in fields(self))

    @property
    def threshold_eV(self) -> float:
        """Photon energy below which nothing is emitted [eV]."""
        return float(self.photon_energy_eV[0])

    def spread_factor_at(self, photon_energy_eV: ArrayLike) -> NDArray[np.float64]:
        """Factor either way by which the yield is uncertain at these energies [eV]."""
        energy = np.asarray(photon_energy_eV, dtype=np.float64)
        factor = np.where(
            energy > self.high_energy_from_eV, self.high_energy_factor, self.spread_factor
        )
        return np.asarray(
            np.where(energy < self.near_threshold_to_eV, self.near_threshold_factor, factor)
        )


@dataclass(frozen=True, slots=True)
class SurfaceState:
    """A state of a surface other than the recorded one.

    Either the curve of another material (`curve_of`, a library name) or the own curve
    with its threshold moved by `barrier_shift_eV`, negative when an oxide or an adsorbed
    layer lowers the barrier.
    """

    source: str
    basis: str
    curve_of: str | None = None
    barrier_shift_eV: float | None = None
    note: str = ""


@dataclass(frozen=True, slots=True, eq=False)
class Material:
    """What a surface is made of.

    `emits` is False for a body that takes up every particle and gives
    nothing back; it then has no emission records and no `photoyield`.
    `surface_states` holds other states by name, see `materials.surface_state`; `laws` the
    chosen emission laws, by the keys of `EMISSION_LAWS`.
    """

    name: str
    kind: str
    description: str
    emits: bool
    values: Mapping[str, Value]
    photoyield: PhotoYield | None
    surface_states: Mapping[str, SurfaceState] = field(default_factory=dict)
    laws: Mapping[str, str] = field(default_factory=dict)

    def __post_init__(self) -> None:
        for name in ("values", "surface_states", "laws"):
            object.__setattr__(self, name, MappingProxyType(dict(getattr(self, name))))

    def __reduce__(self) -> tuple[type[Material], tuple[object, ...]]:
        state = (self.name, self.kind, self.description, self.emits)
        states, laws = dict(self.surface_states), dict(self.laws)
        return Material, (*state, dict(self.values), self.photoyield, states, laws)

    def value(self, key: str) -> float:
        """Return one property in the unit of its key.

        Raises
        ------
        MaterialError
            The material holds no such record; names material and key.
        """
        if key not in self.values:
            raise MaterialError((key,), None, f'is not given by material "{self.name}"')
        return self.values[key].value

    def get(self, key: str, default: float) -> float:
        """Return one property, or `default` when the record is absent."""
        return self.values[key].value if key in self.values else default

    @property
    def weakest_basis(self) -> str:
        """The weakest basis among all records, "assumed" being the weakest."""
        bases = {record.basis for record in self.values.values()}
        if self.photoyield is not None:
            bases.add(self.photoyield.basis)
        return max(bases, key=BASES.index, default=BASES[0])
