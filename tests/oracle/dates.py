"""Calendar arithmetic of the scalar review."""

import calendar
import datetime as dt

from tests.oracle.records import Person


def add_months(day: dt.date, months: int) -> dt.date:
    """The same day `months` calendar months later, or that month's last day."""
    year, month = divmod(day.year * 12 + day.month - 1 + months, 12)
    return dt.date(year, month + 1, min(day.day, calendar.monthrange(year, month + 1)[1]))


def age_on(person: Person, day: dt.date) -> int | None:
    """Completed years; with the year of birth only, the difference of years; None when neither is known."""
    if person.birth_date is not None:
        birthday_passed = (day.month, day.day) >= (person.birth_date.month, person.birth_date.day)
        return day.year - person.birth_date.year - (0 if birthday_passed else 1)
    if person.birth_year is not None:
        return day.year - person.birth_year
    return None
