r"""A quick look: potentials that balance all currents at each moment, as if nothing stored charge.

A run follows charging; a quick look solves f(t, y) = 0 at a few moments, each from the
answer before it, so that it keeps to its branch where a balance has several. What it leaves
out is estimated: with capacitances M and the slope J = ∂f/∂y, the true potentials lag behind
the quasi-steady ones q by δ,

.. math:: M\,\dot\delta = J\,\delta - M\,\dot q,

linear in δ, one step of the implicit Euler method from moment to moment. Far from q, where
currents bend, δ is an order of magnitude and no more. A quick look therefore gives no verdict.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np
from numpy.typing import NDArray

from charging.case import LoadedCase, Mode
from charging.members import Member, block_balance, member_of
from charging.network.charge_balance import ChargeBalance
from charging.network.march import StuckError, Tolerance
from charging.network.nodes import Network
from charging.network.rosenbrock import RODAS3
from charging.orbit_run import laws_of, no_solution, settled, spectrum_of, surroundings_of
from charging.surroundings import Surroundings

Array = NDArray[np.float64]

LONGEST_S = 1200.0
"""Moments lie no farther apart than this, or than 1/`FEWEST` of the run where that is more."""

FEWEST = 48
BEFORE_S = 1e-3  # before surroundings switch
ROUGH = Tolerance(absolute=0.1, relative=1e-4, method=RODAS3)
"""Of the march with frozen surroundings that leads to a balance where Newton's method does not.

Coarser than the volts behind barriers of kilovolts it wanders about the balance."""

FARTHEST_V, FARTHEST_SHARE = 5.0, 0.3
"""Newton's method may move a potential by this and this share; else a march decides the branch."""

STRIDE_V, STRIDE_SHARE = 2.0, 0.2  # of one step of a relaxation
RELAXING, RESTING_S = 200, 1e7  # its steps at most; the last of them is longer than this
ITERATIONS = 8
CLOSE_V, CLOSE_SHARE = 1e-3, 1e-6
"""A balance is found when a last step of Newton's method is smaller."""


@dataclass(frozen=True, slots=True)
class QuickMode:
    """Quasi-steady potentials of one mode, for M members at T moments.

    Attributes
    ----------
    name : str
    members : tuple of Member
        One per emission law.
    net : Network
    times_s : ndarray [T]
        After the start.
    state_V : ndarray [M, T, n]
        State variables: structure, then each node against what it is attached to.
    lag_V : ndarray [M, T, n]
        Estimate of what charging adds to them: true minus quasi-steady.
    charging_s : ndarray [M, T, n]
        Time in which a small displacement of one state variable dies out; infinite where it
        does not.
    """

    name: str
    members: tuple[Member, ...]
    net: Network
    times_s: Array
    state_V: Array
    lag_V: Array
    charging_s: Array

    @property
    def surface_V(self) -> Array:
        """Quasi-steady potentials of the surfaces [M, T, S]."""
        return self.net.potentials(self.state_V)[..., self.net.surface_node]

    @property
    def structure_V(self) -> Array:
        """Quasi-steady potential of the structure [M, T]."""
        return self.state_V[..., 0]

    @property
    def surface_lag_V(self) -> Array:
        """Estimated lag of the surfaces' potentials against structure [M, T, S].

        Of surfaces bonded to structure: of its own potential.
        """
        lag = self.net.potentials(self.lag_V)
        against = lag[..., self.net.surface_node] - lag[..., :1]
        bonded = self.net.surface_node == 0
        return np.where(bonded, lag[..., :1], against)


def quick_look(loaded: LoadedCase) -> tuple[QuickMode, ...]:
    """Quasi-steady potentials of a case in every mode, the base first.

    Raises
    ------
    NoSolutionError
        No balance was found.
    """
    return tuple(quick_mode(loaded, mode) for mode in (None, *loaded.case.alternatives))


