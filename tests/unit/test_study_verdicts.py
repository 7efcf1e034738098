"""What a sweep may say of its choices: never more than DESIGN's claims, in words and exit codes."""

from __future__ import annotations

import json
import sys
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from charging.cli import main
from charging.errors import InputError
from charging.study.intervals import Probability
from charging.study.pictures import heat_map, middle_left_out, tornado
from charging.study.plan import Plan, load_study
from charging.study.ranking import ChoiceRow, LimitRow
from charging.study.report import ranking_csv, report_sweep
from charging.study.sweep import sweep
from charging.study.verdict import ChoiceVerdict, choice_verdict, sweep_review

CASE = (Path(__file__).parent / "two_films.toml").read_text(encoding="utf-8")
HEAD = 'title = "Coatings"\ncase = "case.toml"\nseed = 7\nmembers = 4\nreplicates = 2\n'
STUDY = (
    HEAD + 'draw = "spreads"\n[[vary]]\npath = "surface.tag.material"\nvalues = ["ITO coating"]\n'
)
MODES = {
    "plain": '[review]\nages = ["begin"]\n',
    "statistical": '[review]\nages = ["begin"]\nstatistical = "agreed with the customer"\n',
    "array": "[review]\narray_voltage_V = 100.0\n",
}


def plan(folder: Path, case: str = CASE, study: str = STUDY) -> Plan:
    (folder / "case.toml").write_text(case, encoding="utf-8")
    (folder / "study.toml").write_text(study, encoding="utf-8")
    return load_study(folder / "study.toml")


def row(
    exceed: Probability, beyond: int = 0, failed: int = 0, name: str = "ITO coating"
) -> ChoiceRow:
    limit = LimitRow("normal: tag", "R1", "tag", "normal", -1200.0, -40.0, 1000.0, exceed, beyond)
    return ChoiceRow(name, 0, -1200.0, "normal", "tag", exceed, failed, (), (limit,))


def judged(folder: Path, one: ChoiceRow, draws: int = 1000, mode: str = "plain") -> ChoiceVerdict:
    return choice_verdict(plan(folder, CASE + MODES[mode]), one, draws)


NONE, FEW, MANY = (
    Probability(0.0, 0.0, 0.003),
    Probability(0.01, 0.005, 0.015),
    Probability(0.6, 0.5, 0.7),
)


def test_a_draw_beyond_a_limit_is_exceeded_however_rare(tmp_path: Path) -> None:
    found = judged(tmp_path, row(FEW, beyond=10))
    assert (found.verdict, found.probabilistic) == ("exceeded", "yes")
    assert "10 of 1000 draws" in found.reason


def test_no_draw_beyond_is_not_within_without_the_corner(tmp_path: Path) -> None:
    found = judged(tmp_path, row(NONE))
    assert (found.verdict, found.probabilistic) == ("not assessable", "yes")
    assert "corner" in found.reason


def test_a_statistical_pass_where_the_case_accepts_it(tmp_path: Path) -> None:
    for one, beyond in ((NONE, 0), (FEW, 10)):
        found = judged(tmp_path, row(one, beyond=beyond), mode="statistical")
        assert found.verdict == "within"
        assert "agreed with the customer" in found.reason
        assert any("conditional on assumed spreads" in text for text in found.qualifications)
    assert judged(tmp_path, row(MANY, beyond=600), mode="statistical").verdict == "exceeded"


def test_what_stands_against_within(tmp_path: Path) -> None:
    few_draws = judged(tmp_path, row(NONE), draws=100, mode="statistical")
    assert few_draws.verdict == "not assessable"
    assert "fewer than 500" in few_draws.reason
    lost = judged(tmp_path, row(NONE, failed=100), mode="statistical")
    assert lost.verdict == "not assessable"
    assert "no solution" in lost.reason
    # assumed plasma that the case does not accept
    case = CASE.replace("ECSS geostationary worst case", "substorm, 3 keV class")
    study = plan(tmp_path, case + MODES["statistical"])
    assumed = choice_verdict(study, row(NONE), 1000)
    assert assumed.verdict == "not assessable"
    assert "accept_assumed" in assumed.reason
    # limits whose text nobody has read
    other = plan(tmp_path, CASE + MODES["statistical"] + 'criteria = "NASA"\n')
    unread = choice_verdict(other, row(NONE), 1000)
    assert unread.verdict == "not assessable"
    assert "was not read" in unread.reason


