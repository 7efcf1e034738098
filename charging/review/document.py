"""A review as one document of plain values: review.json, and what the report is made of."""

from __future__ import annotations

from typing import Any

import numpy as np

from charging import __version__
from charging.cautions import cautions
from charging.review.assess import Row
from charging.review.check import Review
from charging.review.claims import (
    ASSUMPTIONS,
    CAUTIONS,
    CLAIM_LIMITS,
    NOT_MODELLED,
    probability,
)
from charging.review.criteria import energy_class
from charging.review.document_runs import (
    barriers_of,
    governing_jumps,
    region_rows,
    shape_numbers,
    timeline_rows,
)
from charging.review.extremes import Quantity
from charging.review.fixes import Fixes, named
from charging.review.limits import UNITS, Requirement, size_of
from charging.review.narrative import moment, plasma_name, sentence, sentences
from charging.review.nominal import Cell
from charging.review.provenance import (
    hashes,
    plasma_rows,
    property_rows,
    references,
    run_hash,
    versions,
)
from charging.review.sentences import when

MOST_SENSITIVITIES = 12
METHOD = "analysis"


def review_document(review: Review) -> dict[str, Any]:
    """Everything a review says, in plain values; times UTC, null for what is not known."""
    loaded = review.loaded
    settings = settings_of(review)
    return {
        "title": loaded.case.title,
        "halflit_version": __version__,
        "verdict": review.verdict,
        "qualifications": list(review.qualifications),
        "run_hash": run_hash(loaded, settings),
        "limits": [limit_row(review, row) for row in review.rows],
        "sentences": sentences(review),
        "scenes": [_scene(review, cell) for cell in review.cells],
        "matrix": [_matrix_row(review, row) for row in review.rows if not row.corner.trivial],
        "worst_pairs": worst_pairs(review),
        "stored_energy": stored_energy(review),
        "structure": _structure(review),
        "timeline": timeline_rows(loaded.case.epoch, review.cells),
        "regions": region_rows(loaded.case.epoch, loaded.case.duration_s, review.cells),
        "jumps": governing_jumps(review),
        "barriers": barriers_of(review),
        "geometry": shape_numbers(review),
        "sensitivities": [_sensitivity_row(row) for row in _distinct(review)],
        "laws_and_collections": [_spread_row(review, row) for row in _distinct(review)],
        "fixes": None if review.fixes is None else fixes_document(review.fixes),
        "properties": property_rows(loaded),
        "plasmas": plasma_rows(review.cells),
        "requirements": [_requirement(r) for r in review.limits],
        "assumptions": [{"assumed": a, "fails": f} for a, f in ASSUMPTIONS],
        "not_modelled": list(NOT_MODELLED),
        "claim_limits": list(CLAIM_LIMITS),
        "cautions": [
            *CAUTIONS,
            *dict.fromkeys(c for cell in review.cells for c in cautions(loaded, cell.run)),
        ],
        "references": references(loaded, review.cells, review.limits),
        "versions": versions(),
        "hashes": hashes(loaded),
        "settings": settings,
        "members": review.members,
    }


def settings_of(review: Review) -> dict[str, Any]:
    """Settings that determine the numbers, beside the case."""
    return {
        "draws": review.ensemble.draws,
        "seed": review.ensemble.seed,
        "fixes": review.fixes is not None,
        "corners": review.searched,
        "ages": list(review.loaded.case.review.ages),
    }


def limit_row(review: Review, row: Row) -> dict[str, Any]:
    """One row of the verdict."""
    cell = review.cells[row.cell]
    requirement, corner = row.requirement, row.corner
    exceeding = int(
        sum(size_of(row.quantity.kind, v) > requirement.limit for v in corner.draws.values)
    )
    moved = bool(row.standing.value)
    return {
        "surface": row.quantity.surface or "structure",
        "against": row.quantity.against,
        "kind": row.quantity.kind,
        "requirement_id": requirement.requirement_id,
        "mode": cell.scene.mode,
        "plasma": plasma_name(review, row) if moved else cell.scene.plasma,
        "plasma_choice": cell.scene.plasma,
        "age": row.variant.age,
        "value": row.standing.value,
        "allowed": requirement.limit,
        "unit": UNITS[row.quantity.kind],
        "margin": row.standing.margin,
        "margin_dB": row.standing.margin_dB,
        "time": moment(review, row.time_s) if moved else None,
        "clause": requirement.clause or None,
        "clause_verified": requirement.verified,
        "margin_policy": {"factor": requirement.margin_factor, "basis": requirement.margin_basis},
        "method": METHOD,
        "law": row.variant.law,
        "collection": row.variant.collection,
        "nominal_value": row.nominal.value,
        "corner_value": corner.value if corner.searched else None,
        "governs": "corner" if row.at_corner else "nominal",
        "corner_extended": corner.extended,
        "corner_first_value": corner.first,
        "draws": corner.draws.count,
        "draws_failed": corner.draws.failed,
        "draws_largest": corner.draws.largest,
        "exceedance_probability": None
        if corner.trivial
        else probability(exceeding, len(corner.draws.values)),
        "bonded": corner.trivial,
        "verdict": row.verdict,
        "reason": row.reason,
        "sentence": sentence(review, row),
    }