def quick_mode(loaded: LoadedCase, mode: Mode | None = None) -> QuickMode:
    """Quasi-steady potentials of one mode of a case for each of its emission laws."""
    case, around = loaded.case, surroundings_of(loaded, mode)
    members = [member_of(loaded, law) for law in laws_of(loaded)]
    spectrum = spectrum_of(case, mode)
    balance = block_balance(members, [spectrum] * len(members), mode, around)
    name = "base" if mode is None else mode.name
    times = _moments(around, case.duration_s)
    zero = np.zeros((len(members), len(balance.net.node_names)))
    try:
        states, jacobian = _balances(balance, times, zero)
    except StuckError as error:
        raise no_solution(loaded, name, members[error.member], balance, error) from error
    first = zero if case.time.start == "uncharged" else states[:, 0]
    mass = balance.mass if balance.mass.ndim == 3 else balance.mass[None]
    own = -np.diagonal(jacobian, axis1=-2, axis2=-1)
    bears = np.diagonal(mass, axis1=-2, axis2=-1)[:, None]
    charging = np.divide(bears, own, out=np.full_like(own, np.inf), where=own > 0.0)
    lag = _lags(times, states, jacobian, mass, first)
    return QuickMode(name, tuple(members), balance.net, times, states, lag, charging)


def _moments(around: Surroundings, end_s: float) -> Array:
    """Start, end, kinks of the surroundings, and even steps of at least two between them."""
    marks = sorted({0.0, end_s, *(b for b in around.breaks_s if 0.0 < b < end_s)})
    longest = max(LONGEST_S, end_s / FEWEST)
    inner = [
        np.linspace(a, b, max(2, int(np.ceil((b - a) / longest))), endpoint=False)
        for a, b in pairwise(marks)
    ]
    before = np.array([edge - BEFORE_S for edge in around.edges_s if BEFORE_S < edge < end_s])
    return np.unique(np.concatenate([*inner, before, [end_s]]))


def _balances(balance: ChargeBalance, times: Array, start: Array) -> tuple[Array, Array]:
    """States [M, T, n] that balance at each moment, and slopes J [A/V, M, T, n, n] there."""
    members, nodes = start.shape
    states = np.empty((members, len(times), nodes))
    slopes = np.empty((members, len(times), nodes, nodes))
    y, everyone = start, np.arange(members)
    for k, time in enumerate(times.tolist()):
        found, jacobian, good = _newton(balance, time, y)
        if k == 0 or not good.all():
            lost = everyone if k == 0 else np.flatnonzero(~good)
            reached, slope, settles = _newton(balance, time, _relaxed(balance, time, y))
            if not settles[lost].all():
                reached, slope, _ = _newton(balance, time, settled(balance, y, ROUGH, time))
            found[lost], jacobian[lost] = reached[lost], slope[lost]
        y = found
        states[:, k], slopes[:, k] = found, jacobian
    return states, slopes


def _relaxed(balance: ChargeBalance, time_s: float, start: Array) -> Array:
    """Roughly where potentials go from `start` [M, n] when a moment lasts.

    Implicit Euler steps that grow as the potentials slow down (pseudo-transient
    continuation, Kelley & Keyes 1998, SIAM J. Numer. Anal. 35, 508).
    """
    which, when = np.arange(len(start)), np.full(len(start), time_s)
    mass = balance.mass if balance.mass.ndim == 3 else balance.mass[None]
    y, step_s = start.copy(), np.full(len(start), 1e-6)
    rate, jacobian = balance.rhs_and_jacobian(which, when, y)
    for _ in range(RELAXING):
        change = np.linalg.solve(mass / step_s[:, None, None] - jacobian, rate[..., None])[..., 0]
        size = np.abs(balance.controlled(change))
        reach = STRIDE_V + STRIDE_SHARE * np.abs(balance.controlled(y))
        tried = y + change
        fits = (size <= reach).all(axis=-1) & balance.admissible(which, tried)
        tried[~fits] = y[~fits]
        late, jacobian = balance.rhs_and_jacobian(which, when, tried)
        # slower by how much, in volts per second
        slows = [
            np.abs(np.linalg.solve(mass, r[..., None])[..., 0]).max(axis=-1) for r in (rate, late)
        ]
        ratio = slows[0] / np.maximum(slows[1], 1e-300)
        step_s *= np.where(fits, np.clip(2.0 * ratio, 0.5, 10.0), 0.2)
        y, rate = tried, late
        if (fits & (size <= 0.1 * reach).all(axis=-1) & (step_s > RESTING_S)).all():
            break
    return y


