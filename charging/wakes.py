"""Wakes in low orbit that no light ions fill, and plasmas that a spacecraft outruns."""

from __future__ import annotations

from typing import Final

import numpy as np
from scipy.constants import atomic_mass, e

from charging.orbit_run import ModeRun
from environments.orbit import EARTH_RADIUS_M

STREAMING_BELOW_M: Final = 2.0e6
"""Height below which the ionosphere streams past a spacecraft faster than its heavy ions move."""
SPEED_M_S: Final = 7.5e3
"""Of a spacecraft in low orbit against the plasma."""
_LIGHT_KG: Final = 8.0 * atomic_mass


def heavy_plasmas(mode: ModeRun) -> tuple[str, ...]:
    """Names of the whole plasmas of a run in low orbit whose ions are all heavier than He+."""
    if not _in_low_orbit(mode):
        return ()
    found = []
    for plasma in dict.fromkeys(mode.whole_plasmas):
        ions = [p.species.mass_kg for p in plasma.populations if p.species.charge_number > 0]
        if ions and min(ions) > _LIGHT_KG:
            found.append(plasma.name)
    return tuple(found)


def unfed_surfaces(mode: ModeRun) -> frozenset[int]:
    """Numbers of the surfaces that stand at some time in a wake that no light ions fill.

    All of them in a plasma of `heavy_plasmas`, which has no known wake.
    """
    if heavy_plasmas(mode):
        return frozenset(range(len(mode.way.case.surface)))
    along = mode.around.along
    return frozenset(() if along is None else np.flatnonzero(along.unfed_wakes()).tolist())


def outrun_plasmas(mode: ModeRun) -> tuple[str, ...]:
    """Names of the whole plasmas of a run in low orbit with ions slower than the spacecraft.

    A plasma named in a case counts as isotropic: it has neither ram nor wake.
    """
    if not _in_low_orbit(mode):
        return ()
    return tuple(
        plasma.name
        for plasma in dict.fromkeys(mode.whole_plasmas)
        if any(
            p.species.charge_number > 0
            and 0.5 * p.species.mass_kg * SPEED_M_S**2 > e * p.temperature_eV
            for p in plasma.populations
        )
    )


def _in_low_orbit(mode: ModeRun) -> bool:
    if mode.way.trajectory is None:
        return False
    return mode.way.lowest_m() - EARTH_RADIUS_M <= STREAMING_BELOW_M
