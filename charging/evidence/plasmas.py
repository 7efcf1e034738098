"""Fluxes, lengths and collection of plasmas against closed forms and standards."""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial
from math import pi

import numpy as np
from scipy.constants import atomic_mass, e, m_e, physical_constants
from scipy.integrate import quad

from charging.currents.collection import (
    SheathWeight,
    cylinder_factor,
    sheath_weight,
    sphere_factor,
)
from charging.evidence.check import Check
from charging.point import floating_point
from environments.auroral import FlatAndMaxwellian
from environments.catalogue import load_plasma
from environments.distributions import Kappa
from environments.plasma import (
    ELECTRON,
    HYDROGEN_ION,
    OXYGEN_ION,
    Plasma,
    Population,
    Species,
    electron_debye_length_m,
    moments,
    one_sided_maxwellian_current,
    population_of,
)

PROTON_MASS_kg = physical_constants["proton mass"][0]
OXYGEN_MASS_kg = 15.994914620 * atomic_mass - m_e

FLUX = "e n sqrt(eT/(2 pi m)) by hand, CODATA constants"
DEBYE = "(eps0/(e sum n/T))^(1/2) by hand"
AURORAL = "ECSS-E-ST-10-04C (2008), clause 8.2.3; its spectrum integrated by another program"
KAPPA = "sqrt(kappa - 3/2) Gamma(kappa - 1)/Gamma(kappa - 1/2) by hand"
BALANCE = (
    "root of sum_e j_e exp(V/T_e) = sum_i j_i G, G = 1 - V/T_i (sphere) or 1 (plane), by another "
    "program"
)


def _plasma(*populations: Population) -> Plasma:
    return Plasma("check", "check", "check", "assumed", None, "", populations)


def _equal(ion: Species, temperature_eV: float) -> Plasma:
    return _plasma(
        Population(ELECTRON, "maxwellian", 1e6, temperature_eV),
        Population(ion, "maxwellian", 1e6, temperature_eV),
    )


def _reduced_root(ion: Species, collection: str, temperature_eV: float) -> float:
    """Floating potential over temperature of a bare collector in the dark."""
    found = floating_point("bare collector", _equal(ion, temperature_eV), collection=collection)
    return found.reached_V / temperature_eV


def _bare_V(name: str, collection: str) -> float:
    return floating_point("bare collector", name, collection=collection).reached_V


def _debye_m(name: str) -> float:
    return electron_debye_length_m(load_plasma(name))


def _current(name: str, sign: int) -> float:
    current = moments(load_plasma(name))["current_density_A_m2"]
    return float(abs(current[np.sign(current) == sign].sum()))


def _kappa_over_maxwellian(kappa: float) -> float:
    hot = moments(_plasma(population_of(ELECTRON, Kappa(1e6, 500.0, kappa))))
    return float(hot["current_density_A_m2"][0] / one_sided_maxwellian_current(1e6, 500.0))


def _kappa_debye(kappa: float) -> float:
    def length(population: Population) -> float:
        return electron_debye_length_m(_plasma(population))

    thermal = length(Population(ELECTRON, "maxwellian", 1e6, 500.0))
    return length(population_of(ELECTRON, Kappa(1e6, 500.0, kappa))) / thermal


AURORA = FlatAndMaxwellian(3.9e-18, 17440.0, 1.13e6, 3960.0)


def _auroral_current_A_m2(low_eV: float, high_eV: float) -> float:
    def flux(energy: float) -> float:
        return float(AURORA.flux(np.array([energy]), m_e)[0])

    inside = [x for x in (17440.0, 40e3, 80e3) if low_eV < x < high_eV]
    whole = quad(flux, low_eV, high_eV, points=inside or None, epsrel=1e-9, limit=200)[0]
    return e * pi * float(whole)


def _sheath(
    debye_m: float, temperature_eV: float, potential_V: float, radius_m: float
) -> SheathWeight:
    return sheath_weight(
        np.array(potential_V),
        debye_length_m=np.array(debye_m),
        temperature_eV=np.array(temperature_eV),
        radius_m=radius_m,
        collection="auto",
    )


