"""Two-line elements through SGP4, the model that they are made for (extra `tle`)."""

from dataclasses import dataclass, field
from importlib import import_module
from pathlib import Path
from typing import Any, Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.earth_axes import teme_to_j2000
from environments.errors import EnvironmentDataError
from environments.orbit import EARTH_GM_M3_S2, EARTH_RADIUS_M
from environments.text_table import read_lines
from environments.timescales import elapsed_s, utc_at
from environments.trajectory import within

Array = NDArray[np.float64]

LONGEST_DAYS: Final = 30.0
"""How far from their epoch elements are used by default (assumed)."""

_JD_1950: Final = 2433282.5


@dataclass(frozen=True, slots=True)
class TleTrajectory:
    """A `Trajectory` from two-line elements; made by `read_tle` or `tle_trajectory`.

    Attributes
    ----------
    name : str
        Of the object, or its number.
    epoch : numpy.datetime64
        UTC of the elements.
    longest_days : float
        Span on both sides of the epoch.

    Notes
    -----
    SGP4 is good to about 1 km at the epoch and loses 1 to 3 km a day in low orbit; in
    geostationary orbit to some 10 km within days (from memory). Its frame TEME is turned to
    J2000 within 1 arcsec, see `teme_to_j2000`.
    """

    name: str
    epoch: np.datetime64
    longest_days: float
    _satellite: Any = field(repr=False)

    @property
    def span_s(self) -> tuple[float, float]:
        """`longest_days` on both sides of the epoch [s]."""
        return (-86400.0 * self.longest_days, 86400.0 * self.longest_days)

    @property
    def source(self) -> str:
        """One line for reports."""
        return f"two-line elements of {self.name} by SGP4, TEME turned to J2000 within 1 arcsec"

    @property
    def speed_limit_m_s(self) -> float:
        """Escape speed at the perigee of the elements, 50 km lower for what SGP4 adds [m s-1]."""
        low = EARTH_RADIUS_M * max(1.0, 1.0 + self._satellite.altp) - 50e3
        return float(np.sqrt(2.0 * EARTH_GM_M3_S2 / low))

    def teme(self, seconds: ArrayLike) -> tuple[Array, Array]:
        """Position [m] and velocity [m s-1], (3, N), as SGP4 gives them, in TEME.

        Raises
        ------
        EnvironmentDataError
            Outside the span, or where SGP4 finds the object decayed or its elements unusable.
        """
        time = within(self, seconds)
        # SGP4 takes days and their fraction, and turns them into time since the epoch: count
        # true seconds, or a leap second would be lost on the way
        day = self.epoch.astype("datetime64[D]")
        start_s = float((self.epoch - day) / np.timedelta64(1, "ns")) * 1e-9
        whole = np.floor((start_s + time) / 86400.0)
        jd = float((day - np.datetime64("1950-01-01", "D")).astype(np.int64)) + _JD_1950 + whole
        part = (start_s + time - 86400.0 * whole) / 86400.0
        code, position, velocity = self._satellite.sgp4_array(jd, part)
        if bool((code != 0).any()):
            first = int(np.flatnonzero(code)[0])
            when = utc_at(self.epoch, time[first : first + 1])[0].astype("datetime64[s]")
            raise EnvironmentDataError(
                f"cannot be followed to {when}Z: {_reason(int(code[first]))}",
                value=self.name,
            )
        return 1e3 * position.T, 1e3 * velocity.T

    def position_velocity(self, seconds: ArrayLike) -> tuple[Array, Array]:
        """See `environments.trajectory.Trajectory`."""
        time = within(self, seconds)
        position, velocity = self.teme(time)
        utc = utc_at(self.epoch, time)
        return teme_to_j2000(position, utc), teme_to_j2000(velocity, utc)


def tle_trajectory(
    line1: str, line2: str, *, name: str | None = None, longest_days: float = LONGEST_DAYS
) -> TleTrajectory:
    """Trajectory from the two lines of an element set.

    Parameters
    ----------
    line1, line2 : str
        69 characters each, checksums right.
    name : str, optional
        For reports; else the catalogue number.
    longest_days : float, optional
        How far from the epoch they may be used.

    Returns
    -------
    TleTrajectory

    Raises
    ------
    EnvironmentDataError
        The package sgp4 is missing; a line has another form, length or checksum; the lines
        belong to different objects; elements out of range.
    """
    for number, line in ((1, line1), (2, line2)):
        _check_line(line, number)
    if line1[2:7] != line2[2:7]:
        raise EnvironmentDataError(
            f"belongs to object {line2[2:7]}, line 1 to {line1[2:7]}", key=("TLE line 2",)
        )
    if not (np.isfinite(longest_days) and longest_days > 0.0):
        raise EnvironmentDataError("must be positive", key=("longest_days",), value=longest_days)
    try:
        api = import_module("sgp4.api")
    except ImportError as error:
        raise EnvironmentDataError(
            "needs the package sgp4: install halflit with the extra `tle`", key=("TLE",)
        ) from error
    try:
        satellite = api.Satrec.twoline2rv(line1, line2)
    except ValueError as error:
        raise EnvironmentDataError(f"cannot be read: {error}", key=("TLE",)) from error
    if satellite.error:
        raise EnvironmentDataError(f"cannot be used: {_reason(int(satellite.error))}", key=("TLE",))
    _check_elements(satellite)
    epoch = _epoch(line1)
    return TleTrajectory(name or f"object {line1[2:7].strip()}", epoch, longest_days, satellite)


