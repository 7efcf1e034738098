"""Energy distributions: fluxes and moments against closed forms and quadrature, one per law."""

from pathlib import Path

import numpy as np
import pytest
import xarray as xr
from mpmath import mp
from scipy.constants import e, epsilon_0, m_e, m_p

from environments.auroral import FlatAndMaxwellian, Fontheim
from environments.catalogue import load_plasma, read_plasma
from environments.distributions import DISTRIBUTIONS, Kappa, Maxwellian, Tabulated
from environments.energy_panels import energy_nodes
from environments.errors import EnvironmentDataError
from environments.isotropic import distribution_moments, panel_marks_eV
from environments.plasma import (
    ELECTRON,
    HYDROGEN_ION,
    Plasma,
    Population,
    electron_debye_length_m,
    extrapolated_share,
    moments,
    population_of,
    warnings_of,
)

ARC = Fontheim(3e11, 1.1, 1e8, 3e3, 3.5e9, 1e4, 3e3, 50.0, 4e4)
ECSS_AURORAL = FlatAndMaxwellian(3.9e-18, 17440.0, 1.13e6, 3960.0)


def plasma_of(*populations):
    return Plasma("test", "test", "none", "assumed", None, "", populations)


def test_maxwellian_has_the_closed_moments():
    n, T = 2.5e6, 740.0
    found = distribution_moments(Maxwellian(n, T), m_p)
    flux = n * np.sqrt(e * T / (2.0 * np.pi * m_p))
    expected = (n, flux, 1.5 * T, 2.0 * T * flux, T)
    assert tuple(found) == pytest.approx(expected, rel=1e-11)


# Ratios to a Maxwellian of equal density and T: flux sqrt(k-3/2) G(k-1)/G(k-1/2), Debye length
# sqrt((2k-3)/(2k-1)); closed forms evaluated by hand for these kappas.
@pytest.mark.parametrize(
    ("kappa", "flux_ratio", "debye_ratio"),
    [(2, 0.797885, 0.577350), (3, 0.921318, 0.774597), (6, 0.972659, 0.904534),
     (25, 0.994695, 0.979379)],
)  # fmt: skip
def test_kappa_moments(kappa, flux_ratio, debye_ratio):
    n, T = 1e6, 300.0
    found = distribution_moments(Kappa(n, T, float(kappa)), m_e)
    thermal = n * np.sqrt(e * T / (2.0 * np.pi * m_e))
    assert found.density_m3 == pytest.approx(n, rel=1e-10)
    assert found.mean_energy_eV == pytest.approx(1.5 * T, rel=1e-10)
    assert found.number_flux_m2_s / thermal == pytest.approx(flux_ratio, rel=1e-6)
    plasma = plasma_of(population_of(ELECTRON, Kappa(n, T, float(kappa))))
    maxwellian = np.sqrt(epsilon_0 * T / (e * n))
    assert electron_debye_length_m(plasma) / maxwellian == pytest.approx(debye_ratio, rel=1e-5)


@pytest.mark.parametrize("kappa", [1.6, 1.9, 2.0, 2.3, 7.0])
def test_kappa_moments_against_integrals(kappa):
    """Integrals of the printed flux over ln E; the energy flux is infinite up to kappa = 2."""
    mp.dps = 20
    n, T = 1e6, 300.0
    k, a = mp.mpf(kappa), (mp.mpf(kappa) - mp.mpf(3) / 2) * T
    edges = [mp.mpf(x) for x in (-60, -20, -5, -1, 1, 5, 20, 60, 200, 700)]

    def integral(power: float) -> float:
        # of f E^power dE with f = (1 + E/a)^(-k - 1), in units of a
        def inside(s):
            return mp.exp((power + 1) * s) * (1 + mp.exp(s)) ** (-k - 1)

        return mp.quad(inside, edges, method="gauss-legendre", maxdegree=6)

    density = integral(0.5)
    found = distribution_moments(Kappa(n, T, kappa), m_e)
    assert found.mean_energy_eV == pytest.approx(float(a * integral(1.5) / density), rel=1e-9)
    debye = density / (integral(-0.5) / (2 * a))
    assert found.debye_temperature_eV == pytest.approx(float(debye), rel=1e-9)
    # one-sided flux over density: pi int E f dE against 4 pi int E f/v dE
    speed = mp.sqrt(2 * mp.mpf(e) * a / mp.mpf(m_e))
    flux = integral(1.0) / (4 * density / speed)
    assert found.number_flux_m2_s / n == pytest.approx(float(flux), rel=1e-9)
    if kappa > 2.0:
        energy = float(a * integral(2.0) / integral(1.0))
        assert found.energy_flux_eV_m2_s / found.number_flux_m2_s == pytest.approx(energy, rel=1e-9)
    else:
        assert found.energy_flux_eV_m2_s == np.inf


