"""Critical temperatures: computed apart from this code with the published laws, and published.

Parameters: Sanders & Inouye 1979, Prokopenko & Laframboise 1980, CRC Handbook (memory). The
computed columns come from an independent quadrature on a logarithmic energy grid with the
formulas as printed, so agreement within 3 percent checks laws and averages. Published:
Lai & Della-Rose 2001, J. Spacecr. Rockets 38, 922 (memory, two digits); rows whose parameters
were picked because they meet the published temperature are printed but not counted.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from typing import NamedTuple

import numpy as np
import pytest
from numpy.typing import NDArray

from charging.onset import (
    law_spread_eV,
    onset_temperatures,
    printed_difference,
    roots_of_average,
)
from materials import material_names
from materials.angle import (
    backscatter_angle_coefficient,
    exponential_angle_factor,
    secondary_angle_coefficient,
)
from materials.backscatter import prokopenko_laframboise_1980
from materials.secondary import YIELD_LAWS, YieldLaw, normal_yield, printed_form

Array = NDArray[np.float64]


class Row(NamedTuple):
    """delta_max, E_max, backscatter A, B, C per keV, Z; temperatures [eV], None: no root."""

    name: str
    peak: float
    peak_eV: float
    a: float
    b: float
    c: float
    z: float
    published_normal: float | None
    si_normal: float | None
    published_isotropic: float
    si_isotropic: float
    si_doubled: float
    sternglass: float | None
    lin_joy: float | None
    lin_joy_isotropic: float | None
    draine_salpeter: float | None
    anti_normal: float | None
    anti_isotropic: float
    matched: bool = False


NONE = None
ROWS = [
    Row("magnesium", 0.92, 250, 0.1, 0, 0, 12, NONE, NONE, 400, 485, 690, NONE, NONE, 475, 103,
        NONE, 40.9),
    Row("aluminium", 0.97, 300, 0.16, 0, 0, 13, NONE, NONE, 600, 795, 968, 224, NONE, 857, 192,
        NONE, 34.4),
    Row("polyimide", 2.1, 150, 0.07, 0, 0, 6.3, 500, 471, 800, 779, 945, 475, 543, 1200, 284,
        14.1, 7.4),
    Row("aluminium oxide", 2.6, 300, 0.16, 0, 0, 10.6, 1200, 1334, 2000, 2235, 2437, 1343, 1852,
        4626, 805, 18.2, 9.0, True),
    Row("fluoropolymer", 3.0, 300, 0.09, 0, 0, 8.3, 1400, 1420, 2100, 2178, 2558, 1430, 2051,
        4401, 859, 16.8, 9.3),
    Row("copper-beryllium", 2.2, 300, 0.31, 0.22, 0.25, 28, 1400, 1145, 2100, 1905, 2268, 1153,
        1504, 4041, 662, 25.3, 14.9),
    Row("glass", 2.35, 350, 0.12, 0, 0, 10.8, 1400, 1334, 2200, 2167, 2532, 1343, 1693, 3816,
        802, 25.8, 13.6, True),
    Row("silica", 2.4, 400, 0.12, 0, 0, 10.8, 1700, 1560, 2600, 2521, 2943, 1571, 2004, 4506,
        938, 28.7, 15.2),
    Row("silver, 1.0", 1.0, 800, 0.42, 0.3, 0.4, 47, 1200, 1106, 2700, 3176, 3652, 1169, 948,
        4504, 673, 293.3, 111.1, True),
    Row("silver, 1.5", 1.5, 800, 0.42, 0.3, 0.4, 47, 1200, 2563, 2700, 4970, 5411, 2589, 3093,
        9632, 1415, 112.9, 61.0),
    Row("magnesium oxide", 4.0, 400, 0.12, 0, 0, 10.4, 2500, 2533, 3600, 3782, 4309, 2554, 4542,
        9932, 1561, 15.1, 8.5),
    Row("indium oxide", 1.4, 800, 0.39, 0.3, 0.4, 40, 2000, 2160, 3600, 4408, 4873, 2189, 2395,
        7784, 1196, 136.2, 71.1, True),
    Row("gold, 1.40", 1.4, 800, 0.48, 0.35, 0.41, 79, 2900, 2603, 4900, 4950, 5544, 2629, 3204,
        9682, 1399, 123.5, 66.6, True),
    Row("gold, 1.45", 1.45, 800, 0.48, 0.35, 0.41, 79, 2900, 2735, 4900, 5120, 5716, 2761, 3460,
        10283, 1475, 116.1, 63.5, True),
    Row("copper-beryllium, activated", 5.0, 400, 0.31, 0.22, 0.25, 28, 3700, 3425, 5300, 5183,
        5701, 3469, 8863, 22676, 2106, 12.1, 7.7),
    Row("magnesium fluoride", 5.5, 1000, 0.1, 0, 0, 10, 7800, 8044, 10900, 11431, 13189, 8133,
        17905, 37155, 5077, 26.9, 15.8, True),
]  # fmt: skip

TOLERANCE = 0.03

# computed the same way, laws with E^-0.35 tails that this package does not offer, in the
# order of `ROWS`: Young & Dekker and Vaughan 1993, normal incidence
SLOW_TAILS = [
    (NONE, NONE),
    (NONE, 304),
    (1524, 1464),
    (7601, 7526),
    (9110, 9012),
    (7412, 7328),
    (5795, 5789),
    (7038, 7058),
    (2384, 2654),
    (11514, 11759),
    (30477, 30395),
    (7848, 8069),
    (12917, 13178),
    (14414, 14687),
    (115467, 115067),
    (177526, 180328),
]


def vaughan_1993(x: Array, peak_eV: float) -> Array:
    v = np.maximum((x * peak_eV - 12.5) / (peak_eV - 12.5), 0.0)
    power = np.where(v <= 1.0, 0.56, 0.25)
    far = 1.125 * np.maximum(v, 1.0) ** -0.35
    return np.where(v > 3.6, far, (v * np.exp(1.0 - v)) ** power)


# forms as printed, of x = E/E_max (and E_max), for a stated maximum of one; typed here anew
PRINTED: dict[str, Callable[[Array, float], Array]] = {
    "sanders_inouye_1979": lambda x, _: 1.37 * (np.exp(-x / 4.3) - np.exp(-x / 0.367)),
    "sternglass_1954": lambda x, _: 7.4 * x * np.exp(-2.0 * np.sqrt(x)),
    "lin_joy_2005": lambda x, _: 1.28 * x**-0.67 * (1.0 - np.exp(-1.614 * x**1.67)),
    "draine_salpeter_1979": lambda x, _: 8.0 * x / (1.0 + x) ** 3,
    "young_dekker": lambda x, _: 1.114 * x**-0.35 * (1.0 - np.exp(-2.28 * x**1.35)),
    "vaughan_1993": vaughan_1993,
}


def computed(
    row: Row, law: str, secondary: float = 1.0, back: float = 1.0
) -> tuple[float | None, float | None]:
    """Critical and anticritical temperature by a printed form, with factors on both yields."""
    drop_eV = 1e3 / row.c if row.c else 1.0

    def total(energy: Array) -> Array:
        free = row.peak * PRINTED[law](energy / row.peak_eV, row.peak_eV)
        eta = prokopenko_laframboise_1980(
            energy, high_energy=row.a, low_energy_drop=row.b, drop_energy_eV=drop_eV
        )
        return secondary * free + back * eta

    return roots_of_average(total)


def isotropic_factors(z: float) -> tuple[float, float]:
    """Angle averages of both yields after Laframboise & Kamitsuma 1983, at every energy."""
    return (
        float(exponential_angle_factor(secondary_angle_coefficient(z))),
        float(exponential_angle_factor(backscatter_angle_coefficient(z))),
    )


def checks() -> list[tuple[str, float | None, Callable[[], float | None]]]:
    found: list[tuple[str, float | None, Callable[[], float | None]]] = []
    for row, slow in zip(ROWS, SLOW_TAILS, strict=True):
        factors = isotropic_factors(row.z)

        def add(
            what: str,
            expected: float | None,
            law: str,
            f: tuple[float, float],
            upper: bool = True,
            row: Row = row,
        ) -> None:
            found.append(
                (f"{row.name}: {what}", expected,
                 partial(lambda r, w, g, u: computed(r, w, *g)[0 if u else 1], row, law, f, upper))
            )  # fmt: skip

        one = (1.0, 1.0)
        add("Sanders-Inouye normal", row.si_normal, "sanders_inouye_1979", one)
        add("Sanders-Inouye isotropic", row.si_isotropic, "sanders_inouye_1979", factors)
        add("Sanders-Inouye doubled", row.si_doubled, "sanders_inouye_1979", (2.0, 1.0))
        add("Sternglass normal", row.sternglass, "sternglass_1954", one)
        add("Lin-Joy normal", row.lin_joy, "lin_joy_2005", one)
        add("Lin-Joy isotropic", row.lin_joy_isotropic, "lin_joy_2005", factors)
        add("Draine-Salpeter normal", row.draine_salpeter, "draine_salpeter_1979", one)
        add("Young-Dekker normal", slow[0], "young_dekker", one)
        add("Vaughan normal", slow[1], "vaughan_1993", one)
        add("anticritical normal", row.anti_normal, "sanders_inouye_1979", one, False)
        add("anticritical isotropic", row.anti_isotropic, "sanders_inouye_1979", factors, False)
    return found


CHECKS = checks()


@pytest.mark.parametrize(("what", "expected", "ours"), CHECKS, ids=[c[0] for c in CHECKS])
def test_computed_row(what: str, expected: float | None, ours: Callable[[], float | None]) -> None:
    found = ours()
    if expected is None:
        assert found is None
    else:
        assert found == pytest.approx(expected, rel=TOLERANCE)


def product_normal(row: Row, law: YieldLaw) -> float | None:
    """Critical temperature at normal incidence with the package's own form of a law."""
    drop_eV = 1e3 / row.c if row.c else 1.0

    def total(energy: Array) -> Array:
        eta = prokopenko_laframboise_1980(
            energy, high_energy=row.a, low_energy_drop=row.b, drop_energy_eV=drop_eV
        )
        return eta + normal_yield(energy, law=law, peak_yield=row.peak, peak_energy_eV=row.peak_eV)

    return roots_of_average(total)[0]


