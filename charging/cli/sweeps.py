"""The command that solves a study: coatings and uncertain numbers over many members."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from charging.cli.output import one_line, print_json, print_table
from charging.cli.runs import AllowOutside, Json

if TYPE_CHECKING:
    from charging.study.report import SweepReport
    from charging.study.sweep import Progress

Study = Annotated[
    Path, typer.Argument(metavar="STUDY", show_default=False, help="Study file (TOML).")
]
OutDir = Annotated[
    Path | None,
    typer.Option("--out", show_default=False, help="Folder [default: ./<study file stem>/]."),
]
MOST_ROWS = 30


def register(app: typer.Typer) -> None:
    """Add the command to the application."""
    app.command(epilog="Example: halflit sweep cases/radiator_coatings_study.toml --workers 2")(
        sweep
    )


def sweep(
    study: Study,
    out: OutDir = None,
    resume: Annotated[bool, typer.Option("--resume", help="Go on with a stopped sweep.")] = False,
    workers: Annotated[int, typer.Option(min=1, max=1024, help="Processes.")] = 1,
    scheduler: Annotated[
        str | None,
        typer.Option(
            metavar="ADDRESS",
            show_default=False,
            help="Dask scheduler, or 'local'. It runs code: trusted networks only.",
        ),
    ] = None,
    allow_outside: AllowOutside = False,
    json: Json = False,
) -> None:
    """Vary coatings and numbers of a case, and rank the choices against its limits.

    Writes blocks as they finish, then sweep.nc, ranking.json, ranking.csv and pictures. Ctrl-C
    keeps finished blocks. Exit 0 done, 2 bad input, 130 interrupted.
    """
    from charging.study.hands import hands_of
    from charging.study.plan import load_study
    from charging.study.report import report_sweep
    from charging.study.sweep import sweep as solve

    plan = load_study(study, allow_outside=allow_outside)
    folder = Path(study.stem) if out is None else out
    quiet = json or not sys.stderr.isatty()
    try:
        with hands_of(plan, workers, scheduler) as hands:
            store = solve(plan, folder, resume=resume, hands=hands, tell=None if quiet else _tell)
            report = report_sweep(plan, store, hands)
    except KeyboardInterrupt:
        print(
            f"\nFinished blocks stay in {folder}. Go on with the same command and --resume.",
            file=sys.stderr,
        )
        raise
    if json:
        print_json(report.document)
        return
    _print(plan.file.title, report, str(folder), plan.file.confidence)


def _tell(progress: Progress) -> None:
    if progress.rate_per_s > 0.0:
        speed = f", {progress.rate_per_s:.3g} per second, {progress.left_s:.0f} s left"
    else:
        speed = " were there"
    print(
        f"\r{progress.done} of {progress.members} members{speed}      ",
        end="" if progress.done < progress.members else "\n",
        file=sys.stderr,
        flush=True,
    )


def _print(title: str, report: SweepReport, folder: str, confidence: float) -> None:
    document = report.document
    print(f"{one_line(title)}: {document['members']} members, {document['draws']} per choice")
    print(f"({document['conditional_on']})\n")
    print_ranking(document)
    print(f"For a verdict: halflit review {folder}")
    if report.indices:
        print(f"\nSobol indices of {report.studied.choice}, {100 * confidence:g} % intervals")
        print_table(
            [
                (
                    one.factor,
                    f"{one.first:.2f} ± {one.first_half_width:.2f}",
                    f"{one.total:.2f} ± {one.total_half_width:.2f}",
                )
                for one in report.indices
            ],
            ("factor", "first order", "total"),
            "lrr",
        )
    worst = document["worst_case"]
    if worst is not None:
        of = f" of {report.studied.choice}" if len(report.rows) > 1 else ""
        print(
            f"\nworst case{of} found: {worst['limit']} {worst['value']:+.4g}, "
            f"{worst['severity']:.2f} times what is allowed, at"
        )
        for path, value in worst["at"].items():
            print(f"  {path} = {value:.4g}")
        print(
            f"({worst['evaluations']} evaluations, {worst['agreeing_starts']} of "
            f"{worst['starts']} starts within 1 % of it"
            + ("" if worst["converged"] else "; stopped by the number of evaluations")
            + ")"
        )
    pictures = "heat_map.png, drivers.png" if report.studied.drivers else "heat_map.png"
    print(f"\n{folder}/: sweep.nc, ranking.json, ranking.csv, {pictures}")


def print_ranking(document: dict[str, Any]) -> None:
    """Print the choices of a ranking in order."""
    drawn = document["draws"] > 1
    rows = document["rows"]
    percent = f"{100.0 * document['confidence']:g} %"
    table = []
    for number, row in enumerate(rows[:MOST_ROWS], 1):
        known = [
            str(number),
            row["choice"],
            f"{row['worst_V']:+.0f}" if row["worst_V"] else "0",
            f"{row['kind']}, {row['surface']}" if row["worst_V"] else "-",
        ]
        if drawn:
            known += [
                f"{row['exceed_probability']:.3g}",
                f"{row['interval'][0]:.3g} to {row['interval'][1]:.3g}",
                row["kept_with_confidence"],
                row["driver"] or "-",
            ]
        else:
            known.append("exceeded" if row["exceed_probability"] else "kept")
        table.append(tuple(known))
    heads: tuple[str, ...] = ("rank", "choice", "worst\nV", "worst differential")
    if drawn:
        heads += (
            "exceeds\na limit",
            f"interval\n{percent}",
            f"keeps limits\nwith {percent}",
            "driven by",
        )
        print_table(table, heads, "rlrlrlll")
    else:
        print_table(table, (*heads, "limits"), "rlrll")
    if len(rows) > MOST_ROWS:
        print(f"... and {len(rows) - MOST_ROWS} more in ranking.csv")
    if drawn:
        kept = [row["choice"] for row in rows if row["kept_with_confidence"] == "yes"]
        answer = "; ".join(kept[:MOST_ROWS]) if kept else "none of the choices"
        print(f"\nWithin limits with {percent} confidence: {answer}.")
        print("Probabilities are conditional on assumed spreads.")
    if document["failed"]:
        print(f"{document['failed']} members found no solution and count as exceeding.")


def print_sweep_review(document: dict[str, Any]) -> None:
    """Print what a review says of a finished sweep."""
    title = one_line(document["title"])
    print(f"{title}: {document['members']} members, {document['draws']} per choice")
    print(f"({document['conditional_on']})\n")
    print_ranking(document)
    for row in document["rows"][:MOST_ROWS]:
        print(f"\n- {row['choice']}: {row['verdict']}: {row['reason']}.")
    for text in document["rows"][0]["qualifications"]:
        print(f"With it: {text}.")
    for text in document["cautions"]:
        print(text)