def _scene(review: Review, cell: Cell) -> dict[str, Any]:
    return {
        "mode": cell.scene.mode,
        "plasma": cell.scene.plasma,
        "plasmas": list(dict.fromkeys(p.name for p in cell.run.whole_plasmas)),
        "sheath": {
            "least_over_radius": cell.sheath.least,
            "most_over_radius": cell.sheath.most,
            "collections": list(cell.sheath.collections),
            "text": cell.sheath.text,
        },
        "structure_lowest_V": float(
            min(v[:, 0].min() for v in (t.y_end for t in cell.run.trajectories))
        ),
        "structure_highest_V": float(
            max(v[:, 0].max() for v in (t.y_end for t in cell.run.trajectories))
        ),
    }


def _matrix_row(review: Review, row: Row) -> dict[str, Any]:
    """Nominal and corner of one row in every scene at every age."""
    q = review.shown.index(row.quantity)
    kind, cells = row.quantity.kind, []
    for c, cell in enumerate(review.cells):
        for a, age in enumerate(review.loaded.case.review.ages):
            own = [
                float(cell.worst.value[v, q])
                for v, variant in enumerate(cell.variants)
                if variant.age == age
            ]
            nominal = max(own, key=lambda value: size_of(kind, value))
            corner = float(row.corner.by_cell[c, a])
            governing = max(nominal, corner, key=lambda value: size_of(kind, value))
            cells.append(
                {
                    "mode": cell.scene.mode,
                    "plasma": cell.scene.plasma,
                    "age": age,
                    "nominal": nominal,
                    "corner": corner if row.corner.searched else None,
                    "exceeded": size_of(kind, governing) > row.requirement.limit,
                }
            )
    return {
        "surface": row.quantity.surface or "structure",
        "against": row.quantity.against,
        "kind": kind,
        "requirement_id": row.requirement.requirement_id,
        "unit": UNITS[kind],
        "allowed": row.requirement.limit,
        "cells": cells,
    }


def worst_pairs(review: Review) -> list[dict[str, Any]]:
    """Largest nominal differences against structure and between neighbours, with time and place."""
    found = []
    for q, quantity in enumerate(review.shown):
        if quantity.kind not in ("normal", "inverted", "neighbour"):
            continue
        value, time_s, cell, variant = _nominal(review, q)
        if size_of(quantity.kind, value) > 0.0:
            found.append(
                {
                    "surface": quantity.surface,
                    "against": quantity.against,
                    "value_V": value,
                    "time": moment(review, time_s),
                    "mode": cell.scene.mode,
                    "plasma": cell.run.plasma_at(time_s),
                    "age": variant.age,
                    "law": variant.law,
                    "collection": variant.collection,
                    "when": when(review.loaded, cell.run, time_s),
                }
            )
    return sorted(found, key=lambda row: -abs(row["value_V"]))


def stored_energy(review: Review) -> list[dict[str, Any]]:
    """Largest nominal stored energy of every surface with a node; information."""
    found = []
    for q, quantity in enumerate(review.shown):
        if quantity.kind == "energy":
            value, time_s, cell, variant = _nominal(review, q)
            found.append(
                {
                    "surface": quantity.surface,
                    "energy_J": value,
                    "class": energy_class(value),
                    "time": moment(review, time_s) if value else None,
                    "mode": cell.scene.mode,
                    "age": variant.age,
                }
            )
    return sorted(found, key=lambda row: -row["energy_J"])


def _nominal(review: Review, q: int) -> tuple[float, float, Cell, Any]:
    kind = review.shown[q].kind
    best = max(
        (
            (size_of(kind, float(cell.worst.value[v, q])), -c, -v)
            for c, cell in enumerate(review.cells)
            for v in range(len(cell.variants))
        ),
    )
    cell = review.cells[-best[1]]
    v = -best[2]
    return float(cell.worst.value[v, q]), float(cell.worst.time_s[v, q]), cell, cell.variants[v]


