"""Timelines of measured plasma: what is read, and what is refused with its line."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from scipy.constants import e, m_e

from environments.distributions import Maxwellian
from environments.errors import EnvironmentDataError
from environments.plasma_timeline import read_plasma_timeline
from environments.regions import REGIONS
from environments.two_maxwellians import spectrum_moments, two_maxwellians

HEAD = "# source = electrostatic analyser of the mission\n"
NAMES = "time,electron_density_cm3,electron_temperature_keV,H+_density_cm3,H+_temperature_eV\n"
ROWS = (
    "2031-03-20T00:00:00Z,1.0,2.0,1.0,8000\n"
    "2031-03-20T00:10:00Z,3.0,4.0,0.5,9000\n"
    "2031-03-20T00:20:00Z,0.0,4.0,0.5,9000\n"
)


def write(path: Path, text: str) -> Path:
    file = path / "timeline.csv"
    file.write_text(text, encoding="utf-8")
    return file


def test_moments_are_read_and_mixed_by_density_and_pressure(tmp_path: Path) -> None:
    timeline = read_plasma_timeline(write(tmp_path, HEAD + NAMES + ROWS))
    at = np.datetime64("2031-03-20T00:05:00", "ns") + np.arange(2) * np.timedelta64(600, "s")
    electrons, protons = timeline.at(at)
    assert electrons.density_m3 == pytest.approx([2e6, 1.5e6], rel=1e-12)
    # half of 1 cm-3 at 2 keV and 3 cm-3 at 4 keV: 3.5 keV; beside the empty row 4 keV
    assert electrons.temperature_eV == pytest.approx([3500.0, 4000.0], rel=1e-12)
    assert protons.species.name == "H+"
    assert timeline.basis == "measured"
    plasma = timeline.along(at)
    assert [REGIONS[k] for k in plasma.region] == ["as measured"] * 2
    assert plasma.bases == {"measured": 1.0}


def test_kappa_of_a_population(tmp_path: Path) -> None:
    text = HEAD + "# kappa = electron 4.5\n" + NAMES + ROWS
    electrons, protons = read_plasma_timeline(write(tmp_path, text)).populations
    assert (electrons.law, electrons.kappa, protons.law) == ("kappa", 4.5, "maxwellian")


def test_times_outside_of_the_rows_are_refused(tmp_path: Path) -> None:
    timeline = read_plasma_timeline(write(tmp_path, HEAD + NAMES + ROWS))
    with pytest.raises(EnvironmentDataError, match="does not cover"):
        timeline.at(np.array(["2031-03-20T00:20:01"], "datetime64[ns]"))


ZERO = "2031-03-20T00:00:00Z,1.0,2.0,1.0,8000\n"
REFUSED = {
    "nan": (HEAD + NAMES + ZERO + "2031-03-20T00:10:00Z,nan,2,1,8000\n", 4, "nan"),
    "empty cell": (HEAD + NAMES + ZERO + "2031-03-20T00:10:00Z,,2,1,8000\n", 4, "finite"),
    "infinite": (HEAD + NAMES + ZERO + "2031-03-20T00:10:00Z,1e999,2,1,8000\n", 4, "finite"),
    "negative density": (HEAD + NAMES + ZERO + "2031-03-20T00:10:00Z,-1,2,1,8000\n", 4,
                         "electron_density_cm3 = -1"),
    "temperature zero": (HEAD + NAMES + ZERO + "2031-03-20T00:10:00Z,1,0,1,8000\n", 4,
                         "electron_temperature_keV = 0"),
    "misspelt column": (HEAD + NAMES.replace("electron_density", "electon_density") + ROWS, 2,
                        'nearest: "electron_density_cm3"'),
    "unknown species": (HEAD + NAMES.replace("H+_", "Xe+_") + ROWS, 2, "Xe\\+_density_cm3"),
    "density without temperature": (
        HEAD + "time,electron_density_cm3\n2031-03-20T00:00:00Z,1\n", 2, "temperature are due"),
    "no time column": (HEAD + NAMES.replace("time", "epoch") + ROWS, 2, "must be time"),
    "no Z": (HEAD + NAMES + ZERO + "2031-03-20T00:10:00,1,2,1,8000\n", 4, "without Z"),
    "unordered": (HEAD + NAMES + ZERO + "2031-03-19T23:59:00Z,1,2,1,8000\n", 4, "not after"),
    "repeated": (HEAD + NAMES + ZERO + ZERO, 4, "not after"),
    "gap": (HEAD + NAMES + ZERO + "2031-03-20T01:00:00Z,1,2,1,8000\n", 4, "gap of 60 min"),
    "row cut": (HEAD + NAMES + ZERO + "2031-03-20T00:10:00Z,1,2\n", 4, "truncated"),
    "one row": (HEAD + NAMES + ZERO, 3, "two"),
    "no source": (NAMES + ROWS, 1, "source"),
    "basis": (HEAD + "# basis = mesured\n" + NAMES + ROWS, 2, 'nearest: "measured"'),
    "kappa of nobody": (HEAD + "# kappa = O+ 4\n" + NAMES + ROWS, 2, "no column"),
    "falling channels": (
        HEAD + "time,electron_100_eV,electron_50_eV,electron_200_eV\n"
        "2031-03-20T00:00:00Z,1,1,1\n", 2, "rising"),
    "negative flux": (
        HEAD + "time,electron_100_eV,electron_200_eV,electron_400_eV\n"
        "2031-03-20T00:00:00Z,1,-1,1\n2031-03-20T00:05:00Z,1,1,1\n", 3, "electron_200_eV = -1"),
}  # fmt: skip


@pytest.mark.parametrize("name", REFUSED)
def test_refused_with_the_line(name: str, tmp_path: Path) -> None:
    text, line, word = REFUSED[name]
    with pytest.raises(EnvironmentDataError, match=word) as caught:
        read_plasma_timeline(write(tmp_path, text))
    assert caught.value.line == line
    assert str(caught.value).startswith(f"{tmp_path / 'timeline.csv'}:{line}: ")


def test_a_declared_gap_is_bridged_and_said(tmp_path: Path) -> None:
    rows = ZERO + "2031-03-20T01:00:00Z,1,2,1,8000\n"
    gap = "# gap = 2031-03-20T00:00:00Z to 2031-03-20T01:00:00Z\n"
    timeline = read_plasma_timeline(write(tmp_path, HEAD + gap + NAMES + rows))
    assert "60 min without data" in timeline.cautions[0]
    longer = HEAD + "# longest_gap_min = 60\n" + NAMES + rows
    assert read_plasma_timeline(write(tmp_path, longer)).cautions == ()
    other = HEAD + gap.replace("T00:00", "T00:01") + NAMES + rows
    with pytest.raises(EnvironmentDataError, match="gap of 60 min"):
        read_plasma_timeline(write(tmp_path, other))


def test_moments_of_a_spectrum_meet_the_closed_forms() -> None:
    """Maxwellian: n, n sqrt(eT/2 pi m), 3/2 nT, 2T times the flux (kinetic theory)."""
    energy = np.geomspace(1.0, 2e5, 600)
    flux = Maxwellian(1.3e6, 2500.0).flux(energy, m_e)
    found = spectrum_moments(energy, flux[None, :], m_e)[:, 0]
    one_sided = 1.3e6 * np.sqrt(e * 2500.0 / (2 * np.pi * m_e))
    expected = [1.3e6, one_sided, 1.5 * 1.3e6 * 2500.0, 5000.0 * one_sided]
    assert found == pytest.approx(expected, rel=3e-4)


def test_spectra_become_two_maxwellians(tmp_path: Path) -> None:
    energy = np.round(np.geomspace(5.0, 2e5, 150), 3)
    two = [(0.6e6, 500.0), (0.3e6, 9000.0)]
    flux = sum(Maxwellian(n, T).flux(energy, m_e) for n, T in two) / 1e4
    columns = ",".join(f"electron_{E}_eV" for E in energy)
    row = ",".join(f"{j:.8e}" for j in flux)
    text = f"{HEAD}time,{columns}\n2031-03-20T00:00:00Z,{row}\n2031-03-20T00:05:00Z,{row}\n"
    timeline = read_plasma_timeline(write(tmp_path, text))
    found = [(float(p.density_m3[0]), float(p.temperature_eV[0])) for p in timeline.populations]
    for got, expected in zip(found, two, strict=True):
        assert got == pytest.approx(expected, rel=0.02)
    assert [p.label for p in timeline.populations] == ["electron, colder", "electron, hotter"]


def test_a_beam_stays_one_population_and_is_said(tmp_path: Path) -> None:
    columns = "time,electron_900_eV,electron_1000_eV,electron_1100_eV"
    row = "1e4,1e8,1e4"
    text = f"{HEAD}{columns}\n2031-03-20T00:00:00Z,{row}\n2031-03-20T00:05:00Z,{row}\n"
    timeline = read_plasma_timeline(write(tmp_path, text))
    cold, hot = timeline.populations
    assert not cold.density_m3.any()
    # mean energy of a 1 keV beam: T is two thirds of it
    assert hot.temperature_eV == pytest.approx(1000.0 / 1.5, rel=0.02)
    assert "narrower than a Maxwellian" in timeline.cautions[0]


def test_no_particles_no_populations() -> None:
    found = two_maxwellians(np.zeros((4, 2)), m_e)
    assert not found.hot_density_m3.any()
    assert bool((found.hot_temperature_eV > 0.0).all())
