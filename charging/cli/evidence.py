"""The command that recomputes every published figure the models are checked against."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from charging.cli.options import wrote
from charging.cli.output import print_json, print_table
from charging.cli.runs import Json

if TYPE_CHECKING:
    from charging.evidence.check import Row


def register(app: typer.Typer) -> None:
    """Add the command to the application."""
    app.command(epilog="Example: halflit evidence --json > evidence.json")(evidence)


def evidence(
    json: Json = False,
    html: Annotated[
        Path | None,
        typer.Option("--html", metavar="FILE", show_default=False, help="Page for a report."),
    ] = None,
) -> None:
    """Published figures beside ours, recomputed now: for a verification report.

    Rows count where the figure stands in a source seen or in closed form and owes nothing to
    the model; the others are listed apart. Exit 0 when every counted row agrees, 3 when one
    does not.
    """
    from dataclasses import asdict
    from math import isfinite

    from charging.evidence.rows import evidence as recomputed

    rows = recomputed()
    if html is not None:
        from charging.evidence.page import evidence_page
        from charging.written_file import written_file

        with written_file(html, option="--html") as scratch:
            scratch.write_text(evidence_page(rows), encoding="utf-8")
        wrote(html)
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
    from charging.evidence.page import HEAD, cells, groups, sum_up

    for title, group in groups(rows):
        print(title)
        print_table([cells(row) for row in group], HEAD, "lrrlrrlll")
        print()
    print(sum_up(rows))