def _check_elements(satellite: Any) -> None:
    """Refuse elements that are no numbers or out of range: the checksum does not see them."""
    half, whole = 180.0, 360.0
    for name, value, high in (
        ("inclination", np.degrees(satellite.inclo), half),
        ("right ascension of the node", np.degrees(satellite.nodeo), whole),
        ("eccentricity", satellite.ecco, 1.0),
        ("argument of perigee", np.degrees(satellite.argpo), whole),
        ("mean anomaly", np.degrees(satellite.mo), whole),
        ("mean motion", 1440.0 * satellite.no_kozai / (2.0 * np.pi), 20.0),
    ):
        if not 0.0 <= value <= high * (1.0 + 1e-12):  # false for nan too
            raise EnvironmentDataError(
                f"{name} is {value:g}", key=("TLE line 2",), allowed=f"0 to {high:g}"
            )
    if not np.isfinite(satellite.bstar):
        raise EnvironmentDataError("drag term is no number", key=("TLE line 1",))


def read_tle(
    path: str | Path, *, epoch: np.datetime64 | None = None, longest_days: float = LONGEST_DAYS
) -> TleTrajectory:
    """Read a file of two-line elements of one object, with or without a line for its name.

    Parameters
    ----------
    path : str or Path
        Text file; empty lines and lines that start with # are skipped.
    epoch : numpy.datetime64, optional
        UTC; of several sets of the object the one nearest to it is taken. Without it the
        file must hold one set.
    longest_days : float, optional
        See `tle_trajectory`.

    Returns
    -------
    TleTrajectory

    Raises
    ------
    EnvironmentDataError
        With file and line: as `tle_trajectory`; a line missing; sets of several objects.
    """
    file = str(path)
    sets: list[TleTrajectory] = []
    name, first = None, None
    objects: set[str] = set()
    number = 0
    for number, text in enumerate(read_lines(path), start=1):
        line = text.rstrip()
        if not line or line.startswith("#"):
            continue
        try:
            if first is None and line.startswith("1 ") and len(line) > 60:
                _check_line(line, 1)
                first = line
            elif first is not None:
                one = tle_trajectory(first, line, name=name, longest_days=longest_days)
                sets.append(one)
                objects.add(first[2:7])
                name, first = None, None
            elif name is None:
                name = line.removeprefix("0 ").strip()
            else:
                raise EnvironmentDataError("is neither a name nor line 1 of a set")
        except EnvironmentDataError as error:
            raise EnvironmentDataError(str(error), file=file, line=number) from error
    if first is not None or name is not None or not sets:
        raise EnvironmentDataError(
            "ends before the lines of an element set are complete: truncated",
            file=file, line=number,
        )  # fmt: skip
    if len(objects) > 1:
        raise EnvironmentDataError(f"holds {len(objects)} objects, must be one", file=file)
    if len(sets) == 1:
        return sets[0]
    if epoch is None:
        raise EnvironmentDataError(
            f"holds {len(sets)} element sets and no epoch says which", file=file
        )
    return min(sets, key=lambda one: abs(float(elapsed_s(epoch, one.epoch))))


def _reason(code: int) -> str:
    known = import_module("sgp4.api").SGP4_ERRORS
    return str(known.get(code, f"error {code}"))


def _check_line(line: str, number: int) -> None:
    key = (f"TLE line {number}",)
    if len(line) != 69 or not line.isascii() or not line.startswith(f"{number} "):
        raise EnvironmentDataError(
            "has not the form of an element set: truncated?", key=key, value=line,
            allowed=f'69 characters that start with "{number} "',
        )  # fmt: skip
    total = sum(int(c) if c.isdigit() else c == "-" for c in line[:68]) % 10
    if line[68] != str(total):
        raise EnvironmentDataError(
            f"has the checksum {line[68]}, its characters give {total}", key=key
        )


def _epoch(line1: str) -> np.datetime64:
    """Epoch of the elements, kept to the 1e-8 day (0.9 ms) of the format."""
    text = line1[18:32]
    try:
        short, day = int(text[:2]), int(text[2:5])
        fraction = int(text[6:14])
    except ValueError as error:
        raise EnvironmentDataError("is no epoch", key=("TLE line 1",), value=text) from error
    if text[5] != "." or not 1 <= day <= 366:
        raise EnvironmentDataError("is no epoch", key=("TLE line 1",), value=text)
    year = 1900 + short if short >= 57 else 2000 + short
    start = np.datetime64(f"{year}-01-01", "ns") + np.timedelta64((day - 1) * 86400, "s")
    return start + np.timedelta64(fraction * 864_000, "ns")
