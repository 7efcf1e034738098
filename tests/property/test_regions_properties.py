"""Invariants of the plasma along a way, whatever the activity."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from environments import lunar_wake, magnetosheath, plasma_sheet, solar_wind, tail_lobe
from environments.activity import Activity
from environments.magnetosphere import MEAN_RADIUS_M
from environments.moon import MOON_RADIUS_M, moon_position_m
from environments.plasmasphere import cold_plasma
from environments.population_series import smoothstep
from environments.region_places import earth_shares
from environments.regions import REGIONS, RegionPlasma, plasma_along
from environments.species import ELECTRON
from environments.substorm import Substorm, substorm_strength
from environments.sun import ASTRONOMICAL_UNIT_M, sun_position_m
from environments.two_maxwellians import two_maxwellians

START = np.datetime64("2031-03-20T00:00", "ns")

activities = st.builds(
    lambda kp, f107, bz, density, speed: Activity(
        {"kp": kp, "f107": f107, "bz_nT": bz, "density_cm3": density, "speed_km_s": speed}
    ),
    st.floats(0.0, 9.0), st.floats(60.0, 300.0), st.floats(-30.0, 20.0), st.floats(0.5, 60.0),
    st.floats(250.0, 1200.0),
)  # fmt: skip


def somewhere(seed: int, count: int = 200) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    times = START + (rng.uniform(0, 365, count) * 86400e9).astype("timedelta64[ns]")
    way = rng.normal(size=(3, count))
    way /= np.linalg.norm(way, axis=0)
    radius = MEAN_RADIUS_M * np.exp(rng.uniform(np.log(1.05), np.log(70.0), count))
    return times, radius * way, sun_position_m(times)


def electrons(plasma: RegionPlasma) -> tuple[np.ndarray, np.ndarray]:
    mine = [p for p in plasma.populations if p.species == ELECTRON]
    density = np.sum([p.density_m3 for p in mine], axis=0)
    return density, np.sum([p.density_m3 * p.temperature_eV for p in mine], axis=0)


@settings(max_examples=30, deadline=None)
@given(activity=activities, seed=st.integers(0, 10_000))
def test_shares_add_to_one_and_moments_are_finite(activity: Activity, seed: int) -> None:
    times, place, sun = somewhere(seed)
    plasma = plasma_along(times, place, sun, activity)
    assert plasma.blend.sum(axis=0) == pytest.approx(np.ones(times.size), abs=1e-12)
    assert plasma.blend.min() >= -1e-15
    assert plasma.region.tolist() == plasma.blend.argmax(axis=0).tolist()
    density, pressure = electrons(plasma)
    assert density.min() > 0.0
    assert bool(np.isfinite(pressure).all())


@settings(max_examples=30, deadline=None)
@given(activity=activities, seed=st.integers(0, 10_000))
def test_blends_stay_between_their_parents(activity: Activity, seed: int) -> None:
    """Density and pressure of the electrons, from the regions' own models, above 2000 km."""
    times, place, sun = somewhere(seed)
    high = np.linalg.norm(place, axis=0) > 1.4 * MEAN_RADIUS_M
    times, place, sun = times[high], place[:, high], sun[:, high]
    now = activity.at(times)
    at = earth_shares(times, place, sun, now)
    wind = solar_wind.solar_wind(np.linalg.norm(sun - place, axis=0) / ASTRONOMICAL_UNIT_M, now)
    sheath = magnetosheath.magnetosheath(at.angle_rad, now)
    hot = plasma_sheet.plasma_sheet(
        at.local_time_h, at.radius_re, at.tailward, now.kp, now.f107
    )  # fmt: skip
    days = (times - times.astype("datetime64[Y]")).astype("timedelta64[s]").astype(float)
    cold = cold_plasma(
        at.l_shell, at.local_time_h, at.radius_re, days / 86400.0 + 1.0, now.kp_max_24h, now.f107
    )
    lobe = tail_lobe.lobe_plasma(at.radius_re)
    beside = np.maximum(cold.density_m3 - hot.electron_density_m3, 0.0)
    beside *= np.clip(1.0 - (at.l_shell - 8.0) / 2.0, 0.0, 1.0)
    wind_n = wind.core_density_m3 + wind.halo_density_m3
    wind_p = (
        wind.core_density_m3 * wind.core_temperature_eV
        + wind.halo_density_m3 * wind.halo_temperature_eV
    )
    lobe_p = lobe.lobe_density_m3 * lobe.electron_temperature_eV
    parents = [
        (at.solar_wind, wind_n, wind_p),
        (at.magnetosheath, sheath.electron_density_m3,
         sheath.electron_density_m3 * sheath.electron_temperature_eV),
        (at.lobe, lobe.lobe_density_m3, lobe_p),
        (at.polar_cap, lobe.lobe_density_m3 + lobe.cap_density_m3,
         lobe_p + lobe.cap_density_m3 * lobe.cap_temperature_eV),
        (at.plasma_sheet, hot.electron_density_m3 + beside,
         hot.electron_density_m3 * hot.electron_temperature_eV + beside * cold.temperature_eV),
        (at.cold_only, cold.density_m3, cold.density_m3 * cold.temperature_eV),
    ]  # fmt: skip
    density, pressure = electrons(plasma_along(times, place, sun, activity))
    for k, mixed in ((1, density), (2, pressure)):
        own = np.array([np.where(p[0] > 0.0, p[k], np.nan) for p in parents])
        assert bool(np.all(mixed >= np.nanmin(own, axis=0) * (1.0 - 1e-9)))
        assert bool(np.all(mixed <= np.nanmax(own, axis=0) * (1.0 + 1e-9)))


