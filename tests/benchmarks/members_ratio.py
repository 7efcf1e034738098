"""A block of members against one, as ratios in one run; time a surface, evaluation and attempt.

Members differ in resistivity and thickness of their films, so they share tables. Extremes are
gathered while marching. Run: ``OMP_NUM_THREADS=1 python tests/benchmarks/members_ratio.py [M]``.
"""

from __future__ import annotations

import resource
import sys
import time
from dataclasses import replace
from pathlib import Path

import numpy as np

from charging.case import load_case
from charging.members import member_of
from charging.network.march import Tolerance, march
from charging.network.peaks import Peaks
from charging.network.rosenbrock import RODAS, RODAS3
from charging.orbit_run import FIRST_STEP_S, solve_mode

CASE = Path(__file__).parents[2] / "cases" / "geo_substorm_day.toml"
LOOSE_V, LOOSE_SHARE = 0.1, 1e-3


def main() -> None:
    """Print times of a day by method and number of members."""
    largest = int(sys.argv[1]) if len(sys.argv) > 1 else 100
    loaded = load_case(CASE)
    mode = solve_mode(loaded, members=[member_of(loaded, "lin_joy_2005")])
    rng = np.random.default_rng(1)
    surfaces = len(mode.net.surface_node)
    for method in (RODAS, RODAS3):
        for barriers in (None, mode.balance.barriers):
            for count in (1, largest):
                spread = np.exp(rng.uniform(-0.7, 0.7, (2, count, len(mode.net.film_node))))
                net = replace(
                    mode.net,
                    film_resistivity_ohm_m=mode.net.film_resistivity_ohm_m * spread[0],
                )
                balance = replace(
                    mode.balance,
                    net=net,
                    barriers=barriers if count == 1 else None,
                    table=replace(mode.balance.table, table=np.zeros(count, dtype=np.intp)),
                )
                start = np.zeros((count, len(net.node_names)))
                peaks = Peaks(balance.controlled, start)
                began = time.process_time()
                march(
                    balance,
                    start,
                    span_s=(0.0, 86400.0),
                    breaks_s=mode.around.breaks_s,
                    tolerance=Tolerance(LOOSE_V, LOOSE_SHARE, method),
                    first_step_s=FIRST_STEP_S,
                    largest_step_s=1800.0,
                    record=peaks,
                )
                spent = time.process_time() - began
                evaluations = 2 + sum(method.evaluates(i) for i in range(len(method.alpha)))
                each = spent / (peaks.count.sum() * surfaces * evaluations)
                print(
                    f"{method.name}, barriers {barriers is not None and count == 1}: "
                    f"{count} members {spent:.2f} s, {spent / count * 1e3:.2f} ms a member, "
                    f"{peaks.count.mean():.0f} steps, {each * 1e9:.0f} ns a surface and evaluation"
                )
    print(f"memory {resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 2**20:.2f} GiB")


if __name__ == "__main__":
    main()
