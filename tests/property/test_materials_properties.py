"""Properties that hold for every argument, not only the tried ones."""

from __future__ import annotations

import contextlib
import copy
import tomllib
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from materials import MaterialError, library_text, load_material, material_names, read_material
from materials.angle import exponential_angle_factor
from materials.conduction import adamec_calderwood_1981_factor, adamec_calderwood_1981_slope
from materials.photoemission import (
    GEOMETRIES,
    escape_fraction,
    escape_slope,
    yield_per_photon,
)
from materials.secondary import YIELD_LAWS, isotropic_yield, secondary_escape_fraction

energies = st.floats(0.0, 1e5)
potentials = st.floats(-2e5, 2e5)
bins = st.lists(st.tuples(st.floats(5.5, 400.0), st.floats(1e-6, 1e6)), min_size=1, max_size=12)


@given(energy=energies, peak=st.floats(0.1, 10.0), at=st.floats(50.0, 2000.0), z=st.floats(4, 100))
def test_isotropic_yield_lies_between_one_and_two_times_the_peak(
    energy: float, peak: float, at: float, z: float
) -> None:
    for law in YIELD_LAWS:
        delta = float(
            isotropic_yield(
                energy, law=law, peak_yield=peak, peak_energy_eV=at, mean_atomic_number=z
            )
        )
        assert 0.0 <= delta <= 2.0 * peak


@given(emitted=bins, pair=st.tuples(potentials, potentials))
def test_escape_falls_with_potential_and_point_source_lets_more_out(
    emitted: list[tuple[float, float]], pair: tuple[float, float]
) -> None:
    photons, weights = np.array(emitted).T
    low, high = sorted(pair)
    curves = []
    for geometry in GEOMETRIES:
        r_low, r_high = escape_fraction([low, high], photons, weights, 5.0, geometry=geometry)
        assert -1e-15 <= r_high <= r_low + 1e-12 <= 1.0 + 2e-12
        assert float(escape_slope(high, photons, weights, 5.0, geometry=geometry)) <= 0.0
        curves.append(r_high)
    assert curves[0] <= curves[1] + 1e-12


@given(emitted=bins, v=st.floats(0.0, 50.0), scale=st.floats(1e-9, 1e20))
def test_escape_does_not_depend_on_the_unit_of_the_weights(
    emitted: list[tuple[float, float]], v: float, scale: float
) -> None:
    photons, weights = np.array(emitted).T
    one = float(escape_fraction(v, photons, weights, 5.0))
    assert float(escape_fraction(v, photons, scale * weights, 5.0)) == pytest.approx(
        one, rel=1e-9, abs=1e-15
    )


@given(name=st.sampled_from(material_names()), energy=st.floats(0.0, 1e4))
def test_yield_is_continuous_and_never_negative(name: str, energy: float) -> None:
    curve = load_material(name).photoyield
    if curve is None:
        return
    here, beside = yield_per_photon([energy, energy * (1.0 + 1e-9)], curve)
    assert here >= 0.0
    assert abs(beside - here) <= 1e-6 * curve.electrons_per_photon.max()


@given(v=potentials, w=st.floats(1.0, 10.0))
def test_secondary_escape_is_a_share(v: float, w: float) -> None:
    for fraction in (
        secondary_escape_fraction(v, kind="conductor", work_function_eV=w),
        secondary_escape_fraction(v, kind="dielectric", secondary_energy_eV=w),
    ):
        assert 0.0 <= float(fraction) <= 1.0
        assert v > 0.0 or float(fraction) == 1.0


@given(c=st.floats(0.0, 50.0), step=st.floats(0.0, 1.0))
def test_angle_factor_grows_with_its_coefficient(c: float, step: float) -> None:
    a, b = exponential_angle_factor([c, c + step])
    assert 1.0 <= a <= b * (1.0 + 1e-13)


@given(
    field=st.floats(-1e9, 1e9),
    temperature=st.floats(50.0, 500.0),
    permittivity=st.floats(1.0, 20.0),
)
def test_field_only_helps_conduction_and_stays_finite(
    field: float, temperature: float, permittivity: float
) -> None:
    factor = float(adamec_calderwood_1981_factor(field, temperature, permittivity))
    slope = float(adamec_calderwood_1981_slope(field, temperature, permittivity))
    assert np.isfinite(factor)
    assert factor >= 1.0
    assert np.isfinite(slope)
    assert slope * field >= 0.0


def paths(entry: Any, path: tuple[Any, ...] = ()) -> list[tuple[Any, ...]]:
    """Return the path of every entry below `entry`."""
    if isinstance(entry, dict):
        inner = list(entry.items())
    elif isinstance(entry, list):
        inner = list(enumerate(entry))
    else:
        return [path]
    return ([path] if path else []) + [p for key, item in inner for p in paths(item, (*path, key))]


RECORDS = {name: tomllib.loads(library_text(name)) for name in ("gold", "PTFE", "bare collector")}
PATHS = [(name, path) for name, record in RECORDS.items() for path in paths(record)]
junk = st.one_of(
    st.none(),
    st.booleans(),
    st.integers(),
    st.floats(),
    st.text(max_size=8),
    st.binary(max_size=4),
    st.lists(st.floats(), max_size=3),
    st.dictionaries(st.text(max_size=4), st.integers(), max_size=2),
)


@given(where=st.sampled_from(PATHS), entry=junk, remove=st.booleans())
def test_reader_raises_nothing_but_its_own_error(where: Any, entry: Any, remove: bool) -> None:
    name, path = where
    document: Any = copy.deepcopy(RECORDS[name])
    table = document
    for part in path[:-1]:
        table = table[part]
    if remove:
        del table[path[-1]]
    else:
        table[path[-1]] = entry
    with contextlib.suppress(MaterialError):
        assert read_material(document).name
