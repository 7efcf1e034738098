"""Figures of a report as SVG, each with the hash of the run."""

from __future__ import annotations

import io
import re
from collections.abc import Mapping, Sequence
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any, NamedTuple

import numpy as np
from matplotlib import rc_context
from matplotlib.axes import Axes

from charging.clock import iso_time
from charging.dataset import mode_dataset
from charging.orbit_run import CaseRun
from charging.plot_page import (
    ALARM,
    COLOURS,
    FAINT,
    FONT,
    INK,
    QUIET,
    SMALL_PT,
    WIDTH_IN,
    Page,
    printable_glyphs,
    shortened,
)
from charging.plots import currents_page, detail_page, differentials_page, potentials_page
from charging.review.assess import Row
from charging.review.check import Review
from charging.review.markup import Markup, visible
from charging.review.narrative import words

ROW_IN = 0.3
NAMES_IN = 3.3
MOST_ROWS = 40
MOST_BARS = 12
SMALLEST, LARGEST = 1e-3, 1e3
WITHIN_MARK, EXCEEDED_MARK, UNKNOWN_MARK = "o", "X", "D"


class Figure(NamedTuple):
    """A figure: anchor, caption, what it shows in words, and its SVG."""

    anchor: str
    caption: str
    description: str
    svg: Markup


def figures(review: Review, document: Mapping[str, Any]) -> list[Figure]:
    """Draw all figures of a report."""
    short = str(document["run_hash"])[:12]
    footer = (
        f"halflit {document['halflit_version']} - an estimate; standards and specialists decide"
    )
    found = []
    rows = [row for row in document["limits"] if not row["bonded"]][:MOST_ROWS]
    if rows:
        found.append(_margins(rows, document, short, footer))
    live = [row for row in review.rows if not row.corner.trivial]
    if live and live[0].corner.sensitivities:
        found.append(_tornado(live[0], document, short, footer))
    cell, member = _shown(review, live)
    if review.loaded.case.shape:
        found.append(_shape(review, live, short))
    dataset = mode_dataset(CaseRun(review.loaded, (cell.run,)), cell.run, member)
    what = f"mode {cell.scene.mode}, plasma {cell.scene.plasma}, {cell.variants[member].law}"
    for anchor, draw, caption, description in PAGES:
        found.append(_page(anchor, draw(dataset), f"{caption} ({what})", description, short))
    return found


PAGES = (
    (
        "figure-potentials",
        potentials_page,
        "Potentials against the plasma along the run",
        "Lines of potential over time for structure and every surface with a node of its own, "
        "with strips of light and plasma on top; extremes are in the tables.",
    ),
    (
        "figure-differentials",
        differentials_page,
        "Surface minus structure along the run, with the limits",
        "Lines of surface minus structure over time, dashed lines at the limits; the worst moments "
        "are in the table of worst pairs.",
    ),
    (
        "figure-detail",
        detail_page,
        "Time around the eclipses, or the whole run without any",
        "The same lines around the eclipse, with structure below and the strips of umbra, penumbra "
        "and plasma on top.",
    ),
    (
        "figure-currents",
        currents_page,
        "Current densities by mechanism at the worst moments",
        "Bars of current density by mechanism on the surface with the worst difference and on the "
        "largest faces of structure, with their numbers.",
    ),
)


def _shown(review: Review, live: Sequence[Row]) -> tuple[Any, int]:
    """Nominal run that the figures show: that of the worst row."""
    if not live:
        return review.cells[0], 0
    place = live[0].nominal
    return review.cells[place.cell], place.variant


