"""Verdicts of a review: rules, reasons, claims that are never made."""

from __future__ import annotations

import re
from dataclasses import replace
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest

from charging.case import LoadedCase, load_case_text
from charging.errors import InputError
from charging.review.assess import (
    LEAST_DRAWS,
    Doubts,
    Row,
    assessed,
    qualifications,
    reasons_against,
)
from charging.review.check import overall
from charging.review.claims import CLAIM_LIMITS, NOT_MODELLED, probability
from charging.review.criteria import CRITERIA, energy_class
from charging.review.designs import Change, designed
from charging.review.extremes import Quantity, judged, neighbours
from charging.review.fixes import Fixes
from charging.review.limits import Requirement, requirements, standing
from charging.review.nominal import Place
from charging.review.scenes import scenes
from charging.review.sensitivity import Corner, Draws, Sensitivity
from charging.review.space import (
    HIGH,
    LOW,
    PHOTOYIELD,
    Variant,
    Workshop,
    draw,
    properties,
    quantile,
    varied,
)
from materials.library import library_text
from materials.record import Spread

CASE = """\
title = "A film, a glass and a tag"
[orbit]
kind = "fixed"
illumination = 0.0
sun_direction = [0.0, 0.0, 1.0]
duration_h = 0.1
[plasma]
use = "NASA geostationary 90 percent"
[body]
radius_m = 1.0
[[surface]]
name = "body"
material = "oxidised aluminium"
area_m2 = 6.0
normal = [0.0, 0.0, 1.0]
neighbours = ["film"]
[[surface]]
name = "film"
material = "film.toml"
area_m2 = 0.5
thickness_m = 25e-6
normal = [0.0, 0.0, 1.0]
temperature_K = 290.0
neighbours = ["tag", "glass"]
[[surface]]
name = "glass"
material = "fused silica"
area_m2 = 0.5
thickness_m = 100e-6
normal = [0.0, 0.0, -1.0]
temperature_K = 290.0
[[surface]]
name = "tag"
material = "gold"
area_m2 = 0.04
normal = [0.0, 0.0, 1.0]
floating = true
capacitance_F = 5e-10
"""
FILM = library_text("polyimide film")


def load(text: str = CASE, film: str = FILM) -> LoadedCase:
    return load_case_text(text, material_texts={"film.toml": film})


def without_source(key: str) -> str:
    """The film's record with one source deleted."""
    head, body = FILM.split(f"[{key}]", 1)
    table, *rest = body.split("\n[", 1)
    kept = "\n".join(line for line in table.splitlines() if not line.startswith("source"))
    return f"{head}[{key}]{kept}\n" + "".join(f"[{part}" for part in rest)


BEGIN = Variant("begin", "sanders_inouye_1979", "auto")
CELL: Any = SimpleNamespace(
    variants=(BEGIN,),
    run=SimpleNamespace(
        assumed=(), around=SimpleNamespace(along=None), way=SimpleNamespace(trajectory=None)
    ),
)


def corner(quantity: Quantity, value: float, **changed: Any) -> Corner:
    found = Corner(
        quantity=quantity, trivial=False, settings=(), value=value, time_s=1.0, scene=0,
        variant=BEGIN, by_cell=np.array([[value]]), sensitivities=(),
        draws=Draws(500, 0, 0.9 * value, np.full(500, 0.9 * value)), extended=False, first=value,
    )  # fmt: skip
    return replace(found, **changed)


def judge(
    loaded: LoadedCase, nominal: float, at_corner: float, kind: str = "normal", **changed: Any
) -> Row:
    requirement = next(r for r in requirements(loaded.case) if r.kind == kind)
    quantity = Quantity(requirement.kind, "film", "structure")
    place = Place(0, 0, nominal, 1.0)
    (row,) = assessed(
        loaded, [CELL], [(requirement, quantity, place, corner(quantity, at_corner, **changed))]
    )
    return row


def test_within_needs_nominal_and_corner_below() -> None:
    row = judge(load(), -200.0, -900.0)
    assert (row.verdict, row.standing.value) == ("within", -900.0)
    assert row.standing.margin == pytest.approx(100.0)


