"""Sunlight and plasma along a plot: shades behind the lines, strips above them."""

from __future__ import annotations

from collections.abc import Sequence

from matplotlib.axes import Axes
from matplotlib.patches import Rectangle
from matplotlib.ticker import NullLocator

from charging.plot_page import (
    CALM,
    EVENT,
    FAINT,
    FONT,
    INK,
    PENUMBRA,
    QUIET,
    SMALL_PT,
    SUNLIT,
    UMBRA,
    Page,
    printable_glyphs,
    shortened,
    size_in,
    text_width_in,
)
from charging.plot_time import DAY_S, Course, Stretch, utc

STRIP_IN, STRIP_STEP_IN = 0.19, 0.24
STRIPS_IN = 0.5
"""Height of one strip, from one to the next, and room for two of them above a panel."""
SWITCHED, MODE, EMITTER = "#e9b0c4", "#cfd8b4", "#7a3fa0"
"""Colours: another plasma by a mode, a mode, emission."""
NAME_LENGTHS = (60, 40, 30, 24, 20, 16, 12)
"""Characters of a name that are tried in turn until it fits."""
LEAST_SHARE = 2e-3
"""Share of the strip that anything takes at least, two dots of the picture."""


def strips_in(along: Course) -> float:
    """Room for the strips above a panel [in]: a third one where a mode or an emitter works."""
    further = _within(along.modes, along) or _within(along.emission, along)
    return STRIPS_IN + (STRIP_STEP_IN if further else 0.0)


def shade(axes: Axes, along: Course) -> None:
    """Shade umbra, penumbra and other plasmas than the base over the height of a panel."""
    umbra, penumbra = _dark(along)
    for parts, colour, strength in (
        (_within(along.events, along), EVENT, 0.25),
        (_within(along.switched, along), SWITCHED, 0.25),
        (penumbra, UMBRA, 0.09),
        (umbra, UMBRA, 0.2),
    ):
        if not parts or [(s.start_s, s.end_s) for s in parts] == [along.shown]:
            continue  # nothing, or the whole axis alike: the strip says it
        bars = [(s.start_s, s.end_s - s.start_s) for s in parts]
        axes.broken_barh(bars, (0.0, 1.0), transform=axes.get_xaxis_transform(),
                         facecolor=colour, alpha=strength, linewidth=0.0, zorder=0.5)  # fmt: skip


def strips(page: Page, along: Course, bottom: float) -> None:
    """Draw strips of sunlight, plasma and modes, with names where they fit and a key beside."""
    modes, emission = _within(along.modes, along), _within(along.emission, along)
    if modes or emission:
        name = "modes" if modes else "emitter"
        _mode_strip(_strip(page, along, bottom, name, CALM), along, modes, emission)
        bottom += STRIP_STEP_IN
    _light_strip(_strip(page, along, bottom + STRIP_STEP_IN, "light", SUNLIT), along)
    _plasma_strip(_strip(page, along, bottom, "plasma", CALM), along)


def _light_strip(axes: Axes, along: Course) -> None:
    low, high = along.shown
    umbra, penumbra = _dark(along)
    _fill(axes, along, penumbra, PENUMBRA)
    _fill(axes, along, umbra, UMBRA)
    dark = sorted((*umbra, *penumbra), key=lambda s: s.start_s)
    if along.long:
        for s in umbra:
            _name(axes, s, (s.name,), "white", None)
    elif len(umbra) <= 2:
        for s in umbra:
            begin = max((d.start_s for d in penumbra if d.end_s == s.start_s), default=s.start_s)
            before = max((d.end_s for d in dark if d.end_s < begin), default=low)
            _name(axes, s, _umbra_texts(along, s), "white", Stretch(before, begin))
    if not dark:
        _name(axes, Stretch(low, high), ("sunlit",), INK)
    if not umbra and len(penumbra) == 1:
        _name(axes, penumbra[0], ("penumbra",), INK)
    days = "days with " if along.long else ""
    entries = [(f"{days}umbra", UMBRA)] if umbra else []
    if penumbra and not (along.long and umbra):
        entries.append((f"{days}penumbra", PENUMBRA))
    _key(axes, entries)


