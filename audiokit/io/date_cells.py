"""Dates and date-times as files write them: ISO, or one other order that the site has set."""

from dataclasses import dataclass

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from audiokit.core.dates import NO_DATE

DATE_ORDERS = ("ymd", "dmy", "mdy")
FIRST_YEAR, LAST_YEAR = 1900, 2200
FIRST_BIRTH_YEAR = 1850
NO_STAMP = np.iinfo(np.int64).min
"""Stands for "no readable date" in arrays of date-times."""

_SECONDS = r"(?P<second>[0-9]{2})(?:[.,](?P<fraction>[0-9]{1,9})[0-9]*)?"
_TIME = rf"(?:[Tt ](?P<hour>[0-9]{{2}}):(?P<minute>[0-9]{{2}})(?::{_SECONDS})?)?"
_SHORT_TIME = _TIME.replace("<hour>[0-9]{2}", "<hour>[0-9]{1,2}")
_ISO = r"(?P<year>[0-9]{4})-(?P<month>[0-9]{2})-(?P<day>[0-9]{2})"
_ZONE = r" ?(?:[Zz]|[+\-\x{2212}][0-9]{2}(?::?[0-9]{2})?)"
_YEAR, _MONTH, _DAY = r"(?P<year>[0-9]{4})", r"(?P<month>[0-9]{1,2})", r"(?P<day>[0-9]{1,2})"
_ORDERS = {"ymd": (_YEAR, _MONTH, _DAY), "dmy": (_DAY, _MONTH, _YEAR), "mdy": (_MONTH, _DAY, _YEAR)}
_FORMS = {"ymd": "year/month/day", "dmy": "day/month/year", "mdy": "month/day/year"}
_PARTS = ("year", "month", "day", "hour", "minute", "second")
_MONTH_DAYS = np.array([0, 31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31])
_DAY_NANOSECONDS = 86_400_000_000_000


@dataclass(frozen=True)
class ParsedDates:
    """Per distinct text.

    day   : int32 days since 1970-01-01, NO_DATE where blank or faulty
    stamp : int64 nanoseconds since 1970-01-01T00:00 local time, NO_STAMP where blank or faulty
    blank : True where the text is empty
    fault : object, "" or one of unreadable_date, impossible_date, zone_offset
    """

    day: NDArray[np.int32]
    stamp: NDArray[np.int64]
    blank: NDArray[np.bool_]
    fault: NDArray[np.object_]


def accepted_forms(order: str | None) -> str:
    """The forms of a date that are accepted, in words."""
    iso = "year-month-day (2024-03-31), a time after it is allowed"
    return f"{iso}; or {_FORMS[order]}" if order else iso


def _part(found: pa.StructArray, name: str) -> NDArray[np.int64]:
    texts = pc.struct_field(found, name)
    return pc.if_else(pc.equal(texts, ""), "0", texts).cast(pa.int64()).fill_null(0).to_numpy(zero_copy_only=False)


def _fields(texts: pa.StringArray, form: str) -> tuple[NDArray[np.bool_], dict[str, NDArray[np.int64]]]:
    """Which texts have the form, and their numbers."""
    found = pc.extract_regex(texts, f"^{form}$")
    numbers = {name: _part(found, name) for name in _PARTS}
    padded = pc.utf8_rpad(pc.struct_field(found, "fraction"), 9, "0")
    numbers["nanosecond"] = padded.cast(pa.int64()).fill_null(0).to_numpy(zero_copy_only=False)
    return found.is_valid().to_numpy(zero_copy_only=False), numbers


def parse_dates(texts: pa.StringArray, order: str | None = None, *, first_year: int = FIRST_YEAR) -> ParsedDates:
    """Dates of distinct, stripped texts.

    order : one of DATE_ORDERS where the site has set it, accepted beside ISO, with / . or - between the parts, hours
            with one digit or two
    """
    formed, numbers = _fields(texts, f"{_ISO}{_TIME}")
    if order is not None:
        first, second, third = _ORDERS[order]
        other, more = _fields(texts, f"{first}[/.\\-]{second}[/.\\-]{third}{_SHORT_TIME}")
        numbers = {name: np.where(formed, numbers[name], more[name]) for name in numbers}
        formed = formed | other
    year, month, day = numbers["year"], numbers["month"], numbers["day"]
    leap = (year % 4 == 0) & ((year % 100 != 0) | (year % 400 == 0))
    month_days = _MONTH_DAYS[np.where((month >= 1) & (month <= 12), month, 0)] + (leap & (month == 2))
    exists = (year >= first_year) & (year <= LAST_YEAR) & (day >= 1) & (day <= month_days)
    exists &= (numbers["hour"] <= 23) & (numbers["minute"] <= 59) & (numbers["second"] <= 59)
    blank = pc.equal(texts, "").to_numpy(zero_copy_only=False)
    zoned = pc.match_substring_regex(texts, f"[0-9]:[0-9]{{2}}.*{_ZONE}$|^{_ISO}[Zz]$").to_numpy(zero_copy_only=False)
    fault = np.full(len(texts), "", object)
    fault[formed & ~exists] = "impossible_date"
    fault[~formed & ~blank] = "unreadable_date"
    fault[~formed & zoned] = "zone_offset"
    good = formed & exists
    months = np.where(good, (year - 1970) * 12 + month - 1, 0).astype("datetime64[M]")
    days = months.astype("datetime64[D]").astype(np.int64) + day - 1
    seconds = (numbers["hour"] * 60 + numbers["minute"]) * 60 + numbers["second"]
    stamp = days * _DAY_NANOSECONDS + seconds * 1_000_000_000 + numbers["nanosecond"]
    return ParsedDates(np.where(good, days, NO_DATE).astype(np.int32), np.where(good, stamp, NO_STAMP), blank, fault)
