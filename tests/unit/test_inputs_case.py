"""Case files: what is read, what is refused, at which line and in which words."""

import json
import math
from collections.abc import Callable
from datetime import UTC, datetime

import pytest
from pydantic import ValidationError

from charging.case import OrbitFixed, OrbitKepler, SunlitEclipse, case_schema, load_case_text
from charging.case_tables import Case
from charging.case_template import CASE_TEMPLATE
from charging.errors import InputError

FIXED = """\
title = "Standard worst case"
[orbit]
kind = "fixed"
illumination = 0.0
sun_direction = [0.0, -3.0, 4.0]
duration_h = 2.0
[plasma]
use = "ECSS geostationary worst case"
[body]
radius_m = 1.0
[[surface]]
name = "plate"
material = "oxidised aluminium"
area_m2 = 1.0
normal = [0.0, 0.0, 2.0]
[[surface]]
name = "ring"
material = "gold"
area_m2 = 0.1
normal = [1e200, 0.0, -1e200]
floating = true
capacitance = "100 pF"
[[surface]]
name = "film"
material = "PTFE"
area_m2 = 0.1
thickness = "1 mil"
temperature = "20 °C"
normal = [1e-300, 0.0, 0.0]
attached_to = "ring"
[[link]]
between = ["ring", "structure"]
resistance = "1 Gohm"
[[limit]]
kind = "field"
surfaces = ["film"]
allowed = "2e7 V/m"
margin_policy = {factor = 2.0, basis = "project rule"}
"""


def changed(old: str, new: str, text: str = CASE_TEMPLATE) -> tuple[str, int]:
    """Return the text with one place changed, and the line of that place."""
    assert text.count(old) == 1, (old, text.count(old))
    return text.replace(old, new), text[: text.index(old)].count("\n") + 1


def refused(text: str) -> InputError:
    with pytest.raises(InputError) as caught:
        load_case_text(text, file="cases/x.toml")
    message = str(caught.value)
    for jargon in ("pydantic", "http", "Input should", "validation error", "discriminator"):
        assert jargon not in message
    return caught.value


def test_template_is_a_valid_case() -> None:
    loaded = load_case_text(CASE_TEMPLATE)
    case = loaded.case
    assert isinstance(case.orbit, OrbitKepler)
    assert case.names == ("bus panel", "south radiator", "solar cells")
    assert case.surface[1].thickness_m == 127e-6
    assert isinstance(case.surface[2].temperature_K, SunlitEclipse)
    assert case.duration_s == 86_400.0
    assert case.output_times == 1441  # 0, 60, … 86400 s
    assert case.event_onset_s == (41_400.0,)  # 11:30
    assert case.sun.f107_81day == case.sun.f107 == 150.0
    assert case.mode[0].f107 == 220.0
    assert set(loaded.materials) == {s.material for s in case.surface} == set(loaded.material_texts)
    assert set(loaded.plasmas) == {
        "quiet geostationary",
        "substorm, 3 keV class",
        "ECSS geostationary worst case",
    }


def test_fixed_case_with_units() -> None:
    case = load_case_text(FIXED).case
    assert isinstance(case.orbit, OrbitFixed)
    assert case.orbit.sun_direction == pytest.approx((0.0, -0.6, 0.8), rel=1e-15)
    assert case.epoch == datetime(2000, 1, 1, tzinfo=UTC)
    assert case.duration_s == 7200.0
    for surface in case.surface:
        assert surface.normal is not None
        assert math.hypot(*surface.normal) == pytest.approx(1.0, rel=1e-15)
    assert case.surface[1].capacitance_F == 1e-10
    assert case.surface[2].temperature_K == 293.15
    assert case.link[0].resistance_ohm == 1e9
    assert case.limit[0].allowed_V_m == 2e7


def test_an_offset_becomes_utc() -> None:
    text, _ = changed("epoch = 2031-03-20T00:00:00Z", "epoch = 2031-03-20T02:00:00+02:00")
    assert load_case_text(text).case.epoch == datetime(2031, 3, 20, tzinfo=UTC)


def test_onset_in_hours_from_the_start() -> None:
    text, _ = changed("onset = 2031-03-20T11:30:00Z", "onset_h = 2")
    assert load_case_text(text).case.event_onset_s == (7200.0,)


