"""Regions along a way: activity, shares, cautions, substorms."""

from __future__ import annotations

from pathlib import Path
from time import perf_counter

import numpy as np
import pytest

from environments.activity import QUANTITIES, Activity, read_activity
from environments.coefficients import Coefficient
from environments.errors import EnvironmentDataError
from environments.magnetosphere import MEAN_RADIUS_M
from environments.moon import MOON_RADIUS_M, moon_position_m
from environments.population_series import PopulationSeries
from environments.regions import REGIONS, RegionPlasma, plasma_along
from environments.species import ELECTRON
from environments.substorm import Substorm, substorm_strength
from environments.sun import ASTRONOMICAL_UNIT_M, sun_position_m

START = np.datetime64("2031-03-20T00:00", "ns")


def stamps(count: int, minutes: float = 10.0) -> np.ndarray:
    return START + (np.arange(count) * minutes * 60e9).astype("timedelta64[ns]")


def along_ray(sun_axis: float, distance_re: np.ndarray, **activity: float) -> RegionPlasma:
    """Places on the line to the Sun (sun_axis 1) or from it (-1)."""
    times = np.full(distance_re.shape, START + np.timedelta64(12, "h"))
    sun = sun_position_m(times)
    toward = sun_axis * sun / np.linalg.norm(sun, axis=0)
    return plasma_along(times, distance_re * MEAN_RADIUS_M * toward, sun, Activity(activity))


def names(plasma: RegionPlasma) -> list[str]:
    flags = [REGIONS[k] for k in plasma.region]
    return [name for k, name in enumerate(flags) if k == 0 or flags[k - 1] != name]


def electron_density(plasma: RegionPlasma) -> np.ndarray:
    found = [p.density_m3 for p in plasma.populations if p.species == ELECTRON]
    return np.sum(found, axis=0)


def test_regions_on_the_way_to_the_sun_in_their_order() -> None:
    plasma = along_ray(1.0, np.linspace(2.0, 40.0, 2000), kp=2.0)
    assert names(plasma) == [
        "plasmasphere", "plasma trough", "plasma sheet", "magnetosheath", "solar wind",
    ]  # fmt: skip
    assert plasma.blend.sum(axis=0) == pytest.approx(np.ones(2000), abs=1e-12)
    assert plasma.blend.min() >= 0.0


def test_tail_has_a_sheet_and_lobes() -> None:
    times = np.full(200, START + np.timedelta64(12, "h"))
    sun = sun_position_m(times)
    away = -sun / np.linalg.norm(sun, axis=0)
    north = np.array([0.0, 0.0, 1.0])[:, None]
    place = MEAN_RADIUS_M * (25.0 * away + np.linspace(-15.0, 15.0, 200) * north)
    found = names(plasma_along(times, place, sun))
    assert found == ["lobe", "plasma sheet", "lobe"]


@pytest.mark.parametrize(
    ("inside", "outside"),
    [("plasma sheet", "magnetosheath"), ("magnetosheath", "solar wind"),
     ("plasmasphere", "plasma trough")],
)  # fmt: skip
def test_density_changes_across_a_boundary(inside: str, outside: str) -> None:
    plasma = along_ray(1.0, np.linspace(2.0, 40.0, 4000), kp=2.0)
    density = electron_density(plasma)
    flags = plasma.region
    last = np.flatnonzero(flags == REGIONS.index(inside))[-1]
    first = np.flatnonzero(flags == REGIONS.index(outside))[0]
    assert first == last + 1
    ratio = density[first + 120] / density[last - 120]
    assert abs(np.log(ratio)) > np.log(1.5)


def test_moments_do_not_jump() -> None:
    """Density and pressure change by little from one of many close places to the next."""
    r = np.linspace(2.3, 40.0, 100_000)
    plasma = along_ray(1.0, r, kp=3.0)
    density = electron_density(plasma)
    pressure = np.sum([p.density_m3 * p.temperature_eV for p in plasma.populations], axis=0)
    assert np.abs(np.diff(np.log(density))).max() < 0.02
    assert np.abs(np.diff(np.log(pressure))).max() < 0.05  # hot plasma sets in from nothing


def test_one_place_alone_equals_itself_among_others() -> None:
    r = np.linspace(3.0, 30.0, 40)
    many = along_ray(-1.0, r)
    by_label = {p.label: p for p in many.populations}
    for k in (3, 17, 39):
        for p in along_ray(-1.0, r[k : k + 1]).populations:
            assert p.density_m3[0] == by_label[p.label].density_m3[k]
            assert p.temperature_eV[0] == by_label[p.label].temperature_eV[k]