def test_kappa_becomes_a_maxwellian():
    energy = np.geomspace(1.0, 3e3, 60)
    near = Kappa(1e6, 300.0, 200.0).flux(energy, m_e)
    far = Kappa(1e6, 300.0, 100.0).flux(energy, m_e)
    exact = Maxwellian(1e6, 300.0).flux(energy, m_e)
    wrong = np.abs(near / exact - 1.0), np.abs(far / exact - 1.0)
    assert wrong[0].max() < 0.3
    # the difference falls as 1/kappa
    assert (wrong[1] / wrong[0])[:-5] == pytest.approx(2.0, rel=0.3)


def test_kappa_flux_is_the_printed_phase_space_density():
    # j = 2 e^2 E f/m^2, f in velocity as Pierrard & Lazar 2010 write it
    mp.dps = 25
    n, T, k = mp.mpf("1e6"), mp.mpf(50), mp.mpf("3.7")
    w2 = (2 * k - 3) * mp.mpf(e) * T / (k * mp.mpf(m_e))
    for energy in (0.3, 20.0, 900.0, 4e4):
        v2 = 2 * mp.mpf(e) * energy / mp.mpf(m_e)
        f = n * mp.gamma(k + 1) / ((mp.pi * k * w2) ** 1.5 * mp.gamma(k - 0.5))
        f *= (1 + v2 / (k * w2)) ** (-k - 1)
        exact = 2 * mp.mpf(e) ** 2 * energy * f / mp.mpf(m_e) ** 2
        found = Kappa(1e6, 50.0, 3.7).flux(np.array([energy]), m_e)[0]
        assert found == pytest.approx(float(exact), rel=1e-12)


# ECSS-E-ST-10-04C (2008) clause 8.2.3: what its figures integrate to, computed apart from this
# code with CODATA 2018: currents 18.470 and 10.301 uA m-2, densities 7.850 and 2.953 cm-3,
# energy flux 442.7 erg cm-2 s-1, directional flux 5.716e9, above 14 keV 3.351e9 cm-2 s-1 sr-1.
def test_ecss_auroral_integral_fluxes():
    plasma = load_plasma("ECSS auroral worst case")
    found = moments(plasma)
    assert found["current_density_A_m2"][0] == pytest.approx(-28.771e-6, rel=5e-5)
    assert found["current_density_A_m2"][1] == pytest.approx(8.774e-9, rel=5e-4)
    assert found["density_m3"][0] == pytest.approx((7.850 + 2.953) * 1e6, rel=2e-4)
    erg = found["energy_flux_eV_m2_s"][0] * e * 1e3
    assert erg == pytest.approx(442.7, rel=2e-4)
    assert found["number_flux_m2_s"][0] / np.pi * 1e-4 == pytest.approx(5.716e9, rel=2e-4)
    above = np.concatenate(
        [np.linspace(14e3, 17440.0, 200001), np.geomspace(17440.001, 4e5, 400001)]
    )
    flux = ECSS_AURORAL.flux(above, m_e)
    integral = float((np.diff(above) * (flux[1:] + flux[:-1]) / 2.0).sum()) * 1e-4
    assert integral == pytest.approx(3.351e9, rel=3e-4)
    before, after = ECSS_AURORAL.flux(np.array([17440.0, 17440.0 * (1 + 1e-12)]), m_e)
    assert after / before == pytest.approx(1.00085, abs=1e-4)


