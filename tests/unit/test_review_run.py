"""A review from file to verdict, report and exit code; fixes applied; sensitivities rerun."""

from __future__ import annotations

import json
import re
from dataclasses import replace
from datetime import UTC, datetime
from html import escape
from html.parser import HTMLParser
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest
from typer.testing import CliRunner

from charging.case import load_case
from charging.cli import app
from charging.orbit_run import solve_mode
from charging.review.blocks import Runner
from charging.review.check import Options, Review, load_case_or_result, review_case
from charging.review.compare import compare, reviewed
from charging.review.corner import serving
from charging.review.designs import Change, designed
from charging.review.document import review_document
from charging.review.document_runs import region_rows
from charging.review.extremes import extremes
from charging.review.files import write_review
from charging.review.report_run import timeline
from charging.review.space import HIGH, LOW, Variant, Workshop
from materials.library import library_text

EVIL = "<script>alert(1)</script> \"'&amp; =1+1 </style> $x_1$"
EVIL_TABLES = f"""
[[limit]]
kind = "structure"
allowed_V = 1e6
requirement_id = '''id {EVIL}'''
source_document = '''document {EVIL}'''
clause = '''clause {EVIL}'''
reason = '''reason {EVIL}'''
margin_policy = {{factor = 1.5, basis = '''basis {EVIL}'''}}
"""
CASE = """\
title = {title}
[orbit]
kind = "fixed"
illumination = 0.0
sun_direction = [0.0, 0.0, 1.0]
duration_h = 0.5
[time]
output_step_s = 300.0
[plasma]
use = "NASA geostationary 90 percent"
[body]
radius_m = 1.0
[emission]
secondary_law = "{law}"
[[surface]]
name = "body"
material = "oxidised aluminium"
area_m2 = 6.0
normal = [0.0, 0.0, 1.0]
[[surface]]
name = "blanket"
material = "{material}"
area_m2 = 0.5
{thickness}
normal = [0.0, 0.0, 1.0]
temperature_K = 290.0
[review]
ages = ["begin"]
"""


def film(value: float, low: float, high: float) -> str:
    """Polyimide film whose resistivity is another one; everything else as in the library."""
    head, rest = library_text("polyimide film").split("[bulk_resistivity_ohm_m]")
    table, tail = rest.split("\n[", 1)
    table = re.sub(r"value  = .*", f"value  = {value!r}", table)
    table = re.sub(r"low = .*, high = [^}]*", f"low = {low!r}, high = {high!r}", table)
    return f"{head}[bulk_resistivity_ohm_m]{table}\n[{tail}"


def write(folder: Path, thickness: float | None, resistivity: float, **changed: str) -> Path:
    folder.mkdir(exist_ok=True)
    entries = {
        "title": "'Box'",
        "law": "lin_joy_2005",
        "material": "blanket.toml",
        "thickness": "" if thickness is None else f"thickness_m = {thickness!r}",
        **changed,
    }
    (folder / "case.toml").write_text(CASE.format(**entries), encoding="utf-8")
    text = film(resistivity, resistivity / 3.0, resistivity * 3.0)
    (folder / "blanket.toml").write_text(text, encoding="utf-8")
    return folder / "case.toml"


def halflit(*arguments: str) -> tuple[int, str]:
    done = CliRunner().invoke(app, [*arguments, "--workers", "1"])
    if done.exception is not None and not isinstance(done.exception, SystemExit):
        raise done.exception
    return done.exit_code, done.stdout


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("reviews")


@pytest.fixture(scope="module")
def thin(folder: Path) -> Path:
    return write(folder / "thin", 25e-6, 1e11)


@pytest.fixture(scope="module")
def within(folder: Path, thin: Path) -> tuple[int, str, dict[str, Any]]:
    out = folder / "within"
    code, text = halflit("review", str(thin), "--out", str(out))
    return code, text, json.loads((out / "review.json").read_text(encoding="utf-8"))


def test_a_case_within_exits_0(within: tuple[int, str, dict[str, Any]]) -> None:
    code, text, document = within
    assert (code, document["verdict"]) == (0, "within")
    assert "Verdict: within" in text
    assert {row["verdict"] for row in document["limits"]} == {"within"}


