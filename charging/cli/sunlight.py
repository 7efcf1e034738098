"""What sunlight does: photoyield and spectrum."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Annotated

import typer

from charging.cli.answers import number
from charging.cli.options import (
    NAMES_OR_FILES,
    Activity,
    Cosine,
    Distance,
    Flare,
    PhotoEscape,
    Plot,
    Radius,
    SurfaceState,
    as_factors,
    as_options,
    check_picture,
    wrote,
)
from charging.cli.output import print_json, print_table
from charging.cli.runs import Json

if TYPE_CHECKING:
    from charging.photo_table import PhotoRow

CURVE_V = (0.5, 1.0, 2.0, 3.0, 5.0, 7.0, 10.0, 15.0, 20.0, 30.0)
"""Potentials [V] of the printed retarding curve."""


def distinct_labels(names: Sequence[str], given: Sequence[str]) -> list[str]:
    """Return the names of records, with what was typed where one name stands twice.

    Examples
    --------
    >>> distinct_labels(["gold", "gold", "PTFE"], ["gold", "./mine.toml", "PTFE"])
    ['gold', 'gold (./mine.toml)', 'PTFE']
    """
    return [
        name if names.count(name) == 1 or name == text else f"{name} ({text})"
        for name, text in zip(names, given, strict=True)
    ]


def register(app: typer.Typer) -> None:
    """Add the commands to the application."""
    app.command(epilog='Example: halflit photoyield gold "ITO coating" --distance-au 0.7')(
        photoyield
    )
    app.command(epilog="Example: halflit spectrum --f107 220 --above 10.4")(spectrum)


def photoyield(
    materials: Annotated[
        list[str], typer.Argument(metavar="M...", show_default=False, help=NAMES_OR_FILES)
    ],
    distance_au: Distance = 1.0,
    f107: Activity = 150.0,
    incidence_cosine: Cosine = 1.0,
    surface_state: SurfaceState = "as recorded",
    photo_escape: PhotoEscape = "auto",
    radius_m: Radius = 1.0,
    flare: Flare = None,
    plasma: Annotated[
        str | None,
        typer.Option(
            "--plasma",
            metavar="P",
            show_default=False,
            help="Also the potential that sunlight holds in this plasma.",
        ),
    ] = None,
    plot: Plot = None,
    json: Json = False,
) -> None:
    """Photocurrent of materials in sunlight and the potentials that hold it back."""
    from dataclasses import asdict

    import numpy as np

    from charging.photo_table import SunlightOptions, photoyield_table, retarding_curves

    check_picture(plot)
    sunlight = SunlightOptions(
        distance_au=distance_au,
        f107=f107,
        incidence_cosine=incidence_cosine,
        surface_state=surface_state,
        photo_escape=photo_escape,
        radius_m=radius_m,
        flare=as_factors(flare),
    )
    potential = np.array(CURVE_V)
    with as_options("material"):
        rows = photoyield_table(materials, **sunlight)
        curves = retarding_curves(materials, potential, **sunlight)
        floats: Sequence[float | None] = [None] * len(rows)
        if plasma is not None:
            from charging.photo_float import sunlit_potentials

            floats = sunlit_potentials(materials, plasma, **sunlight)
    if plot is not None:
        from charging.curve_plots import plot_photoyield

        plot_photoyield(materials, plot, **sunlight)
        wrote(plot)
    if json:
        print_json(
            [
                {
                    **asdict(row),
                    "retarding_curve": {
                        "potential_V": list(CURVE_V),
                        "current_A_m2": curve.tolist(),
                    }
                    if curve is not None
                    else None,
                    "floating_potential_V": volts,
                }
                for row, curve, volts in zip(rows, curves, floats, strict=True)
            ]
        )
        return
    labels = distinct_labels([row.material for row in rows], materials)
    _print_rows(rows, labels, floats if plasma is not None else None)
    emitting = [
        (label, row, curve.tolist())
        for label, row, curve in zip(labels, rows, curves, strict=True)
        if curve is not None
    ]
    if emitting:
        print()
        _print_bands([(label, row) for label, row, _ in emitting])
        print()
        _print_curves(emitting)
    print(
        f"\nSun at {distance_au:g} AU, F10.7 {f107:g}, incidence cosine {incidence_cosine:g}; "
        f"surface {surface_state}; escape {photo_escape}"
        + (f", body radius {radius_m:g} m" if photo_escape == "auto" else "")
        + "".join(f", {band} times {factor:g}" for band, factor in as_factors(flare).items())
        + "."
    )
    print(
        "A current whose level was set from published currents is a calibration, not a check.\n"
        "Above the last point of a curve its yield goes as energy times absorption, or is held."
    )
    if plasma is not None:
        print(f"Floating: reached from 0 V in {plasma}, all currents balanced, no conduction.")


def _print_rows(
    rows: Sequence[PhotoRow], labels: Sequence[str], floats: Sequence[float | None] | None
) -> None:
    print_table(
        [
            (
                labels[i],
                number(row.threshold_eV, ".2f"),
                number(row.threshold_nm, ".0f"),
                f"{1e6 * row.saturation_current_A_m2:.4g}",
                number(row.potential_at_1_percent_V, ".2f"),
                number(row.potential_at_0p1_percent_V, ".2f"),
                number(row.mean_energy_eV, ".2f"),
                number(row.photoelectron_debye_length_m, ".2f"),
                number(row.upper_photon_energy_eV, "g"),
                "-" if row.basis is None else row.basis,
                "-" if row.level is None else row.level,
                *(() if floats is None else (number(floats[i], "+.4g"),)),
            )
            for i, row in enumerate(rows)
        ],
        (
            "material",
            "threshold\neV",
            "\nnm",
            "saturation\nuA m-2",
            "1 % escape\nat V",
            "0.1 %\nat V",
            "mean energy\neV",
            "photo Debye\nm",
            "curve to\neV",
            "basis",
            "level of the curve",
            *(() if floats is None else ("floats at\nV",)),
        ),
        "lrrrrrrrrll" + ("" if floats is None else "r"),
    )


def _print_bands(rows: Sequence[tuple[str, PhotoRow]]) -> None:
    bands = [share.band for share in rows[0][1].bands]
    print_table(
        [
            (band, *(f"{100.0 * row.bands[i].share:.1f}" for _, row in rows))
            for i, band in enumerate(bands)
        ],
        ("share of the current, %", *(label for label, _ in rows)),
        "l" + "r" * len(rows),
    )


def _print_curves(rows: Sequence[tuple[str, PhotoRow, list[float]]]) -> None:
    print_table(
        [
            (
                f"{volts:g}",
                *(
                    f"{100.0 * curve[i] / row.saturation_current_A_m2:.3g}"
                    if row.saturation_current_A_m2
                    else "-"
                    for _, row, curve in rows
                ),
            )
            for i, volts in enumerate(CURVE_V)
        ],
        ("escaping at V, %", *(label for label, _, _ in rows)),
        "r" + "r" * len(rows),
    )


def spectrum(
    f107: Activity = 150.0,
    f107_81day: Annotated[
        float | None,
        typer.Option(
            "--f107-81day", show_default=False, help="81-day mean of it; default: the same."
        ),
    ] = None,
    distance_au: Distance = 1.0,
    flare: Flare = None,
    above: Annotated[
        list[float] | None,
        typer.Option(
            "--above",
            metavar="EV",
            show_default=False,
            help="Photons above this energy [eV]; may be given several times.",
        ),
    ] = None,
    plot: Plot = None,
    json: Json = False,
) -> None:
    """Solar photons by band, soft X-rays to 400 nm."""
    from dataclasses import asdict

    from charging.arguments import as_number, from_environment
    from environments.errors import EnvironmentDataError
    from environments.spectrum import band_table, solar_spectrum, spectrum_sources

    check_picture(plot)
    with as_options():
        energies = [as_number("above", given, above=0.0, high=1e6) for given in above or ()]
        try:
            sun = solar_spectrum(
                f107=f107,
                f107_81day=f107_81day,
                distance_au=distance_au,
                band_factors=as_factors(flare),
            )
        except EnvironmentDataError as error:
            raise from_environment(error) from None
    if plot is not None:
        from charging.curve_plots import plot_spectrum

        plot_spectrum(sun, plot)
        wrote(plot)
    rows = band_table(sun)
    over = [(energy, sun.photons_above(energy)) for energy in energies]
    if json:
        print_json(
            {
                "f107": sun.f107,
                "f107_81day": sun.f107_81day,
                "distance_au": sun.distance_au,
                "flare": as_factors(flare),
                "bands": [asdict(row) for row in rows],
                "photons_above": [
                    {"photon_energy_eV": energy, "photon_flux_m2_s": flux} for energy, flux in over
                ],
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
    for energy, flux in over:
        print(f"photons above {energy:g} eV: {flux:.4g} m-2 s-1")
    activity = f"F10.7 {sun.f107:g}, 81-day mean {sun.f107_81day:g}"
    print(
        f"Sun at {distance_au:g} AU, {activity}. Activity scales "
        "everything below 123 nm;\nabove, a reference spectrum stays as it is."
    )
    if flare:
        print("Flare: " + ", ".join(f"{b} times {x:g}" for b, x in as_factors(flare).items()) + ".")
