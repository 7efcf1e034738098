r"""Tables of a population whose energy distribution is no Maxwellian.

From the directional flux j(E) follow, with Liouville's theorem, the current on a
patch and what it releases there:

.. math:: J = q\pi\int_{\max(0, q\varphi)} j(E)\,G\,dE,

:math:`G = 1 - q\varphi/E` when repelled, in every geometry; 1 in a thin sheath,
:math:`1 + |q\varphi|/E` on a sphere and so on when attracted. Collection and mean
yields are tabulated once per case over the energy gained or lost; tables are split
at the kinks of the spectrum.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from charging.currents.collection import PLANE, Geometry
from charging.currents.splines import polynomial_and_slope, refined_cells, segmented_spline
from charging.currents.tables import REACH_V, Yield, knots
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
    return arriving.sum(axis=-1) / flux, np.array(released).reshape(
        len(yields), len(lost_eV)
    ) / flux


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
    breaks_V : tuple of float
        Magnitudes of the retarding potentials at which the tables have kinks.
    repelled_knots_eV, attracted_knots_eV : ndarray
    repelled : ndarray [S, K-1, 8, 1+Y]
        Logarithm of the collected share over (1 - lost/cutoff)^2, then mean yields.
    attracted : ndarray [S, K-1, 6, 1+2Y]
        Collected share of the thick sheath, then mean yields, plane and thick by turns.
    cutoff_eV : float
        Where a spectrum ends; beyond the last knot nothing arrives.
    """

    plasma: int
    current_A_m2: float
    charge_number: float
    breaks_V: tuple[float, ...]
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


ACCURACY = 1e-9  # of what arrives, to which tables follow the integrals
FLOOR = 1e-22  # of what arrives at 0 V: errors below it do not count
NOTHING = 1e-100  # share of a spectrum below which it counts as ended
FIRST_CELLS = 40
AT_ONCE = 200  # potentials whose integrals are evaluated together


def _end_eV(distribution: Distribution, mass_kg: float, reach_eV: float) -> float:
    """Energy lost at which nothing more arrives, or the reach of the tables [eV]."""
    end = min(reach_eV, distribution.top_eV)
    whole = distribution_moments(distribution, mass_kg).number_flux_m2_s
    if end == distribution.cutoff_eV:
        edge = float(distribution.flux(np.array([end]), mass_kg)[0])
        if edge * end > NOTHING * whole:  # else it has ended below its cut-off, as a beam does
            return end

    def arrives(lost_eV: float) -> bool:
        share = repelled_averages(distribution, mass_kg, [], np.array([lost_eV]))[0]
        return bool(share[0] > NOTHING)

    if end != distribution.cutoff_eV and arrives(end):
        return end
    low = 0.0
    while end - low > 1e-6 * end:
        middle = 0.5 * (low + end)
        low, end = (middle, end) if arrives(middle) else (low, middle)
    return low


def _repelled_columns(
    distribution: Distribution, mass_kg: float, yields: Sequence[Yield], end_eV: float
) -> Callable[[Array], tuple[Array, Array]]:
    """Function for `refined_cells`: what `SpectrumTable.repelled` holds, of energies lost.

    Collected particles may err by `ACCURACY` of themselves, released ones by as much of what
    arrives.
    """
    cutoff = distribution.cutoff_eV

    def columns(lost_eV: Array) -> tuple[Array, Array]:
        parts = [
            repelled_averages(distribution, mass_kg, yields, part)
            for part in np.array_split(lost_eV, -(-len(lost_eV) // AT_ONCE))
        ]
        share, released = (np.concatenate(part, axis=-1) for part in zip(*parts, strict=True))
        ends = lost_eV >= cutoff
        share[ends] = 1.0
        found = np.empty((len(lost_eV), 1 + len(yields)))
        with np.errstate(divide="ignore"):  # the end of a spectrum, set below
            found[:, 0] = np.log(share) - 2.0 * np.log1p(-np.minimum(lost_eV / cutoff, 1.0))
        found[:, 1:] = (released / share).T
        if ends.any():
            # J -> pi j(E_c) (E_c - lost)^2/(2 E_c), made of particles that arrive with nothing
            edge = float(distribution.flux(np.array([cutoff]), mass_kg)[0])
            flux = distribution_moments(distribution, mass_kg).number_flux_m2_s
            found[ends, 0] = np.log(np.pi * edge * cutoff / 2.0 / flux)
            found[ends, 1:] = [float(y(np.zeros(1))[0]) for y in yields]
            share[ends] = 0.0
        # close to the end of a spectrum the energy left over is a difference of large numbers
        rounding = 1e-15 / np.maximum(1.0 - lost_eV / cutoff, 1e-15)
        allowed = ACCURACY + rounding + FLOOR / np.maximum(share, FLOOR)
        return found, np.broadcast_to(np.minimum(allowed, 0.1)[:, None], found.shape)

    return columns


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

    end = _end_eV(distribution, mass, reach)
    marks = [m for m in distribution.marks_eV if 0.0 < m < end]
    first = np.geomspace(1e-3 * min(distribution.scale_eV, end), end, FIRST_CELLS)
    edges = np.array(sorted({0.0, *first[:-1].tolist(), *marks, end}))
    lost, pieces = refined_cells(_repelled_columns(distribution, mass, flat, end), edges)
    cells, powers = pieces.shape[:2]
    repelled = np.empty((surfaces, cells, powers, 1 + kinds))
    repelled[..., 0] = pieces[..., 0]
    repelled[..., 1:] = np.moveaxis(pieces[..., 1:].reshape(cells, powers, surfaces, kinds), 2, 0)

    thick_share, both = attracted_averages(distribution, mass, flat, grid, (PLANE, thick))
    pulled = np.empty((len(grid), surfaces, 1 + 2 * kinds))
    pulled[..., 0] = thick_share[1][:, None]
    mean_both = both / thick_share  # [S Y, 2, K]
    pulled[..., 1:] = np.moveaxis(mean_both, 2, 0).reshape(len(grid), surfaces, 2 * kinds)
    kind = np.arange(surfaces) if rows is None else np.asarray(rows, dtype=np.intp)
    attracted = np.moveaxis(segmented_spline(grid, pulled, ()), 2, 0)[kind]
    return SpectrumTable(
        plasma=plasma,
        current_A_m2=population_current(population),
        charge_number=size,
        breaks_V=tuple(m / size for m in (*marks, end)),
        repelled_knots_eV=lost,
        attracted_knots_eV=grid,
        repelled=np.ascontiguousarray(repelled[kind]),
        attracted=np.ascontiguousarray(attracted),
        cutoff_eV=distribution.cutoff_eV,
    )
