"""Net current of each surface as a function of its potential alone, for the march.

At a given potential the current of a surface is linear in the shares of the
plasmas, in the light and in the sheath weight. So one spline per surface and
plasma, in plane and in thick geometry, and one for the photoelectrons replace
all exponentials: a right-hand side is one gather and a few sums. The direct path
is `surface_currents`; tests and every run's charge audit compare the two.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

from charging.currents.collection import SheathWeight, sheath_weight
from charging.currents.surface import (
    MECHANISMS,
    Populations,
    Setting,
    SurfaceModel,
    electron_sheath,
    surface_currents,
)
from charging.currents.tables import knots

Array = NDArray[np.float64]
Index = NDArray[np.intp]

SCALE_V, SPACING = 0.05, 0.01
PHOTO = MECHANISMS.index("photoemission")


@dataclass(frozen=True, slots=True)
class NetCurrents:
    """Splines of U surface models with the same surfaces, plasmas and body.

    Attributes
    ----------
    knots_V : ndarray [K]
        From 0 upwards; mirrored for negative potentials.
    coefficients : ndarray [U, S, 2(K-1), 4, 2P+1]
        Negative side first; columns: plasmas in plane geometry, plasmas in thick
        geometry, photoelectrons at full light.
    electrons : Populations
    radius_m, collection
        As in `SurfaceModel`.
    """

    knots_V: Array
    coefficients: Array
    electrons: Populations
    radius_m: float
    collection: str

    def current(self, which: Index, potential_V: Array, setting: Setting) -> Array:
        """Net current density [A m-2] alone, [m, S]; arguments as in `current_and_slope`."""
        c, x, _ = self._cells(which, potential_V)
        return self._mixed(_values(c, x), self._sheath(potential_V, setting).weight, setting)

    def current_and_slope(
        self, which: Index, potential_V: Array, setting: Setting
    ) -> tuple[Array, Array]:
        """Net current density [A m-2] and its derivative by potential, each [m, S].

        Parameters
        ----------
        which : ndarray of int [m]
            Surface model of each member.
        potential_V : ndarray [m, S]
        setting : Setting
            Strength [m, P], light [m, S].
        """
        c, x, positive = self._cells(which, potential_V)
        sheath = self._sheath(potential_V, setting)
        value = _values(c, x)
        slope = (3.0 * c[..., 0, :] * x + 2.0 * c[..., 1, :]) * x + c[..., 2, :]
        slope = np.where(positive[..., None], slope, -slope)
        share = setting.strength[:, None, :]
        plasmas = share.shape[-1]
        gain = ((value[..., plasmas:-1] - value[..., :plasmas]) * share).sum(axis=-1)
        return (
            self._mixed(value, sheath.weight, setting),
            self._mixed(slope, sheath.weight, setting) + sheath.slope * gain,
        )

    def _cells(
        self, which: Index, potential_V: Array
    ) -> tuple[Array, Array, NDArray[np.bool_]]:
        """Coefficients [m, S, 4, C] of the cells, distance from their knots [m, S, 1], side."""
        cells = len(self.knots_V) - 1
        size = np.abs(potential_V)
        k = np.minimum((np.arcsinh(np.sqrt(size / SCALE_V)) / SPACING).astype(np.intp), cells - 1)
        x = size - self.knots_V[k]
        positive = potential_V >= 0.0
        column = np.arange(potential_V.shape[1])
        c = self.coefficients[which[:, None], column, k + cells * positive]
        return c, x[..., None], positive

    def _sheath(self, potential_V: Array, setting: Setting) -> SheathWeight:
        debye, temperature = electron_sheath(self.electrons, setting.strength)
        return sheath_weight(
            potential_V,
            debye_length_m=debye[:, None],
            temperature_eV=temperature[:, None],
            radius_m=self.radius_m,
            collection=self.collection,
        )

    def _mixed(self, columns: Array, w: Array, setting: Setting) -> Array:
        """Sum over plasmas, geometries and light of columns [m, S, 2P+1]."""
        share = setting.strength[:, None, :]
        plasmas = share.shape[-1]
        plane: Array = (columns[..., :plasmas] * share).sum(axis=-1)
        thick: Array = (columns[..., plasmas:-1] * share).sum(axis=-1)
        return plane + w * (thick - plane) + setting.light * columns[..., -1]


def _values(c: Array, x: Array) -> Array:
    value: Array = ((c[..., 0, :] * x + c[..., 1, :]) * x + c[..., 2, :]) * x + c[..., 3, :]
    return value


def net_currents(models: Sequence[SurfaceModel]) -> NetCurrents:
    """Tabulate surface models that differ in emission only (a law, a material value)."""
    grid = knots(SCALE_V, SPACING)
    first = models[0]
    plasmas = int(first.electrons.plasma.max()) + 1
    surfaces = len(first.photo_saturation_A_m2)
    both = []
    for model in models:
        sides = []
        for sign in (-1.0, 1.0):
            phi = np.repeat(sign * grid[:, None], surfaces, axis=1)
            columns = []
            for collection in ("plane", "cylinder" if first.collection == "cylinder" else "sphere"):
                fixed = replace(model, collection=collection)
                for p in range(plasmas):
                    strength = np.broadcast_to(np.eye(plasmas)[p], (len(grid), plasmas))
                    dark = Setting(strength, np.zeros_like(phi))
                    columns.append(surface_currents(fixed, phi, dark).by_mechanism.sum(axis=-1))
            first_only = np.broadcast_to(np.eye(plasmas)[0], (len(grid), plasmas))
            lit = Setting(first_only, np.ones_like(phi))
            columns.append(surface_currents(model, phi, lit).by_mechanism[..., PHOTO])
            values = np.stack(columns, axis=-1)  # [K, S, 2P+1]
            sides.append(np.moveaxis(CubicSpline(grid, values, axis=0).c, (2, 1), (0, 1)))
        both.append(np.concatenate(sides, axis=1))
    return NetCurrents(
        knots_V=grid,
        coefficients=np.ascontiguousarray(np.stack(both)),
        electrons=first.electrons,
        radius_m=first.radius_m,
        collection=first.collection,
    )
