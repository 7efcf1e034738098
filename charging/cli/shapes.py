"""The geometry of a case: table and picture."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from charging.cli.options import Plot, check_picture, wrote
from charging.cli.output import one_line, print_json, print_table
from charging.cli.runs import AllowOutside, CaseOrResult, Json

if TYPE_CHECKING:
    from charging.case import LoadedCase


def register(app: typer.Typer) -> None:
    """Add the command to the application."""
    app.command(epilog="Example: halflit shape cases/geo_substorm_day_shape.toml --plot craft.png")(
        shape
    )


def shape(
    case: CaseOrResult,
    plot: Plot = None,
    at: Annotated[
        str | None,
        typer.Option(
            "--at",
            metavar="TIME",
            show_default=False,
            help="Moment of the picture, UTC with Z [default: start; of a result, worst moment].",
        ),
    ] = None,
    allow_outside: AllowOutside = False,
    json: Json = False,
) -> None:
    """Areas, capacitances and views of the shapes of a case, and a picture of them.

    A result colours the picture by its potentials; a case shows light and shadow.
    """
    check_picture(plot)
    from charging.review.check import load_case_or_result
    from charging.shape.account import geometry_account

    loaded = load_case_or_result(case, allow_outside=allow_outside)
    account = geometry_account(loaded.case)
    if plot is not None:
        _picture(loaded, case, plot, at)
        wrote(plot)
    if json:
        print_json(account)
        return
    print(one_line(account["title"]))
    _print(account)


def _picture(loaded: LoadedCase, given: Path, plot: Path, at: str | None) -> None:
    from charging.shape.moment import picture_at

    result = given if given.is_dir() or given.suffix == ".nc" else None
    picture_at(loaded, plot, at=at, result=result)


def _print(account: dict[str, Any]) -> None:
    rows = []
    for row in account["surfaces"]:
        normal = row["normal"]
        looks = "several ways" if normal is None else ", ".join(f"{x:+.2g}" for x in normal)
        rows.append(
            (
                row["surface"],
                f"{row['area_m2']:.3f}",
                f"{looks}, tracks" if row["tracks_sun"] else looks,
                f"{row['capacitance_pF']:.1f}",
                f"{row['field_1_m']:.3g}",
                f"{row['edge_field_1_m']:.3g}",
                f"{row['barrier_share']:.3f}",
                "-" if row["least_lit_share"] is None else f"{row['least_lit_share']:.2f}",
                f"{row['lit_error']:.3f}",
                ", ".join(row["neighbours"]) or "-",
            )
        )
    print_table(
        rows,
        (
            "surface",
            "area\nm2",
            "normal\nbody axes",
            "own\npF",
            "field\nV/m per V",
            "at edges\n(estimate)",
            "barrier\nV per V",
            "lit share\nat least",
            "its\nerror",
            "shares edges with",
        ),
        "lrlrrrrrrl",
    )
    whole = account["whole"]
    print(
        f"\n{whole['panels']} panels, {whole['area_m2']:.2f} m2, of which "
        f"{whole['bare_area_m2']:.2f} m2 belong to no surface; {whole['volume_m3']:.2f} m3.\n"
        f"Capacitance {whole['capacitance_pF']:.0f} pF, as a sphere of {whole['radius_m']:.3f} m; "
        f"wings change it by {100.0 * whole['turn_spread']:.2g} % in a turn.\n"
        f"Before its mean was taken the matrix was asymmetric by {100 * whole['asymmetry']:.2g} %: "
        "the error of these panels between surfaces.\n"
        "field: of a surface alone at 1 V. barrier: what electrons of a surface at 0 V climb when "
        "all else is at -1 V.\n"
        "lit share: least share left free by other parts at a cosine above 0.1; its error: the "
        "largest, times the cosine."
    )
