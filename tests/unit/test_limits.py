"""Limits as data: defaults, replacement, margins, decibels, verdicts."""

from __future__ import annotations

from dataclasses import replace
from math import log10

import pytest

from charging.case import LoadedCase, load_case_text
from charging.orbit_run import ModeRun, solve_mode
from charging.review.limits import (
    DEFAULTS,
    KIND_MEANING,
    RUN_KINDS,
    UNITS,
    Requirement,
    requirements,
    standing,
)
from charging.summary import mode_summary, worst

CASE = """\
title = "Limits"
[orbit]
kind = "fixed"
illumination = 0.0
sun_direction = [0.0, 0.0, 1.0]
duration_h = 0.5
[plasma]
use = "substorm, 3 keV class"
[body]
radius_m = 1.0
[[surface]]
name = "body"
material = "oxidised aluminium"
area_m2 = 6.0
normal = [0.0, 0.0, 1.0]
[[surface]]
name = "film"
material = "polyimide film"
area_m2 = 0.5
thickness_m = 25e-6
normal = [0.0, 0.0, 1.0]
temperature_K = 290.0
[[surface]]
name = "glass"
material = "fused silica"
area_m2 = 0.5
thickness_m = 100e-6
normal = [0.0, 0.0, -1.0]
temperature_K = 290.0
"""
ACCEPTED = CASE.replace(
    'use = "substorm, 3 keV class"', 'use = "substorm, 3 keV class"\naccept_assumed = "a test"'
)


def with_limits(*tables: str, text: str = ACCEPTED) -> LoadedCase:
    return load_case_text(text + "".join(f"[[limit]]\n{table}\n" for table in tables))


def found(loaded: LoadedCase) -> set[tuple[str, float, tuple[str, ...] | None]]:
    """Limits against structure and in dielectrics; those of pairs follow the same rules."""
    return {(r.kind, r.limit, r.surfaces) for r in requirements(loaded.case, RUN_KINDS)}


def test_defaults_are_the_published_ones() -> None:
    """ECSS-E-ST-20-06C (31 July 2008), 6.2.1 a: 1 kV below, 100 V above, 1e7 V/m."""
    assert found(with_limits()) == {
        ("normal", 1000.0, None),
        ("inverted", 100.0, None),
        ("field", 1e7, None),
    }
    for requirement in DEFAULTS:
        assert requirement.document == "ECSS-E-ST-20-06C"
        assert requirement.clause.startswith("6.2.1 a")
        assert requirement.clause in requirement.requirement_id
        assert requirement.basis == "standard"
    assert len({r.requirement_id for r in DEFAULTS}) == 3


def test_a_limit_without_surfaces_replaces_the_default_of_its_kind() -> None:
    assert found(with_limits('kind = "normal"\nallowed_V = 400.0')) == {
        ("normal", 400.0, None),
        ("inverted", 100.0, None),
        ("field", 1e7, None),
    }


def test_a_limit_for_named_surfaces_replaces_the_default_for_these_only() -> None:
    loaded = with_limits('kind = "field"\nallowed_V_m = 2e6\nsurfaces = ["film"]')
    assert found(loaded) == {
        ("normal", 1000.0, None),
        ("inverted", 100.0, None),
        ("field", 1e7, ("body", "glass")),
        ("field", 2e6, ("film",)),
    }


def test_several_limits_of_a_kind_add_up() -> None:
    loaded = with_limits(
        'kind = "inverted"\nallowed_V = 50.0\nsurfaces = ["film", "glass"]',
        'kind = "inverted"\nallowed_V = 300.0\nsurfaces = ["body"]',
        'kind = "normal"\nallowed_V = 500.0',
        'kind = "normal"\nallowed_V = 800.0',
    )
    assert found(loaded) == {
        ("inverted", 50.0, ("film", "glass")),
        ("inverted", 300.0, ("body",)),
        ("normal", 500.0, None),
        ("normal", 800.0, None),
        ("field", 1e7, None),
    }


def test_margin_policy_divides_the_limit() -> None:
    loaded = with_limits(
        'kind = "normal"\nallowed_V = 1000.0\nrequirement_id = "SYS-12"\n'
        'source_document = "System specification"\nclause = "4.2"\n'
        'margin_policy = {factor = 2.5, basis = "project rule"}'
    )
    own = next(r for r in requirements(loaded.case) if r.kind == "normal")
    assert (own.allowed, own.margin_factor, own.limit) == (1000.0, 2.5, 400.0)
    assert (own.requirement_id, own.document, own.clause) == ("SYS-12", "System specification",
                                                              "4.2")  # fmt: skip
    assert own.margin_basis == "project rule"
    assert own.basis == "case"


NORMAL, FIELD, INVERTED = DEFAULTS[:3]