def test_rows_have_the_keys_of_the_contract(within: tuple[int, str, dict[str, Any]]) -> None:
    keys = {"surface", "against", "kind", "requirement_id", "mode", "plasma", "age", "value",
            "allowed", "unit", "margin", "margin_dB", "time", "clause", "verdict",
            "reason"}  # fmt: skip
    for row in within[2]["limits"]:
        assert keys <= set(row)
        assert row["time"] is None or re.fullmatch(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ", row["time"])


def test_at_least_500_draws_and_none_beats_the_corner_by_5_percent(
    within: tuple[int, str, dict[str, Any]],
) -> None:
    live = [row for row in within[2]["limits"] if not row["bonded"]]
    assert live
    for row in live:
        assert row["draws"] >= 500
        largest, found = abs(row["draws_largest"]), abs(row["corner_value"])
        assert largest <= 1.05 * found + 0.01 * row["allowed"]
    assert within[2]["settings"]["seed"] == 1


def test_review_runs_again_from_its_own_file(
    folder: Path, within: tuple[int, str, dict[str, Any]]
) -> None:
    again = load_case_or_result(folder / "within")
    assert again.sha256 == within[2]["hashes"]["case"]
    found = reviewed(folder / "within")
    assert found.document["run_hash"] == within[2]["run_hash"]


def test_deleting_one_source_exits_4(folder: Path, thin: Path) -> None:
    case = write(folder / "unsourced", 25e-6, 1e11)
    record = case.parent / "blanket.toml"
    head, rest = record.read_text(encoding="utf-8").split("[ion_yield_peak]")
    record.write_text(f"{head}[ion_yield_peak]{re.sub(r'source = .*', '', rest, count=1)}")
    code, text = halflit("review", str(case), "--json", "--out", str(folder / "out4"))
    assert code == 4
    rows = [row for row in json.loads(text)["limits"] if row["surface"] == "blanket"]
    assert {row["verdict"] for row in rows} == {"not assessable"}
    assert all("ion_yield_peak of blanket.toml" in row["reason"] for row in rows)


def test_bad_input_exits_2(folder: Path) -> None:
    import subprocess
    import sys

    done = subprocess.run(
        [sys.executable, "-m", "charging", "review", str(folder / "nothing.toml")],
        capture_output=True, text=True, check=False,
    )  # fmt: skip
    assert done.returncode == 2
    assert done.stderr.startswith("error: ")


@pytest.fixture(scope="module")
def thick(folder: Path) -> tuple[Path, Review, dict[str, Any]]:
    case = write(folder / "thick", 127e-6, 1e16, title=f"'''{EVIL}'''")
    case.write_text(case.read_text(encoding="utf-8") + EVIL_TABLES, encoding="utf-8")
    record = case.parent / "blanket.toml"
    text = re.sub(r"source = .*", lambda _: f"source = '''{EVIL}'''", record.read_text(), count=1)
    record.write_text(text, encoding="utf-8")
    review = review_case(load_case(case), Options(draws=20))
    return case, review, review_document(review)


def test_a_thicker_more_resistive_blanket_is_exceeded(
    thick: tuple[Path, Review, dict[str, Any]],
) -> None:
    assert thick[1].verdict == "exceeded"
    exceeded = [row for row in thick[2]["limits"] if row["verdict"] == "exceeded"]
    assert {row["surface"] for row in exceeded} == {"blanket"}
    assert {row["verdict"] for row in exceeded} == {"exceeded"}
    for row in exceeded:
        assert row["margin"] < 0.0


def test_sensitivities_agree_with_full_reruns(thick: tuple[Path, Review, dict[str, Any]]) -> None:
    """The largest ones, against single runs with full tables and tolerance."""
    review = thick[1]
    row = next(r for r in review.rows if r.quantity.kind == "normal" and not r.corner.trivial)
    assert row.corner.sensitivities
    workshop = Workshop.of(review.loaded)
    place = row.nominal
    base = review.cells[place.cell].variants[place.variant]
    for effect in row.corner.sensitivities[:2]:
        for end, said in ((LOW, effect.low), (HIGH, effect.high)):
            variant = replace(base, settings=((effect.of.name, end),))
            run = solve_mode(review.loaded, None, members=[workshop.member(variant)])
            value, _ = extremes(
                run.members[0].case, run.balance.net.of(0), run.trajectories[0], [row.quantity]
            )
            assert said == pytest.approx(value[0], rel=0.01, abs=1.0)


def test_what_is_not_monotone_is_said(thick: tuple[Path, Review, dict[str, Any]]) -> None:
    for row in thick[1].rows:
        for effect in row.corner.sensitivities:
            one_side = (effect.low - effect.nominal) * (effect.high - effect.nominal) > 0.0
            if (
                one_side
                and min(abs(effect.low - effect.nominal), abs(effect.high - effect.nominal))
                > 0.011 * row.requirement.limit
            ):
                assert not effect.monotone


def test_members_give_the_same_in_any_company(thick: tuple[Path, Review, dict[str, Any]]) -> None:
    review = thick[1]
    quantity = review.rows[0].quantity
    variants = [
        Variant("begin", "lin_joy_2005", "auto", ((key, end),))
        for key in (("blanket.toml", "secondary_yield_peak"),)
        for end in (LOW, HIGH)
    ]
    with Runner(1) as runner:
        together = runner.solve(review.loaded, [(review.scenes[0], variants)], [quantity])[0]
        alone = [
            runner.solve(review.loaded, [(review.scenes[0], [one])], [quantity])[0].value[0, 0]
            for one in variants
        ]
    assert together.value[:, 0].tolist() == alone


class _Outline(HTMLParser):
    """Scripts, identifiers, references and texts of a page."""

    def __init__(self, page: str) -> None:
        super().__init__()
        self.scripts: list[dict[str, str | None]] = []
        self.ids: list[str] = []
        self.targets: list[str] = []
        self.loads: list[str] = []
        self.tags: list[str] = []
        self.feed(page)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        found = dict(attrs)
        self.tags.append(tag)
        if tag == "script":
            self.scripts.append(found)
        if found.get("id"):
            self.ids.append(str(found["id"]))
        if tag == "a":
            self.targets.append(str(found.get("href")))
        self.loads += [str(found[k]) for k in ("src", "data", "poster") if k in found]
        assert not any(name.startswith("on") for name in found)


@pytest.fixture(scope="module")
def page(folder: Path, thick: tuple[Path, Review, dict[str, Any]]) -> str:
    write_review(thick[1], thick[2], folder / "page")
    return (folder / "page" / "report.html").read_text(encoding="utf-8")


def test_everything_from_a_case_is_escaped(page: str) -> None:
    assert "<script>alert" not in page
    assert "&lt;script&gt;alert(1)&lt;/script&gt;" in page
    outline = _Outline(page)
    assert page.count("</style>") == outline.tags.count("style")
    assert [script.get("type") for script in outline.scripts] == ["application/json"]
    data = re.search(r'id="review-data">(.*?)</script>', page, flags=re.DOTALL)
    assert data is not None
    island = json.loads(data.group(1))
    assert island["title"] == EVIL
    assert f"id {EVIL}" in {row["requirement_id"] for row in island["limits"]}
    for word in ("id", "document", "basis"):
        assert f"{word} &lt;script&gt;alert(1)&lt;/script&gt;" in page
    for figure in re.findall(r"<svg.*?</svg>", page, flags=re.DOTALL):
        assert "alert(1)" not in re.sub(r'aria-label="[^"]*"', "", figure)


def test_review_json_keeps_the_strings_of_a_case(
    folder: Path, page: str, thick: tuple[Path, Review, dict[str, Any]]
) -> None:
    kept = json.loads((folder / "page" / "review.json").read_text(encoding="utf-8"))
    assert kept["title"] == EVIL
    assert f"id {EVIL}" in {row["requirement_id"] for row in kept["requirements"]}
    assert EVIL in {row["source"] for row in kept["properties"]}


def test_without_corners_nothing_is_within(folder: Path, thin: Path) -> None:
    code, text = halflit("review", str(thin), "--no-corners", "--json", "--out", str(folder / "nc"))
    assert code == 4
    document = json.loads(text)
    for row in document["limits"]:
        if not row["bonded"]:
            assert (row["verdict"], row["corner_value"], row["draws"]) == (
                "not assessable",
                None,
                0,
            )
            assert "spreads of properties were not run" in row["reason"]
    assert document["fixes"] is None
    assert "there is no corner" in (folder / "nc" / "report.html").read_text(encoding="utf-8")


def test_no_solution_exits_3(thin: Path, folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    from charging.__main__ import main
    from charging.errors import NoSolutionError

    def stuck(*_: object) -> None:
        raise NoSolutionError("no step at 2031-03-20T00:00:00Z")

    monkeypatch.setattr("charging.review.check.nominal_cells", stuck)
    monkeypatch.setattr("sys.argv", ["halflit", "review", str(thin), "--out", str(folder / "o3")])
    with pytest.raises(SystemExit) as ended:
        main()
    assert ended.value.code == 3
    assert not (folder / "o3").exists()


def test_every_quantity_is_searched_near_its_worst() -> None:
    random = np.random.Generator(np.random.PCG64(5))
    for _ in range(50):
        sizes = random.random((6, 9)) ** 4
        homes = serving(sizes)
        for q, home in enumerate(homes):
            assert sizes[home, q] >= 0.95 * sizes[:, q].max()
            assert sizes[home, q] == sizes[sorted(set(homes)), q].max()


def test_regions_are_told_in_stretches() -> None:
    """Breaks within one region do not split it; ends lie at the breaks."""
    along = SimpleNamespace(
        breaks_s=(600.0, 1200.0, 1800.0, 9999.0),
        name_at=lambda t: "plasmasphere" if t < 1200.0 else "magnetosphere lobes",
    )
    around = SimpleNamespace(along=along)
    scene = SimpleNamespace(mode="base", plasma="as in the case")
    cells = [SimpleNamespace(scene=scene, run=SimpleNamespace(around=around))]
    rows = region_rows(datetime(2031, 3, 20, tzinfo=UTC), 3600.0, cells)  # type: ignore[arg-type]
    assert [(r["region"], r["from"], r["lasts_s"]) for r in rows] == [
        ("plasmasphere", "2031-03-20T00:00:00Z", 1200.0),
        ("magnetosphere lobes", "2031-03-20T00:20:00Z", 2400.0),
    ]
    page = str(list(timeline({"timeline": [], "regions": rows}) or ()))
    assert "33.3%" in page
    assert "66.7%" in page


@pytest.mark.slow
def test_two_processes_give_the_same_review(folder: Path) -> None:
    case = write(folder / "both", 127e-6, 1e16, law="both")
    text = case.read_text(encoding="utf-8") + '[[mode]]\nname = "lit"\nalternative = true\n'
    case.write_text(text + "illumination = 1.0\n", encoding="utf-8")
    loaded = load_case(case)
    one, two = (
        review_document(review_case(loaded, Options(draws=40, fixes=False, workers=count)))
        for count in (1, 2)
    )
    assert one == two


def test_the_report_stands_alone(page: str) -> None:
    outline = _Outline(page)
    assert outline.loads == []
    assert not re.search(r"https?://(?!www\.w3\.org)", re.sub(r'xmlns[^"]*"[^"]*"', "", page))
    assert len(outline.ids) == len(set(outline.ids))
    for target in outline.targets:
        assert target.startswith("#")
        assert target[1:] in outline.ids
    assert outline.tags.count("svg") >= 5
    assert {"header", "main", "nav", "footer"} <= set(outline.tags)
    assert page.count('role="img" aria-label="') == outline.tags.count("svg")


def test_the_report_holds_every_section(page: str, thick: tuple[Path, Review, Any]) -> None:
    for anchor in ("verdict", "compliance", "cells", "pairs", "potentials", "currents", "timeline",
                   "jumps", "geometry", "sensitivities", "laws", "fixes", "properties", "plasmas",
                   "assumptions", "not-modelled", "claims", "cautions", "references",
                   "versions"):  # fmt: skip
        assert f'<section id="{anchor}"' in page or f'id="{anchor}" aria-labelledby' in page
    short = thick[2]["run_hash"][:12]
    assert f"halflit review, run {short}" in page  # the foot of every printed page
    assert "counter(page)" in page
    for row in thick[2]["properties"]:
        assert row["source"] is None or escape(row["source"], quote=False).split(",")[0] in page


def test_references_are_of_this_run_only(thick: tuple[Path, Review, dict[str, Any]]) -> None:
    """One law, in the dark: the other law and the solar spectrum are not cited."""
    cited = {row["what"] for row in thick[2]["references"]}
    assert "secondary electrons, lin_joy_2005" in cited
    assert not any("sanders_inouye" in what for what in cited)
    assert not any(what.startswith("solar spectrum") for what in cited)


def test_claims_and_cautions_are_in_every_report(page: str) -> None:
    for text in ("at most 3/N", "no purchase value", "no discharge", "crew outside",
                 "specialist review", "qualified specialists decide", "own safety process",
                 "conditional on assumed spreads"):  # fmt: skip
        assert text in page


def test_a_resistivity_comes_with_temperature_field_and_method(
    folder: Path, thick: tuple[Path, Review, dict[str, Any]]
) -> None:
    from charging.review.report_parts import fixes

    change = Change("blanket", "bulk_resistivity_ohm_m", 1e12)
    shown = str(
        list(
            fixes(  # type: ignore[arg-type]
                {
                    "answer": "x",
                    "remaining": [],
                    "single": [
                        {
                            "surface": "blanket",
                            "family": "bulk resistivity",
                            "changes": [change.document()],
                            "status": "solves",
                            "severity_before": 2.0,
                            "severity_after": 0.5,
                            "worsens": [],
                            "candidates_tried": 1,
                            "text": change.text,
                        }
                    ],
                }
            )
            or ()
        )
    )
    for word in ("298 K", "low field", "charge storage", "no purchase value"):
        assert word in shown


def test_compare_says_what_changed_and_what_moved(
    thin: Path, thick: tuple[Path, Review, dict[str, Any]], within: Any, folder: Path
) -> None:
    from charging.review.compare import Reviewed

    before = reviewed(folder / "within")
    after = Reviewed(thick[1].loaded, thick[2])
    found = compare(before, after)
    changed = {row["input"]: (row["before"], row["after"]) for row in found["inputs"]}
    assert changed['surface "blanket" thickness_m'] == (25e-6, 127e-6)
    assert changed['material "blanket.toml": bulk_resistivity_ohm_m value'] == (1e11, 1e16)
    assert found["verdict"] == {"before": "within", "after": "exceeded"}
    moved = {row["kind"]: row for row in found["limits"] if row["surface"] == "blanket"}
    assert moved["normal"]["verdict_before"] == "within"
    assert moved["normal"]["verdict_after"] == "exceeded"
    assert compare(before, before)["limits"] == []
    assert compare(before, before)["inputs"] == []


@pytest.mark.slow
def test_the_proposed_fix_applied_exits_0(folder: Path) -> None:
    """Both laws: exceeded exits 1; the fix of the file, written into the case, exits 0."""
    case = write(folder / "fixing", 127e-6, 1e16, law="both")
    code, text = halflit("review", str(case), "--json", "--out", str(folder / "fixed"))
    assert code == 1
    fixes = json.loads(text)["fixes"]
    assert fixes["verified"]
    assert fixes["verdict_with_them"] == "within"
    (change,) = fixes["changes"]
    assert (change["surface"], change["key"], change["bonded"]) == ("blanket", "material", True)
    mended = write(folder / "mended", None, 1e16, law="both", material=change["value"])
    assert halflit("review", str(mended), "--out", str(folder / "out0"))[0] == 0
    # a bound on the resistivity solves it, too, and a rerun with it agrees
    bound = next(f for f in fixes["single"] if f["family"] == "bulk resistivity")
    assert bound["status"] == "solves"
    largest = bound["changes"][0]["value"]
    loaded = designed(load_case(case), (Change("blanket", "bulk_resistivity_ohm_m", largest),))
    assert review_case(loaded, Options(fixes=False)).verdict == "within"
    too_much = designed(
        load_case(case), (Change("blanket", "bulk_resistivity_ohm_m", 30.0 * largest),)
    )
    assert review_case(too_much, Options(fixes=False)).verdict == "exceeded"


@pytest.mark.slow
def test_more_draws_do_not_beat_the_corner(folder: Path) -> None:
    """2 000 draws with another seed against the corner found with 500."""
    case = write(folder / "draws", 127e-6, 1e16)
    loaded = load_case(case)
    review = review_case(loaded, Options(fixes=False))
    from charging.review.space import draw, properties, varied

    space = varied(properties(loaded, "begin"))
    variants = [Variant("begin", "lin_joy_2005", "auto", one) for one in draw(space, 2000, 99)]
    live = [row for row in review.rows if not row.corner.trivial]
    quantities = [row.quantity for row in live]
    with Runner(1) as runner:
        found = runner.solve(loaded, [(review.scenes[0], variants)], quantities)[0]
    for row, values in zip(live, found.value.T, strict=True):
        worst = float(np.nanmax(np.abs(values)))
        if row.quantity.kind != "inverted":  # positive part only counts there
            assert worst <= 1.05 * abs(row.corner.value) + 0.01 * row.requirement.limit