@pytest.mark.parametrize(("step", "times"), [("60.0", 1441), ("0.5", 172_801), ("7000", 14)])
def test_output_times_hold_both_ends(step: str, times: int) -> None:
    text, _ = changed("output_step_s = 60.0", f"output_step_s = {step}")
    assert load_case_text(text).case.output_times == times


def test_objects_are_frozen() -> None:
    case = load_case_text(CASE_TEMPLATE).case
    with pytest.raises(ValidationError):
        case.title = "other"
    assert isinstance(case.surface, tuple)


def test_the_example_of_the_style() -> None:
    text, line = changed('material = "cover glass"', 'material = "polyimid"')
    assert str(refused(text)) == (
        f'cases/x.toml:{line}: surface "solar cells": material = "polyimid" is unknown.\n'
        '       Nearest: "polyimide film". All names: halflit materials'
    )


# place in the template, what replaces it, words of the message, words after it
FAULTS = [
    ('title = "Three', 'titel = "Three', 'key "titel" is unknown', 'Nearest: "title"'),
    ('kind = "kepler"', 'kind = "oem"', "[orbit]: file is missing", ""),
    ('kind = "kepler"', 'kind = "oen"', "is unknown", 'Nearest: "oem"'),
    ('kind = "kepler"', 'kind = "keppler"', "is unknown", 'Nearest: "kepler"'),
    ('kind = "kepler"', "kind = 3", "kind = 3 is unknown", '"kepler", "oem", "tle", "table"'),
    ('center = "earth"', 'center = "moon"', 'center = "moon" is unknown', '"earth"'),
    ("epoch = 2031-03-20T00:00:00Z", "epoch = 2031-03-20T00:00:00", "time zone", "UTC with Z"),
    ("epoch = 2031-03-20T00:00:00Z", "epoch = 2031-03-20", "is no moment", "2031-03-20T00"),
    ("epoch = 2031-03-20T00:00:00Z", 'epoch = "2031-03-20T00:00:00Z"', "no moment", "quotes"),
    ("epoch = 2031-03-20T00:00:00Z", "epoch = 0001-01-01T00:00:00+01:00", "Sun's", "1950 to"),
    ("epoch = 2031-03-20T00:00:00Z", "epoch = 9999-12-31T23:59:59-01:00", "Sun's", "1950 to"),
    ("eccentricity = 0.0002", "eccentricity = 1.0", "is out of range", "below 1"),
    ("eccentricity = 0.0002", "eccentricity = 0.9", "below ground", "below 0.8487"),
    ("semi_major_axis_km = 42164.17", "semi_major_axis_km = 6300", "out of range", "6378.137"),
    ("inclination_deg = 0.05", "inclination_deg = -1", "out of range", "at least 0"),
    ("inclination_deg = 0.05", "inclination_deg = nan", "nan is not finite", "finite number"),
    ("inclination_deg = 0.05", "inclination_deg = -inf", "-inf is not finite", "finite number"),
    ("inclination_deg = 0.05", "inclination_deg = 1e999", "inf is not finite", "finite number"),
    ("inclination_deg = 0.05", "inclination_deg = true", "true is no number", "a number"),
    ("inclination_deg = 0.05", 'inclination_deg = "0.05"', "is a text", "without quotes"),
    ("inclination_deg = 0.05", "inclination_deg = [0]", "is no number", "a number"),
    ("inclination_deg = 0.05", "inclination_deg = " + "9" * 400, "near 1e400", "finite number"),
    ("inclination_deg = 0.05", "inclination_deg = 0x" + "f" * 999, "near 1e1203", "finite number"),
    ("inclination_deg = 0.05", "inclination_deg = 1979-01-01", "is no number", "a number"),
    ("duration_h = 24.0", "duration_h = 0.0", "out of range", "above 0"),
    ("duration_h = 24.0", "duration_h = 8785", "out of range", "at most 8784"),
    ("output_step_s = 60.0", "output_step_s = 0.1", "output times", "at least 0.432 s"),
    ('start = "uncharged"', 'start = "equilibrum"', "is unknown", 'Nearest: "equilibrium"'),
    ("absorbing_height_km = 0.0", "distance_au = 0.4", "only with a fixed orbit", ""),
    ("f107 = 150.0", "f107 = 0", "out of range", "at least 50"),
    ('law = "nadir"', 'law = "sol"', 'law = "sol" is unknown', '"nadir", "yaw steering", "sun"'),
    ('use = "quiet geostationary"', 'use = "quiet geo"', "unknown", 'Nearest: "quiet geost'),
    ('use = "quiet geostationary"', 'use = ""', "cannot be a name", ".toml"),
    ('use = "quiet geostationary"', 'use = "a/b"', "names a file", "ending in .toml"),
    ('use = "quiet geostationary"', 'model = "region"', "is unknown", "regions"),
    ('use = "quiet geostationary"', 'file = "t.csv"', "is a file whose text was not kept", ""),
    ("onset = 2031-03-20T11:30:00Z", "onset = 2031-03-20T11:30:00", "event 1: onset", "with Z"),
    ("onset = 2031-03-20T11:30:00Z", "onset = 2031-03-21T11:30:00Z", "end of the run", "21T00"),
    ("rise_min = 5.0", "rise_min = -5.0", "rise_min = -5.0 is out of range", "at least 0"),
    ("decay_min = 30.0", "decay_min = 0", "decay_min = 0 is out of range", "above 0"),
    ("decay_min = 30.0", "decay = 30", "has no unit", "min, h"),
    ("radius_m = 1.2", 'radius = "1.2 keV"', 'no unit of length: "keV"', "m, km"),
    ("radius_m = 1.2", 'radius_m = 1.2\nradius = "1 m"', "stands beside radius_m", ""),
    ('collection = "auto"', 'collection = "cube"', "is unknown", '"sphere"'),
    ('secondary_law = "both"', 'secondary_law = "lin_joy"', "unknown", 'Nearest: "lin_joy_2005"'),
    ('name = "bus panel"', 'name = "structure"', "own structure", ""),
    ('name = "bus panel"', 'name = "../bus"', "cannot be a name", "letters"),
    ('name = "bus panel"', 'name = "bus\\n"', "cannot be a name", "letters"),
    ("area_m2 = 4.0", "area_m2 = -4.0", 'surface "bus panel": area_m2', "at least 1e-09"),
    ("area_m2 = 4.0", "aera_m2 = 4.0", 'key "aera_m2" is unknown', 'Nearest: "area_m2"'),
    ("normal = [0.0, 0.0, 1.0]", "normal = [0.0, 1.0]", "has 2 entries", "three numbers"),
    ("normal = [0.0, 0.0, 1.0]", "normal = [0, 0, 1, 0]", "has 4 entries", "three numbers"),
    ("normal = [0.0, 0.0, 1.0]", "normal = [0, 0, 0]", "has no direction", "not all zero"),
    ("normal = [0.0, 0.0, 1.0]", "normal = [0, nan, 1]", "entry 2 of normal = nan", "finite"),
    ("normal = [0.0, 0.0, 1.0]", "normal = 1", "normal = 1 is no list", "brackets"),
    ('thickness = "5 mil"  ', 'thickness = "5 mill"  ', 'length: "mill"', 'Nearest: "mil"'),
    ('thickness = "5 mil"  ', "floating = true", "capacitance_F is missing", ""),
    ('thickness = "5 mil"  ', "capacitance_F = 1e-9", "needs floating = true", ""),
    ('thickness = "5 mil"  ', "", "thickness_m is missing", "metres"),
    ('attached_to = "structure"', 'attached_to = "bus panel"', "no isolated conductor", ""),
    ('attached_to = "structure"', 'attached_to = "south radiator"', "surface itself", ""),
    ('attached_to = "structure"', 'attached_to = "strukture"', "no surface", '"structure"'),
    ('neighbours = ["bus panel"]', 'neighbours = ["bus panle"]', "no surface", '"bus panel"'),
    ('neighbours = ["bus panel"]', 'neighbours = ["south radiator"]', "itself", ""),
    ("temperature_K = 255.0", "", "temperature_K is missing", "a number [K]"),
    ("temperature_K = 255.0", "temperature_K = 0", "out of range", "at least 50"),
    ("eclipse_K = 200.0", "eclipse_K = -1", "temperature_K.eclipse_K = -1", "at least 50"),
    ("eclipse_K = 200.0, ", "", "temperature_K.eclipse_K is missing", ""),
    ('side = "front"', "", "side is missing", '"front", "back"'),
    ("tracks_sun = true", "normal = [1, 0, 0]\ntracks_sun = true", "stands beside normal", ""),
    ("tracks_sun = true", "normal = [0, 1, 0]", "needs tracks_sun = true", ""),
    ("tracks_sun = true", "tracks_sun = 1", "neither true nor false", "true, false"),
    ('material = "oxidised aluminium"', 'material = "PTFE"', 'material "PTFE" is a diel', "metres"),
    ('material = "cover glass"', 'material = "gold"', "a conductor", "Leave it out"),
    ("alternative = true", "alternative = false", "from is missing", "alternative = true"),
    ("alternative = true", "from = 2031-03-20T01:00:00Z", "to is missing", "to_h"),
    ("alternative = true", "", "from is missing", "whole run"),
    ("f107 = 220.0", "", 'mode "solar maximum": changes nothing', "events = false"),
    ("f107 = 220.0", "illumination = 0.0", "only with a fixed orbit", ""),
    ("f107 = 220.0", 'plasma = "quite geostationary"', "unknown", 'Nearest: "quiet geo'),
    ('ages = ["begin", "end"]', 'ages = ["start"]', "is unknown", '"begin", "end"'),
    ('ages = ["begin", "end"]', 'ages = ["end", "end"]', "listed twice", ""),
    ("[[mode]]", "[mode]", "is no array of tables", "[[mode]]"),
    ("[body]", "[[body]]", "is no table", "[body]"),
    ("[body]", "[boddy]", 'key "boddy" is unknown', 'Nearest: "body"'),
]  # fmt: skip


