"""The march: order, dense output, L-stability, breaks, company of other members, failure."""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.integrate import solve_ivp

from charging.currents.lookup import net_currents
from charging.errors import NoSolutionError
from charging.network.march import Tolerance, Trajectory, march
from charging.orbit_run import TOLERANCE, CaseRun

Array = NDArray[np.float64]
Index = NDArray[np.intp]

ANYTHING = Tolerance(absolute=1e30, relative=0.0)
"""Accepts every step, so that breaks alone set the step size."""


class Plain:
    """A system that needs to know of a time the time alone."""

    def rhs_and_jacobian(self, member: Index, time_s: Array, y: Array) -> tuple[Array, Array]:
        raise NotImplementedError

    def rhs(self, member: Index, time_s: Array, y: Array) -> Array:
        raise NotImplementedError

    def moments(self, member: Index, time_s: Array) -> list[Array]:
        return list(time_s)

    def rates_at(self, member: Index, moment: Array, y: Array) -> Array:
        return self.rhs(member, moment, y)

    def start(
        self, member: Index, moment: Array, later: Array, y: Array
    ) -> tuple[Array, Array, Array]:
        return *self.rhs_and_jacobian(member, moment, y), self.rhs(member, later, y)


@dataclass(frozen=True)
class Problem(Plain):
    """``M y' = f(t, y)`` of a two-variable stiff system with a parameter per member.

    M (y0, y1)' = (-rate (y0 - cos t) + 0.3 y0 y1, sin 3t - y1^3 - y0)
    """

    rate: Array
    mass: Array = field(default_factory=lambda: np.array([[2.0, -0.7], [-0.7, 1.5]]))
    seen: list[Array] = field(default_factory=list)

    def rhs(self, member: Index, time_s: Array, y: Array) -> Array:
        self.seen.append(time_s)
        a, b = y[:, 0], y[:, 1]
        return np.stack(
            [
                -self.rate[member] * (a - np.cos(time_s)) + 0.3 * a * b,
                np.sin(3.0 * time_s) - b**3 - a,
            ],
            axis=-1,
        )

    def rhs_and_jacobian(self, member: Index, time_s: Array, y: Array) -> tuple[Array, Array]:
        a, b = y[:, 0], y[:, 1]
        one = np.ones_like(a)
        rows = [[-self.rate[member] + 0.3 * b, 0.3 * a], [-one, -3.0 * b**2]]
        return self.rhs(member, time_s, y), np.moveaxis(np.array(rows), -1, 0)

    def controlled(self, y: Array) -> Array:
        return y

    def admissible(self, member: Index, y: Array) -> NDArray[np.bool_]:
        return (np.abs(y) < 1e3).all(axis=-1)

    def reference(self, member: int, start: Array, times: Array) -> Array:
        """Solution [T, 2] by another integrator, DOP853 at rtol 1e-12."""
        solve = np.linalg.inv(self.mass)
        one = np.array([member])
        found = solve_ivp(
            lambda t, y: solve @ self.rhs(one, np.array([t]), y[None])[0],
            (0.0, times[-1]),
            start,
            method="DOP853",
            rtol=1e-12,
            atol=1e-13,
            t_eval=times,
        )
        return np.asarray(found.y.T)


START = np.array([0.2, -0.5])


def fixed_steps(problem: Problem, count: int, end: float = 2.0) -> Trajectory:
    step = end / count
    (path,) = march(
        problem,
        START[None],
        span_s=(0.0, end),
        breaks_s=tuple(step * k for k in range(1, count)),
        tolerance=ANYTHING,
        first_step_s=step,
    )
    assert len(path.step_s) == count
    return path


def test_order_four_at_the_steps_on_a_non_autonomous_problem_with_mass_matrix() -> None:
    problem = Problem(rate=np.array([5.0]))
    errors = []
    for count in (16, 32, 64):
        path = fixed_steps(problem, count)
        exact = problem.reference(0, START, path.start_s + path.step_s)
        errors.append(np.abs(path.y_end - exact).max())
    orders = np.log2(np.array(errors[:-1]) / errors[1:])
    assert orders.min() > 3.6, (errors, orders)
    assert errors[-1] < 2e-6, errors


def test_dense_output_has_order_three_inside_the_steps() -> None:
    problem = Problem(rate=np.array([5.0]))
    errors = []
    for count in (16, 32, 64):
        path = fixed_steps(problem, count)
        # one step from an exact start isolates the interpolant: its local order is 4
        times = np.linspace(0.0, 2.0 / count, 9)
        exact = problem.reference(0, START, times)
        errors.append(np.abs(path(times) - exact).max())
    orders = np.log2(np.array(errors[:-1]) / errors[1:])
    assert orders.min() > 3.5, (errors, orders)
    whole = fixed_steps(problem, 64)
    times = np.linspace(0.0, 2.0, 501)
    assert np.abs(whole(times) - problem.reference(0, START, times)).max() < 1e-5


