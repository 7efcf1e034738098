"""Every key of a study file stands in the documentation, and nothing that is none."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from charging.study.plan import StudyFile, load_study
from charging.study.targets import NUMBERS, SINGLE_TABLES

CASES = Path(__file__).parents[2] / "cases"
README = (CASES / "README.md").read_text(encoding="utf-8")
KEYS = README.split("## Keys of a study file")[1].split("\n## ")[0]
WORDS = set(re.findall(r"`\[{0,2}([A-Za-z0-9_.]+)\]{0,2}(?: = [^`]*)?`", KEYS))
SCHEMA = StudyFile.model_json_schema()


@pytest.mark.parametrize("table", ["", *sorted(SCHEMA["$defs"])])
def test_keys_are_documented(table: str) -> None:
    keys = set((SCHEMA["$defs"][table] if table else SCHEMA)["properties"])
    assert keys <= WORDS, keys - WORDS


def test_what_may_vary_is_documented() -> None:
    numbers = {key for keys in NUMBERS.values() for key in keys}
    assert numbers | set(SINGLE_TABLES) <= WORDS


@pytest.mark.parametrize("path", sorted(CASES.glob("*_study.toml")), ids=lambda p: p.stem)
def test_the_studies_load(path: Path) -> None:
    study = load_study(path)
    assert f"{path.stem}.toml" in README
    assert len(study.choices) == len({choice.label for choice in study.choices})


def test_ten_thousand_members_with_twelve_surfaces() -> None:
    study = load_study(CASES / "ensemble_speed_study.toml")
    assert study.members == 10_000
    assert len(study.loaded.case.surface) == 12
