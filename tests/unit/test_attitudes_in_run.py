"""Every law of attitude along the run of a case, and shadows of one part on another."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray

from charging.case import LoadedCase, load_case, load_case_text
from charging.dataset import mode_dataset
from charging.errors import InputError
from charging.flight import path
from charging.orbit_run import run_case
from charging.surroundings import surroundings

Array = NDArray[np.float64]

CASE = """\
title = "Attitudes"
[orbit]
kind = "kepler"
epoch = 2031-06-21T00:00:00Z
semi_major_axis_km = 42164.17
eccentricity = 0.0
inclination_deg = 0.0
raan_deg = 0.0
argument_of_perigee_deg = 0.0
mean_anomaly_deg = 0.0
[time]
duration_h = {hours}
output_step_s = 60.0
[emission]
secondary_law = "sanders_inouye_1979"
[attitude]
{attitude}
[plasma]
use = "quiet geostationary"
[body]
radius_m = 1.0
"""
FACES = {
    "px": "normal = [1.0, 0.0, 0.0]",
    "py": "normal = [0.0, 1.0, 0.0]",
    "pz": "normal = [0.0, 0.0, 1.0]",
    "mx": "normal = [-1.0, 0.0, 0.0]",
    "my": "normal = [0.0, -1.0, 0.0]",
    "mz": "normal = [0.0, 0.0, -1.0]",
    "wing front": 'tracks_sun = true\nside = "front"',
    "wing back": 'tracks_sun = true\nside = "back"',
}
TIMES = np.linspace(0.0, 12.0 * 3600.0, 145)


def text(attitude: str, hours: float = 12.0, body: str = "") -> str:
    out = CASE.format(attitude=attitude, hours=hours) + body
    for name, way in FACES.items():
        out += f'[[surface]]\nname = "{name}"\nmaterial = "gold"\narea_m2 = 1.0\n{way}\n'
    return out


def faces(loaded: LoadedCase, times: Array = TIMES) -> dict[str, Array]:
    cosine = path(loaded.case, None, loaded.files).snapshot(times).incidence_cosine
    return dict(zip(FACES, cosine, strict=True))


def sun(loaded: LoadedCase, times: Array = TIMES) -> Array:
    return path(loaded.case, None, loaded.files).snapshot(times).sun_direction


def test_yaw_steering_keeps_the_sun_off_the_sides_and_full_on_the_wings() -> None:
    loaded = load_case_text(text('law = "yaw steering"'))
    found = faces(loaded)
    assert found["wing front"] == pytest.approx(np.ones(145), abs=1e-12)
    for side in ("py", "my", "mx"):
        assert found[side] == pytest.approx(np.zeros(145), abs=1e-12)
    shot = path(loaded.case).snapshot(TIMES)
    nadir = -shot.position_m / np.linalg.norm(shot.position_m, axis=0)
    along = (nadir * shot.sun_direction).sum(axis=0)
    assert found["pz"] == pytest.approx(np.maximum(along, 0.0), abs=1e-12)
    assert found["px"] == pytest.approx(np.sqrt(1.0 - along**2), abs=1e-9)


def test_sun_pointing_holds_one_face_to_the_sun() -> None:
    found = faces(load_case_text(text('law = "sun"')))
    assert found["pz"] == pytest.approx(np.ones(145), abs=1e-12)
    assert found["wing front"] == pytest.approx(np.ones(145), abs=1e-12)
    turned = faces(load_case_text(text('law = "sun"\ntoward_sun = [0.0, 3.0, 4.0]\n'
                                       "toward_north = [1.0, 0.0, 0.0]")))  # fmt: skip
    assert turned["py"] == pytest.approx(np.full(145, 0.6))
    assert turned["pz"] == pytest.approx(np.full(145, 0.8))
    assert turned["wing front"] == pytest.approx(np.full(145, 0.8))


def test_inertial_axes_see_the_sun_by_its_components() -> None:
    loaded = load_case_text(text('law = "inertial"\nx_axis = [0, 1, 0]\ny_axis = [0, 0, 1]'))
    found, s = faces(loaded), sun(loaded)
    for name, component in (("px", s[1]), ("py", s[2]), ("pz", s[0]), ("mz", -s[0])):
        assert found[name] == pytest.approx(np.maximum(component, 0.0), abs=1e-12)
    assert found["wing front"] == pytest.approx(np.hypot(s[1], s[0]), abs=1e-12)


SPIN = 'law = "spin"\naxis = [0.0, 0.0, 1.0]\nperiod_s = 600.0\n'


def test_a_spin_is_the_mean_of_its_turns() -> None:
    mean = load_case_text(text(SPIN))
    found, s = faces(mean), sun(mean)
    across = np.hypot(s[0], s[1])
    for side in ("px", "mx", "py", "my"):  # a belt: the projected area over the area
        assert found[side] == pytest.approx(across / np.pi, rel=1e-6)
    assert found["pz"] == pytest.approx(np.maximum(s[2], 0.0), abs=1e-9)
    # wings after the Sun: the mean of sqrt(1 - a² sin²) over a turn
    from scipy.special import ellipe

    assert found["wing front"] == pytest.approx(2.0 / np.pi * ellipe(across**2), rel=1e-6)
    resolved = load_case_text(text(SPIN + "resolved = true", 1.0))
    times = 600.0 * (np.arange(3600) + 0.5) / 3600.0
    for name, values in faces(resolved, times).items():
        here = faces(mean, np.array([300.0]))[name][0]
        assert values.mean() == pytest.approx(here, abs=3e-5), name
    assert faces(resolved, times)["px"].max() > 0.9


def test_a_resolved_spin_is_followed_by_knots_and_march() -> None:
    loaded = load_case_text(text(SPIN + "resolved = true", 0.5))
    around = surroundings(loaded.case, None, [])
    times = np.random.default_rng(2).uniform(0.0, 1800.0, 3000)
    exact = path(loaded.case).snapshot(times).light.T
    assert np.abs(around.at(times)[0].light - exact).max() < 2e-5
    (mode,) = run_case(loaded).modes
    assert mode.trajectories[0].step_s.max() <= 600.0 / 48.0 * (1.0 + 1e-9)
    endless = text(SPIN.replace("600.0", "0.05") + "resolved = true")
    with pytest.raises(InputError, match="resolved = false"):
        run_case(load_case_text(endless))


def test_quaternions_turn_as_the_law_they_describe(tmp_path: Path) -> None:
    # half a turn in twelve hours about body z, from axes along the inertial ones
    rows = []
    for hour in range(13):
        half = 0.5 * np.pi * hour / 12.0
        rows.append(f"2031-06-21T{hour:02d}:00:00Z,0,0,{np.sin(half):.9f},{np.cos(half):.9f}")
    notes = "# frame = GCRF\n# rotation = body to inertial\n# time_scale = UTC\n"
    (tmp_path / "q.csv").write_text(notes + "time,q_x,q_y,q_z,q_w\n" + "\n".join(rows) + "\n")
    case = tmp_path / "case.toml"
    case.write_text(text('law = "quaternions"\nfile = "q.csv"'))
    loaded = load_case(case)
    spin = 'law = "spin"\naxis = [0, 0, 1]\nperiod_s = 86400.0\nresolved = true\nphase_deg = '
    # a spin about the pole counts its turn from the equinox
    twin = load_case_text(text(spin + "0.0"))
    for name, values in faces(loaded).items():
        assert values == pytest.approx(faces(twin)[name], abs=1e-7), name
    around = surroundings(loaded.case, None, [], loaded.files)
    exact = path(loaded.case, None, loaded.files).snapshot(TIMES).light.T
    assert np.abs(around.at(TIMES)[0].light - exact).max() < 2e-5
    (tmp_path / "q.csv").write_text(
        notes + "time,q_x,q_y,q_z,q_w\n" + "\n".join(rows).replace(",0,0,", ",0,0.1,", 1) + "\n"
    )
    with pytest.raises(InputError, match="length") as caught:
        load_case(case)
    assert (str(caught.value.file), caught.value.line) == (str(tmp_path / "q.csv"), 5)
    (tmp_path / "q.csv").write_text(notes + "time,q_x,q_y,q_z,q_w\n" + "\n".join(rows[:-1]) + "\n")
    with pytest.raises(InputError, match="does not cover") as caught:
        load_case(case)
    assert str(caught.value.file) == str(case)


@pytest.mark.parametrize(
    ("attitude", "words"),
    [
        ('law = "spin"\naxis = [0, 0, 1]', "period_s is missing"),
        ('law = "inertial"\nx_axis = [0, 0, 1]\ny_axis = [0, 0, -2]', "lies along x_axis"),
        ('law = "nadir"\nperiod_s = 3.0', "does not go with law"),
        ('law = "sun"\ntoward_sun = [0, 1, 0]', "lies along toward_sun"),
        ('law = "quaternions"\nfile = "q.txt"', "no CSV file"),
        ('law = "quaternions"', "file is missing"),
        ('law = "yaw stering"', 'Nearest: "yaw steering"'),
    ],
)
def test_refused_attitudes(attitude: str, words: str) -> None:
    with pytest.raises(InputError) as caught:
        load_case_text(text(attitude))
    assert words in str(caught.value)
    assert caught.value.line is not None


# --- shadows --------------------------------------------------------------------------------


def shadow_rows(name: str, half: str) -> str:
    """Full light with the Sun above the x-y plane, a share `half` at and below it."""
    rows = ["surface,sun_azimuth_deg,sun_elevation_deg,lit_share"]
    for azimuth in (-180, -90, 0, 90):
        for elevation, share in ((-90, half), (0, half), (1, "1"), (90, "1")):
            rows.append(f"{name},{azimuth},{elevation},{share}")
    return "\n".join(rows) + "\n"


@pytest.mark.parametrize("on", ["body", "surface"])
def test_shadows_dim_the_light_and_show_in_the_result(tmp_path: Path, on: str) -> None:
    (tmp_path / "s.csv").write_text(shadow_rows("px", "0.25"))
    body = 'shadow = "s.csv"\n' if on == "body" else ""
    content = text('law = "inertial"\nx_axis = [0, 1, 0]\ny_axis = [-1, 0, 0]', 6.0, body)
    # +z is the celestial north: the Sun of June stands 23.4 deg above the x-y plane
    if on == "surface":
        content = content.replace('name = "px"\n', 'name = "px"\nshadow = "s.csv"\n')
    south = content.replace("y_axis = [-1, 0, 0]", "y_axis = [1, 0, 0]")  # +z to the south
    results = []
    for number, version in enumerate((content, south)):
        file = tmp_path / f"{number}.toml"
        file.write_text(version)
        run = run_case(load_case(file))
        dataset = mode_dataset(run, run.modes[0]).set_xindex("surface_name")
        results.append(dataset)
    free, shaded = results
    assert (free.illuminated_fraction.values == 1.0).all()
    assert shaded.illuminated_fraction.sel(surface_name="px").values == pytest.approx(0.25)
    rest = shaded.illuminated_fraction.values[1:]
    assert (rest == 1.0).all()
    photo = {"mechanism": 5}
    bright = free.current_density.isel(photo).sel(surface_name="px").values
    dim = shaded.current_density.isel(photo).sel(surface_name="px").values
    volts = [one.potential.sel(surface_name="px").values for one in (free, shaded)]
    assert (volts[1] <= volts[0] + 1e-9).all()
    near = (bright > 0.0) & (np.abs(volts[0] - volts[1]) < 0.3)
    assert (dim[bright > 0.0] < 0.75 * bright[bright > 0.0]).all() or near.any()


def test_a_shadow_of_another_surface_is_refused(tmp_path: Path) -> None:
    (tmp_path / "s.csv").write_text(shadow_rows("pw", "0.25"))
    case = tmp_path / "case.toml"
    case.write_text(text('law = "nadir"', body='shadow = "s.csv"\n'))
    with pytest.raises(InputError, match="no surface") as caught:
        load_case(case)
    assert (str(caught.value.file), caught.value.line) == (str(tmp_path / "s.csv"), 2)
    (tmp_path / "s.csv").write_text(shadow_rows("px", "0.25"))
    case.write_text(
        text('law = "nadir"').replace('name = "py"\n', 'name = "py"\nshadow = "s.csv"\n')
    )
    with pytest.raises(InputError, match="no rows of this surface"):
        load_case(case)
