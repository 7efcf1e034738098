"""Files and names made to harm: endless, hollow, deep, outside, and texts a terminal would obey."""

from __future__ import annotations

import csv
import json
import os
import subprocess
import sys
import time
from pathlib import Path

import netCDF4
import numpy as np
import pytest

from charging.case import load_case
from charging.dataset import read_result
from charging.errors import InputError, NoSolutionError
from charging.toml_file import parse_toml
from environments.ephemeris_table import read_ephemeris_netcdf
from environments.errors import EnvironmentDataError
from environments.netcdf_sizes import refuse_hollow
from environments.spectrum_file import read_spectrum
from environments.text_table import LARGEST_FILE_BYTES, read_lines
from materials.errors import MaterialError

ROOT = Path(__file__).parents[2]

CASE = """\
title = {title}
[orbit]
kind = "fixed"
illumination = 0.0
sun_direction = [0.0, 0.0, 1.0]
duration_h = 0.01
[time]
output_step_s = 6.0
[plasma]
use = "ECSS geostationary worst case"
[body]
radius_m = 1.0
[[surface]]
name = "{name}"
material = "{material}"
area_m2 = 4.0
normal = [0.0, 0.0, -1.0]
{more}
"""


def case(folder: Path, title: str = '"x"', name: str = "body", material: str = "gold",
         more: str = "") -> Path:  # fmt: skip
    path = folder / "case.toml"
    path.write_text(
        CASE.format(title=title, name=name, material=material, more=more), encoding="utf-8"
    )
    return path


def halflit(*arguments: str, cwd: Path) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-W", "error", "-m", "charging", *arguments],
        cwd=cwd, capture_output=True, text=True, check=False, timeout=100,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
    )  # fmt: skip


def readable(text: str) -> bool:
    return all(line.isprintable() for line in text.split("\n"))


# --- sizes ----------------------------------------------------------------------------------------


def test_a_text_of_more_than_ten_megabytes_is_not_read(tmp_path: Path) -> None:
    path = tmp_path / "long.csv"
    with path.open("wb") as stream:
        stream.truncate(3_000_000_000)  # takes no room on the disk
    began = time.monotonic()
    with pytest.raises(EnvironmentDataError, match="too large") as caught:
        read_lines(path)
    assert "10 MB" in str(caught.value)
    assert time.monotonic() - began < 1.0
    assert LARGEST_FILE_BYTES == 10_000_000


def test_a_data_file_of_a_case_has_the_same_bound(tmp_path: Path) -> None:
    with (tmp_path / "t.csv").open("wb") as stream:
        stream.truncate(3_000_000_000)
    with pytest.raises(InputError, match="too large"):
        load_case(case(tmp_path, more='temperature_K = "t.csv"'))


@pytest.mark.parametrize("deep", [21, 400, 100_000])
@pytest.mark.parametrize("opening", ["[", "{a=", "a."])
def test_nesting_beyond_twenty_levels(opening: str, deep: int) -> None:
    closing = {"[": "]", "{a=": "}", "a.": ""}[opening]
    text = opening * deep + "a = 1" if opening == "a." else f"a = {opening * deep}1{closing * deep}"
    began = time.monotonic()
    with pytest.raises(InputError, match=r"nested too deeply|too many parts"):
        parse_toml(text, file="x.toml")
    assert time.monotonic() - began < 5.0


def test_twenty_levels_are_allowed() -> None:
    parse_toml("a = " + "[" * 19 + "1" + "]" * 19, file="x.toml")


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="no pipes with names here")
@pytest.mark.parametrize("named", ["material", "temperature_K", "spectrum"])
def test_a_pipe_is_no_file(tmp_path: Path, named: str) -> None:
    for name in ("pipe.toml", "pipe.csv"):
        os.mkfifo(tmp_path / name)
    if named == "spectrum":
        with pytest.raises(EnvironmentDataError, match="no such file"):
            read_spectrum("pipe.csv", tmp_path)
        return
    if named == "material":
        given = case(tmp_path, material="pipe.toml")
    else:
        given = case(tmp_path, more='temperature_K = "pipe.csv"')
    with pytest.raises(InputError, match="no ordinary file"):
        load_case(given)
    with pytest.raises(EnvironmentDataError, match="no ordinary file"):
        read_lines(tmp_path / "pipe.csv")


