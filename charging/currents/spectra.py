r"""Tables of a population whose energy distribution is no Maxwellian.

From the directional flux j(E) follow, with Liouville's theorem, the current on a
patch and what it releases there:

.. math:: J = q\pi\int_{\max(0, q\varphi)} j(E)\,G\,dE,

:math:`G = 1 - q\varphi/E` when repelled, in every geometry; 1 in a thin sheath,
:math:`1 + |q\varphi|/E` on a sphere and so on when attracted. Collection and mean
yields are tabulated once per case over the energy gained or lost; tables are split
at the kinks of the spectrum.
"""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from charging.currents.collection import PLANE, Geometry
from charging.currents.splines import graded_knots, polynomial_and_slope, segmented_spline
from charging.currents.tables import REACH_V, SPACING, Yield, knots
from environments.energy_panels import energy_nodes
from environments.isotropic import (
    Distribution,
    distribution_moments,
    lowest_panel_eV,
    panel_marks_eV,
)
from environments.plasma import Population, population_current

Array = NDArray[np.float64]


def repelled_averages(
    distribution: Distribution, mass_kg: float, yields: Sequence[Yield], lost_eV: Array
) -> tuple[Array, Array]:
    """Collected and released particles of a repelled spectrum by direct quadrature.

    Parameters
    ----------
    distribution : Distribution
    mass_kg : float
    yields : sequence of callables, length Y
    lost_eV : ndarray [K]
        Energy that a particle loses on its way, >= 0.

    Returns
    -------
    ndarray [K], ndarray [Y, K]
        Particles that arrive and what they release, per particle that arrives at 0 V.
    """
    energy, weight = energy_nodes(
        lowest_panel_eV(distribution), distribution.top_eV, panel_marks_eV(distribution), lost_eV
    )
    # impact energy x: j(x + lost) (1 - lost/(x + lost)) dx
    whole = energy + lost_eV[:, None]
    arriving = np.pi * distribution.flux(whole, mass_kg) * (energy / whole) * weight
    released = [(arriving * y(energy)).sum(axis=-1) for y in yields]
    flux = distribution_moments(distribution, mass_kg).number_flux_m2_s
    return arriving.sum(axis=-1) / flux, np.array(released).reshape(len(yields), -1) / flux


def attracted_averages(
    distribution: Distribution,
    mass_kg: float,
    yields: Sequence[Yield],
    gained_eV: Array,
    geometries: Sequence[Geometry],
) -> tuple[Array, Array]:
    """Collected [G, K] and released [Y, G, K] particles of an attracted spectrum.

    As `repelled_averages`; `gained_eV` >= 0 is the energy that a particle gains.
    """
    energy, weight = energy_nodes(
        lowest_panel_eV(distribution),
        distribution.top_eV,
        panel_marks_eV(distribution),
        np.zeros(1),
    )
    flux = distribution_moments(distribution, mass_kg).number_flux_m2_s
    far = np.pi * distribution.flux(energy, mass_kg) * weight / flux
    gained = gained_eV[:, None]
    arriving = [far * g.per_energy(gained / energy) for g in geometries]
    impact = energy + gained
    released = [
        [(a * value).sum(axis=-1) for a in arriving] for value in (y(impact) for y in yields)
    ]
    shape = (len(yields), len(geometries), len(gained_eV))
    return np.stack([a.sum(axis=-1) for a in arriving]), np.array(released).reshape(shape)


