"""Models of the regions along an orbit against their papers and other surveys."""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial

import numpy as np
from scipy.constants import e, m_e, m_p

from charging.evidence.check import Check
from environments import plasmasphere, solar_wind, tail_lobe
from environments.activity import Activity, ActivityAt
from environments.magnetopause import (
    bow_shock_radius,
    magnetopause_flaring,
    magnetopause_radius,
    magnetopause_standoff,
)
from environments.magnetosheath import magnetosheath
from environments.plasma_sheet import geostationary_sheet

SHUE = "Shue et al. 1998, J. Geophys. Res. 103, 17691, eqs. 10 and 11 by hand"
CARPENTER = "Carpenter & Anderson 1992, J. Geophys. Res. 97, 1097, by hand"
AVERAGES = "ATS-5, ATS-6, 1979: means in NASA TP-2361, middle of three, from memory"


def _now() -> ActivityAt:
    return Activity().at(np.array(["2031-03-20"], "datetime64[ns]"))


def _saturated(L: float) -> float:
    return float(plasmasphere.saturated_density_m3(L)) / 1e6


def _trough(L: float, hour: float) -> float:
    return float(plasmasphere.trough_density_m3(L, hour)) / 1e6


def _nose_density_ratio() -> float:
    now = _now()
    return float((magnetosheath([0.0], now).proton_density_m3 / now.density_m3)[0])


def _normal_shock() -> float:
    """Rankine-Hugoniot, 5/3, sonic Mach number of the default wind: 6.5 cm-3 cancels."""
    mach2 = 440e3**2 * m_p / (5.0 / 3.0 * e * 20.0)
    return (8.0 / 3.0) * mach2 / ((2.0 / 3.0) * mach2 + 2.0)


def _geostationary(which: int) -> float:
    t = np.arange(0.0, 24.0, 0.5)
    found = geostationary_sheet(t, np.full(t.size, 2.5), np.full(t.size, 120.0))
    n, T = found.electron_density_m3, found.electron_temperature_eV
    current = 1e5 * e * n * np.sqrt(e * T / (2.0 * np.pi * m_e))
    means = (n.mean() / 1e6, (n * T).mean() / n.mean() / 1e3, current.mean())
    return float(means[which])


def _proton_temperature(distance_au: float) -> float:
    return float(solar_wind.solar_wind([distance_au], _now()).proton_temperature_eV[0])


def _proton_density(distance_au: float) -> float:
    return float(solar_wind.solar_wind([distance_au], _now()).proton_density_m3[0]) / 1e6


def _cap(radius_re: float) -> float:
    return float(tail_lobe.lobe_plasma([radius_re]).cap_density_m3[0]) / 1e6


def region_checks() -> Iterator[Check]:
    """Rows about magnetopause, magnetosheath, plasmasphere, plasma sheet, wind."""
    for pressure, bz, nose, flaring in ((2, 0, 10.252, 0.5896), (10, -10, 6.910, 0.6859)):
        where = f"{pressure} nPa, Bz {bz} nT"
        yield Check(
            f"magnetopause under the Sun, {where}", "magnetopause 1998", nose, "RE", 1e-4, SHUE,
            "closed form", partial(magnetopause_standoff, bz, pressure),
        )  # fmt: skip
        yield Check(
            f"flaring of the magnetopause, {where}", "magnetopause 1998", flaring, "1", 1e-4,
            SHUE, "closed form", partial(magnetopause_flaring, bz, pressure),
        )  # fmt: skip
    yield Check(
        "magnetopause across the Sun line, Bz 0 nT, 2 nPa", "magnetopause 1998", 15.4278, "RE",
        1e-3, SHUE, "closed form", partial(magnetopause_radius, 0.0, 0.0, 2.0),
    )  # fmt: skip
    yield Check(
        "magnetopause by the older fit, 4 nPa, Bz -2.4 nT", "magnetopause against older fit",
        8.96790, "RE", 0.02, "Shue et al. 1997, figure printed in an open library's documentation",
        "handbook", partial(magnetopause_standoff, -2.4, 4.0),
    )  # fmt: skip
    for name, law, cosine, value in (
        ("magnetopause at the terminator", magnetopause_radius, 0.0, 15.1),
        ("bow shock under the Sun", bow_shock_radius, 1.0, 14.6),
        ("bow shock at the terminator", bow_shock_radius, 0.0, 25.5),
    ):
        yield Check(
            f"average {name}", "shape of magnetopause and shock", value, "RE", 0.1,
            "Fairfield 1971, J. Geophys. Res. 76, 6700, from memory; 1.6 nPa assumed", "memory",
            partial(law, cosine, 0.0, 1.6),
        )  # fmt: skip
    yield Check(
        "density of the magnetosheath's nose over the wind's", "magnetosheath", _normal_shock(),
        "1", 0.06, "normal shock of a perfect gas, 5/3, at the default wind's sonic Mach number",
        "closed form", _nose_density_ratio,
    )  # fmt: skip
    for L, value in ((2.0, 1885.0), (4.0, 443.0), (6.6, 67.4)):
        yield Check(
            f"saturated plasmasphere at L {L:g}", "plasmasphere 1992", value, "cm-3", 2e-3,
            CARPENTER, "closed form", partial(_saturated, L),
        )  # fmt: skip
    for hour, value in ((3.0, 1.74), (12.0, 3.65)):
        yield Check(
            f"plasma trough at L 6.6, {hour:g} h", "plasma trough 1992", value, "cm-3", 4e-3,
            CARPENTER, "closed form", partial(_trough, 6.6, hour),
        )  # fmt: skip
    yield Check(
        "plasma trough at L 5, 19.5 h, bridged", "plasma trough between 15 and 24 h", 18.04,
        "cm-3", 3.0, "Sheeley et al. 2001, J. Geophys. Res. 106, 25631, mean law by hand",
        "handbook", partial(_trough, 5.0, 19.5), "factor",
    )  # fmt: skip
    for kp in (2.0, 5.0):
        yield Check(
            f"plasmapause at Kp {kp:g}", "plasmapause", 5.39 - 0.382 * kp, "L", 0.35,
            "Moldwin et al. 2002, J. Geophys. Res. 107, 1339: 5.39 - 0.382 Kp", "handbook",
            partial(plasmasphere.plasmapause_l, kp), "absolute",
        )  # fmt: skip
    for which, name, value, unit in (
        (0, "electron density", 1.06, "cm-3"),
        (1, "electron temperature", 2.49, "keV"),
        (2, "electron current density", 0.096, "nA cm-2"),
    ):
        yield Check(
            f"geostationary mean {name}, Kp 2.5", "plasma sheet by local time and Kp", value,
            unit, 2.0, AVERAGES, "memory", partial(_geostationary, which), "factor",
        )  # fmt: skip
    yield Check(
        "protons at 0.3 AU", "solar wind with distance", 23.6, "eV", 4e-3,
        "8 eV r^-0.9 by hand", "closed form", partial(_proton_temperature, 0.3),
    )  # fmt: skip
    yield Check(
        "solar wind at 5.2 AU", "solar wind with distance", 0.240, "cm-3", 4e-3,
        "6.5 cm-3 r^-2 by hand", "closed form", partial(_proton_density, 5.2),
    )  # fmt: skip
    for radius, value in ((2.1, 35.2), (4.66, 0.99)):
        yield Check(
            f"polar cap at {radius:g} RE", "polar cap density", value, "cm-3", 1.5,
            "Persoon et al. 1983, J. Geophys. Res. 88, 10123, from memory; its level was set "
            "between both", "calibration", partial(_cap, radius), "factor",
        )  # fmt: skip