def test_dense_output_meets_the_steps() -> None:
    path = fixed_steps(Problem(rate=np.array([5.0])), 16)
    k = np.arange(16)
    assert np.array_equal(path.inside(k, np.zeros(16)), path.y_start)
    assert np.array_equal(path.inside(k, np.ones(16)), path.y_end)
    assert np.array_equal(path.y_start[1:], path.y_end[:-1])
    assert np.array_equal(path(np.array([2.0]))[0], path.y_end[-1])


def test_stiff_problem_within_tolerance_of_radau() -> None:
    problem = Problem(rate=np.array([1e4]))
    (path,) = march(problem, START[None], span_s=(0.0, 2.0), tolerance=Tolerance(1e-7, 1e-7))
    solve = np.linalg.inv(problem.mass)
    one = np.array([0])
    found = solve_ivp(
        lambda t, y: solve @ problem.rhs(one, np.array([t]), y[None])[0],
        (0.0, 2.0),
        START,
        method="Radau",
        rtol=1e-12,
        atol=1e-12,
        jac=lambda t, y: solve @ problem.rhs_and_jacobian(one, np.array([t]), y[None])[1][0],
    )
    assert np.abs(path.y_end[-1] - found.y[:, -1]).max() < 1e-5
    tight = np.abs(path.y_end[-1] - found.y[:, -1]).max()
    (loose,) = march(problem, START[None], span_s=(0.0, 2.0), tolerance=Tolerance(1e-3, 1e-3))
    assert loose.attempts < path.attempts
    assert tight <= np.abs(loose.y_end[-1] - found.y[:, -1]).max() + 1e-12


@dataclass(frozen=True)
class Decay(Plain):
    """y' = -rate (y - cos t)."""

    rate: float
    mass: Array = field(default_factory=lambda: np.eye(1))

    def rhs(self, member: Index, time_s: Array, y: Array) -> Array:
        return -self.rate * (y - np.cos(time_s)[:, None])

    def rhs_and_jacobian(self, member: Index, time_s: Array, y: Array) -> tuple[Array, Array]:
        return self.rhs(member, time_s, y), np.full((len(y), 1, 1), -self.rate)

    def controlled(self, y: Array) -> Array:
        return y

    def admissible(self, member: Index, y: Array) -> NDArray[np.bool_]:
        return np.ones(len(y), dtype=np.bool_)


def test_one_huge_step_damps_a_fast_mode_to_nothing() -> None:
    (path,) = march(
        Decay(1e9), np.array([[2.0]]), span_s=(0.0, 1e-3), tolerance=ANYTHING, first_step_s=1e-3
    )
    assert len(path.step_s) == 1  # h·rate = 1e6: an A-stable method would keep -1 or so of 1.0
    assert path.y_end[0, 0] == pytest.approx(np.cos(1e-3), abs=1e-5)


@pytest.mark.parametrize(("longest", "between"), [(0.2, 2e-4), (0.1, 3e-5)])
def test_a_fast_mode_costs_few_steps(longest: float, between: float) -> None:
    count = round(10.0 / longest)
    (path,) = march(
        Decay(1e9),
        np.array([[0.0]]),
        span_s=(0.0, 10.0),
        breaks_s=tuple(np.arange(1, count) * longest),
        tolerance=Tolerance(1e-5, 0.0),
    )
    ends = path.start_s + path.step_s
    late = ends > 1e-6
    assert np.abs(path.y_end[late, 0] - np.cos(ends[late])).max() < 1e-6
    # the error norm looks at step ends, which are exact here; inside, the cubic errs by
    # about 0.014 h^3 (infinitely stiff: order 4 does not show)
    times = np.linspace(longest, 10.0, 2001)
    assert np.abs(path(times)[:, 0] - np.cos(times)).max() < between
    assert path.attempts < 10 * count  # an explicit method would need 1e10


@dataclass(frozen=True)
class Ramp(Plain):
    """y' = |t - kink|: polynomial on both sides, so exact when stepped on."""

    kink: float
    mass: Array = field(default_factory=lambda: np.eye(1))

    def rhs(self, member: Index, time_s: Array, y: Array) -> Array:
        return np.abs(time_s - self.kink)[:, None] + 0.0 * y

    def rhs_and_jacobian(self, member: Index, time_s: Array, y: Array) -> tuple[Array, Array]:
        return self.rhs(member, time_s, y), np.zeros((len(y), 1, 1))

    def controlled(self, y: Array) -> Array:
        return y

    def admissible(self, member: Index, y: Array) -> NDArray[np.bool_]:
        return np.ones(len(y), dtype=np.bool_)


