"""The command that recomputes every published figure the models are checked against."""

from __future__ import annotations

from typing import TYPE_CHECKING

import typer

from charging.cli.output import print_json, print_table
from charging.cli.runs import Json

if TYPE_CHECKING:
    from charging.evidence.check import Row


def register(app: typer.Typer) -> None:
    """Add the command to the application."""
    app.command(epilog="Example: halflit evidence --json > evidence.json")(evidence)


def evidence(json: Json = False) -> None:
    """Published figures beside ours, recomputed now: for a verification report.

    Rows count where the figure stands in a source seen or in closed form and owes nothing to
    the model; the others are listed apart. Exit 0 when every counted row agrees, 3 when one
    does not.
    """
    from dataclasses import asdict
    from math import isfinite

    from charging.evidence.rows import evidence as recomputed

    rows = recomputed()
    if json:
        print_json(
            [
                {
                    key: None if isinstance(value, float) and not isfinite(value) else value
                    for key, value in asdict(row).items()
                }
                for row in rows
            ]
        )
    else:
        _print(rows)
    if not all(row.ok for row in rows if row.counted):
        raise typer.Exit(3)


def _print(rows: list[Row]) -> None:
    groups = (
        ("counted", [row for row in rows if row.counted]),
        (
            "not counted: figures from memory, calibrations, shared inputs",
            [row for row in rows if not row.counted],
        ),
    )
    for title, group in groups:
        print(title)
        print_table(
            [
                (
                    row.quantity,
                    f"{row.published:.6g}",
                    f"{row.ours:.6g}",
                    row.unit,
                    _size(row.deviation, row),
                    _size(row.tolerance, row),
                    row.basis,
                    "agrees" if row.ok else "DIFFERS",
                    row.source,
                )
                for row in group
            ],
            ("quantity", "published", "ours", "unit", "off by", "allowed", "basis", "", "source"),
            "lrrlrrlll",
        )
        print()
    counted = groups[0][1]
    print(
        f"{sum(row.ok for row in counted)} of {len(counted)} counted rows agree, "
        f"{sum(row.ok for row in groups[1][1])} of {len(groups[1][1])} of the others."
    )


def _size(value: float, row: Row) -> str:
    if row.measure == "factor":
        return f"x{value:.3g}"
    if row.measure == "absolute":
        return f"{value:.2g} {row.unit}" if row.unit != "1" else f"{value:.2g}"
    return f"{100.0 * value:.2g} %"
