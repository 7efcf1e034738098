"""Quantities with units: against the definitions of the units, and what is refused."""

from math import isclose, pi

import pytest

from charging.errors import ProblemsFound
from charging.units import (
    UNITS,
    accepted_units,
    case_bare_keys,
    convert_quantity,
    normalise_plasma_document,
    parse_quantity,
    plasma_bare_keys,
    rewrite_quantities,
)

# Definitions: SI brochure 2019; international inch 25.4 mm, mil = inch/1000; au IAU 2012 B2.
DEFINITIONS = [
    ("5 mil", "length", 127e-6),
    ("5mil", "length", 0.000127),
    ("25.4 µm", "length", 25.4e-6),
    ("1 au", "length", 149_597_870_700.0),
    ("1 inch", "length", 0.0254),
    ("27.5 keV", "energy", 27_500.0),
    ("1.2 cm-3", "number density", 1.2e6),
    ("1.2 cm^-3", "number density", 1.2e6),
    ("1.2 cm⁻³", "number density", 1.2e6),
    ("1.2 /cm3", "number density", 1.2e6),
    ("1e16 ohm cm", "resistivity", 1e14),
    ("1e16 Ω·cm", "resistivity", 1e14),
    ("1e14 ohm*m", "resistivity", 1e14),
    ("-20 °C", "temperature", 253.15),
    ("290 K", "temperature", 290.0),
    ("3.2 m²", "area", 3.2),
    ("20 cm2", "area", 2e-3),
    ("100 pF", "capacitance", 1e-10),
    ("10 Mohm", "resistance", 1e7),
    ("24 h", "time", 86_400.0),
    ("2e7 V/m", "electric field", 2e7),
    ("20 kV/mm", "electric field", 2e7),
    (".5 kV", "voltage", 500.0),
    ("+3.E1 V", "voltage", 30.0),
]


@pytest.mark.parametrize(("text", "kind", "value"), DEFINITIONS)
def test_units_follow_their_definitions(text: str, kind: str, value: float) -> None:
    assert parse_quantity(text, kind) == value  # decimal conversion: the nearest float, exactly


def test_radian_is_the_only_inexact_unit() -> None:
    assert isclose(parse_quantity("1 rad", "angle"), 180.0 / pi, rel_tol=1e-15)


@pytest.mark.parametrize(
    "text",
    ["", " ", "mil", "5", "5 ", "nan m", "inf m", "-inf m", "5 keV", "5 m m", "1e999 m", "0x10 m",
     "1_000 m", "5,0 m", "1e5000 m", "5 \x1b[31m", "true", "9" * 50 + " m", "5 M", "٣ m", "5\n\n"],
)  # fmt: skip
def test_other_texts_are_no_length(text: str) -> None:
    with pytest.raises(ValueError):
        parse_quantity(text, "length")


def test_conversion_to_the_unit_of_a_key() -> None:
    assert convert_quantity("42164.17 km", "length", "km") == 42164.17
    assert convert_quantity("90 s", "time", "min") == 1.5
    assert convert_quantity("1 d", "time", "h") == 24.0


def test_every_bare_key_ends_in_a_known_unit() -> None:
    for keys in (case_bare_keys(), plasma_bare_keys()):
        for table in keys.values():
            for bare, targets in table.items():
                for target in targets:
                    assert target.unit in UNITS[target.kind]
                    assert target.key.startswith(f"{bare}_")


def test_accepted_units_are_accepted() -> None:
    for kind, units in UNITS.items():
        for unit in units:
            assert unit in accepted_units([kind])
            parse_quantity(f"1 {unit}", kind)


def test_rewriting_remembers_where_a_key_came_from() -> None:
    document = {"surface": [{"name": "a"}, {"thickness": "5 mil", "area_m2": 1}]}
    rewritten = rewrite_quantities(document, case_bare_keys())
    assert rewritten.document["surface"][1] == {"thickness_m": 127e-6, "area_m2": 1}
    assert rewritten.origin == {("surface", 1, "thickness_m"): ("surface", 1, "thickness")}
    assert document["surface"][1] == {"thickness": "5 mil", "area_m2": 1}  # the argument stays


@pytest.mark.parametrize(
    ("text", "key", "value"), [("400 V", "allowed_V", 400.0), ("2 kV/mm", "allowed_V_m", 2e6)]
)
def test_the_unit_chooses_between_two_keys(text: str, key: str, value: float) -> None:
    rewritten = rewrite_quantities({"limit": [{"allowed": text}]}, case_bare_keys())
    assert rewritten.document["limit"][0] == {key: value}


@pytest.mark.parametrize("value", [5, 5.0, True, None, ["5 mil"], {"value": 5}])
def test_a_bare_key_without_text_is_refused(value: object) -> None:
    rewritten = rewrite_quantities({"surface": [{"thickness": value}]}, case_bare_keys())
    assert "has no unit" in rewritten.problems[0].message
    assert rewritten.absent == {("surface", 0, "thickness_m")}


def test_both_ways_at_once_are_refused() -> None:
    table = {"thickness": "5 mil", "thickness_m": 127e-6}
    problem = rewrite_quantities({"surface": [table]}, case_bare_keys()).problems[0]
    assert problem.key == ("surface", 0, "thickness")
    assert "stands beside thickness_m" in problem.message


def test_a_misspelt_unit_gets_the_nearest_one() -> None:
    document = {"population": [{"temperature": "3 kev"}]}
    problem = rewrite_quantities(document, plasma_bare_keys()).problems[0]
    assert problem.nearest == "keV"


def test_plasma_documents() -> None:
    document = {"title": "t", "population": [{"density": "1.5 cm-3", "temperature": "3 keV"}]}
    assert normalise_plasma_document(document)["population"] == (
        {"density_m3": 1.5e6, "temperature_eV": 3000.0},
    )
    with pytest.raises(ProblemsFound, match="density has no unit"):
        normalise_plasma_document({"population": [{"density": 1.5}]})
