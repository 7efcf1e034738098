"""The plots of a result, drawn from its dataset alone.

`plot_all` writes four PNGs: potentials along the run, differentials against their limits, the
time around the eclipses, and the currents at the worst moments. The same data give the same bytes.
"""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from numpy.typing import NDArray

from charging import __version__
from charging.plot_currents import breakdown_page
from charging.plot_page import (
    FONT,
    INK,
    LIMIT_PEN,
    NEGLIGIBLE_V,
    QUIET,
    SMALL_PT,
    STRUCTURE_PEN,
    Page,
    Pen,
    fit,
    pen,
    printable_glyphs,
    shortened,
    side_labels,
    signed,
    size_in,
    voltage_axis,
)
from charging.plot_surroundings import shade, strips, strips_in
from charging.plot_time import Course, course, daily_extremes, time_axis

Array = NDArray[np.float64]

FEATURED = 12
"""Surfaces with a pen and a name of their own; the others are drawn in quiet grey."""
BEFORE_UMBRA_S, AFTER_PENUMBRA_S = 15.0 * 60.0, 90.0 * 60.0
ONE_ECLIPSE_S = 2.0 * 86400.0
"""Eclipses spread over more than this are too many to zoom on: the worst one is shown."""
ABSOLUTE_LINEAR_V, DIFFERENTIAL_LINEAR_V = 5.0, 50.0


@dataclass(frozen=True, slots=True)
class Line:
    """One line of a plot.

    name : of the node; values [T]; pen : None for one of the rest; bonded : surfaces on the node.
    """

    name: str
    values: Array
    pen: Pen | None
    bonded: tuple[str, ...] = ()

    @property
    def label(self) -> str:
        """Name of the node and of all surfaces on it; a name may hold commas."""
        return "; ".join((self.name, *self.bonded))


@dataclass(frozen=True, slots=True)
class LimitLine:
    """A limit on differentials: signed value [V] and what to call it."""

    value_V: float
    name: str


def plot_all(dataset: xr.Dataset, folder: Path) -> list[Path]:
    """Write potentials.png, differentials.png, detail.png and breakdown.png.

    Parameters
    ----------
    dataset : xarray.Dataset
        A result as `charging.dataset.mode_dataset` gives or `read_result` reads it.
    folder : Path
        Made when it does not exist.

    Returns
    -------
    list of Path
        What was written, in the order above.

    Raises
    ------
    InputError
        A picture cannot be written.
    OSError
        The folder cannot be made.
    """
    folder.mkdir(parents=True, exist_ok=True)
    return [
        draw(dataset).save(folder / f"{name}.png", f"halflit {_version(dataset)}")
        for name, draw in PLOTS.items()
    ]


def potentials_page(dataset: xr.Dataset) -> Page:
    """Draw the potential of structure and surfaces against the plasma along the run."""
    along = course(dataset)
    page = _page(dataset, 5.4, f"Potentials against the plasma{_daily(along)}")
    _, own = _lines(dataset)
    bottom = 0.8
    axes = page.panel(bottom, page.top_in - strips_in(along) - bottom)
    _draw(axes, along, [_structure_line(dataset), *own], ABSOLUTE_LINEAR_V, "potential")
    strips(page, along, page.top_in - strips_in(along) + 0.04)
    return page


def differentials_page(dataset: xr.Dataset) -> Page:
    """Draw surface minus structure of every surface with a node of its own, and the limits."""
    along = course(dataset)
    page = _page(dataset, 5.4, f"Surface minus structure{_daily(along)}")
    bottom = 0.8
    axes = page.panel(bottom, page.top_in - strips_in(along) - bottom)
    _draw_differentials(axes, along, dataset)
    strips(page, along, page.top_in - strips_in(along) + 0.04)
    return page


def detail_page(dataset: xr.Dataset) -> Page:
    """Draw differentials and structure around the eclipses, or the whole run without any."""
    along = course(dataset)
    zoom = detail_window(dataset, along)
    what = "Detail: " + ("whole run" if zoom == along else "around the eclipse")
    page = _page(dataset, 7.2, what + _daily(zoom))
    bottom, low_in, gap = 0.8, 1.75, 0.25
    high_in = page.top_in - strips_in(zoom) - bottom - low_in - gap
    _draw_differentials(page.panel(bottom + low_in + gap, high_in), zoom, dataset, timed=False)
    structure = page.panel(bottom, low_in)
    _draw(structure, zoom, [_structure_line(dataset)], ABSOLUTE_LINEAR_V, "structure")
    strips(page, zoom, page.top_in - strips_in(zoom) + 0.04)
    return page


def currents_page(dataset: xr.Dataset) -> Page:
    """Draw the current densities at the worst moments."""
    page_texts = _texts(dataset, "Currents at the worst moments")
    return breakdown_page(dataset, *page_texts)


PLOTS: dict[str, Callable[[xr.Dataset], Page]] = {
    "potentials": potentials_page,
    "differentials": differentials_page,
    "detail": detail_page,
    "breakdown": currents_page,
}
"""File name without ending, and who draws it."""