def _structure(review: Review) -> list[dict[str, Any]]:
    """Structure potential in every scene, and its fastest change after an umbra."""
    found = []
    for cell in review.cells:
        fastest = 0.0
        for e in cell.run.around.eclipses:
            if e.umbra_end is None:
                continue
            for path in cell.run.trajectories:
                near = np.abs(path.start_s - e.umbra_end) < 300.0
                change = path.y_end[near, 0] - path.y_start[near, 0]
                if change.size:
                    fastest = max(fastest, float(np.abs(change / path.step_s[near]).max()))
        scene = _scene(review, cell)
        found.append(
            {
                "mode": cell.scene.mode,
                "plasma": cell.scene.plasma,
                "lowest_V": scene["structure_lowest_V"],
                "highest_V": scene["structure_highest_V"],
                "fastest_change_at_eclipse_exit_V_s": fastest or None,
            }
        )
    return found


def _distinct(review: Review) -> list[Row]:
    """Rows with a live quantity, each quantity once, the worst first."""
    rows: dict[Quantity, Row] = {}
    for row in review.rows:
        if not row.corner.trivial:
            rows.setdefault(row.quantity, row)
    return list(rows.values())


def _sensitivity_row(row: Row) -> dict[str, Any]:
    return {
        "surface": row.quantity.surface or "structure",
        "against": row.quantity.against,
        "kind": row.quantity.kind,
        "unit": UNITS[row.quantity.kind],
        # at the same law, collection and place as the reruns, which may be a little less
        "nominal": next((s.nominal for s in row.corner.sensitivities), row.nominal.value),
        "properties": [
            {
                "material": s.of.material,
                "property": s.of.key,
                "low": s.of.at(0.0),
                "high": s.of.at(1.0),
                "at_low": s.low,
                "at_high": s.high,
                "monotone": s.monotone,
                "basis": s.of.basis,
            }
            for s in row.corner.sensitivities[:MOST_SENSITIVITIES]
            if s.reach > 0.0
        ],
    }


def _spread_row(review: Review, row: Row) -> dict[str, Any]:
    """Worst nominal value by law and by collection."""
    q, kind = review.shown.index(row.quantity), row.quantity.kind
    by_law: dict[str, float] = {}
    by_collection: dict[str, float] = {}
    for cell in review.cells:
        for v, variant in enumerate(cell.variants):
            value = float(cell.worst.value[v, q])
            for table, key in ((by_law, str(variant.law)), (by_collection, variant.collection)):
                if key not in table or size_of(kind, value) > size_of(kind, table[key]):
                    table[key] = value
    return {
        "surface": row.quantity.surface or "structure",
        "against": row.quantity.against,
        "kind": kind,
        "unit": UNITS[kind],
        "by_law": by_law,
        "by_collection": by_collection,
    }


def _requirement(r: Requirement) -> dict[str, Any]:
    return {
        "kind": r.kind,
        "limit": r.limit,
        "unit": UNITS[r.kind],
        "surfaces": None if r.surfaces is None else list(r.surfaces),
        "requirement_id": r.requirement_id,
        "document": r.document,
        "issue": r.issue or None,
        "clause": r.clause or None,
        "clause_verified": r.verified,
        "basis": r.basis,
        "margin_factor": r.margin_factor,
        "margin_basis": r.margin_basis,
        "note": r.note or None,
    }


def fixes_document(fixes: Fixes) -> dict[str, Any]:
    """Fixes as JSON; null for a severity without solution."""
    return {
        "answer": fixes.text,
        "verified": fixes.verified,
        "verdict_with_them": fixes.verdict,
        "changes": [change.document() for change in fixes.chosen],
        "remaining": []
        if fixes.rows is None
        else [
            named(row.quantity, row.requirement.requirement_id)
            for row in fixes.rows
            if row.verdict == "exceeded"
        ],
        "single": [
            {
                "surface": fix.surface,
                "family": fix.family,
                "changes": [change.document() for change in fix.design],
                "status": fix.status,
                "severity_before": fix.before,
                "severity_after": fix.worst if np.isfinite(fix.worst) else None,
                "worsens": list(fix.worsened),
                "candidates_tried": fix.tried,
                "text": fix.text,
            }
            for fix in fixes.single
        ],
    }