@pytest.mark.parametrize(("nominal", "at_corner"), [(-1500.0, -1500.0), (-200.0, -1001.0)])
def test_nominal_or_corner_exceeds(nominal: float, at_corner: float) -> None:
    row = judge(load(), nominal, at_corner)
    assert row.verdict == "exceeded"
    assert ("corner" in row.reason) == (nominal > -1000.0)


def test_a_statistical_pass_overrides_a_corner_only_when_the_case_says_so() -> None:
    passing = Draws(500, 0, -800.0, np.full(500, -800.0))
    assert judge(load(), -200.0, -1200.0, draws=passing).verdict == "exceeded"
    accepted = CASE + '[review]\nstatistical = "agreed with the programme"\n'
    row = judge(load(accepted), -200.0, -1200.0, draws=passing)
    assert row.verdict == "within"
    assert "conditional on assumed spreads" in row.reason
    assert "agreed with the programme" in row.reason
    # not where one draw is beyond, some failed, or the records themselves are beyond
    worse = replace(passing, largest=-1001.0)
    assert judge(load(accepted), -200.0, -1200.0, draws=worse).verdict == "exceeded"
    failing = replace(passing, failed=1)
    assert judge(load(accepted), -200.0, -1200.0, draws=failing).verdict == "exceeded"
    assert judge(load(accepted), -1100.0, -1200.0, draws=passing).verdict == "exceeded"


@pytest.mark.parametrize(
    "key",
    ["bulk_resistivity_ohm_m", "secondary_yield_peak", "relative_permittivity", "photoyield"],
)
def test_a_driving_property_without_source_is_not_assessable(key: str) -> None:
    loaded = load(film=without_source(key))
    row = judge(loaded, -200.0, -900.0)
    assert row.verdict == "not assessable"
    assert key in row.reason
    # an exceeded limit stays exceeded
    assert judge(loaded, -200.0, -1100.0).verdict == "exceeded"


def test_a_property_that_enters_nothing_needs_no_source() -> None:
    loaded = load(film=without_source("density_kg_m3"))
    assert judge(loaded, -200.0, -900.0).verdict == "within"


def test_a_property_of_another_surface_counts_when_it_moves_the_limit() -> None:
    loaded = load(film=without_source("bulk_resistivity_ohm_m"))
    unknown = next(p for p in properties(loaded, "begin") if not p.source)
    requirement = next(r for r in requirements(loaded.case) if r.kind == "normal")
    quantity = Quantity("normal", "glass", "structure")
    for reach, expected in ((40.0, []), (60.0, ["no source"])):
        effect = Sensitivity(unknown, -100.0, -100.0 - reach, -100.0, True)
        found = corner(quantity, -200.0, sensitivities=(effect,))
        reasons = reasons_against(loaded, requirement, quantity, found, Doubts([unknown]))
        assert [r[:9] for r in reasons] == expected


def test_memory_never_blocks() -> None:
    row = judge(load(), -200.0, -900.0)
    assert {p.basis for p in properties(load(), "begin")} >= {"memory"}
    assert row.verdict == "within"


def test_an_assumed_plasma_blocks_until_accepted() -> None:
    cell: Any = SimpleNamespace(
        variants=(BEGIN,),
        run=SimpleNamespace(
            assumed=("textbook",),
            around=SimpleNamespace(along=None),
            way=SimpleNamespace(trajectory=None),
        ),
    )
    requirement = requirements(load().case)[0]
    quantity = Quantity("normal", "film", "structure")
    rows = [(requirement, quantity, Place(0, 0, -1.0, 1.0), corner(quantity, -2.0))]
    assert assessed(load(), [cell], rows)[0].verdict == "not assessable"
    accepted = load(CASE.replace("[body]", 'accept_assumed = "a demonstration"\n[body]'))
    assert assessed(accepted, [cell], rows)[0].verdict == "within"


