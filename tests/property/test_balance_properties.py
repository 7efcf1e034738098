"""Floating potentials of one surface: none missed, none invented, double roots, no root."""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise
from types import SimpleNamespace

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray
from scipy.constants import e, m_e, m_p
from scipy.optimize import brentq

from charging.currents import balance
from charging.currents.balance import SEARCH_V, FloatingPotentials, floating_potentials
from charging.currents.emission import SECONDARY_LAWS
from charging.currents.surface import Setting, SurfaceModel, surface_currents, surface_model
from charging.errors import InputError, NoSolutionError
from environments.catalogue import load_plasma
from environments.plasma import ELECTRON, HYDROGEN_ION, Plasma, Population
from environments.spectrum import solar_spectrum
from materials import load_material

Array = NDArray[np.float64]
POINTS = 100_001

temperatures = st.floats(0.0, 4.7).map(lambda x: 10.0**x)
densities = st.floats(4.5, 7.5).map(lambda x: 10.0**x)


@st.composite
def plasmas(draw: st.DrawFn) -> Plasma:
    rows = [
        Population(ELECTRON, "maxwellian", draw(densities), draw(temperatures)),
        Population(HYDROGEN_ION, "maxwellian", draw(densities), draw(temperatures)),
    ]
    if draw(st.booleans()):
        rows.append(Population(ELECTRON, "maxwellian", draw(densities), draw(temperatures)))
    return Plasma("drawn", "drawn", "a test", "assumed", None, "", tuple(rows))


def scan(model: SurfaceModel, light: float) -> tuple[Array, Array]:
    """Net current on 1e5 points uniform in asinh, in pieces, by the kernel itself."""
    grid = np.sinh(np.linspace(-1.0, 1.0, POINTS) * np.arcsinh(SEARCH_V))
    parts = []
    for piece in np.array_split(grid, 10):
        n = len(piece)
        setting = Setting(np.ones((n, 1)), np.full((n, 1), light))
        parts.append(surface_currents(model, piece[:, None], setting).by_mechanism.sum(axis=-1))
    return grid, np.concatenate(parts)[:, 0]


@settings(max_examples=25, deadline=None, derandomize=True, suppress_health_check=list(HealthCheck))
@given(
    plasma=plasmas(),
    material=st.sampled_from(
        ["gold", "polyimide film", "cover glass, MgF2-coated", "oxidised aluminium", "ITO coating"]
    ),
    law=st.sampled_from(SECONDARY_LAWS),
    collection=st.sampled_from(["auto", "sphere", "cylinder", "plane"]),
    light=st.sampled_from([0.0, 0.0, 0.003, 0.1, 1.0]),
)
def test_roots_are_the_sign_changes_of_a_finer_scan(
    plasma: Plasma, material: str, law: str, collection: str, light: float
) -> None:
    model = surface_model(
        [load_material(material)],
        [plasma],
        solar_spectrum(),
        law=law,  # type: ignore[arg-type]
        radius_m=3.0,
        collection=collection,
    )
    grid, values = scan(model, light)
    crossings = np.flatnonzero(values[:-1] * values[1:] < 0.0)
    try:
        found = floating_potentials(model, light)
    except NoSolutionError:
        assert crossings.size == 0 or driven_away(grid, values, crossings)
        return
    potentials = np.array([root.potential_V for root in found.roots])
    assert (np.diff(potentials) > 0.0).all()
    # none missed: every sign change of the scan holds a root
    for k in crossings:
        inside = (potentials >= grid[k]) & (potentials <= grid[k + 1])
        assert inside.sum() == 1, (grid[k], potentials)
        (root,) = (r for r, here in zip(found.roots, inside, strict=True) if here)
        assert root.stable == (values[k] > 0.0)
    # none invented: the current passes zero there to 1 mV or 1e-6, or only touches it
    for v in potentials:
        step = max(1e-3, 1e-6 * abs(v))
        near = np.array([[v - step], [v + step]])
        setting = Setting(np.ones((2, 1)), np.full((2, 1), light))
        ends = surface_currents(model, near, setting).by_mechanism.sum(axis=-1)[:, 0]
        touches = np.abs(ends).max() < 1e-6 * np.abs(values).max()
        assert ends[0] * ends[1] < 0.0 or touches
    stable = [root.potential_V for root in found.roots if root.stable]
    assert found.reached_V in stable


