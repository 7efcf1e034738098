"""Jumps between branches: where a march leaves an equilibrium that has ceased to exist.

Potentials follow slow surroundings as long as the linearised balance returns a small
displacement. At a fold it grows by itself instead, and the potentials run to another
branch. Such stretches are found in the trajectory after the march, which follows the
jump like any other motion.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from charging.network.charge_balance import ChargeBalance
from charging.network.march import Trajectory

Array = NDArray[np.float64]

GROWTH_S = 60.0
"""A jump is a displacement that grows, at its fastest e-fold within this time."""

LEAST_V, LEAST_SHARE = 1.0, 0.01
"""A jump moves a potential by more than this, and by more than this share of it."""

INSIDE = np.arange(4) / 4.0
"""Points of every step at which the growth is looked at."""

QUIET = 0.5
"""Before a jump the potential moves at less than this share of its later speed."""

SETTLED = 0.1
"""A jump is over when the fastest potential has slowed down to this share."""


@dataclass(frozen=True, slots=True)
class Jump:
    """One jump of one member.

    Attributes
    ----------
    time_s : float
        When the potential that moves most moves fastest.
    begin_s, end_s : float
        The balance becomes unstable; it is stable again and the potentials have slowed down.
    node : int
        The node whose potential changes most.
    before_V, after_V : ndarray [n]
        Absolute potentials of all nodes at `begin_s` and `end_s`.
    """

    time_s: float
    begin_s: float
    end_s: float
    node: int
    before_V: Array
    after_V: Array


def growth_rate(balance: ChargeBalance, member: int, time_s: Array, y: Array) -> Array:
    """Largest real part of the eigenvalues of M⁻¹ J [1/s] at times [T] and states [T, n].

    Where no surface's own current grows with its potential the result is 0: films and links
    damp, so nothing can grow.
    """
    which = np.full(len(time_s), member)
    _, jacobian = balance.rhs_and_jacobian(which, time_s, y)
    mass = balance.mass if balance.mass.ndim == 2 else balance.mass[member]
    ancestry = balance.net.ancestry
    # by absolute potentials a balance without rising currents has no positive diagonal
    back = np.linalg.inv(ancestry)
    absolute = back.T @ jacobian @ back
    rising = (np.diagonal(absolute, axis1=-2, axis2=-1) > 0.0).any(axis=-1)
    symmetric = np.abs(jacobian - np.swapaxes(jacobian, -1, -2)).max(axis=(-1, -2))
    rising |= symmetric > 1e-9 * np.abs(jacobian).max(axis=(-1, -2))
    growth = np.zeros(len(time_s))
    if rising.any():
        matrices = np.linalg.solve(mass, jacobian[rising])
        growth[rising] = np.linalg.eigvals(matrices).real.max(axis=-1)
    return growth


def branch_jumps(balance: ChargeBalance, member: int, path: Trajectory) -> tuple[Jump, ...]:
    """Find the jumps of one member, in order."""
    net = balance.net
    count = len(path.step_s)
    k = np.repeat(np.arange(count), len(INSIDE))
    theta = np.tile(INSIDE, count)
    times = path.start_s[k] + theta * path.step_s[k]
    states = path.inside(k, theta)
    growth = growth_rate(balance, member, times, states)
    unstable = growth > 0.0
    volts = net.potentials(states)
    moved = np.maximum(np.diff(times), 1e-9)
    speed = np.append(np.abs(np.diff(volts, axis=0)).max(axis=-1) / moved, 0.0)
    found: list[Jump] = []
    i = 0
    while i < len(times):
        if not unstable[i]:
            i += 1
            continue
        first = last = i
        top = 0.0
        while i < len(times) - 1:
            top = max(top, float(speed[i]))
            if unstable[i]:
                last = i
            elif speed[i] < SETTLED * top:
                break
            i += 1
        first, last = max(first - 1, 0), max(i, last)
        i = last + 1
        change = volts[last] - volts[first]
        node = int(np.argmax(np.abs(change)))
        size = abs(float(change[node]))
        largest = max(abs(float(volts[first, node])), abs(float(volts[last, node])))
        own = np.abs(np.diff(volts[first : last + 1, node])) / moved[first:last]
        at = int(np.argmax(own))
        # what moves from the start, or moved already, charges; it leaves no equilibrium
        quiet = first > 0 and own[0] < QUIET * own[at]
        fast = growth[first : last + 1].max() > 1.0 / GROWTH_S
        if quiet and fast and size > LEAST_V and size > LEAST_SHARE * largest:
            when = times[first + at] + 0.5 * moved[first + at]
            begin, end = float(times[first]), float(times[last])
            found.append(Jump(float(when), begin, end, node, volts[first], volts[last]))
    return tuple(found)
