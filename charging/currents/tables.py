r"""One-dimensional tables that replace every energy integral of a march.

For an attracted Maxwellian of temperature T the emission that its electrons or
ions cause at the potential :math:`\varphi` (V, magnitude) is

.. math:: Y_G(\varphi) = \int_0^\infty t\,e^{-t}\,G(\varphi/Tt)\,y(Tt+\varphi)\,dt

per unit of the one-sided thermal current, with the yield y(E) at the impact
energy and the collection factor G of the geometry. At 0 V it is the plain
Maxwellian average, which also serves every repelled potential. The knots are
:math:`\varphi_k = \varphi_s \sinh^2(kh)`: dense where square-root terms of y
live, geometric where only ratios matter. Between knots a quintic spline.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.polynomial.legendre import leggauss
from numpy.typing import NDArray

from charging.currents.collection import Geometry
from charging.currents.splines import polynomial_and_slope, segmented_spline

Array = NDArray[np.float64]
Yield = Callable[[Array], Array]

SPACING = 0.024  # h; the spline then errs by 1e-8 of what arrives at most, see the tests
REACH_V = 4.0e5  # tables cover this potential; the search range is ±200 kV


def knot_scale(lowest_temperature_eV: float) -> float:
    """Return φ_s [V]: a hundredth of the smallest yield energy scale, or of the temperature.

    Terms such as φ² ln φ of a thick sheath need knots far below either.
    """
    return 0.01 * min(10.0, lowest_temperature_eV)


def knots(scale_V: float, spacing: float = SPACING) -> Array:
    """Return the potentials φ_k [V] from 0 to at least `REACH_V`."""
    last = np.arcsinh(np.sqrt(REACH_V / scale_V))
    grid = scale_V * np.sinh(spacing * np.arange(int(np.ceil(last / spacing)) + 1)) ** 2
    return np.asarray(grid, dtype=np.float64)


def flux_nodes() -> tuple[Array, Array]:
    r"""Nodes and weights [Q] for :math:`\int_0^\infty t e^{-t} g(t) dt`.

    Gauss-Legendre on panels equal in ln t from 1e-6 to 50, so that structure of
    the yield far below the temperature is resolved; the part below 1e-6 holds
    5e-13 of the weight.
    """
    edges = np.concatenate([[0.0], np.geomspace(1e-6, 50.0, 30)])
    x, w = leggauss(10)
    half = np.diff(edges)[:, None] / 2.0
    t = (edges[:-1, None] + half * (1.0 + x)).ravel()
    return t, (half * w).ravel() * t * np.exp(-t)


def average_yields(
    yields: Sequence[Yield],
    temperature_eV: float,
    potential_V: Array,
    geometries: Sequence[Geometry],
) -> Array:
    """Integrate several yields over one attracted Maxwellian.

    Parameters
    ----------
    yields : sequence of callables, length Y
        y(E) for impact energy E [eV], same shape out as in.
    temperature_eV : float
    potential_V : ndarray [K]
        Magnitude of the attracting potential.
    geometries : sequence of Geometry, length G

    Returns
    -------
    ndarray [Y, G, K]
        Y_G, per unit of the one-sided thermal current.
    """
    t, weight = flux_nodes()
    energy = temperature_eV * t + potential_V[:, None]
    over = potential_V[:, None] / (temperature_eV * t)
    factors = [geometry.per_energy(over) * weight for geometry in geometries]
    return np.stack(
        [
            np.stack([(value * factor).sum(axis=-1) for factor in factors])
            for value in (y(energy) for y in yields)
        ]
    )


@dataclass(frozen=True, slots=True)
class YieldTable:
    """Quintic splines on common knots, for many functions at once.

    Attributes
    ----------
    knots_V : ndarray [K]
    coefficients : ndarray [L, K-1, 6, C]
        L entries (surfaces times populations, flattened), highest power first,
        C columns.
    """

    knots_V: Array
    coefficients: Array

    @classmethod
    def fit(cls, scale_V: float, values: Array, spacing: float = SPACING) -> "YieldTable":
        """Build from `values` [L, K, C] at ``knots(scale_V, spacing)`` [K]."""
        return cls.on(knots(scale_V, spacing), values)

    @classmethod
    def on(cls, knots_V: Array, values: Array, breaks: Sequence[float] = ()) -> "YieldTable":
        """Build from `values` [L, K, C] at any knots [K], split at those in `breaks`."""
        pieces = segmented_spline(knots_V, np.moveaxis(values, 1, 0), breaks)  # [K-1, 6, L, C]
        return cls(knots_V, np.ascontiguousarray(np.moveaxis(pieces, 2, 0)))

    def __call__(self, potential_V: Array) -> tuple[Array, Array]:
        """Return values and slopes by potential, [..., L, C], at `potential_V` [..., L] >= 0.

        Beyond the last knot (`REACH_V`) the last polynomial goes on; the solvers
        refuse such potentials.
        """
        k = np.searchsorted(self.knots_V, potential_V, side="right") - 1
        k = np.clip(k, 0, len(self.knots_V) - 2)
        c = self.coefficients[np.arange(potential_V.shape[-1]), k]
        return polynomial_and_slope(c, (potential_V - self.knots_V[k])[..., None])
