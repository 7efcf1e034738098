"""Eclipse contacts against a shadow traced with astropy's Sun and Earth, ray by ray.

The reference shares nothing with ours but the path of the spacecraft: rays run from the
spacecraft to 180 points of the Sun's limb, past the ellipsoid WGS 84 about the true pole.
"""

import warnings

import numpy as np
import pytest
from scipy.interpolate import CubicSpline

from environments.eclipse import find_eclipses
from environments.orbit import KeplerOrbit
from environments.sun import earth_shadow_radii_m, illumination, sun_path
from environments.trajectory import KeplerTrajectory

EQUATOR_M, POLE_M = 6378137.0, 6356752.314245  # WGS 84
SUN_M = 6.957e8
STEP_S = 10.0


def epoch(text):
    return np.datetime64(text, "ns")


# a, e, i, node, perigee, anomaly; the last five graze the shadow
ORBITS = {
    "LEO 400 km": ("2031-03-20", 6778.137, 0.0005, 51.6, 0.0, 0.0, 0.0),
    "LEO 400 km, winter": ("2030-12-21", 6778.137, 0.0005, 51.6, 120.0, 0.0, 0.0),
    "LEO equator": ("2031-06-21", 6878.137, 0.0, 0.0, 0.0, 0.0, 0.0),
    "LEO polar": ("2031-05-01", 6978.137, 0.001, 90.0, 40.0, 0.0, 0.0),
    "LEO retrograde": ("2031-10-11", 7078.137, 0.002, 144.0, 300.0, 10.0, 0.0),
    "sun-synchronous 10 h": ("2031-03-20", 7178.137, 0.001, 98.6, 330.0, 90.0, 0.0),
    "sun-synchronous 7 h": ("2030-12-21", 7178.137, 0.001, 98.6, 325.0, 90.0, 0.0),
    "LEO 1400 km": ("2031-08-15", 7778.0, 0.0, 66.0, 30.0, 0.0, 0.0),
    "MEO 8000 km": ("2031-04-10", 14440.0, 0.0, 0.03, 0.0, 0.0, 0.0),
    "MEO 20200 km": ("2031-03-25", 26560.0, 0.01, 55.0, 5.0, 0.0, 0.0),
    "MEO 23200 km": ("2031-09-20", 29600.0, 0.0, 56.0, 175.0, 0.0, 0.0),
    "transfer, apogee in shadow": ("2031-03-20", 24400.0, 0.73, 7.0, 0.0, 0.0, 0.0),
    "transfer, perigee in shadow": ("2031-03-20", 24400.0, 0.73, 7.0, 180.0, 0.0, 180.0),
    "transfer, summer": ("2031-06-21", 24400.0, 0.73, 28.5, 100.0, 180.0, 0.0),
    "12 h, e 0.74": ("2031-12-10", 26560.0, 0.74, 63.4, 60.0, 270.0, 0.0),
    "12 h, e 0.74, other node": ("2031-02-10", 26560.0, 0.74, 63.4, 120.0, 270.0, 0.0),
    "48 h, e 0.85": ("2031-03-22", 66900.0, 0.85, 20.0, 0.0, 30.0, 180.0),
    "GEO equinox": ("2031-03-20", 42164.17, 0.0002, 0.05, 0.0, 0.0, 0.0),
    "GEO autumn": ("2031-09-12", 42164.17, 0.0, 0.0, 0.0, 0.0, 90.0),
    "GEO inclined": ("2031-03-12", 42164.17, 0.001, 6.0, 80.0, 0.0, 90.0),
    "GEO late season": ("2031-04-11", 42164.17, 0.0, 0.0, 0.0, 0.0, 0.0),
    "GEO 1997": ("1997-03-30", 42164.17, 0.0, 0.0, 0.0, 0.0, 0.0),
    "LEO grazed, going out": ("2031-06-21", 6778.137, 0.0005, 51.6, 168.0, 0.0, 0.0),
    "LEO grazed, coming in": ("2031-06-21", 6778.137, 0.0005, 51.6, 198.0, 0.0, 0.0),
    "LEO grazed over the pole": ("2030-12-21", 7178.137, 0.001, 98.6, 335.0, 90.0, 0.0),
    "12 h, e 0.74, grazed": ("2031-12-10", 26560.0, 0.74, 63.4, 100.0, 270.0, 0.0),
    "GEO grazed": ("2031-04-13", 42164.17, 0.0, 0.0, 0.0, 0.0, 0.0),
}  # fmt: skip


def astropy_sun_and_pole(start, days):
    """Spline of the Sun's apparent place [m] over seconds, and the pole of the middle."""
    import erfa
    from astropy.coordinates import get_sun
    from astropy.time import Time, TimeDelta
    from astropy.utils import iers
    from erfa import ErfaWarning

    with iers.conf.set_temp("auto_download", False), warnings.catch_warnings():
        warnings.filterwarnings("ignore", message=r".*dubious year", category=ErfaWarning)
        seconds = np.linspace(-3600.0, 86400.0 * days + 3600.0, 14)
        times = Time(str(start), scale="utc") + TimeDelta(seconds, format="sec")
        place = get_sun(times).cartesian.xyz.to_value("m")
        middle = times[7].tt
        pole = erfa.pnm06a(middle.jd1, middle.jd2)[2]
    return CubicSpline(seconds, place, axis=1), pole


