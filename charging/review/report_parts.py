"""Sections of the report that are tables of a document."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from charging.review.markup import Child, Markup, element, items, table
from charging.review.narrative import law_name, shown, words
from charging.review.scenes import AGES

SYMBOL = {"within": "✓", "exceeded": "✗", "not assessable": "?"}


def badge(verdict: str) -> Markup:
    """A verdict by word, sign and colour."""
    sign = element("span", SYMBOL[verdict], aria_hidden="true")
    return element("span", sign, f" {verdict}", class_=f"badge {verdict.replace(' ', '-')}")


def matrix(document: Mapping[str, Any]) -> Child:
    """Every cell of modes, plasmas and ages: nominal and corner."""
    rows = document["matrix"]
    parts: list[Child] = [
        element(
            "p",
            "In each cell the nominal value, the worst of all laws and collections, then the "
            "corner. An exceeded limit is marked ✗ and said.",
        ),
        items(
            [
                f"{s['mode']}, plasma {s['plasma']}: {s['sheath']['text']}."
                for s in document["scenes"]
            ]
        ),
    ]
    if not rows:
        return [*parts, element("p", "Every surface is bonded: no differences.")]
    cells = rows[0]["cells"]
    columns = [(c["mode"], c["plasma"], c["age"]) for c in cells]
    # a few columns a table, so that each fits on paper
    for first in range(0, len(columns), 4):
        chosen = columns[first : first + 4]
        heads = [f"{mode}, {plasma}, {AGES[age]}" for mode, plasma, age in chosen]
        of = f" {first // 4 + 1} of {-(-len(columns) // 4)}" if len(columns) > 4 else ""
        parts.append(
            table(
                f"Nominal and corner by mode, plasma and age{of}",
                ("surface / against", "kind, allowed", *heads),
                [
                    (
                        f"{row['surface']} / {row['against']}",
                        f"{row['kind']}, {shown(row['allowed'], row['unit'])}",
                        *(_cell(c, row["unit"]) for c in row["cells"][first : first + 4]),
                    )
                    for row in rows
                ],
                numbers=tuple(range(2, 2 + len(chosen))),
            )
        )
    return parts


def or_dash(value: float | None, unit: str) -> str:
    """Write a value, or a dash for what was not run."""
    return "–" if value is None else shown(value, unit)


def _cell(cell: Mapping[str, Any], unit: str) -> Child:
    text = f"{shown(cell['nominal'], unit)}; {or_dash(cell['corner'], unit)}"
    if not cell["exceeded"]:
        return text
    return element("span", f"{text} ✗ exceeded", class_="exceeded")


def sensitivities(document: Mapping[str, Any]) -> Child:
    """Corners, their draws, and what moves each quantity."""
    rows = [row for row in document["limits"] if not row["bonded"]]
    if not document["settings"]["corners"]:
        return element(
            "p",
            "Spreads of properties were not run, so there is no corner and nothing is called "
            "within: halflit review --corners runs them.",
        )
    parts: list[Child] = [
        element(
            "p",
            "Each property alone was moved to both ends of its spread by a full rerun. The corner "
            "takes every property to its worse end; random draws over all spreads then try to "
            "beat it by more than 5 %, else it is extended. Probabilities are conditional on "
            "assumed spreads.",
        ),
        table(
            "Corners and draws",
            ("surface / against", "kind", "corner", "worst draw", "draws", "extended",
             "probability of exceeding"),
            [
                (
                    f"{row['surface']} / {row['against']}",
                    row["kind"],
                    or_dash(row["corner_value"], row["unit"]),
                    shown(row["draws_largest"], row["unit"]),
                    f"{row['draws']}"
                    + (f", {row['draws_failed']} without solution" if row["draws_failed"] else ""),
                    f"yes, from {shown(row['corner_first_value'], row['unit'])}"
                    if row["corner_extended"]
                    else "no",
                    row["exceedance_probability"],
                )
                for row in rows
            ],
            numbers=(2, 3),
        ),
    ]  # fmt: skip
    return [*parts, *(_effects(row) for row in document["sensitivities"] if row["properties"])]


def _effects(row: Mapping[str, Any]) -> Markup:
    unit = row["unit"]
    name = f"{row['surface']} against {row['against']}, {row['kind']}"
    return table(
        f"{name}: nominal {shown(row['nominal'], unit)}",
        ("property", "material", "low to high", "value at low", "value at high", "monotone",
         "basis"),
        [
            (
                words(p["property"]),
                p["material"],
                f"{p['low']:.3g} to {p['high']:.3g}",
                shown(p["at_low"], unit),
                shown(p["at_high"], unit),
                "yes" if p["monotone"] else "NOT monotone",
                p["basis"],
            )
            for p in row["properties"]
        ],
        numbers=(2, 3, 4),
    )  # fmt: skip


def laws(document: Mapping[str, Any]) -> Child:
    """Worst nominal value by secondary law and by collection."""
    rows = document["laws_and_collections"]
    names = list(dict.fromkeys(name for row in rows for name in row["by_law"]))
    ways = list(dict.fromkeys(name for row in rows for name in row["by_collection"]))
    if not rows:
        return element("p", "Every surface is bonded: no differences.")
    return table(
        "Worst nominal value by law of secondary emission and by collection",
        (
            "surface / against",
            "kind",
            *map(law_name, names),
            *(f"collection {way}" for way in ways),
        ),
        [
            (
                f"{row['surface']} / {row['against']}",
                row["kind"],
                *(_value(row["by_law"], name, row["unit"]) for name in names),
                *(_value(row["by_collection"], way, row["unit"]) for way in ways),
            )
            for row in rows
        ],
        numbers=tuple(range(2, 2 + len(names) + len(ways))),
    )


def _value(values: Mapping[str, float], name: str, unit: str) -> str:
    return shown(values[name], unit) if name in values else "–"


def fixes(found: Mapping[str, Any] | None) -> Child:
    """Fixes that were run, and what they do to other limits."""
    if found is None:
        return element("p", "No fixes were looked for.")
    parts: list[Child] = [element("p", found["answer"])]
    if found["remaining"]:
        parts += [element("p", "Still exceeded with them:"), items(found["remaining"])]
    if not found["single"]:
        return parts
    parts.append(
        table(
            "Best of each family, each alone rerun in every mode and plasma",
            ("surface", "family", "value over limit before", "after", "status", "change",
             "worsens", "tried"),
            [
                (
                    fix["surface"],
                    fix["family"],
                    f"{fix['severity_before']:.2f}",
                    "–" if fix["severity_after"] is None else f"{fix['severity_after']:.2f}",
                    fix["status"],
                    fix["text"],
                    "; ".join(fix["worsens"]) or "nothing",
                    str(fix["candidates_tried"]),
                )
                for fix in found["single"]
            ],
            numbers=(2, 3, 7),
        )
    )  # fmt: skip
    parts.append(
        element(
            "p",
            "A bulk resistivity here is the largest, spread included, at 298 K, dark and low "
            "field, by charge storage; the run scales it with temperature (Arrhenius) and field "
            "(Adamec & Calderwood). Without these three it is no purchase value. Thermal, optical "
            "and mechanical consequences are not looked at.",
            class_="quiet",
        )
    )
    return parts


def properties(document: Mapping[str, Any]) -> Child:
    """Every property with source and basis."""
    by_material: dict[str, list[Mapping[str, Any]]] = {}
    for row in document["properties"]:
        by_material.setdefault(row["material"], []).append(row)
    parts: list[Child] = [
        element(
            "p",
            "Basis: measured, handbook, derived, memory (recalled from the source named, nobody "
            "looked at the page) or assumed. Spreads hold about 90 percent. Dark resistivity at "
            "298 K, low field, by the method named.",
        )
    ]
    for name, rows in by_material.items():
        users = ", ".join(dict.fromkeys(s for row in rows for s in row["surfaces"]))
        parts.append(
            table(
                f"{name}: {users}",
                ("property", "value", "spread", "basis", "source"),
                [
                    (
                        words(row["property"]),
                        f"{row['value']:.4g} {'' if row['unit'] == '1' else row['unit']}".strip(),
                        f"{row['spread'][0]:.3g} to {row['spread'][1]:.3g}",
                        row["basis"],
                        _source(row),
                    )
                    for row in rows
                ],
                numbers=(1, 2),
                classes="long",
            )
        )
    return parts


def _source(row: Mapping[str, Any]) -> Child:
    if not row["source"]:
        return element("strong", "no source")
    method = row["measurement_method"]
    return str(row["source"]) + (f"; method: {method}" if method else "")


def plasmas(document: Mapping[str, Any]) -> Child:
    """Plasmas with source and populations."""
    parts: list[Child] = []
    for plasma in document["plasmas"]:
        ratio = plasma["electron_to_ion_current_ratio"]
        parts += [
            element("h3", plasma["plasma"]),
            element(
                "p",
                f"{plasma['title']}. Source: {plasma['source'] or 'none'}"
                + (f", {plasma['clause']}" if plasma["clause"] else "")
                + f". Basis: {plasma['basis']}. Used as printed"
                + ("" if ratio is None else f"; electron to ion current {ratio:.3g}")
                + (f". {plasma['note']}" if plasma["note"] else "."),
            ),
            table(
                f"Populations of {plasma['plasma']}",
                ("species", "law", "density (m⁻³)", "temperature (eV)"),
                [
                    (
                        p["species"],
                        p["law"],
                        f"{p['density_m3']:.4g}",
                        f"{p['temperature_eV']:.4g}",
                    )
                    for p in plasma["populations"]
                ],
                numbers=(2, 3),
            ),
        ]
    return parts


def assumptions(document: Mapping[str, Any]) -> Child:
    """What is assumed and where it fails."""
    return table(
        "Assumptions",
        ("assumed", "where it fails"),
        [(row["assumed"], row["fails"]) for row in document["assumptions"]],
    )


def hashes(document: Mapping[str, Any]) -> Child:
    """Versions, settings and hashes."""
    found: list[Sequence[Child]] = [(name, text) for name, text in document["versions"].items()]
    settings = document["settings"]
    found += [
        ("draws per governing combination", str(settings["draws"])),
        ("seed", str(settings["seed"])),
        ("runs along the timeline", str(document["members"])),
    ]
    sums = document["hashes"]

    def row(name: str, text: str) -> Sequence[Child]:
        return (name, element("span", text, class_="hash"))

    lines = [row("run", document["run_hash"]), row("case", sums["case"]), row("code", sums["code"])]
    for kind in ("materials", "plasmas", "files"):
        lines += [row(f"{kind[:-1]} {name}", text) for name, text in sums[kind].items()]
    return [
        table("Versions and settings", ("what", "value"), found),
        table("SHA-256", ("what", "hash"), lines),
    ]