def test_wind_blows_from_the_sun_with_the_earths_motion() -> None:
    plasma = along_ray(1.0, np.array([220.0]))
    wind = next(p for p in plasma.populations if p.label == "solar wind protons")
    assert wind.velocity_m_s is not None
    speed = np.linalg.norm(wind.velocity_m_s)
    assert speed == pytest.approx(np.hypot(440e3, 29.8e3), rel=1e-6)


def test_heliocentric_setting_needs_no_sun() -> None:
    r = np.array([0.2, 1.0, 12.0]) * ASTRONOMICAL_UNIT_M
    plasma = plasma_along(stamps(3), np.stack((r, 0 * r, 0 * r)), None, setting="sun")
    assert len([c for c in plasma.cautions if "extrapolated" in c]) == 2
    assert plasma.region.tolist() == [REGIONS.index("solar wind")] * 3


def test_moon_day_and_night() -> None:
    times = np.array(["2031-03-23T00:00"], "datetime64[ns]")  # new Moon: in the solar wind
    sun = sun_position_m(times) - moon_position_m(times)
    up = sun / np.linalg.norm(sun, axis=0)
    day = plasma_along(times, MOON_RADIUS_M * up, sun, setting="moon")
    night = plasma_along(times, -MOON_RADIUS_M * up, sun, setting="moon")
    assert [REGIONS[x.region[0]] for x in (day, night)] == ["solar wind", "lunar wake"]
    assert electron_density(night)[0] == pytest.approx(0.01 * electron_density(day)[0], rel=0.01)


def test_moon_in_the_tail_has_no_wake() -> None:
    times = stamps(28 * 8, 180.0)
    sun = sun_position_m(times) - moon_position_m(times)
    night = -MOON_RADIUS_M * sun / np.linalg.norm(sun, axis=0)
    plasma = plasma_along(times, night, sun, setting="moon")
    inside = plasma.blend[[REGIONS.index(n) for n in ("lobe", "plasma sheet")]].sum(axis=0)
    wake = plasma.blend[REGIONS.index("lunar wake")]
    assert bool((inside > 0.99).any())
    assert wake[inside > 0.99].max() < 0.01
    assert any("shields" in c for c in plasma.cautions)


@pytest.mark.parametrize(
    ("activity", "word"),
    [({"kp": 9.0}, "plasmapause"), ({"kp": 0.0}, "plasma sheet: Kp outside"),
     ({"bz_nT": -30.0}, "magnetopause: bz_nT"), ({"pressure_nPa": 80.0}, "pressure_nPa")],
)  # fmt: skip
def test_outside_of_the_fit_it_is_said(activity: dict[str, float], word: str) -> None:
    quiet = along_ray(1.0, np.linspace(2.3, 12.0, 300), kp=2.0)
    assert not any(word in c for c in quiet.cautions)
    loud = along_ray(1.0, np.linspace(2.3, 12.0, 300), **activity)
    assert any(word in c for c in loud.cautions)


def test_shares_of_bases_add_to_one_and_name_what_is_assumed() -> None:
    plasma = along_ray(-1.0, np.linspace(2.5, 20.0, 100))
    assert sum(plasma.bases.values()) == pytest.approx(1.0)
    assert 0.3 < plasma.bases["assumed"] < 0.95
    assert any("assumed" in c for c in plasma.cautions)


def test_defaults_that_nobody_gave_are_said() -> None:
    said = along_ray(1.0, np.array([6.6, 9.0]), kp=4.0, f107=100.0).cautions
    assert "bz_nT 0, density_cm3 6.5, speed_km_s 440" in next(c for c in said if "defaults" in c)
    given = {name: q.default for name, q in QUANTITIES.items() if q.default is not None}
    assert not any("default" in c for c in along_ray(1.0, np.array([6.6]), **given).cautions)


@pytest.mark.slow
def test_a_year_of_minutes_in_seconds() -> None:
    times = START + np.arange(525_600) * np.timedelta64(60, "s")
    sun = sun_position_m(times)
    angle = np.linspace(0.0, 366.0 * 2.0 * np.pi, times.size)
    place = 4.2164e7 * np.stack((np.cos(angle), np.sin(angle), 0.0 * angle))
    begin = perf_counter()
    plasma_along(times, place, sun)
    assert perf_counter() - begin < 15.0  # 2.3 s alone on one core


