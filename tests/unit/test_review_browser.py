"""The report in a browser: desktop, phone, print; console, overflow, figures, axe-core."""

from __future__ import annotations

import importlib.util
import re
import shutil
import sys
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from charging.case import load_case_text
from charging.review.check import Options, review_case
from charging.review.document import review_document
from charging.review.files import write_review

CHROMIUM = next(
    filter(None, map(shutil.which, ("chromium", "chromium-browser", "google-chrome"))), None
)
AXE = Path(sys.prefix) / "node_modules" / "axe-core" / "axe.min.js"
LACKING = [
    what
    for what, there in (
        ("playwright (pip install playwright)", importlib.util.find_spec("playwright")),
        ("chromium (apt-get install chromium)", CHROMIUM),
        (f"axe-core ({AXE}; npm install --prefix {sys.prefix} axe-core)", AXE.is_file()),
    )
    if not there
]
pytestmark = pytest.mark.skipif(
    bool(LACKING), reason=f"THE REPORT WAS NOT OPENED IN A BROWSER: no {'; no '.join(LACKING)}"
)

CASE = """\
title = "Long name of a case: a blanket, a glass and an isolated plate <b>&</b> more"
[orbit]
kind = "kepler"
epoch = 2031-03-20T11:00:00Z
semi_major_axis_km = 42164.17
eccentricity = 0.0002
inclination_deg = 0.05
raan_deg = 0.0
argument_of_perigee_deg = 0.0
mean_anomaly_deg = 170.0
[time]
duration_h = 0.4
[plasma]
use = "NASA geostationary 90 percent"
[body]
radius_m = 1.0
barrier = false
[emission]
secondary_law = "lin_joy_2005"
[[surface]]
name = "body"
material = "oxidised aluminium"
area_m2 = 6.0
normal = [0.0, 0.0, 1.0]
[[surface]]
name = "blanket with a rather long name, outer half"
material = "polyimide film"
area_m2 = 0.5
thickness_m = 25e-6
normal = [0.0, 0.0, -1.0]
temperature_K = 290.0
neighbours = ["plate"]
[[surface]]
name = "plate"
material = "gold"
area_m2 = 0.04
normal = [0.0, 1.0, 0.0]
floating = true
capacitance_F = 5e-10
[[mode]]
name = "no events"
alternative = true
events = false
[review]
plasmas = ["quiet geostationary"]
"""


@pytest.fixture(scope="module")
def report(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("report")
    review = review_case(load_case_text(CASE), Options(draws=4, fixes=False))
    write_review(review, review_document(review), folder)
    return folder / "report.html"


@pytest.fixture(scope="module")
def browser() -> Iterator[Any]:
    from playwright.sync_api import sync_playwright

    with sync_playwright() as play:
        opened = play.chromium.launch(executable_path=CHROMIUM, args=["--no-sandbox"])
        yield opened
        opened.close()


@pytest.fixture(params=[(1280, 900), (390, 844)], ids=["desktop", "phone"])
def opened(browser: Any, report: Path, request: pytest.FixtureRequest) -> Iterator[Any]:
    width, height = request.param
    page = browser.new_page(viewport={"width": width, "height": height})
    said: list[str] = []
    asked: list[str] = []
    page.on("console", lambda message: said.append(message.text))
    page.on("pageerror", lambda error: said.append(str(error)))
    page.on("request", lambda one: asked.append(one.url))
    page.goto(report.as_uri())
    yield page, said, asked
    page.close()


def test_nothing_is_said_or_loaded(opened: Any) -> None:
    page, said, asked = opened
    assert said == []
    assert asked == [page.url]


def test_nothing_overflows(opened: Any) -> None:
    page = opened[0]
    assert page.evaluate("document.documentElement.scrollWidth <= window.innerWidth")
    wide = page.evaluate(
        """() => [...document.querySelectorAll('body *')].filter(e =>
          !e.closest('.scroll, .figurebox, .skip, script') &&
          e.getBoundingClientRect().right > window.innerWidth + 1)
          .map(e => e.outerHTML.slice(0, 80))"""
    )
    assert wide == []


def test_all_figures_show(opened: Any) -> None:
    page = opened[0]
    boxes = page.evaluate(
        "[...document.querySelectorAll('figure svg')].map(e => [e.getBoundingClientRect().width, "
        "e.getBoundingClientRect().height, e.getAttribute('aria-label')])"
    )
    assert len(boxes) >= 6
    for width, height, label in boxes:
        assert width > 200
        assert height > 100
        assert label


def test_axe_finds_nothing_serious(browser: Any, report: Path) -> None:
    page = browser.new_page(viewport={"width": 390, "height": 844})
    page.goto(report.as_uri())
    page.add_script_tag(path=str(AXE))
    found = page.evaluate("axe.run({exclude: [['svg > *']]})")
    bad = [
        (one["impact"], one["id"], one["nodes"][0]["html"][:120])
        for one in found["violations"]
        if one["impact"] in ("serious", "critical", "moderate")
    ]
    assert bad == []
    assert len(found["passes"]) > 10


def test_the_keyboard_reaches_the_verdict_first(opened: Any) -> None:
    page = opened[0]
    page.keyboard.press("Tab")
    assert page.evaluate("document.activeElement.getAttribute('href')") == "#verdict"
    assert page.evaluate("document.activeElement.getBoundingClientRect().left") >= 0
    # every box that scrolls can be reached
    assert page.evaluate(
        "[...document.querySelectorAll('.scroll, .figurebox')].every(e => e.tabIndex === 0)"
    )


def test_a_verdict_is_never_told_by_colour_alone(opened: Any) -> None:
    page = opened[0]
    words = page.evaluate("[...document.querySelectorAll('.badge')].map(e => e.textContent)")
    assert words
    assert all(re.search("within|exceeded|not assessable", word) for word in words)


def test_it_prints_on_a4_with_page_numbers_and_hash(browser: Any, report: Path) -> None:
    page = browser.new_page()
    page.goto(report.as_uri())
    printed = page.pdf(prefer_css_page_size=True)
    # on paper nothing scrolls: tables fit into 184 mm, which are 695 px
    page.emulate_media(media="print")
    page.set_viewport_size({"width": 695, "height": 1000})
    wide = page.evaluate(
        "[...document.querySelectorAll('main *')].filter("
        "e => e.getBoundingClientRect().right > 697).map(e => e.outerHTML.slice(0, 90))"
    )
    page.close()
    assert wide == []
    assert printed.startswith(b"%PDF")
    boxes = set(re.findall(rb"/MediaBox \[0 0 ([0-9.]+) ([0-9.]+)\]", printed))
    assert {(round(float(w)), round(float(h))) for w, h in boxes} == {(595, 842)}
    assert printed.count(b"/Type /Page\n") > 5
