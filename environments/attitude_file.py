"""Attitude from a file of quaternions."""

from dataclasses import dataclass
from pathlib import Path
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.ephemeris import INERTIAL_FRAMES, check_times
from environments.errors import EnvironmentDataError
from environments.text_table import number, read_table
from environments.timescales import TIME_SCALES, elapsed_s, read_tai, utc_at, utc_from_tai

Array = NDArray[np.float64]

_NOTES: Final = ("frame", "rotation", "time_scale")
_COLUMNS: Final = ("time", "q_x", "q_y", "q_z", "q_w")
_ROTATIONS: Final = ("inertial to body", "body to inertial")
_UNIT_WITHIN: Final = 1e-4  # four decimals in a file
_LARGEST_TURN_DEG: Final = 90.0


@dataclass(frozen=True, slots=True)
class QuaternionAttitude:
    """Body axes from tabulated quaternions, turned evenly between them (slerp).

    Attributes
    ----------
    epoch : numpy.datetime64
        UTC at 0 s of `axes`.
    times_s : ndarray, shape (K,)
        Of the rows, after the epoch [s].
    quaternions : ndarray, shape (K, 4)
        x, y, z and scalar, unit; they turn body components into inertial ones; signs such
        that neighbours are near each other.
    source : str
        One line for reports.
    """

    epoch: np.datetime64
    times_s: Array
    quaternions: Array
    source: str

    @property
    def span_s(self) -> tuple[float, float]:
        """First and last time that can be asked for [s]."""
        return float(self.times_s[0]), float(self.times_s[-1])

    def axes(
        self, seconds: ArrayLike, position_m: ArrayLike, velocity_m_s: ArrayLike,
        sun_direction: ArrayLike,
    ) -> Array:  # fmt: skip
        """See `environments.pointing.Attitude`; EnvironmentDataError outside the span."""
        time = np.asarray(seconds, dtype=np.float64)
        first, last = self.span_s
        if time.size and (time.min() < first - 1e-6 or time.max() > last + 1e-6):
            bounds = utc_at(self.epoch, [first, last]).astype("datetime64[ms]")
            asked = utc_at(self.epoch, [time.min(), time.max()]).astype("datetime64[ms]")
            raise EnvironmentDataError(
                f"does not cover {asked[0]}Z to {asked[1]}Z", value=self.source,
                allowed=f"{bounds[0]}Z to {bounds[1]}Z",
            )  # fmt: skip
        k = np.clip(np.searchsorted(self.times_s, time, side="right") - 1, 0, len(self.times_s) - 2)
        left = self.times_s[k]
        share = np.clip((time - left) / (self.times_s[k + 1] - left), 0.0, 1.0)
        q = slerp(self.quaternions[k], self.quaternions[k + 1], share)
        # columns of the matrix body to inertial are the body axes
        return np.asarray(np.moveaxis(_matrix(q), (0, 1, 2), (2, 1, 0)))


