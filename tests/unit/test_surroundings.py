"""What surrounds the spacecraft: light on its faces, temperatures, plasma events, times."""

from __future__ import annotations

from datetime import UTC, datetime

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.integrate import solve_ivp

from charging.case import LoadedCase, load_case_text
from charging.flight import Path, eclipses_of, path, sun_distance_au
from charging.orbit_run import CaseRun
from charging.surroundings import (
    Episode,
    Surroundings,
    event_strength,
    output_times,
    surroundings,
)
from environments.eclipse import Eclipse

Array = NDArray[np.float64]

FACES = {
    "nadir": "normal = [0.0, 0.0, 1.0]",
    "anti-nadir": "normal = [0.0, 0.0, -2.0]",
    "forward": "normal = [1.0, 0.0, 0.0]",
    "backward": "normal = [-1.0, 0.0, 0.0]",
    "south": "normal = [0.0, 1.0, 0.0]",
    "north": "normal = [0.0, -1.0, 0.0]",
    "wing front": 'tracks_sun = true\nside = "front"',
    "wing back": 'tracks_sun = true\nside = "back"',
}


def geo_case(epoch: str = "2031-03-20T00:00:00Z", hours: float = 24.0, step: float = 60.0,
             extra: str = "", temperature: str = "") -> LoadedCase:  # fmt: skip
    text = f"""\
title = "Geometry"
[orbit]
kind = "kepler"
epoch = {epoch}
semi_major_axis_km = 42164.17
eccentricity = 0.0
inclination_deg = 0.0
raan_deg = 0.0
argument_of_perigee_deg = 0.0
mean_anomaly_deg = 0.0
[time]
duration_h = {hours}
output_step_s = {step}
[plasma]
use = "quiet geostationary"
{extra}
[body]
radius_m = 1.0
"""
    for name, way in FACES.items():
        text += f'[[surface]]\nname = "{name}"\nmaterial = "gold"\narea_m2 = 1.0\n{way}\n'
        text += f"{temperature}\n" if name == "wing front" else ""
    return load_case_text(text)


def local_time_h(way: Path, time: Array) -> Array:
    """Local solar time [h] from positions alone: angle from the anti-sun direction, eastward."""
    shot = way.snapshot(time)
    place = np.arctan2(shot.position_m[1], shot.position_m[0])
    sun = np.arctan2(shot.sun_direction[1], shot.sun_direction[0])
    return np.asarray(np.degrees(place - sun) / 15.0 % 24.0 + 12.0) % 24.0


@pytest.mark.parametrize(
    ("hour", "lit", "dark"),
    [
        (0.0, ("nadir", "wing front"), ("anti-nadir", "wing back")),
        (12.0, ("anti-nadir", "wing front"), ("nadir", "wing back")),
        # at 6 h local the satellite moves towards the Sun, at 18 h away from it
        (6.0, ("forward", "wing front"), ("backward", "wing back")),
        (18.0, ("backward", "wing front"), ("forward", "wing back")),
    ],
)
def test_faces_see_the_sun_at_their_hour(
    hour: float, lit: tuple[str, ...], dark: tuple[str, ...]
) -> None:
    way = path(geo_case().case)
    time = np.arange(0.0, 86400.0, 60.0)
    away = np.abs((local_time_h(way, time) - hour + 12.0) % 24.0 - 12.0)
    cosine = way.snapshot(time[[int(np.argmin(away))]]).incidence_cosine[:, 0]
    names = list(FACES)
    for name in lit:
        assert cosine[names.index(name)] > 0.99, name
    for name in dark:
        assert cosine[names.index(name)] == 0.0, name
    for name in ("north", "south"):  # equinox: the Sun in the equator
        assert cosine[names.index(name)] < 0.01


@pytest.mark.parametrize(
    ("epoch", "lit", "dark"),
    [("2031-06-21T00:00:00Z", "north", "south"), ("2031-12-21T00:00:00Z", "south", "north")],
)
def test_north_is_minus_y_and_lit_in_northern_summer(epoch: str, lit: str, dark: str) -> None:
    way = path(geo_case(epoch).case)
    cosine = way.snapshot(np.linspace(0.0, 86400.0, 97)).incidence_cosine
    names = list(FACES)
    tilt = np.sin(np.radians(23.44))
    assert cosine[names.index(lit)] == pytest.approx(np.full(97, tilt), abs=2e-3)
    assert (cosine[names.index(dark)] == 0.0).all()
    # a wing that turns about y only keeps the tilt
    assert cosine[names.index("wing front")] == pytest.approx(
        np.full(97, np.sqrt(1.0 - tilt**2)), abs=2e-3
    )


