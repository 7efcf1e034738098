"""Ionosphere, auroral oval, precipitation and field against published figures."""

import numpy as np
import pytest
from scipy.constants import e, epsilon_0
from scipy.constants import m_e as electron_mass

from environments.auroral_oval import (
    equatorward_edge_deg,
    oval_cautions,
    oval_share,
    poleward_edge_deg,
)
from environments.ionosphere import (
    electron_layer,
    ionosphere,
    ionosphere_cautions,
    ionosphere_series,
    profile,
    transition_height_km,
)
from environments.magnetic_field import (
    centre_offset_m,
    field_T,
    motional_field_V_m,
    motional_potential_V,
)
from environments.magnetosphere import MEAN_RADIUS_M, magnetic_place
from environments.precipitation import average_precipitation, precipitation_series, severe_share

# International Reference Ionosphere, mean of the logarithm over four seasons at longitude 0
# [m-3]; hour, magnetic latitude, F10.7, altitudes 250, 400, 600 km. Computed with the open
# package PyIRI apart from the table of the model (other longitudes, geographic latitude).
CLIMATOLOGY = [
    (0.0, 20.0, 70.0, (1.4e11, 9.4e10, 1.6e10)),
    (0.0, 45.0, 70.0, (3.1e10, 5.4e10, 8.2e9)),
    (12.0, 0.0, 70.0, (3.3e11, 5.7e11, 7.4e10)),
    (12.0, 45.0, 70.0, (2.9e11, 5.6e10, 1.3e10)),
    (12.0, 65.0, 70.0, (1.9e11, 3.7e10, 8.4e9)),
    (0.0, 45.0, 200.0, (5.9e10, 4.0e11, 7.1e10)),
    (12.0, 20.0, 200.0, (6.2e11, 2.5e12, 3.1e11)),
    (12.0, 65.0, 200.0, (6.2e11, 4.1e11, 8.8e10)),
]


def _at(altitude, hour, latitude, f107, season=0.0):
    one = np.ones(np.size(altitude))
    layer = electron_layer(latitude * one, hour * one, season * one, f107 * one)
    day = one if 6.0 < hour < 18.0 else 0.0 * one
    return profile(
        np.atleast_1d(altitude).astype(float), layer, day,
        transition_height_km(day, f107 * one, latitude * one),
    )  # fmt: skip


@pytest.mark.parametrize(("hour", "latitude", "f107", "published"), CLIMATOLOGY)
def test_density_of_the_climatology(hour, latitude, f107, published):
    """Factor 2.5: longitude and dip against dipole latitude, each 0.15 decades, and the shape."""
    found = _at(np.array([250.0, 400.0, 600.0]), hour, latitude, f107).electron_density_m3
    ratio = found / np.array(published)
    assert np.all((ratio > 0.4) & (ratio < 2.5)), ratio


@pytest.mark.parametrize(
    ("hour", "f107", "published"),
    [(0.0, 70.0, 500.0), (12.0, 70.0, 800.0), (0.0, 200.0, 900.0), (12.0, 200.0, 1400.0)],
)
def test_oxygen_gives_way_to_light_ions(hour, f107, published):
    """O+/H+ transition heights of the International Reference Ionosphere, 200 km (memory)."""
    heights = np.arange(300.0, 1990.0, 10.0)
    found = _at(heights, hour, 30.0, f107)
    light = found.hydrogen_density_m3 + found.helium_density_m3
    assert abs(heights[np.argmax(light > found.oxygen_density_m3)] - published) <= 15.0
    total = light + found.oxygen_density_m3
    np.testing.assert_allclose(total, found.electron_density_m3, rtol=1e-12)


def test_topside_falls_with_the_scale_height_of_hydrogen():
    """Diffusive equilibrium far above the transition: H = k(Te+Ti)/(m+ g) (Angerami & Thomas)."""
    found = _at(np.array([1400.0, 1500.0]), 0.0, 30.0, 70.0)
    n, te, ti = found.electron_density_m3, found.electron_temperature_eV, found.ion_temperature_eV
    pressure = n * (te + ti)
    mass = (1.00728 + 0.15 * 4.0021) / 1.15 * 1.66054e-27
    g = 3.986e14 / (MEAN_RADIUS_M + 1450e3) ** 2
    expected = mass * g / (e * np.mean(te + ti))
    assert np.log(pressure[0] / pressure[1]) / 1e5 == pytest.approx(expected, rel=0.02)


def test_winter_trough_lies_in_the_published_range():
    """100 to 1e4 cm-3 at 800 km in the winter polar night (DMSP statistics, memory)."""
    found = _at(np.array([800.0]), 0.0, 68.0, 70.0, season=-1.0)
    assert 1e8 < found.electron_density_m3[0] < 1e10
    assert 0.0 < found.hydrogen_density_m3[0] < found.electron_density_m3[0]


