"""What goes wrong around a run: disk, rights, locale, clock, kills, odd sizes, two at once."""

from __future__ import annotations

import json
import os
import resource
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest

from charging.case import load_case, load_case_text
from charging.dataset import read_result
from charging.errors import InputError
from charging.orbit_run import run_case
from charging.result_folder import check_target, result_folder
from charging.results import write_results
from charging.summary import case_summaries

ROOT = Path(__file__).parents[2]

CASE = """\
title = "Drei Flächen, 衛星"
[orbit]
kind = "fixed"
epoch = 2031-03-20T00:00:00Z
illumination = {light}
sun_direction = [0.0, 0.0, 1.0]
duration_h = {hours!r}
[time]
output_step_s = {step!r}
[plasma]
use = "ECSS geostationary worst case"
[body]
radius_m = 1.0
[emission]
secondary_law = "sanders_inouye_1979"
[[surface]]
name = "body"
material = "gold"
area_m2 = 4.0
normal = [0.0, 0.0, -1.0]
[[surface]]
name = "film"
material = "polyimide film"
area_m2 = 1.0
thickness_m = 5e-5
temperature_K = 300.0
normal = [0.0, 0.0, 1.0]
"""


def case(folder: Path, hours: float = 0.02, step: float = 6.0, light: float = 1.0) -> Path:
    path = folder / "case.toml"
    path.write_text(CASE.format(hours=hours, step=step, light=light), encoding="utf-8")
    return path


def command(*arguments: object) -> list[str]:
    return [sys.executable, "-W", "error", "-m", "charging", *map(str, arguments)]


def environment(**more: str) -> dict[str, str]:
    return {**os.environ, "PYTHONPATH": str(ROOT), **more}


def halflit(*arguments: object, cwd: Path, **more: str) -> subprocess.CompletedProcess[bytes]:
    return subprocess.run(
        command(*arguments), cwd=cwd, capture_output=True, check=False, timeout=110,
        env=environment(**more),
    )  # fmt: skip


def whole(folder: Path) -> bool:
    document = json.loads((folder / "summary.json").read_text(encoding="utf-8"))
    return read_result(folder).attrs["title"] == document["title"]


# --- surroundings of the process ------------------------------------------------------------------


def test_clock_umask_and_path_change_nothing(tmp_path: Path) -> None:
    plain, odd = tmp_path / "plain", tmp_path / "Größe – 衛星 '$(x)'"
    for folder in (plain, odd):
        folder.mkdir()
        case(folder)
    write_results(run_case(load_case(plain / "case.toml")), plain / "out", plots=False)
    before = os.umask(0o077)
    try:
        done = halflit(
            "run", "case.toml", "--out", "out ✓", cwd=odd, LC_ALL="C.UTF-8",
            TZ="Pacific/Kiritimati", COLUMNS="20", TERM="dumb",
        )  # fmt: skip
    finally:
        os.umask(before)
    assert done.returncode == 0, done.stderr
    assert done.stderr == b""
    out = odd / "out ✓"
    one, other = (
        json.loads((folder / "summary.json").read_text(encoding="utf-8"))
        for folder in (plain / "out", out)
    )
    assert one == other
    assert whole(out)
    assert (out / "summary.json").stat().st_mode & 0o777 == 0o600
    assert out.stat().st_mode & 0o777 == 0o700


ASCII = {"LC_ALL": "C", "LANG": "C", "PYTHONUTF8": "0", "PYTHONCOERCECLOCALE": "0"}


def test_a_locale_without_the_letters_of_a_name_says_so(tmp_path: Path) -> None:
    case(tmp_path)
    done = halflit("run", "case.toml", "--out", "Größe", cwd=tmp_path, **ASCII)
    assert done.returncode == 2
    assert b"in this locale" in done.stderr
    assert b"Traceback" not in done.stderr


