"""What the README tells a reader to type works."""

import os
import re
import shlex
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
README = (ROOT / "README.md").read_text(encoding="utf-8")


def halflit(*arguments: str, cwd: Path, codes: tuple[int, ...] = (0,)) -> str:
    done = subprocess.run(
        [sys.executable, "-W", "error", "-m", "charging", *arguments],
        cwd=cwd, capture_output=True, text=True, check=False,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
    )  # fmt: skip
    assert done.returncode in codes, done.stderr
    assert done.stderr == ""
    return done.stdout


def test_ci_calls_the_test_command_of_the_readme() -> None:
    lines = [
        line for line in README.splitlines() if re.match(r"python3 -m venv .* -m pytest", line)
    ]
    assert len(lines) == 1
    script = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    assert "README.md" in script
    assert "-m pytest" in script


def test_the_first_command_runs_the_demonstration(tmp_path: Path) -> None:
    (line,) = [line for line in README.splitlines() if "halflit run cases/" in line]
    arguments = shlex.split(line.split("halflit ", 1)[1])
    case = ROOT / arguments[1]
    text = halflit("run", str(case), cwd=tmp_path)
    assert "Verdict: exceeded" in text
    assert {p.name for p in (tmp_path / case.stem).iterdir()} >= {
        "result.nc",
        "summary.json",
        "surfaces.csv",
        "potentials.png",
    }


COMMANDS = re.findall(r"^\| `halflit ([^`]+)`", README, flags=re.MULTILINE)


@pytest.mark.parametrize(
    "command", [c for c in COMMANDS if not re.search("CASE|RESULT|BEFORE|STUDY", c)]
)
def test_commands_of_the_table_run(command: str, tmp_path: Path) -> None:
    assert halflit(*shlex.split(command), cwd=tmp_path)


def test_the_python_example_runs(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture
) -> None:  # type: ignore[type-arg]
    (code,) = re.findall(r"```python\n(.*?)```", README, flags=re.DOTALL)
    monkeypatch.chdir(ROOT)
    exec(compile(code, "README.md", "exec"), {})
    verdict, difference = capsys.readouterr().out.split()
    assert verdict == "exceeded"
    assert float(difference) > 100.0


@pytest.mark.parametrize(
    "name",
    ["run", "review", "plot", "point", "photoyield", "spectrum", "materials", "plasmas", "orbit"],
)
def test_help_of_every_command_names_an_example(name: str) -> None:
    assert "Example: halflit " + name in halflit(name, "--help", cwd=ROOT)
