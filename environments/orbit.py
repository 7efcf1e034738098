"""Kepler orbit around the Earth with the secular drift of its oblateness."""

from dataclasses import dataclass
from math import isfinite
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.errors import EnvironmentDataError

# WGS 84 as in NIMA TR8350.2 (2000): GM and equatorial radius; digits from memory.
EARTH_GM_M3_S2: Final = 3.986004418e14
EARTH_RADIUS_M: Final = 6378137.0
# J2 = -sqrt(5) C20, C20 = -0.484165371736e-3 of EGM96 (Lemoine et al. 1998), from memory.
EARTH_J2: Final = 1.0826266836e-3


@dataclass(frozen=True, slots=True)
class KeplerOrbit:
    """Mean elements of an orbit around the Earth.

    Attributes
    ----------
    epoch : numpy.datetime64
        UTC time of the elements; kept with unit ns.
    semi_major_axis_km : float
        Mean semi-major axis [km].
    eccentricity : float
        0 <= e < 1.
    inclination_deg : float
        Against the equator of J2000 [deg], 0 to 180.
    raan_deg, argument_of_perigee_deg, mean_anomaly_deg : float
        Node, perigee and mean anomaly at the epoch [deg].

    Raises
    ------
    EnvironmentDataError
        Figure not finite or out of range, or a perigee below ground.

    Examples
    --------
    >>> orbit = KeplerOrbit(np.datetime64("2031-03-20T00:00:00"), 42164.17, 0.0, 0.0)
    >>> round(period_s(orbit))
    86164
    """

    epoch: np.datetime64
    semi_major_axis_km: float
    eccentricity: float
    inclination_deg: float
    raan_deg: float = 0.0
    argument_of_perigee_deg: float = 0.0
    mean_anomaly_deg: float = 0.0

    def __post_init__(self) -> None:
        epoch = np.asarray(self.epoch).astype("datetime64[ns]")[()]
        if np.isnat(epoch):
            raise EnvironmentDataError("is not a time", key=("epoch",), allowed="a UTC time")
        object.__setattr__(self, "epoch", epoch)
        for key in (
            "semi_major_axis_km",
            "eccentricity",
            "inclination_deg",
            "raan_deg",
            "argument_of_perigee_deg",
            "mean_anomaly_deg",
        ):
            value = getattr(self, key)
            if not isfinite(value):
                raise EnvironmentDataError("must be finite", key=(key,), value=value)
        if not 0.0 <= self.eccentricity < 1.0:
            raise EnvironmentDataError(
                "is no closed orbit",
                key=("eccentricity",),
                value=self.eccentricity,
                allowed="0 <= e < 1",
            )
        if not 0.0 <= self.inclination_deg <= 180.0:
            raise EnvironmentDataError(
                "is out of range",
                key=("inclination_deg",),
                value=self.inclination_deg,
                allowed="0 to 180",
            )
        perigee_km = self.semi_major_axis_km * (1.0 - self.eccentricity)
        if perigee_km <= EARTH_RADIUS_M / 1e3:
            raise EnvironmentDataError(
                f"puts the perigee below ground ({perigee_km:.0f} km from the centre)",
                key=("semi_major_axis_km",),
                value=self.semi_major_axis_km,
                allowed=f"a (1 - e) above {EARTH_RADIUS_M / 1e3:.3f} km",
            )


def period_s(orbit: KeplerOrbit) -> float:
    """Keplerian period of an orbit, without the drift of the oblateness.

    Parameters
    ----------
    orbit : KeplerOrbit
        Any orbit.

    Returns
    -------
    float
        Period [s], 2 pi sqrt(a^3/GM).

    Examples
    --------
    >>> leo = KeplerOrbit(np.datetime64("2031-03-20"), 6778.137, 0.0, 51.6)
    >>> round(period_s(leo) / 60.0, 1)
    92.6
    """
    return float(2.0 * np.pi / _mean_motion(orbit))


def drift_rates_rad_s(orbit: KeplerOrbit) -> tuple[float, float, float]:
    r"""Secular rates that the Earth's oblateness gives an orbit.

    With :math:`k = \tfrac32 J_2 (R/p)^2 n`, p = a(1-e^2):
    :math:`\dot\Omega = -k\cos i`, :math:`\dot\omega = k(2-\tfrac52\sin^2 i)`,
    :math:`\dot M = n + k\sqrt{1-e^2}(1-\tfrac32\sin^2 i)`.

    Parameters
    ----------
    orbit : KeplerOrbit
        Any orbit.

    Returns
    -------
    tuple of float
        Rates of node, argument of perigee and mean anomaly [rad s-1]; the last one holds
        the mean motion.

    Notes
    -----
    First order in J2: the next terms are smaller by J2, 0.001. Short-period terms (below
    10 km in low orbit, 3 km in geostationary) are left out, as are the Sun, the Moon and drag.

    References
    ----------
    Brouwer (1959), Astron. J. 64, 378; Vallado (2013), Fundamentals of Astrodynamics and
    Applications, 4th ed., sec. 9.6 (section from memory).

    Examples
    --------
    >>> sun_synchronous = KeplerOrbit(np.datetime64("2031-03-20"), 7178.137, 0.0, 98.6)
    >>> round(float(np.degrees(drift_rates_rad_s(sun_synchronous)[0]) * 86400.0), 2)
    0.99
    """
    n = _mean_motion(orbit)
    e = orbit.eccentricity
    inclination = np.radians(orbit.inclination_deg)
    parameter = orbit.semi_major_axis_km * 1e3 * (1.0 - e * e)
    k = 1.5 * EARTH_J2 * (EARTH_RADIUS_M / parameter) ** 2 * n
    sin2 = np.sin(inclination) ** 2
    return (
        float(-k * np.cos(inclination)),
        float(k * (2.0 - 2.5 * sin2)),
        float(n + k * np.sqrt(1.0 - e * e) * (1.0 - 1.5 * sin2)),
    )


