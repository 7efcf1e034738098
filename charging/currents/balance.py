"""Every floating potential of one surface in one plasma.

The current balance of a surface has one root or several; which one is reached
depends on where the surface comes from. Roots are searched on a scan uniform in
asinh of the potential out to ±200 kV.
"""

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

from charging.currents.barrier import ROUNDING_V
from charging.currents.surface import (
    MECHANISMS,
    Setting,
    SurfaceModel,
    surface_currents,
)
from charging.errors import NoSolutionError

Array = NDArray[np.float64]

SEARCH_V = 2e5
SCAN_POINTS = 24_001
AROUND_A_KINK = (0.0, 1e-5, 1e-4, 4e-4)  # of its potential: further points of the scan
INSIDE_A_CELL = 4  # further points inside each cell of the table of a spectrum
# of all that crosses the surface: below it an extremum counts as a double root. The integrals
# are good to 1e-8 of themselves, so nobody could tell it from one.
TOUCHING = 1e-11
DOUBLE_WIDTH = 1e-6  # of the potential: roots nearer than this may be one double root


@dataclass(frozen=True, slots=True)
class Root:
    """A floating potential [V]; stable when the current falls through zero there."""

    potential_V: float
    stable: bool


@dataclass(frozen=True, slots=True)
class FloatingPotentials:
    """All roots, ascending, and the one that an uncharged surface reaches."""

    roots: tuple[Root, ...]
    reached_V: float


def net_current(model: SurfaceModel, potential_V: Array, light: float) -> tuple[Array, Array]:
    """Net current density [A m-2] and slope at potentials [N] of the only surface of a model."""
    count = len(potential_V)
    setting = Setting(np.ones((count, 1)), np.full((count, 1), light))
    currents = surface_currents(model, potential_V[:, None], setting)
    return currents.by_mechanism.sum(axis=-1)[:, 0], currents.slope[:, 0]


def floating_potentials(model: SurfaceModel, light: float) -> FloatingPotentials:
    """Find every floating potential of one surface.

    Parameters
    ----------
    model : SurfaceModel
        Of one surface in one plasma.
    light : float
        Illumination times incidence cosine, 0…1.

    Returns
    -------
    FloatingPotentials
        Roots to 1 nV or 1e-12; a touching (double) root counts once and as unstable. An
        extremum of at most `TOUCHING` of the gross current counts as touching.

    Raises
    ------
    NoSolutionError
        The current does not change sign within ±200 kV.

    Notes
    -----
    The scan has further points where spectra or lines of light begin or end to count, and
    carries the analytic slope. Two roots inside one interval (0.1 % of the potential) have an
    extremum between them: the slope turns towards zero current at one end and away at the
    other. Where the tangent of either end leaves room for a crossing, the extremum is located
    as the root of the slope.
    """
    roots = all_roots(model, light)
    at_zero = float(net_current(model, np.zeros(1), light)[0][0])
    if not roots:
        raise NoSolutionError(
            f"no floating potential within ±{SEARCH_V / 1e3:.0f} kV: the net current keeps the "
            f"sign of {at_zero:+.3g} A m-2"
        )
    return FloatingPotentials(roots, _reached(roots, at_zero))


def all_roots(model: SurfaceModel, light: float) -> tuple[Root, ...]:
    """Every potential at which the current vanishes, ascending; see `floating_potentials`."""

    def current(v: float) -> float:
        return float(net_current(model, np.array([v]), light)[0][0])

    def noise(v: float) -> float:
        return TOUCHING * gross_current(model, v, light)

    def slope(v: float) -> float:
        return float(net_current(model, np.array([v]), light)[1][0])

    grid = _scan(model)
    values, slopes = net_current(model, grid, light)
    # a zero between zeros is an exponential that underflowed, not a balance
    hit = (values[1:-1] == 0.0) & (values[:-2] != 0.0) & (values[2:] != 0.0)
    found = [float(v) for v in grid[1:-1][hit]]
    # signs, because a product of tiny currents is zero
    crossings = np.flatnonzero(np.sign(values[:-1]) * np.sign(values[1:]) < 0.0)
    found += [_root(current, grid[k], grid[k + 1]) for k in crossings]
    for k in _dips(grid, values, slopes):
        found += _close_pair(current, slope, noise, grid[k], grid[k + 1])
    # the same extremum may end two intervals
    found.sort()
    volts = [v for i, v in enumerate(found) if i == 0 or v - found[i - 1] > 2e-9]
    volts = _without_doubles(volts, current, noise)
    roots = []
    for i, v in enumerate(volts):
        near = [abs(v - other) / 3.0 for other in volts[max(0, i - 1) : i + 2] if other != v]
        step = min(1e-6 * max(1.0, abs(v)), *near, np.inf)
        roots.append(Root(v, current(v - step) > 0.0 > current(v + step)))
    return tuple(roots)


