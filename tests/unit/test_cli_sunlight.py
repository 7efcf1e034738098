"""Commands photoyield and spectrum: what they print, draw and refuse."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path

import pytest


def halflit(*words: str, code: int = 0) -> tuple[str, str]:
    done = subprocess.run(
        [sys.executable, "-m", "charging", *words], capture_output=True, text=True, check=False
    )
    assert done.returncode == code, done.stderr
    return done.stdout, done.stderr


def test_photoyield_side_by_side() -> None:
    out, _ = halflit("photoyield", "gold", "PTFE", "bare collector")
    assert "share of the current, %" in out
    assert "escaping at V, %" in out
    line = next(row for row in out.splitlines() if row.startswith("Lyman-alpha"))
    gold, polymer = (float(word) for word in line.split()[1:])
    assert 40.0 < gold < 70.0
    assert polymer == 0.0
    assert "calibration" in out


def test_photoyield_json_holds_the_contract_and_more() -> None:
    out, _ = halflit(
        "photoyield", "gold", "bare collector", "--json", "--plasma", "quiet geostationary",
        "--surface-state", "aged", "--photo-escape", "auto", "--radius-m", "2",
    )  # fmt: skip
    gold, bare = json.loads(out)
    contract = {
        "material", "threshold_eV", "threshold_nm", "saturation_current_A_m2",
        "potential_at_1_percent_V", "potential_at_0p1_percent_V", "mean_energy_eV",
        "upper_photon_energy_eV",
    }  # fmt: skip
    assert contract <= set(gold)
    assert gold["level"] == "largest of laboratory curves"
    assert 0.0 < gold["point_source_share"] < 1.0
    assert len(gold["bands"]) == 7
    curve = gold["retarding_curve"]["current_A_m2"]
    assert curve == sorted(curve, reverse=True)
    assert gold["floating_potential_V"] > 0.0 > bare["floating_potential_V"]
    assert bare["threshold_eV"] is None
    assert bare["retarding_curve"] is None


def test_photoyield_picture(tmp_path: Path) -> None:
    target = tmp_path / "two.png"
    _, err = halflit("photoyield", "gold", "PTFE", "--plot", str(target))
    assert target.stat().st_size > 20_000
    assert "wrote" in err


def test_spectrum_above_a_threshold(tmp_path: Path) -> None:
    target = tmp_path / "sun.svg"
    out, _ = halflit("spectrum", "--above", "10.4", "--above", "4.8", "--plot", str(target))
    assert "photons above 10.4 eV: 1.0" in out
    assert "photons above 4.8 eV" in out
    assert target.exists()
    found = json.loads(halflit("spectrum", "--json", "--above", "4.8", "--f107-81day", "120")[0])
    assert found["photons_above"][0]["photon_energy_eV"] == 4.8
    assert found["photons_above"][0]["photon_flux_m2_s"] > 1e18
    assert found["f107_81day"] == 120.0


@pytest.mark.parametrize(
    ("words", "part"),
    [
        (("photoyield", "PTFE", "--surface-state", "air-exposed"), "--surface-state"),
        (("photoyield", "gold", "--photo-escape", "box"), "--photo-escape"),
        (("photoyield", "gold", "--plasma", "no such plasma"), "no such plasma"),
        (("spectrum", "--above", "0"), "--above"),
        (("spectrum", "--f107-81day", "3"), "--f107-81day"),
        (("photoyield", "gold", "--plot", "x.gif"), "--plot"),
    ],
)
def test_refusals_name_the_option(words: tuple[str, ...], part: str) -> None:
    out, err = halflit(*words, code=2)
    assert not out
    assert part in err
    assert "Traceback" not in err