@pytest.mark.parametrize(("old", "new", "words", "after"), FAULTS)
def test_one_fault_is_named_at_its_line(old: str, new: str, words: str, after: str) -> None:
    text, line = changed(old, new)
    error = refused(text)
    first, *rest = str(error).split("\n")
    assert words in first
    assert after in " ".join(rest)
    assert error.line is not None
    if "missing" in first or "changes nothing" in first:
        assert error.line <= line  # a key that is absent is reported at its table
        assert text.split("\n")[error.line - 1].startswith(("[", "temperature_K"))
    else:
        assert line <= error.line <= line + 2


FIXED_FAULTS = [
    ("duration_h = 2.0\n", "duration_h = 2.0\n[time]\nduration_h = 2.0\n", "give it once"),
    ("duration_h = 2.0\n", "", "duration_h is missing"),
    ("illumination = 0.0", "illumination = 1.1", "out of range"),
    ("floating = true", "", "needs floating = true"),
    ('capacitance = "100 pF"', "", "capacitance_F is missing"),
    ('attached_to = "ring"', "floating = true\ncapacitance_F = 1", "only a conductor"),
    ('between = ["ring", "structure"]', 'between = ["ring"]', "has 1 entry"),
    ('between = ["ring", "structure"]', 'between = ["ring", "ring"]', "with itself"),
    ('between = ["ring", "structure"]', 'between = ["ring", "plat"]', "no surface"),
    ('between = ["ring", "structure"]', 'between = ["plate", "structure"]', "one conductor"),
    ('resistance = "1 Gohm"', "resistance_ohm = 0", "out of range"),
    ('surfaces = ["film"]', 'surfaces = ["plate"]', "has no thickness_m"),
    ('surfaces = ["film"]', 'surfaces = ["films"]', "no surface"),
    ('surfaces = ["film"]', "surfaces = []", "is empty"),
    ('allowed = "2e7 V/m"', "allowed_V = 3", "does not go with kind"),
    ('allowed = "2e7 V/m"', "", "allowed_V_m is missing"),
    ('kind = "field"', 'kind = "normal"', "does not go with kind"),
    ("factor = 2.0", "factor = 0.5", "out of range"),
    (', basis = "project rule"', "", "margin_policy.basis is missing"),
    ('title = "Standard worst case"', 'title = " "', "is empty"),
    ('title = "Standard worst case"', 'title = "a\\u001b[31m"', "control character"),
]


