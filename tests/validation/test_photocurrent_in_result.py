"""The photocurrent of a result file is the spectrum integral over the yield curve of its file."""

from __future__ import annotations

import json
import tomllib
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray as xr
from numpy.typing import NDArray
from scipy.constants import e

from charging.case import load_case
from charging.dataset import mode_dataset
from charging.orbit_run import CaseRun, run_case
from environments.spectrum import SolarSpectrum, solar_spectrum
from materials.library import library_text

Array = NDArray[np.float64]

CASE = """\
title = "A coated plate"
[orbit]
kind = "fixed"
illumination = 0.7
sun_direction = [0.6, 0.0, 0.8]
duration_h = 0.5
[time]
output_step_s = 30.0
[sun]
f107 = 180.0
f107_81day = 120.0
distance_au = 1.3
[plasma]
use = "ECSS geostationary worst case"
[body]
radius_m = 1.0
[[surface]]
name = "coated"
material = "coating.toml"
area_m2 = 0.02
normal = [0.0, 0.0, 1.0]
[[surface]]
name = "rest"
material = "oxidised aluminium"
area_m2 = 8.0
normal = [0.0, 0.0, -1.0]
"""


Curve = dict[str, Any]


def log_log(x: float, points: list[float], values: list[float]) -> float:
    """Log-log between the points, held outside."""
    if x <= points[0]:
        return values[0]
    if x >= points[-1]:
        return values[-1]
    k = next(i for i in range(len(points)) if points[i] <= x < points[i + 1])
    share = float(np.log(x / points[k]) / np.log(points[k + 1] / points[k]))
    return float(values[k] ** (1.0 - share) * values[k + 1] ** share)


def yield_at(curve: Curve, photon: float) -> float:
    """Electrons per photon: written again from the stated policy of a table."""
    assert curve.get("law", "table") == "table"
    assert curve.get("counts", "incident photons") == "incident photons"
    points, values = curve["photon_energy_eV"], curve["electrons_per_photon"]
    if photon <= points[0]:
        return 0.0
    if photon < points[1]:
        return float(values[1] * ((photon - points[0]) / (points[1] - points[0])) ** 2)
    if photon <= points[-1]:
        return log_log(photon, points[1:], values[1:])
    if curve.get("above_last_point", "hold") == "hold":
        return float(values[-1])
    # absorbed energy per length: Y ∝ E μ(E)
    sample = curve["x_ray"]["photon_energy_eV"], curve["x_ray"]["mass_absorption_m2_kg"]
    ratio = log_log(photon, *sample) / log_log(points[-1], *sample)
    return float(values[-1] * photon / points[-1] * ratio)


def saturation(text: str, spectrum: SolarSpectrum) -> float:
    """Charge times the sum of photons times yield [A m-2], normal incidence."""
    curve = tomllib.loads(text)["photoyield"]
    assert curve.get("largest_angle_growth", 1.0) == 1.0
    bins = zip(spectrum.photon_energy_eV.tolist(), spectrum.photon_flux_m2_s.tolist(), strict=True)
    return float(e) * sum(flux * yield_at(curve, photon) for photon, flux in bins)


def result_of(folder: Path, coating: str) -> xr.Dataset:
    """Run the case with a coating file and read its result.nc back."""
    folder.mkdir()
    (folder / "coating.toml").write_text(coating, encoding="utf-8")
    (folder / "case.toml").write_text(CASE, encoding="utf-8")
    run = run_case(load_case(folder / "case.toml"))
    mode_dataset(run, run.modes[0]).to_netcdf(folder / "result.nc", engine="netcdf4")
    with xr.open_dataset(folder / "result.nc", engine="netcdf4") as dataset:
        return dataset.load()


def photocurrent(dataset: xr.Dataset, surface: str) -> Array:
    names = dataset["mechanism_name"].values.tolist()
    row = names.index("photoemission")
    column = dataset["surface_name"].values.tolist().index(surface)
    return np.asarray(dataset["current_density"].values[row, column])


LIBRARY = library_text("oxidised aluminium")