def _shape(review: Review, live: Sequence[Row], short: str) -> Figure:
    """Shapes coloured by potential at the worst moment of the worst limit."""
    from charging.shape.picture import shape_picture  # 3-D axes load only with shapes
    from charging.shape.views import wings_of

    case = review.loaded.case
    cell, member = _shown(review, live)
    time_s = live[0].nominal.time_s if live else 0.0
    run = cell.run
    sun, illumination, leg = run.way.sun_in_body(time_s)
    state = run.trajectories[member](np.array([time_s]))
    volts = run.balance.net.of(member).potentials(state)[0]
    nodes = run.balance.net.surface_node
    when = iso_time(case.epoch, time_s)
    with TemporaryDirectory() as folder, rc_context({"svg.hashsalt": "figure-shape"}):
        file = shape_picture(
            case,
            Path(folder) / "shape.svg",
            sun_body=sun if illumination > 0.0 else np.zeros(3),
            wings=wings_of(leg),
            potential_V=dict(zip(case.names, volts[nodes].tolist(), strict=True)),
            structure_V=float(volts[0]),
            caption=f"{when}, mode {cell.scene.mode}; run {short}",
        )
        text = file.read_text(encoding="utf-8")
    caption = f"Shapes coloured by potential at {when} (mode {cell.scene.mode})"
    return Figure(
        "figure-shape",
        caption,
        "The spacecraft from two sides with numbered surfaces; names and potentials stand beside "
        "it.",
        cleaned(text, "figure-shape", caption),
    )


def _margins(
    rows: Sequence[Mapping[str, Any]], document: Mapping[str, Any], short: str, footer: str
) -> Figure:
    height = ROW_IN * len(rows) + 1.5
    page = Page(
        height, str(document["title"]), "Value over limit, nominal and corner; 1 is the limit",
        footer,
    )  # fmt: skip
    axes = page.panel(0.75, page.top_in - 0.85, NAMES_IN, WIDTH_IN - NAMES_IN - 0.35)
    y = np.arange(len(rows))[::-1]
    for k, row in zip(y, rows, strict=True):
        sizes = [
            float(np.clip(_size(row, row[name]) / row["allowed"], SMALLEST, LARGEST))
            for name in ("nominal_value", "corner_value")
            if row[name] is not None
        ]
        exceeded = row["verdict"] == "exceeded"
        tone = ALARM if exceeded else COLOURS[0]
        mark = {"exceeded": EXCEEDED_MARK, "within": WITHIN_MARK}.get(row["verdict"], UNKNOWN_MARK)
        axes.plot(sizes, [k] * len(sizes), color=tone, linewidth=1.0, zorder=2.0)
        axes.plot(sizes[:1], [k], marker="|", markersize=9, color=tone, zorder=3.0)
        axes.plot(sizes[-1:], [k], marker=mark, markersize=6, color=tone, zorder=3.0)
    axes.axvline(1.0, color=INK, linewidth=1.2, linestyle=(0, (9.0, 3.0)))
    axes.set_xscale("log")
    axes.set_xlim(SMALLEST / 1.5, LARGEST * 1.5)
    axes.set_ylim(-0.6, len(rows) - 0.4)
    axes.grid(axis="x", color=FAINT, linewidth=0.6)
    axes.set_axisbelow(True)
    names = [
        printable_glyphs(
            f"{shortened(r['surface'], 24)} / {shortened(r['against'], 12)}, {r['kind']}"
        )
        for r in rows
    ]
    _names(axes, y, names)
    _label(axes, "value over limit (ends of the axis: or beyond)\nbar nominal; cross exceeded, "
                 "circle within, diamond not assessable")  # fmt: skip
    return _page(
        "figure-margins",
        page,
        "Every limit: value over limit at the values of the records and at the corner",
        "One line per limit from the nominal value to the corner, against a dashed line at the "
        "limit; the numbers are in the compliance matrix.",
        short,
    )


def _size(row: Mapping[str, Any], value: float) -> float:
    from charging.review.limits import size_of

    return size_of(row["kind"], value)


