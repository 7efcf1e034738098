"""Study files: what they may say, and what is refused with file and line."""

from __future__ import annotations

from pathlib import Path

import pytest

from charging.errors import InputError
from charging.study.plan import Plan, load_study

CASE = (Path(__file__).parent / "two_films.toml").read_text(encoding="utf-8")

HEAD = """
title = "Coatings"
case = "case.toml"
seed = 7
members = 6
"""


def written(folder: Path, study: str, case: str = CASE) -> Path:
    (folder / "case.toml").write_text(case, encoding="utf-8")
    path = folder / "study.toml"
    path.write_text(study, encoding="utf-8")
    return path


def plan(folder: Path, study: str, case: str = CASE) -> Plan:
    return load_study(written(folder, study, case))


def test_a_grid_of_coatings_and_a_drawn_range(tmp_path: Path) -> None:
    found = plan(
        tmp_path,
        HEAD
        + """
draw = "spreads"
[[vary]]
path = ["surface.blanket no. 1.5.material", "surface.tag.material"]
values = ["polyimide film", "ITO coating"]
[[vary]]
path = "body.radius_m"
values = [0.5, 1.0, 2.0]
[[vary]]
path = "material.PTFE.bulk_resistivity_ohm_m"
low = 1e15
high = 1e19
law = "log_uniform"
""",
    )
    assert [choice.label for choice in found.choices[:3]] == [
        "polyimide film, 0.5", "polyimide film, 1", "polyimide film, 2",
    ]  # fmt: skip
    assert found.members == 36
    assert [one.target.text for one in found.ranges] == ["material.PTFE.bulk_resistivity_ohm_m"]
    film, metal = found.choices[0].loaded.case, found.choices[3].loaded.case
    # another film than the surface's own brings the thickness that is typical of it
    typical = found.loaded.materials["polyimide film"].value("typical_thickness_m")
    assert [s.thickness_m for s in film.surface] == [None, 50e-6, typical]
    # a conductor has no film: its thickness goes
    assert [s.thickness_m for s in metal.surface] == [None, None, None]
    assert film.body.radius_m == 0.5


def test_a_dielectric_without_thickness_takes_the_typical_one(tmp_path: Path) -> None:
    found = plan(
        tmp_path, HEAD + '[[vary]]\npath = "surface.hull.material"\nvalues = ["polyimide film"]\n'
    )
    material = found.choices[0].loaded.materials["polyimide film"]
    assert found.choices[0].loaded.case.surface[0].thickness_m == material.value(
        "typical_thickness_m"
    )
    assert found.draws == 1  # nothing is drawn


def test_a_thickness_of_the_study_overrides_the_typical_one(tmp_path: Path) -> None:
    found = plan(
        tmp_path,
        HEAD
        + """
[[vary]]
path = "surface.tag.thickness_m"
values = [10e-6]
[[vary]]
path = "surface.tag.material"
values = ["polyimide film"]
""",
    )
    assert found.choices[0].loaded.case.surface[2].thickness_m == 10e-6
    assert found.choices[0].label == "1e-05, polyimide film"


def test_numbers_of_plasmas_links_and_records(tmp_path: Path) -> None:
    found = plan(
        tmp_path,
        HEAD
        + """
[[vary]]
path = "plasma.ECSS geostationary worst case.H+ 2.temperature_eV"
values = [20e3, 30e3]
[[vary]]
path = "link.1.resistance_ohm"
values = [1e9]
[[vary]]
path = "material.PTFE.photoyield"
values = [0.5]
""",
    )
    hot = [
        c.loaded.plasmas["ECSS geostationary worst case"].populations[3].temperature_eV
        for c in found.choices
    ]
    assert hot == [20e3, 30e3]
    assert found.choices[0].loaded.case.link[0].resistance_ohm == 1e9
    curve = found.choices[0].loaded.materials["PTFE"].photoyield
    assert curve is not None
    assert curve.level_factor == 0.5