def test_debye_length_of_the_peak_by_day():
    """3 mm at 1e6 cm-3 and 0.17 eV; the daytime peak is of that class."""
    found = _at(np.array([300.0]), 12.0, 20.0, 130.0)
    length = np.sqrt(epsilon_0 * found.electron_temperature_eV / (e * found.electron_density_m3))
    assert 1.5e-3 < length[0] < 6e-3


def _orbit():
    times = np.datetime64("2031-01-10T00:00:00", "ns") + np.arange(0, 6000, 60) * np.timedelta64(
        1, "s"
    )
    angle = np.linspace(0.0, 2.0 * np.pi, times.size)
    radius = MEAN_RADIUS_M + 840e3
    position = radius * np.stack((np.cos(angle), 0.0 * angle, np.sin(angle)))
    sun = np.repeat([[0.33e11], [-1.27e11], [-0.56e11]], times.size, axis=1)
    return times, position, sun


def test_along_an_orbit():
    times, position, sun = _orbit()
    found = ionosphere(times, position, sun, 90.0)
    series = ionosphere_series(found, position)
    names = [p.species.name for p in series]
    assert names == ["electron", "O+", "He+", "H+"]
    charge = sum(p.density_m3 for p in series[1:])
    np.testing.assert_allclose(charge, series[0].density_m3, rtol=1e-12)
    assert np.all(found.share == 1.0)
    # corotation at the equator, 0.073 mrad/s
    speed = np.sqrt(np.sum(series[0].velocity_m_s ** 2, axis=0))
    assert speed[0] == pytest.approx(7.292e-5 * 7211e3, rel=1e-3)
    alone = ionosphere(times[7:8], position[:, 7:8], sun[:, 7:8], 90.0)
    # the dipole is that of the middle of the times
    assert alone.oxygen_density_m3[0] == pytest.approx(found.oxygen_density_m3[7], rel=1e-5)
    assert len(ionosphere_cautions(found, 90.0)) == 1
    assert len(ionosphere_cautions(found, 300.0)) == 2


def test_no_jumps_along_a_way():
    """Neither at the equator (season of the other hemisphere) nor over the pole (local time)."""
    times, position, sun = _orbit()
    angle = np.linspace(-0.01, 6.3, 5000)
    radius = np.sqrt(np.sum(position[:, 0] ** 2))
    fine = radius * np.stack((np.cos(angle), 1e-4 + 0.0 * angle, np.sin(angle)))
    for level in (70.0, 200.0):
        found = ionosphere(np.full(5000, times[0]), fine, np.repeat(sun[:, :1], 5000, 1), level)
        for density in (found.electron_density_m3, found.oxygen_density_m3):
            assert np.abs(np.diff(np.log(density))).max() < 0.05


def test_share_ends_where_the_plasmasphere_begins():
    times, position, sun = _orbit()
    size = (MEAN_RADIUS_M + np.linspace(300e3, 3000e3, times.size)) / (MEAN_RADIUS_M + 840e3)
    found = ionosphere(times, position * size, sun, 90.0)
    assert np.all(found.share[found.altitude_km > 2000.0] == 0.0)
    assert np.all(found.share[found.altitude_km < 1000.0] == 1.0)
    assert np.all(np.diff(found.share) <= 0.0)


def test_equatorward_edge():
    """Gussenhoven, Hardy & Heinemann 1983: 66.1 - 1.99 Kp at 00-01 h, 71.2 - 1.74 Kp at 18-19 h."""
    for kp in (0.0, 3.0, 6.0):
        assert float(equatorward_edge_deg(0.5, kp)) == pytest.approx(66.1 - 1.99 * kp)
        assert float(equatorward_edge_deg(18.5, kp)) == pytest.approx(71.2 - 1.74 * kp)
    # gaps are bridged between the values on either side
    gap = equatorward_edge_deg(np.linspace(1.5, 4.5, 20), 3.0)
    assert np.all(np.diff(gap) * np.sign(gap[-1] - gap[0]) >= 0.0)
    around = equatorward_edge_deg(np.array([23.999, 0.0, 24.0]), 3.0)
    assert np.ptp(around) < 0.01


def test_poleward_edge():
    """Starkov 1994 at Kp 3."""
    found = poleward_edge_deg(np.array([0.0, 6.0, 12.0, 18.0]), 3.0)
    np.testing.assert_allclose(found, [71.89, 74.01, 75.71, 73.63], atol=0.006)


