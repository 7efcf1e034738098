"""Critical temperatures against closed forms, another program and publications."""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial
from math import nan

from charging.evidence.check import Basis, Check
from charging.onset import onset_temperatures, roots_of_average
from materials.backscatter import prokopenko_laframboise_1980
from materials.secondary import YieldLaw, normal_yield

# Height and place of the maximum of the printed Sanders-Inouye form, prefactor 1.37, in the
# stated peak yield and peak energy; worked out by hand.
SI_HEIGHT, SI_PLACE = 0.9959623, 0.9874695
QUADRATURE = (
    "quadrature of the printed forms by another program: Sanders & Inouye 1979, Prokopenko & "
    "Laframboise 1980"
)
LAI = (
    "Lai & Della-Rose 2001, J. Spacecr. Rockets 38, 922: Sanders & Inouye 1979 with Prokopenko & "
    "Laframboise 1980"
)


def _printed_onset_eV(peak: float, peak_eV: float, backscatter: float, *, upper: bool) -> float:
    law: YieldLaw = "sanders_inouye_1979"
    found = roots_of_average(
        lambda E: (
            normal_yield(E, law=law, peak_yield=SI_HEIGHT * peak, peak_energy_eV=SI_PLACE * peak_eV)
            + prokopenko_laframboise_1980(E, high_energy=backscatter)
        )
    )[0 if upper else 1]
    return nan if found is None else found


def _library_onset_eV(name: str) -> float:
    found = onset_temperatures(name)[0].critical_temperature_eV
    return nan if found is None else found


def critical_checks() -> Iterator[Check]:
    """Rows about the temperatures at which electrons stop being outnumbered by their yield."""
    # (1+T/a)^-2 - (1+T/b)^-2 solved by hand for polyimide: peak 2.1 at 150 eV, A = 0.07
    for upper, value in ((True, 470.6944), (False, 14.05786)):
        yield Check(
            f"{'critical' if upper else 'anticritical'} temperature, printed law, peak 2.1 at "
            "150 eV, backscatter 0.07",
            "critical temperature", value, "eV", 2e-4,
            "1.37 x 2.1 [(1 + T/a)^-2 - (1 + T/b)^-2] + 0.07 = 1 by hand", "closed form",
            partial(_printed_onset_eV, 2.1, 150.0, 0.07, upper=upper),
        )  # fmt: skip
    for what, peak, energy, back, value in (
        ("fluoropolymer", 3.0, 300.0, 0.09, 1420.0),
        ("silica", 2.4, 400.0, 0.12, 1560.0),
        ("magnesium oxide", 4.0, 400.0, 0.12, 2533.0),
    ):
        yield Check(
            f"critical temperature, printed law, parameters of {what}", "critical temperature",
            value, "eV", 2e-3, QUADRATURE, "derived",
            partial(_printed_onset_eV, peak, energy, back, upper=True),
        )  # fmt: skip
    for what, peak, energy, back, value, allowed in (
        ("polyimide", 2.1, 150.0, 0.07, 500.0, 0.15),
        ("fluoropolymer", 3.0, 300.0, 0.09, 1400.0, 0.1),
        ("silica", 2.4, 400.0, 0.12, 1700.0, 0.15),
        ("magnesium oxide", 4.0, 400.0, 0.12, 2500.0, 0.1),
    ):
        yield Check(
            f"critical temperature at normal incidence, {what}", "critical temperature, published",
            value, "eV", allowed, LAI, "memory",
            partial(_printed_onset_eV, peak, energy, back, upper=True),
        )  # fmt: skip
    basis: Basis = "memory"
    for name, value in (
        ("polyimide film", 800.0), ("FEP film, silvered", 2100.0), ("fused silica", 2600.0),
        ("cover glass", 2200.0), ("oxidised aluminium", 2000.0), ("silver", 2700.0),
        ("gold", 4900.0),
    ):  # fmt: skip
        yield Check(
            f"critical temperature of {name}, isotropic, own record",
            "critical temperature of the library", value, "eV", 0.25, LAI, basis,
            partial(_library_onset_eV, name),
        )  # fmt: skip
