"""Floating potentials against closed equations and independently computed balances."""

from dataclasses import dataclass

import mpmath
import pytest
from scipy.constants import atomic_mass, m_e, physical_constants

from charging.point import floating_point
from environments.plasma import ELECTRON, HYDROGEN_ION, OXYGEN_ION, Plasma, Population, Species

PROTON_U = physical_constants["proton mass"][0] / atomic_mass
ELECTRON_U = m_e / atomic_mass


def equal_temperatures(ion: Species, temperature_eV: float) -> Plasma:
    """Electrons and one ion species of the same density and temperature."""
    return Plasma(
        name="test",
        title="electrons and one ion species, equal density and temperature",
        source="closed check",
        basis="derived",
        clause=None,
        note="",
        populations=(
            Population(ELECTRON, "maxwellian", 1e6, temperature_eV),
            Population(ion, "maxwellian", 1e6, temperature_eV),
        ),
    )


def closed_root(mass_u: float, collection: str) -> float:
    """Solve exp(x) = sqrt(m_e/m_i) G(-x) for x = phi/T to 30 digits."""
    with mpmath.workdps(30):
        ratio = mpmath.sqrt(mpmath.mpf(ELECTRON_U) / mpmath.mpf(mass_u))
        gain = {
            "plane": lambda u: mpmath.mpf(1),
            "sphere": lambda u: 1 + u,
            "cylinder": lambda u: (
                2 * mpmath.sqrt(u / mpmath.pi) + mpmath.exp(u) * mpmath.erfc(mpmath.sqrt(u))
            ),
        }[collection]
        return float(mpmath.findroot(lambda x: mpmath.exp(x) - ratio * gain(-x), mpmath.mpf(-3)))


@dataclass(frozen=True)
class Closed:
    """A bare collector in the dark, T_i = T_e, equal densities."""

    ion: Species
    mass_u: float
    collection: str
    published: float
    source: str


OXYGEN_U = 15.994914620 - ELECTRON_U  # the nuclide 16O less one electron
CLOSED = [
    Closed(HYDROGEN_ION, PROTON_U, "sphere", -2.504, "thick-sheath sphere, protons"),
    Closed(OXYGEN_ION, OXYGEN_U, "sphere", -3.612, "thick-sheath sphere, O+ of 15.995 u"),
    Closed(HYDROGEN_ION, PROTON_U, "plane", -3.758, "plane, ln sqrt(m_e/m_p)"),
    Closed(HYDROGEN_ION, PROTON_U, "cylinder", -2.956, "thick-sheath cylinder, protons"),
]


@pytest.mark.parametrize(
    ("check", "temperature_eV"),
    [
        (check, temperature_eV)
        for check in CLOSED
        # on a cold plane the net current is flat over most of the scan, which takes minutes
        for temperature_eV in ((2e4, 4e4) if check.collection == "plane" else (0.1, 1.0, 3000.0))
    ],
    ids=lambda v: v.source if isinstance(v, Closed) else f"{v:g} eV",
)
def test_closed_equation(check, temperature_eV):
    plasma = equal_temperatures(check.ion, temperature_eV)
    found = floating_point("bare collector", plasma, collection=check.collection)
    assert len(found.roots) == 1
    assert found.roots[0].stable
    assert found.reached_V / temperature_eV == pytest.approx(check.published, abs=1e-3)
    independent = closed_root(check.mass_u, check.collection)
    # roots are found to 1e-9 V or 1e-12
    assert found.reached_V == pytest.approx(temperature_eV * independent, abs=3e-9, rel=1e-9)


def test_the_published_figures_are_roots_of_the_closed_equation():
    for check in CLOSED:
        assert closed_root(check.mass_u, check.collection) == pytest.approx(
            check.published, abs=5e-4
        ), check.source


# Source: current balance computed independently (bare collector, zero yields, dark, protons):
# root of sum_e j_e exp(V/T_e) = sum_i j_i G, G = 1 - V/T_i (sphere) or 1 (plane). Three more are
# rows of `halflit evidence`.
COMPUTED = [
    ("NASA geostationary 90 percent", -46955.0, -58382.7),
    ("April 1979 geostationary, second fit", -35135.7, -102784.0),
    ("severe geostationary, second event", -36174.0, -93077.9),
]


@pytest.mark.parametrize(("plasma", "sphere_V", "plane_V"), COMPUTED, ids=lambda v: str(v))
def test_catalogue_plasmas(plasma, sphere_V, plane_V):
    for collection, expected in (("sphere", sphere_V), ("plane", plane_V)):
        found = floating_point("bare collector", plasma, collection=collection)
        assert found.reached_V == pytest.approx(expected, rel=1e-5)


# Real surfaces emit and so reach less than a bare collector (38 kV); in eclipse the event of
# April 1979 took spacecraft to kilovolts (Gussenhoven & Mullen 1983, from memory).
CHARGING = [
    "polyimide film",
    "FEP film, silvered",
    "white paint, zinc oxide-silicone",
    "black paint, carbon-polyurethane",
    "black polyimide film",
    "gold",
]


@pytest.mark.parametrize("material", CHARGING)
def test_worst_case_in_eclipse_is_kilovolts(material):
    found = floating_point(material, "ECSS geostationary worst case")
    assert -38061.7 < found.reached_V < -1000.0


# Sunlit spacecraft outside the plasmasphere float above 5 V, in the dayside magnetosphere 7-8 V,
# in the night side 10-20 V (Laakso 2002, J. Atmos. Sol.-Terr. Phys. 64, 1735, abstract): whole
# bodies, lit on a quarter of their surface. A patch that faces the Sun gets up to four times the
# light, which the retarding curve turns into volts, not tens of volts.
@pytest.mark.parametrize("material", ["gold", "ITO coating", "graphite", "oxidised aluminium"])
def test_quiet_sunlit_conductor_is_volts_positive(material):
    facing = floating_point(material, "quiet geostationary", sunlit=True)
    whole = floating_point(material, "quiet geostationary", sunlit=True, incidence_cosine=0.25)
    assert 2.0 < whole.reached_V < 20.0
    assert whole.reached_V < facing.reached_V < 30.0