def test_interpolated_light_is_the_geometry(demo_day: CaseRun) -> None:
    mode = demo_day.modes[0]
    random = np.random.default_rng(3).uniform(0.0, 86400.0, 2000)
    contacts = [t for t in vars_of(mode.around.eclipses[0]) if t is not None]
    time = np.sort(np.concatenate([random, *(t + np.linspace(-90.0, 90.0, 181) for t in contacts)]))
    setting, _ = mode.around.at(time)
    shot = mode.way.snapshot(time)
    exact = (shot.illumination * shot.incidence_cosine).T
    assert np.abs(setting.light - exact).max() < 2e-5
    assert setting.light.min() >= 0.0
    assert setting.light.max() <= 1.0


def vars_of(eclipse: Eclipse) -> list[float | None]:
    return [eclipse.penumbra_start, eclipse.umbra_start, eclipse.umbra_end, eclipse.penumbra_end]


# --- plasma events ------------------------------------------------------------------------


def test_event_rises_linearly_holds_and_decays() -> None:
    event = Episode(1000.0, 600.0, 1800.0, 900.0, 1)
    time = np.array([0.0, 999.9, 1000.0, 1150.0, 1600.0, 3400.0, 3400.0 + 900.0, 3400.0 + 2700.0])
    expected = [0.0, 0.0, 0.0, 0.25, 1.0, 1.0, np.exp(-1.0), np.exp(-3.0)]
    assert event_strength(time, event) == pytest.approx(expected, abs=1e-12)


def test_event_without_rise_starts_at_once() -> None:
    event = Episode(10.0, 0.0, 5.0, 1.0, 1)
    assert event_strength(np.array([9.999, 10.0, 15.0]), event).tolist() == [0.0, 1.0, 1.0]


def test_shares_add_to_one_and_a_later_event_acts_on_what_it_finds() -> None:
    around = Surroundings(
        knots_s=np.array([0.0, 1e4]),
        table=np.zeros((2, 3)),
        episodes=(Episode(0.0, 100.0, 900.0, 500.0, 1), Episode(1250.0, 500.0, 10.0, 1e3, 2)),
        plasma_count=3,
        breaks_s=(),
        eclipses=(),
    )
    time = np.linspace(0.0, 1e4, 501)
    share = around.strength(time)
    assert share.sum(axis=-1) == pytest.approx(np.ones(501), abs=1e-14)
    assert share.min() >= 0.0
    one = around.strength(np.array([1500.0]))[0]
    first, second = np.exp(-1.0), 0.5  # 500 s after the hold; half way up
    assert one == pytest.approx([(1 - first) * (1 - second), first * (1 - second), second])


def test_onset_before_the_start_counts() -> None:
    extra = """\
[[plasma.event]]
onset = 2031-03-19T23:00:00Z
rise_min = 30.0
hold_min = 60.0
decay_min = 30.0
use = "substorm, 3 keV class"
"""
    case = geo_case(extra=extra).case
    assert case.event_onset_s == (-3600.0,)
    around = surroundings(case, None, [Episode(-3600.0, 1800.0, 3600.0, 1800.0, 1)])
    share = around.strength(np.array([0.0, 1800.0, 3600.0]))[:, 1]
    assert share == pytest.approx([1.0, 1.0, np.exp(-1.0)])


# --- temperature --------------------------------------------------------------------------


def test_temperature_relaxes_between_sunlit_and_eclipse() -> None:
    """dT/dt = (T_target - T)/τ with the target linear in the illumination."""
    pair = "temperature_K = {sunlit_K = 330.0, eclipse_K = 180.0, time_constant_min = 15.0}"
    case = geo_case(temperature=pair).case
    around = surroundings(case, None, [])
    way = path(case)
    column = list(FACES).index("wing front")
    eclipse = around.eclipses[0]
    assert eclipse.penumbra_start is not None
    begin = eclipse.penumbra_start - 1800.0
    times = begin + np.linspace(0.0, 5.0 * 3600.0, 301)

    def rate(t: float, temperature: Array) -> Array:
        light = way.snapshot(np.array([t])).illumination[0]
        return (180.0 + light * 150.0 - temperature) / 900.0

    exact = solve_ivp(rate, (times[0], times[-1]), [330.0], t_eval=times, rtol=1e-8, max_step=30.0)
    _, temperature = around.at(times)
    assert temperature[:, column] == pytest.approx(exact.y[0], abs=0.2)
    assert temperature[:, column].min() < 185.0
    # the others have none: the reference of the resistivities
    assert (np.delete(temperature, column, axis=1) == 298.15).all()


def test_constant_temperature_stays() -> None:
    around = surroundings(geo_case(temperature="temperature_K = 251.5").case, None, [])
    _, temperature = around.at(np.linspace(0.0, 86400.0, 50))
    assert (temperature[:, list(FACES).index("wing front")] == 251.5).all()


# --- times --------------------------------------------------------------------------------


