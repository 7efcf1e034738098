"""report.html: a review as one file that can be handed over, printed and read aloud."""

from __future__ import annotations

import json
from collections.abc import Mapping
from typing import Any

from charging.review.check import Review
from charging.review.figures import Figure, figures
from charging.review.markup import Child, Markup, element, items, joined, section, table
from charging.review.narrative import law_name, plain_time, shown
from charging.review.report_parts import (
    assumptions,
    badge,
    fixes,
    hashes,
    laws,
    matrix,
    or_dash,
    plasmas,
    properties,
    sensitivities,
)
from charging.review.report_run import geometry, jumps, timeline
from charging.review.report_style import PAGE, STYLE
from charging.review.scenes import AGES

SIGN = "Signed values: negative is below, positive above what the surface is judged against."


def report_html(review: Review, document: Mapping[str, Any]) -> str:
    """Write the report of a review.

    Parameters
    ----------
    review : Review
    document : mapping
        Of `review_document`.

    Returns
    -------
    str
        One self-contained HTML document; no script runs in it, nothing is loaded.
    """
    pictures = {figure.anchor: figure for figure in figures(review, document)}
    parts = _sections(document, pictures)
    contents = element(
        "nav",
        element("h2", "Contents", id="contents"),
        items([element("a", title, href=f"#{anchor}") for anchor, title, _ in parts], "ol"),
        aria_labelledby="contents",
    )
    title = f"Surface charging review: {document['title']}"
    short = str(document["run_hash"])[:12]
    head = element(
        "head",
        element("meta", charset="utf-8"),
        element("meta", name="viewport", content="width=device-width, initial-scale=1"),
        element("title", title),
        element("style", Markup(STYLE + PAGE % {"hash": short})),
    )
    body = element(
        "body",
        element("a", "Skip to the verdict", href="#verdict", class_="skip"),
        element(
            "header",
            element("h1", title),
            element(
                "p",
                f"halflit {document['halflit_version']}, run ",
                element("span", str(document["run_hash"]), class_="hash"),
                class_="quiet",
            ),
        ),
        contents,
        element("main", [section(anchor, name, content) for anchor, name, content in parts]),
        element(
            "footer",
            element("p", " ".join(document["cautions"][:2])),
            element("p", f"halflit {document['halflit_version']}, run {short}."),
        ),
        element(
            "script",
            Markup(json_for_script(_data(document))),
            type="application/json",
            id="review-data",
        ),
    )
    return f'<!DOCTYPE html>\n<html lang="en">{head}{body}</html>\n'


def json_for_script(value: object) -> str:
    r"""JSON that cannot end the script element it stands in.

    Examples
    --------
    >>> json_for_script("</script>&")
    '"\\u003c/script\\u003e\\u0026"'
    """
    text = json.dumps(value, ensure_ascii=True, allow_nan=False)
    return text.replace("<", "\\u003c").replace(">", "\\u003e").replace("&", "\\u0026")


def _data(document: Mapping[str, Any]) -> dict[str, Any]:
    keys = ("title", "halflit_version", "verdict", "qualifications", "run_hash", "limits")
    return {key: document[key] for key in keys}


def _sections(
    document: Mapping[str, Any], pictures: Mapping[str, Figure]
) -> list[tuple[str, str, Child]]:
    def picture(anchor: str) -> Child:
        return _figure(pictures[anchor]) if anchor in pictures else None

    found: list[tuple[str, str, Child]] = [
        ("verdict", "Verdict", _verdict(document)),
        ("compliance", "Compliance matrix", [_compliance(document), picture("figure-margins")]),
        ("cells", "Modes, plasmas and ages", matrix(document)),
        ("pairs", "Worst pairs", [_pairs(document), _energy(document)]),
        (
            "potentials",
            "Potentials over the run",
            [_structure(document), picture("figure-potentials"), picture("figure-differentials")],
        ),
        ("currents", "Currents at the worst moments", picture("figure-currents")),
        ("timeline", "Eclipses and regions", [timeline(document), picture("figure-detail")]),
        ("jumps", "Jumps between branches", jumps(document)),
        ("geometry", "Geometry and barriers", [geometry(document), picture("figure-shape")]),
        (
            "sensitivities",
            "Sensitivities and corners",
            [picture("figure-sensitivities"), sensitivities(document)],
        ),
        ("laws", "Spread of laws and collections", laws(document)),
        ("fixes", "Fixes", fixes(document["fixes"])),
        ("properties", "Properties of materials", properties(document)),
        ("plasmas", "Plasmas", plasmas(document)),
        ("assumptions", "What is assumed, and where it fails", assumptions(document)),
        ("not-modelled", "What is not modelled", items(document["not_modelled"])),
        ("claims", "Limits of the claims", items(document["claim_limits"])),
        ("cautions", "Cautions", items(document["cautions"])),
        ("references", "References of this run", _references(document)),
        ("versions", "Versions and hashes", hashes(document)),
    ]
    return found


def _figure(figure: Figure) -> Markup:
    return element(
        "figure",
        element("div", figure.svg, class_="figurebox", tabindex="0", role="region",
                aria_label=f"{figure.caption}, scrolls on a narrow screen"),
        element("figcaption", f"{figure.caption}. {figure.description}"),
        id=figure.anchor,
    )  # fmt: skip


