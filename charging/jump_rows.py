"""Jumps between branches as rows of a document."""

from typing import Any

from charging.case import LoadedCase
from charging.clock import iso_time
from charging.orbit_run import ModeRun


def jump_rows(loaded: LoadedCase, mode: ModeRun, member: int) -> list[dict[str, Any]]:
    """Jumps of one member: time (UTC), surface or structure, volts before and after, law.

    `lasts_s` is the time from the loss of the old equilibrium until the new one is reached.
    """
    names = mode.net.node_names
    return [
        {
            "time": iso_time(loaded.case.epoch, jump.time_s),
            "surface": names[jump.node],
            "before_V": float(jump.before_V[jump.node]),
            "after_V": float(jump.after_V[jump.node]),
            "lasts_s": jump.end_s - jump.begin_s,
            "law": mode.laws[member],
        }
        for jump in mode.jumps(member)
    ]