def test_an_unverified_clause_is_never_within() -> None:
    text = CASE + '[[limit]]\nkind = "normal"\nallowed_V = 500.0\nclause_verified = false\n'
    row = judge(load(text), -1.0, -2.0)
    assert row.verdict == "not assessable"
    assert "was not read" in row.reason
    recalled = judge(load(CASE + '[review]\ncriteria = "NASA"\n'), -1.0, -2.0)
    assert recalled.verdict == "not assessable"
    assert judge(load(CASE + '[review]\ncriteria = "NASA"\n'), -1.0, -600.0).verdict == "exceeded"


def test_only_the_set_whose_text_was_seen_is_verified() -> None:
    assert {name: all(c.verified for c in found) for name, found in CRITERIA.items()} == {
        "ECSS": True,
        "NASA": False,
        "JAXA": False,
    }


def test_a_wake_fed_by_nothing_known_is_not_assessable() -> None:
    requirement = requirements(load().case)[0]
    quantity = Quantity("normal", "film", "structure")
    found = reasons_against(
        load(), requirement, quantity, corner(quantity, -1.0), Doubts(wakes=frozenset({"film"}))
    )
    assert found == ["wake ion current not assessable on film"]


def test_too_few_or_failing_draws_are_not_assessable() -> None:
    few = Draws(LEAST_DRAWS - 1, 0, -1.0, np.zeros(0))
    assert judge(load(), -1.0, -2.0, draws=few).verdict == "not assessable"
    failing = Draws(450, 50, -1.0, np.zeros(0))
    assert "no solution" in judge(load(), -1.0, -2.0, draws=failing).reason


def test_never_within_while_a_limit_is_not_assessable() -> None:
    """First claim of the list: the overall verdict."""
    good = judge(load(), -1.0, -2.0)
    unknown = judge(load(film=without_source("bulk_resistivity_ohm_m")), -1.0, -2.0)
    assert overall([good]) == "within"
    assert overall([good, unknown]) == "not assessable"
    assert overall([]) == "not assessable"


def test_a_fix_is_verified_only_by_a_whole_review() -> None:
    change = (Change("film", "material", "ITO coating", bonds=True),)
    alone = Fixes((), change, False, "exceeded", (), 10)
    nothing = Fixes((), (), False, None, None, 0)
    assert "erified" not in alone.text.replace("No fix found", "")
    assert "erified" not in nothing.text
    whole = Fixes((), change, True, "within", (), 10)
    single: Any = (SimpleNamespace(surface="film", status="solves"),)
    assert "every mode and plasma rerun" in replace(whole, single=single).text


def test_no_probability_is_zero() -> None:
    for draws in (1, 500, 10_000):
        text = probability(0, draws)
        assert not re.match(r"0(\.0*)?\b(?!\.)", text)
        assert float(text.split()[2]) == pytest.approx(min(1.0, 3.0 / draws), rel=0.01)
        assert "conditional on assumed spreads" in text
    assert "conditional on assumed spreads" in probability(3, 500)


def test_arrays_above_70_v_get_no_unqualified_pass() -> None:
    assert qualifications(load(CASE + "[review]\narray_voltage_V = 70.0\n")) == ()
    (text,) = qualifications(load(CASE + "[review]\narray_voltage_V = 71.0\n"))
    assert text.startswith("specialist review")


def test_nothing_is_said_for_crew_outside() -> None:
    text = CASE + '[[limit]]\nkind = "structure"\nallowed_V = 40.0\n[review]\ncrew_outside = true\n'
    loaded = load(text)
    requirement = next(r for r in requirements(loaded.case) if r.kind == "structure")
    quantity = Quantity("structure", "", "plasma")
    place = Place(0, 0, -1.0, 1.0)
    (row,) = assessed(loaded, [CELL], [(requirement, quantity, place, corner(quantity, -2.0))])
    assert row.verdict == "not assessable"
    assert "crew" in row.reason
    assert any("crew" in one for one in qualifications(loaded))


