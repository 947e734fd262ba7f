"""Dates of files against the standard library's calendar, and every form that is not one."""

import datetime

import pyarrow as pa
import pytest
from hypothesis import given
from hypothesis import strategies as st

from audiokit.core.dates import NO_DATE, to_days
from audiokit.io.date_cells import NO_STAMP, parse_dates

NANOSECONDS = 86_400_000_000_000


def parse(text: str, order: str | None = None) -> tuple[int, int] | str:
    parsed = parse_dates(pa.array([text]), order)
    if parsed.fault[0]:
        assert parsed.day[0] == NO_DATE and parsed.stamp[0] == NO_STAMP
        return str(parsed.fault[0])
    return int(parsed.day[0]), int(parsed.stamp[0])


@given(
    moment=st.datetimes(datetime.datetime(1900, 1, 1), datetime.datetime(2200, 12, 31)), separator=st.sampled_from("T ")
)
def test_every_moment_is_read_as_written(moment, separator):
    day = to_days(moment.date())
    seconds = (moment - datetime.datetime.combine(moment.date(), datetime.time())) // datetime.timedelta(microseconds=1)
    assert parse(moment.isoformat(separator)) == (day, day * NANOSECONDS + seconds * 1000)
    assert parse(moment.date().isoformat()) == (day, day * NANOSECONDS)


@given(year=st.integers(1895, 2205), month=st.integers(0, 13), day=st.integers(0, 32))
def test_a_date_is_read_just_where_the_calendar_has_it(year, month, day):
    try:
        expected = to_days(datetime.date(year, month, day)) if 1900 <= year <= 2200 else None
    except ValueError:
        expected = None
    found = parse(f"{year:04d}-{month:02d}-{day:02d}")
    assert found == ((expected, expected * NANOSECONDS) if expected is not None else "impossible_date")
    for order, text in (
        ("dmy", f"{day}/{month}/{year}"),
        ("mdy", f"{month:02d}.{day:02d}.{year}"),
        ("ymd", f"{year}/{month}/{day}"),
    ):
        assert parse(text, order) == found
        assert parse(text) == "unreadable_date"


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("2024-1-5", "unreadable_date"), ("20240105", "unreadable_date"), ("05-01-2024", "unreadable_date"),
        ("2024-01-05T", "unreadable_date"), ("2024-01-05T8:30", "unreadable_date"), ("24-01-05", "unreadable_date"),
        ("2024-W01-1", "unreadable_date"), ("yesterday", "unreadable_date"), ("45000", "unreadable_date"),
        ("\u0662\u0660\u0662\u0664-01-05", "unreadable_date"), ("2024-01-05T24:00", "impossible_date"),
        ("2024-01-05T08:60", "impossible_date"), ("2023-02-29", "impossible_date"), ("1899-12-31", "impossible_date"),
        ("2201-01-01", "impossible_date"), ("2024-01-05T08:30Z", "zone_offset"),
        ("2024-01-05T08:30+01:00", "zone_offset"),
        ("2024-01-05 08:30:00 -0500", "zone_offset"), ("2024-01-05T08:30:00.5+02", "zone_offset"),
    ],
)  # fmt: skip
def test_what_is_no_local_iso_date(text, expected):
    assert parse(text) == expected


def test_a_set_order_is_accepted_beside_iso_and_with_a_time():
    day = to_days(datetime.date(2024, 1, 5))
    assert parse("5.1.2024 08:30", "dmy") == (day, day * NANOSECONDS + 30600 * 10**9)
    assert parse("2024-01-05", "dmy") == parse("1/5/2024", "mdy") == (day, day * NANOSECONDS)
    assert parse("5/1/24", "dmy") == "unreadable_date"
    assert parse("5/1-2024", "dmy") == (day, day * NANOSECONDS)
    assert parse("05/01/2024 8:30", "dmy") == parse("1/5/2024 08:30", "mdy") == parse("2024-01-05T08:30")


def test_blank_is_blank():
    parsed = parse_dates(pa.array(["", "2024-01-05"]))
    assert parsed.blank.tolist() == [True, False] and parsed.fault.tolist() == ["", ""]


def test_no_texts():
    assert len(parse_dates(pa.array([], pa.string()), "dmy").day) == 0
