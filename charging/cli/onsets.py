"""The command that tells at which electron temperature a surface starts to charge."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Annotated

import typer

from charging.cli.output import print_json, print_table
from charging.cli.runs import Json

if TYPE_CHECKING:
    from charging.onset import Onset

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
    """Critical and anticritical electron temperatures and crossover energies, by every law.

    Above the critical temperature a dark surface charges to kilovolts. Exit 0 done, 2 bad input.
    """
    from charging.onset import law_spread_eV, onset_temperatures, printed_difference
    from materials.secondary import YIELD_LAWS, printed_form

    found = [onset_temperatures(name) for name in materials]
    if json:
        print_json([_document(row, rows) for rows in found for row in rows])
        return

    def volts(value: float | None) -> str:
        return "none" if value is None else f"{value:.4g}"

    print_table(
        [
            (
                row.material,
                volts(row.critical_temperature_eV),
                volts(row.anticritical_temperature_eV),
                volts(row.first_crossover_eV),
                volts(row.second_crossover_eV),
                row.law,
                row.backscatter,
                row.angle,
                "" if row.fitted_to_eV is None else f"{row.fitted_to_eV:.3g}",
            )
            for rows in found
            for row in rows
        ],
        (
            "material",
            "critical\nT eV",
            "anticritical\nT eV",
            "crossover\nE1 eV",
            "crossover\nE2 eV",
            "secondary law",
            "backscatter law",
            "incidence",
            "law holds\nto eV",
        ),
        "lrrrrlllr",
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
        "temperature\n(crossovers: at no energy). Anticritical temperatures rest on yields below "
        "50 eV, which are badly known."
    )
    every = [row for rows in found for row in rows]
    print("Every law has its maximum where the material has it. As printed the critical T is")
    for law in YIELD_LAWS:
        moved = printed_difference(every, law)
        if moved is not None:
            low, high = (f"{100.0 * share:+.2g}" for share in moved)
            words = low if low == high else f"{low} to {high}"
            print(f"  {words} % by {law}: {printed_form(law).formula}")


def _document(row: Onset, rows: Sequence[Onset]) -> dict[str, object]:
    """Return one row as JSON; the spread is that over the laws at the same incidence."""
    from charging.onset import law_spread_eV
    from materials.secondary import YIELD_LAWS, printed_form

    spread = law_spread_eV(rows, row.angle)
    printed = printed_form(next(law for law in YIELD_LAWS if law == row.law))
    return {
        "material": row.material,
        "critical_temperature_eV": row.critical_temperature_eV,
        "anticritical_temperature_eV": row.anticritical_temperature_eV,
        "law": row.law,
        "backscatter": row.backscatter,
        "angle": row.angle,
        "first_crossover_eV": row.first_crossover_eV,
        "second_crossover_eV": row.second_crossover_eV,
        "law_fitted_to_eV": row.fitted_to_eV,
        "law_spread_eV": None if spread is None else list(spread),
        "as_printed": {
            "formula": printed.formula,
            "maximum_over_stated": printed.height,
            "maximum_at_over_stated": printed.place,
            "critical_temperature_eV": row.as_printed_eV,
        },
    }