@pytest.mark.parametrize(("old", "new", "words"), FIXED_FAULTS)
def test_faults_of_fixed_cases_and_networks(old: str, new: str, words: str) -> None:
    assert words in str(refused(changed(old, new, FIXED)[0])).split("\n")[0]


def test_bare_key_is_quoted_as_it_stands_in_the_file() -> None:
    text, line = changed('thickness = "1 mil"', 'thickness = "-1 mil"', FIXED)
    error = refused(text)
    assert (error.line, error.key) == (line, ("surface", 2, "thickness"))


def test_attachments_in_a_ring_are_refused() -> None:
    text = FIXED.replace("floating = true", 'floating = true\nattached_to = "wire"')
    text += (
        '[[surface]]\nname = "wire"\nmaterial = "gold"\narea_m2 = 1\nnormal = [1, 0, 0]\n'
        'floating = true\ncapacitance_F = 1e-9\nattached_to = "ring"\n'
    )
    assert "leads back" in str(refused(text))


@pytest.mark.parametrize(
    ("second", "fits"),
    [("12:14:59", False), ("12:15:00", True), ("11:30:00", False), ("10:46:00", False)],
)
def test_events_must_not_overlap_in_rise_and_hold(second: str, fits: bool) -> None:
    event = (  # the template's own event rises and holds from 11:30 to 12:15
        f"[[plasma.event]]\nonset = 2031-03-20T{second}Z\nrise_min = 5\nhold_min = 40\n"
        'decay_min = 1\nuse = "quiet geostationary"\n\n[body]'
    )
    text, _ = changed("[body]", event)
    if fits:
        assert len(load_case_text(text).case.plasma.event) == 2
    else:
        assert "overlaps plasma event" in str(refused(text))