@pytest.mark.slow
def test_a_locale_without_the_letters_of_a_title_prints_their_numbers(tmp_path: Path) -> None:
    case(tmp_path)
    done = halflit("run", "case.toml", "--out", "out", cwd=tmp_path, **ASCII)
    assert done.returncode == 0, done.stderr
    assert done.stdout.startswith(b"Drei Fl\\xe4chen")
    assert whole(tmp_path / "out")


# --- the disk -------------------------------------------------------------------------------------


def limited(largest: int) -> None:
    """Files of this process may not grow beyond a size, and say so instead of dying."""
    signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
    resource.setrlimit(resource.RLIMIT_FSIZE, (largest, largest))


@pytest.mark.parametrize("largest", [0, pytest.param(30_000, marks=pytest.mark.slow)])
def test_a_disk_that_fills_leaves_the_old_result(tmp_path: Path, largest: int) -> None:
    target = tmp_path / "out"
    write_results(run_case(load_case(case(tmp_path))), target, plots=False)
    before = {path.name: path.read_bytes() for path in target.iterdir()}
    done = subprocess.run(
        command("run", "case.toml", "--out", "out"), cwd=tmp_path, capture_output=True, text=True,
        check=False, timeout=110, env=environment(PYTHONDONTWRITEBYTECODE="1"),
        preexec_fn=lambda: limited(largest),
    )  # fmt: skip
    assert done.returncode == 2, done.stderr
    assert done.stderr.startswith("error: ")
    assert "cannot be written" in done.stderr
    assert "Traceback" not in done.stderr
    assert {path.name: path.read_bytes() for path in target.iterdir()} == before
    assert sorted(path.name for path in tmp_path.iterdir()) == ["case.toml", "out"]


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="no such device here")
def test_a_full_standard_output_is_an_error() -> None:
    with Path("/dev/full").open("wb") as full:
        done = subprocess.run(
            command("materials"), stdout=full, stderr=subprocess.PIPE, check=False, cwd=ROOT
        )
    assert done.returncode == 2
    assert b"standard output cannot be written" in done.stderr
    assert b"Traceback" not in done.stderr


@pytest.mark.skipif(os.geteuid() == 0, reason="the superuser may write anywhere")
def test_a_folder_without_rights(tmp_path: Path) -> None:
    closed = tmp_path / "closed"
    closed.mkdir()
    case(tmp_path)
    closed.chmod(0o500)
    done = halflit("run", "case.toml", "--out", "closed/out", cwd=tmp_path)
    assert done.returncode == 2
    assert b"no folder that can be written" in done.stderr


@pytest.mark.parametrize("place", ["/proc/out", "/dev/null/out", "case.toml/out"])
def test_a_folder_that_refuses_is_named(tmp_path: Path, place: str) -> None:
    case(tmp_path)
    target = tmp_path / place
    with pytest.raises(InputError, match="--out"):
        enter(target)


def enter(target: Path) -> None:
    check_target(target)
    with result_folder(target):
        pytest.fail("entered")


# --- kills, pipes, two at once --------------------------------------------------------------------


@pytest.mark.slow
def test_a_kill_while_writing_leaves_the_old_result_and_the_next_run_clears_up(
    tmp_path: Path,
) -> None:
    target = tmp_path / "out"
    write_results(run_case(load_case(case(tmp_path))), target, plots=False)
    before = {path.name: path.read_bytes() for path in target.iterdir()}
    running = subprocess.Popen(
        command("run", "case.toml", "--out", "out"), cwd=tmp_path, env=environment(),
        stdout=subprocess.DEVNULL,
    )  # fmt: skip
    partial, until = tmp_path / ".out.partial", time.monotonic() + 60.0
    while not any(partial.glob("*")) and time.monotonic() < until and running.poll() is None:
        time.sleep(0.002)
    running.send_signal(signal.SIGKILL)
    running.wait()
    assert {path.name: path.read_bytes() for path in target.iterdir()} == before
    write_results(run_case(load_case(tmp_path / "case.toml")), target, plots=False)
    assert sorted(path.name for path in tmp_path.iterdir()) == ["case.toml", "out"]
    assert whole(target)


