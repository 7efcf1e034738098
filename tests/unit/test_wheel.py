"""The wheel holds the three packages with their data, and works away from the checkout."""

import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    # a copy: building leaves folders behind that must not appear in the checkout
    import shutil

    source = tmp_path_factory.mktemp("source")
    for name in ("charging", "materials", "environments"):
        shutil.copytree(ROOT / name, source / name, ignore=shutil.ignore_patterns("__pycache__"))
    for name in ("pyproject.toml", "README.md"):
        shutil.copy(ROOT / name, source)
    target = tmp_path_factory.mktemp("wheel")
    subprocess.run(
        [sys.executable, "-m", "pip", "wheel", "-q", "--no-deps", "--no-build-isolation", "-w",
         str(target), str(source)],
        check=True, capture_output=True,
    )  # fmt: skip
    (found,) = target.glob("*.whl")
    return found


def test_wheel_holds_packages_and_data_only(wheel: Path) -> None:
    names = zipfile.ZipFile(wheel).namelist()
    tops = {name.split("/")[0] for name in names if ".dist-info/" not in name}
    assert tops == {"charging", "materials", "environments"}
    for top in tops:
        assert f"{top}/py.typed" in names
    for room in ("materials", "environments"):
        data = {p.name for p in (ROOT / room / "data").glob("*.toml")}
        assert data == {n.split("/")[-1] for n in names if n.startswith(f"{room}/data/")}
    code = {str(p.relative_to(ROOT)) for p in (ROOT / "charging").rglob("*.py")}
    assert code == {n for n in names if n.startswith("charging/") and n.endswith(".py")}


@pytest.mark.timeout(300)
def test_wheel_runs_away_from_the_checkout(wheel: Path, tmp_path: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        archive.extractall(tmp_path / "site")
    script = (
        "import sys; sys.path.insert(0, 'site'); "
        "import charging; assert 'site' in charging.__file__, charging.__file__; "
        "sys.argv = ['halflit', *sys.argv[1:]]; from charging.cli import main; main()"
    )

    def halflit(*arguments: str) -> str:
        done = subprocess.run(
            [sys.executable, "-c", script, *arguments],
            cwd=tmp_path, capture_output=True, text=True, check=False,
        )  # fmt: skip
        assert done.returncode == 0, done.stderr
        return done.stdout

    (tmp_path / "case.toml").write_text(halflit("case", "new"), encoding="utf-8")
    assert "Verdict" in halflit("run", "case.toml", "--out", "result")
    assert (tmp_path / "result" / "result.nc").is_file()