@dataclass(frozen=True, slots=True)
class SpectrumTable:
    """Collection and yields of one population, for S surfaces.

    Attributes
    ----------
    plasma : int
        Which plasma the population belongs to.
    current_A_m2, charge_number : float
        Signed one-sided current at full strength; magnitude of the charge.
    breaks_V : mapping of float to float
        Magnitudes of the retarding potentials at which the tables have kinks, and the
        spacing of knots that these need, see `graded_knots`.
    repelled_knots_eV, attracted_knots_eV : ndarray
    repelled : ndarray [S, K-1, 6, 1+Y]
        Logarithm of the collected share over `cut`, then mean yields.
    attracted : ndarray [S, K-1, 6, 1+2Y]
        Collected share of the thick sheath, then mean yields, plane and thick by turns.
    cutoff_eV : float
        Where a spectrum ends; beyond the last knot nothing arrives.
    """

    plasma: int
    current_A_m2: float
    charge_number: float
    breaks_V: Mapping[float, float]
    repelled_knots_eV: Array
    attracted_knots_eV: Array
    repelled: Array
    attracted: Array
    cutoff_eV: float

    def __call__(self, pull_V: Array) -> tuple[Array, Array]:
        """Shares [..., S, 2+2Y] of the current at 0 V, and slopes by `pull_V` [..., S].

        `pull_V` is positive where the population is attracted. Columns: collected in plane
        and thick sheath, then released per yield in plane and thick sheath.
        """
        value, slope = self._attracted(np.maximum(pull_V, 0.0) * self.charge_number)
        lost, d_lost = self._repelled(np.maximum(-pull_V, 0.0) * self.charge_number)
        attracted = (pull_V > 0.0)[..., None]
        return (
            np.where(attracted, value, lost),
            np.where(attracted, slope, -d_lost) * self.charge_number,
        )

    def _cells(self, knots_eV: Array, c: Array, energy: Array) -> tuple[Array, Array]:
        k = np.clip(np.searchsorted(knots_eV, energy, side="right") - 1, 0, len(knots_eV) - 2)
        return c[np.arange(energy.shape[-1]), k], (energy - knots_eV[k])[..., None]

    def _repelled(self, energy: Array) -> tuple[Array, Array]:
        last = self.repelled_knots_eV[-1]
        inside = np.minimum(energy, last)
        value, slope = polynomial_and_slope(
            *self._cells(self.repelled_knots_eV, self.repelled, inside)
        )
        rest = 1.0 - inside / self.cutoff_eV
        ends = bool(last < REACH_V) or np.isfinite(self.cutoff_eV)
        there = (energy < last) if ends else np.ones_like(energy, dtype=np.bool_)
        base = np.where(there, np.exp(value[..., 0]), 0.0)
        share = base * rest**2
        d_share = share * slope[..., 0] - 2.0 * base * rest / self.cutoff_eV
        return self._both(share, d_share, value[..., 1:], slope[..., 1:])

    def _both(
        self, share: Array, d_share: Array, mean: Array, d_mean: Array
    ) -> tuple[Array, Array]:
        """Equal columns for plane and thick sheath, as Liouville has it for the repelled."""
        released = share[..., None] * mean
        d_released = d_share[..., None] * mean + share[..., None] * d_mean
        value = np.concatenate([share[..., None], released], axis=-1)
        slope = np.concatenate([d_share[..., None], d_released], axis=-1)
        return np.repeat(value, 2, axis=-1), np.repeat(slope, 2, axis=-1)

    def _attracted(self, energy: Array) -> tuple[Array, Array]:
        value, slope = polynomial_and_slope(
            *self._cells(self.attracted_knots_eV, self.attracted, energy)
        )
        thick, d_thick = value[..., :1], slope[..., :1]
        one, zero = np.ones_like(thick), np.zeros_like(thick)
        yields = (value.shape[-1] - 1) // 2
        share = np.concatenate([one, thick] * (1 + yields), axis=-1)
        d_share = np.concatenate([zero, d_thick] * (1 + yields), axis=-1)
        mean = np.concatenate([one, one, value[..., 1:]], axis=-1)
        d_mean = np.concatenate([zero, zero, slope[..., 1:]], axis=-1)
        return share * mean, d_share * mean + share * d_mean


NOTHING = 1e-250  # share of a spectrum below which it counts as ended
NEAR_A_STEP, NEAR_A_KINK = 0.04, 0.05  # spacing of knots below a mark of the spectrum


