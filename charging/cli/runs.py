"""Commands that run a case and draw its result: run, plot."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from charging.cli.output import one_line, print_json, print_table, volts

if TYPE_CHECKING:
    from charging.orbit_run import CaseRun

CaseFile = Annotated[
    Path,
    typer.Argument(
        metavar="CASE",
        show_default=False,
        help="Case file (TOML); start one with 'halflit case new'.",
    ),
]
CaseOrResult = Annotated[
    Path,
    typer.Argument(
        metavar="CASE|RESULT", show_default=False, help="Case file, result folder or result.nc."
    ),
]
OutDir = Annotated[
    Path | None,
    typer.Option("--out", show_default=False, help="Result folder [default: ./<case file stem>/]."),
]
AllowOutside = Annotated[
    bool, typer.Option("--allow-outside", help="Let the case name files outside its own folder.")
]
Json = Annotated[bool, typer.Option("--json", help="Print JSON instead of a table.")]
Quick = Annotated[
    bool,
    typer.Option("--quick", help="Balance of currents at some moments only; no files, no verdict."),
]

MOST_ECLIPSES = 20
"""More are counted, not printed."""

SLOW_S = 2.0
"""A run that lasts longer says so, on a terminal only."""


def register(app: typer.Typer) -> None:
    """Add the commands to the application."""
    app.command(epilog="Example: halflit run cases/geo_substorm_day.toml --out day1")(run)
    app.command(epilog="Example: halflit plot day1 --out pictures")(plot)


def run(
    case: CaseFile,
    out: OutDir = None,
    allow_outside: AllowOutside = False,
    quick: Quick = False,
    json: Json = False,
) -> None:
    """Run a case along its orbit; write potentials, plots and a verdict.

    Exit 0 computed (the verdict is printed), 2 bad input, 3 no solution.
    """
    from charging.case import load_case

    if quick:
        from charging.cli.quick import print_quick_look
        from charging.errors import InputError

        if out is not None:
            raise InputError("--out: a quick look writes nothing; leave out --out or --quick")
        print_quick_look(load_case(case, allow_outside=allow_outside), json=json)
        return
    from charging.orbit_run import CaseRun, solve_mode
    from charging.result_folder import check_target
    from charging.results import write_results

    loaded = load_case(case, allow_outside=allow_outside)
    target = Path(case.stem) if out is None else out
    check_target(target)
    began = time.monotonic()
    modes = []
    for mode in (None, *loaded.case.alternatives):
        modes.append(solve_mode(loaded, mode))
        if time.monotonic() - began > SLOW_S and sys.stderr.isatty():
            print(f"solved mode {modes[-1].name!r}", file=sys.stderr)
    result = CaseRun(loaded, tuple(modes))
    document = write_results(result, target)
    if json:
        print_json(document)
        return
    _print_run(result, document)
    print(f"\nWritten to {target}{'/' if not str(target).endswith('/') else ''}")


def plot(
    result: Annotated[
        Path,
        typer.Argument(metavar="RESULT", show_default=False, help="Result folder or result.nc."),
    ],
    out: Annotated[
        Path | None,
        typer.Option("--out", show_default=False, help="Folder for the PNGs [default: beside]."),
    ] = None,
) -> None:
    """Redraw the plots of a result from its file alone."""
    import os

    from charging.dataset import read_result
    from charging.errors import InputError
    from charging.plots import plot_all

    dataset = read_result(result)
    folder = out if out is not None else (result if result.is_dir() else result.parent)
    try:
        for picture in plot_all(dataset, folder):
            print(picture)
    except OSError as error:
        reason = os.strerror(error.errno) if error.errno else str(error)
        raise InputError(f"--out {folder}: cannot be written ({reason})") from error


def _value(value: float, unit: str, *, sign: bool = True) -> str:
    if unit != "V":
        return f"{value:{'+' if sign else ''}.2e} V/m"
    return f"{volts(value) if sign else f'{value:g}'} V"


def _print_run(result: CaseRun, document: dict[str, Any]) -> None:
    print(one_line(document["title"]))
    for mode in document["modes"]:
        if len(document["modes"]) > 1:
            print(f"\nMode: {mode['mode']}")
        _print_mode(mode, _clock(result))
    laws = document["laws"]
    if len(laws) > 1:
        print(
            f"\nThe table takes the worse of the secondary-emission laws {' and '.join(laws)}; the "
            f"plots show {laws[0]}. Each law has a result file of its own."
        )
    for warning in document["warnings"]:
        print(f"Note: {warning}.")
    from charging.array_strings import SPECIALIST_V, array_voltage_V

    # no unqualified pass for arrays of a high voltage
    high = array_voltage_V(result.loaded.case) > SPECIALIST_V
    more = f"; array above {SPECIALIST_V:g} V: specialist review" if high else ""
    print(f"\nVerdict: {document['verdict']}{more}")
    _print_caution()


def _clock(result: CaseRun) -> Callable[[str], str]:
    """How the table writes a time: hh:mm:ss of one day, elapsed without an orbit, else a date."""
    from datetime import datetime

    case = result.loaded.case
    if case.orbit.kind == "fixed":

        def elapsed(text: str) -> str:
            at = text.replace(":60Z", ":59Z")  # a leap second is not shown
            whole = round((datetime.fromisoformat(at) - case.epoch).total_seconds())
            return f"{whole // 3600}:{whole // 60 % 60:02d}:{whole % 60:02d}"

        return elapsed
    if case.duration_s > 86400.0:
        return lambda text: text[5:19].replace("T", " ")
    return lambda text: text[11:19]


def _print_mode(mode: dict[str, Any], clock: Callable[[str], str]) -> None:
    def when(row: dict[str, Any], side: str) -> str:
        time = row[f"worst_{side}_time"]
        return "-" if time is None else clock(time)

    def size(row: dict[str, Any], side: str) -> str:
        return "-" if row[f"worst_{side}_time"] is None else told(row[f"worst_{side}_V"])

    def told(value: float | None) -> str:
        return "not assessable" if value is None else volts(value)

    rows = []
    for row in mode["surfaces"]:
        known = [limit for limit in row["limits"] if limit["margin"] is not None] or row["limits"]
        tight = min(known, key=lambda limit: (limit["margin"] or 0.0) / limit["allowed"])
        rows.append(
            (
                row["surface"],
                row["material"],
                told(row["lowest_V"]),
                told(row["highest_V"]),
                size(row, "normal"),
                when(row, "normal"),
                size(row, "inverted"),
                when(row, "inverted"),
                {"normal": "-", "inverted": "+", "field": ""}[tight["kind"]]
                + _value(tight["allowed"], tight["unit"], sign=False),
                "-" if tight["margin"] is None else _value(tight["margin"], tight["unit"]),
                f"{row['verdict']}, bonded" if row["bonded"] else row["verdict"],
            )
        )
    print_table(
        rows,
        (
            "surface",
            "material",
            "lowest\nV",
            "highest\nV",
            "below\nstructure V",
            "\nat",
            "above\nstructure V",
            "\nat",
            "tightest\nlimit",
            "margin",
            "verdict",
        ),
        "llrrrrrrrrl",
    )
    structure = mode["structure"]
    print(
        f"structure: {volts(structure['lowest_V'])} V at {clock(structure['lowest_time'])} to "
        f"{volts(structure['highest_V'])} V at {clock(structure['highest_time'])}"
    )
    for eclipse in mode["eclipses"][:MOST_ECLIPSES]:
        if not eclipse["umbra_s"] and eclipse["penumbra_start"] and eclipse["penumbra_end"]:
            print(
                f"partial eclipse by the {eclipse['body']} {clock(eclipse['penumbra_start'])} to "
                f"{clock(eclipse['penumbra_end'])} UTC"
            )
        if eclipse["umbra_start"] and eclipse["umbra_end"]:
            print(
                f"umbra {clock(eclipse['umbra_start'])} to {clock(eclipse['umbra_end'])} UTC "
                f"({eclipse['umbra_s'] / 60.0:.1f} min)"
            )
    if len(mode["eclipses"]) > MOST_ECLIPSES:
        print(f"and {len(mode['eclipses']) - MOST_ECLIPSES} further eclipses: see summary.json")
    if not mode["eclipses"]:
        steady = mode["steady_after_s"]
        print(
            "not steady at the end of the run"
            if steady is None
            else f"steady: within 1 V or 1 % of the last value after {steady:.0f} s"
        )
    for text in mode["sentences"]:
        print(f"- {text}")
    for fix, surfaces in mode["first_fixes"].items():
        print(f"First fix to try on {', '.join(surfaces)}: {fix}.")


def _print_caution() -> None:
    print(
        "An estimate: program requirements, applicable standards and qualified specialists "
        "decide.\nNot modelled: internal charging, discharge transients, plumes, electron "
        "exchange between surfaces,\nsurface conduction."
    )
