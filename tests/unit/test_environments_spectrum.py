"""Structure of the composite solar spectrum."""

import numpy as np
import pytest
from scipy.constants import c, e, h

from environments.errors import EnvironmentDataError
from environments.spectrum import BANDS, band_table, solar_spectrum, spectrum_sources


def flux_of(spectrum, band):
    return sum(
        flux
        for flux, name in zip(spectrum.photon_flux_m2_s, spectrum.band, strict=True)
        if name == band
    )


def test_counts_of_bins():
    band = solar_spectrum().band
    # 5 X-ray, 37 EUV (20 bands and 17 lines), 3 FUV, 1 line, 77 nm in 1 nm, 200 nm in 5 nm
    assert [band.count(name) for name in BANDS] == [5, 37, 3, 1, 77, 20, 20]


def test_composite_covers_every_wavelength_once():
    s = solar_spectrum()
    width = s.wavelength_high_nm - s.wavelength_low_nm
    low, high = s.wavelength_low_nm[width > 0], s.wavelength_high_nm[width > 0]
    order = np.argsort(low)
    low, high = low[order], high[order]
    # bands meet, except for 120-123 nm, which the Lyman-alpha line stands for
    gaps = [(a, b) for a, b in zip(high[:-1], low[1:], strict=True) if a != b]
    assert gaps == [(120.0, 123.0)]
    assert (low[0], high[-1]) == (0.05, 400.0)
    assert int((width == 0).sum()) == 17 + 1


def test_energy_at_the_middle_of_the_bin():
    s = solar_spectrum()
    middle_m = 0.5e-9 * (s.wavelength_low_nm + s.wavelength_high_nm)
    np.testing.assert_allclose(s.photon_energy_eV, h * c / (middle_m * e), rtol=1e-14)


def test_distance_acts_as_inverse_square():
    near, far = solar_spectrum(distance_au=0.5), solar_spectrum(distance_au=2.0)
    np.testing.assert_allclose(near.photon_flux_m2_s, 16.0 * far.photon_flux_m2_s, rtol=1e-14)


def test_activity_uses_the_mean_of_day_and_81_days():
    a = solar_spectrum(f107=180.0, f107_81day=120.0)
    b = solar_spectrum(f107=150.0)
    np.testing.assert_array_equal(a.photon_flux_m2_s, b.photon_flux_m2_s)
    assert (a.f107, a.f107_81day) == (180.0, 120.0)


def test_only_wavelengths_below_123_nm_scale():
    quiet, active = solar_spectrum(f107=80.0), solar_spectrum(f107=200.0)
    ratio = active.photon_flux_m2_s / quiet.photon_flux_m2_s
    above = quiet.wavelength_low_nm >= 123.0
    assert (ratio[above] == 1.0).all()
    assert (ratio[~above] > 1.2).all()
    # Lyman-alpha: 1 + 0.00423 (200 - 80)
    assert ratio[quiet.band.index("Lyman-alpha")] == pytest.approx(1.5076, rel=1e-12)


def test_floor_keeps_every_flux_at_four_fifths():
    quiet, lowest = solar_spectrum(f107=80.0), solar_spectrum(f107=60.0)
    ratio = lowest.photon_flux_m2_s / quiet.photon_flux_m2_s
    assert ratio.min() == pytest.approx(0.8)
    # 0.8 at the strongly varying X-rays, 1 - 0.00423 * 20 at the line
    assert ratio[0] == pytest.approx(0.8)
    assert ratio[quiet.band.index("Lyman-alpha")] == pytest.approx(0.9154)


def test_flare_factor_touches_its_band_only():
    flare = solar_spectrum(band_factors={"X-ray": 50.0})
    calm = solar_spectrum()
    assert flux_of(flare, "X-ray") == pytest.approx(50.0 * flux_of(calm, "X-ray"))
    assert flux_of(flare, "EUV") == flux_of(calm, "EUV")


def test_band_table_adds_up():
    s = solar_spectrum()
    rows = band_table(s)
    assert [row.band for row in rows] == list(BANDS)
    assert sum(row.photon_flux_m2_s for row in rows) == pytest.approx(s.photon_flux_m2_s.sum())


def test_photons_above_a_threshold():
    s = solar_spectrum()
    total = float(s.photon_flux_m2_s.sum())
    edge_400 = float(h * c / e / 400e-9)
    assert s.photons_above(edge_400 * 0.5) == pytest.approx(total)
    assert s.photons_above(edge_400) == pytest.approx(total)
    # half of the energy of the last 5 nm, hence a little less than half of its photons above
    half = total - (400.0**2 - 397.5**2) / (400.0**2 - 395.0**2) * s.photon_flux_m2_s[-1]
    assert s.photons_above(float(h * c / e / 397.5e-9)) == pytest.approx(half, rel=1e-12)
    # the line is in or out
    line = s.photon_flux_m2_s[s.band.index("Lyman-alpha")]
    assert s.photons_above(10.15) - s.photons_above(10.25) == pytest.approx(line)
    assert s.photons_above(1e5) == 0.0
    with pytest.raises(ValueError, match="threshold_eV"):
        s.photons_above(0.0)


def test_arrays_are_read_only():
    s = solar_spectrum()
    for array in (s.photon_flux_m2_s, s.photon_energy_eV, s.wavelength_low_nm):
        with pytest.raises(ValueError, match="read-only"):
            array[0] = 1.0


@pytest.mark.parametrize(
    "bad",
    [
        {"f107": 10.0},
        {"f107": float("nan")},
        {"f107_81day": 1e4},
        {"distance_au": 0.0},
        {"distance_au": float("inf")},
        {"band_factors": {"X-ray": -1.0}},
        {"band_factors": {"Xray": 2.0}},
    ],
)
def test_refuses(bad):
    with pytest.raises(EnvironmentDataError) as caught:
        solar_spectrum(**bad)
    assert caught.value.key[0] == next(iter(bad))


def test_every_part_has_a_source():
    assert set(spectrum_sources()) == {
        "x_ray",
        "euv",
        "fuv",
        "lyman_alpha",
        "e490_1nm",
        "e490_5nm",
    }
    assert all(spectrum_sources().values())
