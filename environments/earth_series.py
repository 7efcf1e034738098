"""The Earth's place about the Sun as sums of cosines."""

from functools import cache
from typing import Final

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

# Amplitude [1e-8 rad, 1e-8 AU], phase [rad], rate [rad per 1000 years]; one line per power of
# the time in thousands of years since J2000.
_LONGITUDE: Final = (
    """175347046 0 0; 3341656 4.6692568 6283.0758500; 34894 4.62610 12566.15170
    3497 2.7441 5753.3849; 3418 2.8289 3.5231; 3136 3.6277 77713.7715; 2676 4.4181 7860.4194
    2343 6.1352 3930.2097; 1324 0.7425 11506.7698; 1273 2.0371 529.6910; 1199 1.1096 1577.3435
    990 5.233 5884.927; 902 2.045 26.298; 857 3.508 398.149; 780 1.179 5223.694
    753 2.533 5507.553; 505 4.583 18849.228; 492 4.205 775.523; 357 2.920 0.067
    317 5.849 11790.629; 284 1.899 796.298; 271 0.315 10977.079; 243 0.345 5486.778
    206 4.806 2544.314; 205 1.869 5573.143; 202 2.458 6069.777; 156 0.833 213.299
    132 3.411 2942.463; 126 1.083 20.775; 115 0.645 0.980; 103 0.636 4694.003
    102 0.976 15720.839; 102 4.267 7.114; 99 6.21 2146.17; 98 0.68 155.42; 86 5.98 161000.69
    85 1.30 6275.96; 85 3.67 71430.70; 80 1.81 17260.15""",
    """628331966747 0 0; 206059 2.678235 6283.075850; 4303 2.6351 12566.1517; 425 1.590 3.523
    119 5.796 26.298; 109 2.966 1577.344; 93 2.59 18849.23; 72 1.14 529.69; 68 1.87 398.15
    67 4.41 5507.55; 59 2.89 5223.69; 56 2.17 155.42""",
    """52919 0 0; 8720 1.0721 6283.0758; 309 0.867 12566.152""",
    """289 5.844 6283.076""",
)
_LATITUDE: Final = (
    "280 3.199 84334.662; 102 5.422 5507.553; 80 3.88 5223.69; 44 3.70 2352.87; 32 4.00 1577.34",
)
_DISTANCE: Final = (
    """100013989 0 0; 1670700 3.0984635 6283.0758500; 13956 3.05525 12566.15170
    3084 5.1985 77713.7715; 1628 1.1739 5753.3849; 1576 2.8469 7860.4194; 925 5.453 11506.770
    542 4.564 3930.210; 472 3.661 5884.927; 346 0.964 5507.553; 329 5.900 5223.694
    307 0.299 5573.143; 243 4.273 11790.629; 212 5.847 1577.344; 186 5.022 10977.079
    175 3.012 18849.228""",
    "103019 1.107490 6283.075850; 1721 1.0644 12566.1517; 702 3.142 0",
    "4359 5.7846 6283.0758; 124 5.579 12566.152",
)
_ABERRATION_RAD: Final = 20.4898 * np.pi / 648000.0  # at 1 AU


def sun_of_date(centuries: Array) -> tuple[Array, Array, Array]:
    """Apparent place of the Sun on the ecliptic of date.

    Parameters
    ----------
    centuries : ndarray, shape (N,)
        Julian centuries of Terrestrial Time since J2000.

    Returns
    -------
    longitude, latitude, distance : ndarray, shape (N,)
        [rad], from the mean equinox of date, aberration included; [rad]; [AU].

    Notes
    -----
    The terms above 8e-7 rad of a planetary theory; see `environments.sun.sun_position_m` for
    what that is good for.

    References
    ----------
    Bretagnon & Francou (1988), Astron. Astrophys. 202, 309 (VSOP87), as shortened by Meeus
    (1998), Astronomical Algorithms, ch. 25 and app. III (numbers from memory).

    Examples
    --------
    >>> longitude, _, distance = sun_of_date(np.array([-0.0721834360]))  # 13 October 1992, 0 h
    >>> round(float(np.degrees(longitude[0]) % 360.0), 3), round(float(distance[0]), 4)
    (199.902, 0.9976)
    """
    tau = centuries / 10.0
    longitude = _sum(_LONGITUDE, tau) + np.pi
    latitude = -_sum(_LATITUDE, tau)
    distance = _sum(_DISTANCE, tau)
    # to the FK5 equinox, -0.09 arcsec
    return longitude - 4.379e-7 - _ABERRATION_RAD / distance, latitude, distance


def _sum(series: tuple[str, ...], tau: Array) -> Array:
    total = np.zeros_like(tau)
    for power in range(len(series) - 1, -1, -1):
        total *= tau
        for amplitude, phase, rate in _terms(series[power]):
            total += amplitude * np.cos(phase + rate * tau) if rate else amplitude * np.cos(phase)
    return 1e-8 * total


@cache
def _terms(text: str) -> tuple[tuple[float, float, float], ...]:
    rows = (row.split() for row in text.replace("\n", ";").split(";"))
    return tuple((float(a), float(b), float(c)) for a, b, c in rows)
