"""Every NetCDF file that is written follows CF-1.11, and its units are units."""

from __future__ import annotations

import re
import warnings
from pathlib import Path
from typing import Any

import netCDF4
import pytest

from charging.case import load_case
from charging.orbit_run import run_case
from charging.results import write_results

ROOT = Path(__file__).parents[2]
CASES = sorted(
    path
    for path in (ROOT / "cases").glob("*.toml")
    if "[orbit]" in path.read_text(encoding="utf-8") and not path.stem.startswith("ensemble")
)


def shortened(path: Path, folder: Path, hours: float) -> Path:
    """The case with its first hours only, and the files beside it."""
    for other in path.parent.iterdir():
        if other.suffix in {".oem", ".csv", ".toml"}:
            (folder / other.name).write_bytes(other.read_bytes())
    text = path.read_text(encoding="utf-8")
    duration = re.search(r"duration_h = ([\d.]+)", text)
    if duration:
        least = min(hours, float(duration[1]))
        text = text.replace(duration[0], f"duration_h = {least!r}", 1)
    else:
        text = text.replace("[time]\n", f"[time]\nduration_h = {hours!r}\n", 1)
    text = re.sub(r"output_step_s = [\d.]+", f"output_step_s = {hours * 360.0!r}", text, count=1)
    text = re.sub(r"^onset(_h)? = \S+", "onset_h = 0.02", text, flags=re.MULTILINE)
    text = re.sub(r"\[\[mode\]\](\n(?!\[).*)*", "", text)
    (folder / path.name).write_text(text, encoding="utf-8")
    return folder / path.name


def findings(path: Path) -> list[str]:
    """What the CF checker has to say about a file, and every unit that is none."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # the checker's own dependencies
        import cf_units
        from compliance_checker.runner import CheckSuite

        suite = CheckSuite()
        suite.load_all_available_checkers()
        dataset = suite.load_dataset(str(path))
        results = suite.run_all(dataset, ["cf:1.11"], [], None)
        groups, _ = results["cf:1.11"]
        out: Any = suite.dict_output("cf:1.11", groups, str(path), 1)
        dataset.close()
    score = out if isinstance(out, dict) else out[0]
    said = [
        f"{one['name']}: {one['msgs']}"
        for one in score["all_priorities"]
        if one["value"][0] != one["value"][1]
    ]
    with netCDF4.Dataset(str(path)) as file:
        for name, variable in file.variables.items():
            if not getattr(variable, "long_name", ""):
                said.append(f"{name} has no long_name")
            unit = getattr(variable, "units", None)
            if unit is None:
                flags = hasattr(variable, "flag_values") or hasattr(variable, "flag_masks")
                if variable.dtype is not str and not flags:
                    said.append(f"{name} has no units")
                continue
            try:
                cf_units.Unit(unit)
            except ValueError as error:
                said.append(f"{name}: {error}")
        if getattr(file, "Conventions", None) != "CF-1.11":
            said.append("no Conventions")
    return said


@pytest.fixture(autouse=True)
def _home(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.setenv("HOME", str(tmp_path))  # the checker may keep a cache there


def results(case: Path, folder: Path) -> list[Path]:
    write_results(run_case(load_case(case)), folder / "out", plots=False)
    return sorted((folder / "out").rglob("*.nc"))


def test_a_run_along_regions_follows_the_conventions(tmp_path: Path) -> None:
    case = shortened(ROOT / "cases" / "moon_lander_day.toml", tmp_path, 0.1)
    for path in results(case, tmp_path)[:1]:
        assert findings(path) == []


@pytest.mark.slow
@pytest.mark.timeout(600)
@pytest.mark.parametrize("case", CASES, ids=lambda path: path.stem)
def test_every_demonstration_follows_the_conventions(tmp_path: Path, case: Path) -> None:
    files = results(shortened(case, tmp_path, 0.3), tmp_path)
    assert files
    for path in files:
        assert findings(path) == []


@pytest.mark.parametrize(
    "name", ["inclined_eccentric", pytest.param("l1_halo", marks=pytest.mark.slow)]
)
def test_an_orbit_file_follows_the_conventions(tmp_path: Path, name: str) -> None:
    from typer.testing import CliRunner

    from charging.cli import app

    case = shortened(ROOT / "cases" / f"{name}.toml", tmp_path, 0.5)
    target = tmp_path / "orbit.nc"
    done = CliRunner().invoke(app, ["orbit", str(case), "-o", str(target)])
    assert done.exit_code == 0, done.output
    assert findings(target) == []


@pytest.mark.slow
@pytest.mark.timeout(600)
def test_a_sweep_follows_the_conventions(tmp_path: Path) -> None:
    from typer.testing import CliRunner

    from charging.cli import app

    study = ROOT / "cases" / "radiator_coatings_study.toml"
    text = study.read_text(encoding="utf-8")
    found = re.search(r'case = "([^"]+)"', text)
    assert found
    shortened(ROOT / "cases" / found[1], tmp_path, 0.3)
    text = re.sub(r"^members = \d+", "members = 4", text, flags=re.MULTILINE)
    (tmp_path / study.name).write_text(text, encoding="utf-8")
    done = CliRunner().invoke(
        app, ["sweep", str(tmp_path / study.name), "--out", str(tmp_path / "o")]
    )
    assert done.exit_code == 0, done.output
    (sweep,) = (tmp_path / "o").glob("sweep.nc")
    assert findings(sweep) == []
