"""The command line. Loads only the standard library and typer until a command runs."""

from __future__ import annotations

import errno
import io
import os
import sys
from typing import Annotated

import typer

import charging.cli.cases as cases
import charging.cli.evidence as evidence
import charging.cli.onsets as onsets
import charging.cli.questions as questions
import charging.cli.reviews as reviews
import charging.cli.runs as runs
import charging.cli.shapes as shapes
import charging.cli.stream as stream
import charging.cli.sweeps as sweeps
from charging import __version__

app = typer.Typer(
    name="halflit",
    help="Estimate how the outside of a spacecraft charges along its orbit.",
    epilog="An estimate: program requirements, applicable standards and qualified specialists "
    "decide. Crewed use needs its own safety process.",
    pretty_exceptions_enable=False,
    no_args_is_help=True,
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
reviews.register(app)
questions.register(app)
onsets.register(app)
shapes.register(app)
evidence.register(app)
sweeps.register(app)
app.add_typer(cases.app, name="case")


def main() -> None:
    """Run the command line and leave with an exit code.

    0 done, 1 a limit exceeded (review), 2 bad input or output, 3 no numerical solution,
    4 not assessable (review), 130 interrupted. A closed pipe is silent and changes nothing.
    """
    for one in (sys.stdout, sys.stderr):
        if isinstance(one, io.TextIOWrapper):  # a locale may lack the letters of a title
            one.reconfigure(errors="backslashreplace")
    sys.stdout = stream.PipeProof(sys.stdout)
    code = _answer()
    try:
        sys.stdout.flush()
    except OSError as error:
        code = _cannot_print(error)
    sys.exit(code)


def _answer() -> int | str | None:
    from charging.errors import HalflitError, NoSolutionError

    try:
        app()
    except SystemExit as leaving:
        return leaving.code
    except HalflitError as error:
        print(f"error: {error}", file=sys.stderr)
        return 3 if isinstance(error, NoSolutionError) else 2
    except KeyboardInterrupt:
        print("interrupted", file=sys.stderr)
        return 130
    except OSError as error:
        if error.errno != errno.ENOSPC:
            raise
        return _cannot_print(error)
    return 0


def _cannot_print(error: OSError) -> int:
    print(f"error: standard output cannot be written ({error.strerror}).", file=sys.stderr)
    # what is left in the buffer must not fail again when the interpreter closes it
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    return 2
