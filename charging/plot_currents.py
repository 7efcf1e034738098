"""Which currents act on a surface at its worst moment, drawn as bars."""

from __future__ import annotations

from dataclasses import dataclass
from math import floor, log10

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from numpy.typing import NDArray

from charging.plot_page import (
    FAINT,
    FONT,
    INK,
    NEGLIGIBLE_V,
    QUIET,
    SMALL_PT,
    WIDTH_IN,
    Page,
    even_ticks,
    plain,
    shortened,
    signed,
)
from charging.plot_time import course

Array = NDArray[np.float64]

ARRIVING, LEAVING = "#b5482a", "#1f4e8c"
PATCH_TONES = ("#3d4650", "#8b97a3", "#c9d0d6")
MOST_PATCHES = len(PATCH_TONES)
NAMES_IN, GAP_IN = 1.55, 0.35
BAR_IN, GROUP_GAP_IN = 0.125, 0.08
THICKEST_IN = 0.2
HEAD_IN, FOOT_IN = 0.84, 0.66
NAMES = {"ion_induced_secondary": "ion-induced secondary", "bias_or_emitter": "bias or emitter"}


@dataclass(frozen=True, slots=True)
class Column:
    """Bars of one panel: a heading and current densities [µA m-2] per bar and mechanism."""

    heading: str
    bars: tuple[str, ...]
    values_uA_m2: Array


@dataclass(frozen=True, slots=True)
class Moment:
    """A moment worth a row of panels."""

    heading: str
    columns: tuple[Column, ...]


def worst_moments(dataset: xr.Dataset) -> list[tuple[str, int | None, int]]:
    """Kind, surface and output time of the worst differentials, both signs.

    Without any differential: the structure where it is farthest from the plasma.

    Returns
    -------
    list of (kind, index of the surface or None, index of the time)
        kind "normal" (surface below structure), "inverted" (above) or "structure".
    """
    differential = dataset["differential_potential"].values
    found: list[tuple[str, int | None, int]] = []
    for kind, sign in (("normal", -1.0), ("inverted", 1.0)):
        surface, time = np.unravel_index(np.argmax(sign * differential), differential.shape)
        if sign * differential[surface, time] > NEGLIGIBLE_V:
            found.append((kind, int(surface), int(time)))
    if not found:
        farthest = np.argmax(np.abs(dataset["structure_potential"].values))
        found.append(("structure", None, int(farthest)))
    return found


def structure_patches(dataset: xr.Dataset) -> list[int]:
    """Surfaces that are part of the structure, the largest first."""
    nodes = set(dataset["node_name"].values.tolist())
    own = dataset["differential_potential"].values
    area = dataset["surface_area"].values
    bonded = [
        i
        for i, name in enumerate(dataset["surface_name"].values.tolist())
        if name not in nodes and not own[i].any()
    ]
    return sorted(bonded, key=lambda i: -float(area[i]))


def mechanism_label(name: str) -> str:
    """Write a mechanism in words.

    Examples
    --------
    >>> mechanism_label("electron_collection"), mechanism_label("ion_induced_secondary")
    ('electron collection', 'ion-induced secondary')
    """
    return NAMES.get(name, name.replace("_", " "))


def current(value: float, largest: float) -> str:
    """Write a current density beside its bar, to a thousandth of the largest one or so.

    Examples
    --------
    >>> current(-0.75614, 5.3), current(0.00003, 5.3), current(0.0, 5.3)
    ('−0.756', '≈ 0', '0')
    """
    if value == 0.0:
        return "0"
    digits = max(0, 3 - floor(log10(largest)))
    text = f"{abs(value):.{digits}f}"
    if not float(text):
        return "≈ 0"
    return ("−" if value < 0.0 else "+") + text


def breakdown_page(dataset: xr.Dataset, title: str, subtitle: str, footer: str) -> Page:
    """Draw the currents on the surfaces of the worst moments and on the structure's patches."""
    moments = [_moment(dataset, *found) for found in worst_moments(dataset)]
    all_values = np.concatenate(
        [column.values_uA_m2 for moment in moments for column in moment.columns]
    )
    acting = np.flatnonzero(np.any(all_values != 0.0, axis=0))
    names = [mechanism_label(str(n)) for n in dataset["mechanism_name"].values[acting]]
    most_bars = max(len(column.bars) for moment in moments for column in moment.columns)
    pitch = max(most_bars, 2) * BAR_IN + GROUP_GAP_IN
    height = (len(names) + 1) * pitch
    row = height + HEAD_IN + FOOT_IN
    lines = shortened(title, 92, lines=2).count("\n")
    page = Page(len(moments) * row + 0.85 + 0.19 * lines, title, subtitle, footer)
    top = page.top_in
    for moment in moments:
        bottom = top - HEAD_IN - height
        page.write(0.25, top - 0.03, moment.heading, weight="bold")
        count = len(moment.columns)
        width = (WIDTH_IN - NAMES_IN - 0.25 - (count - 1) * GAP_IN) / count
        shown = np.concatenate([_with_sum(c.values_uA_m2).ravel() for c in moment.columns])
        reach = (min(0.0, float(shown.min())), max(0.0, float(shown.max())))
        for k, column in enumerate(moment.columns):
            axes = page.panel(bottom, height, NAMES_IN + k * (width + GAP_IN), width)
            _bars(axes, column, acting, pitch, reach)
            axes.set_yticks(np.arange(len(names) + 1) * pitch,
                            [*names, "sum"] if k == 0 else [""] * (len(names) + 1))  # fmt: skip
            _heading(page, column, NAMES_IN + k * (width + GAP_IN), bottom + height, width)
        top -= row
    return page


