"""Nominal runs of a review: every scene at every age, law and collection."""

from __future__ import annotations

import copyreg
import io
import pickle
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType
from typing import Any

import numpy as np

from charging.case import LoadedCase
from charging.orbit_run import TOLERANCE, ModeRun, laws_of, solve_mode, surroundings_of
from charging.review.blocks import Runner
from charging.review.extremes import Extremes, Quantity, extremes
from charging.review.limits import size_of
from charging.review.scenes import Scene, Sheath, sheath
from charging.review.space import Variant, Workshop


@dataclass(frozen=True, slots=True)
class Cell:
    """One scene solved for its variants at the values of the records.

    run : members in the order of `variants`; worst : of the quantities asked.
    """

    scene: Scene
    run: ModeRun
    variants: tuple[Variant, ...]
    worst: Extremes
    sheath: Sheath


@dataclass(frozen=True, slots=True)
class Place:
    """Where a worst value was found: cell, variant in it, and the value with its time."""

    cell: int
    variant: int
    value: float
    time_s: float


def nominal_cells(
    loaded: LoadedCase, asked: Sequence[Scene], wanted: Sequence[Quantity], runner: Runner
) -> tuple[Cell, ...]:
    """Solve every scene for all ages, laws and allowed collections.

    Several scenes are solved on the processes of the runner.

    Raises
    ------
    NoSolutionError
        The march found no step in one of them.
    """
    if runner.workers < 2 or len(asked) < 2:
        return tuple(_cell(loaded, scene, wanted) for scene in asked)
    rows = [(loaded, scene, tuple(wanted)) for scene in asked]
    return tuple(pickle.loads(packed) for packed in runner.each(_packed_cell, rows))


def _packed_cell(loaded: LoadedCase, scene: Scene, wanted: Sequence[Quantity]) -> bytes:
    target = io.BytesIO()
    _Pickler(target, pickle.HIGHEST_PROTOCOL).dump(_cell(loaded, scene, wanted))
    return target.getvalue()


def _read_only(values: Mapping[Any, Any]) -> MappingProxyType[Any, Any]:
    return MappingProxyType(dict(values))


class _Pickler(pickle.Pickler):
    """A pickler that also knows read-only mappings, of which runs are full."""

    dispatch_table: dict[type, Callable[[Any], Any]] = {  # noqa: RUF012 - asked for by pickle
        **copyreg.dispatch_table,
        MappingProxyType: lambda values: (_read_only, (dict(values),)),
    }


def _cell(loaded: LoadedCase, scene: Scene, wanted: Sequence[Quantity]) -> Cell:
    own = loaded.case.body.collection
    around = surroundings_of(loaded, scene.table)
    workshop = Workshop.of(loaded)

    def solved(collections: Sequence[str]) -> tuple[tuple[Variant, ...], ModeRun]:
        variants = tuple(
            Variant(age, law, collection)
            for age in loaded.case.review.ages
            for law in laws_of(loaded)
            for collection in collections
        )
        members = [workshop.member(variant) for variant in variants]
        run = solve_mode(loaded, scene.table, members=members, around=around, tolerance=TOLERANCE)
        return variants, run

    variants, run = solved([own])
    allowed = sheath(loaded, [run])
    if allowed.collections != (own,):
        variants, run = solved(allowed.collections)
    found = [
        extremes(member.case, run.balance.net.of(i), path, wanted)
        for i, (member, path) in enumerate(zip(run.members, run.trajectories, strict=True))
    ]
    worst = Extremes(np.stack([value for value, _ in found]), np.stack([t for _, t in found]))
    return Cell(scene, run, variants, worst, allowed)


def governing(cells: Sequence[Cell], wanted: Sequence[Quantity]) -> tuple[Place, ...]:
    """Worst place of every quantity over all cells; the first of equals."""
    places = []
    for q, quantity in enumerate(wanted):
        found = [
            Place(c, v, float(cell.worst.value[v, q]), float(cell.worst.time_s[v, q]))
            for c, cell in enumerate(cells)
            for v in range(len(cell.variants))
        ]
        places.append(max(found, key=lambda place: size_of(quantity.kind, place.value)))
    return tuple(places)