def _tornado(row: Row, document: Mapping[str, Any], short: str, footer: str) -> Figure:
    effects = [s for s in row.corner.sensitivities if s.reach > 0.0][:MOST_BARS]
    height = ROW_IN * max(len(effects), 1) + 1.5
    name = f"{row.quantity.surface or 'structure'} against {row.quantity.against}"
    page = Page(height, str(document["title"]), f"What moves {row.quantity.kind}: {name}", footer)
    axes = page.panel(0.75, page.top_in - 0.85, NAMES_IN, WIDTH_IN - NAMES_IN - 0.35)
    y = np.arange(len(effects))[::-1]
    for k, effect in zip(y, effects, strict=True):
        for value, tone, hatch in ((effect.low, COLOURS[0], ""), (effect.high, COLOURS[3], "////")):
            axes.barh(k, value - effect.nominal, left=effect.nominal, height=0.55, color=tone,
                      hatch=hatch, edgecolor=INK, linewidth=0.4, alpha=0.9)  # fmt: skip
    axes.axvline(effects[0].nominal if effects else 0.0, color=INK, linewidth=0.8)
    axes.set_ylim(-0.6, len(effects) - 0.4)
    axes.grid(axis="x", color=FAINT, linewidth=0.6)
    axes.set_axisbelow(True)
    axes.locator_params(axis="x", nbins=5)
    names = [
        printable_glyphs(shortened(f"{words(s.of.key)}, {s.of.material}", 46))
        + ("" if s.monotone else " (not monotone)")
        for s in effects
    ]
    _names(axes, y, names)
    unit = {"field": "V/m", "energy": "J"}.get(row.quantity.kind, "V")
    _label(axes, f"{unit}, with the property at the low (plain) or high (hatched) end of its "
                 "spread")  # fmt: skip
    return _page(
        "figure-sensitivities",
        page,
        f"Sensitivities of the worst limit ({name}, {row.quantity.kind})",
        "Bars from the nominal value to the value with one property at either end of its spread; "
        "the numbers are in the table of sensitivities.",
        short,
    )


def _names(axes: Axes, y: Any, names: Sequence[str]) -> None:
    axes.set_yticks(y, names)
    for text in axes.get_yticklabels():
        text.set_parse_math(False)
        text.set_fontsize(SMALL_PT)
        text.set_fontfamily(FONT)
    axes.tick_params(axis="y", length=0.0)


def _label(axes: Axes, text: str) -> None:
    axes.set_xlabel(text, size=SMALL_PT, color=QUIET, family=FONT)


def _page(anchor: str, page: Page, caption: str, description: str, short: str) -> Figure:
    page.write(WIDTH_IN - 1.55, 0.1, f"run {short}", size=7.0, colour=QUIET, vertical="bottom")
    return Figure(anchor, caption, description, svg(page, anchor, caption))


def svg(page: Page, anchor: str, label: str) -> Markup:
    """SVG of a page, with names that no other figure of the report has.

    Texts are drawn as outlines, so that they look the same everywhere; what a reader of the
    screen needs is in the label.
    """
    target = io.StringIO()
    with rc_context({"svg.hashsalt": anchor, "svg.fonttype": "path"}):
        page.figure.savefig(target, format="svg", metadata={"Date": None, "Creator": None})
    return cleaned(target.getvalue(), anchor, label)


def cleaned(text: str, anchor: str, label: str) -> Markup:
    """Make an SVG document part of a page: no comments, no metadata, identifiers of its own."""
    from html import escape

    text = re.sub(r"<!--.*?-->", "", text[text.index("<svg") :], flags=re.DOTALL)
    text = re.sub(r"<metadata>.*?</metadata>", "", text, flags=re.DOTALL)
    text = re.sub(r'\bid="', f'id="{anchor}-', text)
    text = text.replace("url(#", f"url(#{anchor}-").replace('href="#', f'href="#{anchor}-')
    head = f'<svg role="img" aria-label="{escape(visible(label), quote=True)}" class="figure" '
    text = re.sub(r"^<svg ", head, text)
    text = re.sub(r'^(<svg[^>]*?) width="[^"]*"', r"\1", text)
    return Markup(re.sub(r'^(<svg[^>]*?) height="[^"]*"', r"\1", text).strip())
