"""Environments against published figures and independent computations.

Tolerance = precision of the publication. Figures from memory say so and are wide.
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import pytest
from scipy.constants import c, e, h, physical_constants
from scipy.constants import m_e as electron_mass

from environments.catalogue import load_plasma
from environments.eclipse import find_eclipses
from environments.orbit import (
    EARTH_RADIUS_M,
    KeplerOrbit,
    drift_rates_rad_s,
    period_s,
    position_velocity,
)
from environments.plasma import (
    ELECTRON,
    Plasma,
    Population,
    electron_debye_length_m,
    moments,
    one_sided_maxwellian_current,
)
from environments.spectrum import solar_spectrum
from environments.sun import sun_path

PROTON_MASS = physical_constants["proton mass"][0]


@dataclass(frozen=True)
class Check:
    quantity: str
    published: float
    unit: str
    tolerance: float
    source: str
    basis: str
    ours: Callable[[], float]


def photons(low_nm: float, high_nm: float, f107: float = 80.0) -> float:
    """Photons of all bins that lie between two wavelengths [cm-2 s-1]."""
    s = solar_spectrum(f107=f107)
    inside = (s.wavelength_low_nm >= low_nm) & (s.wavelength_high_nm <= high_nm)
    return float(s.photon_flux_m2_s[inside].sum()) * 1e-4


def centred(low_nm: float, high_nm: float) -> float:
    """Photons of EUV bins whose centre lies between two wavelengths [cm-2 s-1], P = 80."""
    s = solar_spectrum(f107=80.0)
    centre = 0.5 * (s.wavelength_low_nm + s.wavelength_high_nm)
    inside = (centre >= low_nm) & (centre < high_nm) & (np.array(s.band) == "EUV")
    return float(s.photon_flux_m2_s[inside].sum()) * 1e-4


def x_ray_with_full_last_bin() -> float:
    """Undo the share of the bin 3.2-7 nm that the composite uses [cm-2 s-1], P = 80."""
    s = solar_spectrum(f107=80.0)
    x_ray = s.photon_flux_m2_s[np.array(s.band) == "X-ray"] * 1e-4
    return float(x_ray[:-1].sum() + x_ray[-1] * (7.0 - 3.2) / (5.0 - 3.2))


def lyman_alpha(f107: float) -> float:
    s = solar_spectrum(f107=f107)
    return float(s.photon_flux_m2_s[s.band.index("Lyman-alpha")]) * 1e-4


def irradiance_W_m2(low_nm: float, high_nm: float) -> float:
    s = solar_spectrum()
    inside = (s.wavelength_low_nm >= low_nm) & (s.wavelength_high_nm <= high_nm)
    return float((s.photon_flux_m2_s * s.photon_energy_eV * e)[inside].sum())


def total_current(name: str, sign: int) -> float:
    """Random current of all electrons (-1) or ions (+1) of a catalogue entry [A m-2]."""
    current = moments(load_plasma(name))["current_density_A_m2"]
    return float(abs(current[np.sign(current) == sign].sum()))


# Sums over the published bins, written out with the formula; they check the composition,
# the activity law and the units, not the Sun.
EUV = "Richards, Fennelly & Torr 1994, sum of F74113 (1 + A (P - 80)) over the 37 bins"
E490 = "ASTM E490-00a, sum of E lambda/(h c) over its samples"
SPECTRUM = [
    Check(
        f"EUV 5-105 nm, P = {P}", value, "cm-2 s-1", 1e-3, EUV, "derived",
        lambda P=P: photons(5.0, 105.0, P),
    )
    for P, value in ((80, 5.247e10), (100, 6.161e10), (150, 8.446e10), (200, 1.073e11))
] + [
    Check("EUV centres 5-30 nm", 1.190e10, "cm-2 s-1", 1e-3, EUV, "derived",
          lambda: centred(5.0, 30.0)),
    Check("EUV centres 30-60 nm", 1.339e10, "cm-2 s-1", 1e-3, EUV, "derived",
          lambda: centred(30.0, 60.0)),
    Check("EUV centres 60-91.2 nm", 1.025e10, "cm-2 s-1", 1e-3, EUV, "derived",
          lambda: centred(60.0, 91.2)),
    Check("EUV centres 91.2-105 nm", 1.694e10, "cm-2 s-1", 1e-3, EUV, "derived",
          lambda: centred(91.2, 105.0)),
    # 50.1 + 1e4 + 2e6 + 2.85e7 + 5.326e8
    Check("X-ray 0.05-7 nm", 5.631e8, "cm-2 s-1", 1e-3,
          "Solomon & Qian 2005, sum of the five bins", "derived", x_ray_with_full_last_bin),
    # 3.298e9 + 3.2e9 + 8.399e9
    Check("FUV 105-120 nm", 1.490e10, "cm-2 s-1", 1e-3,
          "Woods & Rottman 2002, sum of three bins", "derived", lambda: photons(105.0, 120.0)),
    Check("E490 123-150 nm", 1.0253e11, "cm-2 s-1", 1e-3, E490, "derived",
          lambda: photons(123.0, 150.0)),
    Check("E490 150-175 nm", 7.3971e11, "cm-2 s-1", 1e-3, E490, "derived",
          lambda: photons(150.0, 175.0)),
    Check("E490 175-200 nm", 8.0651e12, "cm-2 s-1", 1e-3, E490, "derived",
          lambda: photons(175.0, 200.0)),
    Check("E490 200-250 nm", 2.299e14, "cm-2 s-1", 1e-3, E490, "derived",
          lambda: photons(200.0, 250.0)),
    Check("E490 250-300 nm", 1.805e15, "cm-2 s-1", 1e-3, E490, "derived",
          lambda: photons(250.0, 300.0)),
    Check("E490 300-350 nm", 6.4596e15, "cm-2 s-1", 1e-3, E490, "derived",
          lambda: photons(300.0, 350.0)),
    Check("E490 350-400 nm", 9.9621e15, "cm-2 s-1", 1e-3, E490, "derived",
          lambda: photons(350.0, 400.0)),
    # 106.6 W m-2 from 119 nm, of which 119-123 nm 6.7e-3
    Check("E490 123-400 nm, power", 106.6, "W m-2", 1e-3,
          "ASTM E490-00a, sum of the irradiance", "derived",
          lambda: irradiance_W_m2(123.0, 400.0)),
    # an independent table: the 17 bins of the coarse scheme from 7 nm, and four X-ray bins
    Check(
        "0.05-105 nm against the 22-bin scheme",
        (1.27e9 + 5.612e9 + 4.342e9 + 8.38e9 + 2.861e9 + 4.83e9)
        + (1.142e9 + 1.459e9 + 8.448e8 + 2.364e9 + 3.655e9)
        + (3.818e8 + 7.156e8 + 1.028e9 + 4.482e9 + 4.419e9 + 4.235e9)
        + 5.631e8,
        "cm-2 s-1", 1e-2, "Solomon & Qian 2005, table of 22 bins", "handbook",
        lambda: photons(0.0, 105.0),
    ),
    # a second instrument where the two tables overlap
    Check("130-135 nm against the FUV reference", 2.659e10, "cm-2 s-1", 0.1,
          "Woods & Rottman 2002", "handbook", lambda: photons(130.0, 135.0)),
    Check("170-175 nm against the FUV reference", 3.397e11, "cm-2 s-1", 0.1,
          "Woods & Rottman 2002", "handbook", lambda: photons(170.0, 175.0)),
    # 3.94e11 and 3.94e11 (1 + 0.00423 120)
    Check("Lyman-alpha, P = 80", 3.94e11, "cm-2 s-1", 1e-3,
          "Woods & Rottman 2002", "handbook", lambda: lyman_alpha(80.0)),
    Check("Lyman-alpha, P = 200", 5.94e11, "cm-2 s-1", 1e-3,
          "Woods & Rottman 2002, scaled", "derived", lambda: lyman_alpha(200.0)),
    # E490 of 120-123 nm, 4.068e11, measured at some activity between minimum and mean
    Check("Lyman-alpha against E490, P = 80", 4.068e11, "cm-2 s-1", 0.1, E490, "derived",
          lambda: lyman_alpha(80.0)),
    Check("Lyman-alpha at solar minimum", 3.5e11, "cm-2 s-1", 0.15,
          "Woods et al. 2000, J. Geophys. Res. 105, 27195", "memory", lambda: lyman_alpha(68.0)),
    Check("Lyman-alpha at solar maximum", 6.0e11, "cm-2 s-1", 0.15,
          "Woods et al. 2000, J. Geophys. Res. 105, 27195", "memory", lambda: lyman_alpha(200.0)),
]  # fmt: skip

NRL = "NRL Plasma Formulary, fundamental plasma parameters"
GARRETT = "Garrett, Schwank & DeForest 1981, averages as tabulated in NASA TP-2361"
PLASMA = [
    # v_Te = (kT/m)^(1/2) = 4.19e7 cm/s sqrt(T); J = e n v/sqrt(2 pi)
    Check("electron thermal speed at 1 eV", 4.19e5, "m s-1", 2e-3, NRL, "memory",
          lambda: float(-one_sided_maxwellian_current(1.0, 1.0)) / e * np.sqrt(2.0 * np.pi)),
    # v_Ti = 9.79e5 cm/s sqrt(T/mu)
    Check("proton thermal speed at 1 eV", 9.79e3, "m s-1", 2e-3, NRL, "memory",
          lambda: float(one_sided_maxwellian_current(1.0, 1.0, mass_kg=PROTON_MASS,
                        charge_number=1)) / e * np.sqrt(2.0 * np.pi)),
    # lambda_D = 7.43e2 cm sqrt(T/n)
    Check("Debye length at 1 eV, 1 cm-3", 7.43, "m", 2e-3, NRL, "memory",
          lambda: electron_debye_length_m(Plasma("x", "x", "x", "assumed", None, "",
                  (Population(ELECTRON, "maxwellian", 1e6, 1.0),)))),
    # currents measured on the same data as the two-Maxwellian fits: nA cm-2 = 1e-5 A m-2.
    # Means of products differ from products of means, hence 30 percent.
    *(
        Check(f"{name}, electron current", electron * 1e-5, "A m-2", 0.3, GARRETT, "memory",
              lambda name=name: total_current(name, -1))
        for name, electron in (("average geostationary, ATS-5", 0.068),
                               ("average geostationary, ATS-6", 0.096),
                               ("average geostationary, 1979", 0.115))
    ),
    *(
        Check(f"{name}, ion current", ion * 1e-8, "A m-2", 0.3, GARRETT, "memory",
              lambda name=name: total_current(name, +1))
        for name, ion in (("average geostationary, ATS-5", 5.1),
                          ("average geostationary, ATS-6", 3.4),
                          ("average geostationary, 1979", 3.3))
    ),
    # by hand: 26.806 nA m-2 per cm-3 and sqrt(eV) for electrons, 0.62557 for protons:
    # 26.806 (0.2 sqrt(400) + 1.2 sqrt(27500)), 0.62557 (0.6 sqrt(200) + 1.3 sqrt(28000))
    Check("ECSS worst case, electron current", 5.4415e-6, "A m-2", 1e-4,
          "e n sqrt(eT/(2 pi m)) by hand", "derived",
          lambda: total_current("ECSS geostationary worst case", -1)),
    Check("ECSS worst case, ion current", 1.4139e-7, "A m-2", 1e-4,
          "e n sqrt(eT/(2 pi m)) by hand", "derived",
          lambda: total_current("ECSS geostationary worst case", +1)),
    # 7.43394 (0.2/400 + 1.2/27500)^(-1/2)
    Check("ECSS worst case, electron Debye length", 318.8, "m", 1e-3,
          "7.43394 (sum n/T)^(-1/2) by hand", "derived",
          lambda: electron_debye_length_m(load_plasma("ECSS geostationary worst case"))),
    # 7.43394 (1.0/100 + 0.1/3000)^(-1/2)
    Check("quiet geostationary, electron Debye length", 74.2, "m", 1e-3,
          "7.43394 (sum n/T)^(-1/2) by hand", "derived",
          lambda: electron_debye_length_m(load_plasma("quiet geostationary"))),
]  # fmt: skip


def longest_umbra_min(orbit: KeplerOrbit, days: float) -> float:
    found = find_eclipses(
        lambda t: position_velocity(orbit, t)[0], sun_path(orbit.epoch), 0.0, days * 86400.0
    )
    return max(eclipse.umbra_s for eclipse in found) / 60.0


def equinox_penumbra_min(of_each: bool) -> float:
    """First to last contact, or the part before the umbra, of the longest eclipse [min]."""
    orbit = KeplerOrbit(np.datetime64("2031-03-16"), 42164.17, 0.0, 0.0)
    found = find_eclipses(
        lambda t: position_velocity(orbit, t)[0], sun_path(orbit.epoch), 0.0, 10 * 86400.0
    )
    whole = [x for x in found if x.penumbra_start is not None and x.penumbra_end is not None]
    longest = max(whole, key=lambda x: x.umbra_s)
    assert longest.penumbra_start is not None
    assert longest.penumbra_end is not None
    assert longest.umbra_start is not None
    if of_each:
        return (longest.umbra_start - longest.penumbra_start) / 60.0
    return (longest.penumbra_end - longest.penumbra_start) / 60.0


def season(umbra: bool) -> float:
    """Days between the first and last eclipse of the spring season 2031."""
    orbit = KeplerOrbit(np.datetime64("2031-02-01"), 42164.17, 0.0, 0.0)
    found = find_eclipses(
        lambda t: position_velocity(orbit, t)[0], sun_path(orbit.epoch), 0.0, 100 * 86400.0
    )
    return float(sum(1 for x in found if x.umbra_s > 0.0 or not umbra))


GEO = KeplerOrbit(np.datetime64("2031-03-20"), 42164.17, 0.0, 0.0)
LEO = KeplerOrbit(np.datetime64("2031-03-20"), EARTH_RADIUS_M / 1e3 + 400.0, 0.0, 0.0)
ORBIT = [
    # umbral cone, half-width asin(6378.137/42164.17) - 0.264 = 8.436 deg, at 0.25 deg/min
    Check("geostationary umbra at equinox", 67.5, "min", 0.5 / 67.5,
          "umbral cone by hand; 67.4 min observed on 26 September 2010", "derived",
          lambda: longest_umbra_min(KeplerOrbit(np.datetime64("2031-03-16"), 42164.17, 0, 0), 10)),
    # half-width 8.700 + 0.269 deg; handbooks quote 72
    Check("geostationary eclipse, first to last contact", 71.8, "min", 0.5 / 71.8,
          "penumbral cone by hand", "derived", lambda: equinox_penumbra_min(False)),
    Check("geostationary penumbra on each side", 2.13, "min", 0.02,
          "0.533 deg at 0.25 deg/min", "derived", lambda: equinox_penumbra_min(True)),
    # declination within +-8.436 and +-8.969 deg: one eclipse a day
    Check("geostationary season with umbra", 43.9, "days", 1.5 / 43.9,
          "solar declination within the umbral half-width", "derived", lambda: season(True)),
    Check("geostationary season with penumbra", 46.8, "days", 1.5 / 46.8,
          "solar declination within the penumbral half-width", "derived", lambda: season(False)),
    Check("sidereal period of the geostationary orbit", 86164.1, "s", 1e-5,
          "definition of the orbit", "memory", lambda: period_s(GEO)),
    Check("period at 400 km", 92.6, "min", 1e-3, "2 pi sqrt(a^3/GM)", "derived",
          lambda: period_s(LEO) / 60.0),
    # cylinder at beta 0, 36.1 min; its umbral cone is 2 x 4.1 s shorter
    Check("umbra at 400 km, Sun in the plane", 36.1 - 8.2 / 60.0, "min", 5e-3,
          "2 asin(R/(R + h)) over the mean motion, less the penumbra", "derived",
          lambda: longest_umbra_min(LEO, 1.0)),
    # sun-synchronous: 360 deg in a year of 365.2422 days; 98.6 deg at 800 km
    Check("node rate of a sun-synchronous orbit at 800 km", 0.9856, "deg/day", 5e-3,
          "360 deg per tropical year; inclination 98.6 deg (3 digits)", "memory",
          lambda: float(np.degrees(drift_rates_rad_s(
              KeplerOrbit(np.datetime64("2031-03-20"), 7178.137, 0.0, 98.60))[0]) * 86400.0)),
    Check("node rate at 400 km, 51.6 deg", -5.0, "deg/day", 2e-2,
          "rule of thumb for the station's orbit", "memory",
          lambda: float(np.degrees(drift_rates_rad_s(
              KeplerOrbit(np.datetime64("2031-03-20"), 6778.137, 0.0, 51.6))[0]) * 86400.0)),
]  # fmt: skip


@pytest.mark.parametrize("check", SPECTRUM + PLASMA + ORBIT, ids=lambda check: check.quantity)
def test_published(check):
    ours = check.ours()
    agrees = ours == pytest.approx(check.published, rel=check.tolerance)
    if check.basis == "memory" and not agrees:
        # nobody has looked at the page: a reason to look, not to stop
        pytest.xfail(f"{ours:g} against {check.published:g} {check.unit} from memory")
    assert agrees, f"{ours:g} against {check.published:g} {check.unit}: {check.source}"


def test_thermal_speed_convention_is_not_what_makes_it_agree():
    """The flux is n vbar/4 with the mean speed vbar = sqrt(8 eT/(pi m))."""
    mean_speed = np.sqrt(8.0 * e * 100.0 / (np.pi * electron_mass))
    assert float(one_sided_maxwellian_current(1e6, 100.0)) == pytest.approx(
        -e * 1e6 * mean_speed / 4.0, rel=1e-14
    )


def test_photon_energy_of_lyman_alpha():
    # h c/(121.567 nm) = 10.1988 eV; Rydberg: 13.5983 eV x 3/4 = 10.199 eV
    s = solar_spectrum()
    line = s.photon_energy_eV[s.band.index("Lyman-alpha")]
    assert line == pytest.approx(h * c / (121.567e-9 * e), rel=1e-12)
    assert line == pytest.approx(0.75 * 13.5983, rel=1e-4)
