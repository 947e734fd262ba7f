"""Calendar arithmetic on whole arrays. Dates are int32 days since 1970-01-01, from 1850 to 2250."""

import datetime
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

Days = NDArray[np.int32]

NO_DATE = np.int32(np.iinfo(np.int32).min)
"""Stands for "not recorded" in arrays of days."""

_EPOCH = datetime.date(1970, 1, 1)

# Calendar arithmetic goes through look-up tables of all days that files may hold: much faster than dates in arrays.
_FIRST_DAY = (datetime.date(1850, 1, 1) - _EPOCH).days
_LAST_DAY = (datetime.date(2251, 1, 1) - _EPOCH).days


def to_days(date: datetime.date) -> int:
    """Days since 1970-01-01 of a calendar date."""
    return (date - _EPOCH).days


def to_date(days: int) -> datetime.date:
    """Calendar date of a count of days since 1970-01-01."""
    return _EPOCH + datetime.timedelta(days=int(days))


def _as_datetime64(days: ArrayLike) -> NDArray[np.datetime64]:
    return np.asarray(days, dtype=np.int64).astype("datetime64[D]")


def year_month_day(days: ArrayLike) -> tuple[NDArray[Any], NDArray[Any], NDArray[Any]]:
    """Year, month (1–12) and day of month (1–31) of each date."""
    date = _as_datetime64(days)
    month = date.astype("datetime64[M]")
    year = month.astype("datetime64[Y]")
    return (
        year.astype(np.int64) + 1970,
        (month - year).astype(np.int64) + 1,
        (date - month.astype("datetime64[D]")).astype(np.int64) + 1,
    )


def add_months(days: ArrayLike, months: int) -> Days:
    """The same day of the month, `months` calendar months later; the month's last day where there is none."""
    later: Days = _later_days(months)[np.asarray(days) - np.int32(_FIRST_DAY)]
    return later


@cache
def _later_days(months: int) -> Days:
    """`add_months` of every day of the look-up range."""
    date = np.arange(_FIRST_DAY, _LAST_DAY).astype("datetime64[D]")
    month = date.astype("datetime64[M]")
    target = month + np.timedelta64(months, "M")
    last = (target + np.timedelta64(1, "M")).astype("datetime64[D]") - np.timedelta64(1, "D")
    later = np.minimum(target.astype("datetime64[D]") + (date - month.astype("datetime64[D]")), last)
    return later.astype(np.int64).astype(np.int32)


@cache
def _calendar() -> NDArray[np.int32]:
    year, month, day = year_month_day(np.arange(_FIRST_DAY, _LAST_DAY))
    return (year * 10000 + month * 100 + day).astype(np.int32)


def calendar_number(days: ArrayLike) -> NDArray[np.int32]:
    """Year × 10000 + month × 100 + day of dates."""
    number: NDArray[np.int32] = _calendar().take(np.asarray(days) - np.int32(_FIRST_DAY))
    return number


def completed_years(from_days: ArrayLike, to: ArrayLike) -> NDArray[np.int32]:
    """Completed years between two dates. [years]

    No text read says how to count an age (common practice, no source): a birthday on 29 February counts from 1 March
    in common years.
    """
    return (calendar_number(to) - calendar_number(from_days)) // np.int32(10000)


def iso_text(days: ArrayLike) -> NDArray[np.object_]:
    """ISO dates as text; NO_DATE becomes the empty string."""
    array = np.asarray(days, dtype=np.int32)
    text = np.datetime_as_string(_as_datetime64(np.where(array == NO_DATE, 0, array)), unit="D").astype(object)
    text[array == NO_DATE] = ""
    return text
