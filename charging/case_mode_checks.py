"""Checks of orbit files, attitudes, modes and emitters: what one key says about another."""

from __future__ import annotations

import itertools
from collections.abc import Iterable, Iterator, Mapping
from typing import TYPE_CHECKING

from charging.case_values import nearest_name, quoted
from charging.errors import Problem, ProblemsFound

if TYPE_CHECKING:
    from charging.case_modes import Emitter, Mode, Span
    from charging.case_orbit import Attitude, OrbitFile
    from charging.case_tables import Case

ATTITUDE_KEYS: Mapping[str, tuple[tuple[str, ...], tuple[str, ...]]] = {
    "nadir": ((), ()),
    "yaw steering": ((), ()),
    "sun": ((), ("toward_sun", "toward_north")),
    "inertial": (("x_axis", "y_axis"), ()),
    "spin": (("axis", "period_s"), ("phase_deg", "resolved")),
    "quaternions": (("file",), ()),
}
"""Keys that a law of attitude needs, and those it may have."""

_CHANGES = ("attitude", "array", "plasma", "emitters", "illumination", "sun_direction", "f107")


def _raise(problems: Iterable[Problem]) -> None:
    found = list(problems)
    if found:
        raise ProblemsFound(found)


def check_orbit_file(orbit: OrbitFile) -> None:
    """Refuse a table of another form than CSV or NetCDF."""
    if orbit.kind == "table" and not orbit.file.endswith((".csv", ".nc")):
        raise ProblemsFound(
            [
                Problem(
                    ("file",),
                    'does not go with kind = "table"',
                    value=orbit.file,
                    allowed="a file ending in .csv or .nc",
                )
            ]
        )


def check_attitude(attitude: Attitude) -> None:
    """Refuse keys that do not belong to the law, or are missing, or give no frame."""
    _raise(_attitude_problems(attitude))


def _attitude_problems(attitude: Attitude) -> Iterator[Problem]:
    needed, optional = ATTITUDE_KEYS[attitude.law]
    given = [key for key in type(attitude).model_fields if key != "law"]
    for key in given:
        value = getattr(attitude, key)
        if value is not None and key not in (*needed, *optional):
            yield Problem(
                (key,),
                f"does not go with law = {quoted([attitude.law])}",
                value=list(value) if isinstance(value, tuple) else value,
                allowed=", ".join((*needed, *optional)) or "no further keys",
            )
        elif value is None and key in needed:
            yield Problem((key,), f"is missing for law = {quoted([attitude.law])}", missing=True)
    for one, other, default in (
        ("x_axis", "y_axis", None),
        ("toward_sun", "toward_north", ((0.0, 0.0, 1.0), (0.0, 1.0, 0.0))),
    ):
        first, second = getattr(attitude, one), getattr(attitude, other)
        if default is not None and attitude.law == "sun":
            first, second = first or default[0], second or default[1]
        if first is not None and second is not None and _parallel(first, second):
            yield Problem((other,), f"lies along {one}", value=list(second))


def _parallel(a: tuple[float, float, float], b: tuple[float, float, float]) -> bool:
    return abs(sum(x * y for x, y in zip(a, b, strict=True))) > 1.0 - 1e-9


def _span_problems(span: Span) -> Iterator[Problem]:
    for moment, hours, word in ((span.begin, span.from_h, "from"), (span.end, span.to_h, "to")):
        if moment is not None and hours is not None:
            yield Problem((f"{word}_h",), f"stands beside {word}; give one of the two", value=hours)
    if (span.begin is not None and span.end is not None and span.end <= span.begin) or (
        span.from_h is not None and span.to_h is not None and span.to_h <= span.from_h
    ):
        key = "to" if span.end is not None else "to_h"
        value = span.end if span.end is not None else span.to_h
        yield Problem((key,), "is not after the begin", value=value)


def check_emitter(emitter: Emitter) -> None:
    """Refuse an emitter that ends before it begins, or whose demand is none."""
    _raise(itertools.chain(_span_problems(emitter), _demand_problems(emitter)))


def _demand_problems(emitter: Emitter) -> Iterator[Problem]:
    if emitter.below_V is not None and emitter.hold_V is not None:
        yield Problem(
            ("below_V",), "stands beside hold_V; give one of the two", value=emitter.below_V
        )
    for key, value in (("below_V", emitter.below_V), ("hold_V", emitter.hold_V)):
        if value is not None and value > 0.5 * emitter.energy_eV:
            yield Problem(
                (key,),
                "is more than half the volts that its electrons can climb",
                value=value,
                allowed=f"at most {0.5 * emitter.energy_eV:.6g}",
            )


def check_mode(mode: Mode) -> None:
    """Refuse a mode that changes nothing, or has no time, or says a thing twice."""
    _raise(_one_mode(mode))


