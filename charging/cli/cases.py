"""Commands about case files: a commented start, a check, the schema."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Annotated

import typer

from charging.cli.output import print_json
from charging.cli.runs import AllowOutside, CaseFile

app = typer.Typer(
    help="Start, check and describe case files.",
    pretty_exceptions_enable=False,
    no_args_is_help=True,
)


@app.command(epilog="Example: halflit case new my_case.toml")
def new(
    file: Annotated[
        Path | None,
        typer.Argument(metavar="FILE", show_default=False, help="File to write, as --out."),
    ] = None,
    out: Annotated[
        Path | None,
        typer.Option("--out", show_default=False, help="File to write [default: print it]."),
    ] = None,
    force: Annotated[bool, typer.Option("--force", help="Replace the file if it exists.")] = False,
) -> None:
    """Print a commented case to start from, or write it to a file.

    Exit 0 done, 2 the file exists or cannot be written.
    """
    from charging.case_template import CASE_TEMPLATE
    from charging.errors import InputError

    if file is not None and out is not None:
        raise InputError("FILE and --out are given; give one of them")
    out = file if out is None else out
    if out is None:
        print(CASE_TEMPLATE, end="")
        return
    from charging.written_file import written_file

    with written_file(out, option="--out", force=force) as scratch:
        scratch.write_text(CASE_TEMPLATE, encoding="utf-8")
    print(f"wrote {out}", file=sys.stderr)


@app.command(epilog="Example: halflit case check cases/geo_substorm_day.toml")
def check(case: CaseFile, allow_outside: AllowOutside = False) -> None:
    """Read a case and everything it names; say what it holds or what is wrong.

    Exit 0 usable, 2 not.
    """
    from charging.case import load_case

    found = load_case(case, allow_outside=allow_outside).case
    parts = [
        _count(len(found.surface), "surface"),
        _count(1 + len(found.mode), "mode"),
        _count(len(found.plasma.event), "plasma event"),
        f"{found.duration_s / 3600.0:g} h",
    ]
    print(f"{case}: ok, {', '.join(parts)}")


@app.command(epilog="Example: halflit case schema > case.schema.json")
def schema() -> None:
    """Print the JSON schema of a case file.

    Keys with units only; checks between keys and bare keys with a unit text are not part of it.
    """
    from charging.case import case_schema

    print_json(case_schema())


def _count(number: int, what: str) -> str:
    return f"{number} {what}{'' if number == 1 else 's'}"
