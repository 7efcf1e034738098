"""What a reader of a result must know before using it."""

import numpy as np

from charging.array_cautions import array_cautions
from charging.barriers import overcount, without_barrier
from charging.case import LoadedCase
from charging.currents.uncharged import what_decides
from charging.orbit_run import ModeRun
from charging.wakes import heavy_plasmas, outrun_plasmas
from environments.orbit import EARTH_RADIUS_M
from environments.plasma import warnings_of as spectrum_warnings

PLASMA_SHEET_FROM_KM = 25000.0
"""Perigee [km from the centre] below which one geostationary plasma cannot hold everywhere."""

KILOVOLT, STRONGLY_POSITIVE_V = 1000.0, 100.0
NOTICEABLE = 0.05
"""Share of the arriving electrons that barriers would turn back, above which a run says so."""


def cautions(loaded: LoadedCase, mode: ModeRun) -> tuple[str, ...]:
    """What a reader of the result must know about this run."""
    reason = loaded.case.plasma.accept_assumed
    accepted = "" if reason is None else f" (accepted: {reason})"
    found = [f'plasma "{name}" rests on assumed figures{accepted}' for name in mode.assumed]
    found += _along_orbit(mode)
    for plasma in dict.fromkeys(mode.whole_plasmas):
        found += [f'plasma "{plasma.name}": {text}' for text in spectrum_warnings(plasma)]
    found += [
        f'wake ion current not assessable in plasma "{name}": it holds no ions as light as '
        "He+, and counts as isotropic here"
        for name in heavy_plasmas(mode)
    ]
    found += [
        f'ions of plasma "{name}" are slower than the spacecraft but count as coming from all '
        'sides: no ram, no wake; model = "regions" or a file of moments has both'
        for name in outrun_plasmas(mode)
    ]
    found += _deciding_assumptions(loaded, mode)
    if loaded.case.shape:
        from charging.shape.account import shape_cautions  # costs time only with shapes

        found += shape_cautions(loaded.case)
    if loaded.case.orbit.kind == "tle":
        found.append(
            "orbit from two-line elements: good to about 1 km at their epoch, and 1 to 3 km a day "
            "worse from there in low orbit"
        )
    if mode.way.trajectory is not None and mode.around.along is None:
        perigee = mode.way.lowest_m() / 1e3
        if perigee < PLASMA_SHEET_FROM_KM:
            found.append(
                f'plasma "{mode.plasmas[0].name}" is used along the whole orbit, down to '
                f"{perigee - EARTH_RADIUS_M / 1e3:.0f} km altitude"
            )
    lowest = min(float(mode.net.potentials(path.y_end).min()) for path in mode.trajectories)
    highest = max(float(mode.net.potentials(path.y_end).max()) for path in mode.trajectories)
    assumed = [
        material.name
        for material in dict.fromkeys(loaded.materials.values())
        if "ion_yield_peak" in material.values
        and material.values["ion_yield_peak"].basis == "assumed"
    ]
    if lowest < -KILOVOLT and assumed:
        found.append(
            "electrons released by ions carry much of the balance at kilovolts, and their "
            f"yield is assumed for {', '.join(assumed)}"
        )
    found += _barriers(loaded, mode)
    found += array_cautions(loaded, mode)
    if highest > STRONGLY_POSITIVE_V and lowest < -STRONGLY_POSITIVE_V:
        found.append(
            f"a surface stands {highest:.0f} V above the plasma beside negative ones: their "
            "electrons, whose exchange is not modelled, would pull it down"
        )
    return tuple(found)


def _along_orbit(mode: ModeRun) -> list[str]:
    """What rests on what in the plasma along the orbit, and what its models say of themselves."""
    along = mode.around.along
    if along is None:
        return []
    shares = ", ".join(f"{100.0 * s:.0f} % {basis}" for basis, s in along.sampled.bases.items())
    found = [f'plasma "{along.name}": its figures are {shares}'] if shares else []
    found += [f'plasma "{along.name}": {text}' for text in along.sampled.cautions]
    if along.streams is not None:
        names = [mode.way.case.names[i] for i in np.flatnonzero(along.unfed_wakes())]
        if names:
            found.append(
                f"wake ion current not assessable on {', '.join(names)}: no ions as light as He+ "
                "pass there, and bent O+ alone decides"
            )
    motional = along.motional_V_m
    if motional > 0.0:
        radius = mode.way.case.body.radius_m
        found.append(
            f"the motion through the Earth's field makes up to {motional:.2g} V per metre, "
            f"{2.0 * motional * radius:.2g} V across the body; left out of the potentials of "
            "surfaces"
        )
    return found


def _deciding_assumptions(loaded: LoadedCase, mode: ModeRun) -> list[str]:
    """Dielectrics that one law or the angle factor alone leaves uncharged in the dark."""
    case = loaded.case
    named = dict.fromkeys(loaded.materials[surface.material] for surface in case.surface)
    found: dict[tuple[str, str], list[str]] = {}
    for plasma in dict.fromkeys(mode.whole_plasmas):
        for material in named:
            if material.kind != "dielectric":
                continue
            for text in what_decides(
                material,
                plasma,
                radius_m=case.body.radius_m,
                collection=case.body.collection,
            ):
                found.setdefault((plasma.name, text), []).append(material.name)
    return [
        f'dark in plasma "{plasma}": {"; ".join(names)}: {text}'
        for (plasma, text), names in found.items()
    ]


def _barriers(loaded: LoadedCase, mode: ModeRun) -> list[str]:
    """What the barriers of a run leave out."""
    found = []
    balance = mode.balance
    missing = without_barrier(loaded.case)
    if missing:
        found.append(
            "no barrier is worked out in front of surfaces that have no fixed place on the sphere: "
            + ", ".join(missing)
        )
    if balance.barriers is None or not balance.models:
        return found
    least = 1.0
    for member, path in enumerate(mode.trajectories):
        which = np.full(len(path.y_end), member)
        times = path.start_s + path.step_s
        standing = balance.vacuum(which, balance.table.prepared(which, mode.around.at(times)[0]))
        least = least if standing is None else min(least, float(standing.min()))
        surface_V = mode.net.potentials(path.y_end)[:, mode.net.surface_node]
        worst = overcount(
            balance.models[member].electrons,
            mode.around.strength(times),
            surface_V,
            balance.heights(which, path.y_end, mode.around.at(times)[0]),
        )
        if worst.share > NOTICEABLE:
            found.append(
                f"barriers hold back what is emitted, not what arrives: up to {worst.share:.0%} "
                f'too many electrons are collected on "{loaded.case.names[worst.surface]}" '
                f"({mode.laws[member]})"
            )
    if least < 1.0:
        found.append(
            f"barriers fade, down to {least:.0%}, where the electron Debye length is shorter than "
            "the body's radius; that they are gone at a tenth of it is assumed"
        )
    return found
