"""Worst potentials of a run, from the march's own steps, against the limits."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from charging.case import LoadedCase
from charging.orbit_run import CaseRun, ModeRun
from charging.review.limits import (
    RUN_KINDS,
    Requirement,
    Standing,
    Verdict,
    requirements,
    standing,
)
from charging.wakes import heavy_plasmas, unfed_surfaces

Array = NDArray[np.float64]

INSIDE_STEP = np.arange(11) / 10.0
"""Points of every step of the march at which peaks are looked for, both ends included."""


NO_VOLTAGE_V = 1e-9
"""A difference below this is that of a bonded surface."""


@dataclass(frozen=True, slots=True)
class Peak:
    """An extreme value, its time [s after the start], and the law that gave it.

    `assessable` is False in a wake that no light ions fill: no voltage is to be given then.
    """

    value: float
    time_s: float
    law: str
    assessable: bool = True


@dataclass(frozen=True, slots=True)
class SurfacePeaks:
    """Extremes of one surface over the laws of a mode.

    lowest, highest : absolute potential [V]; normal, inverted : lowest and highest of
    surface minus structure [V]; field : largest |field| in the dielectric, signed [V/m];
    bonded : part of structure; unfed : stands for a part of the run in a wake that no light
    ions fill.
    """

    surface: str
    material: str
    lowest: Peak
    highest: Peak
    normal: Peak
    inverted: Peak
    field: Peak
    bonded: bool
    unfed: bool = False


@dataclass(frozen=True, slots=True)
class Judgement:
    """One requirement against one surface in one mode."""

    surface: str
    mode: str
    standing: Standing
    peak: Peak
    verdict: Verdict
    reason: str


@dataclass(frozen=True, slots=True)
class ModeSummary:
    """Extremes and judgements of one mode.

    `steady_s` is the time after which every potential stays within 1 V or 1 % of its
    last value, None when it never does so for the last tenth of the run.
    """

    mode: str
    surfaces: tuple[SurfacePeaks, ...]
    structure_lowest: Peak
    structure_highest: Peak
    judgements: tuple[Judgement, ...]
    verdict: Verdict
    steady_s: float | None


def case_summaries(run: CaseRun) -> tuple[ModeSummary, ...]:
    """Summaries of every mode, in the order of the run."""
    return tuple(mode_summary(run.loaded, mode) for mode in run.modes)


def worst(verdicts: Sequence[Verdict]) -> Verdict:
    """Overall verdict: exceeded beats not assessable beats within."""
    for verdict in ("exceeded", "not assessable"):
        if verdict in verdicts:
            return verdict
    return "within"


def mode_summary(loaded: LoadedCase, mode: ModeRun) -> ModeSummary:
    """Find extremes over the steps of every law of a mode and judge them."""
    net = mode.net
    # extremes [law][quantity] as (value, time)
    times, states = zip(*(_samples(mode, i) for i in range(len(mode.laws))), strict=True)
    thickness = np.full((len(mode.members), len(net.surface_node)), np.inf)
    thickness[:, net.film_surface] = net.film_thickness_m
    across_node = net.surface_node

    def peak(rows: Sequence[Array], largest: bool) -> Peak:
        pick = np.argmax if largest else np.argmin
        found = [(float(row[k := int(pick(row))]), float(t[k]), law)
                 for row, t, law in zip(rows, times, mode.laws, strict=True)]  # fmt: skip
        value, time, law = max(found, key=lambda f: f[0] if largest else -f[0])
        return Peak(value, time, law)

    along = mode.around.along
    heavy = bool(heavy_plasmas(mode))
    unfed_at_times = unfed_surfaces(mode)

    def told(number: int, found: Peak) -> Peak:
        if heavy:
            return replace(found, assessable=abs(found.value) < NO_VOLTAGE_V)
        if along is None or along.streams is None:
            return found
        unfed = bool(along.unfed_at(np.array([found.time_s]))[0, number])
        return replace(found, assessable=not unfed or abs(found.value) < NO_VOLTAGE_V)

    surfaces = []
    absolute = [net.potentials(y) for y in states]
    for i, surface in enumerate(loaded.case.surface):
        node = net.surface_node[i]
        own = [v[:, node] for v in absolute]
        difference = [v[:, node] - v[:, 0] for v in absolute]
        field = [
            y[:, across_node[i]] / d if np.isfinite(d) else np.zeros(len(y))
            for y, d in zip(states, thickness[:, i], strict=True)
        ]
        high, low = peak(field, True), peak(field, False)
        surfaces.append(
            SurfacePeaks(
                surface=surface.name,
                material=loaded.materials[surface.material].name,
                lowest=told(i, peak(own, False)),
                highest=told(i, peak(own, True)),
                normal=told(i, peak(difference, False)),
                inverted=told(i, peak(difference, True)),
                field=told(i, high if abs(high.value) >= abs(low.value) else low),
                bonded=bool(node == 0),
                unfed=i in unfed_at_times and bool(node != 0),
            )
        )
    structure = [v[:, 0] for v in absolute]
    judgements = tuple(
        _judge(loaded, mode, requirement, found)
        for found, surface in zip(surfaces, loaded.case.surface, strict=True)
        for requirement in requirements(loaded.case, RUN_KINDS)
        if requirement.covers(found.surface)
        and (requirement.kind != "field" or surface.thickness_m is not None)
    )
    return ModeSummary(
        mode=mode.name,
        surfaces=tuple(surfaces),
        structure_lowest=peak(structure, False),
        structure_highest=peak(structure, True),
        judgements=judgements,
        verdict=worst([j.verdict for j in judgements]),
        steady_s=_steady(times, absolute, loaded.case.duration_s),
    )


def peak_times_s(mode: ModeRun, member: int) -> Array:
    """Times [s] at which an absolute or differential potential of one law is extreme."""
    times, states = _samples(mode, member)
    quantities = mode.balance.controlled(states)
    return np.unique(times[np.concatenate([quantities.argmin(axis=0), quantities.argmax(axis=0)])])


def _samples(mode: ModeRun, member: int) -> tuple[Array, Array]:
    """Times [s] and states at tenths of every step of one law."""
    path = mode.trajectories[member]
    k = np.repeat(np.arange(len(path.step_s)), len(INSIDE_STEP))
    theta = np.tile(INSIDE_STEP, len(path.step_s))
    return path.start_s[k] + theta * path.step_s[k], path.inside(k, theta)


def _judge(loaded: LoadedCase, mode: ModeRun, requirement: Requirement,
           found: SurfacePeaks) -> Judgement:  # fmt: skip
    peak = {"normal": found.normal, "inverted": found.inverted, "field": found.field}[
        requirement.kind
    ]
    stand = standing(requirement, peak.value)
    assumed = mode.assumed
    if not peak.assessable or (found.unfed and not stand.exceeded):
        when = "" if not peak.assessable else "for a part of the run: "
        return Judgement(
            found.surface, mode.name, stand, peak, "not assessable",
            f"wake ion current not assessable: {when}no ions as light as He+ pass there",
        )  # fmt: skip
    if stand.exceeded:
        verdict: Verdict = "exceeded"
        reason = f"beyond {requirement.requirement_id}"
    elif assumed and loaded.case.plasma.accept_assumed is None:
        verdict = "not assessable"
        reason = (
            f'plasma "{assumed[0]}" rests on assumed figures; accept it with '
            '[plasma] accept_assumed = "reason"'
        )
    else:
        verdict, reason = "within", "below the limit"
    return Judgement(found.surface, mode.name, stand, peak, verdict, reason)


def _steady(times: Sequence[Array], absolute: Sequence[Array], end_s: float) -> float | None:
    latest = 0.0
    for t, v in zip(times, absolute, strict=True):
        last = v[-1]
        away = np.abs(v - last) > np.maximum(1.0, 0.01 * np.abs(last))
        moving = np.flatnonzero(away.any(axis=1))
        if moving.size:
            latest = max(latest, float(t[moving[-1]]))
    return latest if latest < 0.9 * end_s else None