def _marks(distribution: Distribution, mass_kg: float, end_eV: float) -> dict[float, float]:
    """Spacing of the knots below every mark of a spectrum up to `end_eV`, by energy [eV].

    Just below a step of the spectrum the particles that still arrive do so with the energy
    that is left to them, so the mean yield changes there as the yield does near zero energy.
    """
    marks = sorted({m for m in distribution.marks_eV if 0.0 < m < end_eV} | {end_eV})
    below, above = (
        distribution.flux(np.array(marks) * (1.0 + side * 1e-9), mass_kg) for side in (-1.0, 1.0)
    )
    steps = np.abs(above - below) > 1e-6 * below
    return {
        mark: NEAR_A_STEP if step else NEAR_A_KINK for mark, step in zip(marks, steps, strict=True)
    }


def spectrum_table(
    population: Population,
    plasma: int,
    yields: Sequence[Sequence[Yield]],
    thick: Geometry,
    rows: Sequence[int] | None = None,
) -> SpectrumTable:
    """Tabulate one population.

    Parameters
    ----------
    population : Population
        With a distribution.
    plasma : int
        Index of its plasma.
    yields : sequence [U] of sequences [Y] of callables
        What each kind of surface releases per particle.
    thick : Geometry
    rows : sequence of int [S], optional
        Kind of each surface; default: one surface per kind.
    """
    distribution = population.distribution
    if distribution is None:
        raise ValueError("a Maxwellian has closed forms")
    mass, charge = population.species.mass_kg, population.species.charge_number
    flat = [y for row in yields for y in row]
    surfaces, kinds = len(yields), len(yields[0])
    size = float(abs(charge))
    reach = REACH_V * size
    grid = size * knots(0.01 * min(10.0, distribution.scale_eV) / size)

    end = min(reach, distribution.top_eV)
    scale = 0.01 * min(10.0, distribution.scale_eV)
    spacings = _marks(distribution, mass, end)
    lost = graded_knots(scale, SPACING, spacings)
    share, released = repelled_averages(distribution, mass, flat, lost)
    cutoff = distribution.cutoff_eV
    counts = share > NOTHING
    counts[-1] |= end == cutoff and counts[-2]
    if not counts.all():  # a steep tail: what lies beyond is nothing
        lost, share, released = lost[counts], share[counts], released[:, counts]
        end = float(lost[-1])
    with np.errstate(divide="ignore", invalid="ignore"):  # the end of a spectrum, set below
        rest = (1.0 - lost / cutoff) ** 2
        log_share, mean = np.log(share / rest), released / share
    if end == cutoff:
        # J -> pi j(E_c) (E_c - lost)^2/(2 E_c), made of particles that arrive with nothing left
        edge = float(distribution.flux(np.array([cutoff]), mass)[0])
        flux = distribution_moments(distribution, mass).number_flux_m2_s
        log_share[-1] = np.log(np.pi * edge * cutoff / 2.0 / flux)
        mean[:, -1] = [float(y(np.zeros(1))[0]) for y in flat]
    columns = np.empty((len(lost), surfaces, 1 + kinds))
    columns[..., 0] = log_share[:, None]
    columns[..., 1:] = np.moveaxis(mean, 1, 0).reshape(len(lost), surfaces, kinds)

    thick_share, both = attracted_averages(distribution, mass, flat, grid, (PLANE, thick))
    pulled = np.empty((len(grid), surfaces, 1 + 2 * kinds))
    pulled[..., 0] = thick_share[1][:, None]
    mean_both = both / thick_share  # [S Y, 2, K]
    pulled[..., 1:] = np.moveaxis(mean_both, 2, 0).reshape(len(grid), surfaces, 2 * kinds)
    marks = [m for m in distribution.marks_eV if m < end]
    kind = np.arange(surfaces) if rows is None else np.asarray(rows, dtype=np.intp)
    repelled = np.moveaxis(segmented_spline(lost, columns, marks), 2, 0)[kind]
    attracted = np.moveaxis(segmented_spline(grid, pulled, ()), 2, 0)[kind]
    return SpectrumTable(
        plasma=plasma,
        current_A_m2=population_current(population),
        charge_number=size,
        breaks_V={m / size: spacing for m, spacing in spacings.items() if m < end or end == cutoff},
        repelled_knots_eV=lost,
        attracted_knots_eV=grid,
        repelled=np.ascontiguousarray(repelled),
        attracted=np.ascontiguousarray(attracted),
        cutoff_eV=cutoff,
    )
