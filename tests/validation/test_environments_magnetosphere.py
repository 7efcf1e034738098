"""Dipole of the Earth against published poles, and its axes against astropy."""

import warnings

import numpy as np
import pytest

from environments.earth_axes import earth_fixed_to_j2000
from environments.magnetosphere import MEAN_RADIUS_M, dipole, dipole_axis, magnetic_place


@pytest.mark.parametrize(
    # World Data Center for Geomagnetism, Kyoto: geomagnetic north pole by IGRF (from memory)
    ("year", "latitude", "longitude"),
    [(2015.0, 80.4, -72.6), (2020.0, 80.7, -72.7), (2025.0, 80.8, -72.8)],
)
def test_pole(year, latitude, longitude):
    axis = dipole(year)
    assert 90.0 - axis.colatitude_deg == pytest.approx(latitude, abs=0.15)
    assert axis.longitude_deg == pytest.approx(longitude, abs=0.3)


def test_field_at_the_magnetic_equator():
    # dipole moment 7.7e22 A m2 (textbooks): mu0 M / 4 pi a^3
    assert dipole(2025.0).equatorial_field_T == pytest.approx(
        1e-7 * 7.7e22 / MEAN_RADIUS_M**3, rel=0.01
    )


@pytest.mark.parametrize("year", [2005, 2018, 2026])
def test_earth_axes_against_astropy(year):
    from astropy import units as u
    from astropy.coordinates import GCRS, ITRS, CartesianRepresentation
    from astropy.time import Time
    from astropy.utils import iers

    times = np.array([f"{year}-0{m}-1{m}T{m:02d}:30:00" for m in range(1, 10)], "datetime64[ns]")
    fixed = np.array([[0.6], [-0.48], [0.64]])
    with iers.conf.set_temp("auto_download", False), warnings.catch_warnings():
        warnings.simplefilter("ignore")
        moments = Time(times.astype(str), scale="utc")
        place = ITRS(
            CartesianRepresentation(np.repeat(fixed, 9, axis=1) * 7e6 * u.m), obstime=moments
        )
        theirs = place.transform_to(GCRS(obstime=moments)).cartesian.xyz.to_value("m") / 7e6
    apart = np.degrees(np.linalg.norm(earth_fixed_to_j2000(fixed, times) - theirs, axis=0))
    assert apart.max() < 0.01


def test_latitude_shell_and_local_time_from_first_principles():
    times = np.array(["2026-06-21T05:00:00"] * 4, "datetime64[ns]")
    axis = dipole_axis(times)[:, 0]
    sun = np.array([1.5e11, 0.0, 0.0])
    noon = sun - (sun @ axis) * axis
    noon /= np.linalg.norm(noon)
    dusk = np.cross(axis, noon)
    angle = np.radians(35.0)
    places = 4e7 * np.stack([
        noon,
        np.cos(angle) * dusk + np.sin(angle) * axis,
        -np.cos(angle) * noon - np.sin(angle) * axis,
        -dusk,
    ]).T  # fmt: skip
    found = magnetic_place(places, np.repeat(sun[:, None], 4, axis=1), times)
    np.testing.assert_allclose(found.dipole_latitude_deg, [0.0, 35.0, -35.0, 0.0], atol=1e-6)
    np.testing.assert_allclose(found.magnetic_local_time_h, [12.0, 18.0, 0.0, 6.0], atol=1e-9)
    shell = 4e7 / MEAN_RADIUS_M / np.cos(np.radians([0.0, 35.0, 35.0, 0.0])) ** 2
    np.testing.assert_allclose(found.l_shell, shell, rtol=1e-12)


def test_on_the_axis_and_refusals():
    times = np.array(["2026-06-21"], "datetime64[ns]")
    sun = [[1.5e11], [0.0], [0.0]]
    assert magnetic_place(7e6 * dipole_axis(times), sun, times).l_shell[0] > 1e12
    with pytest.raises(ValueError, match="1995 to 2040"):
        dipole(1980.0)
    with pytest.raises(ValueError, match="same number"):
        magnetic_place([[7e6], [0.0], [0.0]], sun, times[:0])