@settings(max_examples=30, deadline=None)
@given(
    L=st.floats(1.2, 9.9), t=st.floats(0.0, 24.0), kp=st.floats(0.0, 9.0), f107=st.floats(65, 250)
)
def test_cold_density_lies_between_plasmasphere_and_trough(
    L: float, t: float, kp: float, f107: float
) -> None:
    found = cold_plasma(*(np.array([x]) for x in (L, t, L, 80.0, kp, f107)))
    ends = sorted([found.plasmasphere_density_m3[0], found.trough_density_m3[0]])
    assert ends[0] * (1 - 1e-12) <= found.density_m3[0] <= ends[1] * (1 + 1e-12)
    assert 0.0 <= found.plasmasphere_share[0] <= 1.0
    assert 0.69 < found.temperature_eV[0] < 2.01


@settings(max_examples=20, deadline=None)
@given(seed=st.integers(0, 10_000), activity=activities)
def test_wake_lies_between_its_floor_and_the_stream(seed: int, activity: Activity) -> None:
    rng = np.random.default_rng(seed)
    count = 100
    way = rng.normal(size=(3, count))
    place = way / np.linalg.norm(way, axis=0) * MOON_RADIUS_M * rng.uniform(1.0, 12.0, count)
    stream = np.array([-450e3, 0.0, 0.0])[:, None] * np.ones(count)
    twelve, eight = np.full(count, 12.0), np.full(count, 8.0)
    wake = lunar_wake.lunar_wake(place, stream, twelve, eight)
    assert wake.share.min() >= 0.0
    assert wake.share.max() <= 1.0
    assert not wake.share[place[0] > 0.0].any()
    core, halo = np.full(count, 6e6), np.full(count, 0.3e6)
    ten, sixty = np.full(count, 10.0), np.full(count, 60.0)
    left = lunar_wake.filtered_electrons(core, ten, halo, sixty, 4.0, wake.density_factor)
    # as many electrons as ions are left; pressure between that of the stream and the centre's
    assert left[0] + left[1] == pytest.approx(wake.density_factor * 6.3e6, rel=1e-9)
    deepest = lunar_wake.filtered_electrons(core, ten, halo, sixty, 4.0, np.full(count, 0.01))
    pressures = [c * 10.0 + h * (60.0 + phi / 2.5) for c, h, phi in (left, deepest)]
    assert pressures[0].max() <= (6e6 * 10.0 + 0.3e6 * 60.0) * (1.0 + 1e-12)
    assert bool((pressures[0] >= pressures[1] * (1.0 - 1e-9)).all())
    times = START + (rng.uniform(0, 28, count) * 86400e9).astype("timedelta64[ns]")
    sun = sun_position_m(times) - moon_position_m(times)
    plasma = plasma_along(times, place, sun, activity, setting="moon")
    assert plasma.blend.sum(axis=0) == pytest.approx(np.ones(count), abs=1e-12)
    assert not plasma.blend[REGIONS.index("ionosphere")].any()


@settings(max_examples=50, deadline=None)
@given(
    minutes=st.floats(-1e3, 1e5), hour=st.floats(0, 24), rise=st.floats(0, 60),
    hold=st.floats(0, 200), decay=st.floats(1, 500),
)  # fmt: skip
def test_substorm_is_a_share(
    minutes: float, hour: float, rise: float, hold: float, decay: float
) -> None:
    one = Substorm(START, rise_min=rise, hold_min=hold, decay_min=decay)
    at = np.array([START + np.timedelta64(int(minutes * 60e9), "ns")])
    found = substorm_strength(one, at, np.array([hour]))[0]
    assert 0.0 <= found <= 1.0
    if minutes <= 0.0:
        assert found == 0.0


@settings(max_examples=100, deadline=None)
@given(
    n=st.lists(st.floats(1e3, 1e9), min_size=2, max_size=2),
    T=st.lists(st.floats(1.0, 1e5), min_size=2, max_size=2),
)
def test_two_maxwellians_keep_density_and_pressure(n: list[float], T: list[float]) -> None:
    mass = ELECTRON.mass_kg
    v = [np.sqrt(1.602176634e-19 * t / (2 * np.pi * mass)) for t in T]
    four = np.array([
        [sum(n)],
        [sum(a * b for a, b in zip(n, v, strict=True))],
        [sum(1.5 * a * t for a, t in zip(n, T, strict=True))],
        [sum(2 * a * t * b for a, t, b in zip(n, T, v, strict=True))],
    ])  # fmt: skip
    found = two_maxwellians(four, mass)
    density = found.cold_density_m3 + found.hot_density_m3
    pressure = (
        found.cold_density_m3 * found.cold_temperature_eV
        + found.hot_density_m3 * found.hot_temperature_eV
    )
    assert density[0] == pytest.approx(four[0, 0], rel=1e-9)
    assert pressure[0] == pytest.approx(four[2, 0] / 1.5, rel=1e-6)
    assert found.cold_density_m3[0] >= 0.0
    assert found.hot_density_m3[0] >= 0.0


@given(x=st.floats(-5, 5), low=st.floats(-2, 0), width=st.floats(0.01, 3))
def test_smoothstep_is_monotonic(x: float, low: float, width: float) -> None:
    here, there = smoothstep(np.array([x, x + 0.1]), low, low + width)
    assert 0.0 <= here <= there <= 1.0