def _plasma_strip(axes: Axes, along: Course) -> None:
    events, switched = _within(along.events, along), _within(along.switched, along)
    _fill(axes, along, events, EVENT)
    _fill(axes, along, switched, SWITCHED)
    free = _name_all(axes, along, sorted((*events, *switched), key=lambda s: s.start_s))
    calm = max(free, key=lambda s: _place(axes, s.end_s) - _place(axes, s.start_s))
    _name(axes, calm, (along.base_plasma,), INK)
    entries = [("plasma event", EVENT)] if events else []
    other = "other region" if along.by_region else "by mode"
    _key(axes, [*entries, (other, SWITCHED)] if switched else entries)


def _mode_strip(axes: Axes, along: Course, modes: list[Stretch],
                emission: list[Stretch]) -> None:  # fmt: skip
    """Modes over the height of the strip, emission as a bar along its foot."""
    _fill(axes, along, modes, MODE)
    _fill(axes, along, emission, EMITTER, height=0.16)
    _name_all(axes, along, modes, ahead=True)
    entries = [("mode", MODE)] if modes else []
    _key(axes, [*entries, ("emitter", EMITTER)] if emission else entries)


def _name_all(axes: Axes, along: Course, parts: list[Stretch], *,
              ahead: bool = False) -> list[Stretch]:  # fmt: skip
    """Name stretches in or after themselves, or else ahead; return what is left free.

    Stretches that touch are parted by a line.
    """
    begin, high = along.shown
    free = []
    for i, s in enumerate(parts):
        after = parts[i + 1].start_s if i + 1 < len(parts) else high
        start, end = _place(axes, s.start_s), _place(axes, s.end_s)
        before, behind = start - _place(axes, begin), _place(axes, after) - end
        within = max(behind, end - start + 0.1)
        texts = [shortened(s.name, most) for most in NAME_LENGTHS]
        widths = [text_width_in(printable_glyphs(t), SMALL_PT - 0.5) + 0.1 for t in texts]
        k = next((k for k, wide in enumerate(widths) if wide < within), None)
        j = next((j for j, wide in enumerate(widths) if wide < before), None)
        if k is None and j is not None and ahead:
            left = _moment(axes, start - widths[j])
            free.append(Stretch(begin, left))
            begin = _name(axes, s, (texts[j],), INK, Stretch(left, s.start_s))
        else:
            free.append(Stretch(begin, s.start_s))
            begin = _name(axes, s, (texts[k or 0],), INK, Stretch(s.end_s, after))
        if after == s.end_s < high:
            axes.axvline(after, color=QUIET, linewidth=0.6, zorder=2.0)
    return [*free, Stretch(begin, high)]


def _dark(along: Course) -> tuple[list[Stretch], list[Stretch]]:
    """Umbra and penumbra on the axis; in a long run, spells of days that have them."""
    umbra, penumbra = _within(along.umbra, along), _within(along.penumbra, along)
    return (spells(umbra), spells(penumbra)) if along.long else (umbra, penumbra)


def spells(parts: Sequence[Stretch]) -> list[Stretch]:
    """Join stretches that follow each other within a day and a half, and count them.

    Examples
    --------
    >>> spells([Stretch(0.0, 3600.0), Stretch(86400.0, 90000.0), Stretch(1e6, 1.1e6)])[0]
    Stretch(start_s=0.0, end_s=90000.0, name='2 eclipses')
    """
    groups: list[list[Stretch]] = []
    for s in parts:
        if groups and s.start_s - groups[-1][-1].end_s < 1.5 * DAY_S:
            groups[-1].append(s)
        else:
            groups.append([s])
    return [
        Stretch(g[0].start_s, g[-1].end_s, f"{len(g)} eclipse{'s' * (len(g) > 1)}") for g in groups
    ]


def _umbra_texts(along: Course, s: Stretch) -> tuple[str, ...]:
    if along.fixed:
        return ("umbra",)
    start, end = (utc(along.epoch, t + 30.0)[11:16] for t in (s.start_s, s.end_s))
    return (f"umbra {start} to {end}", "umbra")


