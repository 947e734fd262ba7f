"""The columns that wide and long tests tables share: person, time, purpose and the optional columns of a test."""

from dataclasses import dataclass

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from audiokit.core.dates import NO_DATE, iso_text
from audiokit.core.vocabulary import Purpose
from audiokit.io.cells import CellRules, ParsedCells, parse_cells
from audiokit.io.columns import RECHECK_COLUMNS
from audiokit.io.source_table import SourceTable
from audiokit.io.words import PURPOSE_WORDS, VALID_WORDS, parse_numbers
from audiokit.model.grid import People

NOBODY = -1


@dataclass(frozen=True)
class KnownPeople:
    """The accepted people, and the identifiers that stand in quarantined rows of the people tables."""

    people: People
    rejected: pa.StringArray


@dataclass(frozen=True)
class SharedColumns:
    """One tests table with its shared columns read; every array is [row].

    blank   : True where the row holds nothing at all
    person  : int32 row in People, NOBODY where none
    stamp   : int64 nanoseconds since 1970-01-01T00:00 local time, NO_STAMP where unreadable
    day     : int32 days since 1970-01-01, NO_DATE where unreadable
    purpose, valid : codes, -1 where unreadable
    hours   : hours since noise, NaN where blank or unreadable; None where the file has no such column
    """

    table: SourceTable
    blank: NDArray[np.bool_]
    person: NDArray[np.int32]
    stamp: NDArray[np.int64]
    day: NDArray[np.int32]
    purpose: NDArray[np.int8]
    valid: NDArray[np.int8]
    hours: NDArray[np.float64] | None

    def __len__(self) -> int:
        return len(self.table)


def cell_rules(table: SourceTable) -> CellRules:
    """How the file writes its thresholds."""
    settings = table.settings
    return CellRules(settings.cells, settings.response_limits, settings.decimal_comma, table.raw.typed)


def threshold_cells(table: SourceTable, name: str, rules: CellRules) -> ParsedCells:
    """What the distinct cells of a column of thresholds say; faulty ones are noted."""
    parsed = parse_cells(table.column(name).stripped.to_pylist(), rules)
    table.add_faults(name, parsed.fault)
    return parsed


def _find_people(table: SourceTable, known: KnownPeople, blank: NDArray[np.bool_]) -> NDArray[np.int32]:
    column = table.column("person_id")
    place = pc.index_in(column.stripped, known.people.person_id).fill_null(NOBODY)
    place = place.to_numpy(zero_copy_only=False).astype(np.int32)
    nobody = place == NOBODY
    if nobody.any():
        nobody &= ~pc.equal(column.stripped, "").to_numpy(zero_copy_only=False)
        was_rejected = pc.is_in(column.stripped, known.rejected).to_numpy(zero_copy_only=False) & nobody
        where = column.spread(was_rejected) & ~table.log.rejected & ~blank
        table.add("unknown_person", where, "person_id", "stands only in quarantined rows of the people table")
        where = column.spread(nobody & ~was_rejected) & ~table.log.rejected & ~blank
        table.add("unknown_person", where, "person_id", "is not in the people table")
    return column.spread(place)


def _earliest_days(people: People) -> NDArray[np.int64]:
    """The first day on which each person can have been tested: of birth, or of the year of birth. [person]"""
    new_year = (
        (people.birth_year.astype(np.int64) - 1970).astype("datetime64[Y]").astype("datetime64[D]").astype(np.int64)
    )
    by_year = np.where(people.birth_year == 0, np.int64(NO_DATE), new_year)
    return np.where(people.birth_day == NO_DATE, by_year, people.birth_day)


def _check_birth(table: SourceTable, people: People, person: NDArray[np.int32], day: NDArray[np.int32]) -> None:
    """Note tests dated before the person's birth; where only the year of birth is known, before that year."""
    if not len(people):
        return
    early = np.flatnonzero((day < _earliest_days(people)[person]) & (person != NOBODY) & (day != NO_DATE))
    if len(early):
        who = person[early]
        years = people.birth_year[who].astype(str).astype(object)
        births = np.where(people.birth_day[who] != NO_DATE, iso_text(people.birth_day[who]), years)
        table.add("before_birth", early, "tested_on", pa.array(births, pa.string()))


def _hours(table: SourceTable) -> NDArray[np.float64] | None:
    if not table.has("hours_since_noise"):
        return None
    column = table.column("hours_since_noise")
    numbers = parse_numbers(column.stripped.to_pylist(), table.settings.decimal_comma)
    faulty = np.isnan(numbers) & ~pc.equal(column.stripped, "").to_numpy(zero_copy_only=False)
    if faulty.any():
        table.add("unreadable_number", column.spread(faulty), "hours_since_noise")
    return column.spread(numbers)


def read_shared_columns(table: SourceTable, known: KnownPeople) -> SharedColumns:
    """The shared columns of a tests table; every problem is noted in the table's log."""
    blank = table.check_blank_rows()
    table.check_ids("person_id", blank)
    person = _find_people(table, known, blank)
    if table.has("test_id"):
        table.check_ids("test_id", blank)
    dates = table.dates("tested_on")
    tested_on = table.column("tested_on")
    if dates.blank.any():
        table.add("missing_date", tested_on.spread(dates.blank) & ~blank, "tested_on")
    day = tested_on.spread(dates.day)
    _check_birth(table, known.people, person, day)
    rules = cell_rules(table)
    for name in RECHECK_COLUMNS:
        if table.has(name):
            threshold_cells(table, name, rules)
    length = len(table)
    return SharedColumns(
        table=table,
        blank=blank,
        person=person,
        stamp=tested_on.spread(dates.stamp),
        day=day,
        purpose=table.words("purpose", PURPOSE_WORDS, blank)
        if table.has("purpose")
        else np.full(length, Purpose.BLANK),
        valid=table.words("valid", VALID_WORDS, blank) if table.has("valid") else np.ones(length, np.int8),
        hours=_hours(table),
    )