def test_fontheim_against_mpmath():
    mp.dps = 25

    def flux(energy):
        beam = mp.mpf("3.5e9") * mp.exp(-(((energy - 10000) / mp.mpf(3000)) ** 2))
        x = energy / 3000
        return mp.mpf("3e11") * energy ** mp.mpf("-1.1") + mp.mpf("1e8") * x * mp.exp(-x) + beam

    edges = [50, 100, 300, 1000, 3000, 8000, 12000, 20000, 40000]
    exact = mp.pi * mp.quad(flux, edges)
    speed = mp.sqrt(2 * mp.mpf(e) / mp.mpf(m_e))
    density = 4 * mp.pi * mp.quad(lambda E: flux(E) / (speed * mp.sqrt(E)), edges)
    found = distribution_moments(ARC, m_e)
    assert found.number_flux_m2_s == pytest.approx(float(exact), rel=1e-12)
    assert found.density_m3 == pytest.approx(float(density), rel=1e-12)
    outside = ARC.flux(np.array([49.9, 50.0, 4e4, 40001.0]), m_e)
    assert (outside > 0.0).tolist() == [False, True, True, False]


def test_beam_a_thousandth_of_its_energy_wide():
    narrow = Fontheim(0.0, 1.0, 0.0, 1.0, 1e9, 1e4, 10.0, 1.0, 1e5)
    exact = np.pi * 1e9 * 10.0 * np.sqrt(np.pi)
    assert distribution_moments(narrow, m_e).number_flux_m2_s == pytest.approx(exact, rel=1e-11)


def test_flanks_at_a_cutoff_against_mpmath():
    """Only the flank of a beam, or of a Maxwellian, lies between the cut-offs."""
    mp.dps = 25
    beams = ((1e4, 9e3, 200.0, 5e4), (100.0, 60.0, 12.0, 4e4))
    for low, centre, width, high in beams:
        found = distribution_moments(
            Fontheim(0.0, 1.0, 0.0, 1.0, 1e20, centre, width, low, high), m_e
        )
        far = mp.erfc((mp.mpf(low) - centre) / width)
        exact = mp.pi * mp.mpf("1e20") * width * mp.sqrt(mp.pi) / 2 * far
        assert found.number_flux_m2_s == pytest.approx(float(exact), rel=1e-10)
    top = distribution_moments(Fontheim(0.0, 1.0, 0.0, 1.0, 1e20, 9e3, 200.0, 10.0, 8e3), m_e)
    exact = mp.pi * mp.mpf("1e20") * 200 * mp.sqrt(mp.pi) / 2 * mp.erfc(5)
    assert top.number_flux_m2_s == pytest.approx(float(exact), rel=1e-10)
    cold = distribution_moments(Fontheim(0.0, 1.0, 1e20, 2.0, 0.0, 1e3, 1e2, 50.0, 1e4), m_e)
    # int x e^-x W dx from x0 = 25
    assert cold.number_flux_m2_s == pytest.approx(np.pi * 1e20 * 2.0 * 26.0 * np.exp(-25.0))


def test_no_particles_between_the_cutoffs():
    beyond = Fontheim(0.0, 1.1, 0.0, 3e3, 3.5e9, 1e6, 3e3, 50.0, 4e4)
    with pytest.raises(EnvironmentDataError, match="holds no particles") as caught:
        distribution_moments(beyond, m_e)
    assert caught.value.key == ("law",)


def test_steep_segment_of_a_table():
    # j = (E/100)^-p between 100 and 110 eV, p = ln(1e50)/ln(1.1)
    table = Tabulated((50.0, 100.0, 110.0), (1e25, 1e25, 1e-25))
    p = 50.0 * np.log(10.0) / np.log(1.1)
    exact = np.pi * 1e25 * (25.0 + 50.0 + 100.0 / (p - 1.0))
    assert distribution_moments(table, m_e).number_flux_m2_s == pytest.approx(exact, rel=1e-12)


# (E0, T0, density): T0 down to 1e-5 of E0, the tail large or small against the plateau
@pytest.mark.parametrize(
    ("E0", "T", "density"),
    [(16008.0, 0.17, 1e6), (16008.0, 0.17, 1e10), (5000.0, 100.0, 1.13e6), (5e3, 100.0, 1e3),
     (17440.0, 3960.0, 1.13e6), (30.0, 4e3, 1e6)],
)  # fmt: skip
def test_flat_and_maxwellian_repelled_in_closed_form(E0, T, density):
    r"""Share beyond l: f0 (E0 - l)^2/2 + N T (E0 - l + T), above E0 N T^2 e^{-(l - E0)/T}."""
    f0 = 3.9e-18
    N = density * (m_e / (2.0 * np.pi * e * T)) ** 1.5
    law = FlatAndMaxwellian(f0, E0, density, T)

    def beyond(lost):
        left = np.maximum(E0 - lost, 0.0)
        tail = N * T * (left + T) * np.exp(-np.maximum(lost - E0, 0.0) / T)
        return f0 * left**2 / 2.0 + tail

    near = E0 - np.geomspace(1e-3, 1.0, 20) * E0
    lost = np.concatenate([[0.0], near, E0 + T * np.linspace(0.0, 20.0, 9)])
    flux = 2.0 * np.pi * e**2 / m_e**2 * beyond(np.zeros(1))[0]
    assert distribution_moments(law, m_e).number_flux_m2_s == pytest.approx(flux, rel=1e-12)
    energy, weight = energy_nodes(1e-7, law.top_eV, panel_marks_eV(law), lost)
    arriving = law.flux(energy + lost[:, None], m_e) * energy / (energy + lost[:, None])
    found = np.pi * (arriving * weight).sum(axis=-1) / flux
    assert found == pytest.approx(beyond(lost) / beyond(np.zeros(1)), rel=1e-10)


