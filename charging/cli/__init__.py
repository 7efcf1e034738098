"""The command line. Loads only the standard library and typer until a command runs."""

from __future__ import annotations

import os
import sys
from typing import Annotated

import typer

import charging.cli.cases as cases
import charging.cli.questions as questions
import charging.cli.runs as runs
from charging import __version__

app = typer.Typer(
    name="halflit",
    help="Estimate how the outside of a spacecraft charges along its orbit.",
    epilog="An estimate: program requirements, applicable standards and qualified specialists "
    "decide. Crewed use needs its own safety process.",
    pretty_exceptions_enable=False,
    no_args_is_help=True,
    add_completion=False,
)


def _version(wanted: bool) -> None:
    if wanted:
        print(f"halflit {__version__}")
        raise typer.Exit


@app.callback()
def _root(
    version: Annotated[
        bool,
        typer.Option("--version", callback=_version, is_eager=True, help="Print the version."),
    ] = False,
) -> None:
    pass


runs.register(app)
questions.register(app)
app.add_typer(cases.app, name="case")


def main() -> None:
    """Run the command line and leave with an exit code.

    0 done, 1 a limit exceeded (review), 2 bad input, 3 no numerical solution,
    4 not assessable (review), 130 interrupted.
    """
    from charging.errors import HalflitError, NoSolutionError

    try:
        app()
    except HalflitError as error:
        print(f"error: {error}", file=sys.stderr)
        sys.exit(3 if isinstance(error, NoSolutionError) else 2)
    except BrokenPipeError:
        # the reader of a pipe has gone: say nothing, and keep the exit handler from saying it
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        sys.exit(0)
    except KeyboardInterrupt:
        print("interrupted", file=sys.stderr)
        sys.exit(130)
