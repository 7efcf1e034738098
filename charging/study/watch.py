"""What a study keeps of a block: extremes and last states, gathered while it is marched."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.constants import epsilon_0

from charging.network.charge_balance import ChargeBalance
from charging.network.march import StepLog
from charging.network.nodes import Network
from charging.network.peaks import Peaks

Array = NDArray[np.float64]
Index = NDArray[np.intp]


class Watch:
    """A `Record` of a march for studies: extremes of differentials, pairs and films.

    Parameters
    ----------
    balance : ChargeBalance
        Of the block.
    start : ndarray [M, n]
        States at the start.
    pairs : ndarray of int [P, 2]
        Nodes of declared neighbours.
    history_s : ndarray [T], optional
        Times of a kept history; it keeps every step in memory until the block is done.
    """

    def __init__(
        self, balance: ChargeBalance, start: Array, pairs: Index, history_s: Array | None = None
    ) -> None:
        net = self._net = balance.net
        ancestry = net.ancestry
        self._columns = _Columns(ancestry.shape[1])
        self._surface = self._columns.of(net.surface_ancestry - ancestry[0])
        self._pair = self._columns.of(ancestry[pairs[:, 0]] - ancestry[pairs[:, 1]])
        self._film = self._columns.of(np.eye(len(ancestry))[net.film_node])
        self._structure = self._columns.of(ancestry[:1])
        self._peaks = Peaks(self._columns.values, start)
        self._history_s = history_s
        self._log = None if history_s is None else StepLog()

    def steps(
        self, member: Index, start_s: Array, step_s: Array, y0: Array, y1: Array, c2: Array,
        c3: Array,
    ) -> None:  # fmt: skip
        """Look through one step of each of some members."""
        self._peaks.steps(member, start_s, step_s, y0, y1, c2, c3)
        if self._log is not None:
            self._log.steps(member, start_s, step_s, y0, y1, c2, c3)

    def results(self) -> dict[str, Array]:
        """Worst values of the members; first axis the members."""
        peaks, net = self._peaks, self._net
        low, high, low_s, high_s = (
            _padded(part) for part in (peaks.lowest, peaks.highest, peaks.lowest_s, peaks.highest_s)
        )
        end = _padded(self._columns.values(peaks.end))

        def both(where: tuple[Index, Array]) -> tuple[Array, Array]:
            column, sign = where
            up, down = sign * high[:, column], sign * low[:, column]
            return np.minimum(up, down), np.maximum(up, down)

        column, sign = self._surface
        turned = sign < 0.0
        lowest, highest = both(self._surface)
        pair_lowest, pair_highest = both(self._pair)
        structure_lowest, structure_highest = both(self._structure)
        across = np.maximum(*(np.abs(part) for part in both(self._film)))
        found = {
            "lowest_V": lowest,
            "lowest_time_s": np.where(turned, high_s[:, column], low_s[:, column]),
            "highest_V": highest,
            "highest_time_s": np.where(turned, low_s[:, column], high_s[:, column]),
            "final_V": sign * end[:, column],
            "pair_lowest_V": pair_lowest,
            "pair_highest_V": pair_highest,
            "structure_lowest_V": structure_lowest[:, 0],
            "structure_highest_V": structure_highest[:, 0],
            "structure_final_V": (self._structure[1] * end[:, self._structure[0]])[:, 0],
            "largest_field_V_m": _on_surfaces(net, across / _each(net, "film_thickness_m")),
            "largest_energy_J": _on_surfaces(net, _energy(net, across)),
        }
        if self._log is not None and self._history_s is not None:
            found["history_V"] = self._histories(self._log, self._history_s)
        return found

    def _histories(self, log: StepLog, times_s: Array) -> Array:
        column, sign = self._surface
        along = [
            (sign * _padded(self._columns.values(path(times_s)))[:, column]).T
            for path in log.trajectories(self._peaks.count)
        ]
        return np.stack(along)


class _Columns:
    """Few columns that stand for many rows of potentials: state variables, then differences.

    Most differentials are state variables; rows that are equal, or opposite, share a column.
    """

    def __init__(self, states: int) -> None:
        self._states = states
        self._known = {tuple(row): i for i, row in enumerate(np.eye(states).tolist())}
        self._further: list[list[float]] = []

    def of(self, rows: Array) -> tuple[Index, Array]:
        """Columns and signs of rows [Q, n]; a row of zeros has the column -1."""
        column, sign = np.full(len(rows), -1), np.ones(len(rows))
        for i, row in enumerate(rows):
            key, opposite = tuple((row + 0.0).tolist()), tuple((0.0 - row).tolist())
            if not any(key):
                continue
            if key not in self._known and opposite not in self._known:
                self._known[key] = self._states + len(self._further)
                self._further.append(list(key))
            if key not in self._known:
                sign[i], key = -1.0, opposite
            column[i] = self._known[key]
        return column.astype(np.intp), sign

    def values(self, y: Array) -> Array:
        """Values of the columns [..., C] of states [..., n]."""
        if not self._further:
            return y
        further = (np.array(self._further) * y[..., None, :]).sum(axis=-1)
        return np.concatenate([y, further], axis=-1)


def _padded(values: Array) -> Array:
    """With a last column of zeros: what is bonded to structure has no differential."""
    return np.concatenate([values, np.zeros((len(values), 1))], axis=-1)


def _each(net: Network, name: str) -> Array:
    """A property of the films, [F] or [M, F]."""
    return np.asarray(getattr(net, name))


def _energy(net: Network, across: Array) -> Array:
    """Energy between the faces of films [J, M, F]."""
    area = _each(net, "area_m2")[..., net.film_surface]
    thickness = _each(net, "film_thickness_m")
    capacitance = epsilon_0 * _each(net, "film_permittivity") * area / thickness
    return np.asarray(0.5 * capacitance * across**2)


def _on_surfaces(net: Network, films: Array) -> Array:
    """Values of films [M, F] at their surfaces [M, S]; 0 without a film."""
    found = np.zeros((len(films), len(net.surface_node)))
    found[:, net.film_surface] = films
    return found