def driven_away(grid: Array, values: Array, crossings: NDArray[np.intp]) -> bool:
    """Whether the current at 0 V drives towards a side without a sign change."""
    at_zero = float(np.interp(0.0, grid, values))
    side = grid[crossings] > 0.0 if at_zero > 0.0 else grid[crossings + 1] < 0.0
    return not bool(side.any())


@pytest.mark.parametrize("name", ["quiet geostationary", "ECSS geostationary worst case"])
def test_bare_sphere_against_its_closed_form(name: str) -> None:
    plasma = load_plasma(name)

    def net(v: float) -> float:
        total = 0.0
        for p in plasma.populations:
            mass = m_e if p.species.charge_number < 0 else m_p
            thermal = e * p.density_m3 * np.sqrt(e * p.temperature_eV / (2.0 * np.pi * mass))
            pull = -p.species.charge_number * v / p.temperature_eV
            total += p.species.charge_number * thermal * (1.0 + pull if pull > 0 else np.exp(pull))
        return float(total)

    model = surface_model(
        [load_material("bare collector")],
        [plasma],
        solar_spectrum(),
        law="sanders_inouye_1979",
        radius_m=1.0,
        collection="sphere",
    )
    exact = brentq(net, -SEARCH_V, 0.0, xtol=1e-9)
    (root,) = floating_potentials(model, 0.0).roots
    assert root.stable
    assert root.potential_V == pytest.approx(exact, rel=1e-9)


CLOSED = [("sphere", 1.0, -2.504), ("sphere", 15.995, -3.612), ("plane", 1.0, -3.758),
          ("cylinder", 1.0, -2.956)]  # fmt: skip


@pytest.mark.parametrize(("collection", "mass_u", "expected"), CLOSED)
def test_floating_potential_of_equal_temperatures(
    collection: str, mass_u: float, expected: float
) -> None:
    """Roots of exp(v) = sqrt(m_e/m_i) G(-v): known multiples of kT_e, here to 0.001."""
    from environments.plasma import SPECIES

    ion = HYDROGEN_ION if mass_u == 1.0 else SPECIES["O+"]
    rows = (
        Population(ELECTRON, "maxwellian", 1e6, 100.0),
        Population(ion, "maxwellian", 1e6, 100.0),
    )
    model = surface_model(
        [load_material("bare collector")],
        [Plasma("equal", "equal", "a test", "assumed", None, "", rows)],
        solar_spectrum(),
        law="sanders_inouye_1979",
        radius_m=1.0,
        collection=collection,
    )
    (root,) = floating_potentials(model, 0.0).roots
    assert root.potential_V / 100.0 == pytest.approx(expected, abs=1e-3)


# --- synthetic currents -------------------------------------------------------------------


def solve(monkeypatch: pytest.MonkeyPatch, current: Callable[[Array], Array]) -> FloatingPotentials:
    def net(_: object, potential: Array, __: float) -> tuple[Array, Array]:
        # slope by central differences: the search needs its sign and its root
        h = 1e-7 * (1.0 + np.abs(potential))
        return current(potential), (current(potential + h) - current(potential - h)) / (2.0 * h)

    monkeypatch.setattr(balance, "net_current", net)
    monkeypatch.setattr(balance, "gross_current", lambda *_: 1.0)
    model = SimpleNamespace(electron_spectra=(), ion_spectra=(), escape_breaks_V=())
    return floating_potentials(model, 0.0)  # type: ignore[arg-type]


@pytest.mark.parametrize("touch", [-12345.678, -150.03, -0.7, 3.3, 77.7, 1234.5])
def test_double_root_is_found_and_not_stable(monkeypatch: pytest.MonkeyPatch, touch: float) -> None:
    """J = (x - a)² (b - x), x = asinh(v): touches zero at a, crosses at b only."""
    cross = -20000.0 if touch > 0.0 else 20000.0
    a, b = np.arcsinh(touch), np.arcsinh(cross)
    found = solve(monkeypatch, lambda v: (np.arcsinh(v) - a) ** 2 * (b - np.arcsinh(v)))
    by_place = sorted(found.roots, key=lambda root: abs(root.potential_V - touch))
    assert by_place[0].potential_V == pytest.approx(touch, abs=1e-3, rel=1e-6)
    assert not by_place[0].stable
    assert by_place[-1].potential_V == pytest.approx(cross, rel=1e-6)
    assert by_place[-1].stable
    assert len(found.roots) == 2