def test_breaks_are_step_ends_to_the_last_bit() -> None:
    breaks = (0.1, 1.0 / 3.0, np.pi / 2.0, 1.9999, -1.0, 2.0, 5.0, 1.0 / 3.0)
    (path,) = march(
        Ramp(np.pi / 2.0),
        np.zeros((1, 1)),
        span_s=(0.0, 2.0),
        breaks_s=breaks,
        tolerance=Tolerance(1e-3, 0.0),
    )
    for inside in (0.1, 1.0 / 3.0, np.pi / 2.0, 1.9999):
        assert inside in path.start_s
    assert (np.diff(path.start_s) > 0.0).all()
    assert path.start_s[-1] + path.step_s[-1] == pytest.approx(2.0, abs=1e-15)
    kink = np.pi / 2.0
    exact = (kink**2 + (2.0 - kink) ** 2) / 2.0
    assert path.y_end[-1, 0] == pytest.approx(exact, abs=1e-12)


def test_a_kink_without_a_break_costs_accuracy() -> None:
    kink = np.pi / 2.0
    (path,) = march(
        Ramp(kink),
        np.zeros((1, 1)),
        span_s=(0.0, 2.0),
        tolerance=ANYTHING,
        first_step_s=0.5,
    )
    assert abs(path.y_end[-1, 0] - (kink**2 + (2.0 - kink) ** 2) / 2.0) > 1e-6


def test_a_member_alone_is_the_same_as_in_a_block_bit_for_bit() -> None:
    rate = np.array([3.0, 1e5, 40.0, 0.0, 777.0])
    start = np.stack([START * (1.0 + k) for k in range(5)])
    tolerance = Tolerance(1e-5, 1e-5)
    block = march(Problem(rate=rate), start, span_s=(0.0, 1.5), tolerance=tolerance)
    assert len({path.attempts for path in block}) > 1
    for m, whole in enumerate(block):
        (alone,) = march(
            Problem(rate=rate[m : m + 1]), start[m : m + 1], span_s=(0.0, 1.5), tolerance=tolerance
        )
        assert_same(alone, whole)


def test_a_law_alone_is_the_same_as_with_the_other_bit_for_bit(static_case: CaseRun) -> None:
    mode = static_case.modes[1]
    for m, model in enumerate(mode.balance.models):
        single = replace(mode.balance, models=(model,), table=net_currents((model,)))
        (alone,) = march(
            single,
            np.zeros((1, len(mode.net.node_names))),
            span_s=(0.0, static_case.loaded.case.duration_s),
            breaks_s=mode.around.breaks_s,
            tolerance=TOLERANCE,
        )
        assert_same(alone, mode.trajectories[m])


def assert_same(one: Trajectory, other: Trajectory) -> None:
    assert one.attempts == other.attempts
    for name in ("start_s", "step_s", "y_start", "y_end", "c2", "c3"):
        assert np.array_equal(getattr(one, name), getattr(other, name)), name


@dataclass(frozen=True)
class BlowUp(Plain):
    """y' = y^2: infinite at t = 1 from y = 1."""

    limit: float
    mass: Array = field(default_factory=lambda: np.eye(1))

    def rhs(self, member: Index, time_s: Array, y: Array) -> Array:
        return y**2

    def rhs_and_jacobian(self, member: Index, time_s: Array, y: Array) -> tuple[Array, Array]:
        return y**2, 2.0 * y[..., None]

    def controlled(self, y: Array) -> Array:
        return y

    def admissible(self, member: Index, y: Array) -> NDArray[np.bool_]:
        return np.asarray((np.abs(y) < self.limit).all(axis=-1))


def test_a_solution_that_leaves_the_domain_is_an_error_that_says_when() -> None:
    with pytest.raises(NoSolutionError, match=r"no step at 0\.9999\d\d s"):
        march(BlowUp(1e5), np.ones((1, 1)), span_s=(0.0, 2.0), tolerance=Tolerance(1e-3, 1e-3))


def test_attempts_run_out() -> None:
    with pytest.raises(NoSolutionError, match="after 7 attempts"):
        march(
            BlowUp(1e5),
            np.ones((1, 1)),
            span_s=(0.0, 2.0),
            tolerance=Tolerance(1e-8, 1e-8),
            attempts=7,
        )


def test_a_member_that_fails_is_found_in_a_block() -> None:
    start = np.array([[-1.0], [1.0]])  # y = -1/(1+t) lives on
    with pytest.raises(NoSolutionError, match=r"no step at 0\.9999"):
        march(BlowUp(1e5), start, span_s=(0.0, 2.0), tolerance=Tolerance(1e-3, 1e-3))


def test_no_stage_looks_beyond_the_step() -> None:
    """A jump of f after the end must not be seen early."""
    problem = Problem(rate=np.array([5.0]))
    march(problem, START[None], span_s=(0.0, 1.0), tolerance=Tolerance(1e-4, 1e-4))
    assert max(float(t.max()) for t in problem.seen) <= 1.0 + 1e-12
