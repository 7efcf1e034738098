"""Trajectories from tables of states, and the checks that every such table must pass."""

from collections.abc import Sequence
from dataclasses import dataclass, field
from itertools import pairwise
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.earth_axes import teme_to_j2000
from environments.errors import EnvironmentDataError
from environments.interpolation import Method, interpolate, rows_needed
from environments.orbit import EARTH_GM_M3_S2, EARTH_RADIUS_M
from environments.timescales import utc_from_tai
from environments.trajectory import within
from environments.vectors import length

_BLOCK: Final = 16384

Array = NDArray[np.float64]
Times = NDArray[np.datetime64]

INERTIAL_FRAMES: Final = ("GCRF", "GCRS", "ICRF", "ICRS", "EME2000", "J2000", "TEME")
"""Frames that can be read; all but TEME count as one, 5 m apart in geostationary orbit."""

DEFAULT_METHOD: Final[Method] = "hermite"
DEFAULT_DEGREE: Final = 7

# Larger errors of interpolation than this are refused: 1.3 s of low orbit [m].
_COARSEST_M: Final = 10e3
# Within this distance the pull of Moon and Sun stays below 5 % of the Earth's [m].
_EARTH_ALONE_M: Final = 1.5e8
_SLACK: Final = np.timedelta64(1_000_000, "ns")  # between segments, 1 ms of rounding
_FARTHEST_M: Final = 2.5e9  # halo orbits about the Lagrange points reach 1.8 million km


@dataclass(frozen=True, slots=True)
class Segment:
    """States of one stretch, interpolated on their own.

    Attributes
    ----------
    tai : ndarray of datetime64[ns], shape (K,)
        Times, increasing; TAI, see `environments.timescales`.
    position_m : ndarray, shape (K, 3)
        GCRS-like.
    velocity_m_s : ndarray, shape (K, 3), or None
        None: the derivative of the interpolated position.
    method, degree
        How to interpolate, see `environments.interpolation`.
    usable : tuple of datetime64 or None
        Times between which it may be used, TAI; None: all of it.
    """

    tai: Times
    position_m: Array
    velocity_m_s: Array | None
    method: Method = DEFAULT_METHOD
    degree: int = DEFAULT_DEGREE
    usable: tuple[np.datetime64, np.datetime64] | None = None


@dataclass(frozen=True, slots=True)
class SampledTrajectory:
    """A `Trajectory` through tabulated states; made by the readers of files.

    Attributes
    ----------
    segments : tuple of Segment
        In the order of time, each starting where the one before ends.
    source : str
        One line for reports.
    interpolation_error_m : float
        Largest difference at the middle of a row's interval between the interpolation and
        another of lower order (of higher order for cubic Hermite): an upper estimate.
    gravity_mismatch : float
        Median over the intervals of a segment, largest of the segments, of the difference
        between the change of velocity and what the Earth's gravity gives, over the latter.
    speed_limit_m_s : float
        Highest speed met at rows and between them, 5 % added.
    """

    segments: tuple[Segment, ...]
    source: str
    interpolation_error_m: float = field(init=False)
    gravity_mismatch: float = field(init=False)
    speed_limit_m_s: float = field(init=False)
    epoch: np.datetime64 = field(init=False)
    span_s: tuple[float, float] = field(init=False)
    _bounds_s: Array = field(init=False, repr=False)
    _tables: tuple[Array, ...] = field(init=False, repr=False)

    def __post_init__(self) -> None:
        origin = _bounds(self.segments[0])[0]
        starts = [_seconds(_bounds(one)[0], origin) for one in self.segments]
        end = _seconds(_bounds(self.segments[-1])[1], origin)
        tables = tuple(np.asarray(_seconds(one.tai, origin)) for one in self.segments)
        put = object.__setattr__
        put(self, "epoch", utc_from_tai(origin)[()])
        put(self, "span_s", (0.0, float(end)))
        put(self, "_bounds_s", np.array([*starts, end], dtype=np.float64))
        put(self, "_tables", tables)
        checks = [_quality(t, one) for t, one in zip(tables, self.segments, strict=True)]
        put(self, "interpolation_error_m", max(one.error_m for one in checks))
        put(self, "gravity_mismatch", max(one.gravity_mismatch for one in checks))
        # between the middles and rows looked at a bound orbit changes speed by far less
        put(self, "speed_limit_m_s", 1.05 * max(one.fastest_m_s for one in checks))

    def position_velocity(self, seconds: ArrayLike) -> tuple[Array, Array]:
        """See `environments.trajectory.Trajectory`."""
        time = within(self, seconds)
        position, velocity = np.empty((3, time.size)), np.empty((3, time.size))
        which = np.searchsorted(self._bounds_s, time, side="right") - 1
        which = np.clip(which, 0, len(self.segments) - 1)
        for k in np.unique(which):
            here = which == k
            position[:, here], velocity[:, here] = _states(
                self._tables[k], self.segments[k], time[here]
            )
        return position, velocity