def read_attitude_csv(path: str | Path, epoch: np.datetime64) -> QuaternionAttitude:
    """Read quaternions from comma-separated columns.

    Parameters
    ----------
    path : str or Path
        Columns ``time``, ``q_x``, ``q_y``, ``q_z``, ``q_w`` (scalar last, named so in any
        order); above them the notes ``# frame = GCRF`` (or another inertial frame),
        ``# rotation = inertial to body`` or ``body to inertial`` (whose components the
        quaternion turns into whose), ``# time_scale = UTC`` (times then end in Z).
    epoch : numpy.datetime64
        UTC from which `axes` counts.

    Returns
    -------
    QuaternionAttitude

    Raises
    ------
    EnvironmentDataError
        With file and line: note missing, unknown column, not a number, length differing from 1
        by more than 1e-4, times not increasing, gap, more than 90 deg between two rows.

    Notes
    -----
    Read as the components of a vector v: v' = q v q*, with Hamilton's product. TEME is not
    accepted.
    """
    table = read_table(path, _NOTES)
    notes = {key: value for key, (value, _) in table.notes.items()}
    for key in _NOTES:
        if key not in notes:
            raise table.error(f"does not say its {key}")
    frames = [frame for frame in INERTIAL_FRAMES if frame != "TEME"]
    for key, allowed in (
        ("frame", frames), ("rotation", _ROTATIONS), ("time_scale", TIME_SCALES)
    ):  # fmt: skip
        if notes[key] not in allowed:
            raise table.error(
                f"{key} = {notes[key]} cannot be used", table.notes[key][1],
                allowed=", ".join(allowed),
            )  # fmt: skip
    if set(table.columns) != set(_COLUMNS):
        raise table.error(
            f"names the columns {', '.join(table.columns)}", table.columns_line,
            allowed=", ".join(_COLUMNS),
        )  # fmt: skip
    order = [table.columns.index(name) for name in _COLUMNS]
    zone = "required" if notes["time_scale"] == "UTC" else "forbidden"
    tai, values, lines = [], [], []
    for line, cells in table.rows:
        try:
            tai.append(read_tai(cells[order[0]], notes["time_scale"], zone=zone))
        except EnvironmentDataError as error:
            raise table.error(str(error), line) from error
        row = [number(cells[k], line, table.file) for k in order[1:]]
        norm = float(np.sqrt(sum(x * x for x in row)))
        if abs(norm - 1.0) > _UNIT_WITHIN:
            raise table.error(f"holds a quaternion of length {norm:.6g}, must be 1", line)
        values.append([x / norm for x in row])
        lines.append(line)
    if len(lines) < 2:
        raise table.error("holds fewer than two rows", lines[-1])
    stamps = np.array(tai, "datetime64[ns]")
    check_times(stamps, lines, table.file)
    q = np.array(values)
    if notes["rotation"] == "inertial to body":
        q[:, :3] *= -1.0
    for k in range(1, len(q)):  # q and -q are one attitude: keep to the nearer
        if float(q[k] @ q[k - 1]) < 0.0:
            q[k] *= -1.0
    turns = 2.0 * np.degrees(np.arccos(np.clip(np.sum(q[1:] * q[:-1], axis=1), -1.0, 1.0)))
    if float(turns.max()) > _LARGEST_TURN_DEG:
        k = int(np.argmax(turns))
        raise table.error(
            f"turns by {turns[k]:.0f} deg from the row before: the way between is unknown",
            lines[k + 1], allowed=f"{_LARGEST_TURN_DEG:.0f} deg",
        )  # fmt: skip
    times = elapsed_s(epoch, utc_from_tai(stamps))
    return QuaternionAttitude(epoch, times, q, f"quaternions of {Path(path).name}")


def slerp(first: ArrayLike, second: ArrayLike, share: ArrayLike) -> Array:
    """Turn evenly from one quaternion to another.

    Parameters
    ----------
    first, second : array_like, shape (N, 4)
        Unit, less than a right angle apart as four-vectors.
    share : array_like, shape (N,)
        0 at the first, 1 at the second.

    Returns
    -------
    ndarray, shape (N, 4)
        Unit.

    References
    ----------
    Shoemake (1985), SIGGRAPH Computer Graphics 19, 245.

    Examples
    --------
    >>> half = slerp([[0.0, 0.0, 0.0, 1.0]], [[0.0, 0.0, 1.0, 0.0]], [0.5])
    >>> half.round(6).tolist()  # half of half a turn about z
    [[0.0, 0.0, 0.707107, 0.707107]]
    """
    a, b = np.asarray(first, dtype=np.float64), np.asarray(second, dtype=np.float64)
    s = np.asarray(share, dtype=np.float64)
    # half the angle between the two by arctan2: exact for small ones
    apart = 2.0 * np.arctan2(
        np.sqrt(np.sum((b - a) ** 2, axis=1)), np.sqrt(np.sum((b + a) ** 2, axis=1))
    )
    # sin(s x)/sin(x) by sinc: s as x goes to 0
    base = np.sinc(apart / np.pi)
    left = (1.0 - s) * np.sinc((1.0 - s) * apart / np.pi) / base
    right = s * np.sinc(s * apart / np.pi) / base
    q = left[:, None] * a + right[:, None] * b
    return np.asarray(q / np.sqrt(np.sum(q**2, axis=1))[:, None])


def _matrix(q: Array) -> Array:
    """Matrices (N, 3, 3) of unit quaternions (N, 4), scalar last."""
    x, y, z, w = q.T
    rows = (
        (1.0 - 2.0 * (y * y + z * z), 2.0 * (x * y - z * w), 2.0 * (x * z + y * w)),
        (2.0 * (x * y + z * w), 1.0 - 2.0 * (x * x + z * z), 2.0 * (y * z - x * w)),
        (2.0 * (x * z - y * w), 2.0 * (y * z + x * w), 1.0 - 2.0 * (x * x + y * y)),
    )
    return np.asarray(np.moveaxis(np.array(rows), 2, 0))