def clearances(position, sun, pole):
    """Distance by which rays to the Sun's limb miss the ellipsoid [m], (limb, N).

    Along the pole all is stretched by a/b, which makes the ellipsoid a sphere and keeps
    rays straight.
    """
    toward = sun - position
    distance = np.linalg.norm(toward, axis=0)
    toward = toward / distance
    side = np.cross(toward, np.array([0.3, -0.4, 0.87]), axis=0)
    side = side / np.linalg.norm(side, axis=0)
    other = np.cross(toward, side, axis=0)
    size = SUN_M / np.sqrt(distance**2 - SUN_M**2)

    def stretched(v):
        return v + (EQUATOR_M / POLE_M - 1.0) * np.tensordot(pole, v, 1) * pole[:, None]

    start = stretched(position)
    rows = []
    for angle in np.linspace(0.0, 2.0 * np.pi, 180, endpoint=False):
        ray = stretched(toward + size * (np.cos(angle) * side + np.sin(angle) * other))
        ray = ray / np.linalg.norm(ray, axis=0)
        along = np.sum(start * ray, axis=0)
        nearest = np.linalg.norm(start - along * ray, axis=0) - EQUATOR_M
        # a body that lies behind is no obstacle
        rows.append(np.where(along < 0.0, nearest, np.linalg.norm(start, axis=0) - EQUATOR_M))
    return np.array(rows)


def reference_contacts(trajectory, days):
    """Contacts (penumbra, umbra) by scan and bisection, and the scan itself."""
    sun, pole = astropy_sun_and_pole(trajectory.epoch, days)

    def margins(t):
        c = clearances(trajectory.position_velocity(t)[0], sun(t), pole)
        return np.array([c.min(axis=0), c.max(axis=0)])

    grid = np.arange(0.0, 86400.0 * days + 1.0, STEP_S)
    values = np.concatenate([margins(part) for part in np.array_split(grid, 20)], axis=1)
    contacts = []
    for kind in (0, 1):
        k = np.flatnonzero((values[kind, :-1] < 0.0) != (values[kind, 1:] < 0.0))
        left, right, inside = grid[k], grid[k + 1], values[kind, k] < 0.0
        for _ in range(20):
            middle = 0.5 * (left + right)
            same = (margins(middle)[kind] < 0.0) == inside if k.size else inside
            left, right = np.where(same, middle, left), np.where(same, right, middle)
        contacts.append(0.5 * (left + right))
    return grid, values, contacts


@pytest.mark.parametrize("name", ORBITS)
def test_contacts_within_five_seconds(name):
    start, *elements = ORBITS[name]
    trajectory = KeplerTrajectory(KeplerOrbit(epoch(start), *elements))
    days = 2 if elements[0] > 50000.0 else 1
    grid, values, (penumbra, umbra) = reference_contacts(trajectory, days)
    equatorial, polar = earth_shadow_radii_m()
    found = find_eclipses(
        lambda t: trajectory.position_velocity(t)[0], sun_path(trajectory.epoch),
        0.0, grid[-1], body_radius_m=equatorial, polar_radius_m=polar,
        speed_limit_m_s=trajectory.speed_limit_m_s,
    )  # fmt: skip
    assert found
    edges = [t for one in found for t in (one.penumbra_start, one.penumbra_end) if t is not None]
    deep = [t for one in found for t in (one.umbra_start, one.umbra_end) if t is not None]
    # none missed, none invented, each at its time
    assert len(edges) == penumbra.size
    assert len(deep) == umbra.size
    assert np.abs(np.array(edges) - penumbra).max() < 5.0
    if umbra.size:
        assert np.abs(np.array(deep) - umbra).max() < 5.0
    # at every step of the scan the continuous illumination says the same
    light = illumination(
        trajectory.position_velocity(grid)[0], sun_path(trajectory.epoch)(grid),
        equatorial, polar_radius_m=polar,
    )  # fmt: skip
    near = np.concatenate([np.abs(grid[:, None] - np.append(penumbra, umbra)).min(axis=1)])
    clear = near > 5.0
    np.testing.assert_array_equal((light < 1.0)[clear], (values[0] < 0.0)[clear])
    np.testing.assert_array_equal((light == 0.0)[clear], (values[1] < 0.0)[clear])


def test_a_spherical_earth_would_fail_where_the_shadow_is_grazed():
    """The reference tells a flattened Earth from a sphere, so it can judge ours."""
    start, *elements = ORBITS["LEO grazed over the pole"]
    trajectory = KeplerTrajectory(KeplerOrbit(epoch(start), *elements))
    _, _, (penumbra, _) = reference_contacts(trajectory, 1)
    found = find_eclipses(
        lambda t: trajectory.position_velocity(t)[0], sun_path(trajectory.epoch), 0.0, 86400.0
    )
    edges = [t for one in found for t in (one.penumbra_start, one.penumbra_end) if t is not None]
    assert len(edges) != penumbra.size or np.abs(np.array(edges) - penumbra).max() > 5.0
