"""Linearly implicit time march of a stiff charge balance, member by member.

The integrator is RODAS, a six-stage, stiffly accurate, L-stable Rosenbrock
method of order 4 with an embedded method of order 3 and a dense output of order
3 (Hairer & Wanner 1996, Solving Ordinary Differential Equations II, sec. VI.4
and IV.7; coefficients from memory, its orders are tested). It solves
``M dy/dt = f(t, y)`` with a constant mass matrix for a block of members at once;
every member has its own time and step size, so that a member's numbers do not
depend on its company.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from charging.errors import NoSolutionError

Array = NDArray[np.float64]
Index = NDArray[np.intp]

GAMMA = 0.25
# stage times and the factors of df/dt, in steps
ALPHA = (0.0, 0.386, 0.21, 0.63, 1.0, 1.0)
GAMMA_T = (0.25, -0.1043, 0.1035, -0.0362, 0.0, 0.0)
A = (
    (),
    (1.544,),
    (0.9466785280815826, 0.2557011698983284),
    (3.314825187068521, 2.896124015972201, 0.9986419139977817),
    (1.221224509226641, 6.019134481288629, 12.53708332932087, -0.687886036105895),
    (1.221224509226641, 6.019134481288629, 12.53708332932087, -0.687886036105895, 1.0),
)
C = (
    (),
    (-5.6688,),
    (-2.430093356833875, -0.2063599157091915),
    (-0.1073529058151375, -9.594562251023355, -20.47028614809616),
    (7.496443313967647, -10.24680431464352, -33.99990352819905, 11.7089089320616),
    (
        8.083246795921522,
        -7.981132988064893,
        -31.52159432874371,
        16.31930543123136,
        -6.058818238834054,
    ),
)
DENSE_2 = (10.12623508344586, -7.487995877610167, -34.80091861555747, -7.992771707568823,
           1.025137723295662)  # fmt: skip
DENSE_3 = (-0.6762803392801253, 6.087714651680015, 16.43084320892478, 24.76722511418386,
           -6.594389125716872)  # fmt: skip

SAFETY, LARGEST_FACTOR, SMALLEST_FACTOR = 0.9, 5.0, 0.2
TIME_DIFFERENCE = 1e-4  # df/dt is a forward difference over this share of the step


class System(Protocol):
    """A stiff initial-value problem for a block of members."""

    @property
    def mass(self) -> Array:
        """Mass matrix [n, n]."""
        ...

    def rhs(self, member: Index, time_s: Array, y: Array) -> Array:
        """Return f [m, n] for members `member` [m] at `time_s` [m], `y` [m, n]."""
        ...

    def rhs_and_jacobian(self, member: Index, time_s: Array, y: Array) -> tuple[Array, Array]:
        """Return f [m, n] and its derivative by y [m, n, n]."""
        ...

    def controlled(self, y: Array) -> Array:
        """Return the quantities [m, q] (linear in y) whose error is kept small."""
        ...

    def admissible(self, y: Array) -> NDArray[np.bool_]:
        """Tell [m] whether a state lies where the right-hand side is defined."""
        ...


@dataclass(frozen=True, slots=True)
class Tolerance:
    """Local error allowed per step and controlled quantity: absolute + relative·|value|."""

    absolute: float
    relative: float


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

    Returns
    -------
    list of Trajectory, one per member

    Raises
    ------
    NoSolutionError
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
    log: list[tuple[Index, Array, Array, Array, Array, Array, Array]] = []
    active = np.arange(members)
    while active.size:
        room = stops[goal[active]] - t[active]
        lands = h[active] >= room * (1.0 - 1e-12)
        # two even steps rather than a full one and a sliver
        step = np.where(lands, room, np.where(h[active] > 0.5 * room, 0.5 * room, h[active]))
        # what holds before a jump holds up to it: no stage of a step that ends there looks over
        latest = np.nextafter(stops[goal[active]], -np.inf)
        y1, error, c2, c3 = _rodas_step(
            system, active, t[active], y[active], step, latest, tolerance
        )
        tried[active] += 1
        good = error <= 1.0
        factor = SAFETY * np.maximum(error, 1e-8) ** -0.25
        # predictive control (Gustafsson 1991, ACM Trans. Math. Softw. 17, 533): errors that
        # grow from step to step shorten the next one before it is refused
        trend = SAFETY * step / np.where(last_step[active] > 0.0, last_step[active], step)
        trend = trend * (last_error[active] / np.maximum(error, 1e-8) ** 2) ** 0.25
        factor = np.where(good & (last_step[active] > 0.0), np.minimum(factor, trend), factor)
        factor = np.clip(factor, SMALLEST_FACTOR, LARGEST_FACTOR)
        factor = np.where(good & refused[active], np.minimum(factor, 1.0), factor)
        refused[active] = ~good
        done = active[good]
        last_step[done], last_error[done] = step[good], np.maximum(error[good], 1e-2)
        log.append((done, t[done], step[good], y[done], y1[good], c2[good], c3[good]))
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
            raise NoSolutionError(
                f"no step at {t[m]:.6f} s after the start: step {h[m]:.1e} s "
                f"after {tried[m]} attempts"
            )
        active = still
    return [_collect(log, m, int(tried[m])) for m in range(members)]


def _rodas_step(
    system: System,
    member: Index,
    t: Array,
    y: Array,
    h: Array,
    latest: Array,
    tolerance: Tolerance,
) -> tuple[Array, Array, Array, Array]:
    """Try one step; return y1, error norm (inf where a stage left the domain), c2, c3."""
    f0, jacobian = system.rhs_and_jacobian(member, t, y)
    delta = TIME_DIFFERENCE * h
    f_t = (system.rhs(member, t + delta, y) - f0) / delta[:, None]
    mass_h = system.mass / h[:, None, None]
    inverse = np.linalg.inv(mass_h / GAMMA - jacobian)  # small and used six times
    stages: list[Array] = []
    f = f0
    inside = np.ones(len(h), dtype=np.bool_)
    state = y
    for i in range(6):
        if i:
            state = y.copy()
            for a, stage in zip(A[i], stages, strict=True):
                state += a * stage
            inside &= system.admissible(state)
            state = np.where(inside[:, None], state, y)  # rejected below
            f = system.rhs(member, np.minimum(t + ALPHA[i] * h, latest), state)
        right = f
        if GAMMA_T[i]:
            right = right + (GAMMA_T[i] * h)[:, None] * f_t
        if i:
            mix = np.zeros_like(y)
            for c, stage in zip(C[i], stages, strict=True):
                mix += c * stage
            right = right + (mass_h * mix[:, None, :]).sum(axis=-1)
        stages.append((inverse * right[:, None, :]).sum(axis=-1))
    y1 = state + stages[5]
    inside &= system.admissible(y1)
    scale = tolerance.absolute + tolerance.relative * np.maximum(
        np.abs(system.controlled(y)), np.abs(system.controlled(y1))
    )
    error = np.max(np.abs(system.controlled(stages[5])) / scale, axis=-1)
    error = np.where(inside & np.isfinite(error), error, np.inf)
    c2 = sum(d * s for d, s in zip(DENSE_2, stages[:5], strict=True))
    c3 = sum(d * s for d, s in zip(DENSE_3, stages[:5], strict=True))
    return y1, error, np.asarray(c2), np.asarray(c3)


def _collect(
    log: list[tuple[Index, Array, Array, Array, Array, Array, Array]], member: int, attempts: int
) -> Trajectory:
    def column(number: int) -> Array:
        return np.concatenate([entry[number][entry[0] == member] for entry in log])

    return Trajectory(
        start_s=column(1),
        step_s=column(2),
        y_start=column(3),
        y_end=column(4),
        c2=column(5),
        c3=column(6),
        attempts=attempts,
    )
