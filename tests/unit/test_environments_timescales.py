"""Leap seconds, day boundaries, and times of text files."""

import erfa
import numpy as np
import pytest

from environments.errors import EnvironmentDataError
from environments.timescales import (
    elapsed_s,
    read_tai,
    tai_from_utc,
    tai_minus_utc_s,
    utc_at,
    utc_from_tai,
    write_tai,
)

LEAP = np.datetime64("2017-01-01T00:00:00", "ns")


def test_table_is_that_of_erfa():
    table = erfa.leap_seconds.get()
    table = table[table["year"] >= 1972]
    days = np.array([f"{y:04d}-{m:02d}-01" for y, m, _ in table], "datetime64[ns]")
    np.testing.assert_array_equal(tai_minus_utc_s(days), table["tai_utc"].astype(int))
    before = days[1:] - np.timedelta64(1, "ns")
    np.testing.assert_array_equal(tai_minus_utc_s(before), table["tai_utc"][:-1].astype(int))


def test_a_day_with_a_leap_second_has_86401_seconds():
    assert elapsed_s(np.datetime64("2016-12-31"), LEAP) == 86401.0
    assert elapsed_s(np.datetime64("2017-12-31"), np.datetime64("2018-01-01")) == 86400.0
    after = utc_at(np.datetime64("2016-12-31"), [86399.0, 86400.5, 86401.0, 86402.25])
    assert [str(t)[:23] for t in after] == [
        "2016-12-31T23:59:59.000",
        "2016-12-31T23:59:59.999",  # the leap second: shown as the end of its day
        "2017-01-01T00:00:00.000",
        "2017-01-01T00:00:01.250",
    ]


def test_round_trip_over_every_boundary():
    base = np.array(
        ["1972-07-01", "1999-01-01", "2015-07-01", "2017-01-01", "2024-02-29", "2031-03-20"],
        "datetime64[ns]",
    )
    offsets = np.array([-2_000_000_000, -1, 0, 1, 999_999_999, 86_400_000_000_000], "m8[ns]")
    utc = (base[:, None] + offsets).ravel()
    np.testing.assert_array_equal(utc_from_tai(tai_from_utc(utc)), utc)
    assert (np.diff(tai_from_utc(np.sort(utc))) > np.timedelta64(0)).all()


@pytest.mark.parametrize("scale", ["UTC", "TAI", "TT", "GPS"])
def test_text_round_trip_with_astropy(scale):
    from astropy.time import Time

    text = "2016-12-31T23:59:58.250000000"
    tai = read_tai(text, scale)
    assert write_tai(tai, scale) == [text]
    if scale != "GPS":
        reference = Time(text, scale=scale.lower(), format="isot", precision=9).tai
        assert str(tai) == reference.isot
    else:  # TAI is 19 s ahead of GPS time
        assert str(tai).startswith("2017-01-01T00:00:17.25")


def test_leap_second_in_text():
    from astropy.time import Time

    inside = read_tai("2016-12-31T23:59:60.5", "UTC")
    assert str(inside) == Time("2016-12-31T23:59:60.5", scale="utc", precision=9).tai.isot
    assert write_tai(inside, "UTC") == ["2016-12-31T23:59:60.500000000"]
    assert read_tai("2016-366T23:59:60.5Z", "UTC") == inside


@pytest.mark.parametrize(
    ("text", "scale", "problem"),
    [
        ("2017-12-31T23:59:60", "UTC", "no leap second"),
        ("2016-12-31T22:59:60", "UTC", "no leap second"),
        ("2016-12-31T23:59:60", "TT", "leap second"),
        ("2031-02-29T00:00:00", "UTC", "no day"),
        ("2031-366T00:00:00", "UTC", "no day"),
        ("2031-000T00:00:00", "UTC", "no day"),
        ("2031-03-20T24:00:00", "UTC", "time of day"),
        ("2031-03-20", "UTC", "not a time"),
        ("2031-03-20T00:00:00+01:00", "UTC", "not a time"),
        ("2031-03-20T00:00:00Z", "TAI", "says UTC"),
        ("1971-03-20T00:00:00", "UTC", "before 1972"),
        ("2031-03-20T00:00:00", "UT1", "time scale"),
        ("9999-03-20T00:00:00", "UTC", "outside 1900"),
    ],
)
def test_refuses(text, scale, problem):
    with pytest.raises(EnvironmentDataError, match=problem):
        read_tai(text, scale)


def test_zone():
    with pytest.raises(EnvironmentDataError, match="without Z"):
        read_tai("2031-03-20T00:00:00", "UTC", zone="required")