def edited(factor: float) -> tuple[str, float]:
    """Library record with the yield next to Lyman-alpha changed; the energy of that point."""
    curve = tomllib.loads(LIBRARY)["photoyield"]
    k = int(np.argmin(np.abs(np.array(curve["photon_energy_eV"]) - 10.2)))
    old = curve["electrons_per_photon"][k]
    before, after = LIBRARY.split("electrons_per_photon = [", 1)
    inside, rest = after.split("]", 1)
    written = [part.strip() for part in inside.split(",") if part.strip()]
    assert float(written[k]) == old
    written[k] = repr(old * factor)
    text = f"{before}electrons_per_photon = [{', '.join(written)}]{rest}"
    return text, curve["photon_energy_eV"][k]


def test_editing_one_yield_point_changes_the_photocurrent_as_the_integral_says(
    tmp_path: Path,
) -> None:
    spectrum = solar_spectrum(f107=180.0, f107_81day=120.0, distance_au=1.3)
    changed, _ = edited(1.5)
    found = {}
    for name, text in (("library", LIBRARY), ("edited", changed)):
        dataset = result_of(tmp_path / name, text)
        column = dataset["surface_name"].values.tolist().index("coated")
        potential = dataset["potential"].values[column]
        light = dataset["illumination"].values * dataset["incidence_cosine"].values[column]
        assert light == pytest.approx(np.full(light.shape, 0.7 * 0.8), rel=1e-12)
        negative = potential < -0.1
        assert negative.sum() > 30
        assert potential.min() < -1000.0
        ours = photocurrent(dataset, "coated")[negative]
        exact = saturation(text, spectrum) * light[negative]
        worst = np.abs(ours / exact - 1.0).max()
        print(f"{name}: worst relative difference {worst:.1e}")
        assert worst < 1e-10
        found[name] = ours[-1]
        assert json.loads(dataset.attrs["material_texts"])["coating.toml"] == text
    assert found["edited"] / found["library"] > 1.02
    expected = saturation(changed, spectrum) / saturation(LIBRARY, spectrum)
    assert found["edited"] / found["library"] == pytest.approx(expected, rel=1e-10)


def test_photocurrent_of_every_surface_along_the_demo_day(
    demo_day: CaseRun, demo_folder: Path
) -> None:
    case = demo_day.loaded.case
    with xr.open_dataset(demo_folder / "result.nc", engine="netcdf4") as dataset:
        dataset.load()
    # the mode's spectrum at the Sun's distance at the middle of the day
    position = demo_day.modes[0].way.snapshot(np.array([43200.0]))
    assert position.position_m.shape == (3, 1)
    spectrum = solar_spectrum(
        f107=case.sun.f107,
        f107_81day=case.sun.f107_81day,
        distance_au=demo_day.modes[0].spectrum.distance_au,
    )
    light = dataset["illumination"].values * dataset["incidence_cosine"].values
    compared = 0
    for i, surface in enumerate(case.surface):
        text = demo_day.loaded.material_texts[surface.material]
        # nothing to climb: below the plasma and no barrier in front
        free = dataset["barrier_height"].values[i] == 0.0
        negative = (dataset["potential"].values[i] < -0.1) & (light[i] > 0.0) & free
        ours = photocurrent(dataset, surface.name)
        exact = saturation(text, spectrum) * light[i]
        assert ours[negative] == pytest.approx(exact[negative], rel=1e-10), surface.name
        assert (ours[light[i] == 0.0] == 0.0).all()
        # above the plasma some come back, never more than were emitted
        assert (ours <= exact * (1.0 + 1e-9) + 1e-30).all()
        compared += int(negative.sum())
    assert compared > 300


def test_spectrum_of_the_demo_day_is_at_the_distance_of_the_date(demo_day: CaseRun) -> None:
    # 2031-03-20: between perihelion 0.983 and aphelion 1.017, 0.996 AU
    assert demo_day.modes[0].spectrum.distance_au == pytest.approx(0.996, abs=1e-3)
    assert demo_day.modes[0].spectrum.f107_81day == demo_day.loaded.case.sun.f107_81day
