"""From the shapes of a case to the areas, normals and neighbours of its surfaces."""

from __future__ import annotations

from charging.case_tables import Case, Surface
from charging.errors import Problem
from charging.shape.craft import Patch, neighbours, patches
from charging.shape.soundness import craft_problems
from charging.shape.views import craft_of

AREA_AGREES = 0.01
NORMAL_AGREES = 0.9998  # cosine of 1 degree


def with_faces(case: Case) -> tuple[Case, list[Problem]]:
    """Fill in what the shapes say about the surfaces of a case.

    Parameters
    ----------
    case : Case
        With `shape`; checked as far as names tell.

    Returns
    -------
    Case
        Area, normal, tracking and neighbours of every surface as its faces have them.
    list of Problem
        Overlapping or loose shapes, surfaces without area, contradictions.
    """
    craft = craft_of(case)
    problems = list(craft_problems(craft))
    if problems:
        return case, problems
    found, near = patches(craft), neighbours(craft)
    surfaces = []
    for index, surface in enumerate(case.surface):
        one = found[index]
        problems += _contradictions(index, surface, one)
        update = {
            "area_m2": one.area_m2,
            "normal": None if one.tracks_sun else one.normal,
            "tracks_sun": one.tracks_sun,
            "side": ("front" if one.front else "back") if one.tracks_sun else None,
            "neighbours": tuple(case.surface[k].name for k in near[index]),
        }
        surfaces.append(surface.model_copy(update=update))
    for index, mode in enumerate(case.mode):
        if craft.turns and mode.parked_normal is not None and abs(mode.parked_normal[1]) > 1e-6:
            problems.append(
                Problem(
                    ("mode", index, "parked_normal"),
                    "is not square to body y, about which the wings turn",
                    value=list(mode.parked_normal),
                    allowed="[x, 0, z]",
                )
            )
    return case.model_copy(update={"surface": tuple(surfaces)}), problems


def _contradictions(index: int, surface: Surface, found: Patch) -> list[Problem]:
    problems = []
    if surface.area_m2 and abs(surface.area_m2 / found.area_m2 - 1.0) > AREA_AGREES:
        problems.append(
            Problem(
                ("surface", index, "area_m2"),
                f"contradicts the faces, of which {found.area_m2:.4g} m2 are free",
                value=surface.area_m2,
                allowed="leave it out",
            )
        )
    if surface.normal is not None and not found.tracks_sun:
        along = (
            -1.0
            if found.normal is None
            else sum(a * b for a, b in zip(surface.normal, found.normal, strict=True))
        )
        if along < NORMAL_AGREES:
            what = (
                "which look several ways"
                if found.normal is None
                else f"which look along [{', '.join(f'{x:.4g}' for x in found.normal)}]"
            )
            problems.append(
                Problem(
                    ("surface", index, "normal"),
                    f"contradicts the faces, {what}",
                    value=list(surface.normal),
                    allowed="leave it out",
                )
            )
    if surface.tracks_sun and not found.tracks_sun:
        problems.append(
            Problem(
                ("surface", index, "tracks_sun"),
                "contradicts the faces, whose shapes do not all turn with the Sun",
                value=True,
                allowed="tracks_sun = true in the [[shape]]",
            )
        )
    if surface.side is not None and found.tracks_sun:
        side = "front" if found.front else "back"
        if surface.side != side:
            problems.append(
                Problem(
                    ("surface", index, "side"),
                    "contradicts the faces",
                    value=surface.side,
                    allowed=f'"{side}"',
                )
            )
    if surface.neighbours:
        problems.append(
            Problem(
                ("surface", index, "neighbours"),
                "are found from the shapes",
                value=list(surface.neighbours),
                allowed="leave it out",
            )
        )
    return problems
