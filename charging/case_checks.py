"""Checks between the keys of a case: within one table, and from table to table.

Field by field limits stand in :mod:`charging.case_tables`; here is what one key says about
another. Everything raises :class:`charging.errors.ProblemsFound` with all faults found.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterable, Iterator, Sequence
from datetime import timedelta
from typing import TYPE_CHECKING

from charging.case_mode_checks import emitter_problems, mode_problems
from charging.case_values import nearest_name, quoted
from charging.errors import KeyPath, Problem, ProblemsFound

if TYPE_CHECKING:
    from charging.case_orbit import OrbitKepler
    from charging.case_plasma import PlasmaEvent, PlasmaSubstorm
    from charging.case_tables import (
        Case,
        Limit,
        Link,
        Surface,
    )

STRUCTURE = "structure"
MOST_OUTPUT_TIMES = 200_000
LONGEST_RUN_H = 24.0 * 366.0
MOST_PROBLEMS = 50  # a search for the nearest name belongs to each


# one table ---------------------------------------------------------------------------------------


def _raise(problems: Iterable[Problem]) -> None:
    found = list(problems)
    if found:
        raise ProblemsFound(found)


def _missing(key: str, message: str = "is missing", allowed: str | None = None) -> Problem:
    return Problem((key,), message, missing=True, allowed=allowed)


def check_kepler(orbit: OrbitKepler, earth_radius_km: float) -> None:
    """Refuse an orbit whose perigee is below ground."""
    perigee_km = orbit.semi_major_axis_km * (1.0 - orbit.eccentricity) - earth_radius_km
    if perigee_km < 0.0:
        most = 1.0 - earth_radius_km / orbit.semi_major_axis_km
        raise ProblemsFound(
            [
                Problem(
                    ("eccentricity",),
                    f"puts the perigee {-perigee_km:.6g} km below ground",
                    value=orbit.eccentricity,
                    allowed=f"below {most:.6g} with this semi-major axis",
                )
            ]
        )


def check_event(event: PlasmaEvent | PlasmaSubstorm) -> None:
    """Refuse a plasma event or a substorm without begin or with two."""
    if event.onset is not None and event.onset_h is not None:
        message = "stands beside onset; give one of the two"
        raise ProblemsFound([Problem(("onset_h",), message, value=event.onset_h)])
    if event.onset is None and event.onset_h is None:
        raise ProblemsFound(
            [
                _missing(
                    "onset", "is missing", "onset (UTC with Z) or onset_h (hours from the start)"
                )
            ]
        )


def _surface_problems(surface: Surface) -> Iterator[Problem]:
    if surface.name == STRUCTURE:
        yield Problem(("name",), "is the spacecraft's own structure", value=surface.name)
    if surface.normal is not None and surface.tracks_sun:
        yield Problem(
            ("tracks_sun",), "stands beside normal; give one of the two", value=surface.tracks_sun
        )
    shaped = surface.face is not None or surface.faces != ()
    if surface.face is not None and surface.faces:
        message = "stands beside face; give one of the two"
        yield Problem(("faces",), message, value=list(surface.faces))
    yield from _list_problems(("faces",), surface.faces)
    if not shaped and "area_m2" not in surface.model_fields_set:
        yield _missing("area_m2")
    if surface.normal is None and not surface.tracks_sun and not shaped:
        yield _missing("normal", "is missing", "normal = [x, y, z], or tracks_sun = true with side")
    if surface.tracks_sun and surface.side is None:
        yield _missing("side", "is missing for a sun tracker", '"front", "back"')
    if surface.side is not None and not surface.tracks_sun:
        yield Problem(("side",), "needs tracks_sun = true", value=surface.side)
    if surface.floating and surface.capacitance_F is None:
        yield _missing(
            "capacitance_F", "is missing for floating = true", "farad to what it is attached to"
        )
    if surface.capacitance_F is not None and not surface.floating:
        yield Problem(("capacitance_F",), "needs floating = true", value=surface.capacitance_F)
    if surface.floating and surface.thickness_m is not None:
        yield Problem(
            ("floating",),
            "stands beside thickness_m, which makes a dielectric; only a conductor can be isolated",
            value=True,
        )
    if surface.thickness_m is not None and surface.temperature_K is None:
        yield _missing(
            "temperature_K",
            "is missing; the conductivity of a surface with thickness_m depends on it",
            "a number [K], {sunlit_K, eclipse_K, time_constant_min}, or a .csv file",
        )
    if surface.attached_to == surface.name != STRUCTURE:
        yield Problem(("attached_to",), "is the surface itself", value=surface.attached_to)
    yield from _list_problems(("neighbours",), surface.neighbours)
    if surface.name in surface.neighbours:
        index = surface.neighbours.index(surface.name)
        yield Problem(("neighbours", index), "is the surface itself", value=surface.name)


def check_surface(surface: Surface) -> None:
    """Refuse contradictions within one surface."""
    _raise(_surface_problems(surface))


def check_link(link: Link) -> None:
    """Refuse a link from a node to itself."""
    if link.between[0] == link.between[1]:
        message = "joins a conductor with itself"
        raise ProblemsFound([Problem(("between",), message, value=list(link.between))])


def _limit_problems(limit: Limit) -> Iterator[Problem]:
    due = {"field": "allowed_V_m", "energy": "allowed_J"}.get(limit.kind, "allowed_V")
    others = [
        key
        for key in ("allowed_V", "allowed_V_m", "allowed_J")
        if key != due and getattr(limit, key) is not None
    ]
    for other in others:
        message = f"does not go with kind = {quoted([limit.kind])}"
        yield Problem((other,), message, value=getattr(limit, other), allowed=due)
    if not others and getattr(limit, due) is None:
        yield _missing(due, "is missing", "a positive number")
    if limit.kind == "structure" and limit.surfaces is not None:
        message = 'do not go with kind = "structure", which concerns no single surface'
        yield Problem(("surfaces",), message, value=list(limit.surfaces))
    if limit.surfaces is not None:
        if not limit.surfaces:
            yield Problem(("surfaces",), "is empty", value=[], allowed="names; leave out for all")
        yield from _list_problems(("surfaces",), limit.surfaces)


def check_limit(limit: Limit) -> None:
    """Refuse a limit without its allowed value, or with the wrong one."""
    _raise(_limit_problems(limit))


def _list_problems(key: KeyPath, names: Sequence[str]) -> Iterator[Problem]:
    for index, name in enumerate(names):
        if name in names[:index]:
            yield Problem((*key, index), "is listed twice", value=name)


# from table to table -----------------------------------------------------------------------------


def check_case(case: Case, *, orbit_only: bool = False) -> None:
    """Refuse what one table says against another: names, times, kinds of orbit.

    `orbit_only` lifts the bounds on length and output times that hold for a run.
    """
    if not case.surface:
        raise ProblemsFound([_missing("surface", allowed="at least one [[surface]]")])
    found = itertools.chain(
        _time_problems(case, orbit_only),
        _sun_problems(case),
        _plasma_problems(case),
        _event_problems(case),
        _name_problems(case),
        _attachment_problems(case),
        mode_problems(case),
        emitter_problems(case),
        _list_problems(("review", "ages"), case.review.ages),
        _list_problems(("review", "plasmas"), case.review.plasmas),
    )
    _raise(itertools.islice(found, MOST_PROBLEMS))


def _time_problems(case: Case, orbit_only: bool) -> Iterator[Problem]:
    if not case.resolved:  # asked again once the file of the orbit is read
        return
    fixed_h = case.orbit.duration_h if case.orbit.kind == "fixed" else None
    if fixed_h is not None and case.time.duration_h is not None:
        message = "stands in [orbit] too; give it once"
        yield Problem(("time", "duration_h"), message, value=case.time.duration_h)
    elif fixed_h is None and case.time.duration_h is None:
        yield Problem(("time", "duration_h"), "is missing", missing=True, allowed="hours above 0")
    elif case.duration_s > 3600.0 * LONGEST_RUN_H and not orbit_only:
        yield Problem(
            ("time", "duration_h"),
            "is out of range",
            value=case.time.duration_h,
            allowed=f"at most {LONGEST_RUN_H:.10g} for a run; halflit orbit takes 20 times as much",
        )
    elif case.output_times > MOST_OUTPUT_TIMES and not orbit_only:
        least = case.duration_s / MOST_OUTPUT_TIMES
        yield Problem(
            ("time", "output_step_s"),
            f"gives {case.output_times} output times",
            value=case.time.output_step_s,
            allowed=f"{MOST_OUTPUT_TIMES} times: at least {least:.4g} s here",
        )


def _sun_problems(case: Case) -> Iterator[Problem]:
    if case.sun.distance_au is not None and case.orbit.kind != "fixed":
        yield Problem(
            ("sun", "distance_au"),
            "goes only with a fixed orbit; here it follows from the date",
            value=case.sun.distance_au,
        )
    if case.orbit.kind == "kepler":
        perigee_km = case.orbit.semi_major_axis_km * (1.0 - case.orbit.eccentricity)
        lowest_km = perigee_km - 6378.137
        if lowest_km <= case.sun.absorbing_height_km:
            yield too_low(case.sun.absorbing_height_km, lowest_km)


def _plasma_problems(case: Case) -> Iterator[Problem]:
    plasma, fixed = case.plasma, case.orbit.kind == "fixed"
    if plasma.model is not None and fixed and plasma.around is None:
        yield Problem(
            ("plasma", "around"),
            "is missing for the regions of a fixed case",
            missing=True,
            allowed='"moon" with solar_zenith_angle_deg, or "sun"',
        )
    if plasma.around is not None and not fixed:
        yield Problem(("plasma", "around"), "goes only with a fixed orbit", value=plasma.around)


def too_low(height_km: float, lowest_km: float) -> Problem:
    """Return the fault of an orbit that leads through the absorbing air."""
    return Problem(
        ("sun", "absorbing_height_km"),
        f"is not below the orbit, which comes down to {lowest_km:.0f} km",
        value=height_km,
        missing=height_km == 0.0,  # then it need not stand in the file
        allowed=f"below {lowest_km:.6g}",
    )


def _event_problems(case: Case) -> Iterator[Problem]:
    if case.time.duration_h is None and getattr(case.orbit, "duration_h", None) is None:
        return
    if not case.resolved:
        return
    onsets = case.event_onset_s
    spans = []
    for index, (event, onset_s) in enumerate(zip(case.plasma.event, onsets, strict=True)):
        key = "onset" if event.onset_h is None else "onset_h"
        value = event.onset if event.onset_h is None else event.onset_h
        if onset_s >= case.duration_s:
            end = case.epoch + timedelta(seconds=case.duration_s)
            yield Problem(
                ("plasma", "event", index, key),
                "is not before the end of the run",
                value=value,
                allowed=f"before {end.isoformat(timespec='seconds').replace('+00:00', 'Z')}",
            )
        whole_s = 60.0 * (event.rise_min + event.hold_min)
        spans.append((onset_s, onset_s + whole_s, index, key, value))
    spans.sort(key=lambda span: span[:3])
    for before, after in itertools.pairwise(spans):
        if after[0] < before[1] or after[0] == before[0]:
            yield Problem(
                ("plasma", "event", after[2], after[3]),
                f"overlaps plasma event {before[2] + 1}, whose rise and hold last"
                f" {(before[1] - before[0]) / 60.0:.6g} min",
                value=after[4],
            )


def _name_problems(case: Case) -> Iterator[Problem]:
    names = case.names
    for key, entries in (
        ("surface", names),
        ("mode", [mode.name for mode in case.mode]),
        ("emitter", [emitter.name for emitter in case.emitter]),
        ("string", [string.name for string in case.string]),
    ):
        for index, name in enumerate(entries):
            if name in entries[:index]:
                first = entries.index(name) + 1
                yield Problem(
                    (key, index, "name"), f"is the name of {key} {first} already", value=name
                )
    for index, surface in enumerate(case.surface):
        for place, neighbour in enumerate(surface.neighbours):
            yield from _unknown(("surface", index, "neighbours", place), neighbour, names)
    for index, string in enumerate(case.string):
        yield from _unknown(("string", index, "surface"), string.surface, names)
    for index, link in enumerate(case.link):
        for place, end in enumerate(link.between):
            known = (*names, STRUCTURE)
            yield from _unknown(("link", index, "between", place), end, known)
        nodes = [_node(end, case) for end in link.between]
        if nodes[0] == nodes[1] and link.between[0] != link.between[1]:
            yield Problem(
                ("link", index, "between"),
                "joins two names of one conductor; a conductor is bonded to what it is attached to"
                " unless floating = true",
                value=list(link.between),
            )
    for index, limit in enumerate(case.limit):
        for place, name in enumerate(limit.surfaces or ()):
            path = ("limit", index, "surfaces", place)
            yield from _unknown(path, name, names)
            film = name in names and case.surface[names.index(name)].thickness_m is not None
            if limit.kind == "field" and name in names and not film:
                yield Problem(path, "has no thickness_m, so no field", value=name)


def _node(name: str, case: Case) -> str:
    """Return the isolated conductor, dielectric or structure that `name` is a part of."""
    for surface in case.surface:
        if surface.name == name and not surface.floating and surface.thickness_m is None:
            return surface.attached_to
    return name


def _unknown(path: KeyPath, name: str, names: Sequence[str]) -> Iterator[Problem]:
    if name not in names:
        near = nearest_name(name, names)
        yield Problem(
            path, "is no surface of this case", value=name, nearest=near, allowed=_some(names)
        )


def _some(names: Sequence[str]) -> str:
    unique = list(dict.fromkeys(names))
    return quoted(unique) if len(unique) <= 12 else f"{quoted(unique[:12])} and more"


def _attachment_problems(case: Case) -> Iterator[Problem]:
    surfaces = {surface.name: surface for surface in case.surface}
    isolated = [name for name, surface in surfaces.items() if surface.floating]
    for index, surface in enumerate(case.surface):
        target = surface.attached_to
        path = ("surface", index, "attached_to")
        if target in (STRUCTURE, surface.name):
            continue
        if target not in surfaces:
            yield from _unknown(path, target, (*isolated, STRUCTURE))
        elif not surfaces[target].floating:
            yield Problem(
                path,
                "is no isolated conductor (floating = true)",
                value=target,
                allowed=_some((*isolated, STRUCTURE)),
            )
        elif _returns(surface.name, surfaces):
            yield Problem(path, "leads back to this surface, never to structure", value=target)


def _returns(start: str, surfaces: dict[str, Surface]) -> bool:
    """Whether following attached_to from `start` comes back to `start`."""
    seen = set()
    name = surfaces[start].attached_to
    while name in surfaces and name not in seen:
        if name == start:
            return True
        seen.add(name)
        name = surfaces[name].attached_to
    return False
