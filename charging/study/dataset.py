"""A finished study as one dataset, and the documents made from its ranking."""

from __future__ import annotations

import re
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np
import xarray as xr

from charging import __version__
from charging.orbit_run import laws_of
from charging.review.extremes import neighbours
from charging.study.plan import Plan
from charging.study.solve import HISTORY_POINTS, Results, Solver
from charging.study.store import Store

SURFACE = ("member", "mode", "law", "surface")
PAIR = ("member", "mode", "law", "pair")
ONE = ("member", "mode", "law")
VARIABLES: dict[str, tuple[tuple[str, ...], str, str]] = {
    "lowest_V": (SURFACE, "V", "lowest potential of a surface minus that of structure"),
    "lowest_time_s": (SURFACE, "s", "when, after the start"),
    "highest_V": (SURFACE, "V", "highest potential of a surface minus that of structure"),
    "highest_time_s": (SURFACE, "s", "when, after the start"),
    "final_V": (SURFACE, "V", "potential of a surface minus that of structure at the end"),
    "largest_field_V_m": (SURFACE, "V m-1", "largest field in the film of a surface"),
    "largest_energy_J": (SURFACE, "J", "largest energy stored between the faces of a film"),
    "pair_lowest_V": (PAIR, "V", "lowest difference of declared neighbours"),
    "pair_highest_V": (PAIR, "V", "highest difference of declared neighbours"),
    "structure_lowest_V": (ONE, "V", "lowest potential of structure"),
    "structure_highest_V": (ONE, "V", "highest potential of structure"),
    "structure_final_V": (ONE, "V", "potential of structure at the end"),
    "history_V": ((*SURFACE, "history_time"), "V", "surface minus structure along the run"),
    "factor_value": (("member", "factor"), "1", "value of a drawn factor, in its own unit"),
}
"""Variables of a sweep: dimensions, unit, meaning."""


def by_choice(plan: Plan, store: Store) -> list[Results]:
    """Results of every choice, its blocks joined in order.

    Raises
    ------
    InputError
        A block is damaged.
    """
    found = store.finished()
    parts = [store.read(found[number]) for number in sorted(found)]
    cut = store.manifest["blocks"]
    joined = []
    for choice in range(len(plan.choices)):
        own = [part for part, block in zip(parts, cut, strict=True) if block[0] == choice]
        joined.append({name: np.concatenate([one[name] for one in own]) for name in own[0]})
    return joined


def sweep_dataset(plan: Plan, solver: Solver, results: Sequence[Results]) -> xr.Dataset:
    """One dataset with every member; members of all choices side by side.

    Dimensions: member, mode, law, surface, pair, factor. Drawn ranges and varied values are
    coordinates of `member` by their paths; names are auxiliary coordinates, as in a result
    (``dataset.set_xindex("surface_name")``).
    """
    case = plan.loaded.case
    data: dict[str, Any] = {}
    for name, (dims, unit, meaning) in VARIABLES.items():
        if name in results[0]:
            value = np.concatenate([one[name] for one in results])
            data[name] = (dims, value, {"units": unit, "long_name": meaning})
    count = plan.members
    coordinates: dict[str, Any] = {
        "member": ("member", np.arange(count), {"units": "1", "long_name": "number of the member"}),
        "choice": (
            "member",
            np.repeat([c.label for c in plan.choices], plan.draws),
            {"long_name": "choice of the member"},
        ),
        "replicate": (
            "member",
            np.tile(solver.replicate, len(plan.choices)),
            {"units": "1", "long_name": "number of the scramble"},
        ),
        "mode_name": (
            "mode",
            ["base", *(mode.name for mode in case.alternatives)],
            {"long_name": "name of the mode"},
        ),
        "law_name": (
            "law",
            list(laws_of(plan.loaded)),
            {"long_name": "name of the secondary-emission law"},
        ),
        "surface_name": ("surface", list(case.names), {"long_name": "name of the surface"}),
        "pair_name": (
            "pair",
            [f"{a} - {b}" for a, b in neighbours(case)],
            {"long_name": "names of the pair of neighbours"},
        ),
        "factor_name": ("factor", list(solver.names), {"long_name": "name of the drawn factor"}),
    }
    for path in plan.choices[0].values:
        values = [choice.values[path] for choice in plan.choices]
        named = {"long_name": path}
        coordinates[_variable(path)] = ("member", np.repeat(values, plan.draws), named)
    for one in plan.ranges:
        column = solver.names.index(one.target.text)
        own = np.concatenate([part["factor_value"][:, column] for part in results])
        named = {"long_name": one.target.text}
        coordinates[_variable(one.target.text)] = ("member", own, named)
    if "history_V" in data:
        times = np.linspace(0.0, case.duration_s, HISTORY_POINTS)
        named = {"units": "s", "long_name": "time after the start"}
        coordinates["history_time"] = (
            "history_time",
            times,
            {"units": "s", "long_name": "time after the start"},
        )
    return xr.Dataset(
        data,
        coords=coordinates,
        attrs={
            "Conventions": "CF-1.11",
            "title": plan.file.title,
            "halflit_version": __version__,
            "seed": str(plan.file.seed),
            "study": plan.text,
            "study_sha256": plan.sha256,
            "case": plan.loaded.text,
            "case_sha256": plan.loaded.sha256,
            "history": "halflit sweep",
        },
    )


def _variable(path: str) -> str:
    """Name of the coordinate of a path: letters, digits and underscores.

    Examples
    --------
    >>> _variable("surface.north radiator.material")
    'surface_north_radiator_material'
    """
    return re.sub(r"[^A-Za-z0-9]+", "_", path).strip("_")


def open_sweep(folder: str | Path) -> xr.Dataset:
    """Open the dataset of a finished sweep; values are read when they are used.

    Raises
    ------
    FileNotFoundError
        There is none.
    """
    return xr.open_dataset(Path(folder) / "sweep.nc", engine="netcdf4")
