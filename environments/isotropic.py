r"""What every isotropic energy distribution offers, and its moments.

A distribution gives the directional differential number flux j(E) [m-2 s-1 sr-1 eV-1],
the same in every direction, from which collection and emission follow. Without drift,
non-relativistic (:math:`E = m v^2/2`).
"""

from collections.abc import Mapping
from math import isfinite
from typing import ClassVar, Final, NamedTuple, Protocol, runtime_checkable

import numpy as np
from numpy.typing import NDArray
from scipy.constants import e

from environments.energy_panels import energy_nodes
from environments.errors import EnvironmentDataError

Array = NDArray[np.float64]
Numbers = Mapping[str, tuple[float, float]]

# Ranges outside which a figure is refused as a slip of units; assumed, far beyond any
# plasma that a spacecraft meets (lobe 1e4 m-3, ionosphere 1e12 m-3; 0.02 eV ... 100 keV).
DENSITY_RANGE_M3: Final = (1.0, 1e16)
TEMPERATURE_RANGE_EV: Final = (1e-3, 1e6)
ENERGY_RANGE_EV: Final = (1e-3, 1e7)
FLUX_RANGE: Final = (0.0, 1e30)
REACH_EV: Final = 4e5
"""Retarding potentials up to this leave the integrals over a spectrum accurate."""
EMPTY_M3: Final = 1e-40
"""Density below which a spectrum holds nothing; the least of tables in range has more."""


class Distribution(Protocol):
    """What every law offers.

    `numbers` holds the keys of its figures in a plasma file with their ranges, `arrays`
    those of its lists; both are the names of its fields.
    """

    law: ClassVar[str]
    numbers: ClassVar[Numbers]
    arrays: ClassVar[Numbers]

    def flux(self, energy_eV: Array, mass_kg: float) -> Array:
        """Directional differential number flux [m-2 s-1 sr-1 eV-1] at energies [eV] >= 0."""
        ...

    @property
    def marks_eV(self) -> tuple[float, ...]:
        """Energies with kinks, and those that a narrow beam needs as panel edges [eV]."""
        ...

    @property
    def edges_eV(self) -> tuple[float, ...]:
        """Energies besides the marks at which panels of integrals must end [eV].

        Needed where the spectrum changes over less than the energy above a mark.
        """
        ...

    @property
    def cutoff_eV(self) -> float:
        """Energy above which there is nothing [eV]; inf when the spectrum has no end."""
        ...

    @property
    def top_eV(self) -> float:
        """Energy above which a retarded flux holds less than 1e-15 of itself [eV]."""
        ...

    @property
    def scale_eV(self) -> float:
        """Smallest energy over which the spectrum changes [eV]."""
        ...


class Moments(NamedTuple):
    """Moments of one population, particles without their sign of charge.

    density_m3 [m-3]; number_flux_m2_s, one-sided [m-2 s-1]; mean_energy_eV of the particles
    in a volume; energy_flux_eV_m2_s, one-sided, inf where the integral diverges;
    debye_temperature_eV, 1/<1/(2E)>.
    """

    density_m3: float
    number_flux_m2_s: float
    mean_energy_eV: float
    energy_flux_eV_m2_s: float
    debye_temperature_eV: float


@runtime_checkable
class HasMoments(Protocol):
    """A distribution with moments in closed form."""

    def moments(self, mass_kg: float) -> Moments:
        """Moments of particles of a mass."""
        ...


def lowest_panel_eV(distribution: Distribution) -> float:
    """Where geometric panels over the energy may begin [eV]: a millionth of the scale."""
    return 1e-6 * min(distribution.scale_eV, 10.0)


def panel_marks_eV(distribution: Distribution) -> tuple[float, ...]:
    """Energies at which panels of integrals over a spectrum must end [eV]."""
    return (*distribution.marks_eV, *distribution.edges_eV)


def distribution_moments(distribution: Distribution, mass_kg: float) -> Moments:
    r"""Moments of a distribution: its closed forms, or integrals.

    Number density :math:`4\pi\int j/v\,dE`, one-sided number flux :math:`\pi\int j\,dE`;
    the energy that takes the place of T in the Debye length is :math:`1/\langle
    1/(2E)\rangle`, the linear response of an isotropic f (T for a Maxwellian).

    Raises
    ------
    EnvironmentDataError
        The spectrum holds no particles.

    Examples
    --------
    >>> from scipy.constants import m_e
    >>> from environments.distributions import Kappa
    >>> found = distribution_moments(Kappa(1e6, 100.0, 4.0), m_e)
    >>> round(found.density_m3), round(found.mean_energy_eV, 6)
    (1000000, 150.0)
    """
    if isinstance(distribution, HasMoments):
        return distribution.moments(mass_kg)
    # the root singularity of <1/E> at E = 0 needs a lowest panel that holds 1e-12 of it
    lowest = 1e-18 * lowest_panel_eV(distribution)
    marks = panel_marks_eV(distribution)
    energy, weight = energy_nodes(lowest, distribution.top_eV, marks, np.zeros(1))
    E, dE = energy[0], weight[0]
    flux = distribution.flux(E, mass_kg) * dE
    speed = np.sqrt(2.0 * e * E / mass_kg)
    number = 4.0 * np.pi * flux / speed
    density = float(number.sum())
    if density < EMPTY_M3:
        raise EnvironmentDataError("holds no particles", key=("law",), value=distribution.law)
    found = Moments(
        density,
        float(np.pi * flux.sum()),
        float((number * E).sum()) / density,
        float(np.pi * (flux * E).sum()),
        density / float((number / (2.0 * E)).sum()),
    )
    if not all(isfinite(x) and x > 0.0 for x in found):
        raise EnvironmentDataError("holds no particles", key=("law",), value=distribution.law)
    return found
