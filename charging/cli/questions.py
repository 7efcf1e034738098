"""Small questions that need no run: point, photoyield, spectrum, orbit, materials, plasmas."""

from __future__ import annotations

import sys
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Annotated

import typer

from charging.cli import catalogue
from charging.cli.answers import (
    number,
    orbit_document,
    point_document,
    print_orbit,
    print_point,
)
from charging.cli.output import print_json, print_table
from charging.cli.runs import AllowOutside, CaseFile, Json

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


def register(app: typer.Typer) -> None:
    """Add the commands to the application."""
    app.command(
        epilog='Example: halflit point --material "polyimide film" '
        '--plasma "ECSS geostationary worst case"'
    )(point)
    app.command(epilog='Example: halflit photoyield gold "ITO coating" --distance-au 0.7')(
        photoyield
    )
    app.command(epilog="Example: halflit spectrum --f107 220")(spectrum)
    app.command(epilog="Example: halflit orbit cases/geo_substorm_day.toml -o orbit.nc")(orbit)
    catalogue.register(app)


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
            option = f"--{name.replace('_', '-')}"
            error.message = error.message.replace(f"{name} = ", f"{option} ", 1)
        raise


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
    radius_m: Annotated[
        float, typer.Option("--radius-m", help="Radius of the body [m], above 0, up to 1000.")
    ] = 1.0,
    distance_au: Distance = 1.0,
    f107: Activity = 150.0,
    law: Annotated[
        str,
        typer.Option(
            "--law",
            metavar="sanders_inouye_1979|lin_joy_2005",
            help="Secondary-emission law.",
        ),
    ] = "sanders_inouye_1979",
    plot: Plot = None,
    json: Json = False,
) -> None:
    """Floating potentials of one surface in one plasma, and the currents there.

    One-sided patch without conduction. Exit 0 done, 2 bad input, 3 no floating potential.
    """
    from charging.point import floating_point

    _check_picture(plot)
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
        )
    if plot is not None:
        from charging.curve_plots import plot_point

        plot_point(found, plot)
        _wrote(plot)
    if json:
        print_json(point_document(found))
    else:
        print_point(found)


def photoyield(
    materials: Annotated[
        list[str],
        typer.Argument(metavar="M...", show_default=False, help=NAMES_OR_FILES),
    ],
    distance_au: Distance = 1.0,
    f107: Activity = 150.0,
    incidence_cosine: Cosine = 1.0,
    plot: Plot = None,
    json: Json = False,
) -> None:
    """Photocurrent of materials in sunlight and the potentials that hold it back."""
    from dataclasses import asdict

    from charging.photo_table import photoyield_table

    _check_picture(plot)
    with as_options("material"):
        rows = photoyield_table(
            materials, distance_au=distance_au, f107=f107, incidence_cosine=incidence_cosine
        )
    if plot is not None:
        from charging.curve_plots import plot_photoyield

        plot_photoyield(
            materials,
            plot,
            distance_au=distance_au,
            f107=f107,
            incidence_cosine=incidence_cosine,
        )
        _wrote(plot)
    if json:
        print_json([asdict(row) for row in rows])
        return
    print_table(
        [
            (
                row.material,
                number(row.threshold_eV, ".2f"),
                number(row.threshold_nm, ".0f"),
                f"{1e6 * row.saturation_current_A_m2:.4g}",
                number(row.potential_at_1_percent_V, ".2f"),
                number(row.potential_at_0p1_percent_V, ".2f"),
                number(row.mean_energy_eV, ".2f"),
                number(row.upper_photon_energy_eV, "g"),
                "-" if row.basis is None else row.basis,
                "-" if row.level is None else row.level,
            )
            for row in rows
        ],
        (
            "material",
            "threshold\neV",
            "\nnm",
            "saturation\nuA m-2",
            "1 % escape\nat V",
            "0.1 %\nat V",
            "mean energy\neV",
            "curve to\neV",
            "basis",
            "level of the curve",
        ),
        "lrrrrrrrll",
    )
    print(
        f"Sun at {distance_au:g} AU, F10.7 {f107:g}, incidence cosine {incidence_cosine:g}. "
        "Above the last point of a curve its yield is held.\n"
        "A current whose level was set from published currents is a calibration, not a check. "
        "Electron energies\nabove 20 eV photon energy are partly assumed; "
        "mean energies come out high against published 1 to 2.5 eV."
    )


def spectrum(
    f107: Activity = 150.0, distance_au: Distance = 1.0, plot: Plot = None, json: Json = False
) -> None:
    """Solar photons by band, soft X-rays to 400 nm."""
    from dataclasses import asdict

    from charging.arguments import from_environment
    from environments.errors import EnvironmentDataError
    from environments.spectrum import band_table, solar_spectrum, spectrum_sources

    _check_picture(plot)
    with as_options():
        try:
            sun = solar_spectrum(f107=f107, distance_au=distance_au)
        except EnvironmentDataError as error:
            raise from_environment(error) from None
    if plot is not None:
        from charging.curve_plots import plot_spectrum

        plot_spectrum(sun, plot)
        _wrote(plot)
    rows = band_table(sun)
    if json:
        print_json(
            {
                "f107": sun.f107,
                "f107_81day": sun.f107_81day,
                "distance_au": sun.distance_au,
                "bands": [asdict(row) for row in rows],
                "sources": spectrum_sources(),
            }
        )
        return
    print_table(
        [
            (
                row.band,
                f"{row.wavelength_low_nm:g}",
                f"{row.wavelength_high_nm:g}",
                f"{row.photon_flux_m2_s:.4g}",
                f"{1e3 * row.irradiance_W_m2:.4g}",
            )
            for row in rows
        ],
        ("band", "from\nnm", "to\nnm", "photons\nm-2 s-1", "irradiance\nmW m-2"),
        "lrrrr",
    )
    print(
        f"Sun at {distance_au:g} AU, F10.7 {f107:g} (day and 81-day mean). Activity scales "
        "everything below 123 nm;\nabove, a reference spectrum stays as it is."
    )


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
    from charging.orbit_view import orbit_dataset, orbit_report, write_orbit

    loaded = load_case(case, allow_outside=allow_outside)
    found = orbit_report(loaded)
    if out is not None:
        write_orbit(orbit_dataset(loaded), out, option="--out")
        _wrote(out)
    document = orbit_document(found)
    if json:
        print_json(document)
    else:
        print_orbit(found, document)


def _check_picture(plot: Path | None) -> None:
    """Refuse a wrong ending before anything is computed."""
    if plot is not None:
        from charging.curve_plots import refuse_unknown_ending

        refuse_unknown_ending(plot)


def _wrote(file: Path) -> None:
    print(f"wrote {file}", file=sys.stderr)
