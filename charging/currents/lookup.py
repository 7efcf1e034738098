"""Net current of each surface as a function of its potential alone, for the march.

At a given potential the current of a surface is linear in the shares of the
plasmas, in the light and in the sheath weight. So one spline per surface and
plasma, in plane and in thick geometry, and one for the photoelectrons replace
all exponentials: a right-hand side is one gather and a few sums. The direct path
is `surface_currents`; tests and every run's charge audit compare the two.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from charging.currents.barrier import ROUNDING_V
from charging.currents.collection import SheathWeight, sheath_weight
from charging.currents.splines import (
    graded_knots,
    polynomial,
    polynomial_and_slope,
    segmented_knots,
    segmented_spline,
)
from charging.currents.surface import (
    Populations,
    Setting,
    SurfaceModel,
    electron_sheath,
    net_in_limits,
)
from charging.currents.tables import knots

Array = NDArray[np.float64]
Index = NDArray[np.intp]

SCALE_V, SPACING = 0.05, 0.0065
NOT_GRADED = 10.0  # spacing of knots below a break that needs no grading
SPECTRUM_DEGREE = 5  # the kinks of spectra ask for more
DEGREE = 3  # a quintic on fewer knots costs a march a fifth more


@dataclass(frozen=True, slots=True)
class NetCurrents:
    """Splines of U surface models with the same surfaces, plasmas and body.

    Attributes
    ----------
    knots_V : ndarray [K]
        From 0 upwards; mirrored for negative potentials.
    coefficients : ndarray [U, S, 2(K-1), degree+1, 2P+1]
        Negative side first; columns: plasmas in plane geometry, plasmas in thick
        geometry, photoelectrons at full light.
    electrons : Populations
    radius_m, collection
        As in `SurfaceModel`.
    angle_growth : ndarray [S]
        As in `SurfaceModel`.
    """

    knots_V: Array
    coefficients: Array
    electrons: Populations
    radius_m: float
    collection: str
    angle_growth: Array

    def current(self, which: Index, potential_V: Array, setting: Setting) -> Array:
        """Net current density [A m-2] alone, [m, S]; arguments as in `current_and_slope`."""
        c, x, _ = self._cells(which, potential_V)
        return self._mixed(polynomial(c, x), self._sheath(potential_V, setting).weight, setting)

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
        value, slope = polynomial_and_slope(c, x)
        slope = np.where(positive[..., None], slope, -slope)
        share = setting.strength[:, None, :]
        plasmas = share.shape[-1]
        gain = ((value[..., plasmas:-1] - value[..., :plasmas]) * share).sum(axis=-1)
        return (
            self._mixed(value, sheath.weight, setting),
            self._mixed(slope, sheath.weight, setting) + sheath.slope * gain,
        )

    def _cells(self, which: Index, potential_V: Array) -> tuple[Array, Array, NDArray[np.bool_]]:
        """Coefficients [m, S, degree+1, C], distance from the left knot [m, S, 1], side."""
        cells = len(self.knots_V) - 1
        size = np.abs(potential_V)
        k = np.clip(np.searchsorted(self.knots_V, size, side="right") - 1, 0, cells - 1)
        x = size - self.knots_V[k]
        positive = potential_V >= 0.0
        column = np.arange(potential_V.shape[1])
        # one flat row number: a single gather is a third faster than three indices
        rows = self.coefficients.reshape(-1, *self.coefficients.shape[3:])
        per_surface = self.coefficients.shape[2]
        first = (which[:, None] * potential_V.shape[1] + column) * per_surface
        c = rows[first + k + cells * positive]
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
        light = np.minimum(self.angle_growth * setting.light, setting.illumination)
        return plane + w * (thick - plane) + light * columns[..., -1]


def net_currents(models: Sequence[SurfaceModel]) -> NetCurrents:
    """Tabulate surface models that differ in emission only (a law, a material value)."""
    first = models[0]
    spectra = [s for model in models for s in (*model.electron_spectra, *model.ion_spectra)]
    degree = SPECTRUM_DEGREE if spectra else DEGREE
    breaks = [ROUNDING_V, *first.escape_breaks_V]
    grid = segmented_knots(knots(SCALE_V, SPACING), breaks)
    kinks = {b: h for s in spectra for b, h in s.breaks_V.items()}
    if kinks:
        smooth = dict.fromkeys(breaks, NOT_GRADED)
        graded = {**smooth, **kinks, float(grid[-1]): NOT_GRADED}
        grid = graded_knots(SCALE_V, SPACING, graded)
        breaks = sorted(graded)[:-1]
    plasmas = int(first.electrons.plasma.max()) + 1
    surfaces = len(first.photo_saturation_A_m2)
    both = []
    for model in models:
        sides = []
        for sign in (-1.0, 1.0):
            phi = np.repeat(sign * grid[:, None], surfaces, axis=1)
            plane, thick = [], []
            photo = np.zeros_like(phi)
            for p in range(plasmas):
                strength = np.broadcast_to(np.eye(plasmas)[p], (len(grid), plasmas))
                in_plane, in_thick, photo = net_in_limits(model, phi, strength)
                plane.append(in_plane)
                thick.append(in_thick)
            values = np.stack([*plane, *thick, photo], axis=-1)  # [K, S, 2P+1]
            pieces = segmented_spline(grid, values, breaks, degree)
            sides.append(np.moveaxis(pieces, 2, 0))
        both.append(np.concatenate(sides, axis=1))
    return NetCurrents(
        knots_V=grid,
        coefficients=np.ascontiguousarray(np.stack(both)),
        electrons=first.electrons,
        radius_m=first.radius_m,
        collection=first.collection,
        angle_growth=first.angle_growth,
    )
