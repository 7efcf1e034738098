"""Pictures of a sweep: a map of choices against limits, and what drives the first of them."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np
from matplotlib.colors import Normalize
from numpy.typing import NDArray

from charging import __version__
from charging.plot_page import WIDTH_IN, Page, printable_glyphs, text_width_in
from charging.study.plan import Plan
from charging.study.ranking import ChoiceRow

Array = NDArray[np.float64]

SOFTWARE = f"halflit {__version__}"
NAME_PT, ROW_IN = 7.5, 0.3
MOST_ROWS, MOST_COLUMNS, MOST_DRIVERS = 40, 16, 10
FOOTER = (
    "An estimate. Program requirements, applicable standards and qualified specialists decide. "
    "Probabilities are conditional on assumed spreads."
)


def heat_map(plan: Plan, rows: Sequence[ChoiceRow], target: Path) -> None:
    """Probability of exceeding each limit, choice by choice; every cell carries its number.

    Choices carry their ranks, so that long labels can be found in ranking.csv.
    """
    limits = _shown_limits(rows)
    shown = rows[:MOST_ROWS]
    value = np.full((len(shown), max(1, len(limits))), np.nan)
    for i, row in enumerate(shown):
        known = {one.limit: one.exceed.value for one in row.limits}
        value[i, : len(limits)] = [known.get(limit, np.nan) for limit in limits]
    names = [middle_left_out(f"{i}  {row.choice}", 46) for i, row in enumerate(shown, 1)]
    below = [middle_left_out(one, 34) for one in limits]
    # names under the map lean by 40 degrees
    foot = 0.5 + 0.66 * max((text_width_in(name, NAME_PT) for name in below), default=0.0)
    height = 0.9 + ROW_IN * len(shown) + foot
    page = Page(
        height, plan.file.title,
        f"share of draws that exceed a limit; {plan.draws} draws per choice; choices by rank",
        FOOTER,
    )  # fmt: skip
    left = 0.3 + max(text_width_in(name, NAME_PT) for name in names)
    left = max(left, 1.6)
    width = min(WIDTH_IN - left - 0.25, 0.8 * value.shape[1])
    axes = page.figure.add_axes(
        (left / WIDTH_IN, foot / height, width / WIDTH_IN, ROW_IN * len(shown) / height)
    )
    axes.imshow(
        np.ma.masked_invalid(value), aspect="auto", cmap="cividis_r", norm=Normalize(0.0, 1.0)
    )
    for i, j in np.ndindex(value.shape):
        dark = bool(value[i, j] > 0.55)
        axes.text(j, i, _share(float(value[i, j])), ha="center", va="center", fontsize=7,
                  color="white" if dark else "black")  # fmt: skip
    axes.set_yticks(range(len(shown)), names, fontsize=NAME_PT, parse_math=False)
    axes.set_xticks(range(len(limits)), below, fontsize=NAME_PT, rotation=40, ha="right",
                    rotation_mode="anchor", parse_math=False)  # fmt: skip
    axes.tick_params(length=0)
    page.save(target, SOFTWARE)


def _share(value: float) -> str:
    if not np.isfinite(value):
        return "–"
    if value == 0.0:
        return "0"
    return "<0.01" if value < 0.01 else ">0.99" if 0.99 < value < 1.0 else f"{value:.2f}"


def middle_left_out(text: str, width: int) -> str:
    """A text in at most `width` characters: its beginning and its end tell it from others.

    Examples
    --------
    >>> middle_left_out("material.polyimide film.secondary_yield_peak", 32)
    'material.polyim…ndary_yield_peak'
    """
    text = printable_glyphs(" ".join(text.split()))
    if len(text) <= width:
        return text
    head = (width - 2) // 2
    return f"{text[:head].rstrip()}…{text[len(text) - (width - 1 - head) :].lstrip()}"


def _shown_limits(rows: Sequence[ChoiceRow]) -> list[str]:
    """Limits that any draw exceeds first, then the nearest ones."""
    worst: dict[str, tuple[float, float]] = {}
    for row in rows:
        for one in row.limits:
            near = abs(one.worst) / one.allowed if np.isfinite(one.worst) else 0.0
            old = worst.get(one.limit, (0.0, 0.0))
            worst[one.limit] = (max(old[0], one.exceed.value), max(old[1], near))
    order = sorted(worst, key=lambda name: worst[name], reverse=True)
    return order[:MOST_COLUMNS]


def tornado(row: ChoiceRow, target: Path) -> None:
    """Rank correlation of the strongest factors with the severity, for one choice."""
    drivers = row.drivers[:MOST_DRIVERS]
    height = 1.95 + 0.3 * max(1, len(drivers))
    page = Page(
        height, f"What drives: {row.choice}",
        "rank correlation of drawn values with the largest |value|/limit", FOOTER,
    )  # fmt: skip
    axes = page.figure.add_axes((0.44, 0.9 / height, 0.5, 0.3 * max(1, len(drivers)) / height))
    place = np.arange(len(drivers))
    value = [correlation for _, correlation in drivers]
    axes.barh(
        place, value, height=0.6, color=["#33508a" if v >= 0.0 else "#c98a1b" for v in value],
        hatch=["" if v >= 0.0 else "///" for v in value], edgecolor="white",
    )  # fmt: skip
    for y, v in zip(place, value, strict=True):
        side = 1.0 if v >= 0.0 else -1.0
        axes.text(v + 0.02 * side, float(y), f"{v:+.2f}", va="center", fontsize=7.5,
                  ha="left" if v >= 0.0 else "right")  # fmt: skip
    axes.set_yticks(place, [_property(name) for name, _ in drivers], fontsize=NAME_PT,
                    parse_math=False)  # fmt: skip
    axes.invert_yaxis()
    axes.set_xlim(-1.15, 1.15)
    axes.axvline(0.0, color="#333333", linewidth=0.8)
    axes.set_xlabel("larger value worsens (right), eases (left)", fontsize=8)
    axes.tick_params(axis="x", labelsize=7.5)
    for edge in ("top", "right", "left"):
        axes.spines[edge].set_visible(False)
    page.save(target, SOFTWARE)


def _property(name: str) -> str:
    """Name of a factor: the property first, which tells most."""
    start, _, key = name.rpartition(".")
    return middle_left_out(f"{key}: {start.partition('.')[2] or start}", 52)
