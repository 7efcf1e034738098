r"""Populations whose moments change in time, as fixed Maxwellians with weights in time.

A march reads tables made for fixed temperatures. So a population whose temperature moves
along the orbit is a mixture of the two neighbours on a grid of temperatures, their weights
linear in time. The weights keep density and pressure. A kappa population is the mixture of
Maxwellians whose inverse temperatures follow a gamma distribution, shape :math:`\kappa-1/2`,
rate :math:`(\kappa-3/2)T`: exactly the kappa law, and again weights on the same grid.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammainc

from environments.plasma import BASES, Plasma, Population
from environments.population_series import PopulationSeries
from environments.species import HYDROGEN_ION, Species

Array = NDArray[np.float64]

RATIO = 1.2
"""From one temperature of the grid to the next. The mixture of two neighbours instead of the
Maxwellian between them moves a floating potential by 0.011 T at most where protons balance and
by 0.031 T where O+ does (of 2.5 and 3.6 T), and lowers a random current by 0.10 %."""

CONSTANT = 1e-3
"""Relative change of a temperature below which one Maxwellian of its mean serves."""

NEGLIGIBLE = 1e-6
"""Share of the ion current that a Maxwellian must reach at some time to be kept."""

KAPPA_STEP = 2
"""Steps of the grid between the Maxwellians of a kappa, whose spread hides the gaps: its random
current comes out 0.26 % low."""

KAPPA_TAILS = (1e-5, 1e-4)
"""Parts of the density (cold end) and of the pressure (hot end) of a kappa that are left out."""


@dataclass(frozen=True, slots=True)
class Basis:
    r"""Fixed Maxwellians of 1 m-3 and how many of each there are.

    Attributes
    ----------
    plasmas : tuple of Plasma, length B
        One population each, ions before electrons.
    weights : ndarray [K, B]
        Density of each [m-3] at K times. Ions of one charge count as that many protons of the
        same temperature as bring their current: as many as there are, times
        :math:`\sqrt{m_p/m}`.
    """

    plasmas: tuple[Plasma, ...]
    weights: Array


def basis_of(series: Sequence[PopulationSeries], name: str) -> Basis:
    """Basis of populations at rest.

    Parameters
    ----------
    series : sequence of PopulationSeries
        At the same K times.
    name : str
        Name of the plasma they belong to.

    Returns
    -------
    Basis
        Maxwellians that never bring `NEGLIGIBLE` of the ion current are left out.
    """
    found: dict[tuple[int, float], Array] = {}
    bases: dict[tuple[int, float], str] = {}
    for one in series:
        if not bool(np.any(one.density_m3 > 0.0)):
            continue
        charge = one.species.charge_number
        equal = 1.0 if charge < 0 else float(np.sqrt(HYDROGEN_ION.mass_kg / one.species.mass_kg))
        for temperature, weight in parts(one):
            key = (charge, temperature)
            found[key] = found.get(key, 0.0) + equal * weight
            before = bases.get(key, BASES[0])
            bases[key] = max(before, one.basis, key=BASES.index)
    keys = sorted(_kept(found), key=lambda key: (key[0] < 0, *key))
    plasmas = tuple(
        Plasma(
            name=f"{name}: {_species(charge).name} {temperature:.4g} eV",
            title="part of a plasma that changes along the orbit",
            source="environments.regions",
            basis=bases[charge, temperature],
            clause=None,
            note="",
            populations=(Population(_species(charge), "maxwellian", 1.0, temperature),),
        )
        for charge, temperature in keys
    )
    return Basis(plasmas, np.stack([found[key] for key in keys], axis=-1))


def parts(series: PopulationSeries, ratio: float = RATIO) -> list[tuple[float, Array]]:
    """Temperatures [eV] and densities [m-3], each [K], whose sum stands for a population."""
    density, temperature = series.density_m3, series.temperature_eV
    present = density > 0.0
    low, high = float(temperature[present].min()), float(temperature[present].max())
    if series.law == "kappa":
        assert series.kappa is not None
        shape, rate = series.kappa - 0.5, (series.kappa - 1.5)
        cold, hot = _gamma_reach(shape)
        grid = _grid(low * rate / hot, high * rate / cold, ratio, KAPPA_STEP)
        below, above = _gamma_hats(shape, rate * temperature[:, None], grid)
        return _weighted(grid, density, below, above)
    if high <= low * (1.0 + CONSTANT):
        mean = float((density * temperature).sum() / density.sum())
        return [(mean, density)]
    grid = _grid(low, high, ratio)
    inside = np.clip(temperature, low, high)
    cell = np.clip(np.searchsorted(grid, inside, side="right") - 1, 0, len(grid) - 2)
    above_share = (inside - grid[cell]) / (grid[cell + 1] - grid[cell])
    shares = np.zeros((len(density), len(grid) - 1))
    below, above = shares.copy(), shares.copy()
    rows = np.arange(len(density))
    below[rows, cell], above[rows, cell] = 1.0 - above_share, above_share
    return _weighted(grid, density, below, above)


def _weighted(grid: Array, density: Array, below: Array, above: Array) -> list[tuple[float, Array]]:
    """Temperatures and densities from the shares [K, cells] at both ends of every cell."""
    share = np.zeros((len(density), len(grid)))
    share[:, :-1] += below
    share[:, 1:] += above
    return [
        (float(t), density * share[:, k]) for k, t in enumerate(grid) if bool(np.any(share[:, k]))
    ]


def _grid(low: float, high: float, ratio: float, step: int = 1) -> Array:
    """Every `step`-th power of the ratio around a range of temperatures, at least two."""
    wide = step * np.log(ratio)
    first = int(np.floor(np.log(low) / wide + 1e-9))
    last = max(int(np.ceil(np.log(high) / wide - 1e-9)), first + 1)
    return np.asarray(ratio ** (step * np.arange(first, last + 1, dtype=np.float64)))


def _gamma_reach(shape: float) -> tuple[float, float]:
    """Arguments between which a gamma distribution holds all but `KAPPA_TAILS`."""
    from scipy.special import gammaincinv

    # hot particles have a small inverse temperature; pressure weighs it with T, shape less 1
    return float(gammaincinv(shape - 1.0, KAPPA_TAILS[1])), float(
        gammaincinv(shape, 1.0 - KAPPA_TAILS[0])
    )


def _gamma_hats(shape: float, rate: Array, grid: Array) -> tuple[Array, Array]:
    """Shares [K, cells] of a kappa's Maxwellians at the ends of each cell of the grid.

    Linear in T within a cell, so density and pressure are those of the gamma distribution
    over the cell; `rate` [K, 1] in eV.
    """
    inverse = rate / grid
    number = np.clip(-np.diff(gammainc(shape, inverse), axis=-1), 0.0, None)
    pressure = -np.diff(gammainc(shape - 1.0, inverse), axis=-1) * rate / (shape - 1.0)
    above = np.clip((pressure - grid[:-1] * number) / np.diff(grid), 0.0, number)
    return number - above, above


def _kept(found: dict[tuple[int, float], Array]) -> list[tuple[int, float]]:
    """Parts that matter beside the ion current at some time; all where there are no ions."""
    ions = sum(
        (weight * charge * np.sqrt(temperature) for (charge, temperature), weight in found.items()
         if charge > 0),
        start=np.zeros(1),
    )  # fmt: skip
    heavy = float(np.sqrt(HYDROGEN_ION.mass_kg / 9.1093837e-31))
    kept = []
    for (charge, temperature), weight in found.items():
        flux = weight * abs(charge) * np.sqrt(temperature) * (heavy if charge < 0 else 1.0)
        if bool(np.any(flux > NEGLIGIBLE * ions)):
            kept.append((charge, temperature))
    return kept


def _species(charge: int) -> Species:
    """Electron, proton, or a proton's mass with a larger charge."""
    from environments.species import ELECTRON

    if charge < 0:
        return ELECTRON
    if charge == 1:
        return HYDROGEN_ION
    return Species(f"charge +{charge}, 1 u", HYDROGEN_ION.mass_kg, charge)
