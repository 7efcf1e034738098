"""What `halflit run --quick` prints: quasi-steady potentials and what they leave out."""

from __future__ import annotations

from typing import TYPE_CHECKING

from charging.cli.output import one_line, print_json, print_table, volts

if TYPE_CHECKING:
    from charging.case import LoadedCase

CLOSE = 0.1
"""A lag above this share of the largest difference to structure is pointed out."""


def print_quick_look(loaded: LoadedCase, *, json: bool) -> None:
    """Solve and print the quasi-steady potentials of a case in every mode."""
    from charging.quick_look import quick_document, quick_look

    document = quick_document(loaded, quick_look(loaded))
    if json:
        print_json(document)
        return
    print(one_line(loaded.case.title))
    for mode in document["modes"]:
        if len(document["modes"]) > 1:
            print(f"\nMode: {one_line(mode['mode'])}")
        rows = [
            (
                row["surface"],
                volts(row["lowest_V"]),
                volts(row["highest_V"]),
                volts(row["below_structure_V"]),
                volts(row["above_structure_V"]),
                volts(row["largest_lag_V"]),
                f"{row['largest_lag_after_s'] / 3600.0:.2f}",
                _duration(row["charging_time_s"]),
            )
            for row in mode["surfaces"]
        ]
        print_table(
            rows,
            (
                "surface",
                "lowest\nV",
                "highest\nV",
                "below\nstructure V",
                "above\nstructure V",
                "left out\nV",
                "at\nh",
                "charging\ntime",
            ),
            "lrrrrrrr",
        )
        structure = mode["structure"]
        print(
            f"structure: {volts(structure['lowest_V'])} V to {volts(structure['highest_V'])} V, "
            f"{volts(structure['largest_lag_V'])} V left out"
        )
    print(
        "\nQuasi-steady: every surface as if it had charged for ever at each of the moments. "
        '"left out" estimates\nwhat charging adds to the difference to structure (of bonded '
        "surfaces, to their potential), at worst, and when."
    )
    if document["largest_lag_share"] > CLOSE:
        print(
            "It is large here: these are potentials that the surfaces tend to, not those that they "
            "reach."
        )
    print("No verdict: 'halflit run' without --quick follows the charging.")


def _duration(time_s: float | None) -> str:
    if time_s is None:
        return "-"
    for unit, size in (("d", 86400.0), ("h", 3600.0), ("min", 60.0)):
        if time_s >= size:
            return f"{time_s / size:.3g} {unit}"
    return f"{time_s:.2g} s"
