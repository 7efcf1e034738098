"""Net current of each surface as a function of its potential alone, for the march.

At a given potential the current of a surface is linear in the shares of the
plasmas, in the light, in the sheath weight and in the share of the photo- and
secondary electrons that overcome the barrier in front of it. So splines per
surface and plasma, in plane and in thick geometry, and those of the escape
replace all exponentials: a right-hand side is two gathers and a few sums. The
direct path is `surface_currents`; tests and every run's charge audit compare the two.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from charging.currents.barrier import escape_height
from charging.currents.cells import Grids, grids
from charging.currents.collection import SheathWeight
from charging.currents.escape import EscapeShares, escape_of
from charging.currents.sheath import Sheath, sheath_of
from charging.currents.splines import refined_cells, segmented_spline
from charging.currents.streams import Arrived, StreamModel, gathered
from charging.currents.surface import (
    Kept,
    Setting,
    SurfaceModel,
    limits_and_gross,
    limits_of_each,
)
from charging.currents.tables import knots

Array = NDArray[np.float64]
Index = NDArray[np.intp]

SCALE_V, SPACING = 0.05, 0.0065
SPECTRUM_DEGREE = 5  # the kinks of spectra ask for more
FIRST_EVERY = 32  # so many knots apart begin the cells that are refined near kinks
ACCURACY, FLOOR = 2e-9, 1e-9  # of what crosses a surface; of what crosses it at 0 V
DEGREE = 3  # a quintic on fewer knots costs a march a fifth more


class Slopes(NamedTuple):
    """Net current density [A m-2] and its derivatives by potential and height, each [m, S]."""

    net: Array
    by_potential: Array
    by_height: Array


@dataclass(frozen=True, slots=True)
class NetCurrents:
    """Splines of U surface models with as many surfaces and plasmas, for M members.

    Attributes
    ----------
    table : ndarray of int [M]
        Which of the U tables a member reads: members that differ in their network alone share.
    grids : Grids
        Knots [V] from 0 upwards; mirrored for negative potentials.
    coefficients : ndarray [U, S, 2(K-1), degree+1, 4P]
        Negative side first; four columns per plasma: collected minus backscattered current in
        plane and in thick geometry, emission before escape in plane and in thick geometry.
    escape : EscapeShares
        Shares of photo- and secondary electrons that leave.
    photo_saturation_A_m2 : ndarray [U, S]
    sheath : Sheath
    angle_growth : ndarray [U, S]
        As in `SurfaceModel`.
    streams : StreamModel or None
        Ions that stream past, with yields [U, S].
    """

    table: Index
    grids: Grids
    coefficients: Array
    escape: EscapeShares
    photo_saturation_A_m2: Array
    sheath: Sheath
    angle_growth: Array
    streams: StreamModel | None = None

    def current(
        self, which: Index, potential_V: Array, setting: Setting, height_V: Array | None = None
    ) -> Array:
        """Net current density [A m-2] alone, [m, S]; arguments as in `slopes`.

        Without `height_V` what leaves climbs to the plasma alone.
        """
        height = escape_height(potential_V)[0] if height_V is None else height_V
        c, x, _ = self._cells(which, potential_V)
        columns = _weighted(_powers(x[..., 0], c.shape[2]), c, setting.strength)
        kept = setting.kept
        if kept is not None and (self.streams is None or setting.stream is None):
            weight = self.sheath.share(
                self.table[which], potential_V, kept.sheath_m2, kept.child_m2
            )
            directed = None
        else:
            sheath = self._sheath(which, potential_V, setting)
            weight, directed = sheath.weight, self._directed(which, potential_V, setting, sheath)
        bare = columns[..., 0] + weight * (columns[..., 1] - columns[..., 0])
        emitted = columns[..., 2] + weight * (columns[..., 3] - columns[..., 2])
        if directed is not None:
            bare = bare + directed.collected_A_m2
            emitted = emitted + directed.released_A_m2
        share = self.escape.shares(self.table[which], height)
        photo = self._photocurrent(which, setting)
        return bare + emitted * share[..., 1] + photo * share[..., 0]

    def slopes(self, which: Index, potential_V: Array, setting: Setting, height_V: Array) -> Slopes:
        """Net current density and its derivatives by potential and by barrier height.

        Parameters
        ----------
        which : ndarray of int [m]
            Members.
        potential_V : ndarray [m, S]
        setting : Setting
            Strength [m, P], light [m, S].
        height_V : ndarray [m, S]
            What photo- and secondary electrons must climb to leave, >= 0.
        """
        c, x, positive = self._cells(which, potential_V)
        sheath = self._sheath(which, potential_V, setting)
        powers = _powers(x[..., 0], c.shape[2])
        columns = _weighted(powers, c, setting.strength)
        rises = np.where(positive, 1.0, -1.0)[..., None] * _derived(powers)
        d_columns = _weighted(rises, c, setting.strength)
        gain, d_gain = (
            columns[..., 1::2] - columns[..., 0::2],
            d_columns[..., 1::2] - d_columns[..., 0::2],
        )
        bare, emitted = (columns[..., 2 * k] + sheath.weight * gain[..., k] for k in (0, 1))
        d_bare, d_emitted = (
            d_columns[..., 2 * k] + sheath.weight * d_gain[..., k] + sheath.slope * gain[..., k]
            for k in (0, 1)
        )
        directed = self._directed(which, potential_V, setting, sheath)
        if directed is not None:
            bare, d_bare = bare + directed.collected_A_m2, d_bare + directed.slope
            emitted = emitted + directed.released_A_m2
            d_emitted = d_emitted + directed.released_slope
        share, d_share = self.escape.shares_and_slopes(self.table[which], height_V)
        photo = self._photocurrent(which, setting)
        return Slopes(
            bare + emitted * share[..., 1] + photo * share[..., 0],
            d_bare + d_emitted * share[..., 1],
            emitted * d_share[..., 1] + photo * d_share[..., 0],
        )

    def current_and_slope(
        self, which: Index, potential_V: Array, setting: Setting
    ) -> tuple[Array, Array]:
        """Net current density [A m-2] and derivative by potential, each [m, S], no barrier."""
        height, d_height = escape_height(potential_V)
        net, by_potential, by_height = self.slopes(which, potential_V, setting, height)
        return net, by_potential + by_height * d_height

    def _directed(
        self, which: Index, potential_V: Array, setting: Setting, sheath: SheathWeight
    ) -> Arrived | None:
        """What streaming ions bring; None where there are none."""
        if self.streams is None or setting.stream is None:
            return None
        place = None if setting.kept is None else setting.kept.focus
        own = self.streams.of(self.table[which])
        return own.arrived(potential_V, setting.stream, sheath, place)

    def _photocurrent(self, which: Index, setting: Setting) -> Array:
        """Photocurrent density [A m-2, m, S] of which nothing is held back."""
        if setting.kept is not None:
            return setting.kept.photo_A_m2
        table = self.table[which]
        light = np.minimum(self.angle_growth[table] * setting.light, setting.illumination)
        return np.asarray(light * self.photo_saturation_A_m2[table])

    def _cells(self, which: Index, potential_V: Array) -> tuple[Array, Array, NDArray[np.bool_]]:
        """Coefficients [m, S, degree+1, C], distance from the left knot [m, S, 1], side."""
        table = self.table[which]
        k, x = self.grids.cell(table, np.abs(potential_V))
        positive = potential_V >= 0.0
        column = np.arange(potential_V.shape[1])
        # one flat row number: a single gather is a third faster than three indices
        rows = self.coefficients.reshape(-1, *self.coefficients.shape[3:])
        per_surface = self.coefficients.shape[2]
        first = (table[:, None] * potential_V.shape[1] + column) * per_surface
        c = rows[first + k + (per_surface // 2) * positive]
        return c, x[..., None], positive

    def _sheath(self, which: Index, potential_V: Array, setting: Setting) -> SheathWeight:
        table, kept = self.table[which], setting.kept
        if kept is None:
            squares = self.sheath.squares(table, setting.strength)
        else:
            squares = kept.sheath_m2, kept.child_m2
        return self.sheath.weight(table, potential_V, *squares)

    def prepared(self, which: Index, setting: Setting) -> Setting:
        """Add to the setting of members [m] what follows from it alone."""
        debye, child = self.sheath.squares(self.table[which], setting.strength)
        place = None
        if self.streams is not None and setting.stream is not None:
            place = self.streams.place(setting.stream)
        photo = self._photocurrent(which, setting)
        return setting._replace(kept=Kept(debye, child, photo, place))


def _powers(x: Array, count: int) -> Array:
    """Powers of x [m, S], highest first, [m, S, count]."""
    found = np.ones((*x.shape, count))
    for n in range(count - 2, -1, -1):
        np.multiply(found[..., n + 1], x, out=found[..., n])
    return found


def _derived(powers: Array) -> Array:
    """Derivatives of `_powers` by x."""
    found = np.zeros_like(powers)
    count = powers.shape[-1]
    found[..., :-1] = powers[..., 1:] * np.arange(count - 1, 0, -1.0)
    return found


def _weighted(powers: Array, c: Array, strength: Array) -> Array:
    """Four columns [m, S, 4]: coefficients [m, S, degree+1, 4P] by powers and plasma shares."""
    m, surfaces, count = powers.shape
    plasmas = strength.shape[-1]
    weights = np.empty((m, surfaces, count, plasmas))
    for p in range(plasmas):
        np.multiply(powers, strength[:, p, None, None], out=weights[..., p])
    terms = count * plasmas
    # a product of small arrays per surface: nothing is summed over members
    weights, c = weights.reshape(m, surfaces, 1, terms), c.reshape(m, surfaces, terms, 4)
    found: Array = np.matmul(weights, c)[..., 0, :]
    return found


def net_currents(models: Sequence[SurfaceModel]) -> NetCurrents:
    """Tabulate the surface models of M members; a model that several members share, once."""
    unique = {id(model): model for model in models}
    place = {key: u for u, key in enumerate(unique)}
    tabulated = [_tabulated(model) for model in unique.values()]
    cells = max(table.shape[1] for _, table in tabulated) // 2
    powers = max(table.shape[2] for _, table in tabulated)
    return NetCurrents(
        table=np.array([place[id(model)] for model in models], dtype=np.intp),
        grids=grids([grid for grid, _ in tabulated]),
        coefficients=np.stack([_filled(table, cells, powers) for _, table in tabulated]),
        escape=escape_of([model.escape_table for model in unique.values()]),
        photo_saturation_A_m2=np.stack([m.photo_saturation_A_m2 for m in unique.values()]),
        sheath=sheath_of(list(unique.values())),
        angle_growth=np.stack([model.angle_growth for model in unique.values()]),
        streams=gathered([model.streams for model in unique.values()]),
    )


def _filled(table: Array, cells: int, powers: int) -> Array:
    """Table [S, 2K, degree+1, C] with as many cells on each side and powers as the largest.

    Powers that a table lacks are zero, which changes none of its values.
    """
    own, degrees = table.shape[1] // 2, table.shape[2]
    if (own, degrees) == (cells, powers):
        return np.ascontiguousarray(table)
    filled = np.zeros((table.shape[0], 2, cells, powers, table.shape[3]))
    filled[:, :, :own, powers - degrees :] = table.reshape(
        table.shape[0], 2, own, degrees, table.shape[3]
    )
    return filled.reshape(table.shape[0], 2 * cells, powers, table.shape[3])


def _tabulated(model: SurfaceModel) -> tuple[Array, Array]:
    """Knots [K] of a model, and coefficients [S, 2(K-1), degree+1, 4P]."""
    spectra = (*model.electron_spectra, *model.ion_spectra)
    grid = knots(SCALE_V, SPACING)
    if spectra:
        kinks = {b for s in spectra for b in s.breaks_V}
        first = {*grid[::FIRST_EVERY].tolist(), float(grid[-1])}
        edges = np.array(sorted(first | {k for k in kinks if k < grid[-1]}))
        grid, pieces = refined_cells(lambda size: _both_sides(model, size), edges, SPECTRUM_DEGREE)
        # [K-1, degree+1, 2 S C] -> [S, 2 (K-1), degree+1, C]
        cells, powers = pieces.shape[:2]
        pieces = pieces.reshape(cells, powers, 2, len(model.photo_saturation_A_m2), -1)
        sides = pieces.transpose(3, 2, 0, 1, 4)
        return grid, sides.reshape(len(sides), 2 * cells, powers, -1)
    both = []
    for sign in (-1.0, 1.0):
        values = _columns(model, sign * grid)
        both.append(np.moveaxis(segmented_spline(grid, values, (), DEGREE), 2, 0))
    return grid, np.concatenate(both, axis=1)


def _columns(model: SurfaceModel, potential_V: Array) -> Array:
    """Columns [N, S, 4P] of the table at potentials [N] common to all surfaces."""
    phi = np.repeat(potential_V[:, None], len(model.photo_saturation_A_m2), axis=1)
    found = limits_of_each(model, phi)
    return found.reshape(*found.shape[:2], -1)


def _both_sides(model: SurfaceModel, size_V: Array) -> tuple[Array, Array]:
    """Columns at minus and plus `size_V` [N], flat [N, 2 S C], and the error allowed of each.

    Allowed is `ACCURACY` of all that crosses the surface, and of `FLOOR` of what crosses at 0 V.
    """
    found, allowed = [], []
    surfaces = len(model.photo_saturation_A_m2)
    floor = FLOOR * limits_and_gross(model, np.zeros((1, surfaces)))[1]
    for sign in (-1.0, 1.0):
        phi = np.repeat(sign * size_V[:, None], surfaces, axis=1)
        values, gross = limits_and_gross(model, phi)
        found.append(values.reshape(len(size_V), surfaces, -1))
        allowed.append(ACCURACY * (gross + floor).reshape(len(size_V), surfaces, -1))
    flat = (len(size_V), -1)
    return np.stack(found, 1).reshape(flat), np.stack(allowed, 1).reshape(flat)
