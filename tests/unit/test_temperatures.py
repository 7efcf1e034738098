"""Temperatures of surfaces from a table of times."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from charging.case import load_case, load_case_text
from charging.dataset import mode_dataset
from charging.errors import InputError
from charging.orbit_run import run_case
from charging.review.check import load_case_or_result
from charging.surroundings import surroundings

CASE = """\
title = "Temperatures"
[orbit]
kind = "fixed"
illumination = 0.0
sun_direction = [0.0, 0.0, 1.0]
epoch = 2031-03-20T00:00:00Z
[time]
duration_h = 1.0
output_step_s = 60.0
[emission]
secondary_law = "sanders_inouye_1979"
[plasma]
use = "ECSS geostationary worst case"
[body]
radius_m = 1.0
[[surface]]
name = "ring"
material = "gold"
area_m2 = 1.0
normal = [0.0, 0.0, 1.0]
[[surface]]
name = "film"
material = "polyimide film"
area_m2 = 1.0
thickness_m = 5e-5
normal = [0.0, 0.0, -1.0]
temperature_K = "film.csv"
"""
ROWS = """\
# of a thermal model
time,K
2031-03-20T00:00:00Z,200
2031-03-20T00:10:30Z,320.5
2031-03-20T01:00:00Z,280
"""


def loaded(folder: Path, rows: str):  # type: ignore[no-untyped-def]
    (folder / "case.toml").write_text(CASE, encoding="utf-8")
    (folder / "film.csv").write_text(rows, encoding="utf-8")
    return load_case(folder / "case.toml")


@pytest.mark.parametrize(
    "rows", [ROWS, "K,time_h\n200,-0.0\n320.5,0.175\n280,1.0\n"], ids=["moments", "hours"]
)
def test_rows_are_met_and_linear_between(tmp_path: Path, rows: str) -> None:
    case = loaded(tmp_path, rows)
    around = surroundings(case.case, None, [], case.files)
    times = np.array([0.0, 315.0, 630.0, 2115.0, 3600.0])
    _, temperature = around.at(times)
    assert temperature[:, 1] == pytest.approx([200.0, 260.25, 320.5, 300.25, 280.0])
    assert temperature[:, 0] == pytest.approx(np.full(5, 298.15))


def test_the_film_conducts_by_the_table_and_the_result_reruns(tmp_path: Path) -> None:
    case = loaded(tmp_path, ROWS)
    run = run_case(case)
    (mode,) = run.modes
    dataset = mode_dataset(run, mode)
    assert dataset.surface_temperature[1].values.max() == pytest.approx(320.5, abs=3.0)
    # against the same film at the two constants that bracket the table
    ends = []
    for kelvin in ("200.0", "320.5"):
        constant = run_case(load_case_text(CASE.replace('"film.csv"', kelvin))).modes[0]
        ends.append(constant.net.potentials(constant.trajectories[0](np.array([3600.0])))[0])
    own = mode.net.potentials(mode.trajectories[0](np.array([3600.0])))[0]
    across = [abs(v[1] - v[0]) for v in (ends[0], own, ends[1])]
    assert across[0] > across[1] > across[2]
    dataset.to_netcdf(tmp_path / "result.nc")
    (tmp_path / "film.csv").unlink()
    again = load_case_or_result(tmp_path / "result.nc")
    assert again.files.texts == {"film.csv": ROWS}


@pytest.mark.parametrize(
    ("rows", "line", "words"),
    [
        ("time,degC\n2031-03-20T00:00:00Z,20\n", 1, "names the columns"),
        ("time,K\n2031-03-20T00:00:00,200\n", 2, "without Z"),
        ("time,K\n2031-03-20T00:00:00Z,nan\n", 2, "finite"),
        ("time,K\n2031-03-20T00:00:00Z,0\n", 2, "out of range"),
        (ROWS.replace(",280", ""), 5, "truncated"),
        (ROWS.replace("T01:00", "T00:10"), 5, "not after the one before"),
        ("time,K\n2031-03-20T00:00:00Z,200\n", 2, "fewer than two rows"),
    ],
)
def test_bad_tables(tmp_path: Path, rows: str, line: int, words: str) -> None:
    with pytest.raises(InputError, match=words) as caught:
        loaded(tmp_path, rows)
    assert caught.value.line == line
    assert str(caught.value.file).endswith("film.csv")


def test_a_table_that_ends_before_the_run_is_refused_at_its_key(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="does not cover") as caught:
        loaded(tmp_path, ROWS.replace("T01:00", "T00:59"))
    assert caught.value.line == 1 + CASE[: CASE.index("temperature_K")].count("\n")


def test_a_quoted_number_is_no_file() -> None:
    with pytest.raises(InputError, match="is a text"):
        load_case_text(CASE.replace('"film.csv"', '"290"'))
