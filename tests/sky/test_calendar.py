"""Local times, against the published dates of daylight saving and by round trips."""

from datetime import UTC, datetime

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from causticload.errors import InputError
from causticload.sky.calendar import format_local, parse_local, utc_times


@pytest.mark.parametrize(
    ("text", "zone", "utc"),
    [
        ("2026-06-21T13:30", "Europe/London", "2026-06-21T12:30:00"),  # summer time, UTC+1
        ("2026-12-21 13:30", "Europe/London", "2026-12-21T13:30:00"),
        ("2026-01-15T09:00:30", "Australia/Sydney", "2026-01-14T22:00:30"),  # summer there, UTC+11
        ("2026-07-01T12:00", "Asia/Kathmandu", "2026-07-01T06:15:00"),  # UTC+5:45
        ("2026-06-21T13:30+02:00", "Europe/London", "2026-06-21T11:30:00"),
        ("2026-06-21T13:30Z", "Europe/London", "2026-06-21T13:30:00"),
        ("2024-02-29T00:00", "UTC", "2024-02-29T00:00:00"),
    ],
)
def test_reads_local_clock_and_offsets(text, zone, utc):
    assert parse_local(text, zone) == np.datetime64(utc)


def test_a_time_the_clock_skips_is_refused_with_both_readings():
    # Clocks in the United Kingdom go forward on the last Sunday of March at 01:00 UTC.
    with pytest.raises(InputError, match="does not exist") as caught:
        parse_local("2026-03-29T01:30", "Europe/London")
    assert "2026-03-29T02:30+01:00" in caught.value.hint
    assert "2026-03-29T00:30+00:00" in caught.value.hint


def test_a_time_the_clock_shows_twice_is_refused_with_both_readings():
    with pytest.raises(InputError, match="happens twice") as caught:
        parse_local("2026-10-25T01:30", "Europe/London")
    for reading in ("2026-10-25T01:30+01:00", "2026-10-25T01:30+00:00"):
        assert reading in caught.value.hint
    readings = {
        str(parse_local(f"2026-10-25T01:30{o}", "Europe/London")) for o in ("+01:00", "+00:00")
    }
    assert readings == {"2026-10-25T00:30:00", "2026-10-25T01:30:00"}


@pytest.mark.parametrize("text", ["2026-06-21", "noon", "", "2026-13-01T00:00", "2026-06-21T25:00"])
def test_refuses_what_is_no_date_and_time(text):
    with pytest.raises(InputError):
        parse_local(text, "Europe/London")


@pytest.mark.parametrize("zone", ["Europe/Londn", "", "/etc/passwd", "Europe"])
def test_refuses_an_unknown_zone(zone):
    with pytest.raises(InputError, match="no time zone"):
        parse_local("2026-06-21T13:30", zone)


def test_writes_the_local_clock_with_its_offset():
    utc = np.datetime64("2026-06-21T12:30")
    assert format_local(utc, "Europe/London") == "2026-06-21 13:30 +01:00"
    assert format_local(utc, "America/St_Johns") == "2026-06-21 10:00 -02:30"
    assert format_local(datetime(2026, 6, 21, 12, 29, 31), "UTC") == "2026-06-21 12:30 +00:00"


def test_refuses_to_write_a_missing_time():
    with pytest.raises(InputError, match="NaT"):
        format_local(np.datetime64("NaT"), "UTC")


@settings(max_examples=200, deadline=None)
@given(
    st.integers(0, 200 * 365 * 1440),
    st.sampled_from(["Europe/London", "America/New_York", "Australia/Lord_Howe", "UTC"]),
)
def test_what_is_written_reads_back(minutes, zone):
    # Minutes since 1950: all offsets are whole minutes by then.
    utc = np.datetime64("1950-01-01T00:00") + np.timedelta64(minutes, "m")
    date, clock, offset = format_local(utc, zone).split()
    assert parse_local(f"{date}T{clock}{offset}", zone) == utc


def test_reads_the_usual_kinds_of_time_alike():
    want = np.array(["2026-06-21T12:30"], dtype="datetime64[us]")
    kinds = [
        np.datetime64("2026-06-21T12:30"),
        np.array(["2026-06-21T12:30"], dtype="datetime64[s]"),
        pd.DatetimeIndex(["2026-06-21 13:30"]).tz_localize("Europe/London"),
        pd.Timestamp("2026-06-21 13:30", tz="Europe/London"),
        datetime(2026, 6, 21, 12, 30, tzinfo=UTC),
        "2026-06-21T13:30+01:00",
        ["2026-06-21T12:30Z"],
    ]
    for kind in kinds:
        np.testing.assert_array_equal(utc_times(kind), want)


@pytest.mark.parametrize(
    "times",
    [
        pd.DatetimeIndex(["2026-06-21 13:30"]),
        datetime(2026, 6, 21),
        "2026-06-21T13:30",
        ["today"],
        np.array(["2026-06-21", "NaT"], dtype="datetime64[s]"),
        12.0,
        [12.0],
    ],
)
def test_refuses_times_without_zone_or_meaning(times):
    with pytest.raises(InputError):
        utc_times(times)
