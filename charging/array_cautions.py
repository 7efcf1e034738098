"""What a reader must know of the strings, emitters and dose rates of a run."""

import numpy as np

from charging.array_strings import SPECIALIST_V, irradiated, unirradiated
from charging.case import LoadedCase
from charging.orbit_run import ModeRun
from charging.surroundings import FIRST_OUTPUT_S

SNAP_OVER_V, DISCHARGE_V = 200.0, -100.0
"""Potentials against the plasma outside of which strings do what is not modelled."""


def array_cautions(loaded: LoadedCase, mode: ModeRun) -> list[str]:
    """What strings, emitters and dose rates leave out in one mode."""
    found = _strings(loaded, mode)
    clamps = [one.name for one in loaded.case.emitter if one.hold_V is not None]
    if clamps:
        found.append(
            f"{', '.join(clamps)}: a clamp that holds structure is common practice without a "
            "source; what its plume does to other surfaces is not modelled"
        )
    if irradiated(loaded.case):
        found.append(
            "dose rates raise the conductivity of films by coefficients good to an order of "
            "magnitude; they must be those in the depth of the film, which electrons of keV do "
            "not reach"
        )
        none = unirradiated(loaded.case, loaded.materials)
        if none:
            found.append(
                f"no figure for the conductivity that radiation adds to {', '.join(none)}: none "
                "was added"
            )
    return found


def _strings(loaded: LoadedCase, mode: ModeRun) -> list[str]:
    strings = mode.balance.strings
    if strings is None:
        return []
    low, high = np.inf, -np.inf
    lowest, highest = 0, 0
    for member, path in enumerate(mode.trajectories):
        ends_s = path.start_s + path.step_s
        # an uncharged start is no state of a flight
        settled = ends_s >= min(FIRST_OUTPUT_S, ends_s[-1])
        times, structure = ends_s[settled], path.y_end[settled, :1]
        which = np.full(len(times), member)
        setting, _ = mode.around.at(times)
        ends = strings.ends(which, setting, mode.around.string_ends_V(times))
        lower, upper = (structure + end for end in ends)
        if lower.min() < low:
            low, lowest = float(lower.min()), int(lower.min(axis=0).argmin())
        if upper.max() > high:
            high, highest = float(upper.max()), int(upper.max(axis=0).argmax())
    found = [
        f'string "{one.name}" of {one.voltage_V:.0f} V: specialist review, as for every array '
        f"above {SPECIALIST_V:.0f} V"
        for one in loaded.case.string
        if one.voltage_V > SPECIALIST_V
    ]
    if low < DISCHARGE_V:
        found.append(
            f'string "{strings.names[lowest]}" comes to {low:.0f} V against the plasma: discharges '
            f"below {DISCHARGE_V:.0f} V are not modelled"
        )
    if high > SNAP_OVER_V:
        found.append(
            f'string "{strings.names[highest]}" comes to {high:+.0f} V against the plasma: above '
            f"{SNAP_OVER_V:+.0f} V insulators beside conductors collect too (snap-over), which is "
            "not modelled"
        )
    return found
