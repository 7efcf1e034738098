"""Commands of a design review: review and compare."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from charging.cli.output import one_line, print_json, print_table, volts
from charging.cli.runs import AllowOutside, CaseOrResult, Json

if TYPE_CHECKING:
    from charging.review.check import Options, Review

EXIT = {"within": 0, "exceeded": 1, "not assessable": 4}
MOST_WORKERS = 2

Side = Annotated[
    Path,
    typer.Argument(show_default=False, help="Case file, result folder, result.nc or review.json."),
]
Workers = Annotated[
    int | None,
    typer.Option(
        "--workers", min=1, max=64, show_default=False, help="Processes [default: up to 2]."
    ),
]


def register(app: typer.Typer) -> None:
    """Add the commands to the application."""
    app.command(epilog="Example: halflit review cases/geo_static_worst_case.toml --out review1")(
        review
    )
    app.command(epilog="Example: halflit compare before.toml after.toml")(compare)


def review(
    case: CaseOrResult,
    out: Annotated[
        Path | None,
        typer.Option(
            "--out",
            show_default=False,
            help="Folder for report.html and review.json [default: ./<case file stem>/, or the "
            "result folder].",
        ),
    ] = None,
    fixes: Annotated[
        bool, typer.Option("--fixes/--no-fixes", help="Look for fixes of exceeded limits.")
    ] = True,
    corners: Annotated[
        bool | None,
        typer.Option(
            "--corners/--no-corners",
            show_default=False,
            help="Run the spreads of properties; nothing is within without them "
            "[default: yes, unless the plasma changes along the orbit].",
        ),
    ] = None,
    workers: Workers = None,
    allow_outside: AllowOutside = False,
    json: Json = False,
) -> None:
    """Check every surface against its limits in every mode, plasma and age of a case.

    The folder of a finished sweep gives its probabilistic verdict. Exit 0 all within, 1 a limit
    exceeded, 4 not assessable, 2 bad input, 3 no solution.
    """
    from charging.review.check import load_case_or_result, review_case
    from charging.review.document import review_document
    from charging.review.files import review_target, write_review

    if case.is_dir():
        _leave_if_sweep(case, json=json)
    loaded = load_case_or_result(case, allow_outside=allow_outside)
    target = review_target(case, out)
    options = _options(workers, fixes=fixes, corners=corners)
    found = review_case(loaded, options)
    if options.progress is not None:
        print(file=sys.stderr)
    document = review_document(found)
    write_review(found, document, target)
    if json:
        print_json(document)
    else:
        _print_review(found, document)
        print(f"\nWritten to {target}{os.sep}: report.html, review.json")
    raise typer.Exit(EXIT[found.verdict])


def _options(workers: int | None, *, fixes: bool, corners: bool | None = None) -> Options:
    from charging.errors import printable
    from charging.review.check import Options

    def note(text: str) -> None:
        print(f"note: {printable(text)}", file=sys.stderr, flush=True)

    return Options(
        fixes=fixes,
        workers=workers or usual_workers(),
        progress=_told(),
        notes=note,
        corners=corners,
    )


def _leave_if_sweep(folder: Path, *, json: bool) -> None:
    """Print the verdict of a sweep and leave; go on where the folder is none."""
    from charging.study.verdict import is_sweep, overall_verdict, sweep_review

    if not is_sweep(folder):
        return
    document = sweep_review(folder)
    verdict = overall_verdict(document["rows"])
    if json:
        print_json({"verdict": verdict, **document})
    else:
        from charging.cli.sweeps import print_sweep_review

        print_sweep_review(document)
        print(f"\nVerdict on the first choice: {verdict}")
    raise typer.Exit(EXIT[verdict])


def _told() -> Callable[[int, int], None] | None:
    """Count runs on a terminal; nothing elsewhere."""
    if not sys.stderr.isatty():
        return None

    def tell(done: int, planned: int) -> None:
        print(f"\r{done} of {planned} runs or more", end="", file=sys.stderr, flush=True)

    return tell


def usual_workers() -> int:
    """Processes where none are asked for: two, or one on a single core."""
    return min(MOST_WORKERS, len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity")
               else os.cpu_count() or 1)  # fmt: skip


def _print_review(found: Review, document: dict[str, Any]) -> None:
    print(one_line(document["title"]))
    print_table(
        [
            (
                row["surface"],
                row["against"],
                row["kind"],
                _value(row["nominal_value"], row["unit"]),
                _maybe(row["corner_value"], row["unit"]),
                _value(row["allowed"], row["unit"], sign=False),
                _value(row["margin"], row["unit"]),
                "-" if row["margin_dB"] is None else f"{row['margin_dB']:+.1f}",
                row["mode"],
                row["plasma"],
                row["age"],
                row["time"] or "-",
                row["verdict"],
            )
            for row in document["limits"]
        ],
        (
            "surface",
            "against",
            "kind",
            "nominal",
            "corner",
            "allowed",
            "margin",
            "margin\ndB",
            "mode",
            "plasma",
            "age",
            "time (UTC)",
            "verdict",
        ),
        "lllrrrrrlllll",
    )
    for scene in document["scenes"]:
        print(f"\n{scene['mode']}, plasma {scene['plasma']}: {scene['sheath']['text']}.")
    draws = found.ensemble
    if not found.searched:
        print(
            "\nSpreads of properties were not run, so nothing is called within and no fixes were "
            "looked for."
        )
    else:
        print(
            f"\nCorner: every property at the end of its spread that makes the limit worse, "
            f"checked by {draws.draws} draws\n(seed {draws.seed}) in every governing combination; "
            f"{document['members']} runs in all. Laws: exponential and E^-0.67, the worse governs."
        )
    for text in document["sentences"]:
        print(f"\n- {text}")
    if found.fixes is not None and found.fixes.single:
        _print_fixes(document["fixes"])
    print(f"\nVerdict: {found.verdict}")
    for text in found.qualifications:
        print(f"With it: {text}.")
    for text in document["cautions"][:2]:
        print(text)
    print(f"Not modelled: {', '.join(document['not_modelled'])}.")


def _print_fixes(fixes: dict[str, Any]) -> None:
    print("\nFixes, each run in every mode and plasma (severity: value over limit):")
    print_table(
        [
            (
                fix["surface"],
                fix["family"],
                f"{fix['severity_before']:.2f}",
                "-" if fix["severity_after"] is None else f"{fix['severity_after']:.2f}",
                fix["status"],
                fix["text"],
            )
            for fix in fixes["single"]
        ],
        ("surface", "family", "before", "after", "status", "change"),
        "llrrll",
    )
    for fix in fixes["single"]:
        if fix["worsens"]:
            print(f"- rejected, {fix['text']}: worsens {'; '.join(fix['worsens'])}")
    print(f"\n{fixes['answer']}")


def _value(value: float, unit: str, *, sign: bool = True) -> str:
    if unit == "J":
        return f"{1e3 * value:.3g} mJ"
    if unit != "V":
        return f"{value:{'+' if sign else ''}.2e} V/m"
    return f"{volts(value) if sign else f'{value:g}'} V"


def compare(
    before: Side,
    after: Side,
    workers: Workers = None,
    allow_outside: AllowOutside = False,
    json: Json = False,
) -> None:
    """Compare two reviews: what changed in the inputs, what moved in the verdict.

    A review.json is used where it belongs to the inputs and this program; else the review runs.
    """
    from charging.review.compare import compare as compared
    from charging.review.compare import reviewed

    options = _options(workers, fixes=False)
    sides = [
        reviewed(path, allow_outside=allow_outside, options=options) for path in (before, after)
    ]
    if options.progress is not None:
        print(file=sys.stderr)
    document = compared(sides[0], sides[1])
    if json:
        print_json(document)
        return
    if document["inputs"]:
        print_table(
            [
                (row["input"], _short(row["before"]), _short(row["after"]))
                for row in document["inputs"]
            ],
            ("input", "before", "after"),
            "lll",
        )
    else:
        print("Inputs are the same.")
    print()
    if document["limits"]:
        print_table(
            [
                (
                    row["surface"],
                    row["against"],
                    row["kind"],
                    _maybe(row["before"], row["unit"]),
                    _maybe(row["after"], row["unit"]),
                    row["verdict_before"] or "-",
                    row["verdict_after"] or "-",
                )
                for row in document["limits"]
            ],
            ("surface", "against", "kind", "before", "after", "verdict\nbefore", "\nafter"),
            "lllrrll",
        )
    print(f"{document['unmoved']} limits did not move.")
    print(f"Verdict: {document['verdict']['before']} -> {document['verdict']['after']}")


def _maybe(value: float | None, unit: str) -> str:
    return "-" if value is None else _value(value, unit)


def _short(value: object) -> str:
    from charging.errors import printable

    if isinstance(value, float):
        return f"{value:.6g}"
    text = "-" if value is None else printable(str(value))
    return text if len(text) <= 60 else f"{text[:57]}..."
