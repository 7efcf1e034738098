"""Random physical cases through a run: no NaN, charge closed, no floating potential passed over.

``python tests/fuzz/physical_cases.py --cases 10000 --record physical.json``. Half of them
are bare conductors, whose end must be the potential that the scan of the current balance says an
uncharged surface reaches; half are a hull, a film and an isolated plate with a resistor.
"""

from __future__ import annotations

import argparse
import json
import math
import random
import sys
import time
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np

HEAD = """\
title = "Random"
[orbit]
kind = "fixed"
illumination = {light!r}
sun_direction = [0.0, 0.0, 1.0]
duration_h = {hours!r}
[time]
output_step_s = {step!r}
[sun]
f107 = {f107!r}
[plasma]
use = "random.toml"
[body]
radius_m = {radius!r}
barrier = {barrier}
[emission]
secondary_law = "sanders_inouye_1979"
[[surface]]
name = "hull"
material = "gold"
area_m2 = {area!r}
normal = [0.0, 0.0, 1.0]
"""

MORE = """\
[[surface]]
name = "film"
material = "polyimide film"
area_m2 = {film!r}
thickness_m = {thickness!r}
temperature_K = {kelvin!r}
normal = [0.0, 0.0, {side}]
neighbours = ["hull"]
[[surface]]
name = "plate"
material = "silver"
area_m2 = {plate!r}
floating = true
capacitance_F = {farad!r}
normal = [0.0, 0.0, {other}]
[[link]]
between = ["plate", "structure"]
resistance_ohm = {ohm!r}
"""

CHARGE = 1e-4
"""Charge is closed to this share of what went through a node."""

LAWS = ("sanders_inouye_1979", "lin_joy_2005", "sternglass_1954", "draine_salpeter_1979")
SHAPES = ("sphere", "cylinder", "plane", "auto")


def between(draw: random.Random, low: float, high: float) -> float:
    """Random number, even in its logarithm."""
    return math.exp(draw.uniform(math.log(low), math.log(high)))


def random_plasma(draw: random.Random) -> Any:
    """One or two electron populations, Maxwellian or kappa, and one or two of ions."""
    from environments.catalogue import read_plasma

    hot, dense = between(draw, 0.1, 3e4), between(draw, 1e5, 1e11)
    rows: list[dict[str, object]] = []
    for species in ("electron", *(["electron"] if draw.random() < 0.4 else [])):
        row: dict[str, object] = {
            "species": species,
            "density_m3": dense if not rows else dense * between(draw, 0.01, 1.0),
            "temperature_eV": hot if not rows else between(draw, 0.1, 3e4),
        }
        if draw.random() < 0.05:
            row |= {"law": "kappa", "kappa": draw.uniform(2.1, 8.0)}
        rows.append(row)
    rows += [
        {
            "species": species,
            "density_m3": dense * between(draw, 0.2, 2.0),
            "temperature_eV": hot * between(draw, 0.1, 3.0),
        }
        for species in ("H+", *(["O+"] if draw.random() < 0.3 else []))
    ]
    return read_plasma({"title": "random", "source": "drawn", "population": rows})


def random_material(draw: random.Random, kind: str) -> Any:
    """Library material of a kind with peak yield, its energy and photocurrent moved."""
    from materials.library import load_material, material_names

    while True:
        material = load_material(draw.choice(material_names()))
        if material.kind == kind:
            break
    if not material.emits:
        return material
    values = dict(material.values)
    for key, factor in (("secondary_yield_peak", 2.0), ("secondary_yield_peak_energy_eV", 1.5)):
        moved = values[key].value * between(draw, 1.0 / factor, factor)
        values[key] = replace(values[key], value=moved)
    curve = material.photoyield
    if curve is not None:
        curve = replace(curve, level_factor=between(draw, 0.3, 3.0))
    return replace(material, values=values, photoyield=curve)


