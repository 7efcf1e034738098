"""UTC, TAI and the scales that run beside them; times of text files.

Inside, an instant is TAI kept as `datetime64[ns]`: it has no leap seconds, so differences
are true seconds. UTC as `datetime64[ns]` cannot name the leap second itself; it is shown
as the last nanosecond of its day.
"""

import re
from collections.abc import Callable
from functools import cache
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from environments.errors import EnvironmentDataError

Times = NDArray[np.datetime64]

# First days of UTC with a new TAI - UTC [s]: IERS Bulletin C, complete to 2026 as far as known;
# from memory, checked in the tests against a library's table.
_FIRST_DAYS: Final = (
    "1972-01-01 1972-07-01 1973-01-01 1974-01-01 1975-01-01 1976-01-01 1977-01-01 1978-01-01 "
    "1979-01-01 1980-01-01 1981-07-01 1982-07-01 1983-07-01 1985-07-01 1988-01-01 1990-01-01 "
    "1991-01-01 1992-07-01 1993-07-01 1994-07-01 1996-01-01 1997-07-01 1999-01-01 2006-01-01 "
    "2009-01-01 2012-07-01 2015-07-01 2017-01-01"
)
_FIRST_OFFSET_S: Final = 10

TT_MINUS_TAI_S: Final = 32.184
"""IAU 1991, exact."""

# Scale minus TAI [s]; GPS time started with UTC on 6 January 1980, 19 s behind TAI.
_AHEAD_OF_TAI_S: Final = {"TAI": 0.0, "TT": TT_MINUS_TAI_S, "TDB": TT_MINUS_TAI_S, "GPS": -19.0}
TIME_SCALES: Final = ("UTC", *_AHEAD_OF_TAI_S)
"""Scales that can be read. TDB counts as TT, from which it differs by less than 2 ms."""

_SECOND: Final = np.timedelta64(1_000_000_000, "ns")
_STAMP: Final = re.compile(
    r"(\d{4})-(?:(\d{2})-(\d{2})|(\d{3}))[T ](\d{2}):(\d{2}):(\d{2})(?:\.(\d{1,12}))?(Z?)"
)


@cache
def _table() -> tuple[Times, NDArray[np.int64]]:
    days = np.array(_FIRST_DAYS.split(), "datetime64[ns]")
    offsets = np.arange(days.size, dtype=np.int64) + _FIRST_OFFSET_S
    days.flags.writeable = offsets.flags.writeable = False
    return days, offsets


def tai_minus_utc_s(utc: ArrayLike) -> NDArray[np.int64]:
    """Leap seconds: TAI minus UTC.

    Parameters
    ----------
    utc : array_like of datetime64
        UTC.

    Returns
    -------
    ndarray of int64
        [s]. Before 1972, where UTC ran at other rates, the first value, 10 s, which is
        wrong by up to 9 s; beyond the last leap second announced, the last, 37 s.

    References
    ----------
    IERS Bulletin C (values from memory).

    Examples
    --------
    >>> tai_minus_utc_s(np.array(["2016-12-31T23:59:59", "2017-01-01"], "datetime64[ns]")).tolist()
    [36, 37]
    """
    days, offsets = _table()
    stamps = np.asarray(utc).astype("datetime64[ns]")
    k = np.searchsorted(days, stamps, side="right") - 1
    return np.asarray(offsets[np.maximum(k, 0)], dtype=np.int64)


def tai_from_utc(utc: ArrayLike) -> Times:
    """TAI of UTC times.

    Parameters
    ----------
    utc : array_like of datetime64
        UTC; never within a leap second, which datetime64 cannot name.

    Returns
    -------
    ndarray of datetime64[ns]
        TAI.

    Examples
    --------
    >>> str(tai_from_utc(np.datetime64("2017-01-01"))[()])
    '2017-01-01T00:00:37.000000000'
    """
    stamps = np.asarray(utc).astype("datetime64[ns]")
    return np.asarray(stamps + tai_minus_utc_s(stamps) * _SECOND)


def utc_from_tai(tai: ArrayLike) -> Times:
    """UTC of TAI times.

    Parameters
    ----------
    tai : array_like of datetime64
        TAI.

    Returns
    -------
    ndarray of datetime64[ns]
        UTC. Within a leap second, the last nanosecond before midnight.

    Examples
    --------
    >>> during = np.datetime64("2017-01-01T00:00:36.5")
    >>> str(utc_from_tai(during)[()])
    '2016-12-31T23:59:59.999999999'
    """
    days, offsets = _table()
    stamps = np.asarray(tai).astype("datetime64[ns]")
    # a leap second is the one before the new offset comes into force
    k = np.maximum(np.searchsorted(days + offsets * _SECOND, stamps, side="right") - 1, 0)
    utc = stamps - offsets[k] * _SECOND
    following = days[np.minimum(k + 1, days.size - 1)]
    late = (k + 1 < days.size) & (utc >= following)
    return np.asarray(np.where(late, following - np.timedelta64(1, "ns"), utc))


def utc_at(epoch: np.datetime64, seconds: ArrayLike) -> Times:
    """UTC some true seconds after an epoch, leap seconds counted.

    Parameters
    ----------
    epoch : numpy.datetime64
        UTC.
    seconds : array_like, shape (N,)
        Elapsed [s].

    Returns
    -------
    ndarray of datetime64[ns], shape (N,)
        UTC, rounded to the nanosecond.

    Examples
    --------
    >>> utc_at(np.datetime64("2016-12-31T23:59:00"), [30.0, 61.0]).astype("datetime64[s]").tolist()
    [datetime.datetime(2016, 12, 31, 23, 59, 30), datetime.datetime(2017, 1, 1, 0, 0)]
    """
    elapsed = np.rint(np.asarray(seconds, dtype=np.float64) * 1e9).astype("timedelta64[ns]")
    return utc_from_tai(tai_from_utc(epoch) + elapsed)