def test_unknown_setting_and_place_within_the_earth() -> None:
    times, place = stamps(1), np.array([[7e6], [0.0], [0.0]])
    with pytest.raises(EnvironmentDataError, match="setting"):
        plasma_along(times, place, place, setting="mars")  # type: ignore[arg-type]
    with pytest.raises(EnvironmentDataError, match="inside of the Earth"):
        plasma_along(times, 0.5 * place, 1e4 * place)
    with pytest.raises(EnvironmentDataError, match="inside of the Moon"):
        plasma_along(times, 0.1 * place, 1e4 * place, setting="moon")
    with pytest.raises(ValueError, match="same number"):
        plasma_along(stamps(2), place, place)


def test_low_polar_orbit_meets_ionosphere_oval_and_cap() -> None:
    times = stamps(102, 1.0)
    angle = 2.0 * np.pi * np.arange(102) / 102.0
    place = 7.2e6 * np.stack((np.cos(angle), 0.0 * angle, np.sin(angle)))
    plasma = plasma_along(times, place, sun_position_m(times), Activity({"kp": 3.0}))
    assert set(names(plasma)) == {"ionosphere", "auroral oval", "polar cap"}
    assert plasma.blend.sum(axis=0) == pytest.approx(np.ones(102), abs=1e-12)
    hot = next(p for p in plasma.populations if p.label == "auroral electrons").density_m3
    oval = plasma.blend[REGIONS.index("auroral oval")]
    assert bool(((hot > 0.0) == (oval > 0.0)).all())
    assert any("ionosphere" in c for c in plasma.cautions)
    assert not any(p.label.startswith("cold") for p in plasma.populations)


def test_radial_way_out_of_the_ionosphere_has_no_gap() -> None:
    altitude = np.linspace(600e3, 3000e3, 2000)
    plasma = along_ray(1.0, 1.0 + altitude / MEAN_RADIUS_M)
    assert names(plasma) == ["ionosphere", "plasmasphere"]
    density = electron_density(plasma)
    assert np.abs(np.diff(np.log(density))).max() < 0.02
    assert density.min() > 1e9  # a quiet plasmasphere at L 1.5 holds thousands a cm3


def test_substorm_history_and_drift() -> None:
    one = Substorm(START, rise_min=10.0, hold_min=40.0, decay_min=90.0)
    at = stamps(19, 10.0)
    midnight = substorm_strength(one, at, np.zeros(19))
    assert midnight[:6] == pytest.approx([0.0, 1.0, 1.0, 1.0, 1.0, 1.0])
    assert midnight[14] == pytest.approx(np.exp(-1.0))  # 90 min after the hold
    assert substorm_strength(one, at, np.full(19, 12.0))[3] == 0.0
    # 18 keV electrons drift 3.78 h of local time an hour: at 06 h after an hour and more
    dawn = substorm_strength(one, at, np.full(19, 6.0))
    assert dawn[1] < 0.05
    assert dawn[12] == pytest.approx(midnight[12])


def test_substorm_mixes_its_plasma_into_the_sheet() -> None:
    # geostationary midnight is opposite to the Sun
    times = stamps(7)
    sun = sun_position_m(times)
    place = -4.2164e7 * sun / np.linalg.norm(sun, axis=0)
    quiet = plasma_along(times, place, sun, Activity({"kp": 3.0}))
    storm = Activity({"kp": 3.0}, substorms=(Substorm(START),))
    loud = plasma_along(times, place, sun, storm)
    label = "plasma sheet electrons"
    base = next(p for p in quiet.populations if p.label == label).density_m3
    left = next(p for p in loud.populations if p.label == label).density_m3
    new = next(p for p in loud.populations if p.label == "substorm electrons").density_m3
    assert left[0] == base[0]
    assert new[0] == 0.0
    assert new[1:6] == pytest.approx(np.full(5, 1.12e6), rel=1e-6)
    assert left[1:6] == pytest.approx(np.zeros(5), abs=1.0)


@pytest.mark.parametrize(
    "wrong",
    [{"decay_min": 0.0}, {"rise_min": -1.0}, {"ion_temperature_eV": np.nan},
     {"local_time_h": 25.0}],
)  # fmt: skip
def test_substorm_refuses(wrong: dict[str, float]) -> None:
    with pytest.raises(EnvironmentDataError, match=next(iter(wrong))):
        Substorm(START, **wrong)


