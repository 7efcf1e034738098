"""Moments as text."""

from __future__ import annotations

from datetime import datetime


def iso_time(epoch: datetime, seconds: float) -> str:
    """Return a UTC time in ISO form with Z, to the second; leap seconds are counted.

    Examples
    --------
    >>> iso_time(datetime(2031, 3, 20), 3600.4)
    '2031-03-20T01:00:00Z'
    >>> [iso_time(datetime(2016, 12, 31, 23, 59, 59), t) for t in (0.0, 1.0, 2.0)]
    ['2016-12-31T23:59:59Z', '2016-12-31T23:59:60Z', '2017-01-01T00:00:00Z']
    """
    import numpy as np  # loads here, not with the command line

    from environments.timescales import tai_from_utc, write_tai

    # a fraction of a second in the epoch is kept until the sum is rounded
    moment = tai_from_utc(np.datetime64(epoch.replace(tzinfo=None), "ns"))
    ns = moment.astype(np.int64) + round(seconds * 1e9) + 500_000_000
    whole = (ns // 1_000_000_000 * 1_000_000_000).astype("datetime64[ns]")
    return write_tai(whole, "UTC")[0][:19] + "Z"


def span(seconds: float) -> str:
    """Return a length of time for a sentence.

    Examples
    --------
    >>> span(75.0), span(600.0), span(10800.0)
    ('75 s', '10 min', '3.0 h')
    """
    if seconds < 120.0:
        return f"{seconds:.0f} s"
    return f"{seconds / 60.0:.0f} min" if seconds < 7200.0 else f"{seconds / 3600.0:.1f} h"