def _newton(
    balance: ChargeBalance, time_s: float, start: Array
) -> tuple[Array, Array, NDArray[np.bool_]]:
    """Balance [M, n] by Newton's method, slopes [M, n, n], and whether each is to be trusted.

    A member that is not keeps its start.
    """
    which, when = np.arange(len(start)), np.full(len(start), time_s)
    y, good = start.copy(), np.ones(len(start), dtype=np.bool_)
    done = np.zeros(len(start), dtype=np.bool_)
    reach = FARTHEST_V + FARTHEST_SHARE * np.abs(balance.controlled(start))
    for _ in range(ITERATIONS):
        rate, jacobian = balance.rhs_and_jacobian(which, when, y)
        try:
            step = np.asarray(-np.linalg.solve(jacobian, rate[..., None])[..., 0], np.float64)
        except np.linalg.LinAlgError:
            return start, jacobian, np.zeros(len(start), dtype=np.bool_)
        step[done | ~good] = 0.0
        y = y + step
        moved = np.abs(balance.controlled(y - start))
        good &= (moved <= reach).all(axis=-1)
        good &= balance.admissible(which, y)
        y[~good] = start[~good]
        allowed = CLOSE_V + CLOSE_SHARE * np.abs(balance.controlled(y))
        done |= (np.abs(balance.controlled(step)) <= allowed).all(axis=-1)
        if (done | ~good).all():
            break
    good &= done
    y[~good] = start[~good]
    jacobian = balance.rhs_and_jacobian(which, when, y)[1]
    mass = balance.mass if balance.mass.ndim == 3 else balance.mass[None]
    stable = np.linalg.eigvals(np.linalg.solve(mass, jacobian)).real.max(axis=-1) <= 0.0
    return y, jacobian, good & stable


def _lags(times: Array, states: Array, jacobian: Array, mass: Array, first: Array) -> Array:
    """Estimated lag [M, T, n] behind `states`, from the state `first` [M, n] at the start."""
    lag = np.empty_like(states)
    lag[:, 0] = first - states[:, 0]
    for k in range(1, len(times)):
        rate = mass / (times[k] - times[k - 1])
        behind = lag[:, k - 1] - (states[:, k] - states[:, k - 1])
        pulled = np.matmul(rate, behind[..., None])
        lag[:, k] = np.linalg.solve(rate - jacobian[:, k], pulled)[..., 0]
    return lag


def quick_document(loaded: LoadedCase, looks: Sequence[QuickMode]) -> dict[str, Any]:
    """A quick look as plain data: the worse of all laws for every surface, in every mode."""
    modes = [
        {
            "mode": look.name,
            "moments": len(look.times_s),
            "structure": _row(look, look.structure_V, look.lag_V[..., 0], 0),
            "surfaces": [
                {"surface": surface.name, "material": surface.material, **_surface_row(look, i)}
                for i, surface in enumerate(loaded.case.surface)
            ],
        }
        for look in looks
    ]
    largest = max(_across(look) for look in looks)
    lag = max(float(np.abs(look.surface_lag_V).max()) for look in looks)
    return {
        "title": loaded.case.title,
        "kind": "quasi-steady quick look, no verdict",
        "laws": [member.law for member in looks[0].members],
        "largest_lag_share": lag / max(largest, 1.0),
        "modes": modes,
    }


def _across(look: QuickMode) -> float:
    """Largest difference to structure of any surface [V]."""
    return float(np.abs(look.surface_V - look.structure_V[..., None]).max())


def _surface_row(look: QuickMode, surface: int) -> dict[str, float | None]:
    volts = look.surface_V[..., surface]
    against = volts - look.structure_V
    node = int(look.net.surface_node[surface])
    row = _row(look, volts, look.surface_lag_V[..., surface], node)
    for key, at in (("below", int(np.argmin(against))), ("above", int(np.argmax(against)))):
        row[f"{key}_structure_V"] = float(against.flat[at])
        row[f"{key}_structure_after_s"] = float(look.times_s[at % len(look.times_s)])
    return row


def _row(look: QuickMode, volts: Array, lag: Array, node: int) -> dict[str, float | None]:
    """Extremes of potentials [M, T], largest lag [M, T], and the charging time of a node then."""
    at = int(np.argmax(np.abs(lag)))
    charging = float(look.charging_s[..., node].flat[at])
    return {
        "lowest_V": float(volts.min()),
        "highest_V": float(volts.max()),
        "largest_lag_V": float(lag.flat[at]),
        "largest_lag_after_s": float(look.times_s[at % len(look.times_s)]),
        "charging_time_s": charging if np.isfinite(charging) else None,
    }