@pytest.mark.parametrize("law", YIELD_LAWS)
def test_printed_form_is_the_normalised_one_with_other_parameters(law: YieldLaw) -> None:
    form = printed_form(law)
    energy = np.geomspace(1.0, 1e5, 200)
    wanted = PRINTED[law](energy / 300.0, 300.0)
    found = normal_yield(energy, law=law, peak_yield=form.height, peak_energy_eV=form.place * 300.0)
    # 1.614 of Lin & Joy has four digits
    assert found == pytest.approx(wanted, rel=2e-4 if law == "lin_joy_2005" else 1e-9, abs=1e-15)
    assert found.max() == pytest.approx(form.height, rel=1e-2)


def test_onset_says_what_the_printed_forms_would_give() -> None:
    """The rows of the command carry both; they move as the forms of the reference do."""
    rows = onset_temperatures("polyimide film")
    for law, low, high in (
        ("sanders_inouye_1979", -0.04, -0.01), ("lin_joy_2005", 0.03, 0.08),
        ("sternglass_1954", 0.0, 0.01), ("draine_salpeter_1979", -0.5, -0.3),
    ):  # fmt: skip
        found = printed_difference(rows, law)
        assert found is not None
        assert low <= found[0] <= found[1] <= high


def test_table_beside_the_publication(capsys: pytest.CaptureFixture[str]) -> None:
    """Print the published values; count only parameters not picked to meet them."""
    counted = []
    for row in ROWS:
        for angle, published, factors in (
            ("normal", row.published_normal, (1.0, 1.0)),
            ("isotropic", row.published_isotropic, isotropic_factors(row.z)),
        ):
            found = computed(row, "sanders_inouye_1979", *factors)[0]
            mark = "not counted" if row.matched else "counted"
            print(f"{row.name:30} {angle:10} published {published} computed {found} {mark}")
            if angle == "normal":
                for law in YIELD_LAWS:
                    product, printed = product_normal(row, law), computed(row, law)[0]
                    print(f"    {law}: as printed {printed}, normalised {product}")
            if not row.matched and published and found:
                counted.append(found / published)
    # two printed digits, laws and backscatter from memory: the bulk within 15 percent; silver
    # with its handbook yield of 1.5 lies a factor two off, in print too
    assert np.median(np.abs(np.array(counted) - 1.0)) < 0.1
    assert "not counted" in capsys.readouterr().out


