"""Secondary emission, backscatter, ion impact and escape against closed forms and data."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from functools import partial

import numpy as np

from charging.evidence.check import Check
from materials import load_material
from materials.angle import (
    backscatter_angle_coefficient,
    exponential_angle_factor,
    secondary_angle_coefficient,
)
from materials.backscatter import (
    hunger_kuchler_1979,
    maxwellian_backscatter,
    prokopenko_laframboise_1980,
)
from materials.crossover import crossovers
from materials.ion_impact import whipple_1981
from materials.maxwellian_yield import maxwellian_yield
from materials.secondary import (
    YieldLaw,
    isotropic_yield,
    lin_joy_2005,
    normal_yield,
    sanders_inouye_1979,
    true_secondary_peak,
)
from materials.secondary_escape import secondary_escape_fraction

# Shapes f(E/E_max) of the printed forms over their own maxima, worked out to 6 digits with
# another program: [E/E_max, f].
SHAPES: dict[YieldLaw, tuple[str, tuple[tuple[float, float], ...]]] = {
    "sternglass_1954": (
        "x exp(2 - 2 sqrt x), Sternglass 1954",
        ((0.1, 0.392570), (3.16, 0.667173), (10.0, 0.132394)),
    ),
    "sanders_inouye_1979": (
        "exp(-y/4.3) - exp(-y/0.367) over its maximum, Sanders & Inouye 1979",
        ((0.1, 0.293273), (3.16, 0.665486), (10.0, 0.138403)),
    ),
    "draine_salpeter_1979": (
        "8 x/(1+x)^3 with its maximum moved to E_max, Draine & Salpeter 1979",
        ((0.1, 0.291545), (3.16, 0.621015), (10.0, 0.15625)),
    ),
    "lin_joy_2005": (
        "x^-0.67 [1 - exp(-r x^1.67)] over its maximum, r = 1.61404, Lin & Joy 2005",
        ((0.1, 0.198086), (3.16, 0.577583), (10.0, 0.266939)),
    ),
}

# Lin-Joy over an isotropic flux: 2 int x^-0.67 [1 - exp(-r x^1.67 mu)] dmu by quadrature
LIN_JOY_ISOTROPIC = ((0.5, 0.856841), (1.0, 1.258006), (10.0, 0.526806))

REUTER = "Reuter 1972, Proc. 6th Int. Congr. X-ray Optics and Microanalysis, fit to data at 20 keV"
MULTIPACTOR = "ECSS-E-ST-20-01C (2020), reference curve as received; a model curve through data"
CARBON = "evaporated carbon, electron-yield database, University of Science and Technology of China"
FUJII = "Fujii & Ishihara 2013, Astrophys. Space Sci. Proc. 32, 437 (abstract)"
CRC = "CRC Handbook of Chemistry and Physics, section 12, secondary electron emission"


def _shape(law: YieldLaw, x: float) -> float:
    return float(normal_yield(500.0 * x, law=law, peak_yield=1.0, peak_energy_eV=500.0))


def _lin_joy_isotropic(x: float) -> float:
    return float(
        isotropic_yield(
            500.0 * x, law="lin_joy_2005", peak_yield=1.0, peak_energy_eV=500.0,
            mean_atomic_number=13.0,
        )
    )  # fmt: skip


def _secondary_factor(z: float) -> float:
    return float(exponential_angle_factor(secondary_angle_coefficient(z)))


def _backscatter_factor(z: float) -> float:
    return float(exponential_angle_factor(backscatter_angle_coefficient(z)))


def _exponential_far_above(z: float) -> float:
    """Isotropic over normal yield of Sanders-Inouye at 40 E_max, where the angle law is full."""
    isotropic = isotropic_yield(4e3, peak_yield=2.0, peak_energy_eV=100.0, mean_atomic_number=z)
    return float(isotropic / sanders_inouye_1979(4e3, peak_yield=2.0, peak_energy_eV=100.0))


def total_yield(name: str, energy_eV: float, law: Callable[..., object]) -> float:
    """Total yield of a material of the library at normal incidence, as a yield bench sees it."""
    material = load_material(name)
    free = np.asarray(
        law(
            energy_eV,
            peak_yield=true_secondary_peak(material),
            peak_energy_eV=material.value("secondary_yield_peak_energy_eV"),
        )
    )
    back = prokopenko_laframboise_1980(
        energy_eV,
        high_energy=material.value("backscatter_high_energy"),
        low_energy_drop=material.get("backscatter_low_energy_drop", 0.0),
        drop_energy_eV=material.get("backscatter_drop_energy_eV", 4e3),
    )
    return float(free + back)


def second_crossover_eV(name: str, law: Callable[..., object]) -> float:
    """Upper energy at which the total yield of a material is one."""
    found = crossovers(
        lambda E: np.array([total_yield(name, float(x), law) for x in np.atleast_1d(E)])
    )
    return float("nan") if found.second_eV is None else found.second_eV


def yield_checks() -> Iterator[Check]:
    """Rows about electrons that electrons and ions release."""
    for law, (source, points) in SHAPES.items():
        for x, value in points:
            yield Check(
                f"secondary yield at {x:g} E_max over its maximum, {law}",
                f"secondary yield, {law}", value, "1", 1e-4, source, "closed form",
                partial(_shape, law, x),
            )  # fmt: skip
    for x, value in LIN_JOY_ISOTROPIC:
        yield Check(
            f"isotropic secondary yield at {x:g} E_max", "isotropic yield, lin_joy_2005", value,
            "1", 1e-4, "2 int delta(mu) mu dmu of the constant-loss form, by quadrature",
            "closed form", partial(_lin_joy_isotropic, x),
        )  # fmt: skip
    # 2 int exp[b (1 - mu)] mu dmu by quadrature, b by the printed formula
    for z, value in ((6, 1.375453), (13, 1.413606), (79, 1.428150)):
        yield Check(
            f"isotropic factor of secondaries, Z = {z}", "angle law of secondaries", value, "1",
            1e-4, "2 int exp[beta (1 - mu)] mu dmu by quadrature, Laframboise & Kamitsuma 1983",
            "closed form", partial(_secondary_factor, z),
        )  # fmt: skip
    yield Check(
        "isotropic factor far above E_max, Z = 13", "isotropic yield, sanders_inouye_1979",
        1.413606, "1", 1e-4, "the angle factor whole, as its onset is past", "closed form",
        partial(_exponential_far_above, 13.0),
    )  # fmt: skip
    for z, value in ((6, 3.006583), (13, 1.931134), (79, 1.240389)):
        yield Check(
            f"isotropic factor of backscatter, Z = {z}", "angle law of backscatter", value, "1",
            1e-4, "2 int exp[7.37 Z^-0.56875 (1 - mu)] mu dmu by quadrature", "closed form",
            partial(_backscatter_factor, z),
        )  # fmt: skip
    # sums of (1 + T/a)^-2 by quadrature of x exp(-x/T)/T^2
    for ratio, value in ((2.0, 0.612165), (5.0, 0.291486), (10.0, 0.124820)):
        yield Check(
            f"Maxwellian average at T = {ratio:g} E_max", "Maxwellian average of the yield", value,
            "1", 1e-4, "int delta(E) E exp(-E/T) dE/T^2 by quadrature", "closed form",
            partial(maxwellian_yield, 300.0 * ratio, peak_yield=1.0, peak_energy_eV=300.0),
        )  # fmt: skip
    yield from _data_rows()
    yield from _backscatter_rows()
    yield from _ion_and_escape_rows()


def _data_rows() -> Iterator[Check]:
    for metal, name, value in (
        ("aluminium", "oxidised aluminium", 2.09),
        ("silver", "silver", 1.83),
        ("copper", "copper", 1.67),
    ):
        yield Check(
            f"total yield of {metal} as received at 1 keV", "secondary yield of the library",
            value, "1", 0.2, MULTIPACTOR, "handbook",
            partial(total_yield, name, 1e3, sanders_inouye_1979),
        )  # fmt: skip
    for energy, value, tolerance in ((1e3, 0.467, 0.2), (5e3, 0.207, 0.3)):
        yield Check(
            f"secondary yield of carbon at {energy / 1e3:g} keV, power law",
            "lin_joy_2005 against data", value, "1", tolerance, CARBON, "measured",
            partial(lin_joy_2005, energy, peak_yield=0.707, peak_energy_eV=350.0),
        )  # fmt: skip
    yield Check(
        "second crossover of FEP", "secondary yield of the library", 2700.0, "eV", 0.35, FUJII,
        "measured", partial(second_crossover_eV, "FEP film, silvered", lin_joy_2005),
    )  # fmt: skip
    for name, value, tolerance, source in (
        ("fused silica", 2300.0, 0.7, "Dionne 1975, J. Appl. Phys. 46, 3347; 1500-4000 eV"),
        ("polyimide film", 600.0, 0.65, "Willis & Skinner 1973, Solid State Commun. 13, 685"),
    ):
        yield Check(
            f"second crossover of {name}", "secondary yield of the library", value, "eV",
            tolerance, source, "memory", partial(second_crossover_eV, name, sanders_inouye_1979),
        )  # fmt: skip


def _backscatter_rows() -> Iterator[Check]:
    for z, value in ((6, 0.064), (29, 0.302), (79, 0.487)):
        yield Check(
            f"backscatter at 20 keV, Z = {z}", "backscatter, hunger_kuchler_1979", value, "1",
            0.1, REUTER, "measured",
            partial(hunger_kuchler_1979, 2e4, mean_atomic_number=z),
        )  # fmt: skip
    for z, kev, value in ((29, 10.0, 0.309202), (79, 4.0, 0.458142)):
        yield Check(
            f"backscatter at {kev:g} keV, Z = {z}", "backscatter, hunger_kuchler_1979", value,
            "1", 1e-4,
            "Hunger & Kuchler 1979, Phys. Status Solidi A 56, K45, by hand", "closed form",
            partial(hunger_kuchler_1979, 1e3 * kev, mean_atomic_number=z),
        )  # fmt: skip
    gold = {"high_energy": 0.48, "low_energy_drop": 0.35, "drop_energy_eV": 1e3 / 0.41}
    yield Check(
        "backscatter of gold at 2 keV", "backscatter, prokopenko_laframboise_1980", 0.325849, "1",
        1e-4, "A - B exp(-C E) by hand, Prokopenko & Laframboise 1980", "closed form",
        partial(prokopenko_laframboise_1980, 2e3, **gold),
    )  # fmt: skip
    yield Check(
        "Maxwellian average of gold's backscatter at 3 keV",
        "backscatter, prokopenko_laframboise_1980", 0.409619, "1", 1e-4,
        "A - B (1 + C T)^-2 by hand", "closed form",
        partial(maxwellian_backscatter, 3e3, **gold),
    )  # fmt: skip


def _ion_and_escape_rows() -> Iterator[Check]:
    for kev, value in ((1.0, 0.892388), (10.0, 2.568), (50.0, 4.101588)):
        yield Check(
            f"electrons per proton of {kev:g} keV, technical aluminium",
            "ion impact, whipple_1981", value, "1", 1e-4,
            "2 gamma_max sqrt(x)/(1 + x), Whipple 1981, Rep. Prog. Phys. 44, 1197", "closed form",
            partial(whipple_1981, 1e3 * kev, peak_yield=4.28, peak_energy_eV=90e3),
        )  # fmt: skip
    for volts, value in ((1.0, 0.669421), (5.0, 0.224377), (20.0, 0.033736)):
        yield Check(
            f"secondaries that leave a metal at +{volts:g} V, W = 4.5 eV",
            "escape of secondaries, Chung & Everhart 1974", value, "1", 1e-4,
            "[W/(W + V)]^2 by hand", "closed form",
            partial(
                secondary_escape_fraction, volts, kind="conductor", work_function_eV=4.5
            ),
        )  # fmt: skip
    yield Check(
        "secondaries that leave a dielectric at +5 V, T = 2 eV",
        "escape of secondaries, Maxwellian", 0.082085, "1", 1e-4, "exp(-V/T)", "closed form",
        partial(secondary_escape_fraction, 5.0, kind="dielectric", secondary_energy_eV=2.0),
    )  # fmt: skip
