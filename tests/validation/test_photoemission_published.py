"""Photoemission against publications other than the ones its curves come from.

Counted are only comparisons in which neither side has seen the other. Saturation
currents of materials whose level was set from a published current are printed as
calibration and not asserted. Run with ``-s`` to see all figures.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace

import numpy as np
import pytest
from mpmath import mp  # type: ignore[import-untyped]
from scipy.constants import e

from charging.currents.photo_escape import photo_escape, photo_sheath, sheath_of
from charging.photo_table import photocurrent_grid, photoyield_table
from environments.spectrum import solar_spectrum
from materials import Material, load_material, material_names
from materials.photo_laws import fowler_function
from materials.photoelectron_energies import LowEnergyPeak
from materials.photoemission import (
    collided_share,
    escape_fraction,
    photo_current_density,
    two_exponential_escape,
    yield_per_photon,
)
from materials.surface_state import AGED_FROM, aged_photoyield, in_state, shift_barrier
from materials.work_function import element_work_function_eV, elements

EMITTING = [name for name in material_names() if load_material(name).photoyield is not None]


@dataclass(frozen=True)
class Check:
    quantity: str
    published: float
    unit: str
    tolerance: float
    """Largest factor either way, or largest difference where `absolute`."""
    source: str
    basis: str
    ours: Callable[[], float]
    absolute: bool = False
    counted: bool = True


def say(text: str) -> None:
    print(text)


# --- yields at single photon energies --------------------------------------------------------

WASS = (
    "Wass, Hollington, Sumner, Yang & Pfeil 2019, Rev. Sci. Instrum. 90, 064501 (abstract):"
    " gold-plated surfaces, 1e-5 to 4.4e-5 at 4.8 to 6.2 eV, effective work function 4.1-4.3 eV"
)


def clean_gold_with_lowered_barrier(energy: float) -> float:
    """Yield of clean gold (Feuerbacher & Fitton; Krolikowski & Spicer), barrier 4.2 eV."""
    clean = load_material("gold").photoyield
    assert clean is not None
    curve = shift_barrier(clean, 4.2 - clean.threshold_eV, source=WASS)
    return float(yield_per_photon(energy, curve))


def recorded_air_exposed_gold(energy: float) -> float:
    curve = load_material("gold, air-exposed").photoyield
    assert curve is not None
    return float(yield_per_photon(energy, curve))


# The recorded air-exposed curve took its points below 7 eV from Wass et al.: not counted. Clean
# gold with their barrier, semi-independent, is a row of `halflit evidence`.
GOLD = [
    Check(
        f"recorded yield of air-exposed gold at {energy} eV (own source)",
        published,
        "1",
        1.01,
        WASS,
        "measured",
        lambda energy=energy: recorded_air_exposed_gold(energy),  # type: ignore[misc]
        counted=False,
    )
    for energy, published in ((4.8, 1.0e-5), (6.2, 4.4e-5))
]


@pytest.mark.parametrize("check", GOLD, ids=lambda c: c.quantity)
def test_gold_near_threshold(check: Check) -> None:
    ours = check.ours()
    factor = max(ours / check.published, check.published / ours)
    say(f"{check.quantity}: {ours:.3g}, published {check.published:g}, factor {factor:.2f}")
    assert factor <= check.tolerance, check.source


def test_lowered_barrier_lies_in_the_published_range_of_the_near_ultraviolet() -> None:
    # the range 4.8 to 6.2 eV as a whole, each yield weighted alike in the logarithm
    energy = np.linspace(4.8, 6.2, 29)
    ours = np.exp(np.mean([np.log(clean_gold_with_lowered_barrier(e)) for e in energy]))
    published = np.sqrt(1.0e-5 * 4.4e-5)
    say(
        f"gold with adsorbed layer, 4.8-6.2 eV, semi-independent: {ours:.3g}; geometric mean of"
        f" the published ends (derived, not published): {published:.3g}"
    )
    assert 1.0 / 4.4 < ours / published < 4.4  # the width of the published range itself


# --- aged in orbit ---------------------------------------------------------------------------

NAKAGAWA = (
    "Nakagawa, Ishii, Tsuruda, Hayakawa & Mukai 2000, Earth Planets Space 52, 283 (abstract):"
    " 85 +- 33 uA m-2, 2.1 +- 0.5 eV, surface density 2.9e9 +- 1.4e9 m-3, 1993-1998"
)


GEOTAIL_F107 = (70.0, 80.0, 90.0, 100.0, 120.0, 150.0)


def test_aged_state_against_geotail() -> None:
    # 1993-1998 had F10.7 of 70 to 120 for the most part (memory); 150 is our default. The
    # lower end of 85 +- 33 is 52: met from about 90 on, missed by 1 to 3 at 70 and 80.
    met = {}
    for f107 in GEOTAIL_F107:
        sun = solar_spectrum(f107=f107)
        ours = 1e6 * float(
            photo_current_density(sun.photon_energy_eV, sun.photon_flux_m2_s, aged_photoyield())
        )
        met[f107] = abs(ours - 85.0) <= 33.0
        words = "within" if met[f107] else "OUTSIDE"
        say(f"aged state at F10.7 {f107:g}: {ours:.1f} uA m-2, {words} Geotail 85 +- 33")
    assert all(met[f107] for f107 in GEOTAIL_F107 if f107 >= 90.0), NAKAGAWA
    assert not any(met[f107] for f107 in GEOTAIL_F107 if f107 <= 80.0), NAKAGAWA


def test_membership_of_the_envelope_decides_the_geotail_check() -> None:
    # which laboratory curves count as those of aged surfaces was chosen by us: each material
    # alone, and the envelope without its strongest member
    sun = solar_spectrum(f107=100.0)
    yields = {
        name: yield_per_photon(sun.photon_energy_eV, load_material(name).photoyield)  # type: ignore[arg-type]
        for name in AGED_FROM
    }

    def current(names: Iterable[str]) -> float:
        largest = np.max([yields[name] for name in names], axis=0)
        return float(1e6 * e * (sun.photon_flux_m2_s * largest).sum())

    alone = {name: round(current([name]), 1) for name in AGED_FROM}
    without = {name: round(current(set(AGED_FROM) - {name}), 1) for name in AGED_FROM}
    say(f"envelope at F10.7 100: {current(AGED_FROM):.1f}; each alone {alone}; without {without}")
    assert current(AGED_FROM) >= max(alone.values()) - 0.05
    # without a single one of its members the envelope leaves the published range
    assert min(without.values()) < 85.0 - 33.0


def test_no_curve_behind_the_aged_state_knows_a_current_measured_in_orbit() -> None:
    for name in AGED_FROM:
        curve = load_material(name).photoyield
        assert curve is not None
        text = f"{curve.source} {curve.note} {curve.level}"
        assert not any(word in text for word in ("Nakagawa", "Geotail", "Pedersen", "orbit"))


def test_surface_density_of_photoelectrons_against_geotail() -> None:
    # not counted: the relation alone, with Geotail's own current and energy scale
    density = sheath_of(85e-6, 2.0 * 2.1).density_m3
    say(f"not counted: photoelectron density {density:.3g} m-3, Geotail 2.9e9 +- 1.4e9")
    assert abs(density - 2.9e9) <= 1.4e9, NAKAGAWA


# --- shape of the retarding curve ------------------------------------------------------------

PEDERSEN = (
    "Pedersen 1995, Ann. Geophys. 13, 118: 80 exp(-V/2.0) + 3 exp(-V/7.5) uA m-2 for"
    " satellites with conducting surfaces (memory)"
)
GEOS_RADIUS_M = 0.8  # the satellites behind the fit: GEOS 0.8 m, ISEE-1 0.9 m (memory)
SHAPE_V = np.array([0.0, 0.5, 1.0, 1.5, 2.0, 2.5, 3.0, 3.5, 4.0, 4.5, 5.0, 10.0])
AGED_CONDUCTORS = [name for name in EMITTING if load_material(name).kind == "conductor"]


def shape_ratio(name: str, geometry: str) -> np.ndarray:
    material = in_state(load_material(name), "aged")
    ours = photo_escape(
        SHAPE_V, material, solar_spectrum(), radius_m=GEOS_RADIUS_M, geometry=geometry
    )
    fit = two_exponential_escape(SHAPE_V, current_A_m2=[80e-6, 3e-6], scale_V=[2.0, 7.5])
    return np.asarray(ours / fit)


@pytest.mark.parametrize("name", AGED_CONDUCTORS)
def test_shape_of_the_aged_state_against_the_two_exponential_fit(name: str) -> None:
    # normalised at 0 V; our default activity (F10.7 150); the energy law has no parameter
    # from this curve. Factor 2 to 5 V, factor 4 at 10 V.
    ratios = {g: shape_ratio(name, g) for g in ("auto", "planar", "point source")}
    for geometry, ratio in ratios.items():
        text = " ".join(f"{v:g}V:{r:.2f}" for v, r in zip(SHAPE_V, ratio, strict=True))
        say(f"aged {name}, {geometry}: ours/fit {text}")
    blend = ratios["auto"]
    assert blend[0] == 1.0
    assert np.all((blend[:-1] > 0.5) & (blend[:-1] < 2.0)), PEDERSEN
    assert 0.25 < blend[-1] < 4.0, PEDERSEN


@pytest.mark.parametrize("radius", [GEOS_RADIUS_M, 1.1])
def test_shape_at_the_quiet_sun_is_weaker_and_known(radius: float) -> None:
    # F10.7 80, when less of the current comes from energetic photons (all aged surfaces are
    # alike); bodies of the size of the satellites behind the fit (memory). Too low by up to 2.7
    # around 4 V; the activity behind the fit is not known to us.
    material = in_state(load_material("oxidised aluminium"), "aged")
    ours = photo_escape(SHAPE_V, material, solar_spectrum(f107=80.0), radius_m=radius)
    fit = two_exponential_escape(SHAPE_V, current_A_m2=[80e-6, 3e-6], scale_V=[2.0, 7.5])
    say(f"quiet Sun, radius {radius} m, ours/fit: {np.round(ours / fit, 2).tolist()}")
    assert np.all((ours / fit > 0.35) & (ours / fit < 2.0)), PEDERSEN


# --- energies of the electrons ---------------------------------------------------------------

FEUERBACHER = (
    "Feuerbacher & Fitton 1972; Grard 1973 (memory): maximum at 0.2-0.4 (hv - threshold) below"
    " about 15 eV; a second maximum below 2-3 eV from about 20 eV"
)


def energy_distribution(photon: float, energy: np.ndarray, peak: LowEnergyPeak) -> np.ndarray:
    """p(E) = -dR/dV of the point-source curve."""
    share = escape_fraction(energy, [photon], [1.0], 4.6, geometry="point source", peak=peak)
    return np.asarray(-np.gradient(share, energy))


@pytest.mark.parametrize("photon", [7.0, 10.2, 12.0, 15.0])
def test_maximum_of_the_distribution_below_15_eV(photon: float) -> None:
    energy = np.linspace(1e-3, photon - 4.6, 4001)
    for peak in (LowEnergyPeak("chung_everhart_1974", 4.6), LowEnergyPeak("maxwellian", 2.0)):
        place = energy[energy_distribution(photon, energy, peak).argmax()] / (photon - 4.6)
        say(f"maximum at {photon} eV: {place:.2f} W ({peak.law})")
        assert 0.2 <= place <= 0.4, FEUERBACHER


@pytest.mark.parametrize("photon", [21.2, 30.0, 40.8])
def test_low_energy_maximum_from_20_eV(photon: float) -> None:
    energy = np.linspace(1e-3, photon - 4.6, 8001)
    peak = LowEnergyPeak("chung_everhart_1974", 4.6)
    place = energy[energy_distribution(photon, energy, peak).argmax()]
    say(f"maximum at {photon} eV: {place:.2f} eV")
    assert place < 3.0, FEUERBACHER


def test_collided_electrons_rule_from_about_20_eV() -> None:
    # the cascade has no parameter but the threshold; the measured statement is its check
    photon = np.linspace(5.0, 60.0, 5501)
    half = photon[int(np.argmax(collided_share(photon, 4.6) > 0.5))]
    say(f"half of the electrons have collided at {half:.1f} eV")
    assert 15.0 < half < 27.0, FEUERBACHER


def test_mean_energies_are_printed_beside_the_published_range() -> None:
    # not counted, no agreement claimed: the publications do not say whether a mean energy or
    # a V_0 (half of it as planar escape) is meant; the aged state and gold lie outside
    # 2.1 +- 0.5 either way, graphite and steel inside it as a V_0
    say("mean energies [eV]; published 1.0 to 2.5 (memory), in orbit 2.1 +- 0.5")
    for state in ("as recorded", "aged"):
        for row in photoyield_table(
            ["gold", "graphite", "stainless steel"], surface_state=state, f107=90.0
        ):
            assert row.mean_energy_eV is not None
            half = 0.5 * row.mean_energy_eV
            say(f"  {row.material}, {state}: {row.mean_energy_eV:.2f}, V_0 {half:.2f}")


# --- thresholds of two compilations ----------------------------------------------------------
#
# Not a check of the library: its curves and work functions come from their own sources. Two
# compilations are compared, neither of which a run uses, to show how far such figures differ.

HANDBOOK = "handbook of physical quantities, vacuum-cleaned polycrystalline samples (two copies)"
HANDBOOK_eV = {
    "Ag": (4.7, 4.7), "Al": (4.2, 4.2), "Au": (4.8, 4.8), "Be": (3.92, 3.92), "C": (4.45, 4.81),
    "Cd": (4.04, 4.04), "Co": (4.40, 4.40), "Cr": (4.60, 4.60), "Cu": (4.36, 4.36),
    "Fe": (4.40, 4.71), "Mg": (3.67, 3.67), "Mo": (4.20, 4.20), "Nb": (3.99, 3.99),
    "Ni": (4.91, 5.01), "Pb": (4.05, 4.05), "Pt": (5.30, 5.55), "Si": (3.59, 4.67),
    "Ta": (4.13, 4.13), "Ti": (4.14, 4.50),
}  # fmt: skip
RIVIERE = "Riviere 1957, contact potentials of clean evaporated metals (abstract), +-0.03-0.05 eV"
RIVIERE_eV = {"Cu": 4.52, "Ag": 4.31, "Au": 4.70, "Al": 4.20, "Ni": 4.74, "Mo": 4.22, "Fe": 4.17}
KNOWN_APART = {"Be", "Co", "Ag", "Mo", "Nb"}


def test_work_functions_against_another_compilation() -> None:
    assert set(HANDBOOK_eV) <= set(elements())
    difference = {}
    for symbol, (low, high) in HANDBOOK_eV.items():
        ours = element_work_function_eV(symbol)
        difference[symbol] = ours - min(max(ours, low), high)
    say("Michaelson minus handbook [eV]: " + str({k: round(v, 2) for k, v in difference.items()}))
    # +-0.15 eV of Michaelson and as much of the handbook
    agree = {symbol for symbol, value in difference.items() if abs(value) <= 0.3 + 1e-9}
    assert len(agree) >= 10, HANDBOOK
    assert set(difference) - agree == KNOWN_APART, HANDBOOK
    assert np.median(np.abs(list(difference.values()))) <= 0.2


def test_work_functions_against_contact_potentials() -> None:
    difference = [element_work_function_eV(s) - value for s, value in RIVIERE_eV.items()]
    say(f"Michaelson minus Riviere [eV]: {np.round(difference, 2).tolist()}")
    # both claim less; the sources differ by up to 0.4 eV with the face and the residual gas
    assert np.max(np.abs(difference)) <= 0.45, RIVIERE
    assert abs(np.mean(difference)) <= 0.3, RIVIERE


# --- Fowler's function -----------------------------------------------------------------------


@pytest.mark.parametrize(
    "x", [-600.0, -90.0, -30.0, -8.0, -3.0, -1.0, -0.2, 0.0, 0.2, 1.0, 4.0, 8.0, 30.0]
)
def test_fowler_function_against_its_series(x: float) -> None:
    # Fowler 1931: x <= 0: e^x - e^2x/4 + e^3x/9 - ...; x >= 0: pi^2/6 + x^2/2 - (same of -x)
    with mp.workdps(30):
        y = mp.exp(-abs(mp.mpf(x)))  # nsum is accurate against 1, so the first y is taken out
        series = y * mp.nsum(lambda n: (-y) ** (n - 1) / n**2, [1, mp.inf])
        expected = series if x <= 0 else mp.pi**2 / 6 + mp.mpf(x) ** 2 / 2 - series
    assert float(fowler_function(x)) == pytest.approx(float(expected), rel=2e-15, abs=0.0)


def test_fowler_function_against_its_integral() -> None:
    for x in (-5.0, 0.0, 2.5, 12.0):
        with mp.workdps(30):
            exact = mp.quad(lambda y: mp.log1p(mp.exp(x - y)), [0, max(x, 1), max(x, 1) + 80])  # noqa: B023
        assert float(fowler_function(x)) == pytest.approx(float(exact), rel=1e-13, abs=0.0)


# --- solar activity --------------------------------------------------------------------------

METALS_AND_CARBONS = (
    "oxidised aluminium", "gold", "silver", "copper", "stainless steel", "titanium", "graphite",
    "carbon-fibre composite", "ITO coating",
)  # fmt: skip
BELOW_EXPECTED = ("silver",)
HIGH_THRESHOLD = ("fused silica", "cover glass", "PTFE", "FEP film, silvered")


def test_ratio_of_photocurrents_between_solar_activities() -> None:
    # Expected before the curves were tabulated: 1.5-1.7 for metals and carbons, about 2 for
    # silica and fluoropolymers. It does not depend on the level of a curve.
    grid = photocurrent_grid(EMITTING, incidence_cosine=[1.0], f107=[80.0, 200.0])[:, 0]
    ratio = dict(zip(EMITTING, grid[:, 1] / grid[:, 0], strict=True))
    shares = {row.material: row.bands for row in photoyield_table(EMITTING, f107=140.0)}
    steady = {}
    for name, value in ratio.items():
        part = {share.band: share.share for share in shares[name]}
        steady[name] = 1.0 - sum(part[b] for b in list(part)[:4])
        euv = part["X-ray"] + part["EUV"] + part["FUV below Lyman-alpha"]
        say(
            f"{name}: 200/80 = {value:.2f}; at 140: below 120 nm {100 * euv:.0f} %, "
            f"Lyman-alpha {100 * part['Lyman-alpha']:.0f} %, above 123 nm "
            f"{100 * (1 - euv - part['Lyman-alpha']):.0f} %"
        )
    for name in METALS_AND_CARBONS:
        if name in BELOW_EXPECTED:
            continue
        assert 1.5 <= ratio[name] <= 1.7, (name, ratio[name])
    # silver misses the expected range: its curve begins at 4.26 eV, so that light above
    # 123 nm, which does not follow the activity, gives more of its current than elsewhere
    for name in BELOW_EXPECTED:
        say(f"{name}: {ratio[name]:.3f} lies below the expected 1.5 to 1.7")
        assert ratio[name] < 1.5
        assert steady[name] > max(steady[n] for n in METALS_AND_CARBONS if n != name)
    for name in HIGH_THRESHOLD:
        assert 1.7 <= ratio[name] <= 2.4, (name, ratio[name])
    # the near ultraviolet of air-exposed gold does not follow the activity
    assert ratio["gold, air-exposed"] < ratio["gold"]


@pytest.mark.parametrize("name", EMITTING)
def test_ratio_of_activities_is_explained_by_the_bands(name: str) -> None:
    quiet, active = (photoyield_table([name], f107=s)[0] for s in (80.0, 200.0))
    gains = [
        (share.share, after.current_A_m2 / share.current_A_m2)
        for share, after in zip(quiet.bands, active.bands, strict=True)
        if share.share > 0.0
    ]
    total = active.saturation_current_A_m2 / quiet.saturation_current_A_m2
    assert sum(share * gain for share, gain in gains) == pytest.approx(total, rel=1e-12, abs=0.0)
    # Woods & Rottman 2002: Lyman-alpha by 1 + 0.00423 * 120; nothing scales above 123 nm
    by_band = {s.band: a.current_A_m2 / s.current_A_m2 for s, a in
               zip(quiet.bands, active.bands, strict=True) if s.share > 0.0}  # fmt: skip
    if "Lyman-alpha" in by_band:
        assert by_band["Lyman-alpha"] == pytest.approx(1.5076, rel=1e-9)
    for band in ("FUV above Lyman-alpha", "MUV", "NUV"):
        assert by_band.get(band, 1.0) == pytest.approx(1.0, rel=1e-12)


def test_lyman_alpha_gives_half_of_the_photocurrent_of_metals_and_carbons() -> None:
    # "about half": Grard 1973 and later reviews (memory)
    for name in METALS_AND_CARBONS:
        row = photoyield_table([name], f107=100.0)[0]
        share = next(s.share for s in row.bands if s.band == "Lyman-alpha")
        say(f"Lyman-alpha share of {name}: {share:.2f}")
        assert 0.4 <= share <= 0.65, name


# --- calibration, not validation --------------------------------------------------------------

GRARD = {
    "oxidised aluminium": 42.0, "ITO coating": 30.0, "gold": 29.0, "stainless steel": 20.0,
    "graphite": 4.0, "lunar regolith": 4.5,
}  # fmt: skip


@pytest.mark.parametrize("name", GRARD)
def test_levels_set_from_saturation_currents_say_so(name: str) -> None:
    # the comparison is printed; what is asserted is the honest label
    row = photoyield_table([name], f107=100.0)[0]
    say(f"calibration: {name} {1e6 * row.saturation_current_A_m2:.1f}, published {GRARD[name]}")
    assert row.level == "set from the published saturation current"


def test_no_material_is_relevelled_by_the_program() -> None:
    for name in EMITTING:
        curve = load_material(name).photoyield
        assert curve is not None
        assert curve.level != "normalised to a measured current"


def test_twenty_materials_have_a_curve_with_source_and_spread() -> None:
    assert len(EMITTING) >= 20
    assert {"lunar regolith", "gold", "gold, air-exposed"} <= set(EMITTING)
    for name in EMITTING:
        material: Material = load_material(name)
        curve = material.photoyield
        assert curve is not None
        assert curve.threshold_eV > 0.0
        assert len(curve.source) > 10
        assert curve.spread_factor > 1.0


def test_photoelectron_debye_length_is_decimetres_at_1_au() -> None:
    # literature on photoelectron sheaths at 1 AU: some 0.1 to 1 m (memory)
    for name in METALS_AND_CARBONS:
        sheath = photo_sheath(load_material(name), solar_spectrum())
        assert sheath is not None
        assert 0.05 < sheath.debye_length_m < 2.0, name


def test_a_user_record_keeps_its_level() -> None:
    curve = load_material("gold").photoyield
    assert curve is not None
    user = replace(load_material("gold"), photoyield=replace(curve, level="as published"))
    row = photoyield_table([user])[0]
    assert row.level == "as published"