REFUSED = {
    "unknown key": ("colour = 1\n", "study.toml:6", "colour"),
    "unknown path": (
        '[[vary]]\npath = "surface.blankt no. 1.5.material"\nvalues = ["gold"]\n',
        "study.toml:7", 'Nearest: "blanket no. 1.5"',
    ),
    "unknown property": (
        '[[vary]]\npath = "material.PTFE.bulk_resistivity"\nlow = 1.0\nhigh = 2.0\n',
        "study.toml:7", "bulk_resistivity_ohm_m",
    ),
    "unknown coating": (
        '[[vary]]\npath = "surface.tag.material"\nvalues = ["polyimid film"]\n',
        "case.toml", 'Nearest: "polyimide film"',
    ),
    "no range": ('[[vary]]\npath = "body.radius_m"\nlow = 1.0\n', "study.toml:6", "low and high"),
    "values and range": (
        '[[vary]]\npath = "body.radius_m"\nlow = 1.0\nhigh = 2.0\nvalues = [1.0]\n',
        "study.toml:6", "values and a range",
    ),
    "upside down": (
        '[[vary]]\npath = "body.radius_m"\nlow = 2.0\nhigh = 1.0\n', "study.toml:6", "not below",
    ),
    "out of range": (
        '[[vary]]\npath = "material.PTFE.relative_permittivity"\nlow = 0.5\nhigh = 2.0\n',
        "study.toml:8", "1 to 1000",
    ),
    "log from zero": (
        '[[vary]]\npath = "body.radius_m"\nlow = 0.0\nhigh = 1.0\nlaw = "log_uniform"\n',
        "study.toml:6", "above 0",
    ),
    "nan": ('[[vary]]\npath = "body.radius_m"\nlow = nan\nhigh = 1.0\n', "study.toml:8", "finite"),
    "text for a number": (
        '[[vary]]\npath = "body.radius_m"\nlow = "1"\nhigh = 2.0\n', "study.toml:8", "number",
    ),
    "no such link": (
        '[[vary]]\npath = "link.2.resistance_ohm"\nvalues = [1e9]\n', "study.toml:7", "1 to 1",
    ),
    "a path twice": (
        '[[vary]]\npath = "body.radius_m"\nvalues = [1.0]\n'
        '[[vary]]\npath = "body.radius_m"\nvalues = [2.0]\n',
        "study.toml:10", "twice",
    ),
    "a value twice": (
        '[[vary]]\npath = "body.radius_m"\nvalues = [1.0, 1.0]\n', "study.toml:6", "twice",
    ),
    "histories of too many": ("histories = true\n", "study.toml:5", "10000 members"),
    "nothing to search": ("[worst_case]\nstarts = 4\n", "study.toml:6", "[[search]]"),
    "no such surface": ('surfaces = ["tagg"]\n', "study.toml:6", "hull"),
}  # fmt: skip


@pytest.mark.parametrize("name", REFUSED)
def test_refused_with_file_and_line(name: str, tmp_path: Path) -> None:
    lines, place, words = REFUSED[name]
    head = HEAD.replace("= 6", "= 20000") if name.startswith("histories") else HEAD
    with pytest.raises(InputError) as error:
        plan(tmp_path, head + lines)
    assert place in str(error.value)
    assert words in str(error.value)


def test_the_case_lies_beside_the_study(tmp_path: Path) -> None:
    (tmp_path / "in").mkdir()
    (tmp_path / "case.toml").write_text(CASE, encoding="utf-8")
    path = tmp_path / "in" / "study.toml"
    path.write_text(HEAD.replace("case.toml", "../case.toml"), encoding="utf-8")
    with pytest.raises(InputError, match="outside the folder"):
        load_study(path)
    assert load_study(path, allow_outside=True).members == 1


def test_too_many_members_are_refused_before_anything_is_solved(tmp_path: Path) -> None:
    values = ", ".join(str(0.5 + 0.001 * i) for i in range(1000))
    lines = f'[[vary]]\npath = "body.radius_m"\nvalues = [{values}]\n'
    with pytest.raises(InputError, match="1000 choices of 2000 members"):
        plan(tmp_path, HEAD.replace("members = 6", "members = 2000") + lines)
