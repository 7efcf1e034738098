"""What a review says about its runs, in plain values: times, regions, jumps, barriers, shapes."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from datetime import datetime
from itertools import pairwise
from typing import Any

from charging.barriers import without_barrier
from charging.clock import iso_time
from charging.jump_rows import jump_rows
from charging.review.check import Review
from charging.review.nominal import Cell
from charging.surroundings import Surroundings


def timeline_rows(epoch: datetime, cells: Sequence[Cell]) -> list[dict[str, Any]]:
    """Eclipses, events and intervals of modes as plain values."""
    found = []
    for cell in cells:
        for what, start_s, end_s in _spans(cell):
            found.append(
                {
                    "run": f"{cell.scene.mode}, {cell.scene.plasma}",
                    "what": what,
                    "from": iso_time(epoch, start_s),
                    "to": iso_time(epoch, end_s),
                }
            )
    return found


def _spans(cell: Cell) -> Iterator[tuple[str, float, float]]:
    around = cell.run.around
    for e in around.eclipses:
        if e.umbra_start is not None and e.umbra_end is not None:
            minutes = (e.umbra_end - e.umbra_start) / 60.0
            yield (
                f"umbra of the {e.body.capitalize()}, {minutes:.1f} min",
                e.umbra_start,
                e.umbra_end,
            )
    for event in around.episodes:
        name = cell.run.plasmas[event.plasma].name
        yield (
            f"plasma event {name}, then decay",
            event.onset_s,
            event.onset_s + event.rise_s + event.hold_s,
        )
    for leg in cell.run.way.legs:
        if leg.modes:
            yield f"mode {', '.join(leg.modes)}", leg.start_s, leg.end_s


def region_rows(epoch: datetime, end_s: float, cells: Sequence[Cell]) -> list[dict[str, Any]]:
    """Stretches of the runs in which one region has the largest share."""
    found = []
    for cell in cells:
        for name, start, end in _regions(cell.run.around, end_s):
            found.append(
                {
                    "run": f"{cell.scene.mode}, {cell.scene.plasma}",
                    "region": name,
                    "from": iso_time(epoch, start),
                    "to": iso_time(epoch, end),
                    "lasts_s": end - start,
                }
            )
    return found


def _regions(around: Surroundings, end_s: float) -> Iterator[tuple[str, float, float]]:
    along = around.along
    if along is None:
        return
    edges = sorted({0.0, end_s, *(b for b in along.breaks_s if 0.0 < b < end_s)})
    begun, name = 0.0, ""
    for start, end in pairwise(edges):
        here = along.name_at(0.5 * (start + end))
        if here != name:
            if name:
                yield name, begun, start
            begun, name = start, here
    yield name, begun, end_s


def governing_jumps(review: Review) -> list[dict[str, Any]]:
    """Branch jumps of the nominal runs that govern a limit."""
    places = {
        (row.nominal.cell, row.nominal.variant) for row in review.rows if not row.corner.trivial
    }
    found = []
    for c, v in sorted(places):
        cell = review.cells[c]
        variant = cell.variants[v]
        for row in jump_rows(review.loaded, cell.run, v):
            place = {"mode": cell.scene.mode, "plasma": cell.scene.plasma}
            found.append({**row, **place, "age": variant.age, "collection": variant.collection})
    return found


def barriers_of(review: Review) -> dict[str, Any]:
    """Whether barriers in front of surfaces were worked out, how, and where not."""
    case = review.loaded.case
    on = any(cell.run.balance.barriers is not None for cell in review.cells)
    without = list(without_barrier(case)) if on else []
    if not case.body.barrier:
        text = (
            "Barriers in front of surfaces are off (barrier = false): what negative neighbours "
            "hold back of photo- and secondary electrons is left out."
        )
    elif not on:
        text = "No barriers: all surfaces stand at one potential or have no fixed place."
    elif case.shape:
        text = "Barriers in front of surfaces are those of the shapes (Laplace's equation)."
    else:
        text = (
            f"Barriers in front of surfaces are those of caps on a sphere of "
            f"{case.body.radius_m:g} m (Laplace's equation)."
        )
    if without:
        text += f" No barrier is worked out for {', '.join(without)}: they turn or have no normal."
    return {"on": on, "without": without, "text": text}


def shape_numbers(review: Review) -> dict[str, Any] | None:
    """Numbers about the shapes of a case; None without any."""
    if not review.loaded.case.shape:
        return None
    from charging.shape.account import geometry_account  # costs time only with shapes

    return geometry_account(review.loaded.case)
