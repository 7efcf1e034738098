"""Low orbit: ram and wake currents, aurora and ionosphere against published figures."""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial

import numpy as np
from scipy.constants import e

from charging.currents.flow import plane_limit
from charging.currents.focus import focused_flux
from charging.evidence.check import Check
from environments.auroral_oval import equatorward_edge_deg, poleward_edge_deg
from environments.ionosphere import profile, transition_height_km
from environments.ionosphere_climatology import electron_layer
from environments.precipitation import average_precipitation
from environments.species import OXYGEN_ION

GUSSENHOVEN = "Gussenhoven, Hardy & Heinemann 1983, J. Geophys. Res. 88, 5692, by hand"
STARKOV = "Starkov 1994, Geomagn. Aeron. 34, 331, by hand"
HARDY = "Hardy et al. 1987, J. Geophys. Res. 92, 12275 (abstract), through Robinson et al. 1987"


def _ram(cosine: float, temperature_eV: float) -> float:
    where = (0.0, 125e6, temperature_eV, OXYGEN_ION.mass_kg, 1, 7450.0, cosine)
    return float(plane_limit(*where).current_A_m2) * 1e9


def _sphere(speed_ratio: float, attraction: float) -> float:
    node, weight = np.polynomial.legendre.leggauss(48)
    return 0.5 * float(np.sum(weight * focused_flux(speed_ratio, node, attraction)[0]))


def _conductance(kp: float) -> float:
    """Pedersen conductance of the average precipitation [mho]."""
    flux, temperature = average_precipitation(0.0, kp)
    mean, power = 2.0 * temperature / 1e3, flux * 2.0 * temperature * e * 1e3
    return float(40.0 * mean * np.sqrt(power) / (16.0 + mean**2))


def _density(altitude_km: float, hour: float, latitude_deg: float, f107: float) -> float:
    one = np.ones(1)
    day = one if 6.0 < hour < 18.0 else 0.0 * one
    layer = electron_layer(latitude_deg * one, hour * one, 0.0 * one, f107 * one)
    crossing = transition_height_km(day, f107 * one, latitude_deg * one)
    return float(profile(altitude_km * one, layer, day, crossing).electron_density_m3[0])


def low_orbit_checks() -> Iterator[Check]:
    """Checks of this topic.

    Yields
    ------
    Check
    """
    yield Check(
        "O+ onto a ram plate, 125 cm-3, 7450 m/s", "ram current", 149.2, "nA m-2", 1e-3,
        "n u e by hand, plasma of ECSS-E-ST-10-04C clause 8.2.3 b", "closed form",
        partial(_ram, 1.0, 0.02),
    )  # fmt: skip
    yield Check(
        "O+ onto a plate along the motion, 0.2 eV", "ram current", 8.774, "nA m-2", 1e-3,
        "random flux by hand, same plasma", "closed form", partial(_ram, 0.0, 0.2),
    )  # fmt: skip
    for S, u, value in ((1.0, 50.0, 38.6454), (5.0, 1000.0, 181.7651)):
        yield Check(
            f"sphere's mean flux over that at rest, speed ratio {S:g}, {u:g} kT",
            "orbits round a drawing sphere", value, "1", 1e-3,
            "orbit-limited sphere in a stream, Kanal 1962, Whipple 1981, evaluated with mpmath",
            "closed form", partial(_sphere, S, u),
        )  # fmt: skip
    for hour, kp, edge in ((0.5, 3.0, 60.13), (18.5, 5.0, 62.50)):
        yield Check(
            f"equatorward edge of the aurora at {hour:g} h, Kp {kp:g}", "auroral oval 1983", edge,
            "deg", 0.006, GUSSENHOVEN, "closed form", partial(equatorward_edge_deg, hour, kp),
            "absolute",
        )  # fmt: skip
    for hour, edge in ((0.0, 71.89), (12.0, 75.71)):
        yield Check(
            f"poleward edge of the oval at {hour:g} h, Kp 3", "auroral oval 1994", edge, "deg",
            0.006, STARKOV, "closed form", partial(poleward_edge_deg, hour, 3.0), "absolute",
        )  # fmt: skip
    for kp, value in ((0.0, 3.09), (6.0, 12.5)):
        yield Check(
            f"Pedersen conductance of the night oval, Kp {kp:g}", "average precipitation", value,
            "mho", 0.01, HARDY, "calibration", partial(_conductance, kp),
        )  # fmt: skip
    for altitude, hour, latitude, f107, value in (
        (400.0, 0.0, 45.0, 200.0, 4.0e11),
        (400.0, 12.0, 20.0, 200.0, 2.5e12),
        (800.0, 12.0, 65.0, 70.0, 5.3e9),
    ):
        yield Check(
            f"ionosphere at {altitude:g} km, {hour:g} h, {latitude:g} deg, F10.7 {f107:g}",
            "ionosphere", value, "m-3", 2.5,
            "International Reference Ionosphere climatology (PyIRI 0.1.7) at longitude 0",
            "derived", partial(_density, altitude, hour, latitude, f107), "factor",
            independent=False,
        )  # fmt: skip
