"""The solar spectrum and photoemission against tables, closed forms and other data."""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial
from math import pi

import numpy as np
from scipy.constants import e

from charging.evidence.check import Check
from charging.photo_table import photoyield_table
from environments.spectrum import SolarSpectrum, solar_spectrum
from materials import load_material
from materials.photo_laws import fowler_function, law_yield
from materials.photoelectron_energies import direct_escape
from materials.photoemission import photo_current_density, yield_per_photon
from materials.record import PhotoYield
from materials.surface_state import aged_photoyield, shift_barrier

EUV = "Richards, Fennelly & Torr 1994, sum of F74113 (1 + A (P - 80)) over the 37 bins"
E490 = "ASTM E490-00a, sum of E lambda/(h c) over its samples"
SOLOMON = "Solomon & Qian 2005, J. Geophys. Res. 110, A10306, table of 22 bins"
WOODS = "Woods & Rottman 2002, Comparative Aeronomy in the Solar System, AGU Monograph 130"
WASS = (
    "Wass, Hollington, Sumner, Yang & Pfeil 2019, Rev. Sci. Instrum. 90, 064501 (abstract): "
    "gold-plated surfaces, 1e-5 to 4.4e-5 at 4.8 to 6.2 eV"
)
NAKAGAWA = (
    "Nakagawa, Ishii, Tsuruda, Hayakawa & Mukai 2000, Earth Planets Space 52, 283 (abstract): "
    "85 +- 33 uA m-2"
)
GRARD = "Grard 1973, J. Geophys. Res. 78, 2885 (memory); the level of the curve was set from it"
# the 17 bins of the coarse scheme from 7 nm on, and the X-ray bins below, P = 80
COARSE_BINS = (
    1.27e9 + 5.612e9 + 4.342e9 + 8.38e9 + 2.861e9 + 4.83e9
    + 1.142e9 + 1.459e9 + 8.448e8 + 2.364e9 + 3.655e9
    + 3.818e8 + 7.156e8 + 1.028e9 + 4.482e9 + 4.419e9 + 4.235e9
    + 5.631e8
)  # fmt: skip


def _photons_cm2_s(low_nm: float, high_nm: float, f107: float = 80.0) -> float:
    s = solar_spectrum(f107=f107)
    inside = (s.wavelength_low_nm >= low_nm) & (s.wavelength_high_nm <= high_nm)
    return float(s.photon_flux_m2_s[inside].sum()) * 1e-4


def _power_W_m2(low_nm: float, high_nm: float) -> float:
    s = solar_spectrum()
    inside = (s.wavelength_low_nm >= low_nm) & (s.wavelength_high_nm <= high_nm)
    return float((s.photon_flux_m2_s * s.photon_energy_eV * e)[inside].sum())


def _lyman_alpha_cm2_s(f107: float) -> float:
    s = solar_spectrum(f107=f107)
    return float(s.photon_flux_m2_s[s.band.index("Lyman-alpha")]) * 1e-4


def _curve(name: str) -> PhotoYield:
    curve = load_material(name).photoyield
    assert curve is not None  # every name below has one
    return curve


def _between_points(name: str) -> float:
    return float(np.sqrt(np.prod(_curve(name).electrons_per_photon[3:5])))


def _at_the_middle(name: str) -> float:
    curve = _curve(name)
    return float(yield_per_photon(np.sqrt(np.prod(curve.photon_energy_eV[3:5])), curve))


def _gold_with_lowered_barrier(energy_eV: float) -> float:
    clean = _curve("gold")
    lowered = shift_barrier(clean, 4.2 - clean.threshold_eV, source=WASS)
    return float(yield_per_photon(energy_eV, lowered))


def _saturation_A_m2(curve: PhotoYield, f107: float) -> float:
    s: SolarSpectrum = solar_spectrum(f107=f107)
    return float(photo_current_density(s.photon_energy_eV, s.photon_flux_m2_s, curve))


def _lyman_share(name: str) -> float:
    row = photoyield_table([name], f107=100.0)[0]
    return next(share.share for share in row.bands if share.band == "Lyman-alpha")


