"""The page of a plot: sheet, palette, volt axes, labels beside the lines, files.

Figures are drawn on their own canvas; no global state of matplotlib is read or changed.
"""

from __future__ import annotations

import textwrap
from collections.abc import Sequence
from dataclasses import dataclass, field
from math import ceil, floor, log10
from pathlib import Path

import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.font_manager import findfont, get_font
from matplotlib.patches import Rectangle
from matplotlib.text import Text
from matplotlib.ticker import MaxNLocator, NullLocator
from numpy.typing import NDArray

from charging.written_file import written_file

Array = NDArray[np.float64]
Dashes = tuple[int, tuple[float, ...]]

DPI = 200
WIDTH_IN = 8.0
LEFT_IN, RIGHT_IN = 0.95, 1.95
"""Margins of a panel: axis labels left, names of the lines right."""

TEXT_PT, SMALL_PT, TITLE_PT = 8.5, 8.0, 10.5
FONT = "DejaVu Sans"
"""Comes with matplotlib, so that pictures look alike everywhere."""

NEGLIGIBLE_V = 1e-3
"""Differentials below the accuracy of an equilibrium are no worst case of anything."""

NARROW = 4.0
"""Ratio of the extremes below which values of one sign need no logarithm."""

INK, QUIET, FAINT, ALARM = "#1b1f24", "#59626c", "#d5dade", "#9c1f1f"
UMBRA, PENUMBRA, SUNLIT, EVENT, CALM = "#33383f", "#a9adb3", "#fbf3d9", "#e3b98a", "#eef1f3"

COLOURS = (
    "#1f4e8c", "#b5482a", "#2a8c82", "#c8932b", "#6d3f7f", "#7d8a97", "#66752f", "#b0768f",
)  # fmt: skip
DASHES: tuple[Dashes, ...] = (
    (0, ()),
    (0, (5.0, 1.6)),
    (0, (1.3, 1.3)),
    (0, (7.0, 1.5, 1.3, 1.5)),
    (0, (12.0, 1.8)),
    (0, (2.8, 1.2)),
    (0, (6.0, 1.3, 1.3, 1.3, 1.3, 1.3)),
    (0, (9.0, 1.5, 3.0, 1.5)),
)


@dataclass(frozen=True, slots=True)
class Pen:
    """How a line is drawn; dashes tell lines apart where colour does not."""

    colour: str
    dashes: Dashes
    width: float = 1.3


STRUCTURE_PEN = Pen(INK, DASHES[0], 2.0)
LIMIT_PEN = Pen(ALARM, (0, (9.0, 3.0)), 1.1)