def test_bonded_surfaces_are_within_whatever_was_drawn(tmp_path: Path) -> None:
    one = row(NONE)
    bonded = replace(one, limits=(replace(one.limits[0], worst=0.0),))
    found = judged(tmp_path, bonded, draws=20)
    assert (found.verdict, found.reason) == ("within", "zero by construction: bonded")
    case = CASE.replace("ECSS geostationary worst case", "substorm, 3 keV class")
    assert choice_verdict(plan(tmp_path, case), bonded, 20).verdict == "not assessable"
    study = plan(tmp_path, study='surfaces = ["tag"]\n' + STUDY)
    assert choice_verdict(study, bonded, 20).qualifications == ("only limits of tag were judged",)


def test_within_speaks_of_every_age_and_plasma(tmp_path: Path) -> None:
    both = MODES["statistical"].replace('ages = ["begin"]', 'plasmas = ["quiet geostationary"]')
    found = choice_verdict(plan(tmp_path, CASE + both), row(NONE), 1000)
    assert found.verdict == "not assessable"
    assert "the end of life was not run" in found.reason
    assert "quiet geostationary" in found.reason


def test_an_array_above_70_V_gets_no_unqualified_pass(tmp_path: Path) -> None:
    found = judged(tmp_path, row(NONE), mode="array")
    assert any("specialist review" in text for text in found.qualifications)


def test_review_of_a_sweep_folder(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    study = plan(tmp_path)
    out = tmp_path / "out"
    store = sweep(study, out)
    with pytest.raises(InputError, match=r"no ranking\.json"):
        sweep_review(out)
    report_sweep(study, store)
    monkeypatch.setattr(sys, "argv", ["halflit", "review", str(out), "--json"])
    with pytest.raises(SystemExit) as left:
        main()
    document = json.loads(capsys.readouterr().out)
    codes = {"within": 0, "exceeded": 1, "not assessable": 4}
    assert left.value.code == codes[document["verdict"]]
    # ECSS worst case in the dark: the blanket is kilovolts from its neighbours in every draw
    assert document["verdict"] == "exceeded"
    ranking = out / "ranking.json"
    text = json.loads(ranking.read_text(encoding="utf-8"))
    text["blocks_sha256"] = ["0" * 64]
    ranking.write_text(json.dumps(text), encoding="utf-8")
    with pytest.raises(InputError, match="does not belong"):
        sweep_review(out)
    next((out / "blocks").iterdir()).unlink()
    with pytest.raises(InputError, match="not finished"):
        sweep_review(out)


def test_pictures_with_many_long_names(tmp_path: Path) -> None:
    study = plan(tmp_path)
    rng = np.random.default_rng(0)
    rows = []
    for i in range(45):
        limits = tuple(
            LimitRow(f"normal: surface {j} $of$ 衛星", "R", "", "normal", -1.0, -1.0, 1.0,
                     Probability(float(rng.random()), 0.0, 1.0), 1)
            for j in range(9)
        )  # fmt: skip
        drivers = tuple(
            (f"material.a long name {k} $x.secondary_yield_peak", 0.1) for k in range(12)
        )
        name = f"polyimide film with a long name, {i}" if i % 2 else "=SUM(A1)"
        rows.append(replace(row(MANY, name=name), limits=limits, drivers=drivers))
    heat_map(study, rows, tmp_path / "heat.png")
    tornado(rows[0], tmp_path / "tornado.png")
    for path in (tmp_path / "heat.png", tmp_path / "tornado.png"):
        assert path.read_bytes()[:4] == b"\x89PNG"
    assert "\n1,'=SUM(A1)," in ranking_csv(rows)  # no cell is a formula
    assert len({middle_left_out(r.choice, 24) for r in rows}) == 23