def test_stored_energy_never_says_no_discharge() -> None:
    assert [energy_class(v) for v in (1e-4, 5e-3, 0.1, 2.0)] == [
        "negligible", "note", "act", "severe",
    ]  # fmt: skip
    assert any("does not say that there is no discharge" in text for text in CLAIM_LIMITS)
    # 37.6 mJ of 1 m2 of 25 um film at 250 V, permittivity 3.4: arithmetic of 1/2 C V2
    assert pytest.approx(37.6e-3, rel=2e-3) == 0.5 * 8.8541878e-12 * 3.4 / 25e-6 * 250.0**2


def test_what_is_not_modelled_is_listed() -> None:
    for word in ("internal charging", "discharge transients", "plumes", "electron exchange",
                 "conduction along surfaces"):  # fmt: skip
        assert any(word in text for text in NOT_MODELLED)


def test_energy_limit_in_joules_and_decibels_of_power() -> None:
    loaded = load(CASE + '[[limit]]\nkind = "energy"\nallowed_J = 0.01\nsurfaces = ["film"]\n')
    limit = next(r for r in requirements(loaded.case) if r.kind == "energy")
    assert standing(limit, 0.001).margin_dB == pytest.approx(10.0)
    assert [q.surface for r, q in judged(loaded.case, [limit])] == ["film"]


@pytest.mark.parametrize(
    ("table", "key"),
    [
        ('kind = "energy"\nallowed_V = 1.0', "allowed_V"),
        ('kind = "energy"', "allowed_J"),
        ('kind = "structure"\nallowed_V = 40.0\nsurfaces = ["film"]', "surfaces"),
        ('kind = "field"\nallowed_J = 1.0', "allowed_J"),
    ],
)
def test_limits_that_contradict_themselves_are_refused(table: str, key: str) -> None:
    with pytest.raises(InputError, match=key):
        load(f"{CASE}[[limit]]\n{table}\n")


@pytest.mark.parametrize("entry", ["draws = 499", "seed = -1", 'criteria = "own"', "ages = []"])
def test_review_keys_are_checked(entry: str) -> None:
    with pytest.raises(InputError, match=entry.split(" ")[0]):
        load(f"{CASE}[review]\n{entry}\n")


def test_neighbours_hold_both_ways_and_bonded_ones_stand_for_structure() -> None:
    case = load().case
    assert neighbours(case) == (("body", "film"), ("film", "tag"), ("film", "glass"))
    pairs = {
        (q.kind, q.surface, q.against)
        for _, q in judged(case, requirements(case))
        if q.kind.startswith("neighbour")
    }
    # a dielectric against the conductor that floats; not against the bonded body or the glass
    assert pairs == {("neighbour normal", "film", "tag"), ("neighbour inverted", "film", "tag")}
    text = CASE + '[[limit]]\nkind = "neighbour"\nallowed_V = 400.0\n'
    both = [q for r, q in judged(load(text).case, requirements(load(text).case))
            if r.kind == "neighbour"]  # fmt: skip
    assert [(q.surface, q.against) for q in both] == [("film", "tag"), ("film", "glass")]


def test_scenes_are_modes_times_plasmas() -> None:
    text = CASE + (
        '[[mode]]\nname = "lit"\nalternative = true\nillumination = 1.0\n'
        '[review]\nplasmas = ["quiet geostationary"]\n'
    )
    found = [(s.mode, s.plasma) for s in scenes(load(text))]
    assert found == [
        ("base", "as in the case"),
        ("base", "quiet geostationary"),
        ("lit", "as in the case"),
        ("lit", "quiet geostationary"),
    ]
    lit = scenes(load(text))[3].table
    assert lit is not None
    assert (lit.illumination, lit.plasma, lit.events) == (1.0, "quiet geostationary", False)


@pytest.mark.parametrize(
    ("spread", "nominal"),
    [
        (Spread("uniform", 1.0, 3.0), 2.0),
        (Spread("log_uniform", 1.0, 100.0), 10.0),
        (Spread("triangular", 1.0, 4.0), 2.0),
        (Spread("triangular", 1.0, 4.0), 1.0),
    ],
)
def test_quantiles_rise_from_end_to_end(spread: Spread, nominal: float) -> None:
    places = np.linspace(0.0, 1.0, 101)
    values = np.array([quantile(spread, nominal, p) for p in places])
    assert (values[0], values[-1]) == (spread.low, spread.high)
    assert (np.diff(values) > 0.0).all()


