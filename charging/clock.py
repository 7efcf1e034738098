"""Moments as text."""

from __future__ import annotations

from datetime import datetime, timedelta


def iso_time(epoch: datetime, seconds: float) -> str:
    """Return a UTC time in ISO form with Z, to the second.

    Examples
    --------
    >>> iso_time(datetime(2031, 3, 20), 3600.4)
    '2031-03-20T01:00:00Z'
    """
    moment = epoch.replace(tzinfo=None) + timedelta(seconds=round(seconds))
    return moment.isoformat(timespec="seconds") + "Z"


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
