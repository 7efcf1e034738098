"""Charge audit: what arrived must be what is stored.

The march conserves charge by construction of its steps; this audit does not trust
it. It integrates the currents of the direct path (not the march's tables) over the
dense output with Gauss-Legendre points and compares the sum with C ΔV, node by node.
"""

from typing import NamedTuple

import numpy as np
from numpy.polynomial.legendre import leggauss
from numpy.typing import NDArray

from charging.network.charge_balance import ChargeBalance
from charging.network.march import Trajectory

Array = NDArray[np.float64]

POINTS = 4


class Audit(NamedTuple):
    """Residual charge [C] by step end and node, and its largest share of the throughput.

    ends_s [K]; residual_C [K, n]: arrived minus stored since the start; relative: largest
    |residual| over the charge that went through the node either way.
    """

    ends_s: Array
    residual_C: Array
    relative: float


def charge_audit(balance: ChargeBalance, member: int, path: Trajectory) -> Audit:
    """Audit one trajectory."""
    x, weight = leggauss(POINTS)
    theta, weight = (x + 1.0) / 2.0, weight / 2.0
    steps = len(path.step_s)
    k = np.repeat(np.arange(steps), POINTS)
    states = path.inside(k, np.tile(theta, steps))
    times = path.start_s[k] + np.tile(theta, steps) * path.step_s[k]
    flows = balance.flows(member, times, states)
    net = balance.net.of(member)
    into = balance.node_currents(flows, member).reshape(steps, POINTS, -1)
    share = weight[None, :, None] * path.step_s[:, None, None]
    arrived = np.cumsum((into * share).sum(axis=1), axis=0)
    change = net.potentials(path.y_end) - net.potentials(path.y_start[0])
    residual = arrived - change @ net.capacitance_F.T

    through = np.zeros((len(times), len(net.node_names)))
    size = np.abs(flows.surface_A_m2).sum(axis=-1) * net.area_m2
    for surface, node in enumerate(net.surface_node):
        through[:, node] += size[:, surface]
    film = np.abs(flows.film_A_m2) * net.area_m2[net.film_surface]
    for i, node in enumerate(net.film_node):
        through[:, node] += film[:, i]
    through[:, 0] += np.abs(flows.emitter_A).sum(axis=-1) + flows.string_gross_A.sum(axis=-1)
    total = (through.reshape(steps, POINTS, -1) * share).sum(axis=(0, 1))
    relative = float(np.max(np.abs(residual) / np.where(total > 0.0, total, 1.0)))
    return Audit(path.start_s + path.step_s, residual, relative)
