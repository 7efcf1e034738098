"""Small questions that need no run: point and orbit; registers those of other modules."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from charging.cli import catalogue, sunlight
from charging.cli.answers import orbit_document, point_document, print_orbit, print_point
from charging.cli.options import (
    NAMES_OR_FILES,
    Activity,
    Cosine,
    Distance,
    PhotoEscape,
    Plot,
    Radius,
    SurfaceState,
    as_options,
    check_picture,
    wrote,
)
from charging.cli.output import print_json
from charging.cli.runs import AllowOutside, CaseFile, Json


def register(app: typer.Typer) -> None:
    """Add the commands to the application."""
    app.command(
        epilog='Example: halflit point --material "polyimide film" '
        '--plasma "ECSS geostationary worst case"'
    )(point)
    sunlight.register(app)
    app.command(epilog="Example: halflit orbit cases/geo_substorm_day.toml -o orbit.nc")(orbit)
    catalogue.register(app)


def point(
    material: Annotated[
        str, typer.Option("--material", metavar="M", show_default=False, help=NAMES_OR_FILES)
    ],
    plasma: Annotated[
        str, typer.Option("--plasma", metavar="P", show_default=False, help=NAMES_OR_FILES)
    ],
    sunlit: Annotated[bool, typer.Option("--sunlit/--dark", help="In sunlight or not.")] = False,
    incidence_cosine: Cosine = 1.0,
    collection: Annotated[
        str,
        typer.Option(
            "--collection",
            metavar="sphere|cylinder|plane|auto",
            help="How attracted particles are collected; auto: plane to sphere by sheath length.",
        ),
    ] = "auto",
    radius_m: Radius = 1.0,
    distance_au: Distance = 1.0,
    f107: Activity = 150.0,
    law: Annotated[
        str | None,
        typer.Option(
            "--law",
            metavar="NAME",
            show_default=False,
            help="Secondary-emission law: sanders_inouye_1979, lin_joy_2005, sternglass_1954, "
            "draine_salpeter_1979; default: the material's choice, else the first.",
        ),
    ] = None,
    surface_state: SurfaceState = "as recorded",
    photo_escape: PhotoEscape = "auto",
    plot: Plot = None,
    json: Json = False,
) -> None:
    """Floating potentials of one surface in one plasma, and the currents there.

    One-sided patch without conduction. Exit 0 done, 2 bad input, 3 no floating potential.
    """
    from charging.point import floating_point

    check_picture(plot)
    with as_options():
        found = floating_point(
            material,
            plasma,
            sunlit=sunlit,
            incidence_cosine=incidence_cosine,
            collection=collection,
            radius_m=radius_m,
            distance_au=distance_au,
            f107=f107,
            law=law,
            surface_state=surface_state,
            photo_escape=photo_escape,
        )
    if plot is not None:
        from charging.curve_plots import plot_point

        plot_point(found, plot)
        wrote(plot)
    if json:
        print_json(point_document(found))
    else:
        print_point(found)


def orbit(
    case: CaseFile,
    out: Annotated[
        Path | None,
        typer.Option(
            "--out", "-o", metavar="FILE", show_default=False, help="NetCDF of the orbit (.nc)."
        ),
    ] = None,
    allow_outside: AllowOutside = False,
    json: Json = False,
) -> None:
    """Eclipses and beta angle along the orbit of a case, without charging."""
    from charging.case import load_case
    from charging.orbit_view import orbit_report, write_orbit

    loaded = load_case(case, allow_outside=allow_outside, orbit_only=True)
    if out is None:
        found = orbit_report(loaded)
    else:
        found = write_orbit(loaded, out, option="--out")
        wrote(out)
    document = orbit_document(found)
    if json:
        print_json(document)
    else:
        print_orbit(found, document)