def test_share_of_the_oval():
    hours = np.linspace(0.0, 24.0, 49)
    for kp in (0.0, 3.0, 7.0, 9.0):
        low = equatorward_edge_deg(hours, kp)
        assert np.all(oval_share(low - 0.6, hours, kp) == 0.0)
        assert np.all(oval_share(-(low + 1.0), hours, kp) > 0.4)
        assert np.all(oval_share(89.0, hours, kp) == 0.0)
    assert len(oval_cautions(np.array([2.0, 8.0]))) == 2


def test_average_precipitation_gives_the_published_conductances():
    """Hardy et al. 1987 (abstract): Pedersen 3.09 and 12.5, Hall 4.05 and 25.9 mho.

    Through Robinson et al. 1987: 40 E sqrt(Q)/(16 + E^2) and 0.45 E^0.85 times it.
    """
    kp = np.array([0.0, 6.0])
    flux, temperature = average_precipitation(0.0, kp)
    mean = 2.0 * temperature / 1e3
    power = flux * 2.0 * temperature * e * 1e3  # erg cm-2 s-1
    pedersen = 40.0 * mean * np.sqrt(power) / (16.0 + mean**2)
    np.testing.assert_allclose(pedersen, [3.09, 12.5], rtol=0.01)
    np.testing.assert_allclose(0.45 * mean**0.85 * pedersen, [4.05, 25.9], rtol=0.01)


def test_populations_of_the_aurora_carry_that_flux():
    share, hours, kp = np.array([0.0, 1.0, 0.5]), np.zeros(3), np.full(3, 4.0)
    primaries, degraded = precipitation_series(share, hours, kp)
    flux, _ = average_precipitation(hours, kp)
    for one in (primaries, degraded):
        carried = one.density_m3 * np.sqrt(e * one.temperature_eV / (2 * np.pi * electron_mass))
        np.testing.assert_allclose(carried, share * flux, rtol=1e-12)


def test_severe_events_stand_before_and_after_midnight_in_the_oval():
    hours = np.array([12.0, 19.5, 20.0, 23.0, 2.0, 6.0])
    found = severe_share(66.0, hours, 5.0)
    assert found[0] == found[5] == 0.0
    assert 0.0 < found[1] < 1.0
    assert np.all(found[2:5] == 1.0)
    assert np.all(severe_share(40.0, hours, 5.0) == 0.0)


def test_centre_of_the_eccentric_dipole():
    """577 km towards 22.6 N 137.6 E in 2015, some 2 km and 0.3 deg a year since.

    Koochak & Fraser-Smith 2017, Earth Space Sci. 4, 626 (memory).
    """
    offset = centre_offset_m()
    size = np.sqrt(np.sum(offset**2))
    assert size / 1e3 == pytest.approx(600.0, abs=15.0)
    assert np.degrees(np.arcsin(offset[2] / size)) == pytest.approx(22.7, abs=1.0)
    assert np.degrees(np.arctan2(offset[1], offset[0])) == pytest.approx(135.0, abs=2.5)


def test_field_in_low_orbit():
    """22 000 nT over South America to 67 000 nT south of Australia on the ground (memory)."""
    lon, lat = np.meshgrid(np.arange(0.0, 360.0, 10.0), np.arange(-80.0, 81.0, 10.0))
    lon, lat = np.radians(lon.ravel()), np.radians(lat.ravel())
    place = MEAN_RADIUS_M * np.stack(
        (np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat))
    )
    times = np.full(lon.size, np.datetime64("2025-03-20T12:00:00", "ns"))
    size = np.sqrt(np.sum(field_T(place, times) ** 2, axis=0))
    assert size.min() == pytest.approx(22e-6, rel=0.15)
    assert size.max() == pytest.approx(67e-6, rel=0.1)
    # far away the offset fades and the centred dipole remains: B along its equator
    far = np.array([[4e8], [0.0], [0.0]])
    latitude = magnetic_place(far, [[1.5e11], [0.0], [0.0]], times[:1]).dipole_latitude_deg[0]
    along = (
        29.8e-6
        * (MEAN_RADIUS_M / 4e8) ** 3
        * np.sqrt(1.0 + 3.0 * np.sin(np.radians(latitude)) ** 2)
    )
    assert np.sqrt(np.sum(field_T(far, times[:1]) ** 2)) == pytest.approx(along, rel=0.02)


def test_motional_potential_of_a_large_station():
    """7.66 km/s, 3e-5 T, 100 m: some 20 V, 5 to 40 (derived)."""
    field = motional_field_V_m([[7660.0], [0.0], [0.0]], [[0.0], [0.0], [3e-5]])
    np.testing.assert_allclose(field[:, 0], [0.0, -0.2298, 0.0])
    assert motional_potential_V(field, [0.0, -100.0, 0.0])[0] == pytest.approx(22.98)
    with pytest.raises(ValueError, match="offset_m"):
        motional_potential_V(field, [1.0, 2.0])