def test_names_must_differ() -> None:
    text = changed('name = "ring"', 'name = "plate"', FIXED)[0].replace('"ring"', '"plate"')
    assert "is the name of surface 1 already" in str(refused(text))


def test_the_first_problem_by_line_is_told_and_the_others_counted() -> None:
    text, _ = changed("radius_m = 1.2", "radius_m = -1")
    text, line = changed("inclination_deg = 0.05", "inclination_deg = true", text)
    text, _ = changed('thickness = "5 mil"  ', 'thickness = "5 ml"  ', text)
    error = refused(text)
    assert error.line == line
    assert error.more == 2
    assert str(error).endswith("(and 2 more)")


def test_all_unknown_names_are_counted() -> None:
    text, _ = changed('material = "cover glass"', 'material = "glas"')
    text, line = changed('use = "quiet geostationary"', 'use = "quiet"', text)
    error = refused(text)
    assert (error.line, error.more) == (line, 1)


@pytest.mark.parametrize("text", ["", "title = 'x'", "surface = []", "surface = 3", "[surface]"])
def test_what_is_hardly_a_case(text: str) -> None:
    refused(text)


@pytest.mark.parametrize(
    ("text", "line"),
    [
        ("title = 'x'\ntitle = 'y'", 2),
        ("\n\na = ", 3),
        ("a = 2031-02-30T00:00:00Z", 1),
        ('a = "\\ud800"', 1),
    ],
)
def test_toml_faults_carry_their_line(text: str, line: int) -> None:
    error = refused(text)
    assert error.line == line
    assert "this is no TOML" in str(error)


@pytest.mark.parametrize(
    "text",
    ["a = " + "[" * 100_000, "a = " + "[" * 45 + "]" * 45, "[" + "a." * 90_000 + "a]",
     "a" + ".a" * 150 + " = 1", "a = " + "9" * 5000, "a = " + "{a = " * 500 + "1" + "}" * 500],
    ids=["open brackets", "deep array", "long header", "deep key", "digits", "inline tables"],
)  # fmt: skip
def test_shapes_that_break_readers(text: str) -> None:
    refused(text)


@pytest.mark.parametrize(
    "extra",
    ["".join(f"k{number} = 1\n" for number in range(60_000)),
     "".join(f'[[surface]]\nname = "{number}"\n' for number in range(20_000)),
     f"[review.x]\nplasmas = {[str(number) for number in range(90_000)]}\n",
     f"[[limit]]\nkind = 'normal'\nallowed_V = 1\nsurfaces = {['x'] * 100_000}\n",
     "".join('[[link]]\nbetween = ["a", "b"]\nresistance_ohm = 1\n' for _ in range(999))],
    ids=["keys", "surfaces", "plasmas", "names", "links"],
)  # fmt: skip
def test_large_faulty_files_end_in_an_error(extra: str) -> None:
    assert refused(CASE_TEMPLATE + extra).more >= 0


def test_schema_is_json_with_every_key_of_the_template() -> None:
    schema = json.loads(json.dumps(case_schema()))
    assert schema["additionalProperties"] is False
    assert set(schema["properties"]) == set(Case.model_fields)
    assert "thickness_m" in schema["$defs"]["Surface"]["properties"]


@pytest.mark.parametrize("build", [lambda: Case.model_validate({"title": "x"})])
def test_building_in_python_is_checked_too(build: Callable[[], Case]) -> None:
    with pytest.raises(ValidationError):
        build()
