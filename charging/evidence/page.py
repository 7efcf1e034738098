"""The comparison with published figures as a page, or as a section of a report."""

from __future__ import annotations

from collections.abc import Sequence

from charging import __version__
from charging.evidence.check import Row
from charging.review.markup import Markup, element, section, table
from charging.review.report_style import STYLE

HEAD = ("quantity", "published", "ours", "unit", "off by", "allowed", "basis", "", "source")


def size(value: float, row: Row) -> str:
    """Deviation or tolerance in the sense of the row's measure.

    Examples
    --------
    >>> from charging.evidence.check import Check, evaluate
    >>> row = evaluate([Check("x", "x", 2.0, "V", 0.1, "y", "closed form", lambda: 2.1)])[0]
    >>> size(row.deviation, row)
    '5 %'
    """
    if row.measure == "factor":
        return f"x{value:.3g}"
    if row.measure == "absolute":
        return f"{value:.2g} {row.unit}" if row.unit != "1" else f"{value:.2g}"
    return f"{100.0 * value:.2g} %"


def cells(row: Row) -> tuple[str, ...]:
    """Texts of a row in the order of `HEAD`."""
    return (
        row.quantity,
        f"{row.published:.6g}",
        f"{row.ours:.6g}",
        row.unit,
        size(row.deviation, row),
        size(row.tolerance, row),
        row.basis,
        "agrees" if row.ok else "DIFFERS",
        row.source,
    )


def groups(rows: Sequence[Row]) -> tuple[tuple[str, list[Row]], ...]:
    """Rows that count and the others, each with its title."""
    return (
        ("counted", [row for row in rows if row.counted]),
        (
            "not counted: figures from memory, calibrations, shared inputs",
            [row for row in rows if not row.counted],
        ),
    )


def sum_up(rows: Sequence[Row]) -> str:
    """Return one sentence: how many rows agree."""
    (_, counted), (_, others) = groups(rows)
    return (
        f"{sum(row.ok for row in counted)} of {len(counted)} counted rows agree, "
        f"{sum(row.ok for row in others)} of {len(others)} of the others."
    )


def evidence_section(rows: Sequence[Row]) -> Markup:
    """Section of a report: both tables and what they say."""
    said = (
        "Every figure was recomputed by the version named here. A row counts where the published "
        "figure stands in a source seen, or in closed form, and owes nothing to the model."
    )
    return section(
        "evidence",
        "Published figures beside ours",
        element("p", f"halflit {__version__}. {sum_up(rows)}"),
        element("p", said, class_="quiet"),
        [
            table(title, HEAD, map(cells, group), numbers=(1, 2, 4, 5))
            for title, group in groups(rows)
            if group
        ],
    )


def evidence_page(rows: Sequence[Row]) -> str:
    """Page of its own, without links to anything outside it."""
    page = element(
        "html",
        element(
            "head",
            element("meta", charset="utf-8"),
            element("meta", name="viewport", content="width=device-width, initial-scale=1"),
            element("title", "Published figures beside those of halflit"),
            element("style", Markup(STYLE)),
        ),
        element(
            "body",
            element("header", element("h1", "Evidence")),
            element("main", evidence_section(rows)),
        ),
        lang="en",
    )
    return f"<!doctype html>\n{page}\n"
