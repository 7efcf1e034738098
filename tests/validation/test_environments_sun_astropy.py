"""The Sun's direction and the constants against astropy (ERFA's ephemeris of the Earth)."""

import warnings

import numpy as np
import pytest

from environments.earth_axes import equinox_of_date_to_j2000
from environments.orbit import EARTH_GM_M3_S2, EARTH_J2, EARTH_RADIUS_M
from environments.sun import (
    ASTRONOMICAL_UNIT_M,
    SOLAR_RADIUS_M,
    distance_au,
    sun_position_m,
)

DATES = [f"{year}-{day}" for year in range(2026, 2034) for day in (
    "01-04T00:00:00", "03-20T12:00:00", "05-11T07:30:00", "06-21T18:00:00",
    "08-08T03:00:00", "09-23T00:00:00", "11-02T09:00:00", "12-21T21:00:00",
)]  # fmt: skip


def astropy_sun(dates):
    from astropy.coordinates import get_sun
    from astropy.time import Time
    from astropy.utils import iers
    from erfa import ErfaWarning

    with iers.conf.set_temp("auto_download", False), warnings.catch_warnings():
        # leap seconds beyond those announced are unknown; 1 s of the Sun is 1e-5 deg
        warnings.filterwarnings("ignore", message=r".*dubious year", category=ErfaWarning)
        return get_sun(Time(dates, scale="utc")).cartesian.xyz.to_value("m")


def test_direction_within_a_thousandth_of_a_degree():
    ours = sun_position_m(np.array(DATES, "datetime64[ns]"))
    theirs = astropy_sun(DATES)
    across = np.linalg.norm(np.cross(ours, theirs, axis=0), axis=0)
    angle = np.degrees(np.arctan2(across, np.sum(ours * theirs, axis=0)))
    assert angle.max() < 0.001
    # not merely within a tolerance that hides a missing precession (0.36 deg by 2026)
    assert angle.mean() < 0.0003


def test_distance_to_five_digits():
    ours = distance_au(sun_position_m(np.array(DATES, "datetime64[ns]")))
    theirs = np.linalg.norm(astropy_sun(DATES), axis=0) / ASTRONOMICAL_UNIT_M
    # terms below 1e-6 AU are left out
    np.testing.assert_allclose(ours, theirs, rtol=1e-5)


@pytest.mark.parametrize("year", [1950.0, 2026.0, 2050.0])
def test_precession_to_a_fifth_of_a_second_of_arc(year):
    from erfa import pmat06

    # GCRS to the mean equinox of date, IAU 2006; its inverse is what ours does
    matrix = pmat06(2451545.0, (year - 2000.0) * 365.25).T
    axes = np.eye(3)
    ours = equinox_of_date_to_j2000(axes, np.full(3, (year - 2000.0) / 100.0))
    # angles of 1976 against those of 2006, 0.3 arcsec per century, and the frame bias 0.02
    np.testing.assert_allclose(ours, matrix, atol=1e-6)


def test_constants():
    from astropy import constants

    assert constants.au.value == ASTRONOMICAL_UNIT_M
    assert constants.R_sun.value == SOLAR_RADIUS_M
    # nominal values of IAU 2015 resolution B3 have seven and five digits
    assert pytest.approx(constants.GM_earth.value, rel=2e-7) == EARTH_GM_M3_S2
    assert pytest.approx(constants.R_earth.value, rel=1e-5) == EARTH_RADIUS_M
    # J2 of EGM96, 1.08263e-3 in textbooks (Vallado 2013, from memory)
    assert pytest.approx(1.08263e-3, rel=1e-5) == EARTH_J2
