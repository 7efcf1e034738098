"""Time in a plot: the course of a run, the axis, and long runs day by day."""

from __future__ import annotations

import json
from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.ticker import NullLocator
from numpy.typing import NDArray

from charging.clock import span
from charging.plot_page import FONT, INK, SMALL_PT

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]

DAY_S = 86400.0
LONG_S = 10.0 * DAY_S
"""Longer runs are drawn as the lowest and highest value of each day."""
LOG_START_S = 1.0
EVENT_STRENGTH = 0.01
"""Share of its greatest density below which a plasma other than the base is not named."""

CLOCK_STEPS_S = (1, 2, 5, 10, 15, 30, 60, 120, 300, 600, 900, 1800, 3600, 7200, 10800, 21600,
                 43200, 86400, 172800, 432000, 864000, 1728000)  # fmt: skip
MONTHS = (1, 2, 3, 6, 12)
SPANS = (
    (1e-3, "1 ms"), (1e-2, "10 ms"), (0.1, "0.1 s"), (1.0, "1 s"), (10.0, "10 s"),
    (60.0, "1 min"), (600.0, "10 min"), (3600.0, "1 h"), (21600.0, "6 h"), (DAY_S, "1 day"),
    (10.0 * DAY_S, "10 days"), (100.0 * DAY_S, "100 days"),
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class Stretch:
    """A length of time [s after the start] with a name for it."""

    start_s: float
    end_s: float
    name: str = ""


@dataclass(frozen=True, slots=True)
class Course:
    """What happens along a run, and the part of it that a plot shows.

    Attributes
    ----------
    seconds : ndarray [T]
        Output times after the start.
    epoch : datetime64
    fixed : bool
        No orbit: the axis is the time since the start, logarithmic.
    shown : (float, float)
        Ends of the time axis [s].
    umbra, penumbra : tuple of Stretch
    events, switched : tuple of Stretch
        Where another plasma than the base is present, by its name: in a plasma event, and by a
        mode alone.
    base_plasma : str
    modes, emission : tuple of Stretch
        Interval modes, those that overlap joined by "+"; where emitters send electrons out.
    by_region : bool
        The base is the region of space with the longest stay, other plasmas are regions too.
    """

    seconds: Array
    epoch: np.datetime64
    fixed: bool
    shown: tuple[float, float]
    umbra: tuple[Stretch, ...]
    penumbra: tuple[Stretch, ...]
    events: tuple[Stretch, ...]
    switched: tuple[Stretch, ...]
    base_plasma: str
    modes: tuple[Stretch, ...]
    emission: tuple[Stretch, ...]
    by_region: bool = False

    @property
    def long(self) -> bool:
        """Whether the axis spans so many days that only daily extremes can be read."""
        return not self.fixed and self.shown[1] - self.shown[0] > LONG_S

    @property
    def visible(self) -> Flags:
        """Output times [T] on the axis."""
        low, high = self.shown
        return (self.seconds >= low) & (self.seconds <= high)

    def zoomed(self, low: float, high: float) -> Course:
        """Return the same course with another part of it shown, within the run."""
        return replace(self, shown=(max(low, self.shown[0]), min(high, self.shown[1])))

    def moment(self, seconds: float) -> str:
        """Write a time as UTC, with the day where the run is longer than one; or as elapsed."""
        if self.fixed:
            return f"after {span(seconds)}" if seconds > 0.0 else "at the start"
        text = utc(self.epoch, seconds)
        same_day = utc(self.epoch, float(self.seconds[-1]) - 1.0)[:10] == text[:10]
        minute = utc(self.epoch, seconds + 30.0)
        return f"at {text[11:19] if same_day else minute[:10] + ' ' + minute[11:16]} UTC"


def course(dataset: xr.Dataset) -> Course:
    """Read the course of a run from its result."""
    time = dataset["time"].values
    seconds = np.asarray((time - time[0]) / np.timedelta64(1, "s"), dtype=np.float64)
    region = np.asarray(dataset["region"].values, dtype=np.int64)
    masks = dict(
        zip(
            str(dataset["region"].attrs["flag_meanings"]).split(),
            np.atleast_1d(dataset["region"].attrs["flag_masks"]).tolist(),
            strict=True,
        )
    )
    fixed = not np.any(dataset["position"].values)
    end = float(seconds[-1])
    start = 0.0
    if fixed and len(seconds) > 1:
        first = float(seconds[1])
        start = LOG_START_S if first <= LOG_START_S < 0.1 * end else first
    if not start < end:
        fixed, end = False, start + 1.0  # too few times for a logarithmic axis
    names = [str(n).rpartition(":")[0] for n in dataset["population_name"].values]
    in_event = (region & masks["plasma_event"]) > 0
    present = _present(dataset, names)
    places = _places(dataset, region)
    base = names[0]
    if places:
        base = max(places, key=lambda name: int(places[name].sum()))
        present |= {name: flags for name, flags in places.items() if name != base}
    in_mode = (region & masks.get("mode_interval", 0)) > 0
    emitted = np.asarray(dataset["emitter_current"].values, dtype=np.float64)
    return Course(
        seconds=seconds,
        epoch=time[0],
        fixed=fixed,
        shown=(start, end),
        umbra=stretches(seconds, (region & masks["umbra"]) > 0),
        penumbra=stretches(seconds, (region & masks["penumbra"]) > 0),
        events=_named(seconds, present, in_event),
        switched=_named(seconds, present, ~in_event),
        base_plasma=base,
        modes=_modes(dataset, seconds, in_mode),
        emission=stretches(seconds, emitted > 0.0, "emitter"),
        by_region=bool(places),
    )


def _places(dataset: xr.Dataset, region: NDArray[np.int64]) -> dict[str, Flags]:
    """When the spacecraft is in each region of space that it meets [T]."""
    attrs = dataset["region"].attrs
    if "flag_values" not in attrs:
        return {}
    found = {}
    rows = zip(
        str(attrs["flag_meanings"]).split(),
        np.atleast_1d(attrs["flag_masks"]).tolist(),
        np.atleast_1d(attrs["flag_values"]).tolist(),
        strict=True,
    )
    for meaning, mask, value in rows:
        within = (region & mask) == value
        if mask != value and within.any():  # a field of bits, no single one
            found[meaning.replace("_", " ")] = within
    return found


def _present(dataset: xr.Dataset, names: list[str]) -> dict[str, Flags]:
    """When each plasma other than the base [T] rules: the strongest one of those present."""
    density = np.asarray(dataset["population_density"].values, dtype=np.float64)
    others = [name for name in dict.fromkeys(names) if name != names[0]]
    if not others:
        return {}
    whole = np.stack([density[[n == name for n in names]].sum(axis=0) for name in others])
    greatest = whole.max(axis=1, keepdims=True)
    strength = whole / np.where(greatest > 0.0, greatest, 1.0)
    ruling = strength.argmax(axis=0)
    seen = strength.max(axis=0) > EVENT_STRENGTH
    return {name: seen & (ruling == k) for k, name in enumerate(others)}


def _named(seconds: Array, present: dict[str, Flags], where: Flags) -> tuple[Stretch, ...]:
    found = [s for name, flags in present.items() for s in stretches(seconds, flags & where, name)]
    return tuple(sorted(found, key=lambda s: s.start_s))


def _modes(dataset: xr.Dataset, seconds: Array, flags: Flags) -> tuple[Stretch, ...]:
    """Interval modes from the attribute ``mode_spans``; unnamed without it."""
    if not flags.any():
        return ()
    spans = json.loads(str(dataset.attrs.get("mode_spans", "[]")))
    if not spans:
        return stretches(seconds, flags, "mode")
    edges = sorted({float(span[key]) for span in spans for key in ("start_s", "end_s")})
    pieces = []
    for start, end in pairwise(edges):
        inside = [str(m["name"]) for m in spans if m["start_s"] <= start < m["end_s"]]
        if inside:
            pieces.append(Stretch(start, end, " + ".join(inside)))
    return tuple(pieces)


def stretches(seconds: Array, flags: Flags, name: str = "") -> tuple[Stretch, ...]:
    """Stretches of time where a flag is set; an edge lies half way between two outputs.

    Examples
    --------
    >>> found = stretches(np.arange(5.0), np.array([False, True, True, False, True]))
    >>> [(s.start_s, s.end_s) for s in found]
    [(0.5, 2.5), (3.5, 4.0)]
    """
    edges = np.concatenate(
        ([seconds[0]], (seconds[1:] + seconds[:-1]) / 2.0, [seconds[-1]]), dtype=np.float64
    )
    change = np.flatnonzero(np.diff(np.concatenate(([0], flags.astype(np.int8), [0]))))
    return tuple(
        Stretch(float(edges[first]), float(edges[after]), name)
        for first, after in zip(change[::2].tolist(), change[1::2].tolist(), strict=True)
    )


def utc(epoch: np.datetime64, seconds: float) -> str:
    """UTC as text to the second, after an epoch.

    Examples
    --------
    >>> utc(np.datetime64("2031-03-20T11:00:00", "ns"), 90.4)
    '2031-03-20T11:01:30'
    """
    return str(np.datetime_as_string(epoch + np.timedelta64(round(seconds), "s"), unit="s"))


def daily_extremes(seconds: Array, values: Array) -> tuple[Array, Array, Array]:
    """Middle of each day after the start [s], and lowest and highest value in it."""
    day = ((seconds - seconds[0]) // DAY_S).astype(np.int64)
    if day[-1] > day[-2]:
        day[-1] = day[-2]  # the end belongs to the day that it closes
    first = np.flatnonzero(np.diff(day, prepend=-1))
    middle = seconds[0] + (day[first] + 0.5) * DAY_S
    return middle, np.minimum.reduceat(values, first), np.maximum.reduceat(values, first)


def time_axis(axes: Axes, along: Course, *, labelled: bool = True) -> None:
    """Make the horizontal axis UTC, or for a run without orbit the time since its start."""
    low, high = along.shown
    if along.fixed:
        axes.set_xscale("log")
        ticks, texts = span_ticks(low, high)
        name = "time since the start" + (
            f" (first output after {span(low)})" if low > LOG_START_S else ""
        )
    else:
        ticks, texts = clock_ticks(along.epoch, low, high)
        name = "time (UTC)"
    axes.set_xlim(low, high)
    axes.set_xticks(ticks, texts if labelled else [""] * len(texts))
    axes.xaxis.set_minor_locator(NullLocator())
    if labelled:
        axes.set_xlabel(name, size=SMALL_PT, color=INK, family=FONT)


def span_ticks(low: float, high: float) -> tuple[list[float], list[str]]:
    """Ticks of a logarithmic axis of elapsed time, in the units that people use.

    Examples
    --------
    >>> span_ticks(60.0, 86400.0)[1]
    ['1 min', '10 min', '1 h', '6 h', '1 day']
    """
    found = [(t, text) for t, text in SPANS if low <= t <= high * 1.0001]
    if len(found) < 3:
        decades = np.log10(high / low)
        values = low * 10.0 ** (decades * np.arange(5) / 4.0)
        return [float(v) for v in values], [f"{v:.3g} s" for v in values]
    return [t for t, _ in found], [text for _, text in found]


def clock_ticks(epoch: np.datetime64, low: float, high: float) -> tuple[list[float], list[str]]:
    r"""Ticks at round UTC times; the date stands below the first one and each midnight.

    Examples
    --------
    >>> clock_ticks(np.datetime64("2031-03-20T11:00:00", "ns"), 0.0, 4000.0)[1]
    ['11:00\n2031-03-20', '11:10', '11:20', '11:30', '11:40', '11:50', '12:00']
    """
    if high - low > 75.0 * DAY_S:
        return _month_ticks(epoch, low, high)
    day = epoch.astype("datetime64[D]")
    since = float((epoch - day.astype(epoch.dtype)) / np.timedelta64(1, "s"))

    def at(step: float) -> list[float]:
        count = np.arange(np.ceil((low + since) / step), np.floor((high + since) / step) + 1.0)
        return [float(c * step - since) for c in count]

    step = next(
        (s for s in CLOCK_STEPS_S if (high - low) / s <= (8.5 if s < DAY_S else 6.5)),
        CLOCK_STEPS_S[-1],
    )
    ticks, texts = at(step), []
    for i, tick in enumerate(ticks):
        text = utc(epoch, tick)
        clock = text[11:19] if step < 60 else text[11:16]
        if step >= DAY_S:
            texts.append(text[:10])
        elif i == 0 or clock.startswith("00:00"):
            texts.append(f"{clock}\n{text[:10]}")
        else:
            texts.append(clock)
    return ticks, texts


def _month_ticks(epoch: np.datetime64, low: float, high: float) -> tuple[list[float], list[str]]:
    first = (epoch + np.timedelta64(round(low), "s")).astype("datetime64[M]")
    last = (epoch + np.timedelta64(round(high), "s")).astype("datetime64[M]")
    months = int((last - first).astype(int))
    step = next((m for m in MONTHS if months / m <= 7.0), MONTHS[-1])
    ticks, texts = [], []
    for month in np.arange(first, last + 1):
        at = float((month.astype(epoch.dtype) - epoch) / np.timedelta64(1, "s"))
        if low <= at <= high and (int(month.astype(int)) % step == 0):
            ticks.append(at)
            texts.append(str(month))
    return ticks, texts