def limit_lines(dataset: xr.Dataset) -> list[LimitLine]:
    """Voltage limits that the result carries in its attribute ``limits``; none without it."""
    found: dict[tuple[float, str], None] = {}
    for limit in json.loads(str(dataset.attrs.get("limits", "[]"))):
        if limit["kind"] not in ("normal", "inverted"):
            continue  # a field limit is no voltage
        value = float(limit["limit"]) * (-1.0 if limit["kind"] == "normal" else 1.0)
        of = limit.get("surfaces")
        scope = "" if of is None else f", {of[0]}" if len(of) == 1 else f", {len(of)} surfaces"
        found[value, f"limit {signed(value)} V{scope}"] = None
    return [LimitLine(value, name) for value, name in found]


def detail_window(dataset: xr.Dataset, along: Course) -> Course:
    """Zoom on 15 min before the first umbra to 90 min after the last penumbra.

    The whole run when there is no eclipse or no orbit. Eclipses over more than two days:
    the one nearest to the worst differential.
    """
    umbra = along.umbra or along.penumbra
    if along.fixed or not umbra:
        return along
    first, last = umbra[0], (along.penumbra or umbra)[-1]
    end = max(last.end_s, umbra[-1].end_s)
    if end - first.start_s > ONE_ECLIPSE_S:
        worst = np.argmax(np.abs(dataset["differential_potential"].values).max(axis=0))
        moment = float(along.seconds[worst])
        first = min(umbra, key=lambda s: abs((s.start_s + s.end_s) / 2.0 - moment))
        end = max(
            [s.end_s for s in along.penumbra if 0.0 <= s.start_s - first.end_s < 1.0]
            + [first.end_s]
        )
    return along.zoomed(first.start_s - BEFORE_UMBRA_S, end + AFTER_PENUMBRA_S)


def _lines(dataset: xr.Dataset) -> tuple[list[Line], list[Line]]:
    """Differentials and potentials of the surfaces that have a node of their own.

    A pen belongs to a surface, the same in every plot; `FEATURED` surfaces with the largest
    differentials get one.
    """
    nodes = set(dataset["node_name"].values.tolist())
    names = [str(n) for n in dataset["surface_name"].values]
    own = [i for i, name in enumerate(names) if name in nodes]
    differential = np.asarray(dataset["differential_potential"].values, dtype=np.float64)
    absolute = np.asarray(dataset["potential"].values, dtype=np.float64)
    size = np.abs(differential).max(axis=1)
    featured = sorted(sorted(own, key=lambda i: -size[i])[:FEATURED])
    pens: dict[int, Pen] = {i: pen(k) for k, i in enumerate(featured)}
    both = []
    for values in (differential, absolute):
        lines = []
        for i in own:
            bonded = [names[j] for j in range(len(names))
                      if names[j] not in nodes and size[j] > 0.0
                      and np.array_equal(values[j], values[i])]  # fmt: skip
            lines.append(Line(names[i], values[i], pens.get(i), tuple(bonded)))
        both.append(lines)
    return both[0], both[1]


def _structure_line(dataset: xr.Dataset) -> Line:
    nodes = set(dataset["node_name"].values.tolist())
    moved = np.any(dataset["differential_potential"].values != 0.0, axis=1).tolist()
    bonded = [
        str(name)
        for name, away in zip(dataset["surface_name"].values, moved, strict=True)
        if name not in nodes and not away
    ]
    values = np.asarray(dataset["structure_potential"].values, dtype=np.float64)
    return Line("structure", values, STRUCTURE_PEN, tuple(bonded))


def _draw(axes: Axes, along: Course, lines: list[Line], linear_V: float, name: str, *,
          limits: list[LimitLine] | None = None, air: float = 0.04,
          timed: bool = True) -> None:  # fmt: skip
    """Draw lines over time with shades, limits and the names of all lines."""
    limits = limits or []
    seen = along.visible
    values = [line.values[seen] for line in lines]
    marks = [limit.value_V for limit in limits]
    low = min([float(v.min()) for v in values] + marks, default=0.0)
    high = max([float(v.max()) for v in values] + marks, default=0.0)
    time_axis(axes, along, labelled=timed)
    voltage_axis(axes, low, high, linear_V, name, air=air)
    shade(axes, along)
    labels: list[tuple[str, float, Pen]] = []
    rest = 0
    for line, shown in zip(lines, values, strict=True):
        style = line.pen or Pen(QUIET, (0, ()), 0.5)
        rest += line.pen is None
        above = 4.0 if style is STRUCTURE_PEN else 2.5 if line.pen else 2.0
        end = float(shown[-1])
        for x, y in _traces(along, line.values):
            axes.plot(x, y, color=style.colour, linestyle=style.dashes, linewidth=style.width,
                      zorder=above)  # fmt: skip
            end = float(y[-1]) if along.long and abs(y[-1]) >= abs(end) else end
        if line.pen is not None:
            labels.append((shortened(line.label, 22, lines=3), end, style))
    for limit in limits:
        axes.axhline(limit.value_V, color=LIMIT_PEN.colour, linestyle=LIMIT_PEN.dashes,
                     linewidth=LIMIT_PEN.width, zorder=3.0)  # fmt: skip
        labels.append((shortened(limit.name, 22, lines=2), limit.value_V, LIMIT_PEN))
    if rest:
        labels.append((f"{rest} others, smaller", 0.0, Pen(QUIET, (0, ()), 0.5)))
    side_labels(axes, labels)


