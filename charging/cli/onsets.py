"""The command that tells at which electron temperature a surface starts to charge."""

from __future__ import annotations

from typing import Annotated

import typer

from charging.cli.output import print_json, print_table
from charging.cli.runs import Json

Materials = Annotated[
    list[str],
    typer.Argument(
        metavar="MATERIAL...",
        show_default=False,
        help="Library name, or a file (ends in .toml or holds '/').",
    ),
]


def register(app: typer.Typer) -> None:
    """Add the command to the application."""
    app.command(epilog='Example: halflit onset "polyimide film" gold')(onset)


def onset(materials: Materials, json: Json = False) -> None:
    """Critical and anticritical electron temperatures of dark surfaces, by every law.

    Above the critical temperature a dark surface charges to kilovolts. Exit 0 done, 2 bad input.
    """
    from charging.onset import law_spread_eV, onset_temperatures

    found = [onset_temperatures(name) for name in materials]
    if json:
        print_json(
            [
                {
                    "material": row.material,
                    "critical_temperature_eV": row.critical_temperature_eV,
                    "anticritical_temperature_eV": row.anticritical_temperature_eV,
                    "law": row.law,
                    "backscatter": row.backscatter,
                    "angle": row.angle,
                }
                for rows in found
                for row in rows
            ]
        )
        return

    def volts(value: float | None) -> str:
        return "none" if value is None else f"{value:.4g}"

    print_table(
        [
            (
                row.material,
                volts(row.critical_temperature_eV),
                volts(row.anticritical_temperature_eV),
                row.law,
                row.backscatter,
                row.angle,
                "" if row.fitted_to_eV != row.fitted_to_eV else f"{row.fitted_to_eV:.3g}",
            )
            for rows in found
            for row in rows
        ],
        (
            "material",
            "critical\nT eV",
            "anticritical\nT eV",
            "secondary law",
            "backscatter law",
            "incidence",
            "law holds\nto eV",
        ),
        "lrrlllr",
    )
    print()
    for rows in found:
        spread = law_spread_eV(rows)
        if spread is None:
            print(f"{rows[0].material}: no law gives a critical temperature; it charges at any")
        else:
            print(
                f"{rows[0].material}: {spread[0]:.4g} to {spread[1]:.4g} eV over the laws, "
                f"isotropic (a factor {spread[1] / spread[0]:.1f})"
            )
    print(
        "Maxwellian electrons, no ions, no light. none: as many electrons leave as arrive at no "
        "temperature.\nAnticritical temperatures rest on yields below 50 eV, which are badly known."
    )
