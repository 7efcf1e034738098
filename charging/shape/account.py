"""What the geometry of a case amounts to, in numbers: areas, capacitances, fields, views."""

from __future__ import annotations

from typing import Any

import numpy as np
from scipy.constants import epsilon_0

from charging.case_tables import Case
from charging.errors import InputError
from charging.shape.craft import Craft, craft_panels, neighbours, patches
from charging.shape.solution import field_at, shape_field
from charging.shape.views import Wings, craft_of, sun_views, table_error


def geometry_account(case: Case) -> dict[str, Any]:
    """Numbers about the shapes of a case.

    Returns
    -------
    dict
        ``surfaces`` [{``surface``, ``faces``, ``area_m2``, ``normal``, ``tracks_sun``,
        ``neighbours``, ``capacitance_pF``, ``barrier_share``, ``field_1_m``, ``edge_field_1_m``,
        ``least_lit_share``, ``lit_error``}] and ``whole`` {``panels``, ``area_m2``,
        ``bare_area_m2``, ``volume_m3``, ``capacitance_pF``, ``radius_m``, ``asymmetry``,
        ``turn_spread``, ``weight_spread``}.

        `capacitance_pF` is the diagonal of Maxwell's matrix; `barrier_share` the height that
        electrons of a surface at 0 V climb when everything else is at -1 V; `field_1_m` the
        mean field at the surface when the surface alone is at 1 V [V m-1 per V], and
        `edge_field_1_m` the largest of a panel, at an edge an estimate that finer panels raise.

    Raises
    ------
    InputError
        The case has no shapes.
    """
    if not case.shape:
        raise InputError(
            "the case has no shapes",
            key=("shape",),
            allowed="[[shape]] tables; see cases/README.md",
        )
    craft = craft_of(case)
    found, near = patches(craft), neighbours(craft)
    field, panels = shape_field(craft), craft_panels(craft, 0.0)
    at_zero = field_at(craft, 0.0)
    views, error = sun_views(craft, Wings()), table_error(craft, Wings())
    rows = []
    for k, surface in enumerate(case.surface):
        others = -np.ones(len(found))
        others[k] = 0.0
        own = at_zero.surface_field_1_m[panels.patch == k, k]
        size = panels.area_m2[panels.patch == k]
        seen = views.cosine[k] > 0.1
        least = float(views.share[k][seen].min()) if seen.any() else None
        rows.append(
            {
                "surface": surface.name,
                "faces": list(surface.lies_on),
                "area_m2": found[k].area_m2,
                "normal": None if found[k].normal is None else list(found[k].normal or ()),
                "tracks_sun": found[k].tracks_sun,
                "neighbours": [case.surface[j].name for j in near[k]],
                "capacitance_pF": float(field.capacitance_F[k, k]) * 1e12,
                "barrier_share": float(-(field.weights[k] @ others).min()),
                "field_1_m": float((own * size).sum() / size.sum()),
                "edge_field_1_m": float(own.max()),
                "least_lit_share": least,
                "lit_error": float(error[0][k]),
            }
        )
    total = float(field.capacitance_F.sum())
    whole = {
        "panels": len(panels),
        "area_m2": sum(one.area_m2 for one in found),
        "bare_area_m2": found[-1].area_m2,
        "volume_m3": panels.volume_m3,
        "capacitance_pF": total * 1e12,
        "radius_m": total / (4.0 * np.pi * epsilon_0),
        "asymmetry": field.asymmetry,
        "turn_spread": field.capacitance_spread,
        "weight_spread": field.weight_spread,
    }
    return {"title": case.title, "surfaces": rows, "whole": whole}


def shape_cautions(case: Case) -> list[str]:
    """What a reader of a run with shapes must know."""
    craft: Craft = craft_of(case)
    field = shape_field(craft)
    bare = patches(craft)[-1].area_m2
    radius = float(field.capacitance_F.sum()) / (4.0 * np.pi * epsilon_0)
    notes = [
        f"shapes: capacitance that of a sphere of {radius:.3g} m, error of the mesh about "
        f"{100.0 * field.asymmetry:.2g} % between surfaces; wings turned change it by "
        f"{100.0 * field.capacitance_spread:.2g} %, and the mean is used"
    ]
    if bare > 0.0:
        notes.append(
            f"faces of shapes without a surface ({bare:.3g} m2) are at structure's potential and "
            "collect nothing"
        )
    return notes
