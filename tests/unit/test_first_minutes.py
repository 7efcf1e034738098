"""What a new user meets first: help, completion, version, examples, errors that say what to do."""

from __future__ import annotations

import importlib.util
import os
import re
import subprocess
import sys
from pathlib import Path

import pytest
import typer

from charging import __version__
from charging.cli import app

ROOT = Path(__file__).parents[2]


def halflit(*arguments: str, cwd: Path = ROOT, **more: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "charging", *arguments], cwd=cwd, capture_output=True, text=True,
        check=False, timeout=60, env={**os.environ, "PYTHONPATH": str(ROOT), **more},
    )  # fmt: skip


def commands() -> dict[str, typer.models.CommandInfo]:
    """Every command by what is typed for it."""
    found = {}
    groups = [("", app), *((f"{g.name} ", g.typer_instance) for g in app.registered_groups)]
    for prefix, one in groups:
        assert one is not None
        for command in one.registered_commands:
            assert command.callback is not None
            found[prefix + (command.name or command.callback.__name__)] = command
    return found


COMMANDS = commands()


@pytest.mark.parametrize("name", COMMANDS)
def test_every_help_holds_an_example_of_its_command(name: str) -> None:
    assert (COMMANDS[name].epilog or "").startswith(f"Example: halflit {name}")
    callback = COMMANDS[name].callback
    assert callback is not None
    text = callback.__doc__
    assert text
    assert not re.search(r"\[\[?\w", text.split("\n")[0]), "brackets vanish from a help page"


EXAMPLES = [command.epilog or "" for command in COMMANDS.values()]


@pytest.mark.parametrize("example", EXAMPLES)
def test_files_of_the_examples_exist(example: str) -> None:
    for file in re.findall(r"cases/[\w.]+", example):
        assert (ROOT / file).exists(), file


def test_version_and_completion(tmp_path: Path) -> None:
    assert halflit("--version").stdout == f"halflit {__version__}\n"
    # "halflit po" and the key that completes, as bash asks for it
    asked = {"COMP_WORDS": "halflit po", "COMP_CWORD": "1"}
    done = halflit(_HALFLIT_COMPLETE="complete_bash", **asked)
    program = Path(sys.executable).with_name("halflit")
    if program.exists():  # completion goes by the name of the program
        done = subprocess.run(
            [str(program)], capture_output=True, text=True, check=False, cwd=tmp_path,
            env={**os.environ, "PYTHONPATH": str(ROOT), "_HALFLIT_COMPLETE": "complete_bash",
                 **asked},
        )  # fmt: skip
        assert done.stdout.split() == ["point"]


@pytest.mark.parametrize(
    ("arguments", "step"),
    [
        (("run", "none.toml"), "halflit case new"),
        (("point", "--material", "goldd", "--plasma", "solar wind at 1 AU"), "gold"),
        (("materials", "nothing like it"), "halflit materials"),
        (("plasmas", "nothing like it"), "halflit plasmas"),
        (("plot", "none"), "result"),
        (("runn",), "run"),
    ],
)
def test_errors_name_the_next_step(arguments: tuple[str, ...], step: str) -> None:
    done = halflit(*arguments)
    assert done.returncode == 2
    assert step in done.stderr, done.stderr
    assert "Traceback" not in done.stderr


@pytest.mark.slow
def test_help_starts_within_twice_a_bare_program() -> None:
    path = ROOT / "tests" / "benchmarks" / "start_ratio.py"
    spec = importlib.util.spec_from_file_location("start_ratio", path)
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    ours, bare = module.start_times(7)
    assert ours <= 2.0 * bare, (ours, bare)