def _one_mode(mode: Mode) -> Iterator[Problem]:
    yield from _span_problems(mode)
    edges = (mode.begin, mode.end, mode.from_h, mode.to_h)
    timed = any(edge is not None for edge in edges)
    if mode.alternative and timed:
        yield Problem(
            ("alternative",), "stands beside an interval; give one of the two", value=True
        )
    elif not mode.alternative:
        for word, moment, hours in (
            ("from", mode.begin, mode.from_h),
            ("to", mode.end, mode.to_h),
        ):
            if moment is None and hours is None:
                yield Problem(
                    (word,),
                    "is missing",
                    missing=True,
                    allowed=f"{word} (UTC with Z) or {word}_h (hours from the start), or "
                    "alternative = true, a whole run of its own",
                )
        if mode.f107 is not None:
            yield Problem(
                ("f107",), "goes only with alternative = true, a whole run", value=mode.f107
            )
    if mode.events and all(getattr(mode, key) is None for key in _CHANGES):
        allowed = f"{', '.join(_CHANGES)}, events = false"
        yield Problem((), "changes nothing", sentence=True, allowed=allowed)
    angles = [
        key for key in ("parked_sun_angle_deg", "parked_normal") if getattr(mode, key) is not None
    ]
    if mode.array == "parked" and len(angles) != 1:
        yield Problem(
            ("array",),
            "needs one of two further keys",
            value=mode.array,
            allowed="parked_sun_angle_deg, parked_normal",
        )
    elif mode.array != "parked" and angles:
        yield Problem((angles[0],), 'needs array = "parked"', value=getattr(mode, angles[0]))


# from table to table -----------------------------------------------------------------------------


def mode_problems(case: Case) -> Iterator[Problem]:
    """Yield what modes and attitude say against orbit, surfaces, emitters and each other."""
    fixed = case.orbit.kind == "fixed"
    if fixed and case.attitude.law != "nadir":
        yield Problem(
            ("attitude", "law"),
            "goes only with an orbit; here sun_direction stands in body axes",
            value=case.attitude.law,
        )
    trackers = any(surface.tracks_sun for surface in case.surface)
    emitters = [emitter.name for emitter in case.emitter]
    for index, mode in enumerate(case.mode):
        if fixed and mode.attitude is not None:
            yield Problem(
                ("mode", index, "attitude"),
                "goes only with an orbit; here sun_direction stands in body axes",
                value=mode.attitude.law,
            )
        if not fixed:
            for key in ("illumination", "sun_direction"):
                if getattr(mode, key) is not None:
                    yield Problem(
                        ("mode", index, key),
                        "goes only with a fixed orbit; here it follows from orbit and attitude",
                        value=getattr(mode, key),
                    )
        if mode.array is not None and not trackers:
            yield Problem(
                ("mode", index, "array"), "finds no surface with tracks_sun", value=mode.array
            )
        for place, name in enumerate(mode.emitters or ()):
            if name not in emitters:
                yield Problem(
                    ("mode", index, "emitters", place),
                    "is no emitter of this case",
                    value=name,
                    nearest=nearest_name(name, emitters),
                    allowed=quoted(emitters) or "none has been given",
                )
    if case.resolved:
        yield from _interval_problems(case)


def _interval_problems(case: Case) -> Iterator[Problem]:
    if case.time.duration_h is None and getattr(case.orbit, "duration_h", None) is None:
        return
    spans = []
    for index, mode in enumerate(case.mode):
        if mode.alternative:
            continue
        start, end = span_s(case, mode)
        if not 0.0 <= start < end or start >= case.duration_s:
            key = "from" if mode.begin is not None else "from_h"
            value = mode.begin if mode.begin is not None else mode.from_h
            allowed = "from the start of the run on, before its end, and before the mode ends"
            yield Problem(("mode", index, key), "is no begin within the run", value=value,
                          allowed=allowed)  # fmt: skip
            continue
        changed = {key for key in _CHANGES if getattr(mode, key) is not None}
        spans.append((start, end, changed | ({"events"} if not mode.events else set()), index))
    for (a0, a1, one, i), (b0, b1, other, k) in itertools.combinations(spans, 2):
        both = sorted(one & other)
        if both and a0 < b1 and b0 < a1:
            yield Problem(
                ("mode", k, "name"),
                f"overlaps mode {quoted([case.mode[i].name])}, which changes {both[0]} too",
                value=case.mode[k].name,
            )


def emitter_problems(case: Case) -> Iterator[Problem]:
    """Yield emitters that never work within the run."""
    if not case.resolved:
        return
    if case.time.duration_h is None and getattr(case.orbit, "duration_h", None) is None:
        return
    for index, emitter in enumerate(case.emitter):
        start, end = span_s(case, emitter)
        if start >= min(end, case.duration_s) or end <= 0.0:
            yield Problem(
                ("emitter", index, "name"),
                "works at no time of the run",
                value=emitter.name,
                allowed="from before to, within the run",
            )


def span_s(case: Case, span: Span) -> tuple[float, float]:
    """Begin and end [s after the start] of a mode or emitter; open ends are those of the run."""
    start, end = 0.0, case.duration_s
    if span.begin is not None:
        start = case.seconds_to(span.begin)
    elif span.from_h is not None:
        start = 3600.0 * span.from_h
    if span.end is not None:
        end = case.seconds_to(span.end)
    elif span.to_h is not None:
        end = 3600.0 * span.to_h
    return start, end