@pytest.mark.parametrize(
    ("requirement", "value", "margin", "ratio"),
    [
        (NORMAL, -200.0, 800.0, 5.0),
        (NORMAL, -2000.0, -1000.0, 0.5),
        (NORMAL, 0.0, 1000.0, None),
        (NORMAL, 50.0, 1000.0, None),
        (INVERTED, 40.0, 60.0, 2.5),
        (INVERTED, -3000.0, 100.0, None),
        (INVERTED, 1000.0, -900.0, 0.1),
        (FIELD, -2e7, -1e7, 0.5),
        (FIELD, 2e6, 8e6, 5.0),
    ],
)
def test_margin_and_decibels(
    requirement: Requirement, value: float, margin: float, ratio: float | None
) -> None:
    stand = standing(requirement, value)
    assert stand.value == value
    assert stand.margin == pytest.approx(margin)
    if ratio is None:
        assert stand.margin_dB is None
    else:
        assert stand.margin_dB == pytest.approx(20.0 * log10(ratio))
    assert stand.exceeded is (margin < 0.0)


def test_a_value_on_the_limit_is_not_beyond_it() -> None:
    stand = standing(NORMAL, -1000.0)
    assert (stand.margin, stand.margin_dB, stand.exceeded) == (0.0, 0.0, False)
    assert standing(replace(NORMAL, margin_factor=1.25), -900.0).exceeded


def test_overall_verdict_takes_the_worst() -> None:
    assert worst([]) == "within"
    assert worst(["within", "within"]) == "within"
    assert worst(["within", "not assessable"]) == "not assessable"
    assert worst(["not assessable", "exceeded", "within"]) == "exceeded"


@pytest.fixture(scope="module")
def solved() -> ModeRun:
    return solve_mode(load_case_text(CASE))


def verdicts(loaded: LoadedCase, mode: ModeRun) -> dict[tuple[str, str], str]:
    return {
        (j.surface, j.standing.requirement.kind): j.verdict
        for j in mode_summary(loaded, mode).judgements
    }


def test_assumed_plasma_is_not_assessable_until_accepted(solved: ModeRun) -> None:
    wide = [
        f'kind = "{kind}"\nallowed_{"V_m" if kind == "field" else "V"} = 1e9'
        for kind in ("normal", "inverted", "field")
    ]
    refused = verdicts(with_limits(*wide, text=CASE), solved)
    accepted = verdicts(with_limits(*wide, text=ACCEPTED), solved)
    assert set(refused.values()) == {"not assessable"}
    assert set(accepted.values()) == {"within"}
    assert mode_summary(with_limits(*wide, text=CASE), solved).verdict == "not assessable"


def test_exceeded_beats_not_assessable(solved: ModeRun) -> None:
    loaded = with_limits('kind = "field"\nallowed_V_m = 1.0', text=CASE)
    found_there = verdicts(loaded, solved)
    assert found_there["film", "field"] == "exceeded"
    assert "not assessable" in found_there.values()
    assert mode_summary(loaded, solved).verdict == "exceeded"


def test_published_plasma_needs_no_acceptance() -> None:
    text = CASE.replace("substorm, 3 keV class", "NASA geostationary 90 percent")
    loaded = with_limits('kind = "normal"\nallowed_V = 1e6', text=text)
    assert "not assessable" not in verdicts(loaded, solve_mode(loaded)).values()


def test_field_is_asked_of_dielectrics_only(solved: ModeRun) -> None:
    kinds: dict[str, set[str]] = {}
    for surface, kind in verdicts(with_limits(), solved):
        kinds.setdefault(surface, set()).add(kind)
    assert kinds == {
        "body": {"normal", "inverted"},
        "film": {"normal", "inverted", "field"},
        "glass": {"normal", "inverted", "field"},
    }


def test_judged_value_is_the_worst_of_both_laws(solved: ModeRun) -> None:
    summary = mode_summary(with_limits(), solved)
    for i, peaks in enumerate(summary.surfaces):
        for pick, peak in ((min, peaks.normal), (max, peaks.inverted)):
            by_law = {}
            for law, path in zip(solved.laws, solved.trajectories, strict=True):
                v = solved.net.potentials(path.y_end)
                by_law[law] = pick(0.0, pick(v[:, solved.net.surface_node[i]] - v[:, 0]))
            # peaks also look inside the steps: never less than at their ends
            assert abs(peak.value) >= abs(pick(by_law.values())) - 1e-9
            if abs(by_law[solved.laws[0]] - by_law[solved.laws[1]]) > 50.0:
                assert peak.law == pick(by_law, key=lambda law: by_law[law])


def test_pairs_have_the_figures_of_the_same_clause() -> None:
    """6.2.1 a speaks of adjacent conductors: structure, or a neighbour that floats."""
    by_kind = {r.kind: r for r in DEFAULTS}
    for kind in ("normal", "inverted"):
        pair = by_kind[f"neighbour {kind}"]  # type: ignore[index]
        own = by_kind[kind]  # type: ignore[index]
        assert (pair.limit, pair.clause) == (own.limit, own.clause)


def test_kinds_have_units_and_words() -> None:
    assert set(KIND_MEANING) == set(UNITS)
    assert {r.kind for r in DEFAULTS} < set(KIND_MEANING)
    assert {UNITS[kind] for kind in RUN_KINDS} == {"V", "V m-1"}