def test_universal_table_of_the_laws() -> None:
    """T*/E_max and T_A/E_max without backscatter, printed forms, computed apart."""
    peaks = (1.2, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0)
    table: dict[YieldLaw, tuple[float | None, ...]] = {
        "sanders_inouye_1979": (0.8327, 1.6679, 2.6804, 3.5403, 4.3092, 5.6655, 6.8560),
        "sternglass_1954": (0.9325, 1.7157, 2.7120, 3.5676, 4.3381, 5.7079, 6.9188),
        "lin_joy_2005": (None, 1.5757, 2.9006, 4.3233, 5.8663, 9.3003, 13.1614),
        "draine_salpeter_1979": (0.7028, 1.0792, 1.6286, 2.1289, 2.5964, 3.4608, 4.2555),
    }
    lower = {
        "sanders_inouye_1979": (0.4008, 0.1932, 0.1131, 0.0809, 0.0631, 0.0440, 0.0338),
        "sternglass_1954": (0.3175, 0.1556, 0.0861, 0.0589, 0.0445, 0.0295, 0.0219),
    }
    for law, ratios in table.items():
        for i, (peak, ratio) in enumerate(zip(peaks, ratios, strict=True)):
            row = ROWS[0]._replace(peak=peak, peak_eV=1000.0, a=0.0)
            critical, anticritical = computed(row, law)
            if ratio is None:
                assert critical is None
                continue
            assert critical == pytest.approx(1000.0 * ratio, rel=2e-4)
            if law in lower:
                assert anticritical == pytest.approx(1000.0 * lower[law][i], rel=2e-3)


def test_closed_form_of_polyimide() -> None:
    # integrated by hand: (1+T/a)^-2 - (1+T/b)^-2, root 470.694403 eV, lower root 14.057859 eV
    critical, anticritical = computed(ROWS[2], "sanders_inouye_1979")
    assert critical == pytest.approx(470.694403, rel=1e-6)
    assert anticritical == pytest.approx(14.057859, rel=1e-6)


@pytest.mark.parametrize("name", material_names())
def test_onset_of_every_material(name: str) -> None:
    rows = onset_temperatures(name)
    assert (rows[0].angle, rows[0].law) == ("isotropic", "sanders_inouye_1979")
    assert {row.law for row in rows} == set(YIELD_LAWS)
    assert {row.angle for row in rows} == {"isotropic", "normal"}
    for row in rows:
        if row.critical_temperature_eV is not None and row.anticritical_temperature_eV is not None:
            assert row.anticritical_temperature_eV < row.critical_temperature_eV
    spread = law_spread_eV(rows)
    assert spread is None or spread[0] <= spread[1]
    if spread is None:
        assert name in {"bare collector", "black paint, carbon-polyurethane", "graphite"}