def sampled_trajectory(
    segments: Sequence[Segment], source: str, *, file: str | None = None
) -> SampledTrajectory:
    """Join segments and check that their motion can be that of a spacecraft.

    Parameters
    ----------
    segments : sequence of Segment
        In the order of time.
    source : str
        One line for reports.
    file : str, optional
        For errors.

    Returns
    -------
    SampledTrajectory
        Its epoch is the first usable time.

    Raises
    ------
    EnvironmentDataError
        Segments that leave a gap or run backwards, states inside the Earth or beyond
        1.5 million km, rows too far apart for their interpolation (error above 10 km), or a
        motion that the Earth's gravity does not explain: a wrong unit, frame or centre.

    Notes
    -----
    The gravity test compares the change of velocity over each interval with the integral of
    -GM r/r^3 and takes the median of the mismatch, so that thrust now and then passes; its
    bound is 5 %. Where velocities are given, the change of position over every interval must
    be what they and gravity make it, within 100 m, 0.1 % and the error of that rule: one row
    that jumps is refused, thrust of some m/s is not. The gravity test is made within 150 000
    km, where oblateness (0.3 %) and the Moon stay far
    below. A wrong unit or a frame that turns with the Earth fails by much more.
    """
    if not segments:
        raise EnvironmentDataError("holds no states", file=file)
    for before, after in pairwise(segments):
        end, start = _bounds(before)[1], _bounds(after)[0]
        if abs(start - end) > _SLACK:
            what = "leaves a gap before" if start > end else "overlaps"
            raise EnvironmentDataError(
                f"a segment that ends at {end} TAI {what} the next, which starts at {start} TAI",
                file=file,
            )
    for one in segments:
        radius = np.sqrt(np.sum(one.position_m**2, axis=1))
        if radius.min() < EARTH_RADIUS_M - 30e3:
            km = 1e-3 * float(radius.min())
            raise EnvironmentDataError(
                f"holds a position inside the Earth, {km:.6g} km from its centre: wrong unit?",
                file=file,
            )
        if radius.max() > _FARTHEST_M:
            km = 1e-3 * float(radius.max())
            raise EnvironmentDataError(
                f"holds a position {km:.6g} km away, beyond the Lagrange points of Sun and Earth: "
                "wrong unit?",
                file=file,
            )
    for one in segments:
        _refuse_jumps(one, file)
    trajectory = SampledTrajectory(tuple(segments), source)
    mismatch = trajectory.gravity_mismatch
    if mismatch > 0.05:
        raise EnvironmentDataError(
            f"holds a motion that differs from the Earth's gravity by {100.0 * mismatch:.3g} %: "
            "wrong unit, frame or centre?",
            file=file,
            allowed="states in an inertial frame about the Earth",
        )
    if trajectory.interpolation_error_m > _COARSEST_M:
        raise EnvironmentDataError(
            "has rows too far apart for its interpolation: error up to "
            f"{1e-3 * trajectory.interpolation_error_m:.3g} km",
            file=file,
            allowed=f"{1e-3 * _COARSEST_M:.0f} km",
        )
    return trajectory


