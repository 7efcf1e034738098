"""One sentence per limit that is not met: what, where, when, why, what to try."""

from collections.abc import Sequence

import numpy as np

from charging.case import LoadedCase, Surface
from charging.clock import iso_time, span
from charging.currents.surface import MECHANISMS
from charging.orbit_run import ModeRun
from charging.review.limits import UNITS
from charging.summary import Judgement

WORDS = {
    "electron_collection": "collected electrons",
    "ion_collection": "collected ions",
    "secondary_electron": "secondary electrons",
    "ion_induced_secondary": "electrons released by ions",
    "backscatter": "backscattered electrons",
    "photoemission": "photoemission",
}


def sentence(loaded: LoadedCase, mode: ModeRun, judgement: Judgement) -> str:
    """Say what stands where, when and driven by what."""
    stand, peak = judgement.standing, judgement.peak
    requirement = stand.requirement
    unit = UNITS[requirement.kind]
    size = f"{abs(stand.value):.3g} V/m" if unit != "V" else f"{abs(stand.value):.0f} V"
    limit = f"{requirement.limit:.3g} V/m" if unit != "V" else f"{requirement.limit:.0f} V"
    what = {
        "normal": f"stands {size} below structure",
        "inverted": f"stands {size} above structure",
        "field": f"holds {size} across its film",
    }[requirement.kind]
    return (
        f"{judgement.surface} {what} at {when(loaded, mode, peak.time_s)}; allowed {limit} "
        f"({requirement.requirement_id}); law {peak.law}. "
        f"{driver(loaded, mode, mode.laws.index(peak.law), judgement.surface, peak.time_s)}."
    )


def when(loaded: LoadedCase, mode: ModeRun, time_s: float) -> str:
    """Say a time: UTC, how long after which event, in which mode."""
    text = iso_time(loaded.case.epoch, time_s)
    for eclipse in mode.around.eclipses:
        start, end = eclipse.umbra_start, eclipse.umbra_end
        if start is not None and end is not None and start <= time_s <= end:
            text += f", {(time_s - start) / 60.0:.0f} min into eclipse"
        elif end is not None and end < time_s < end + 3600.0:
            # the difference of the times as printed
            text += f", {span(round(time_s) - round(end))} after the end of umbra"
    begun = [e for e in mode.around.episodes if e.onset_s <= time_s]
    if begun:
        last = max(begun, key=lambda e: e.onset_s)
        name = mode.plasmas[last.plasma].name
        text += f", {span(round(time_s) - round(last.onset_s))} after the onset of '{name}'"
    if not mode.around.episodes and not mode.around.eclipses:
        text = f"{span(time_s)} after the start"
    # a peak at the edge of a mode was reached before it
    leg = mode.way.legs[int(mode.around.leg(np.array(np.nextafter(time_s, 0.0))))]
    if leg.modes:
        text += f", in mode {' and '.join(repr(name) for name in leg.modes)}"
    return text


def driver(loaded: LoadedCase, mode: ModeRun, member: int, surface: str, time_s: float) -> str:
    """Name the largest currents on a surface, if any is given, and on what holds structure."""
    time = np.array([time_s])
    state = mode.trajectories[member](time)
    arriving = mode.balance.flows(member, time, state)
    flows = arriving.surface_A_m2[0]
    names = loaded.case.names
    text = "Currents there"
    if surface:
        own = flows[names.index(surface)]
        up, down = int(np.argmax(own)), int(np.argmin(own))
        text += (
            f": {WORDS[MECHANISMS[up]]} {1e6 * own[up]:+.2g}, "
            f"{WORDS[MECHANISMS[down]]} {1e6 * own[down]:+.2g} µA/m2"
        )
    on_structure = [i for i, node in enumerate(mode.net.surface_node) if node == 0]
    if on_structure:
        net = flows[on_structure].sum(axis=-1) * mode.net.of(member).area_m2[on_structure]
        pulls = on_structure[int(np.argmin(net))]
        if net.min() < 0.0:
            text += f"; structure is drawn down by '{names[pulls]}' ({1e6 * net.min():+.2g} µA)"
    for name, current in zip(mode.balance.emitters.names, arriving.emitter_A[0], strict=True):
        if current > 0.0:
            text += f"; emitter '{name}' gives structure {1e6 * current:+.3g} µA"
    strings = () if mode.balance.strings is None else mode.balance.strings.names
    for name, current in zip(strings, arriving.string_A[0], strict=True):
        text += f"; string '{name}' gives structure {1e6 * current:+.3g} µA"
    return text


def first_fixes(loaded: LoadedCase, judgements: Sequence[Judgement]) -> dict[str, list[str]]:
    """First thing to try, and the surfaces with an exceeded limit it is meant for.

    A suggestion: nothing was run with it.
    """
    fixes: dict[str, list[str]] = {}
    for judgement in unmet(judgements):
        surface = next(s for s in loaded.case.surface if s.name == judgement.surface)
        names = fixes.setdefault(first_fix(surface), [])
        if surface.name not in names:
            names.append(surface.name)
    return fixes


def first_fix(surface: Surface) -> str:
    """Suggest what to try first on a surface; nothing was run with it."""
    if surface.floating:
        return "a bleed resistor to structure ([[link]])"
    if surface.material.startswith("cover glass"):
        return 'a face bonded to structure (material = "cover glass, ITO-coated", no thickness_m)'
    return "a conductive outer layer bonded to structure (a conductor, no thickness_m)"


def unmet(judgements: Sequence[Judgement]) -> list[Judgement]:
    """Judgements that exceed their limit, the worst first."""
    bad = [j for j in judgements if j.verdict == "exceeded"]
    return sorted(bad, key=lambda j: j.standing.margin / j.standing.requirement.limit)


def not_assessable(judgements: Sequence[Judgement]) -> list[str]:
    """One sentence per reason why limits could not be assessed."""
    surfaces: dict[str, list[str]] = {}
    for j in judgements:
        if j.verdict == "not assessable":
            names = surfaces.setdefault(j.reason, [])
            if j.surface not in names:
                names.append(j.surface)
    return [f"Not assessable: {reason} ({', '.join(who)})." for reason, who in surfaces.items()]