def _traces(along: Course, values: Array) -> list[tuple[Array, Array]]:
    """What to draw of a line: all its points on the axis, or its daily extremes."""
    near = np.flatnonzero(along.visible)
    if along.long:
        x, least, most = daily_extremes(along.seconds[near], values[near])
        return [(x, least)] if np.array_equal(least, most) else [(x, least), (x, most)]
    first, last = max(int(near[0]) - 1, 0), min(int(near[-1]) + 2, len(values))
    x = along.seconds[first:last]
    keep = x > 0.0 if along.fixed else np.isfinite(x)  # no zero on a logarithmic axis
    return [(x[keep], values[first:last][keep])]


def _draw_differentials(axes: Axes, along: Course, dataset: xr.Dataset, *,
                        timed: bool = True) -> None:  # fmt: skip
    lines, _ = _lines(dataset)
    largest = max((float(np.abs(line.values).max()) for line in lines), default=0.0)
    linear = float(np.clip(largest / 10.0, 1.0, DIFFERENTIAL_LINEAR_V))
    _draw(axes, along, lines, linear, "surface minus structure", limits=limit_lines(dataset),
          air=0.13, timed=timed)  # fmt: skip
    if not lines:
        axes.text(0.5, 0.6, "every surface is bonded to the structure: no differentials",
                  transform=axes.transAxes, ha="center", size=SMALL_PT, color=INK, family=FONT,
                  bbox={"facecolor": "white", "edgecolor": "none"})  # fmt: skip
        return
    shown = np.flatnonzero(along.visible)
    for sign, kind in ((-1.0, "normal"), (1.0, "inverted")):
        signed_values = sign * np.stack([line.values for line in lines])
        k, at = np.unravel_index(np.argmax(signed_values[:, shown]), (len(lines), len(shown)))
        worst = float(signed_values[k, shown[at]])
        if worst > NEGLIGIBLE_V:
            where = "" if worst == signed_values.max() else " of this window"
            name = shortened(lines[k].name, 30)
            text = f"worst {kind}{where}: {name} {signed(sign * worst)} V"
            _point_out(axes, along, int(shown[at]), sign * worst, text, top=sign > 0.0)


def _point_out(axes: Axes, along: Course, at: int, value: float, text: str, *,
               top: bool) -> None:  # fmt: skip
    """Name an extreme in the free space above or below all lines."""
    seconds = max(float(along.seconds[at]), along.shown[0])
    text = printable_glyphs(f"{text} {along.moment(float(along.seconds[at]))}")
    note = axes.annotate(
        text, (seconds, value), xytext=(0.5, 0.955 if top else 0.045),
        textcoords="axes fraction", ha="center", va="center", size=SMALL_PT, color=INK,
        family=FONT, parse_math=False, zorder=6.0,
        arrowprops={"arrowstyle": "-", "color": INK, "linewidth": 0.7, "shrinkA": 1.0,
                    "shrinkB": 2.5},
    )  # fmt: skip
    width = size_in(axes)[0]
    half = fit(note, 0.98 * width) / width / 2.0
    to_axes = axes.transData + axes.transAxes.inverted()
    x = float(to_axes.transform((seconds, value))[0])
    note.set_x(min(max(x, half + 0.01), 0.99 - half))
    axes.plot([seconds], [value], marker="o", markersize=4.5, markerfacecolor="white",
              markeredgecolor=INK, markeredgewidth=1.0, zorder=5.0, clip_on=False)  # fmt: skip


def _daily(along: Course) -> str:
    return ", lowest and highest of each day" if along.long else ""


def _version(dataset: xr.Dataset) -> str:
    return str(dataset.attrs.get("halflit_version", __version__))


def _texts(dataset: xr.Dataset, what: str) -> tuple[str, str, str]:
    """Title, line below it and footer of a page."""
    parts = [what, f"mode {dataset.attrs.get('mode', 'base')}"]
    if "secondary_law" in dataset.attrs:
        law = str(dataset.attrs["secondary_law"]).replace("_", " ").title()
        parts.append(f"secondary emission {law}")
    return (
        str(dataset.attrs.get("title", "halflit result")),
        " · ".join(parts),
        f"halflit {_version(dataset)} - an estimate; standards and specialists decide",
    )


def _page(dataset: xr.Dataset, height_in: float, what: str) -> Page:
    return Page(height_in, *_texts(dataset, what))