@pytest.mark.parametrize("gap", [1e-3, 1e-4, 1e-5])
@pytest.mark.parametrize("place", [-5000.0, -31.4, 8.0])
def test_close_pair_between_scan_points_is_split(
    monkeypatch: pytest.MonkeyPatch, place: float, gap: float
) -> None:
    """Two roots a relative `gap` apart, far closer than the scan, and one elsewhere."""
    left, right = np.arcsinh(place * (1.0 + gap)), np.arcsinh(place)
    other = np.arcsinh(20000.0 if place < 0.0 else -20000.0)
    found = solve(
        monkeypatch,
        lambda v: (np.arcsinh(v) - left) * (np.arcsinh(v) - right) * (other - np.arcsinh(v)),
    )
    near = [r for r in found.roots if abs(r.potential_V - place) < 0.01 * abs(place)]
    assert len(near) == 2
    assert {r.stable for r in near} == {True, False}
    assert sorted(r.potential_V for r in near) == pytest.approx(
        sorted((place, place * (1.0 + gap))), rel=1e-9
    )


def test_roots_ascend_and_alternate(monkeypatch: pytest.MonkeyPatch) -> None:
    places = np.arcsinh(np.array([-40000.0, -900.0, -3.0, 5.0, 60.0]))

    def current(v: Array) -> Array:
        x = np.arcsinh(v)
        return -np.prod([x - p for p in places], axis=0)

    found = solve(monkeypatch, current)
    assert [r.potential_V for r in found.roots] == pytest.approx([-40000, -900, -3, 5, 60])
    assert [r.stable for r in found.roots] == [True, False, True, False, True]
    # from 0 V the current is negative between -3 and 5: down to -3
    assert found.reached_V == pytest.approx(-3.0)
    for one, other in pairwise(found.roots):
        assert one.potential_V < other.potential_V


def test_surface_at_rest_stays(monkeypatch: pytest.MonkeyPatch) -> None:
    found = solve(monkeypatch, lambda v: -v)
    assert [r.potential_V for r in found.roots] == [0.0]
    assert found.reached_V == 0.0


@pytest.mark.parametrize("sign", [-1.0, 1.0])
def test_no_sign_change_is_an_error(monkeypatch: pytest.MonkeyPatch, sign: float) -> None:
    with pytest.raises(NoSolutionError, match="±200 kV"):
        solve(monkeypatch, lambda v: sign * (1.0 + 0.0 * v))


def test_near_miss_is_no_root(monkeypatch: pytest.MonkeyPatch) -> None:
    with pytest.raises(NoSolutionError):
        solve(monkeypatch, lambda v: (np.arcsinh(v) - 3.0) ** 2 + 1e-4)


@pytest.mark.parametrize("sign", [-1.0, 1.0])
def test_root_on_the_wrong_side_is_not_reached(
    monkeypatch: pytest.MonkeyPatch, sign: float
) -> None:
    """The only root is unstable and behind: an uncharged surface runs away from it."""
    with pytest.raises(NoSolutionError, match="driven away"):
        solve(monkeypatch, lambda v: sign * (100.0 + sign * v))


def test_plasma_without_ions_is_refused() -> None:
    """Nothing would stop the electrons: there is no floating potential to look for."""
    rows = (
        Population(ELECTRON, "maxwellian", 1e6, 20.0),
        Population(HYDROGEN_ION, "maxwellian", 0.0, 20.0),
    )
    with pytest.raises(InputError, match="ions"):
        surface_model(
            [load_material("bare collector")],
            [Plasma("electrons", "electrons", "a test", "assumed", None, "", rows)],
            solar_spectrum(),
            law="sanders_inouye_1979",
            radius_m=1.0,
        )
