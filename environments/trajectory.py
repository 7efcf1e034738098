"""One interface to every way of saying where a spacecraft is."""

from collections.abc import Iterator
from dataclasses import dataclass
from math import inf
from typing import NamedTuple, Protocol, runtime_checkable

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.errors import EnvironmentDataError
from environments.orbit import EARTH_GM_M3_S2, KeplerOrbit, position_velocity
from environments.sun import (
    beta_angle_deg,
    earth_shadow_radii_m,
    illumination,
    sun_path,
)
from environments.timescales import elapsed_s, utc_at

Array = NDArray[np.float64]


@runtime_checkable
class Trajectory(Protocol):
    """Where a spacecraft is, at true seconds after an epoch.

    Attributes
    ----------
    epoch : numpy.datetime64
        UTC at 0 s.
    span_s : tuple of float
        First and last time that can be asked for [s].
    source : str
        One line for reports: what it rests on, interpolation and frame included.
    speed_limit_m_s : float
        A speed that is never exceeded [m s-1]; the search for eclipses relies on it.
    """

    @property
    def epoch(self) -> np.datetime64: ...  # noqa: D102
    @property
    def span_s(self) -> tuple[float, float]: ...  # noqa: D102
    @property
    def source(self) -> str: ...  # noqa: D102
    @property
    def speed_limit_m_s(self) -> float: ...  # noqa: D102

    def position_velocity(self, seconds: ArrayLike) -> tuple[Array, Array]:
        """Position [m] and velocity [m s-1], (3, N), GCRS-like, at seconds [s], (N,).

        Raises EnvironmentDataError outside the span.
        """
        ...


@dataclass(frozen=True, slots=True)
class KeplerTrajectory:
    """A Kepler orbit with the drift of J2 as a `Trajectory`; see `environments.orbit`.

    Examples
    --------
    >>> orbit = KeplerOrbit(np.datetime64("2031-03-20"), 42164.17, 0.0, 0.0)
    >>> KeplerTrajectory(orbit).position_velocity([0.0])[0][0].round().tolist()
    [42164170.0]
    """

    orbit: KeplerOrbit

    @property
    def epoch(self) -> np.datetime64:
        """UTC of the elements."""
        return self.orbit.epoch

    @property
    def span_s(self) -> tuple[float, float]:
        """Without limit."""
        return (-inf, inf)

    @property
    def source(self) -> str:
        """One line for reports."""
        return "Kepler orbit with secular J2 drift of node, perigee and anomaly"

    @property
    def speed_limit_m_s(self) -> float:
        """Speed at perigee, 1 % added for the drift [m s-1]."""
        perigee_m = 1e3 * self.orbit.semi_major_axis_km * (1.0 - self.orbit.eccentricity)
        return float(1.01 * np.sqrt(EARTH_GM_M3_S2 * (1.0 + self.orbit.eccentricity) / perigee_m))

    def position_velocity(self, seconds: ArrayLike) -> tuple[Array, Array]:
        """See `Trajectory`."""
        return position_velocity(self.orbit, seconds)


@dataclass(frozen=True, slots=True)
class ShiftedTrajectory:
    """A trajectory counted from another epoch; made by `starting_at`."""

    base: Trajectory
    epoch: np.datetime64
    shift_s: float

    @property
    def span_s(self) -> tuple[float, float]:
        """Of the base, counted from the new epoch."""
        return (self.base.span_s[0] - self.shift_s, self.base.span_s[1] - self.shift_s)

    @property
    def source(self) -> str:
        """Of the base."""
        return self.base.source

    @property
    def speed_limit_m_s(self) -> float:
        """Of the base."""
        return self.base.speed_limit_m_s

    def position_velocity(self, seconds: ArrayLike) -> tuple[Array, Array]:
        """See `Trajectory`."""
        return self.base.position_velocity(np.asarray(seconds, dtype=np.float64) + self.shift_s)


def starting_at(trajectory: Trajectory, epoch: np.datetime64) -> Trajectory:
    """Count a trajectory from another epoch.

    Parameters
    ----------
    trajectory : Trajectory
        Any.
    epoch : numpy.datetime64
        UTC; 0 s of the result.

    Returns
    -------
    Trajectory

    Raises
    ------
    EnvironmentDataError
        The epoch lies outside the span.

    Examples
    --------
    >>> orbit = KeplerOrbit(np.datetime64("2031-03-20"), 42164.17, 0.0, 0.0)
    >>> later = starting_at(KeplerTrajectory(orbit), np.datetime64("2031-03-21"))
    >>> later.shift_s
    86400.0
    """
    if isinstance(trajectory, ShiftedTrajectory):
        trajectory = trajectory.base
    shift = float(elapsed_s(trajectory.epoch, epoch))
    shifted = ShiftedTrajectory(trajectory, epoch, shift)
    within(shifted, np.array([0.0]))
    return shifted