def elapsed_s(epoch: np.datetime64, utc: ArrayLike) -> NDArray[np.float64]:
    """True seconds from an epoch to UTC times; the inverse of `utc_at`.

    Parameters
    ----------
    epoch : numpy.datetime64
        UTC.
    utc : array_like of datetime64
        UTC.

    Returns
    -------
    ndarray
        [s].

    Examples
    --------
    >>> float(elapsed_s(np.datetime64("2016-12-31"), np.datetime64("2017-01-01")))
    86401.0
    """
    return np.asarray((tai_from_utc(utc) - tai_from_utc(epoch)) / _SECOND, dtype=np.float64)


def read_tai(text: str, scale: str, *, zone: str = "optional") -> np.datetime64:
    """Read a time of a file.

    Parameters
    ----------
    text : str
        ``2031-03-20T12:00:00.5``, or with the day of the year, ``2031-079T12:00:00.5``.
    scale : str
        One of `TIME_SCALES`.
    zone : {"optional", "required", "forbidden"}, optional
        Whether a Z must follow; it says UTC, so other scales refuse it.

    Returns
    -------
    numpy.datetime64
        TAI with unit ns; further digits are cut.

    Raises
    ------
    EnvironmentDataError
        Not a time, no such day, no leap second there, or an unknown scale.

    Examples
    --------
    >>> str(read_tai("2016-12-31T23:59:60.25Z", "UTC"))
    '2017-01-01T00:00:36.250000000'
    """
    if scale not in TIME_SCALES:
        allowed = ", ".join(TIME_SCALES)
        raise EnvironmentDataError("is no usable time scale", value=scale, allowed=allowed)

    def refuse(problem: str) -> EnvironmentDataError:
        return EnvironmentDataError(problem, value=text, allowed="such as 2031-03-20T12:00:00.5")

    match = _STAMP.fullmatch(text)
    if match is None:
        raise refuse("is not a time")
    year, month, day, of_year, hour, minute, second, part, zed = match.groups()
    if zone == "required" and not zed:
        raise refuse("is a UTC time without Z")
    if zed and (scale != "UTC" or zone == "forbidden"):
        raise refuse(f"has a Z, which says UTC, in the time scale {scale}")
    date = _day(year, month, day, of_year, refuse)
    if int(hour) > 23 or int(minute) > 59 or int(second) > 60:
        raise refuse("is not a time of day")
    ns = (int(hour) * 3600 + int(minute) * 60 + int(second)) * 10**9
    if part:
        ns += int(part[:9].ljust(9, "0"))
    within = np.timedelta64(ns, "ns")
    if scale != "UTC":
        if second == "60":
            raise refuse(f"is a leap second, which {scale} does not have")
        return _one(date + within - np.timedelta64(_ahead_ns(scale), "ns"))
    if date < _table()[0][0]:
        raise refuse("lies before 1972, where UTC had no whole leap seconds")
    if second == "60":
        following = date + np.timedelta64(1, "D")
        if (hour, minute) != ("23", "59") or following not in _table()[0]:
            raise refuse("is no leap second")
    return _one(date + within + tai_minus_utc_s(date) * _SECOND)


def write_tai(tai: ArrayLike, scale: str) -> list[str]:
    """Write times for a file; the inverse of `read_tai`.

    Parameters
    ----------
    tai : array_like of datetime64, shape (N,)
        TAI.
    scale : str
        One of `TIME_SCALES`.

    Returns
    -------
    list of str
        With nine decimals, a leap second as ``23:59:60``, without Z.

    Examples
    --------
    >>> write_tai([np.datetime64("2017-01-01T00:00:36.25")], "UTC")
    ['2016-12-31T23:59:60.250000000']
    """
    stamps = np.atleast_1d(np.asarray(tai)).astype("datetime64[ns]")
    if scale != "UTC":
        return [str(s) for s in stamps + np.timedelta64(_ahead_ns(scale), "ns")]
    utc = utc_from_tai(stamps)
    beyond = (stamps - tai_from_utc(utc)).astype(np.int64)  # within a leap second above 0
    texts = []
    for stamp, extra in zip(utc, beyond, strict=True):
        text = str(stamp)
        if extra > 0:
            text = f"{text[:17]}60.{int(extra) - 1:09d}"
        texts.append(text)
    return texts


def _one(stamp: ArrayLike) -> np.datetime64:
    return np.datetime64(int(np.asarray(stamp).astype("datetime64[ns]").astype(np.int64)), "ns")


def _ahead_ns(scale: str) -> int:
    return round(_AHEAD_OF_TAI_S[scale] * 1e9)


def _day(
    year: str,
    month: str | None,
    day: str | None,
    of_year: str | None,
    refuse: Callable[[str], EnvironmentDataError],
) -> np.datetime64:
    if not 1900 <= int(year) <= 2200:
        raise refuse("lies outside 1900 to 2200")
    try:
        if of_year is None:
            return np.datetime64(f"{year}-{month}-{day}", "ns")
        date = np.datetime64(f"{year}-01-01", "D") + np.timedelta64(int(of_year) - 1, "D")
    except ValueError:
        raise refuse("is no day of the calendar") from None
    if int(of_year) == 0 or str(date)[:4] != year:
        raise refuse("is no day of the calendar")
    return _one(date)