def sunlight_checks() -> Iterator[Check]:
    """Rows about photons and the electrons they free."""
    for activity, value in ((80.0, 5.247e10), (200.0, 1.073e11)):
        yield Check(
            f"photons of 5 to 105 nm at P = {activity:g}", "solar spectrum, EUV", value,
            "cm-2 s-1", 1e-3, EUV, "derived", partial(_photons_cm2_s, 5.0, 105.0, activity),
        )  # fmt: skip
    yield Check(
        "photons of 0.05 to 105 nm against the coarse scheme", "solar spectrum, EUV",
        COARSE_BINS, "cm-2 s-1", 1e-2, SOLOMON, "handbook", partial(_photons_cm2_s, 0.0, 105.0),
    )  # fmt: skip
    yield Check(
        "photons of 105 to 120 nm", "solar spectrum, far ultraviolet", 3.298e9 + 3.2e9 + 8.399e9,
        "cm-2 s-1", 1e-3, WOODS + ", sum of three bins", "derived",
        partial(_photons_cm2_s, 105.0, 120.0),
    )  # fmt: skip
    for low, high, value in (
        (123.0, 150.0, 1.0253e11), (175.0, 200.0, 8.0651e12), (300.0, 350.0, 6.4596e15),
    ):  # fmt: skip
        yield Check(
            f"photons of {low:g} to {high:g} nm", "solar spectrum, ASTM E490", value, "cm-2 s-1",
            1e-3, E490, "derived", partial(_photons_cm2_s, low, high),
        )  # fmt: skip
    yield Check(
        "power of 123 to 400 nm", "solar spectrum, ASTM E490", 106.6, "W m-2", 1e-3,
        "ASTM E490-00a, sum of the irradiance", "derived", partial(_power_W_m2, 123.0, 400.0),
    )  # fmt: skip
    yield Check(
        "photons of 130 to 135 nm in two instruments", "solar spectrum, far ultraviolet", 2.659e10,
        "cm-2 s-1", 0.1, WOODS, "handbook", partial(_photons_cm2_s, 130.0, 135.0),
    )  # fmt: skip
    for activity, value, source in (
        (80.0, 3.94e11, WOODS), (200.0, 3.94e11 * (1.0 + 0.00423 * 120.0), WOODS + ", scaled"),
    ):  # fmt: skip
        yield Check(
            f"Lyman-alpha at P = {activity:g}", "solar spectrum, Lyman-alpha", value, "cm-2 s-1",
            1e-3, source, "handbook", partial(_lyman_alpha_cm2_s, activity),
        )  # fmt: skip
    yield Check(
        "Lyman-alpha against 120 to 123 nm of ASTM E490", "solar spectrum, Lyman-alpha", 4.068e11,
        "cm-2 s-1", 0.1, E490, "derived", partial(_lyman_alpha_cm2_s, 80.0),
    )  # fmt: skip
    for activity, value in ((68.0, 3.5e11), (200.0, 6.0e11)):
        yield Check(
            f"Lyman-alpha at F10.7 {activity:g}", "solar spectrum, Lyman-alpha", value, "cm-2 s-1",
            0.15, "Woods et al. 2000, J. Geophys. Res. 105, 27195", "memory",
            partial(_lyman_alpha_cm2_s, activity),
        )  # fmt: skip
    yield from _photoemission_checks()


def _photoemission_checks() -> Iterator[Check]:
    one_line = np.array([10.0])
    yield Check(
        "photocurrent of 1e16 photons m-2 s-1 of 10 eV over the yield", "photocurrent",
        e * 1e16, "A m-2", 1e-12, "e F Y for one line", "closed form",
        lambda: float(photo_current_density(one_line, np.array([1e16]), _curve("gold")))
        / float(yield_per_photon(10.0, _curve("gold"))),
    )  # fmt: skip
    yield Check(
        "yield of gold between two points of its record", "interpolation of a yield curve",
        _between_points("gold"), "1", 1e-9, "geometric means of both points, log-log",
        "closed form", partial(_at_the_middle, "gold"),
    )  # fmt: skip
    for x, value in ((0.0, pi**2 / 12.0), (3.0, 6.095753), (-2.0, 0.1310125)):
        yield Check(
            f"Fowler's function at {x:g}", "Fowler-DuBridge law", value, "1", 1e-6,
            "int log(1 + exp(x - y)) dy by another program, Fowler 1931", "closed form",
            partial(fowler_function, x),
        )  # fmt: skip
    yield Check(
        "power law 0.01 (hv - 6 eV)^(5/2) at 10 eV", "power law of the yield", 0.32, "1", 1e-12,
        "0.01 x 4^2.5, Kane 1962", "closed form",
        partial(law_yield, 10.0, 6.0, 0.01, exponent=2.5),
    )  # fmt: skip
    # V half of W, n = 7/3: 2^-(n+2) planar, 2^-(n+1) [1 + (n+1)/2] point source
    for planar, value in ((True, 0.0496063), (False, 0.2645668)):
        yield Check(
            f"direct photoelectrons that leave at half their energy, "
            f"{'plane' if planar else 'point source'}",
            "escape of photoelectrons", value, "1", 1e-6,
            "p(E) ~ E (W - E)^(7/3) with its maximum at 0.3 W, integrated by hand", "closed form",
            partial(direct_escape, np.array(0.5), planar),
        )  # fmt: skip
    for energy, value in ((4.8, 1.0e-5), (6.2, 4.4e-5)):
        yield Check(
            f"yield of gold with an adsorbed layer at {energy:g} eV", "surface state, barrier",
            value, "1", 10.0, WASS + "; the barrier of 4.2 eV is theirs", "measured",
            partial(_gold_with_lowered_barrier, energy), "factor", independent=False,
        )  # fmt: skip
    yield Check(
        "photocurrent of surfaces aged in orbit at F10.7 100", "surface state, aged", 85e-6,
        "A m-2", 33.0 / 85.0, NAKAGAWA, "measured",
        lambda: _saturation_A_m2(aged_photoyield(), 100.0),
    )  # fmt: skip
    for name in ("gold", "graphite", "oxidised aluminium"):
        yield Check(
            f"share of Lyman-alpha in the photocurrent of {name}", "share of Lyman-alpha", 0.5,
            "1", 0.15, '"about half", Grard 1973 and later reviews', "memory",
            partial(_lyman_share, name), "absolute",
        )  # fmt: skip
    for name, value in (
        ("oxidised aluminium", 42.0), ("ITO coating", 30.0), ("gold", 29.0),
        ("stainless steel", 20.0), ("graphite", 4.0), ("lunar regolith", 4.5),
    ):  # fmt: skip
        yield Check(
            f"saturation photocurrent of {name}", "level of a yield curve", value * 1e-6, "A m-2",
            0.25, GRARD, "calibration", partial(_saturation_A_m2, _curve(name), 100.0),
        )  # fmt: skip
