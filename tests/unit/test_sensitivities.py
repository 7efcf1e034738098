"""Sensitivities along a run against finite differences of whole runs."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from charging.case import LoadedCase, load_case_text
from charging.network.march import Tolerance
from charging.orbit_run import ModeRun, solve_mode
from charging.sensitivities import (
    Parameter,
    film_thickness,
    material_value,
    photo_level,
    plasma_density,
    sensitivities,
)
from materials import load_material

CASE = """\
title = "Two films and a plate in half light"
[orbit]
kind = "fixed"
illumination = 0.4
sun_direction = [0.0, 0.0, 1.0]
duration_h = 0.5
[time]
start = "{start}"
[plasma]
use = "ECSS geostationary worst case"
[body]
radius_m = 1.2
[emission]
secondary_law = "lin_joy_2005"
[[surface]]
name = "panel"
material = "oxidised aluminium"
area_m2 = 3.0
normal = [0.0, 0.0, -1.0]
[[surface]]
name = "blanket"
material = "polyimide film"
area_m2 = 2.0
thickness_m = 5e-5
temperature_K = 300.0
normal = [0.0, 0.0, -1.0]
[[surface]]
name = "glass"
material = "cover glass"
area_m2 = 1.0
thickness_m = 1e-4
temperature_K = 320.0
normal = [0.0, 0.6, 0.8]
"""
FINE = Tolerance(absolute=1e-4, relative=1e-6)
PARAMETERS = [
    material_value("polyimide film", "bulk_resistivity_ohm_m"),
    material_value("cover glass", "secondary_yield_peak"),
    film_thickness("blanket"),
    photo_level("cover glass"),
]
TIMES = np.array([1e-3, 0.02, 1.0, 30.0, 200.0, 900.0, 1800.0])


@pytest.fixture(scope="module")
def loaded() -> LoadedCase:
    return load_case_text(CASE.format(start="uncharged"))


@pytest.fixture(scope="module")
def run(loaded: LoadedCase) -> ModeRun:
    return solve_mode(loaded, tolerance=FINE)


def by_whole_runs(loaded: LoadedCase, run: ModeRun, parameters: list[Parameter]) -> np.ndarray:
    """Central differences [P, T, n] of the node potentials of pairs of runs by ln p."""
    step = 2e-3
    members = [p.scaled(run.members[0], 1.0 + s * step) for p in parameters for s in (-1.0, 1.0)]
    paths = solve_mode(loaded, members=members, tolerance=FINE).trajectories
    return np.array(
        [
            run.net.potentials(high(TIMES) - low(TIMES)) / (2.0 * step)
            for low, high in zip(paths[0::2], paths[1::2], strict=True)
        ]
    )


def test_derivatives_against_differences_of_whole_runs(loaded: LoadedCase, run: ModeRun) -> None:
    ours = sensitivities(loaded, run, PARAMETERS)
    found = ours.potentials(TIMES)
    assert ours.names[2] == "blanket: thickness_m"
    differences = by_whole_runs(loaded, run, PARAMETERS)
    for p, parameter in enumerate(PARAMETERS):
        scale = np.abs(differences[p]).max()
        assert scale > 1.0, parameter.name  # it does matter
        error = np.abs(found[:, p] - differences[p]).max() / scale
        print(f"{parameter.name}: {scale:.3g} V, error {error:.1e}")
        assert error < 1e-3, parameter.name


@pytest.mark.slow
def test_from_an_equilibrium_start() -> None:
    loaded = load_case_text(CASE.format(start="equilibrium"))
    run = solve_mode(loaded, tolerance=FINE)
    parameter = plasma_density("ECSS geostationary worst case", electrons=True)
    found = sensitivities(loaded, run, [parameter]).potentials(TIMES)[:, 0]
    (differences,) = by_whole_runs(loaded, run, [parameter])
    assert np.abs(found - differences).max() < 1e-3 * np.abs(differences).max()


def test_a_parameter_of_something_else_is_refused(loaded: LoadedCase, run: ModeRun) -> None:
    with pytest.raises(ValueError, match='surface "panel" has no thickness_m'):
        sensitivities(loaded, run, [film_thickness("panel")])
    bare = replace(run.members[0], materials={"x": load_material("bare collector")})
    with pytest.raises(ValueError, match='material "x" has no photoyield'):
        photo_level("x").scaled(bare, 1.0)
