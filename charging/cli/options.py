"""Options and messages that several commands share."""

from __future__ import annotations

import sys
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Annotated

import typer

Cosine = Annotated[
    float, typer.Option("--incidence-cosine", help="Cosine of the angle of sunlight, 0 to 1.")
]
Distance = Annotated[
    float, typer.Option("--distance-au", help="Distance from the Sun [AU], 0.01 to 100.")
]
Activity = Annotated[
    float, typer.Option("--f107", help="Solar radio flux at 10.7 cm [sfu], 50 to 500.")
]
Plot = Annotated[
    Path | None,
    typer.Option("--plot", metavar="FILE", show_default=False, help="Picture: .png, .svg, .pdf."),
]

NAMES_OR_FILES = "Library name, or a file (ends in .toml or holds '/')."
SurfaceState = Annotated[
    str,
    typer.Option(
        "--surface-state",
        metavar="'as recorded'|clean|air-exposed|aged",
        help="State of the surface for photoemission.",
    ),
]
PhotoEscape = Annotated[
    str,
    typer.Option(
        "--photo-escape",
        metavar="auto|planar|'point source'",
        help="How photoelectrons leave a positive surface; auto: by Debye length and --radius-m.",
    ),
]
Flare = Annotated[
    list[str] | None,
    typer.Option(
        "--flare",
        metavar="BAND=FACTOR",
        show_default=False,
        help="Factor on the photons of a band, e.g. X-ray=100; may be given several times.",
    ),
]
Radius = Annotated[
    float, typer.Option("--radius-m", help="Radius of the body [m], above 0, up to 1000.")
]


@contextmanager
def as_options(*positional: str) -> Iterator[None]:
    """Name options instead of the arguments of the Python call in the message of an error.

    Arguments in `positional` keep their name.
    """
    from charging.errors import InputError

    try:
        yield
    except InputError as error:
        if error.file is None and len(error.key) == 1 and error.key[0] not in positional:
            name = str(error.key[0])
            option = "--flare" if name == "band_factors" else f"--{name.replace('_', '-')}"
            error.message = error.message.replace(f"{name} = ", f"{option} ", 1)
        raise


def as_factors(given: list[str] | None) -> dict[str, float]:
    """Return the factors of ``--flare``; InputError for text that is no BAND=FACTOR.

    Examples
    --------
    >>> as_factors(["X-ray=100"])
    {'X-ray': 100.0}
    """
    from charging.errors import InputError, printable

    factors = {}
    for text in given or ():
        band, equals, factor = text.partition("=")
        try:
            factors[band.strip()] = float(factor)
            if not 0.0 <= float(factor) <= 1e6:
                equals = ""
        except ValueError:
            equals = ""
        if not equals:
            raise InputError(
                f'--flare "{printable(text)}": is no BAND=FACTOR',
                key=("flare",),
                value=text,
                allowed="a band of 'halflit spectrum', an equals sign and a number, 0 to 1e6",
            )
    return factors


def check_picture(plot: Path | None) -> None:
    """Refuse a wrong ending before anything is computed."""
    if plot is not None:
        from charging.curve_plots import refuse_unknown_ending

        refuse_unknown_ending(plot)


def wrote(file: Path) -> None:
    """Say on stderr which file was written."""
    print(f"wrote {file}", file=sys.stderr)
