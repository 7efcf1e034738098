"""Plasma files with spectra of their own, as a user's file and as the text a result keeps."""

from __future__ import annotations

from pathlib import Path

import pytest

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
