"""Every key of a case file and every command stands in the documentation."""

import re
from pathlib import Path

import pytest
import typer

from charging.case_tables import Case
from charging.cli import app
from charging.dataset import VARIABLES

ROOT = Path(__file__).parents[2]
README = (ROOT / "cases" / "README.md").read_text(encoding="utf-8")
KEYS = README.split("## Keys of a case file")[1].split("## Plasma and material files")[0]
DOCUMENTED = set(re.findall(r"`\[{0,2}([A-Za-z0-9_.]+)\]{0,2}(?: = [^`]*)?`", KEYS))
TABLES = {
    name: set(table["properties"])
    for name, table in Case.model_json_schema()["$defs"].items()
    if "properties" in table
}


@pytest.mark.parametrize("table", sorted(TABLES))
def test_keys_of_a_table_are_documented(table: str) -> None:
    written = DOCUMENTED | {"kind", "event", "substorm"}  # [orbit] kind = …, [[plasma.event]]
    assert TABLES[table] <= written, TABLES[table] - written


def test_tables_are_documented() -> None:
    top = set(Case.model_json_schema()["properties"])
    assert top <= DOCUMENTED, top - DOCUMENTED


def test_no_documented_key_is_unknown() -> None:
    known = {key for keys in TABLES.values() for key in keys} | set(
        Case.model_json_schema()["properties"]
    )
    stray = set(re.findall(r"`([a-z][a-z0-9_]*(?:_[A-Za-z0-9]+)+)`", KEYS)) - known
    assert stray == set()


def test_every_command_is_in_the_readme() -> None:
    readme = (ROOT / "README.md").read_text(encoding="utf-8")
    for command in app.registered_commands:
        name = command.name or command.callback.__name__  # type: ignore[union-attr]
        assert f"halflit {name}" in readme, name


RESULT = README.split("## Variables of a result")[1].split("\n## ")[0]
ROWS = dict(re.findall(r"^\| `(\w+)` \| ([^|]*) \|", RESULT, flags=re.MULTILINE))


def test_variables_of_a_result_are_documented() -> None:
    assert set(ROWS) == set(VARIABLES)
    for name, variable in VARIABLES.items():
        dims, _, unit = ROWS[name].partition("; ")
        assert dims.split(", ") == list(variable.dims), name
        assert unit == (variable.units or "flags"), name


def test_every_option_of_every_command_is_explained() -> None:
    for group in (app, *(one.typer_instance for one in app.registered_groups)):
        assert group is not None
        for command in typer.main.get_command(group).commands.values():  # type: ignore[attr-defined]
            for parameter in command.params:
                assert getattr(parameter, "help", None), (command.name, parameter.name)
