"""Calendar arithmetic on arrays against the standard library's dates, day by day."""

import calendar
import datetime

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from audiokit.core.dates import (
    NO_DATE,
    add_months,
    calendar_number,
    completed_years,
    iso_text,
    to_date,
    to_days,
    year_month_day,
)

EPOCH = datetime.date(1970, 1, 1)
DATES = st.dates(datetime.date(1850, 1, 1), datetime.date(2240, 12, 31))
FOUR_CENTURIES = np.arange(to_days(datetime.date(1850, 1, 1)), to_days(datetime.date(2250, 12, 31)), dtype=np.int32)


def months_later(date: datetime.date, months: int) -> datetime.date:
    """Written apart from the package: count months, then cut to the month's last day."""
    count = date.year * 12 + date.month - 1 + months
    year, month = divmod(count, 12)
    return datetime.date(year, month + 1, min(date.day, calendar.monthrange(year, month + 1)[1]))


def age(born: datetime.date, on: datetime.date) -> int:
    """Written apart from the package: birthdays that have passed."""
    return on.year - born.year - ((on.month, on.day) < (born.month, born.day))


def test_days_and_dates_are_one_another() -> None:
    assert to_days(EPOCH) == 0
    assert to_days(datetime.date(1969, 12, 31)) == -1
    assert [to_date(to_days(date)) for date in (EPOCH, datetime.date(1850, 1, 1), datetime.date(2024, 2, 29))] == [
        EPOCH,
        datetime.date(1850, 1, 1),
        datetime.date(2024, 2, 29),
    ]


def test_every_day_of_four_centuries() -> None:
    year, month, day = year_month_day(FOUR_CENTURIES)
    dates = [EPOCH + datetime.timedelta(days=number) for number in FOUR_CENTURIES.tolist()]
    assert year.tolist() == [date.year for date in dates]
    assert month.tolist() == [date.month for date in dates]
    assert day.tolist() == [date.day for date in dates]
    assert calendar_number(FOUR_CENTURIES).tolist() == [d.year * 10000 + d.month * 100 + d.day for d in dates]
    assert iso_text(FOUR_CENTURIES).tolist() == [date.isoformat() for date in dates]


@pytest.mark.parametrize("months", [1, 6, 12, 24])
def test_months_later_on_every_day(months: int) -> None:
    days = FOUR_CENTURIES[: -40 * 31]
    later = add_months(days, months)
    assert later.dtype == np.int32
    assert later.tolist() == [to_days(months_later(to_date(day), months)) for day in days.tolist()]


def test_months_later_at_month_ends() -> None:
    """By hand; six months from the 31st is the month's last day (the contract's reading of the persistence rule)."""
    cases = [
        ("2021-08-31", 6, "2022-02-28"),
        ("2023-08-31", 6, "2024-02-29"),
        ("2024-02-29", 12, "2025-02-28"),
        ("2024-02-29", 48, "2028-02-29"),
        ("2023-12-31", 6, "2024-06-30"),
        ("2024-01-30", 1, "2024-02-29"),
        ("1900-01-31", 1, "1900-02-28"),
        ("2000-01-31", 1, "2000-02-29"),
        ("2024-03-15", 0, "2024-03-15"),
    ]
    for start, months, later in cases:
        day = to_days(datetime.date.fromisoformat(start))
        assert to_date(int(add_months(day, months))).isoformat() == later


@settings(max_examples=300, deadline=None)
@given(born=DATES, on=DATES)
def test_completed_years(born: datetime.date, on: datetime.date) -> None:
    assert int(completed_years(to_days(born), to_days(on))) == age(born, on)


def test_completed_years_around_every_kind_of_birthday() -> None:
    """29 February counts from 1 March in common years (common practice, no source)."""
    for born in (datetime.date(2000, 2, 29), datetime.date(1960, 3, 1), datetime.date(1979, 12, 31)):
        days = np.arange(to_days(born), to_days(datetime.date(2041, 1, 1)), dtype=np.int32)
        expected = [age(born, to_date(day)) for day in days.tolist()]
        assert completed_years(np.full(len(days), to_days(born)), days).tolist() == expected
    leap = to_days(datetime.date(2000, 2, 29))
    on = [to_days(datetime.date(*day)) for day in ((2001, 2, 28), (2001, 3, 1), (2004, 2, 28), (2004, 2, 29))]
    assert completed_years(leap, on).tolist() == [0, 1, 3, 4]


def test_no_date_is_blank() -> None:
    days = np.array([0, NO_DATE, 19782], dtype=np.int32)
    assert iso_text(days).tolist() == ["1970-01-01", "", "2024-02-29"]
    assert iso_text(np.empty(0, dtype=np.int32)).tolist() == []


def test_shapes_are_kept() -> None:
    days = np.arange(6, dtype=np.int32).reshape(2, 3)
    assert add_months(days, 6).shape == completed_years(days, days).shape == calendar_number(days).shape == (2, 3)
    assert completed_years(days, 20000).shape == (2, 3)