def position_velocity(
    orbit: KeplerOrbit, seconds: ArrayLike
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Position and velocity along an orbit.

    Parameters
    ----------
    orbit : KeplerOrbit
        Mean elements; its plane is counted from the equator and equinox of J2000.
    seconds : array_like, shape (N,)
        Time since the epoch [s]; may be negative.

    Returns
    -------
    position, velocity : ndarray, shape (3, N)
        [m] and [m s-1], inertial, GCRS-like. The velocity is the exact time derivative of
        the position, drift of node and perigee included.

    Raises
    ------
    ValueError
        `seconds` not finite or not one-dimensional.

    Notes
    -----
    Errors grow with time by what `drift_rates_rad_s` leaves out; against tracked elements
    of a low satellite expect kilometres within a day.

    Examples
    --------
    >>> orbit = KeplerOrbit(np.datetime64("2031-03-20"), 42164.17, 0.0, 0.0)
    >>> position, velocity = position_velocity(orbit, [0.0])
    >>> position[:, 0].round(0).tolist(), velocity[1, 0].round(0).item()
    ([42164170.0, 0.0, 0.0], 3075.0)
    """
    time = np.asarray(seconds, dtype=np.float64)
    if time.ndim != 1 or not np.isfinite(time).all():
        raise ValueError("seconds must be a one-dimensional array of finite numbers")
    raan_rate, perigee_rate, anomaly_rate = drift_rates_rad_s(orbit)
    a = orbit.semi_major_axis_km * 1e3
    e = orbit.eccentricity
    b = a * np.sqrt(1.0 - e * e)
    E = eccentric_anomaly(np.radians(orbit.mean_anomaly_deg) + anomaly_rate * time, e)
    E_rate = anomaly_rate / (1.0 - e * np.cos(E))
    # in the plane: x to perigee, y along the motion there
    x, y = a * (np.cos(E) - e), b * np.sin(E)
    x_rate, y_rate = -a * np.sin(E) * E_rate, b * np.cos(E) * E_rate
    perigee = np.radians(orbit.argument_of_perigee_deg) + perigee_rate * time
    u, v = _turn(x, y, perigee)
    u_rate, v_rate = _turn(x_rate, y_rate, perigee)
    u_rate, v_rate = u_rate - perigee_rate * v, v_rate + perigee_rate * u
    # tilt about the node, then turn by the node
    cos_i, sin_i = (
        np.cos(np.radians(orbit.inclination_deg)),
        np.sin(np.radians(orbit.inclination_deg)),
    )
    raan = np.radians(orbit.raan_deg) + raan_rate * time
    X, Y = _turn(u, v * cos_i, raan)
    X_rate, Y_rate = _turn(u_rate, v_rate * cos_i, raan)
    position = np.stack((X, Y, v * sin_i))
    velocity = np.stack((X_rate - raan_rate * Y, Y_rate + raan_rate * X, v_rate * sin_i))
    return position, velocity


def eccentric_anomaly(mean_anomaly_rad: ArrayLike, eccentricity: float) -> NDArray[np.float64]:
    """Solve Kepler's equation E - e sin E = M.

    Parameters
    ----------
    mean_anomaly_rad : array_like
        M [rad], any revolution.
    eccentricity : float
        0 <= e < 1.

    Returns
    -------
    ndarray
        E [rad], in the same revolution as M.

    Notes
    -----
    Newton steps kept inside the bracket |E - M| <= e, halved where a step leaves it, so the
    iteration ends for every M and e. The residual reached is a few units in the last place.

    Examples
    --------
    >>> E = eccentric_anomaly(1.0, 0.5)
    >>> round(float(E - 0.5 * np.sin(E)), 12)
    1.0
    """
    M = np.asarray(mean_anomaly_rad, dtype=np.float64)
    turns = 2.0 * np.pi * np.round(M / (2.0 * np.pi))
    m = M - turns
    low, high = m - eccentricity, m + eccentricity
    E = m + eccentricity * np.sin(m)
    for _ in range(100):
        residual = E - eccentricity * np.sin(E) - m
        low = np.where(residual < 0.0, E, low)
        high = np.where(residual > 0.0, E, high)
        step = E - residual / (1.0 - eccentricity * np.cos(E))
        new = np.where((step >= low) & (step <= high), step, 0.5 * (low + high))
        done = np.abs(new - E) <= 4e-16 * (1.0 + np.abs(E))
        E = new
        if bool(done.all()):
            break
    return np.asarray(E + turns, dtype=np.float64)


def _mean_motion(orbit: KeplerOrbit) -> float:
    return float(np.sqrt(EARTH_GM_M3_S2 / (orbit.semi_major_axis_km * 1e3) ** 3))


def _turn(
    x: NDArray[np.float64], y: NDArray[np.float64], angle: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    cos, sin = np.cos(angle), np.sin(angle)
    return cos * x - sin * y, sin * x + cos * y