@pytest.mark.slow
def test_two_runs_into_one_folder_leave_one_whole_result(tmp_path: Path) -> None:
    case(tmp_path)
    both = [
        subprocess.Popen(
            command("run", "case.toml", "--out", "out"), cwd=tmp_path, env=environment(),
            stdout=subprocess.DEVNULL, stderr=subprocess.PIPE, text=True,
        )
        for _ in range(2)
    ]  # fmt: skip
    for running in both:
        _, text = running.communicate(timeout=110)
        assert running.returncode in (0, 2)
        assert "Traceback" not in text
    assert 0 in [running.returncode for running in both]
    assert whole(tmp_path / "out")
    assert not [path for path in tmp_path.iterdir() if path.name.startswith(".")]


def test_a_closed_pipe_is_silent() -> None:
    for arguments in (("plasmas", "--json"), ("--help",)):
        read, write = os.pipe()
        os.close(read)
        done = subprocess.run(
            command(*arguments), stdout=write, stderr=subprocess.PIPE, check=False, cwd=ROOT
        )
        os.close(write)
        assert done.stderr == b"", arguments
        assert done.returncode == 0, arguments


# --- odd sizes ------------------------------------------------------------------------------------


def test_a_case_of_one_second() -> None:
    run = run_case(load_case_text(CASE.format(hours=1.0 / 3600.0, step=1.0, light=1.0)))
    times = run.modes[0].times_s
    assert times[0] == 0.0
    assert times[-1] == pytest.approx(1.0, abs=1e-9)
    assert np.isfinite(run.modes[0].trajectories[0](times)).all()
    assert case_summaries(run)[0].verdict


def many(count: int) -> str:
    surfaces = "".join(
        f'[[surface]]\nname = "film {k}"\nmaterial = "polyimide film"\narea_m2 = 0.01\n'
        f"thickness_m = {5e-5 * (1 + k % 7)!r}\ntemperature_K = {280.0 + k % 40!r}\n"
        f"normal = [0.0, {1.0 if k % 2 else -1.0}, 0.0]\n"
        for k in range(count)
    )
    return CASE.format(hours=0.05, step=30.0, light=1.0) + surfaces


def test_forty_surfaces_with_as_many_nodes() -> None:
    run = run_case(load_case_text(many(40)))
    assert len(run.modes[0].net.node_names) == 42
    assert np.isfinite(run.modes[0].trajectories[0].y_end).all()


@pytest.mark.slow
@pytest.mark.timeout(1200)
def test_a_thousand_surfaces(tmp_path: Path) -> None:
    run = run_case(load_case_text(many(998)))  # 1 000 is the most a file may hold
    write_results(run, tmp_path / "out", plots=False)
    dataset = read_result(tmp_path / "out")
    assert dataset.sizes["surface"] == 1000
    assert np.isfinite(dataset["potential"].values).all()
    assert dataset.attrs["charge_audit_relative"] < 1e-4


@pytest.mark.slow
@pytest.mark.timeout(1200)
def test_ten_years(tmp_path: Path) -> None:
    text = (ROOT / "cases" / "geo_substorm_day.toml").read_text(encoding="utf-8")
    step = 10 * 365.25 * 86400.0 / 199_000
    text = text.replace("duration_h = 24.0", "duration_h = 87660.0", 1)
    text = text.replace("output_step_s = 60.0", f"output_step_s = {step!r}", 1)
    assert "87660.0" in text
    (tmp_path / "case.toml").write_text(text, encoding="utf-8")
    done = halflit("case", "check", "case.toml", cwd=tmp_path)
    # allowed or refused with the bound, but never without end
    assert done.returncode in (0, 2)
    if done.returncode == 2:
        assert b"duration_h" in done.stderr
    done = halflit("orbit", "case.toml", "--json", cwd=tmp_path)
    assert done.returncode == 0, done.stderr
    assert len(json.loads(done.stdout)["eclipses"]) > 800  # two seasons a year, 45 nights each
    shutil.rmtree(tmp_path / "case", ignore_errors=True)
