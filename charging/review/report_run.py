"""Sections of the report about the runs themselves: timeline, jumps, barriers, shapes."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from charging.review.markup import Child, element, items, table
from charging.review.narrative import law_name, plain_time, shown
from charging.review.scenes import AGES

MOST_ROWS = 40
"""Rows of a table after which it says how many there are more."""


def timeline(document: Mapping[str, Any]) -> Child:
    """Eclipses, events, intervals of modes and regions of every run."""
    rows, regions = document["timeline"], document["regions"]
    parts: list[Child] = []
    if rows:
        parts += _long(
            "Eclipses, events and intervals",
            ("run", "what", "from", "to"),
            [(r["run"], r["what"], plain_time(r["from"]), plain_time(r["to"])) for r in rows],
        )
    else:
        parts.append(element("p", "No eclipse, event or interval of a mode in any run."))
    if not regions:
        return parts
    span: dict[tuple[str, str], list[float]] = {}
    for r in regions:
        span.setdefault((r["run"], r["region"]), []).append(r["lasts_s"])
    whole: dict[str, float] = {}
    for (run, _), lengths in span.items():
        whole[run] = whole.get(run, 0.0) + sum(lengths)
    parts.append(
        table(
            "Regions of the plasma: where a run spends its time",
            ("run", "region", "share of the run", "visits"),
            [
                (run, region, f"{sum(lengths) / whole[run]:.1%}", str(len(lengths)))
                for (run, region), lengths in span.items()
            ],
            numbers=(2, 3),
        )
    )
    parts += _long(
        "Regions in time, each while it has the largest share",
        ("run", "region", "from", "to"),
        [(r["run"], r["region"], plain_time(r["from"]), plain_time(r["to"])) for r in regions],
    )
    return parts


def _long(caption: str, head: Sequence[str], rows: Sequence[Sequence[Child]]) -> list[Child]:
    """Write a table whose rows end at some number, and say so."""
    parts: list[Child] = [table(caption, head, rows[:MOST_ROWS])]
    if len(rows) > MOST_ROWS:
        parts.append(element("p", f"And {len(rows) - MOST_ROWS} more, in review.json."))
    return parts


def jumps(document: Mapping[str, Any]) -> Child:
    """Jumps between branches in the runs that govern."""
    rows = document["jumps"]
    if not rows:
        return element("p", "No potential jumps between branches in the runs that govern a limit.")
    return [
        element(
            "p",
            "A jump: the equilibrium that a potential followed ceases to exist, and the potential "
            "runs to another. Near one, small changes of a property move the result much.",
        ),
        *_long(
            "Jumps between branches, in the runs that govern a limit at the values of the records",
            ("surface", "when", "before", "after", "lasts", "mode, plasma, age", "law"),
            [
                (
                    r["surface"],
                    plain_time(r["time"]),
                    shown(r["before_V"], "V"),
                    shown(r["after_V"], "V"),
                    f"{r['lasts_s']:.3g} s",
                    f"{r['mode']}, {r['plasma']}, {AGES[r['age']]}",
                    law_name(r["law"]),
                )
                for r in rows
            ],
        ),
    ]


def geometry(document: Mapping[str, Any]) -> Child:
    """Barriers, and shapes in numbers."""
    barrier, account = document["barriers"], document["geometry"]
    parts: list[Child] = [element("p", barrier["text"])]
    if account is None:
        return parts
    whole = account["whole"]
    parts += [
        table(
            "Surfaces on the shapes",
            ("surface", "area (m²)", "capacitance (pF)", "barrier at -1 kV around (V)",
             "least lit share", "neighbours"),
            [
                (
                    row["surface"],
                    f"{row['area_m2']:.3g}",
                    f"{row['capacitance_pF']:.3g}",
                    f"{1000.0 * row['barrier_share']:.0f}",
                    "–" if row["least_lit_share"] is None else f"{row['least_lit_share']:.0%}",
                    ", ".join(row["neighbours"]) or "none",
                )
                for row in account["surfaces"]
            ],
            numbers=(1, 2, 3, 4),
            classes="long",
        ),
        items(
            [
                f"{whole['panels']} panels, {whole['area_m2']:.3g} m², of which "
                f"{whole['bare_area_m2']:.3g} m² bare structure that collects nothing",
                f"capacitance to space {whole['capacitance_pF']:.4g} pF, that of a sphere of "
                f"{whole['radius_m']:.3g} m",
            ]
        ),
    ]  # fmt: skip
    return parts
