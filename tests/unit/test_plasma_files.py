"""Plasma files with spectra of their own, as a user's file and as the text a result keeps."""

from __future__ import annotations

from pathlib import Path

import pytest

from charging.arguments import as_plasma
from charging.case import load_case
from charging.case_library import Sources, find_plasma
from charging.errors import InputError
from charging.point import floating_point
from environments.distributions import Tabulated

TEXT = """title = "measured"
source = "a test"

[[population]]
species = "electron"
law = "tabulated"
spectrum_file = "spectrum.csv"   # beside this file

[[population]]
species = "electron"
law = "fontheim"
pitch_angle = "isotropic"
power_coefficient_m2_s_sr_eV = 1e11
power_exponent = 1.1
maxwellian_coefficient_m2_s_sr_eV = 1e8
maxwellian_energy = "3 keV"
gaussian_coefficient_m2_s_sr_eV = 1e9
gaussian_energy = "10 keV"
gaussian_width = "3 keV"
low_cutoff = "50 eV"
high_cutoff = "40 keV"

[[population]]
species = "O+"
density = "100 cm-3"
temperature_eV = 0.2
"""


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    (tmp_path / "arc.toml").write_text(TEXT)
    rows = "\n".join(f"{energy},{1e9 / energy}" for energy in (10.0, 100.0, 1e3, 1e4))
    (tmp_path / "spectrum.csv").write_text(f"energy_eV,flux_m2_s_sr_eV\n{rows}\n")
    return tmp_path


def test_kept_text_stands_alone(folder: Path) -> None:
    plasma, text = find_plasma("arc.toml", Sources(folder / "case.toml"))
    assert isinstance(plasma.populations[0].distribution, Tabulated)
    assert plasma.populations[1].law == "fontheim"
    assert "spectrum_file" not in text
    kept = Sources(None, plasma_texts={"arc.toml": text})
    assert find_plasma("arc.toml", kept)[0] == plasma


def test_point_reads_such_a_file(folder: Path) -> None:
    found = floating_point("polyimide film", str(folder / "arc.toml"))
    assert found.reached_V < 0.0
    assert any("below the first channel" in note for note in found.notes) is False


def test_missing_spectrum_names_file_and_line(folder: Path) -> None:
    (folder / "spectrum.csv").unlink()
    with pytest.raises(InputError) as caught:
        find_plasma("arc.toml", Sources(folder / "case.toml"))
    assert caught.value.line == 7
    assert "no such file" in str(caught.value)


ALONE = """title = "electrons alone"
source = "a test"

[[population]]
species = "electron"
density = "1 cm-3"
temperature = "1 keV"
"""
NEGATIVE = """
[[population]]
mass_u = 16.0
charge_number = -1
density = "1 cm-3"
temperature = "1 keV"
"""
CASE = """title = "dark"
[orbit]
kind = "fixed"
illumination = 0.0
sun_direction = [1.0, 0.0, 0.0]
duration_h = 0.1
[plasma]
use = "alone.toml"
[body]
radius_m = 1.0
[[surface]]
name = "face"
material = "gold"
area_m2 = 1.0
normal = [0.0, 0.0, 1.0]
"""


def test_electrons_alone_are_refused_with_file_and_line_and_can_still_be_looked_at(
    tmp_path: Path,
) -> None:
    file = tmp_path / "alone.toml"
    file.write_text(ALONE)
    (tmp_path / "case.toml").write_text(CASE)
    refused = (
        lambda: load_case(tmp_path / "case.toml"),
        lambda: floating_point("gold", str(file)),
    )
    for ask in refused:
        with pytest.raises(InputError, match="holds no positive ions") as caught:
            ask()
        assert caught.value.line == 4
        assert "alone.toml" in str(caught.value)
    assert as_plasma(str(file)).populations[0].temperature_eV == 1e3


def test_negative_ions_are_refused_when_they_are_read(tmp_path: Path) -> None:
    file = tmp_path / "negative.toml"
    file.write_text(ALONE + NEGATIVE)
    with pytest.raises(InputError, match="negative ions, which are not modelled") as caught:
        as_plasma(str(file))
    assert caught.value.line == 11
    assert "charge_number = -1" in str(caught.value)
    assert "negative.toml" in str(caught.value)
