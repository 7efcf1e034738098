"""Photocurrents per second on one core, as a grid and one call at a time.

A point of the grid is one (material, angle, activity). Run:
``OMP_NUM_THREADS=1 python tests/benchmarks/photocurrent_rate.py``.
"""

from __future__ import annotations

import time

import numpy as np

from charging.currents.emission import photo_saturation_A_m2
from charging.photo_table import photocurrent_grid
from environments.spectrum import solar_spectrum
from materials import load_material, material_names


def main() -> None:
    """Print both rates and their ratio."""
    names = material_names()
    cosine, f107 = np.linspace(0.0, 1.0, 50), np.linspace(70.0, 250.0, 100)
    photocurrent_grid(names, incidence_cosine=cosine, f107=f107)  # tables load on first use
    began = time.perf_counter()
    repeats = 5
    for _ in range(repeats):
        grid = photocurrent_grid(names, incidence_cosine=cosine, f107=f107)
    many = repeats * grid.size / (time.perf_counter() - began)
    began = time.perf_counter()
    single = 200
    gold = load_material("gold")
    for k in range(single):
        photo_saturation_A_m2(gold, solar_spectrum(f107=float(f107[k % len(f107)])))
    one = single / (time.perf_counter() - began)
    print(f"grid of {grid.size}: {many:.3g} photocurrents per second")
    print(f"one call at a time: {one:.3g} per second; ratio {many / one:.3g}")


if __name__ == "__main__":
    main()