@pytest.mark.skipif(not Path("/dev/zero").exists(), reason="no such device here")
def test_a_device_is_no_file(tmp_path: Path) -> None:
    (tmp_path / "zero.csv").symlink_to("/dev/zero")
    given = case(tmp_path, more='temperature_K = "zero.csv"')
    with pytest.raises(InputError, match="outside"):
        load_case(given)
    with pytest.raises(InputError, match="no ordinary file"):
        load_case(given, allow_outside=True)


def hollow(path: Path, *, times: bool = True) -> Path:
    """NetCDF of a few kilobytes that declares a terabyte."""
    with netCDF4.Dataset(str(path), "w") as dataset:
        dataset.setncatts({"frame": "GCRF", "center": "earth", "time_scale": "UTC"})
        dataset.createDimension("time", 10**11)
        dataset.createDimension("axis", 3)
        time_ = dataset.createVariable("time", "f8", ("time",), chunksizes=(8192,))
        if times:
            time_.setncattr("units", "seconds since 2031-03-20 00:00:00")
        one = dataset.createVariable("position", "f8", ("axis", "time"), chunksizes=(3, 8192))
        one.setncattr("units", "m")
        for name in ("energy_eV", "flux_m2_s_sr_eV"):
            dataset.createVariable(name, "f8", ("time",), chunksizes=(8192,))
    return path


def test_a_hollow_file_is_refused_before_memory_is_asked_for(tmp_path: Path) -> None:
    path = hollow(tmp_path / "big.nc")
    assert path.stat().st_size < 1_000_000
    with pytest.raises(EnvironmentDataError, match="declares"):
        read_ephemeris_netcdf(path)
    with pytest.raises(InputError, match="declares"):
        read_result(hollow(tmp_path / "result.nc", times=False))
    with pytest.raises(EnvironmentDataError, match="declares"):
        read_spectrum("big.nc", tmp_path)
    refuse_hollow(49_000_000, path)


# --- names are never paths ------------------------------------------------------------------------


@pytest.mark.parametrize("name", ["../up", "a/b", "/etc", "..", "a\\\\b", "con\\u0000", "~"])
def test_names_that_look_like_paths_are_refused(tmp_path: Path, name: str) -> None:
    with pytest.raises(InputError):
        load_case(case(tmp_path, name=name))


# --- texts that a terminal, a spreadsheet or a page would obey ------------------------------------

EVIL = r'"\u009b2J\u202e =cmd|calc!A1\nVerdict: within\n<script>alert(1)</script> $x_{1}$ %s"'


def test_texts_of_a_case_act_on_nothing(tmp_path: Path) -> None:
    work = tmp_path / "work"
    work.mkdir()
    record = ROOT / "materials" / "data" / "gold.toml"
    (work / "=1+1.toml").write_bytes(record.read_bytes())
    given = case(work, title=EVIL, name="CON.aux +1-1 (x)", material="=1+1.toml")
    done = halflit("run", given.name, "--out", "out", cwd=work)
    assert done.returncode == 0, done.stderr
    # neither does the terminal obey, nor does a title pass for a verdict
    assert readable(done.stdout), repr(done.stdout)
    assert sum(line.startswith("Verdict: ") for line in done.stdout.splitlines()) == 1
    # nothing is written but the result
    assert [path.name for path in tmp_path.iterdir()] == ["work"]
    assert sorted(path.name for path in work.iterdir()) == ["=1+1.toml", "case.toml", "out"]
    # where a text is data it stays as it is
    title = load_case(given).case.title
    summary = json.loads((work / "out" / "summary.json").read_text(encoding="utf-8"))
    assert summary["title"] == title
    assert read_result(work / "out").attrs["title"] == title
    # no cell of a table is a formula
    with (work / "out" / "surfaces.csv").open(encoding="utf-8", newline="") as stream:
        cells = [cell for row in csv.reader(stream) for cell in row]
    assert "CON.aux +1-1 (x)" in cells
    for cell in cells:
        if cell and cell[0] in "=+-@\t\r":
            float(cell)


def test_control_characters_in_a_title_are_refused(tmp_path: Path) -> None:
    for character in ("\\u0000", "\\u001b", "\\u0007", "\\u007f"):
        with pytest.raises(InputError, match="control character"):
            load_case(case(tmp_path, title=f'"x{character}"'))


@pytest.mark.parametrize("first", ["=", "+", "-", "@"])
def test_a_name_cannot_begin_a_formula(tmp_path: Path, first: str) -> None:
    with pytest.raises(InputError):
        load_case(case(tmp_path, name=f"{first}1+1"))


