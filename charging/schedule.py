"""What holds when: intervals of modes and emitters as legs of constant settings."""

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import pairwise

from charging.case_mode_checks import span_s
from charging.case_modes import Mode
from charging.case_orbit import Attitude, OrbitFixed
from charging.case_tables import Case

Vector = tuple[float, float, float]


@dataclass(frozen=True, slots=True)
class Leg:
    """A stretch of the run without a change of mode or emitter.

    Attributes
    ----------
    start_s, end_s : float
        After the start of the run.
    modes : tuple of str
        Names of the interval modes that hold.
    attitude : Attitude
    parked : bool
        Wings do not track: they stand `parked_angle_deg` off, or with `parked_normal`.
    plasma : str
        Base plasma as the case names it.
    events : bool
        Whether plasma events count.
    emitting : tuple of bool
        Which emitters work.
    illumination : float
    sun_direction : tuple of float
        Of a fixed case.
    """

    start_s: float
    end_s: float
    modes: tuple[str, ...]
    attitude: Attitude
    parked: bool
    parked_angle_deg: float
    parked_normal: Vector | None
    plasma: str
    events: bool
    emitting: tuple[bool, ...]
    illumination: float
    sun_direction: Vector


def legs(case: Case, mode: Mode | None = None) -> tuple[Leg, ...]:
    """Legs of a run, in order and without gaps.

    Parameters
    ----------
    case : Case
    mode : Mode or None
        An alternative mode: what it gives replaces what case and intervals say, for the whole
        run.
    """
    end = case.duration_s
    spans = [(span_s(case, one), one) for one in case.mode if not one.alternative]
    working = [span_s(case, one) for one in case.emitter]
    edges = {0.0, end}
    for start, stop in (*(span for span, _ in spans), *working):
        edges |= {t for t in (start, stop) if 0.0 < t < end}
    times = sorted(edges)
    found: list[Leg] = []
    for start, stop in pairwise(times):
        inside = [one for (a, b), one in spans if a <= start < b]
        on = tuple(a <= start < b for a, b in working)
        found.append(_leg(case, start, stop, inside, mode, on))
    return tuple(found)


def _leg(
    case: Case,
    start: float,
    stop: float,
    inside: list[Mode],
    alternative: Mode | None,
    on: tuple[bool, ...],
) -> Leg:
    attitude, plasma, events = case.attitude, case.plasma.base, True
    array: Mode | None = None
    light, direction = 1.0, (1.0, 0.0, 0.0)
    if isinstance(case.orbit, OrbitFixed):
        light, direction = case.orbit.illumination, case.orbit.sun_direction
    for mode in (*inside, *(() if alternative is None else (alternative,))):
        attitude = attitude if mode.attitude is None else mode.attitude
        plasma = plasma if mode.plasma is None else mode.plasma
        events = events and mode.events
        array = array if mode.array is None else mode
        light = light if mode.illumination is None else mode.illumination
        direction = direction if mode.sun_direction is None else mode.sun_direction
        if mode.emitters is not None:
            on = tuple(one.name in mode.emitters for one in case.emitter)
    parked = array is not None and array.array == "parked"
    return Leg(
        start_s=start,
        end_s=stop,
        modes=tuple(one.name for one in inside),
        attitude=attitude,
        parked=parked,
        parked_angle_deg=(array.parked_sun_angle_deg or 0.0) if parked and array else 0.0,
        parked_normal=array.parked_normal if parked and array else None,
        plasma=plasma,
        events=events,
        emitting=on,
        illumination=light,
        sun_direction=direction,
    )


def plasma_names(case: Case, mode: Mode | None = None) -> tuple[str, ...]:
    """Plasmas of a run as the case names them: base, one per event, then those of intervals."""
    base = case.plasma.base if mode is None or mode.plasma is None else mode.plasma
    names = [base]
    if mode is None or mode.events:
        names += [event.use for event in case.plasma.event]
    names += _further(case, mode, base)
    return tuple(names)


def _further(case: Case, mode: Mode | None, base: str) -> Iterator[str]:
    return iter(dict.fromkeys(one.plasma for one in legs(case, mode) if one.plasma != base))