def _refuse_jumps(segment: Segment, file: str | None) -> None:
    """Compare each step of position with the trapezoidal rule of velocity and gravity."""
    if segment.velocity_m_s is None or len(segment.tai) < 2:
        return
    step = np.diff(segment.tai).astype(np.int64) * 1e-9
    place, velocity = segment.position_m.T, segment.velocity_m_s.T
    pull = _gravity(place)
    mean = 0.5 * (velocity[:, :-1] + velocity[:, 1:])
    travel = mean * step - np.diff(pull, axis=1) * step**2 / 12.0
    moved = np.diff(place, axis=1)
    radius = np.minimum(length(place[:, :-1]), length(place[:, 1:]))
    turn = np.sqrt(EARTH_GM_M3_S2 / radius**3) * step
    # the rule errs by r (turn)^5/720 on a circle; ten times that for eccentric arcs
    allowed = 100.0 + 1e-3 * length(moved) + 10.0 / 720.0 * radius * turn**5
    off = length(moved - travel)
    bad = np.flatnonzero(off > allowed)
    # where most rows disagree, unit or frame are wrong: the gravity test says that better
    if 0 < bad.size <= max(2, off.size // 10):
        row = int(bad[0]) + 1
        when = utc_from_tai(segment.tai[row : row + 1])[0].astype("datetime64[ms]")
        raise EnvironmentDataError(
            f"jumps by {1e-3 * off[bad[0]]:.3g} km against its own velocities at row {row + 1} "
            f"of a segment, {when}Z",
            file=file,
        )


def check_times(tai: Times, lines: Sequence[int] | None, file: str | None) -> None:
    """Refuse unsorted or duplicate times and single missing rows.

    Parameters
    ----------
    tai : ndarray of datetime64, shape (K,)
        In the order of the file.
    lines : sequence of int or None
        Line of each row, for errors.
    file : str or None
        For errors.

    Raises
    ------
    EnvironmentDataError
        With the line of the row that breaks the order. A gap is a step more than 1.5 times
        as long as both of its neighbours, as long as at most one in twenty is like it.

    Examples
    --------
    >>> t = np.array([0, 60, 180, 240], "datetime64[s]").astype("datetime64[ns]")
    >>> check_times(t, [5, 6, 7, 8], "a.csv")
    Traceback (most recent call last):
    ...
    environments.errors.EnvironmentDataError: a.csv:7: follows after a gap of 120 s, steps around
    it are 60 s
    """
    steps = np.diff(tai).astype(np.int64) * 1e-9

    def refuse(k: int, problem: str) -> EnvironmentDataError:
        line = None if lines is None else lines[k]
        where = "" if lines is not None else f"row {k + 1} "
        return EnvironmentDataError(f"{where}{problem}", file=file, line=line)

    for k in np.flatnonzero(steps <= 0.0):
        if steps[k] == 0.0:
            raise refuse(int(k) + 1, "repeats the time of the row before")
        raise refuse(int(k) + 1, "goes back in time")
    if steps.size < 3:
        return
    padded = np.concatenate((steps[1:2], steps, steps[-2:-1]))
    around = np.maximum(padded[:-2], padded[2:])
    for k in np.flatnonzero(steps > 1.5 * around):
        if int((steps > steps[k] / 1.5).sum()) <= max(1, steps.size // 20):
            raise refuse(
                int(k) + 1,
                f"follows after a gap of {steps[k]:g} s, steps around it are {around[k]:g} s",
            )


def to_inertial(
    tai: Times, position_m: Array, velocity_m_s: Array | None, frame: str
) -> tuple[Array, Array | None]:
    """Bring states, (K, 3), of a frame of `INERTIAL_FRAMES` to the GCRS-like frame.

    Raises
    ------
    EnvironmentDataError
        Unknown frame, or one that turns with the Earth.
    """
    name = frame.upper()
    if name not in INERTIAL_FRAMES:
        raise EnvironmentDataError(
            "is no frame that can be used", value=frame, allowed=", ".join(INERTIAL_FRAMES)
        )
    if name != "TEME":
        return position_m, velocity_m_s
    utc = utc_from_tai(tai)
    position = teme_to_j2000(position_m.T, utc).T
    return position, None if velocity_m_s is None else teme_to_j2000(velocity_m_s.T, utc).T


def _bounds(segment: Segment) -> tuple[np.datetime64, np.datetime64]:
    if segment.usable is not None:
        return segment.usable
    return segment.tai[0], segment.tai[-1]


def _seconds(tai: ArrayLike, origin: np.datetime64) -> Array:
    elapsed = np.asarray(tai) - origin
    return np.asarray(elapsed.astype("timedelta64[ns]").astype(np.int64) * 1e-9)


def _states(times: Array, segment: Segment, at_s: Array) -> tuple[Array, Array]:
    return interpolate(
        times,
        segment.position_m,
        segment.velocity_m_s,
        at_s,
        method=segment.method,
        degree=segment.degree,
    )


class _Quality(NamedTuple):
    error_m: float
    fastest_m_s: float
    gravity_mismatch: float


def _quality(times: Array, segment: Segment) -> _Quality:
    """Look at the middle of every interval of a segment, in blocks to save memory."""
    method: Method = "lagrange"
    degree = max(1, min(3, times.size - 1))
    if segment.velocity_m_s is not None:
        method, degree = "hermite", 3
        if segment.method == "hermite" and segment.degree == 3 and times.size >= 3:
            degree = 5
    elif (segment.method, segment.degree) == ("lagrange", 3) and times.size >= 5:
        degree = 4
    error, fastest, mismatches = 0.0, 0.0, []
    for first in range(0, times.size - 1, _BLOCK):
        rows = slice(first, min(first + _BLOCK, times.size - 1) + 1)
        t, place = times[rows], segment.position_m[rows].T
        middle = 0.5 * (t[:-1] + t[1:])
        between, speed = _states(times, segment, middle)
        other, _ = interpolate(
            times, segment.position_m, segment.velocity_m_s, middle, method=method, degree=degree
        )
        if segment.velocity_m_s is not None:
            at_rows = segment.velocity_m_s[rows].T
        else:
            at_rows = _states(times, segment, t)[1]
        error = max(error, float(length(between - other).max()))
        fastest = max(fastest, float(length(speed).max()), float(length(at_rows).max()))
        # Simpson's rule is good for arcs up to half a radian
        gained = np.diff(t) / 6.0
        gained = gained * (
            _gravity(place[:, :-1]) + 4.0 * _gravity(between) + _gravity(place[:, 1:])
        )
        off = length(np.diff(at_rows, axis=1) - gained) / length(gained)
        radius = length(between)
        arc = np.sqrt(EARTH_GM_M3_S2 / radius**3) * np.diff(t)
        mismatches.append(off[(radius < _EARTH_ALONE_M) & (arc < 0.5)])
    mismatch = np.concatenate(mismatches)
    return _Quality(error, fastest, float(np.median(mismatch)) if mismatch.size else 0.0)


def _gravity(position: Array) -> Array:
    return np.asarray(-EARTH_GM_M3_S2 * position / length(position) ** 3)


def require_rows(count: int, method: Method, degree: int) -> None:
    """Refuse a table with fewer rows than its interpolation needs.

    Raises
    ------
    EnvironmentDataError
        Also for a degree that does not exist.
    """
    try:
        needed = rows_needed(method, degree)
    except ValueError as error:
        raise EnvironmentDataError(
            str(error), key=("interpolation degree",), value=degree
        ) from error
    if count < needed:
        raise EnvironmentDataError(
            f"has {count} rows, but {method} interpolation of degree {degree} needs {needed}"
        )