def test_tabulated_maxwellian_comes_near_the_maxwellian():
    exact = Maxwellian(1e6, 500.0)
    energy = np.geomspace(5.0, 15e3, 60)
    table = Tabulated(tuple(energy), tuple(exact.flux(energy, m_e)))
    ours, wanted = distribution_moments(table, m_e), distribution_moments(exact, m_e)
    assert ours.number_flux_m2_s == pytest.approx(wanted.number_flux_m2_s, rel=5e-3)
    assert ours.density_m3 == pytest.approx(wanted.density_m3, rel=5e-3)
    assert extrapolated_share(population_of(ELECTRON, table)) < 1e-3
    # power laws between channels: the integral of one segment by hand
    two = Tabulated((10.0, 100.0, 1000.0), (1e6, 1e4, 1e2))
    by_hand = np.pi * (1e6 * 10.0 / 2.0 + 1e8 * (1 / 10.0 - 1 / 1000.0))
    assert distribution_moments(two, m_e).number_flux_m2_s == pytest.approx(by_hand, rel=1e-12)


def test_extrapolated_share_warns_above_a_tenth():
    def steep(first):
        energy = np.geomspace(first, 1e4, 30)
        return population_of(ELECTRON, Tabulated(tuple(energy), tuple(1e9 * energy**-1.0)))

    shares = [extrapolated_share(steep(first)) for first in (1.0, 1000.0)]
    # int below = j1 E1/2, above = A ln(Elast/E1) with j = A/E
    assert shares == pytest.approx([0.5 / (0.5 + np.log(1e4)), 0.5 / (0.5 + np.log(10.0))])
    assert warnings_of(plasma_of(steep(1.0))) == ()
    assert "18 %" in warnings_of(plasma_of(steep(1000.0)))[0]


@pytest.mark.parametrize(
    "make",
    [
        lambda: Tabulated((1.0, 2.0), (1.0, 1.0)),
        lambda: Tabulated((1.0, 3.0, 2.0), (1.0, 1.0, 1.0)),
        lambda: Tabulated((1.0, 2.0, 3.0), (1.0, 0.0, 1.0)),
        lambda: Tabulated((1.0, 2.0, 3.0), (1.0, 1.0)),
        lambda: Fontheim(1e9, 1.0, 0.0, 1.0, 0.0, 1e3, 1e2, 100.0, 50.0),
        lambda: Fontheim(0.0, 1.0, 0.0, 1.0, 0.0, 1e3, 1e2, 10.0, 50.0),
        lambda: Tabulated((1e-300, 1.0, 1e300), (1.0, 1.0, 1.0)),
        lambda: Tabulated((1.0, 2.0, 3.0), (1.0, 1e31, 1.0)),
        lambda: Tabulated((1.0, 2.0, 3.0), (1.0, 1e-31, 1.0)),
    ],
)
def test_refused(make):
    with pytest.raises(EnvironmentDataError):
        make()