def test_triangular_quantiles_are_those_of_scipy() -> None:
    from scipy.stats import triang

    spread = Spread("triangular", 1.0, 4.0)
    exact = triang(c=(2.0 - 1.0) / 3.0, loc=1.0, scale=3.0)
    for place in (0.05, 0.3, 0.5, 0.9):
        assert quantile(spread, 2.0, place) == pytest.approx(exact.ppf(place), rel=1e-12)


def test_draws_repeat_with_their_seed_and_do_not_depend_on_their_number() -> None:
    space = varied(properties(load(), "begin"))
    assert draw(space, 5, 7) == draw(space, 9, 7)[:5]
    assert draw(space, 5, 7) != draw(space, 5, 8)


def test_a_member_has_the_properties_of_its_settings() -> None:
    loaded = load()
    names = {p.name: p for p in properties(loaded, "begin")}
    resistivity = ("film.toml", "bulk_resistivity_ohm_m")
    light = ("film.toml", PHOTOYIELD)
    variant = replace(BEGIN, settings=((resistivity, HIGH), (light, LOW)))
    member = Workshop.of(loaded).member(variant)
    film = member.materials[member.case.surface[1].material]
    assert film.value("bulk_resistivity_ohm_m") == names[resistivity].spread.high
    assert film.photoyield is not None
    assert film.photoyield.level_factor == pytest.approx(names[light].spread.low)
    glass = member.materials[member.case.surface[2].material]
    assert glass == loaded.materials["fused silica"] or glass is loaded.materials["fused silica"]


def test_end_of_life_has_aged_photoyields() -> None:
    loaded = load()
    member = Workshop.of(loaded).member(replace(BEGIN, age="end"))
    curves = {member.materials[s.material].photoyield.level for s in member.case.surface}  # type: ignore[union-attr]
    assert curves == {"largest of laboratory curves"}
    assert all(s.surface_state == "as recorded" for s in member.case.surface)


def test_designs_change_what_they_say_and_nothing_else() -> None:
    loaded = load()
    thinner = designed(loaded, (Change("film", "thickness_m", 1e-5),))
    assert [s.thickness_m for s in thinner.case.surface] == [None, 1e-5, 100e-6, None]
    coated = designed(loaded, (Change("film", "material", "ITO coating", bonds=True),))
    film = coated.case.surface[1]
    assert (film.thickness_m, film.material, film.floating) == (None, "ITO coating", False)
    bled = designed(loaded, (Change("tag", "link", 1e9),))
    assert [(link.between, link.resistance_ohm) for link in bled.case.link] == [
        (("tag", "structure"), 1e9)
    ]
    bound = designed(loaded, (Change("film", "bulk_resistivity_ohm_m", 1e12),))
    record = bound.materials[bound.case.surface[1].material].values["bulk_resistivity_ohm_m"]
    # the bound holds for the whole spread
    assert (record.value, record.spread.high) == (1e12, 1e12)
    assert record.spread.low == pytest.approx(1e11)
    assert loaded.case.surface[1].thickness_m == 25e-6


def test_requirement_of_a_bonded_surface_is_still_listed() -> None:
    kinds = {
        q.kind for _, q in judged(load().case, requirements(load().case)) if q.surface == "body"
    }
    assert kinds == {"normal", "inverted"}


def test_margin_policy_reaches_the_verdict() -> None:
    text = CASE + (
        '[[limit]]\nkind = "normal"\nallowed_V = 1000.0\n'
        'margin_policy = {factor = 2.0, basis = "project rule"}\n'
    )
    requirement: Requirement = next(r for r in requirements(load(text).case) if r.kind == "normal")
    assert requirement.limit == 500.0
    assert judge(load(text), -400.0, -600.0).verdict == "exceeded"