def _moment(dataset: xr.Dataset, kind: str, surface: int | None, time: int) -> Moment:
    along = course(dataset)
    names = [str(n) for n in dataset["surface_name"].values]
    area = dataset["surface_area"].values
    density = 1e6 * np.asarray(dataset["current_density"].values[:, :, time].T, dtype=np.float64)
    when = along.moment(float(along.seconds[time]))
    structure = float(dataset["structure_potential"].values[time])
    columns = []
    if surface is None:
        text = f"Structure farthest from the plasma: {signed(structure)} V {when}"
    else:
        difference = float(dataset["differential_potential"].values[surface, time])
        own = float(dataset["potential"].values[surface, time])
        name = shortened(names[surface], 40)
        side = "below" if kind == "normal" else "above"
        text = (
            f"Worst {kind} differential: {name}, {abs(difference):.4g} V {side} "
            f"the structure, {when}"
        )
        columns.append(
            Column(
                f"{shortened(names[surface], 26)} at {signed(own)} V",
                (names[surface],),
                density[[surface]],
            )
        )
    patches = structure_patches(dataset)
    kept = patches[:MOST_PATCHES]
    if kept:
        more = len(patches) - len(kept)
        rest = f", {more} smaller not shown" if more else ""
        columns.append(
            Column(
                f"structure at {signed(structure)} V{rest}",
                tuple(f"{shortened(names[i], 34)} ({area[i]:.3g} m²)" for i in kept),
                density[kept],
            )
        )
    if not columns:  # nothing is bonded and nothing differs: show the largest surface
        largest = int(np.argmax(area))
        columns.append(Column(shortened(names[largest], 40), (names[largest],), density[[largest]]))
    return Moment(text, tuple(columns))


def _with_sum(values: Array) -> Array:
    return np.concatenate((values, values.sum(axis=1, keepdims=True)), axis=1)


def _bars(axes: Axes, column: Column, acting: NDArray[np.intp], pitch: float,
          reach: tuple[float, float]) -> None:  # fmt: skip
    values = _with_sum(column.values_uA_m2)
    rows = [*acting.tolist(), values.shape[1] - 1]
    count = len(column.bars)
    largest = max(reach[1], -reach[0])
    thick = min(THICKEST_IN, (pitch - GROUP_GAP_IN) / count)
    for place, mechanism in enumerate(rows):
        for bar in range(count):
            value = float(values[bar, mechanism])
            y = place * pitch + (bar - (count - 1) / 2.0) * thick
            tone = PATCH_TONES[bar] if count > 1 else (ARRIVING if value > 0.0 else LEAVING)
            axes.barh(y, value, height=0.82 * thick, color=tone, edgecolor=INK, linewidth=0.4,
                      zorder=2.0)  # fmt: skip
            axes.annotate(
                current(value, largest),
                (value, y),
                xytext=(3.0 if value >= 0.0 else -3.0, -0.4),
                textcoords="offset points",
                ha="left" if value >= 0.0 else "right",
                va="center",
                size=7.0,
                color=INK if value else QUIET,
                family=FONT,
            )
    axes.axvline(0.0, color=INK, linewidth=0.8, zorder=3.0)
    axes.axhline((len(rows) - 1.5) * pitch, color=QUIET, linewidth=0.6, zorder=1.0)
    axes.grid(axis="x", color=FAINT, linewidth=0.6)
    axes.set_axisbelow(True)
    air = 0.24 * (reach[1] - reach[0]) or 1.0  # for the numbers
    axes.set_xlim(reach[0] - air, reach[1] + air)
    ticks = even_ticks(reach[0] - air, reach[1] + air, 5)
    axes.set_xticks(ticks, [plain(t) for t in ticks])
    axes.set_ylim((len(rows) - 0.5) * pitch, -0.5 * pitch)
    axes.tick_params(axis="y", length=0.0)
    axes.spines["left"].set_visible(False)
    axes.set_xlabel("current density (µA m⁻²)\npositive = positive charge arriving",
                    size=SMALL_PT, color=INK, family=FONT)  # fmt: skip


def _heading(page: Page, column: Column, left: float, top: float, room: float) -> None:
    lines = column.heading
    if len(column.bars) == 1 and column.heading.startswith("structure"):
        lines += f": {column.bars[0]}"
    if len(column.bars) == 1:
        page.write(left, top + 0.08, lines, vertical="bottom", room=room)
        return
    step = 0.135
    base = top + 0.06
    page.write(left, base + step * len(column.bars) + 0.02, lines, vertical="bottom", room=room)
    for k, bar in enumerate(reversed(column.bars)):
        tone = PATCH_TONES[len(column.bars) - 1 - k]
        page.swatch(left, base + step * k + 0.025, tone)
        page.write(left + 0.2, base + step * k, bar, size=7.2, vertical="bottom", room=room - 0.2)