def test_a_file_name_in_a_message_is_harmless(tmp_path: Path) -> None:
    name = "x\x1b[2J\n.toml"
    (tmp_path / name).write_text("title = 1\n", encoding="utf-8")
    done = halflit("run", name, cwd=tmp_path)
    assert done.returncode == 2
    assert readable(done.stderr), repr(done.stderr)
    assert "Traceback" not in done.stderr


def test_errors_show_no_character_that_acts() -> None:
    bad = "\x1b[2J\x9b\u202e\n"
    shown = (
        str(InputError(bad, file=bad, allowed=bad, nearest=bad, next_step=bad)),
        str(NoSolutionError(bad, next_step=bad)),
        str(EnvironmentDataError(bad, key=(bad,), value=bad, allowed=bad, nearest=bad, file=bad)),
        str(MaterialError((bad,), bad, bad, bad, bad)),
    )
    for text in shown:
        assert readable(text), repr(text)
        assert text.count("\n") <= 2


# --- results that were bent -----------------------------------------------------------------------


@pytest.fixture(scope="module")
def result(tmp_path_factory: pytest.TempPathFactory) -> Path:
    from charging.orbit_run import run_case
    from charging.results import write_results

    folder = tmp_path_factory.mktemp("hostile")
    write_results(run_case(load_case(case(folder))), folder / "out", plots=False)
    return folder / "out" / "result.nc"


def bent(result: Path, target: Path, **attributes: object) -> Path:
    target.write_bytes(result.read_bytes())
    with netCDF4.Dataset(str(target), "a") as dataset:
        for name, value in attributes.items():
            dataset.delncattr(name)
            if value is not None:
                dataset.setncattr(name, value)
    return target


@pytest.mark.parametrize(
    "attributes",
    [
        {"material_texts": "{"},
        {"material_texts": "[1]"},
        {"plasma_texts": '{"a": 1}'},
        {"limits": "nonsense"},
        {"file_texts": "[" * 100_000},
        {"case_text": None},
        {"case_text": 3.0},
        {"case_text": "title = 1"},
    ],
)
def test_a_result_with_bent_attributes_is_refused(
    result: Path, tmp_path: Path, attributes: dict[str, object]
) -> None:
    from charging.review.check import load_case_or_result

    path = bent(result, tmp_path / "x.nc", **attributes)
    with pytest.raises(InputError) as caught:
        load_case_or_result(path)
    assert str(path) in str(caught.value)


@pytest.mark.parametrize("share", [0.02, 0.3, 0.6, 0.9, 0.99])
def test_a_truncated_result_is_refused(result: Path, tmp_path: Path, share: float) -> None:
    data = result.read_bytes()
    (tmp_path / "x.nc").write_bytes(data[: int(share * len(data))])
    with pytest.raises(InputError, match="NetCDF"):
        read_result(tmp_path / "x.nc")


def test_a_result_of_an_older_version_says_what_it_lacks(result: Path, tmp_path: Path) -> None:
    import xarray as xr

    with xr.open_dataset(result) as dataset:
        dataset.load()
    older = dataset.drop_vars("barrier_height")
    older.attrs["halflit_version"] = "0.0.9"
    older.to_netcdf(tmp_path / "old.nc", engine="netcdf4")
    with pytest.raises(InputError, match=r"written by halflit 0\.0\.9") as caught:
        read_result(tmp_path / "old.nc")
    assert "barrier_height" in str(caught.value)
    assert "halflit run" in str(caught.value)


def test_values_of_a_bent_ephemeris_are_refused(tmp_path: Path) -> None:
    for number, (units, value) in enumerate(
        [("fortnights since 2031-03-20", 0.0), ("seconds since never", 0.0),
         ("seconds since 2031-03-20 00:00:00", np.inf), ("seconds since 2031-03-20", 1e30)]
    ):  # fmt: skip
        path = tmp_path / f"{number}.nc"
        with netCDF4.Dataset(str(path), "w") as dataset:
            dataset.setncatts({"frame": "GCRF", "center": "earth", "time_scale": "UTC"})
            dataset.createDimension("time", 4)
            dataset.createDimension("axis", 3)
            at = dataset.createVariable("time", "f8", ("time",))
            at.setncattr("units", units)
            at[:] = np.arange(4.0) + value
            place = dataset.createVariable("position", "f8", ("axis", "time"))
            place.setncattr("units", "km")
            place[:] = np.full((3, 4), 3e4)
        with pytest.raises(EnvironmentDataError):
            read_ephemeris_netcdf(path)