def plasma_checks() -> Iterator[Check]:
    """Rows about fluxes, Debye lengths, collection and bare floating potentials."""
    for name, mass, charge, value in (
        ("electrons", m_e, -1, -26.80595e-9),
        ("protons", PROTON_MASS_kg, 1, 0.6255712e-9),
        ("O+", OXYGEN_MASS_kg, 1, 0.1569884e-9),
    ):
        yield Check(
            f"one-sided current of 1 cm-3 of {name} at 1 eV", "one-sided flux of a Maxwellian",
            value, "A m-2", 1e-5, FLUX, "closed form",
            partial(one_sided_maxwellian_current, 1e6, 1.0, mass_kg=mass, charge_number=charge),
        )  # fmt: skip
    for name, electron, ion in (
        ("ECSS geostationary worst case", 5.4415e-6, 141.39e-9),
        ("quiet geostationary", 0.4149e-6, 23.042e-9),
    ):
        for sign, value, word in ((-1, electron, "electron"), (1, ion, "ion")):
            yield Check(
                f"{name}, {word} current", "currents of the catalogue", value, "A m-2", 2e-4,
                FLUX, "closed form", partial(_current, name, sign),
            )  # fmt: skip
    for name, value in (
        ("ECSS geostationary worst case", 318.8),
        ("quiet geostationary", 74.2),
    ):
        yield Check(
            f"{name}, electron Debye length", "Debye length", value, "m", 1e-3, DEBYE,
            "closed form", partial(_debye_m, name),
        )  # fmt: skip
    for kappa, value in ((3.0, 0.921318), (4.0, 0.951533), (6.0, 0.972659)):
        yield Check(
            f"flux of a kappa distribution over a Maxwellian's, kappa {kappa:g}",
            "kappa distribution, flux", value, "1", 1e-5, KAPPA, "closed form",
            partial(_kappa_over_maxwellian, kappa),
        )  # fmt: skip
    yield Check(
        "directional flux of 1 keV electrons, kappa 4, 500 eV, 1 cm-3",
        "kappa distribution, spectrum", 4.6055169e8, "m-2 s-1 sr-1 eV-1", 1e-6,
        "2 E f/m^2 with the kappa distribution by another program", "closed form",
        partial(Kappa(1e6, 500.0, 4.0).flux, np.array(1000.0), m_e),
    )  # fmt: skip
    yield Check(
        "Debye length of a kappa distribution over a Maxwellian's, kappa 3",
        "kappa distribution, Debye length", 0.774597, "1", 1e-5,
        "sqrt((2 kappa - 3)/(2 kappa - 1))", "closed form", partial(_kappa_debye, 3.0),
    )  # fmt: skip
    for what, low, high, value in (
        ("flat part", 1e-3, 17440.0, 18.470e-6),
        ("tail", 17440.0, 3e5, 10.301e-6),
    ):
        yield Check(
            f"auroral worst case, current of the {what}", "auroral spectrum in two parts", value,
            "A m-2", 2e-4, AURORAL, "derived", partial(_auroral_current_A_m2, low, high),
        )  # fmt: skip
    yield Check(
        "auroral worst case, whole current of the catalogue entry", "auroral spectrum in two parts",
        28.771e-6, "A m-2", 5e-3, AURORAL, "derived",
        lambda: abs(float(moments(load_plasma("ECSS auroral worst case"))
                          ["current_density_A_m2"].min())),
    )  # fmt: skip
    yield from _collection_checks()
    yield from _floating_checks()


def _collection_checks() -> Iterator[Check]:
    # 2 sqrt(u/pi) + exp(u) erfc(sqrt u) with another program
    for u, value in ((0.1, 1.080403), (1.0, 1.555963), (10.0, 3.738826)):
        yield Check(
            f"collection by a thick-sheath cylinder at u = {u:g}", "collection, cylinder", value,
            "1", 1e-5, "2 sqrt(u/pi) + exp(u) erfc(sqrt u), Mott-Smith & Langmuir 1926",
            "closed form", partial(cylinder_factor, np.array(u)),
        )  # fmt: skip
    for u in (0.1, 10.0):
        yield Check(
            f"collection by a thick-sheath sphere at u = {u:g}", "collection, sphere", 1.0 + u,
            "1", 1e-12, "1 + u, Mott-Smith & Langmuir 1926", "closed form",
            partial(sphere_factor, np.array(u)),
        )  # fmt: skip
    for ion, word, collection, temperature, value in (
        (HYDROGEN_ION, "protons", "sphere", 1000.0, -2.503851),
        (OXYGEN_ION, "O+ of 15.995 u", "sphere", 1000.0, -3.611626),
        (HYDROGEN_ION, "protons", "cylinder", 1000.0, -2.95611),
        (HYDROGEN_ION, "protons", "plane", 2e4, -3.757714),
    ):
        yield Check(
            f"bare {collection} in {word}, equal temperatures, potential over T",
            f"floating potential, {collection}", value, "1", 2e-5,
            "exp(x) = sqrt(m_e/m_i) G(-x) solved to 20 digits by another program", "closed form",
            partial(_reduced_root, ion, collection, temperature),
        )  # fmt: skip
    # (sqrt 2/3) 10 m (2 5000/100)^(3/4)
    yield Check(
        "sheath of 5 kV in 100 eV, Debye length 10 m", "sheath length", 149.0712, "m", 1e-6,
        "Child law by hand, Lieberman & Lichtenberg 2005", "closed form",
        lambda: float(_sheath(10.0, 100.0, -5000.0, 2.0).length_m),
    )  # fmt: skip
    # u = 2 x 800/100 = 16, s = (sqrt 2/3) 8 x 0.5 m = 1.885618 m, R = 2 m: s^2/(s^2 + R^2)
    yield Check(
        "thick-sheath share at 800 V in 100 eV, Debye length 0.5 m, radius 2 m", "sheath length",
        0.470588, "1", 1e-5, "s^2/(s^2 + R^2) by hand (the blend is this project's own)",
        "closed form", lambda: float(_sheath(0.5, 100.0, -800.0, 2.0).weight),
    )  # fmt: skip


def _floating_checks() -> Iterator[Check]:
    for name, sphere, plane in (
        ("ECSS geostationary worst case", -38061.7, -99835.9),
        ("ATS-6 geostationary worst case", -63194.7, -81513.4),
        ("quiet geostationary", -1177.37, -5555.77),
    ):
        for collection, value in (("sphere", sphere), ("plane", plane)):
            yield Check(
                f"bare {collection} in the dark, {name}",
                f"floating potential, {collection}", value, "V", 1e-5, BALANCE, "derived",
                partial(_bare_V, name, collection),
            )  # fmt: skip