def within(trajectory: Trajectory, seconds: ArrayLike) -> Array:
    """Check times against the span of a trajectory.

    Returns
    -------
    ndarray, shape (N,)
        The times [s].

    Raises
    ------
    EnvironmentDataError
        A time outside the span by more than a microsecond.
    ValueError
        Times not finite or not one-dimensional.
    """
    time = np.asarray(seconds, dtype=np.float64)
    if time.ndim != 1 or not bool(np.isfinite(time).all()):
        raise ValueError("seconds must be a one-dimensional array of finite numbers")
    first, last = trajectory.span_s
    if time.size and (time.min() < first - 1e-6 or time.max() > last + 1e-6):
        bounds = utc_at(trajectory.epoch, [first, last]).astype("datetime64[ms]")
        asked = utc_at(trajectory.epoch, [time.min(), time.max()]).astype("datetime64[ms]")
        raise EnvironmentDataError(
            f"does not cover {asked[0]}Z to {asked[1]}Z",
            value=trajectory.source,
            allowed=f"{bounds[0]}Z to {bounds[1]}Z",
        )
    return np.clip(time, first, last)


class Geometry(NamedTuple):
    """Place and light of a spacecraft at N times.

    Attributes
    ----------
    seconds : ndarray, shape (N,)
        After the epoch [s].
    position_m, velocity_m_s : ndarray, shape (3, N)
        From the Earth's centre, GCRS-like.
    sun_direction : ndarray, shape (3, N)
        Unit vector from the spacecraft to the Sun.
    illumination : ndarray, shape (N,)
        Share of the Sun's disc that the flattened Earth leaves free, 0 to 1.
    beta_angle_deg : ndarray, shape (N,)
        Sun above the orbit plane.
    sun_distance_m : ndarray, shape (N,)
        From the spacecraft.
    """

    seconds: Array
    position_m: Array
    velocity_m_s: Array
    sun_direction: Array
    illumination: Array
    beta_angle_deg: Array
    sun_distance_m: Array


def geometry(
    trajectory: Trajectory, seconds: ArrayLike, *, absorbing_height_m: float = 0.0
) -> Geometry:
    """Place and light along a trajectory.

    Parameters
    ----------
    trajectory : Trajectory
        Any.
    seconds : array_like, shape (N,)
        After the epoch [s].
    absorbing_height_m : float, optional
        Height up to which the air stops light [m].

    Returns
    -------
    Geometry
        Errors as stated at `sun_position_m` and `illumination`.

    Examples
    --------
    >>> orbit = KeplerOrbit(np.datetime64("2031-03-20"), 42164.17, 0.0, 0.0)
    >>> day = geometry(KeplerTrajectory(orbit), np.arange(0.0, 86400.0, 60.0))
    >>> int((day.illumination == 0.0).sum())  # minutes in the umbra
    67
    """
    time = within(trajectory, seconds)
    position, velocity = trajectory.position_velocity(time)
    sun = sun_path(trajectory.epoch)(time)
    equatorial, polar = earth_shadow_radii_m(absorbing_height_m)
    toward = sun - position
    away = np.sqrt(np.sum(toward**2, axis=0))
    return Geometry(
        time,
        position,
        velocity,
        toward / away,
        illumination(position, sun, equatorial, polar_radius_m=polar),
        beta_angle_deg(position, velocity, sun),
        away,
    )


def geometry_blocks(
    trajectory: Trajectory,
    end_s: float,
    step_s: float,
    *,
    start_s: float = 0.0,
    absorbing_height_m: float = 0.0,
    block: int = 20_000,
) -> Iterator[Geometry]:
    """Geometry on a regular grid, block by block, so that memory stays bounded.

    Parameters
    ----------
    trajectory : Trajectory
        Any.
    end_s, step_s : float
        Last time and step [s]; the end is part of the grid.
    start_s : float, optional
        First time [s].
    absorbing_height_m : float, optional
        See `geometry`.
    block : int, optional
        Times per block; some 2 kB of memory each while a block is made.

    Yields
    ------
    Geometry

    Examples
    --------
    >>> orbit = KeplerOrbit(np.datetime64("2031-03-20"), 42164.17, 0.0, 0.0)
    >>> blocks = geometry_blocks(KeplerTrajectory(orbit), 86400.0, 60.0, block=1000)
    >>> [shot.seconds.size for shot in blocks]
    [1000, 441]
    """
    if not (np.isfinite([start_s, end_s, step_s]).all() and step_s > 0.0 and end_s > start_s):
        raise ValueError("times must be finite, step_s > 0, end_s > start_s")
    count = int(np.ceil((end_s - start_s) / step_s - 1e-9))
    for first in range(0, count + 1, block):
        k = np.arange(first, min(first + block, count + 1))
        time = np.where(k == count, end_s, start_s + k * step_s)
        yield geometry(trajectory, time, absorbing_height_m=absorbing_height_m)