def pen(number: int) -> Pen:
    """Pen of the line with a number: 64 different ones, then they repeat.

    Eight neighbours differ in dashes alone, so that a grey copy can be read, too.
    """
    return Pen(
        COLOURS[number % len(COLOURS)], DASHES[(number + number // len(COLOURS)) % len(DASHES)]
    )


@dataclass(slots=True)
class Page:
    """One sheet with a title on top and a caution at the bottom; lengths in inches."""

    height_in: float
    title: str
    subtitle: str
    footer: str
    figure: Figure = field(init=False)

    def __post_init__(self) -> None:
        self.figure = Figure(figsize=(WIDTH_IN, self.height_in), dpi=DPI, facecolor="white")
        FigureCanvasAgg(self.figure)
        lines = shortened(self.title, 92, lines=2)
        left = 0.25
        top = self.height_in - 0.12
        self.write(left, top, lines, size=TITLE_PT, weight="bold")
        self.write(left, top - 0.19 * (1 + lines.count("\n")), self.subtitle, colour=QUIET)
        self.write(left, 0.1, self.footer, size=7.0, colour=QUIET, vertical="bottom")

    @property
    def top_in(self) -> float:
        """Height of the free sheet below the title."""
        return self.height_in - 0.55 - 0.19 * shortened(self.title, 92, lines=2).count("\n")

    def panel(self, bottom: float, height: float, left: float = LEFT_IN,
              width: float = WIDTH_IN - LEFT_IN - RIGHT_IN) -> Axes:  # fmt: skip
        """Add a panel with quiet frame and horizontal grid."""
        sheet = (WIDTH_IN, self.height_in)
        axes = self.figure.add_axes(
            (left / sheet[0], bottom / sheet[1], width / sheet[0], height / sheet[1])
        )
        axes.set_facecolor("white")
        axes.tick_params(labelsize=SMALL_PT, color=QUIET, labelcolor=INK, labelfontfamily=FONT)
        for side, spine in axes.spines.items():
            spine.set_color(QUIET)
            spine.set_linewidth(0.7)
            spine.set_visible(side in ("left", "bottom"))
        return axes

    def write(self, x: float, y: float, text: str, *, size: float = SMALL_PT,
              colour: str = INK, weight: str = "normal",
              vertical: str = "top", room: float | None = None) -> None:  # fmt: skip
        """Write text at a place of the sheet, smaller where it would leave its room."""
        written = self.figure.text(
            x / WIDTH_IN,
            y / self.height_in,
            printable_glyphs(text),
            size=size,
            color=colour,
            weight=weight,
            va=vertical,
            family=FONT,
            parse_math=False,
        )
        fit(written, WIDTH_IN - x - 0.1 if room is None else room)

    def swatch(self, x: float, y: float, colour: str) -> None:
        """Draw a small bar of a colour at a place of the sheet."""
        self.figure.add_artist(
            Rectangle((x / WIDTH_IN, y / self.height_in), 0.15 / WIDTH_IN, 0.08 / self.height_in,
                      transform=self.figure.transFigure, facecolor=colour, edgecolor=INK,
                      linewidth=0.4)
        )  # fmt: skip

    def save(self, target: Path, software: str) -> Path:
        """Write the PNG as a whole, without a date, and return its path."""
        with written_file(target, option="--out") as scratch:
            self.figure.savefig(
                scratch,
                format="png",
                dpi=DPI,
                metadata={"Software": software},
                pil_kwargs={"compress_level": 1},  # four times as fast, a quarter larger
            )
        return target


def size_in(axes: Axes) -> tuple[float, float]:
    """Width and height of a panel [in]."""
    figure = axes.get_figure(root=True)
    assert figure is not None
    box = axes.get_position()
    width, height = figure.get_size_inches()
    return float(box.width * width), float(box.height * height)


def text_width_in(text: str, size: float = SMALL_PT) -> float:
    """Width of a text [in] as its longest line would be drawn, with some air.

    Examples
    --------
    >>> text_width_in("umbra") < text_width_in("penumbra") < 1.0
    True
    """
    return max(len(line) for line in text.split("\n")) * 0.58 * size / 72.0 + 0.04


def printable_glyphs(text: str) -> str:
    """Replace characters that the font lacks, so that a title never stops a plot.

    Examples
    --------
    >>> printable_glyphs("Größe 衛星")
    'Größe □□'
    """
    font = get_font(findfont(FONT))
    return "".join(c if c == "\n" or font.get_char_index(ord(c)) else "□" for c in text)


def shortened(text: str, width: int, *, lines: int = 1) -> str:
    r"""Break a text into at most so many lines; what is left out shows as …

    Examples
    --------
    >>> shortened("array cover glass, outer half", 18, lines=2)
    'array cover glass,\nouter half'
    >>> shortened("array cover glass, outer half", 18)
    'array cover glass…'
    """
    found = textwrap.wrap(" ".join(text.split()), width)
    if len(found) > lines:
        last = found[lines - 1][: width - 1].rstrip(" ,;")
        found = [*found[: lines - 1], f"{last}…"]
    return "\n".join(found)


def signed(value: float) -> str:
    """Write a number with sign and three digits, or whole from 100 on.

    Examples
    --------
    >>> signed(-1390.8), signed(4.211), signed(0.0), signed(-0.00004)
    ('−1391', '+4.21', '0', '−4e-05')
    """
    if value == 0.0:
        return "0"
    text = f"{abs(value):.0f}" if abs(value) >= 99.95 else f"{abs(value):.3g}"
    return ("−" if value < 0.0 else "+") + text


def plain(value: float) -> str:
    """Write a tick with a true minus sign and without needless digits.

    Examples
    --------
    >>> plain(-10000.0), plain(0.5)
    ('−10000', '0.5')
    """
    return f"{value:.10g}".replace("-", "−")


def even_ticks(low: float, high: float, most: int) -> list[float]:
    """Round values at equal distances within an axis.

    Examples
    --------
    >>> even_ticks(-2.9, 6.9, 5)
    [-2.0, 0.0, 2.0, 4.0, 6.0]
    """
    found = MaxNLocator(most, steps=[1, 2, 2.5, 5, 10]).tick_values(low, high)
    return [float(f"{t:.10g}") for t in np.asarray(found).tolist() if low <= t <= high]


def voltage_axis(axes: Axes, low: float, high: float, linear_V: float, name: str,
                 *, air: float = 0.04) -> None:  # fmt: skip
    """Make the vertical axis an asinh scale that shows volts and kilovolts together.

    Values of one sign that differ by less than a factor `NARROW` get a linear axis of their
    own range instead, else they would lie on one line.

    Parameters
    ----------
    low, high : float
        Values that must be seen [V]; on an asinh axis 0 V is seen, too.
    linear_V : float
        Voltage below which the axis is about linear; logarithmic far above.
    name : str
        Quantity; unit and scale are added.
    air : float
        Free share of the axis at either end; ticks keep out of more than a little.
    """
    if low * high > 0.0 and max(low / high, high / low) < NARROW:
        short = max(0.0, max(1.0, 0.02 * abs(low)) - (high - low)) / 2.0
        pad = (high - low + 2.0 * short) * air / (1.0 - 2.0 * air) + short
        axes.set_ylim(low - pad, high + pad)
        bottom, top = axes.get_ylim()
        even = even_ticks(bottom + 0.05 * (top - bottom), top, 8)  # clear of the time axis
        axes.set_yticks(even, [plain(t) for t in even])
        scale = ""
    else:
        low, high = min(low, 0.0), max(high, 0.0)
        if high - low < 0.1:  # a line at zero needs some axis, too
            low, high = low - 1.0, high + 1.0
        ends = np.arcsinh(np.array([low, high]) / linear_V)
        free = (ends[1] - ends[0]) * air / (1.0 - 2.0 * air) * np.array([-1.0, 1.0])
        outer = tuple((linear_V * np.sinh(ends + free)).tolist())
        axes.set_yscale("asinh", linear_width=linear_V)
        axes.set_ylim(*outer)
        least, most = outer if air < 0.1 else (low, high)
        ticks = voltage_ticks(least, most, linear_V, size_in(axes)[1])
        axes.set_yticks(ticks, [plain(t) for t in ticks])
        axes.yaxis.set_minor_locator(NullLocator())
        axes.axhline(0.0, color=QUIET, linewidth=0.7, zorder=1.5)
        curved = max(-low, high) > 1.5 * linear_V
        scale = f"\nlinear to {linear_V:.3g} V, logarithmic beyond" if curved else ""
    axes.grid(axis="y", color=FAINT, linewidth=0.6)
    axes.set_axisbelow(True)
    axes.set_ylabel(f"{name} (V){scale}", size=SMALL_PT, color=INK, family=FONT)


def voltage_ticks(low: float, high: float, linear_V: float, height_in: float) -> list[float]:
    """Round values along an asinh axis: zero, powers of ten, then fives and twos, not crowded.

    Examples
    --------
    >>> voltage_ticks(-2000.0, 10.0, 5.0, 2.0)
    [-1000.0, -100.0, -10.0, 0.0, 10.0]
    """
    top = ceil(log10(max(abs(low), abs(high))))
    least = min(floor(log10(linear_V)), top) - 1
    wanted = [0.0]
    for digit in (1.0, 5.0, 2.0):
        for power in range(top, least - 1, -1):
            wanted += [digit * 10.0**power, -digit * 10.0**power]
    span = np.arcsinh(high / linear_V) - np.arcsinh(low / linear_V)
    kept: list[float] = []
    for tick in wanted:
        apart = [abs(np.arcsinh(tick / linear_V) - np.arcsinh(k / linear_V)) for k in kept]
        near = min(apart, default=np.inf) / span * height_in
        if low <= tick <= high and near > 0.26:
            kept.append(tick)
    return sorted(float(f"{k:.6g}") for k in kept)


def spread_out(wanted: Sequence[float], heights: Sequence[float], room: float) -> list[float]:
    """Centres of labels near the wanted places without overlap, within 0 … `room`.

    Labels that touch form a block, which lies at the mean of what its members wanted.

    Examples
    --------
    >>> spread_out([0.5, 0.5, 3.0], [1.0, 1.0, 1.0], 4.0)
    [0.5, 1.5, 3.0]
    """
    order = sorted(range(len(wanted)), key=lambda i: wanted[i])
    blocks: list[tuple[list[int], float, float]] = []  # members, low edge, height
    for i in order:
        members, low, height = [i], wanted[i] - heights[i] / 2.0, heights[i]
        low = max(0.0, min(low, room - height))
        while blocks and blocks[-1][1] + blocks[-1][2] > low:
            before, _, below = blocks.pop()
            members, height = before + members, below + height
            offset, pulls = 0.0, []
            for m in members:
                pulls.append(wanted[m] - heights[m] / 2.0 - offset)
                offset += heights[m]
            low = max(0.0, min(float(np.mean(pulls)), room - height))
        blocks.append((members, low, height))
    centres = [0.0] * len(wanted)
    for members, low, _ in blocks:
        edge = low
        for m in members:
            centres[m] = edge + heights[m] / 2.0
            edge += heights[m]
    return centres


def side_labels(axes: Axes, labels: Sequence[tuple[str, float, Pen]]) -> None:
    """Write the name of every line beside its end, with a piece of the line before it.

    Parameters
    ----------
    labels : sequence of (text, value at the right end, pen)
    """
    width, height = size_in(axes)
    to_axes = axes.transData + axes.transAxes.inverted()
    right = axes.get_xlim()[1]
    ends = [float(to_axes.transform((right, value))[1]) * height for _, value, _ in labels]
    texts = [printable_glyphs(text) for text, _, _ in labels]
    heights = [0.145 * (1 + text.count("\n")) + 0.025 for text in texts]
    scale = min(1.0, (height + 0.4) / max(sum(heights), 1e-9))
    room = height + 0.4
    places = spread_out([e + 0.2 for e in ends], [h * scale for h in heights], room)
    for text, end, place, (_, _, style) in zip(texts, ends, places, labels, strict=True):
        y = (place - 0.2) / height
        x = 1.0 + np.array([0.02, 0.16, 0.2, 0.46, 0.52]) / width
        axes.plot(x[:2], [end / height, y], color=style.colour, linewidth=0.5,
                  transform=axes.transAxes, clip_on=False)  # fmt: skip
        axes.plot(x[1:4:2], [y, y], color=style.colour, linewidth=style.width,
                  linestyle=style.dashes, transform=axes.transAxes, clip_on=False)  # fmt: skip
        size = SMALL_PT * min(1.0, max(scale, 0.7))
        written = axes.text(x[4], y, text, size=size, color=INK, va="center", linespacing=1.05,
                            transform=axes.transAxes, family=FONT, parse_math=False)  # fmt: skip
        fit(written, RIGHT_IN - 0.57)


def fit(text: Text, room_in: float) -> float:
    """Make a text smaller where it is wider than its room; returns its width [in]."""
    wide = float(Text.get_window_extent(text).width) / DPI
    if wide <= room_in:
        return wide
    text.set_fontsize(float(text.get_fontsize()) * 0.97 * room_in / wide)  # letters are hinted
    return room_in
