"""Regions of space that the orbit of a case crosses, without charging."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from charging.case import LoadedCase
from charging.flight import path
from charging.plasma_sources import regions_sampler
from environments.regions import REGIONS

Array = NDArray[np.float64]

BLOCK = 4096
"""Times at once."""
FINEST_S = 0.5
"""A boundary is found to so many seconds."""


class Stay(NamedTuple):
    """One stay in a region, the one with the largest share: its name, and seconds from start."""

    region: str
    start_s: float
    end_s: float


Finder = Callable[[Array], NDArray[np.int8]]


def region_finder(loaded: LoadedCase) -> Finder | None:
    """Index of the region at times [s]; None where the plasma is not that of regions."""
    case = loaded.case
    if case.plasma.model is None or case.orbit.kind == "fixed":
        return None
    sample = regions_sampler(case, path(case, None, loaded.files), loaded.files)

    def find(time_s: Array) -> NDArray[np.int8]:
        return np.asarray(sample(time_s).region, dtype=np.int8)

    return find


def stays(loaded: LoadedCase) -> tuple[Stay, ...]:
    """Stays in regions in order, looked for on the output steps; empty without regions.

    A stay shorter than an output step may be missed.
    """
    find = region_finder(loaded)
    if find is None:
        return ()
    end, step = loaded.case.duration_s, loaded.case.time.output_step_s
    found: list[Stay] = []
    begin, now = 0.0, int(find(np.zeros(1))[0])
    for first in np.arange(0.0, end, step * BLOCK):
        time = np.minimum(first + step * np.arange(BLOCK + 1), end)
        own = find(time)
        for k in np.flatnonzero(own[1:] != own[:-1]):
            edge = _edge(find, float(time[k]), float(time[k + 1]), int(own[k]))
            found.append(Stay(REGIONS[now], begin, edge))
            begin, now = edge, int(own[k + 1])
    found.append(Stay(REGIONS[now], begin, end))
    return tuple(found)


def _edge(find: Finder, low: float, high: float, before: int) -> float:
    """Time [s] at which a region ends, by halving."""
    while high - low > FINEST_S:
        middle = 0.5 * (low + high)
        if int(find(np.array([middle]))[0]) == before:
            low = middle
        else:
            high = middle
    return 0.5 * (low + high)


def add_regions(file: Path, find: Finder) -> None:
    """Add `region` (time) to the NetCDF of an orbit."""
    import netCDF4  # loads slowly

    with netCDF4.Dataset(str(file), "a") as dataset:
        variable = dataset.createVariable("region", "i1", ("time",), chunksizes=(8192,))
        variable.setncatts(
            {
                "long_name": "region of space with the largest share",
                "flag_values": np.arange(len(REGIONS), dtype=np.int8),
                "flag_meanings": " ".join(name.replace(" ", "_") for name in REGIONS),
            }
        )
        time = dataset.variables["time"]
        for first in range(0, len(time), BLOCK):
            here = slice(first, min(first + BLOCK, len(time)))
            variable[here] = find(np.asarray(time[here], dtype=np.float64))