@pytest.mark.parametrize(("hours", "step"), [(24.0, 60.0), (13.01, 700.0), (1.0, 5000.0)])
def test_output_grid_holds_every_step_and_the_end(hours: float, step: float) -> None:
    case = geo_case(hours=hours, step=step).case
    around = surroundings(case, None, [])
    times = output_times(case, around)
    grid = np.append(np.arange(0.0, hours * 3600.0, step), hours * 3600.0)
    assert np.isin(grid, times).all()
    assert (np.diff(times) > 0.0).all()
    assert times[0] == 0.0
    assert times[-1] == hours * 3600.0


def test_output_is_refined_to_a_second_around_contacts() -> None:
    case = geo_case(step=300.0).case
    around = surroundings(case, None, [])
    (eclipse,) = around.eclipses
    times = output_times(case, around)
    for contact in vars_of(eclipse):
        assert contact is not None
        near = times[np.abs(times - contact) <= 30.0]
        assert np.diff(near).max() <= 1.0
        assert np.abs(times - contact).min() <= 0.5
    far = times[(times > 3600.0) & (times < 20000.0)]
    assert np.diff(far).min() == 300.0


def test_edges_are_breaks(demo_day: CaseRun) -> None:
    around = demo_day.modes[0].around
    breaks = np.array(around.breaks_s)
    (eclipse,) = around.eclipses
    for contact in vars_of(eclipse):
        assert contact in around.breaks_s
    onset = (datetime(2031, 3, 20, 11, 45, tzinfo=UTC)
             - datetime(2031, 3, 20, tzinfo=UTC)).total_seconds()  # fmt: skip
    event = demo_day.loaded.case.plasma.event[0]
    rise_end = onset + 60.0 * event.rise_min
    for edge in (onset, rise_end, rise_end + 60.0 * event.hold_min):
        assert np.abs(breaks - edge).min() < 1e-6
    assert (np.diff(breaks) > 0.0).all()
    assert breaks[0] > 0.0
    assert breaks[-1] < 86400.0
    # terminators: each body-fixed face with the Sun in its plane twice a day
    shot = demo_day.modes[0].way.snapshot(breaks)
    faces = [s.name for s in demo_day.loaded.case.surface]
    for name in ("east blanket", "nadir panel", "launch ring"):
        crossing = np.abs(shot.signed_cosine[faces.index(name)]) < 1e-4
        assert crossing.sum() == 2, name


def test_illumination_vanishes_between_the_umbral_contacts(demo_day: CaseRun) -> None:
    mode = demo_day.modes[0]
    (eclipse,) = mode.around.eclipses
    assert eclipse.umbra_start is not None
    assert eclipse.umbra_end is not None
    assert eclipse.penumbra_start is not None
    assert eclipse.penumbra_end is not None
    inside = np.linspace(eclipse.umbra_start + 0.5, eclipse.umbra_end - 0.5, 50)
    assert (mode.way.snapshot(inside).illumination == 0.0).all()
    assert mode.around.at(inside)[0].light.max() < 1e-12
    outside = np.array([eclipse.penumbra_start - 1.0, eclipse.penumbra_end + 1.0])
    assert (mode.way.snapshot(outside).illumination == 1.0).all()


def test_absorbing_height_lengthens_the_eclipse() -> None:
    bare = geo_case()
    text = bare.text.replace("[plasma]", "[sun]\nabsorbing_height_km = 150.0\n[plasma]")
    (short,), (long,) = eclipses_of(bare.case), eclipses_of(load_case_text(text).case)
    # 150 km at the orbit's 3.07 km/s (less the shadow's own motion) at both ends: 98 s
    assert long.umbra_s - short.umbra_s == pytest.approx(2.0 * 150.0 / 3.07, rel=0.05)


def test_fixed_case_has_what_its_table_says(static_case: CaseRun) -> None:
    base, eclipse = static_case.modes
    time = np.array([0.0, 5.0, 86400.0])
    assert (base.way.snapshot(time).illumination == 1.0).all()
    assert (eclipse.way.snapshot(time).illumination == 0.0).all()
    assert (eclipse.around.at(time)[0].light == 0.0).all()
    direction = np.array([0.14, 0.0, 0.99])
    direction /= np.linalg.norm(direction)
    assert pytest.approx(np.tile(direction, (3, 1))) == base.way.snapshot(time).sun_direction.T
    names = list(static_case.loaded.case.names)
    light = base.around.at(time)[0].light[0]
    assert light[names.index("nadir panel")] == pytest.approx(direction[2])
    assert light[names.index("east blanket")] == pytest.approx(direction[0])
    assert light[names.index("anti-nadir panel")] == 0.0
    assert light[names.index("array cover glass")] == pytest.approx(1.0)
    assert base.around.eclipses == ()


def test_distance_from_the_sun_follows_the_season() -> None:
    assert sun_distance_au(geo_case("2031-01-04T00:00:00Z").case) == pytest.approx(0.9833, abs=2e-4)
    assert sun_distance_au(geo_case("2031-07-05T00:00:00Z").case) == pytest.approx(1.0167, abs=2e-4)
