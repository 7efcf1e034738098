"""Linearly implicit time march of a stiff charge balance, member by member.

The integrators are Rosenbrock methods with dense output (see `rosenbrock`). They
solve ``M dy/dt = f(t, y)`` with a constant mass matrix for a block of members at
once; every member has its own time and step size, so that a member's numbers do
not depend on its company.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from charging.errors import NoSolutionError
from charging.network.rosenbrock import RODAS, Method

Array = NDArray[np.float64]
Index = NDArray[np.intp]

SAFETY, LARGEST_FACTOR, SMALLEST_FACTOR = 0.9, 5.0, 0.2
TIME_DIFFERENCE = 1e-4  # df/dt is a forward difference over this share of the step


class StuckError(NoSolutionError):
    """A member found no step.

    Attributes
    ----------
    member : int
    time_s, step_s : float
    state : ndarray [n]
    attempts : int
    error : float
        Of the last attempt, over what is allowed; infinite where a stage left the domain.
    """

    def __init__(
        self, member: int, time_s: float, state: Array, step_s: float, attempts: int, error: float
    ) -> None:
        super().__init__(
            f"no step at {time_s:.6f} s after the start: step {step_s:.1e} s "
            f"after {attempts} attempts"
        )
        self.member, self.time_s, self.state = member, time_s, state
        self.step_s, self.attempts, self.error = step_s, attempts, error


class System(Protocol):
    """A stiff initial-value problem for a block of members."""

    @property
    def mass(self) -> Array:
        """Mass matrix [n, n], or one per member [M, n, n]."""
        ...

    def moments(self, member: Index, time_s: Array) -> Sequence[Any]:
        """Return what `rates_at` must know of the times [K, m], K items of any kind."""
        ...

    def rates_at(self, member: Index, moment: Any, y: Array) -> Array:
        """Return f [m, n] for members `member` [m] at their moments and `y` [m, n]."""
        ...

    def start(self, member: Index, moment: Any, later: Any, y: Array) -> tuple[Array, Array, Array]:
        """Return f [m, n], its derivative by y [m, n, n], and f of the same y at `later`."""
        ...

    def controlled(self, y: Array) -> Array:
        """Return the quantities [..., q] (linear in y) whose error is kept small."""
        ...

    def admissible(self, member: Index, y: Array) -> NDArray[np.bool_]:
        """Tell [m] whether a state lies where the right-hand side is defined."""
        ...


@dataclass(frozen=True, slots=True)
class Tolerance:
    """Local error allowed per step and controlled quantity: absolute + relative·|value|.

    `method` is RODAS where accuracy counts, RODAS3 where a volt or a percent will do.
    """

    absolute: float
    relative: float
    method: Method = RODAS


@dataclass(frozen=True, slots=True)
class Trajectory:
    """Accepted steps of one member, with a cubic polynomial on each.

    Attributes
    ----------
    start_s, step_s : ndarray [K]
    y_start, y_end, c2, c3 : ndarray [K, n]
    attempts : int
        Steps tried, rejected ones included.
    """

    start_s: Array
    step_s: Array
    y_start: Array
    y_end: Array
    c2: Array
    c3: Array
    attempts: int

    def __call__(self, time_s: Array) -> Array:
        """Return y [T, n] at times [T] inside the span of the steps."""
        k = np.searchsorted(self.start_s, time_s, side="right") - 1
        k = np.clip(k, 0, len(self.start_s) - 1)
        theta = (time_s - self.start_s[k]) / self.step_s[k]
        return self.inside(k, theta)

    def inside(self, k: Index, theta: Array) -> Array:
        """Return y at the fraction `theta` (0…1) of the steps `k`."""
        s = theta[..., None]
        bend = self.c2[k] + s * self.c3[k]
        return (1.0 - s) * self.y_start[k] + s * (self.y_end[k] + (1.0 - s) * bend)


def march(
    system: System,
    y0: Array,
    *,
    span_s: tuple[float, float],
    breaks_s: Sequence[float] = (),
    tolerance: Tolerance,
    first_step_s: float = 1e-6,
    largest_step_s: float = np.inf,
    attempts: int = 200_000,
    record: "Record | None" = None,
) -> list[Trajectory]:
    """March a block of members from `span_s[0]` to `span_s[1]`.

    Parameters
    ----------
    system : System
    y0 : ndarray [M, n]
        One starting state per member.
    span_s : (float, float)
        Start and end [s].
    breaks_s : sequence of float
        Times at which f has a kink or a jump; every member steps onto them.
    tolerance : Tolerance
    first_step_s : float
        First step.
    largest_step_s : float
        No step is longer. A state that follows slow surroundings has no error at its step
        ends, however long the step: only this keeps the dense output right between them.
    attempts : int
        Largest number of tries per member.
    record : Record, optional
        What is to be done with each step instead of keeping all of them.

    Returns
    -------
    list of Trajectory
        One per member; empty with a `record` of your own.

    Raises
    ------
    StuckError
        The step fell below 1e-13 of the time or the attempts ran out.
    """
    start, end = span_s
    stops = np.array(sorted({b for b in breaks_s if start < b < end} | {end}))
    members = y0.shape[0]
    t = np.full(members, float(start))
    y = y0.astype(np.float64, copy=True)
    h = np.full(members, float(first_step_s))
    goal = np.zeros(members, dtype=np.intp)
    tried = np.zeros(members, dtype=np.intp)
    last_step, last_error = np.zeros(members), np.full(members, 1e-2)
    refused = np.zeros(members, dtype=np.bool_)
    log = StepLog() if record is None else record
    exponent = -1.0 / tolerance.method.order
    active = np.arange(members)
    while active.size:
        room = stops[goal[active]] - t[active]
        lands = h[active] >= room * (1.0 - 1e-12)
        # two even steps rather than a full one and a sliver
        step = np.where(lands, room, np.where(h[active] > 0.5 * room, 0.5 * room, h[active]))
        # what holds before a jump holds up to it: no stage of a step that ends there looks over
        latest = np.nextafter(stops[goal[active]], -np.inf)
        try:
            y1, error, c2, c3 = _step(system, active, t[active], y[active], step, latest, tolerance)
        except np.linalg.LinAlgError:
            raise NoSolutionError(
                f"the balance of charges has no solution {t[active].min():.6g} s after the start: "
                "currents or capacitances differ by more than a computer's digits",
                next_step="Look for extreme thicknesses, capacitances or resistances.",
            ) from None
        tried[active] += 1
        good = error <= 1.0
        factor = SAFETY * np.maximum(error, 1e-8) ** exponent
        # predictive control (Gustafsson 1991, ACM Trans. Math. Softw. 17, 533): errors that
        # grow from step to step shorten the next one before it is refused
        trend = SAFETY * step / np.where(last_step[active] > 0.0, last_step[active], step)
        trend = trend * (last_error[active] / np.maximum(error, 1e-8) ** 2) ** -exponent
        factor = np.where(good & (last_step[active] > 0.0), np.minimum(factor, trend), factor)
        factor = np.clip(factor, SMALLEST_FACTOR, LARGEST_FACTOR)
        factor = np.where(good & refused[active], np.minimum(factor, 1.0), factor)
        refused[active] = ~good
        done = active[good]
        last_step[done], last_error[done] = step[good], np.maximum(error[good], 1e-2)
        log.steps(done, t[done], step[good], y[done], y1[good], c2[good], c3[good])
        t[done] = np.where(lands[good], stops[goal[done]], t[done] + step[good])
        y[done] = y1[good]
        h[active] = step * np.where(good, factor, np.minimum(factor, 0.9))
        h[active] = np.minimum(h[active], largest_step_s)
        goal[done] += lands[good]
        still = active[goal[active] < len(stops)]
        stuck = still[(h[still] < 1e-13 * np.maximum(np.abs(t[still]), 1.0))
                      | (tried[still] >= attempts)]  # fmt: skip
        if stuck.size:
            m = int(stuck[0])
            last = float(error[np.flatnonzero(active == m)[0]])
            raise StuckError(m, float(t[m]), y[m].copy(), float(h[m]), int(tried[m]), last)
        active = still
    return log.trajectories(tried) if isinstance(log, StepLog) else []


def _step(
    system: System,
    member: Index,
    t: Array,
    y: Array,
    h: Array,
    latest: Array,
    tolerance: Tolerance,
) -> tuple[Array, Array, Array, Array]:
    """Try one step; return y1, error norm (inf where a stage left the domain), c2, c3."""
    method = tolerance.method
    count = len(method.alpha)
    delta = TIME_DIFFERENCE * h
    fresh = [i for i in range(1, count) if method.evaluates(i)]
    ahead = [np.minimum(t + method.alpha[i] * h, latest) for i in fresh]
    now, later, *others = system.moments(member, np.stack([t, t + delta, *ahead]))
    moment = dict(zip(fresh, others, strict=True))
    f, jacobian, f_later = system.start(member, now, later, y)
    h_ = h[:, None]
    f_t = (f_later - f) * (h_ / delta[:, None])
    mass = system.mass
    mass_h = (mass if mass.ndim == 2 else mass[member]) / h_[..., None]
    inverse = np.linalg.inv(mass_h / method.gamma - jacobian)  # small and used by every stage
    stages = np.empty((count, *y.shape))
    inside = np.ones(len(h), dtype=np.bool_)
    state = y
    for i in range(count):
        a, c = method.rows[i]
        if i in moment:
            state = y + (a * stages[:i]).sum(axis=0)
            fits = system.admissible(member, state)
            if not fits.all():
                inside &= fits
                state = np.where(inside[:, None], state, y)  # rejected below
            f = system.rates_at(member, moment[i], state)
        right = f
        if method.gamma_t[i]:
            right = right + method.gamma_t[i] * f_t
        if i:
            mix = (c * stages[:i]).sum(axis=0)
            right = right + (mass_h * mix[:, None, :]).sum(axis=-1)
        stages[i] = (inverse * right[:, None, :]).sum(axis=-1)
    y1 = state + stages[-1]
    inside &= system.admissible(member, y1)
    size = np.abs(system.controlled(np.stack([y, y1, stages[-1]])))
    scale = tolerance.absolute + tolerance.relative * np.maximum(size[0], size[1])
    error = np.max(size[2] / scale, axis=-1)
    error = np.where(inside & np.isfinite(error), error, np.inf)
    c2, c3 = ((dense * stages).sum(axis=0) for dense in method.dense)
    return y1, error, c2, c3


class Record(Protocol):
    """What is done with the accepted steps of a block."""

    def steps(
        self,
        member: Index,
        start_s: Array,
        step_s: Array,
        y0: Array,
        y1: Array,
        c2: Array,
        c3: Array,
    ) -> None:
        """Take one step of each of some members [m]; states and polynomials [m, n]."""
        ...  # fmt: skip


class StepLog:
    """Keeps every step."""

    def __init__(self) -> None:
        self._log: list[tuple[Index, Array, Array, Array, Array, Array, Array]] = []

    def steps(
        self, member: Index, start_s: Array, step_s: Array, y0: Array, y1: Array, c2: Array,
        c3: Array,
    ) -> None:  # fmt: skip
        """Keep one step of each of some members."""
        self._log.append((member, start_s, step_s, y0, y1, c2, c3))

    def trajectories(self, attempts: Index) -> list[Trajectory]:
        """Steps by member; `attempts` [M] is kept beside them."""
        member, *columns = (np.concatenate(part) for part in zip(*self._log, strict=True))
        order = np.argsort(member, kind="stable")
        ends = np.searchsorted(member[order], np.arange(len(attempts) + 1))
        found = []
        for m, tried in enumerate(attempts):
            own = order[ends[m] : ends[m + 1]]
            start_s, step_s, y0, y1, c2, c3 = (column[own] for column in columns)
            found.append(Trajectory(start_s, step_s, y0, y1, c2, c3, int(tried)))
        return found