def _verdict(document: Mapping[str, Any]) -> Child:
    verdict = document["verdict"]
    rows = document["limits"]
    counts = ", ".join(
        f"{sum(row['verdict'] == name for row in rows)} {name}"
        for name in ("exceeded", "not assessable", "within")
    )
    box = element(
        "p",
        "Verdict: ",
        badge(verdict),
        f" — {counts}, of {len(rows)} limits.",
        class_=f"verdict {verdict.replace(' ', '-')}",
    )
    with_it = document["qualifications"]
    fix = document["fixes"]
    return [
        box,
        element("p", "With it: ", element("strong", "; ".join(with_it)), ".") if with_it else None,
        element("p", " ".join(document["cautions"][:2])),
        element("h3", "Limits that are not within, the worst first"),
        items(document["sentences"]),
        element("p", element("strong", "Fixes: "), fix["answer"]) if fix else None,
    ]


def _compliance(document: Mapping[str, Any]) -> Child:
    rows = []
    for row in document["limits"]:
        evidence = [element("a", "cells", href="#cells")]
        if not row["bonded"]:
            evidence += [Markup(", "), element("a", "effects", href="#sensitivities")]
        unit = row["unit"]
        rows.append(
            (
                f"{row['surface']} / {row['against']}",
                f"{row['requirement_id']}, {row['kind']}",
                row["method"],
                shown(row["nominal_value"], unit),
                or_dash(row["corner_value"], unit),
                shown(row["allowed"], unit),
                _margin(row),
                [badge(row["verdict"]), f" {row['reason']}. Governs: {_place(row)}"],
                joined(evidence),
            )
        )
    return [
        element(
            "p",
            f"{SIGN} The governing value is the worse of nominal and corner; the margin is that "
            "of the governing value; decibels are 20 log10 of allowed over value (energy: 10).",
        ),
        table(
            "Compliance matrix",
            (
                "surface / against",
                "requirement",
                "method",
                "nominal",
                "corner",
                "allowed",
                "margin",
                "status, and where the limit governs",
                "evidence",
            ),
            rows,
            numbers=(3, 4, 5, 6),
            classes="wide7",
        ),
        table(
            "Requirements",
            ("requirement", "kind", "limit", "for", "document", "clause read", "margin policy"),
            [
                (
                    r["requirement_id"],
                    r["kind"],
                    shown(r["limit"], r["unit"]),
                    "all" if r["surfaces"] is None else ", ".join(r["surfaces"]),
                    r["document"] + (f" ({r['issue']})" if r["issue"] else ""),
                    "yes" if r["clause_verified"] else "no",
                    f"factor {r['margin_factor']:g}, {r['margin_basis']}",
                )
                for r in document["requirements"]
            ],
            numbers=(2,),
        ),
    ]


def _margin(row: Mapping[str, Any]) -> Child:
    size = shown(row["margin"], row["unit"])
    if row["margin_dB"] is None:
        return size
    return [size, element("br"), f"{row['margin_dB']:+.1f} dB"]


def _place(row: Mapping[str, Any]) -> str:
    where = f"{row['mode']}, {row['plasma']}, {AGES[row['age']]}"
    return f"{where}, {plain_time(row['time'])}." if row["time"] else f"{where}."


def _pairs(document: Mapping[str, Any]) -> Child:
    return [
        element("p", f"At the values of the records. {SIGN}"),
        table(
            "Largest differences",
            ("surface", "against", "difference", "mode, plasma, age", "law", "when"),
            [
                (
                    row["surface"],
                    row["against"],
                    shown(row["value_V"], "V"),
                    f"{row['mode']}, {row['plasma']}, {AGES[row['age']]}",
                    law_name(row["law"]),
                    row["when"],
                )
                for row in document["worst_pairs"][:20]
            ],
            numbers=(2,),
        ),
    ]


def _energy(document: Mapping[str, Any]) -> Child:
    return [
        table(
            "Stored energy, ½ C V² of a film or isolated conductor: information",
            ("surface", "energy", "class", "mode, age", "time"),
            [
                (
                    row["surface"],
                    shown(row["energy_J"], "J"),
                    row["class"],
                    f"{row['mode']}, {AGES[row['age']]}",
                    "–" if row["time"] is None else plain_time(row["time"]),
                )
                for row in document["stored_energy"]
            ],
            numbers=(1,),
        ),
        element(
            "p",
            "Classes are this project's own (assumed; below 1 mJ negligible, to 10 mJ note, to 1 J "
            "act). A stored energy does not say that there is no discharge.",
            class_="quiet",
        ),
    ]


def _structure(document: Mapping[str, Any]) -> Child:
    return table(
        "Structure against the plasma",
        ("mode", "plasma", "lowest", "highest", "fastest change at eclipse exit"),
        [
            (
                row["mode"],
                row["plasma"],
                shown(row["lowest_V"], "V"),
                shown(row["highest_V"], "V"),
                "–"
                if row["fastest_change_at_eclipse_exit_V_s"] is None
                else f"{row['fastest_change_at_eclipse_exit_V_s']:.3g} V/s",
            )
            for row in document["structure"]
        ],
        numbers=(2, 3, 4),
    )


def _references(document: Mapping[str, Any]) -> Child:
    sources: dict[str, list[str]] = {}
    for row in document["references"]:
        sources.setdefault(row["source"], []).append(row["what"])
    return [
        element("p", "Exactly what this run used."),
        table("References", ("source", "used for"),
              [(source, "; ".join(what)) for source, what in sources.items()],
              classes="long"),
    ]  # fmt: skip