def _without_doubles(
    volts: list[float], current: Callable[[float], float], noise: Callable[[float], float]
) -> list[float]:
    """Roots without those that rounding makes of one double root: nothing but noise between."""
    kept: list[float] = []
    for v in volts:
        if kept and v - kept[-1] < DOUBLE_WIDTH * max(1.0, abs(v)):
            middle = 0.5 * (v + kept[-1])
            if abs(current(middle)) <= noise(middle):
                kept[-1] = middle
                continue
        kept.append(v)
    return kept


def _scan(model: SurfaceModel) -> Array:
    """Potentials uniform in asinh, denser wherever the current has structure of its own.

    That is where a spectrum begins or ends to be repelled, in the cells of its table, which
    are as small as the spectrum is rough, and where the electrons of a line are held back.
    """
    uniform = np.sinh(np.linspace(-1.0, 1.0, SCAN_POINTS) * np.arcsinh(SEARCH_V))
    kinks, cells = [np.array([*model.escape_breaks_V, ROUNDING_V, -ROUNDING_V])], []
    for sign, spectra in ((-1.0, model.electron_spectra), (1.0, model.ion_spectra)):
        for s in spectra:
            kinks.append(sign * np.array(s.breaks_V))
            knots = sign * s.repelled_knots_eV / s.charge_number
            cells.append(_with_points_between(knots))
    near = np.array([sign * d for d in AROUND_A_KINK for sign in (-1.0, 1.0)])
    further = [(np.concatenate(kinks)[:, None] * (1.0 + near)).ravel(), *cells]
    grid = np.concatenate([uniform, *further])
    return np.unique(grid[np.abs(grid) <= SEARCH_V])


def _with_points_between(knots: Array) -> Array:
    share = np.arange(INSIDE_A_CELL + 1) / (INSIDE_A_CELL + 1)
    return (knots[:-1, None] + np.diff(knots)[:, None] * share).ravel()


def _dips(grid: Array, values: Array, slopes: Array) -> Iterable[int]:
    """Intervals in which the current may touch or cross zero twice."""
    sign = np.sign(values[:-1])
    falls, rises = sign * slopes[:-1], sign * slopes[1:]
    low, high = sign * values[:-1], sign * values[1:]
    turns = (sign * values[1:] > 0.0) & (falls <= 0.0) & (rises >= 0.0) & (falls != rises)
    width = np.diff(grid)
    # a curve with a kink, where a spectrum ends, may fall far below where the tangents meet:
    # it is enough that one of them alone gets halfway to zero inside the interval
    deep = (-falls * width >= 0.5 * low) | (rises * width >= 0.5 * high)
    return (int(k) for k in np.flatnonzero(turns & deep))


def _root(current: Callable[[float], float], low: float, high: float) -> float:
    return float(brentq(current, low, high, xtol=1e-9, rtol=1e-12))


def _close_pair(
    current: Callable[[float], float],
    slope: Callable[[float], float],
    noise: Callable[[float], float],
    low: float,
    high: float,
) -> list[float]:
    """Roots around the extremum between `low` and `high`, where the slope changes sign."""
    at_low = current(low)
    if np.sign(slope(low)) * np.sign(slope(high)) < 0.0:
        best = float(brentq(slope, low, high, xtol=1e-12, rtol=1e-14))
    else:  # one of them is zero or rounding: the extremum lies at that end
        best = min(low, high, key=lambda v: abs(slope(v)))
    bottom = current(best)
    if bottom == 0.0:
        return [best]
    if np.sign(bottom) * np.sign(at_low) < 0.0:
        return [_root(current, low, best), _root(current, best, high)]
    return [best] if abs(bottom) <= noise(best) else []


def _reached(roots: Sequence[Root], at_zero: float) -> float:
    """Root that an uncharged surface runs into: the next in the direction of the current."""
    below = [r.potential_V for r in roots if r.potential_V <= 0.0]
    above = [r.potential_V for r in roots if r.potential_V >= 0.0]
    if at_zero < 0.0 and below:
        return max(below)
    if at_zero > 0.0 and above:
        return min(above)
    if at_zero == 0.0:
        return 0.0
    raise NoSolutionError(
        "an uncharged surface is driven away from every floating potential within "
        f"±{SEARCH_V / 1e3:.0f} kV"
    )


def gross_current(model: SurfaceModel, potential_V: float, light: float) -> float:
    """All that crosses the only surface of a model, whatever its sign [A m-2]."""
    return sum(abs(j) for j in breakdown(model, potential_V, light).values())


def breakdown(model: SurfaceModel, potential_V: float, light: float) -> dict[str, float]:
    """Current density [A m-2] by mechanism of the only surface of a model."""
    setting = Setting(np.ones((1, 1)), np.full((1, 1), light))
    row = surface_currents(model, np.array([[potential_V]]), setting).by_mechanism[0, 0]
    return dict(zip(MECHANISMS, (float(j) for j in row), strict=True))