ROW = {
    "kappa": {"density_m3": 1e6, "temperature_eV": 1e3, "kappa": 5.0},
    "fontheim": {
        "pitch_angle": "isotropic",
        "power_coefficient_m2_s_sr_eV": 3e11,
        "power_exponent": 1.1,
        "maxwellian_coefficient_m2_s_sr_eV": 1e8,
        "maxwellian_energy_eV": 3e3,
        "gaussian_coefficient_m2_s_sr_eV": 3.5e9,
        "gaussian_energy_eV": 1e4,
        "gaussian_width_eV": 3e3,
        "low_cutoff_eV": 50.0,
        "high_cutoff_eV": 4e4,
    },
    "flat and maxwellian": {
        "pitch_angle": "isotropic",
        "flat_phase_space_density_s3_m6": 3.9e-18,
        "flat_up_to_eV": 17440.0,
        "maxwellian_density_m3": 1.13e6,
        "maxwellian_temperature_eV": 3960.0,
    },
    "tabulated": {"energy_eV": [10.0, 1e2, 1e3], "flux_m2_s_sr_eV": [1e6, 1e5, 1e3]},
    "maxwellian": {"density_m3": 1e6, "temperature_eV": 1e3},
}


def document(row):
    return {"title": "t", "source": "s", "population": [row]}


def test_every_law_has_a_row_here():
    assert set(ROW) == set(DISTRIBUTIONS)


@pytest.mark.parametrize("law", sorted(DISTRIBUTIONS))
def test_reader_takes_each_law_and_needs_every_key(law):
    row = {"species": "electron", "law": law, **ROW[law]}
    found = read_plasma(document(row)).populations[0]
    assert found.law == law
    assert found.density_m3 > 0.0
    for key in ROW[law]:
        rest = {k: v for k, v in row.items() if k != key}
        with pytest.raises(EnvironmentDataError) as caught:
            read_plasma(document(rest))
        assert caught.value.key[-1] == key
    with pytest.raises(EnvironmentDataError):
        read_plasma(document({**row, "unheard_of": 1.0}))


def test_pitch_angle_must_be_isotropic():
    row = {"species": "electron", "law": "fontheim", **ROW["fontheim"], "pitch_angle": "beam"}
    with pytest.raises(EnvironmentDataError, match="isotropic"):
        read_plasma(document(row))


@pytest.mark.parametrize("ending", ["csv", "nc"])
def test_spectrum_files(tmp_path: Path, ending: str):
    energy, flux = [10.0, 100.0, 1000.0], [1e6, 1e5, 1e3]
    path = tmp_path / f"spectrum.{ending}"
    if ending == "csv":
        lines = [f"{a},{b}" for a, b in zip(energy, flux, strict=True)]
        path.write_text("# a comment\nenergy_eV,flux_m2_s_sr_eV\n" + "\n".join(lines))
    else:
        xr.Dataset(
            {"energy_eV": ("channel", energy), "flux_m2_s_sr_eV": ("channel", flux)}
        ).to_netcdf(path)
    row = {"species": "H+", "law": "tabulated", "spectrum_file": path.name}
    found = read_plasma(document(row), tmp_path).populations[0]
    assert found.species is HYDROGEN_ION
    assert found.distribution == Tabulated(tuple(energy), tuple(flux))
    for bad, folder in ((row, None), ({**row, "spectrum_file": "../x.csv"}, tmp_path),
                        ({**row, "spectrum_file": "none.csv"}, tmp_path),
                        ({**row, "energy_eV": [1.0]}, tmp_path)):  # fmt: skip
        with pytest.raises(EnvironmentDataError):
            read_plasma(document(bad), folder)


@pytest.mark.parametrize(
    "text",
    [
        "",
        "energy,flux\n1,2\n",
        "energy_eV,flux_m2_s_sr_eV\n1,x\n",
        "energy_eV,flux_m2_s_sr_eV\n1,nan\n2,1\n3,1\n",
        "energy_eV,flux_m2_s_sr_eV\n1e-300,1\n2,1\n1e300,1\n",
        "energy_eV,flux_m2_s_sr_eV\n1,1e-31\n2,1\n3,1\n",
        "energy_eV,flux_m2_s_sr_eV\n1,1\n2,1e31\n3,1\n",
    ],
)
def test_bad_csv(tmp_path: Path, text: str):
    (tmp_path / "a.csv").write_text(text)
    row = {"species": "electron", "law": "tabulated", "spectrum_file": "a.csv"}
    with pytest.raises(EnvironmentDataError):
        read_plasma(document(row), tmp_path)


def test_solar_wind_has_core_and_halo():
    wind = load_plasma("solar wind at 1 AU")
    assert [p.law for p in wind.populations[:2]] == ["maxwellian", "kappa"]
    assert isinstance(wind.populations[1], Population)
    assert electron_debye_length_m(wind) == pytest.approx(9.4, rel=0.01)
