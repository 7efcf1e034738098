"""What a review runs: modes, plasmas, ages, laws, and the collections that the sheath allows."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from charging.case import LoadedCase, Mode
from charging.currents.surface import electron_sheath
from charging.orbit_run import ModeRun

Array = NDArray[np.float64]

OWN_PLASMA = "as in the case"
AGES = {"begin": "begin of life", "end": "end of life"}
BESIDE = 10.0
"""Ratio of sheath length to body radius, either way, within which both limits are run."""


@dataclass(frozen=True, slots=True)
class Scene:
    """One mode in one choice of plasma.

    mode : name; plasma : `OWN_PLASMA` or a name of ``[review] plasmas``; table : what changes.
    """

    mode: str
    plasma: str
    table: Mode | None


def scenes(loaded: LoadedCase) -> tuple[Scene, ...]:
    """Every mode with the case's own plasma and with each plasma of the review.

    A plasma of the review replaces the case's own for the whole run, without events.
    """
    found = []
    for mode in (None, *loaded.case.alternatives):
        name = "base" if mode is None else mode.name
        found.append(Scene(name, OWN_PLASMA, mode))
        for plasma in loaded.case.review.plasmas:
            start = mode or Mode(name="base", alternative=True, plasma=plasma)
            changed = start.model_copy(update={"plasma": plasma, "events": False})
            found.append(Scene(name, plasma, changed))
    return tuple(found)


@dataclass(frozen=True, slots=True)
class Sheath:
    """Sheath lengths over body radius along a run, and the collections they allow."""

    least: float
    most: float
    collections: tuple[str, ...]
    text: str


def sheath(loaded: LoadedCase, runs: Sequence[ModeRun]) -> Sheath:
    """Which collections of attracted particles the sheath length allows.

    s = max(λ_D, (√2/3) λ_D (2|φ|/T)^¾) over the runs with the case's own collection. Within
    a factor `BESIDE` of the body radius both limits are possible; far larger: sphere, and
    cylinder for a body said to be long; far smaller: plane.
    """
    radius = loaded.case.body.radius_m
    ratios = np.array([ratio for run in runs for ratio in _ratios(run, radius)])
    least, most = float(ratios.min()), float(ratios.max())
    asked: str = loaded.case.body.collection
    allowed: tuple[str, ...]
    thick: tuple[str, ...] = ("cylinder", "sphere") if asked == "cylinder" else ("sphere",)
    size = f"sheath {least:.3g} to {most:.3g} times the body radius"
    if most < 1.0 / BESIDE:
        allowed, text = ("plane",), f"{size}: plane; sphere and cylinder do not apply"
    elif least > BESIDE:
        allowed, text = thick, f"{size}: {' and '.join(thick)}; plane does not apply"
    else:
        allowed = (*thick, "plane")
        text = f"{size}: {', '.join(thick)} and plane, the worse governs"
    own = (asked,) if asked not in allowed else ()
    if asked == "auto" and len(allowed) == 1:
        # the blend is that limit to a part in (s/R)², so it stands for it
        return Sheath(least, most, ("auto",), f"{text} (run as the blend, which is that limit)")
    if own and asked != "auto":
        text += f"; {asked}, which the case asks for, is run too"
    return Sheath(least, most, (*own, *allowed), text)


def _ratios(run: ModeRun, radius_m: float) -> Array:
    found = []
    for member, path in enumerate(run.trajectories):
        setting = run.around.at(path.start_s)[0]
        debye, temperature = electron_sheath(run.balance.models[member].electrons, setting.strength)
        size = np.abs(run.balance.net.potentials(path.y_end)).max(axis=-1)
        child = np.sqrt(2.0) / 3.0 * (2.0 * size / temperature) ** 0.75
        found.append(debye * np.maximum(1.0, child) / radius_m)
        found.append(debye / radius_m)
    return np.concatenate(found)
