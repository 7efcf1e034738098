"""What a reader of a result must know before using it."""

from charging.case import LoadedCase
from charging.orbit_run import ModeRun
from environments.orbit import EARTH_RADIUS_M
from environments.plasma import warnings_of as spectrum_warnings

PLASMA_SHEET_FROM_KM = 25000.0
"""Perigee [km from the centre] below which one geostationary plasma cannot hold everywhere."""

KILOVOLT, STRONGLY_POSITIVE_V = 1000.0, 100.0


def cautions(loaded: LoadedCase, mode: ModeRun) -> tuple[str, ...]:
    """What a reader of the result must know about this run."""
    reason = loaded.case.plasma.accept_assumed
    accepted = "" if reason is None else f" (accepted: {reason})"
    found = [
        f'plasma "{plasma.name}" rests on assumed figures{accepted}'
        for plasma in dict.fromkeys(mode.plasmas)
        if plasma.basis == "assumed"
    ]
    for plasma in dict.fromkeys(mode.plasmas):
        found += [f'plasma "{plasma.name}": {text}' for text in spectrum_warnings(plasma)]
    if loaded.case.orbit.kind == "tle":
        found.append(
            "orbit from two-line elements: good to about 1 km at their epoch, and 1 to 3 km a day "
            "worse from there in low orbit"
        )
    if mode.way.trajectory is not None:
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
    if highest > STRONGLY_POSITIVE_V and lowest < -STRONGLY_POSITIVE_V:
        found.append(
            f"a surface stands {highest:.0f} V above the plasma beside negative ones: their "
            "electrons, whose exchange is not modelled, would pull it down"
        )
    return tuple(found)
