"""The house: who imports whom, what loads when, how long a module may be, provenance."""

from __future__ import annotations

import ast
import subprocess
import sys
import tomllib
from pathlib import Path
from typing import Any

import pytest

ROOT = Path(__file__).parents[2]
ROOMS = ("charging", "materials", "environments")
MODULES = sorted(path for room in ROOMS for path in (ROOT / room).rglob("*.py"))
LONGEST = 400
VISIBLE = {
    "README.md",
    "DEVELOPERS.md",
    "pyproject.toml",
    "charging",
    "materials",
    "environments",
    "tests",
    "cases",
}


def imports(path: Path) -> set[str]:
    """Every module named by an import statement, wherever it stands in the file."""
    tree = ast.parse(path.read_text(encoding="utf-8"))
    found = set()
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            found |= {name.name for name in node.names}
        elif isinstance(node, ast.ImportFrom):
            prefix = "." * node.level
            found.add(prefix + (node.module or ""))
    return found


def top_level_imports(path: Path) -> set[str]:
    """Modules imported when the file is, TYPE_CHECKING blocks left out."""
    tree = ast.parse(path.read_text(encoding="utf-8"))
    found = set()
    for node in tree.body:
        if isinstance(node, ast.Import):
            found |= {name.name.split(".")[0] for name in node.names}
        elif isinstance(node, ast.ImportFrom):
            found.add((node.module or "").split(".")[0])
    return found


def test_import_reader_finds_imports_inside_functions(tmp_path: Path) -> None:
    file = tmp_path / "x.py"
    file.write_text("import os.path\ndef f():\n    from materials import gold\n", encoding="utf-8")
    assert imports(file) == {"os.path", "materials"}


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(ROOT)))
def test_rooms_import_downwards_only(path: Path) -> None:
    room = path.relative_to(ROOT).parts[0]
    forbidden = {
        "materials": {"charging", "environments"},
        "environments": {"charging", "materials"},
        "charging": set(),
    }[room] | {"tests"}
    named = {name.split(".")[0] for name in imports(path)}
    assert not named & forbidden
    assert not any(name.startswith(".") for name in imports(path)), "relative import"


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(ROOT)))
def test_no_module_is_too_long(path: Path) -> None:
    assert len(path.read_text(encoding="utf-8").splitlines()) <= LONGEST


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(ROOT)))
def test_file_names_say_what_they_hold(path: Path) -> None:
    assert path.stem not in {"utils", "util", "helpers", "helper", "misc", "common", "tools"}


def test_nothing_else_stands_at_the_top() -> None:
    built = {"build", "dist", "__pycache__"}
    visible = {
        path.name
        for path in ROOT.iterdir()
        if not path.name.startswith(".")
        and not path.name.endswith(".egg-info")
        and path.name not in built
        and not (path / "summary.json").is_file()  # a result folder of a run started here
    }
    assert visible == VISIBLE


def test_init_files_hold_names_only() -> None:
    for room in ROOMS:
        for path in (ROOT / room).rglob("__init__.py"):
            if path.parent.name == "cli":
                continue  # the application itself
            for node in ast.parse(path.read_text(encoding="utf-8")).body:
                assert isinstance(node, ast.Import | ast.ImportFrom | ast.Assign | ast.Expr), path


def test_package_and_command_line_load_the_standard_library_and_typer_only() -> None:
    allowed = set(sys.stdlib_module_names) | {"typer", "charging"}
    files = [ROOT / "charging" / "__init__.py", ROOT / "charging" / "__main__.py"]
    files += sorted((ROOT / "charging" / "cli").glob("*.py"))
    for path in files:
        assert top_level_imports(path) <= allowed, path
    assert top_level_imports(ROOT / "charging" / "__init__.py") == set()


HEAVY = {
    "numpy", "scipy", "xarray", "netCDF4", "matplotlib", "pandas", "materials", "environments",
}  # fmt: skip


@pytest.mark.parametrize(
    ("arguments", "forbidden"),
    [
        (["--help"], HEAVY | {"pydantic"}),
        (["--version"], HEAVY | {"pydantic"}),
        # typer from 0.29 on loads pydantic by itself to describe the parameters of a command
        (["run", "--help"], HEAVY),
    ],
)
def test_help_loads_neither_numpy_nor_pydantic(arguments: list[str], forbidden: set[str]) -> None:
    done = subprocess.run(
        [sys.executable, "-X", "importtime", "-m", "charging", *arguments],
        cwd=ROOT,
        capture_output=True,
        text=True,
        check=False,
        timeout=60,
    )
    assert done.returncode == 0, done.stderr[-2000:]
    loaded = {
        line.rsplit("|", 1)[1].strip().split(".")[0]
        for line in done.stderr.splitlines()
        if line.startswith("import time:") and "|" in line
    }
    assert "typer" in loaded
    assert not loaded & forbidden
    assert "halflit" in done.stdout or "Usage" in done.stdout


DATA = sorted((ROOT / "materials" / "data").glob("*.toml")) + sorted(
    (ROOT / "environments" / "data").glob("*.toml")
)
BASES = {"measured", "handbook", "derived", "memory", "assumed"}


@pytest.mark.parametrize("path", DATA, ids=lambda path: path.stem)
def test_every_record_says_where_it_comes_from(path: Path) -> None:
    document = tomllib.loads(path.read_text(encoding="utf-8"))
    if path.parent.parent.name == "environments":
        if path.stem.startswith("plasma_"):
            assert document["source"].strip()
            assert document["basis"] in BASES
        else:
            parts = [table for table in document.values() if isinstance(table, dict)]
            assert parts
            assert all(part["source"].strip() for part in parts)
        return
    records = {key: value for key, value in document.items() if isinstance(value, dict)}
    assert records or document["emits"] is False
    for key, record in records.items():
        assert_sourced(key, record)


def assert_sourced(key: str, record: dict[str, Any]) -> None:
    """Every table that holds a figure says source and basis; a value also its spread."""
    inner = {k: v for k, v in record.items() if isinstance(v, dict) and k != "spread"}
    if set(record) - set(inner):
        assert record["source"].strip(), key
        assert record["basis"] in BASES, key
    if "value" in record:
        assert record["spread"]["low"] <= record["value"] <= record["spread"]["high"], key
    for name, table in inner.items():
        assert_sourced(f"{key}.{name}", table)


def test_wheel_lists_every_package_and_its_data() -> None:
    setup = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))
    listed = set(setup["tool"]["setuptools"]["packages"])
    there = {
        ".".join(path.parent.relative_to(ROOT).parts)
        for room in ROOMS
        for path in (ROOT / room).rglob("__init__.py")
    }
    assert listed == there
    for room in ROOMS:
        assert (ROOT / room / "py.typed").is_file()
        assert "py.typed" in setup["tool"]["setuptools"]["package-data"][room]
