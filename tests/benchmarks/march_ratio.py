"""March of the demonstration day against a plain script, as a ratio in one run.

The plain script does what one would write first: scipy's ``solve_ivp`` (Radau) on the
same nodes, every right-hand side evaluated by the direct path. Run:
``python tests/benchmarks/march_ratio.py``.
"""

from __future__ import annotations

import time
from itertools import pairwise
from pathlib import Path

import numpy as np
from scipy.integrate import solve_ivp

from charging.case import load_case
from charging.network.march import march
from charging.orbit_run import FIRST_STEP_S, TOLERANCE, solve_mode

CASE = Path(__file__).parents[2] / "cases" / "geo_substorm_day.toml"
HOURS = 2.0  # the plain script takes too long for a day


def main() -> None:
    """Print both times and their ratio."""
    mode = solve_mode(load_case(CASE))
    balance, around = mode.balance, mode.around
    start, end = 3600.0 * 11.2, 3600.0 * (11.2 + HOURS)
    y0 = mode.trajectories[0](np.array([start]))
    breaks = around.breaks_s
    began = time.perf_counter()
    ours = march(
        balance,
        y0,
        span_s=(start, end),
        breaks_s=breaks,
        tolerance=TOLERANCE,
        first_step_s=FIRST_STEP_S,
    )[0]
    ours_s = time.perf_counter() - began

    def rate(t: float, y: np.ndarray) -> np.ndarray:
        flows = balance.flows(0, np.array([t]), y[None])
        into = balance.node_currents(flows)[0]
        return np.linalg.solve(balance.mass, balance.net.ancestry.T @ into)

    began = time.perf_counter()
    edges = [start, *(b for b in breaks if start < b < end), end]
    y = y0[0]
    for low, high in pairwise(edges):
        y = solve_ivp(rate, (low, high), y, method="Radau", rtol=1e-4, atol=0.01).y[:, -1]
    plain_s = time.perf_counter() - began
    print(f"march {ours_s:.3f} s, plain Radau on the direct path {plain_s:.1f} s")
    print(
        f"ratio {plain_s / ours_s:.0f}; largest difference {np.abs(ours.y_end[-1] - y).max():.3g} V"
    )


if __name__ == "__main__":
    main()