def test_activity_file(tmp_path: Path) -> None:
    file = tmp_path / "activity.csv"
    file.write_text(
        "time,kp,bz_nT\n2031-03-19T00:00:00Z,6,0\n2031-03-19T03:00:00Z,3.333,-4\n"
        "2031-03-20T06:00:00Z,1,4\n",
        encoding="utf-8",
    )
    activity = read_activity(file, {"f107": 70.0})
    now = activity.at(np.array(["2031-03-19T01:30", "2031-03-20T02:59", "2031-03-20T06:00"],
                               "datetime64[ns]"))  # fmt: skip
    assert now.kp.tolist() == [6.0, 3.333, 1.0]
    # 6 held until 03:00, which lies within 24 h before 02:59 of the next day
    assert now.kp_max_24h.tolist() == [6.0, 6.0, 3.333]
    assert now.bz_nT[0] == pytest.approx(-2.0)
    assert now.f107.tolist() == [70.0] * 3
    assert set(activity.assumed()) == set(QUANTITIES) - {"kp", "bz_nT", "f107"}
    with pytest.raises(EnvironmentDataError, match="does not cover"):
        activity.at(np.array(["2031-03-18"], "datetime64[ns]"))


def test_largest_kp_of_a_day_against_a_plain_loop() -> None:
    rng = np.random.default_rng(7)
    rows = START + np.sort(rng.choice(20_000, 300, replace=False)) * np.timedelta64(60, "s")
    kp = rng.uniform(0.0, 9.0, 300)
    asked = rows[0] + rng.integers(0, int((rows[-1] - rows[0]).astype(np.int64)), 200).astype(
        "timedelta64[ns]"
    )
    found = Activity({}, rows, {"kp": kp}).at(asked).kp_max_24h
    for when, value in zip(asked, found, strict=True):
        holds = np.flatnonzero(rows <= when - np.timedelta64(1, "D"))
        first = holds[-1] if holds.size else 0
        last = np.flatnonzero(rows <= when)[-1]
        assert value == kp[first : last + 1].max()


REFUSED = {
    "unknown column": ("time,kpp\n2031-03-19T00:00:00Z,6\n", 1, 'nearest: "kp"'),
    "out of range": ("time,kp\n2031-03-19T00:00:00Z,9.7\n", 2, "kp = 9.7"),
    "nan": ("time,kp\n2031-03-19T00:00:00Z,nan\n", 2, "finite"),
    "no Z": ("time,kp\n2031-03-19T00:00:00,6\n", 2, "without Z"),
    "unordered": ("time,kp\n2031-03-19T00:00:00Z,6\n2031-03-19T00:00:00Z,6\n", 3, "not after"),
    "first column": ("kp,time\n6,2031-03-19T00:00:00Z\n", 1, "begin with the column time"),
}


@pytest.mark.parametrize("name", REFUSED)
def test_activity_refused_with_the_line(name: str, tmp_path: Path) -> None:
    text, line, word = REFUSED[name]
    file = tmp_path / "activity.csv"
    file.write_text(text, encoding="utf-8")
    with pytest.raises(EnvironmentDataError, match=word) as caught:
        read_activity(file)
    assert caught.value.line == line


def test_activity_constants_are_checked() -> None:
    with pytest.raises(EnvironmentDataError, match=r"kp = 9\.5"):
        Activity({"kp": 9.5})
    with pytest.raises(EnvironmentDataError, match="kp"):
        Activity({"kp": float("nan")})
    with pytest.raises(EnvironmentDataError, match="no quantity"):
        Activity({"kq": 1.0})


def test_series_and_coefficients_refuse_nonsense() -> None:
    one = np.ones(2)
    with pytest.raises(EnvironmentDataError, match="negative"):
        PopulationSeries(ELECTRON, "maxwellian", None, -one, one, None, "x", "y", "assumed")
    with pytest.raises(EnvironmentDataError, match="not > 0"):
        PopulationSeries(ELECTRON, "maxwellian", None, one, 0 * one, None, "x", "y", "assumed")
    with pytest.raises(EnvironmentDataError, match="kappa"):
        PopulationSeries(ELECTRON, "kappa", None, one, one, None, "x", "y", "assumed")
    with pytest.raises(EnvironmentDataError, match="basis"):
        Coefficient("a", (1.0,), "1", "guess", "x")
