"""Orbits, eclipses and the magnetic field against closed forms and handbooks."""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial

import numpy as np

from charging.evidence.check import Check
from environments.eclipse import Eclipse, find_eclipses
from environments.magnetosphere import MEAN_RADIUS_M, dipole
from environments.orbit import (
    EARTH_RADIUS_M,
    KeplerOrbit,
    drift_rates_rad_s,
    period_s,
    position_velocity,
)
from environments.sun import sun_path

GEO_KM = 42164.17


def _orbit(day: str, radius_km: float, inclination_deg: float = 0.0) -> KeplerOrbit:
    return KeplerOrbit(np.datetime64(day), radius_km, 0.0, inclination_deg)


def _eclipses(orbit: KeplerOrbit, days: float) -> list[Eclipse]:
    return list(
        find_eclipses(
            lambda t: position_velocity(orbit, t)[0], sun_path(orbit.epoch), 0.0, days * 86400.0
        )
    )


def _longest_umbra_min(radius_km: float, day: str, days: float) -> float:
    return max(found.umbra_s for found in _eclipses(_orbit(day, radius_km), days)) / 60.0


def _longest_eclipse_min() -> float:
    spans = [
        found.penumbra_end - found.penumbra_start
        for found in _eclipses(_orbit("2031-03-16", GEO_KM), 10.0)
        if found.penumbra_start is not None and found.penumbra_end is not None
    ]
    return max(spans) / 60.0


def _season_days(*, umbra: bool) -> float:
    found = _eclipses(_orbit("2031-02-01", GEO_KM), 100.0)
    return float(sum(1 for one in found if one.umbra_s > 0.0 or not umbra))


def _node_deg_day(radius_km: float, inclination_deg: float) -> float:
    rates = drift_rates_rad_s(_orbit("2031-03-20", radius_km, inclination_deg))
    return float(np.degrees(rates[0]) * 86400.0)


def orbit_checks() -> Iterator[Check]:
    """Rows about orbits and their eclipses."""
    yield Check(
        "geostationary umbra at equinox", "eclipse geometry", 67.5, "min", 0.5,
        "umbral cone by hand, half-width 8.436 deg; 67.4 min observed on 26 September 2010",
        "derived", partial(_longest_umbra_min, GEO_KM, "2031-03-16", 10.0), "absolute",
    )  # fmt: skip
    yield Check(
        "geostationary eclipse, first to last contact", "eclipse geometry", 71.8, "min", 0.5,
        "penumbral cone by hand, half-width 8.969 deg", "derived", _longest_eclipse_min,
        "absolute",
    )  # fmt: skip
    for umbra, value, word in ((True, 43.9, "umbra"), (False, 46.8, "penumbra")):
        yield Check(
            f"days of a geostationary season with {word}", "eclipse geometry", value, "days", 1.5,
            "solar declination within the half-width of the shadow", "derived",
            partial(_season_days, umbra=umbra), "absolute",
        )  # fmt: skip
    low = EARTH_RADIUS_M / 1e3 + 400.0
    # cylinder at beta 0, 36.1 min; its umbral cone is 2 x 4.1 s shorter
    yield Check(
        "umbra at 400 km, Sun in the plane", "eclipse geometry", 36.1 - 8.2 / 60.0, "min", 5e-3,
        "2 asin(R/(R + h)) over the mean motion, less the penumbra", "derived",
        partial(_longest_umbra_min, low, "2031-03-20", 1.0),
    )  # fmt: skip
    yield Check(
        "period at 400 km", "Kepler's third law", 92.56, "min", 1e-3, "2 pi sqrt(a^3/GM) by hand",
        "closed form", lambda: period_s(_orbit("2031-03-20", low)) / 60.0,
    )  # fmt: skip
    yield Check(
        "sidereal period of the geostationary orbit", "Kepler's third law", 86164.1, "s", 1e-5,
        "definition of the orbit", "memory", lambda: period_s(_orbit("2031-03-20", GEO_KM)),
    )  # fmt: skip
    # -1.5 n J2 (R/a)^2 cos i with J2 = 1.08263e-3
    yield Check(
        "node rate at 800 km, 98.60 deg", "secular rates of the oblate Earth", 0.9856, "deg/day",
        5e-3, "360 deg in a tropical year: definition of a sun-synchronous orbit", "closed form",
        partial(_node_deg_day, 7178.137, 98.60),
    )  # fmt: skip
    yield Check(
        "equatorial field of the Earth's dipole", "dipole field",
        1e-7 * 7.7e22 / MEAN_RADIUS_M**3, "T", 0.01, "mu0 M/(4 pi a^3), M = 7.7e22 A m2", "memory",
        lambda: dipole(2025.0).equatorial_field_T,
    )  # fmt: skip