def _strip(page: Page, along: Course, bottom: float, name: str, colour: str) -> Axes:
    axes = page.panel(bottom, STRIP_IN)
    if along.fixed:
        axes.set_xscale("log")
    axes.set_xlim(along.shown)
    axes.set_ylim(0.0, 1.0)
    axes.set_xticks([])
    axes.xaxis.set_minor_locator(NullLocator())
    axes.set_yticks([])
    axes.set_facecolor(colour)
    for spine in axes.spines.values():
        spine.set_visible(True)
        spine.set_color(FAINT)
    axes.text(-0.06 / size_in(axes)[0], 0.45, name, size=SMALL_PT, color=QUIET, ha="right",
              va="center", transform=axes.transAxes, family=FONT)  # fmt: skip
    return axes


def _within(parts: Sequence[Stretch], along: Course) -> list[Stretch]:
    """Stretches on the time axis, cut at its ends."""
    low, high = along.shown
    return [
        Stretch(max(s.start_s, low), min(s.end_s, high), s.name)
        for s in parts
        if s.end_s > low and s.start_s < high
    ]


def _fill(axes: Axes, along: Course, parts: Sequence[Stretch], colour: str, *,
          height: float = 1.0) -> None:  # fmt: skip
    low, high = along.shown
    least = 0.0 if along.fixed else LEAST_SHARE * (high - low)
    bars = [(s.start_s, max(s.end_s - s.start_s, least)) for s in parts]
    axes.broken_barh(bars, (0.0, height), facecolor=colour, linewidth=0.0, zorder=1.0)


def _place(axes: Axes, seconds: float) -> float:
    """Distance of a time from the left end [in]."""
    to_axes = axes.transData + axes.transAxes.inverted()
    return float(to_axes.transform((seconds, 0.5))[0]) * size_in(axes)[0]


def _moment(axes: Axes, place_in: float) -> float:
    """Time at a distance from the left end [in]."""
    to_data = axes.transAxes + axes.transData.inverted()
    return float(to_data.transform((place_in / size_in(axes)[0], 0.5))[0])


def _name(axes: Axes, s: Stretch, texts: Sequence[str], colour: str,
          free: Stretch | None = None) -> float:  # fmt: skip
    """Write the first text that fits into a stretch, else the first one beside it.

    Returns the time at which the text or the stretch ends, whichever is later.
    """
    width, size = size_in(axes)[0], SMALL_PT - 0.5

    def put(x: float, text: str, side: str, ink: str) -> None:
        axes.text(x / width, 0.45, text, size=size, color=ink, ha=side, va="center", zorder=3.0,
                  family=FONT, transform=axes.transAxes, parse_math=False)  # fmt: skip

    shown = [printable_glyphs(shortened(text, 60)) for text in texts]
    low, high = _place(axes, s.start_s), _place(axes, s.end_s)
    for text in shown:
        if text_width_in(text, size) < high - low:
            put((low + high) / 2.0, text, "center", colour)
            return s.end_s
    if free is None:
        return s.end_s
    low, high = _place(axes, free.start_s), _place(axes, free.end_s)
    wide = text_width_in(shown[0], size) + 0.1
    if wide > high - low + 1e-6:
        return s.end_s
    if free.end_s <= s.start_s:
        put(high - 0.05, shown[0], "right", INK)
        return s.end_s
    put(low + 0.05, shown[0], "left", INK)
    return _moment(axes, low + wide)


def _key(axes: Axes, entries: Sequence[tuple[str, str]]) -> None:
    width = size_in(axes)[0]
    x = 0.16
    for text, colour in entries:
        axes.add_patch(
            Rectangle((1.0 + x / width, 0.15), 0.16 / width, 0.62, transform=axes.transAxes,
                      clip_on=False, facecolor=colour, edgecolor=QUIET, linewidth=0.4)
        )  # fmt: skip
        axes.text(1.0 + (x + 0.21) / width, 0.45, text, size=SMALL_PT - 0.5, color=INK,
                  va="center", transform=axes.transAxes, family=FONT)  # fmt: skip
        x += 0.3 + text_width_in(text, SMALL_PT - 0.5)