def block(draw: random.Random, members: int, single: bool) -> tuple[Any, Any]:
    """One case and its members, ready to be solved."""
    from charging.case import load_case_text
    from charging.members import Member

    side = draw.choice((-1.0, 1.0))
    text = HEAD.format(
        light=draw.choice((0.0, 1.0, draw.random())), hours=1.0 if single else 0.3,
        step=600.0 if single else 60.0, f107=draw.uniform(70.0, 250.0),
        radius=between(draw, 0.1, 10.0),
        barrier="false" if single else draw.choice(("true", "false")),
        area=between(draw, 0.5, 20.0),
    )  # fmt: skip
    if not single:
        text += MORE.format(
            film=between(draw, 0.1, 5.0), thickness=between(draw, 1e-5, 1e-3),
            kelvin=draw.uniform(150.0, 400.0), side=side, plate=between(draw, 0.01, 1.0),
            farad=between(draw, 1e-11, 1e-8), other=-side, ohm=between(draw, 1e3, 1e12),
        )  # fmt: skip
    plasma = 'title = "x"\nsource = "x"\n' + "".join(
        f'[[population]]\nspecies = "{s}"\ndensity_m3 = 1e6\ntemperature_eV = 1e3\n'
        for s in ("electron", "H+")
    )
    loaded = load_case_text(text, plasma_texts={"random.toml": plasma})
    made = []
    for _ in range(members):
        materials = {
            "gold": random_material(draw, "conductor"),
            "polyimide film": random_material(draw, "dielectric"),
            "silver": random_material(draw, "conductor"),
        }
        law: Any = draw.choice(LAWS)
        plasmas = {"random.toml": random_plasma(draw)}
        made.append(Member(loaded.case, materials, plasmas, law, draw.choice(SHAPES)))
    return loaded, made


def faults(loaded: Any, made: list[Any], single: bool) -> list[str | None]:
    """Solve a block; one text per member that failed."""
    from charging.audit import charge_audit
    from charging.currents.balance import floating_potentials
    from charging.errors import NoSolutionError
    from charging.orbit_run import solve_mode

    try:
        mode = solve_mode(loaded, members=made)
    except NoSolutionError as error:
        if len(made) > 1:  # the others are tried without it
            half = len(made) // 2
            return faults(loaded, made[:half], single) + faults(loaded, made[half:], single)
        return [f"no solution: {error}"]  # beyond 200 kV: refused, with the reason
    found: list[str | None] = []
    for i, path in enumerate(mode.trajectories):
        words = []
        states = path(mode.times_s)
        if not (np.isfinite(states).all() and np.isfinite(path.y_end).all()):
            words.append("a state is not finite")
        relative = charge_audit(mode.balance, i, path).relative
        if not relative <= CHARGE:
            words.append(f"charge open by {relative:.2e}")
        if single:
            words += _passed_over(mode, i, path, floating_potentials)
        found.append("; ".join(words) or None)
    return found


def _passed_over(mode: Any, member: int, path: Any, floating_potentials: Any) -> list[str]:
    from charging.currents.balance import net_current
    from charging.currents.surface import Setting, surface_currents

    model = mode.balance.models[member]
    light = float(mode.way.snapshot(np.zeros(1)).light[0, 0])
    answer = floating_potentials(model, light)
    end = float(path.y_end[-1, 0])
    if abs(end - answer.reached_V) <= 0.01 + 1e-4 * abs(answer.reached_V):
        return []
    one = np.array([end])
    setting = Setting(np.ones((1, 1)), np.full((1, 1), light))
    gross = float(np.abs(surface_currents(model, one[:, None], setting).by_mechanism).sum())
    net = abs(float(net_current(model, one, light)[0][0]))
    low, high = sorted((0.0, answer.reached_V))
    if (
        low <= end <= high
        and net > 1e-9 * gross
        and not any(root.stable and low < root.potential_V < end for root in answer.roots)
    ):
        return [f"under way at {end:.6g} V to {answer.reached_V:.6g} V"]  # slow, not wrong
    return [
        f"ends at {end:.9g} V, balance says {answer.reached_V:.9g} V (net/gross {net / gross:.1e})"
    ]


def run(cases: int, seed: int, members: int = 40) -> dict[str, Any]:
    """Run many cases; returns the record."""
    draw = random.Random(seed)
    began, done, singles = time.monotonic(), 0, 0
    told: list[dict[str, Any]] = []
    slow = refused = 0
    while done < cases:
        single = draw.random() < 0.5
        loaded, made = block(draw, min(members, cases - done), single)
        for number, fault in enumerate(faults(loaded, made, single)):
            if fault is not None and fault.startswith("under way"):
                slow += 1
            elif fault is not None and "range of the tables" in fault:
                refused += 1
            elif fault is not None:
                told.append({"block": done, "member": number, "single": single, "fault": fault})
                print(told[-1], file=sys.stderr, flush=True)
        done += len(made)
        singles += len(made) * single
    return {
        "seed": seed, "cases": done, "against the balance": singles, "under way": slow,
        "beyond 200 kV, refused": refused,
        "faults": told, "seconds": round(time.monotonic() - began, 1),
    }  # fmt: skip


def main() -> int:
    """Run and write the record."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--cases", type=int, default=10_000)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--record", type=Path)
    args = parser.parse_args()
    record = run(args.cases, args.seed)
    print(json.dumps({**record, "faults": len(record["faults"])}))
    if args.record:
        args.record.write_text(json.dumps(record, indent=1) + "\n", encoding="utf-8")
    return int(bool(record["faults"]))


if __name__ == "__main__":
    sys.exit(main())
