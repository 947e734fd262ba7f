"""People tables to `People`: one row per accepted person, in order of identifier."""

from collections.abc import Sequence

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from audiokit.core.dates import NO_DATE, year_month_day
from audiokit.io.columns import PEOPLE_COLUMNS
from audiokit.io.date_cells import FIRST_BIRTH_YEAR, LAST_YEAR
from audiokit.io.repeats import NO_KEY, Key, Stack, check_repeats
from audiokit.io.source_table import SourceTable
from audiokit.io.words import SEX_WORDS
from audiokit.model.grid import People

_DATES = {"hired_on": "hired_day", "left_on": "left_day", "noise_since": "noise_since_day"}
_FOUR_DIGITS = r"^[0-9]{4}$"


def _days(table: SourceTable, name: str) -> NDArray[np.int32]:
    if not table.has(name):
        return np.full(len(table), NO_DATE, np.int32)
    first = FIRST_BIRTH_YEAR if name == "birth_date" else None
    parsed = table.dates(name, first) if first else table.dates(name)
    return table.column(name).spread(parsed.day)


def _birth_years(table: SourceTable) -> NDArray[np.int16]:
    """Years of birth, 0 where blank or unreadable; the latter are noted. [row]"""
    if not table.has("birth_year"):
        return np.zeros(len(table), np.int16)
    column = table.column("birth_year")
    plain = pc.replace_substring_regex(column.stripped, r"\.0+$", "")
    formed = pc.match_substring_regex(plain, _FOUR_DIGITS)
    year = pc.if_else(formed, plain, "0").cast(pa.int64()).to_numpy(zero_copy_only=False)
    good = (year >= FIRST_BIRTH_YEAR) & (year <= LAST_YEAR)
    blank = pc.equal(plain, "").to_numpy(zero_copy_only=False)
    table.add("unreadable_year", column.spread(~good & ~blank), "birth_year")
    return column.spread(np.where(good, year, 0).astype(np.int16))


def _birth(table: SourceTable) -> tuple[NDArray[np.int32], NDArray[np.int16]]:
    """Day and year of birth of each row; a disagreement of the two is noted."""
    day, year = _days(table, "birth_date"), _birth_years(table)
    known = day != NO_DATE
    year_of_day = np.where(known, year_month_day(np.where(known, day, 0))[0], 0).astype(np.int16)
    conflict = known & (year != 0) & (year != year_of_day)
    if conflict.any():
        dates = table.column("birth_date").texts(np.flatnonzero(conflict))
        table.add("conflicting_birth", conflict, "birth_year", dates)
    return day, np.where(known, year_of_day, year)


def _parse(table: SourceTable) -> dict[str, NDArray]:
    blank = table.check_blank_rows()
    table.check_ids("person_id", blank)
    birth_day, birth_year = _birth(table)
    return {
        "blank": blank,
        "sex": table.words("sex", SEX_WORDS, blank),
        "birth_day": birth_day,
        "birth_year": birth_year,
        **{field: _days(table, name) for name, field in _DATES.items()},
    }


def _text_columns(tables: Sequence[SourceTable], kept: Sequence[NDArray[np.int64]]) -> dict[str, pa.Array]:
    """Every column of the files as text, "" where a file has no such column."""
    names = [name for name in PEOPLE_COLUMNS if any(table.has(name) for table in tables)]
    names += list(dict.fromkeys(name for table in tables for name in table.mapped.others))
    columns = {}
    for name in names:
        found = [table.named(name) for table in tables]
        parts = [
            pa.repeat(pa.scalar("", pa.string()), len(rows)) if column is None else column.texts(rows)
            for column, rows in zip(found, kept, strict=True)
        ]
        columns[name] = pa.concat_arrays(parts)
    return columns


def _check_repeats(tables: Sequence[SourceTable], blank_rows: NDArray[np.bool_]) -> None:
    stack = Stack(tables)
    near = stack.codes("person_id")
    unnamed = np.concatenate([table.column("person_id").blank() for table in tables])
    key = Key(np.where(unnamed, NO_KEY, near), "person_id", "the same person_id stands with other contents in", True)
    check_repeats(stack, near, key, blank_rows)


def read_people(tables: Sequence[SourceTable]) -> tuple[People, pa.StringArray]:
    """The accepted people of all people tables, and the identifiers that stand in quarantined rows only.

    Every problem is noted in the log of its table.
    """
    parsed = [_parse(table) for table in tables]
    _check_repeats(tables, np.concatenate([p["blank"] for p in parsed]))
    kept = [np.flatnonzero(~table.log.rejected) for table in tables]
    columns = _text_columns(tables, kept)
    ids = columns["person_id"]
    order = pc.array_sort_indices(ids).to_numpy()
    frame = pd.DataFrame({name: texts.take(pa.array(order)).to_pandas() for name, texts in columns.items()})
    arrays = {
        field: np.concatenate([p[field][rows] for p, rows in zip(parsed, kept, strict=True)])[order]
        for field in parsed[0]
        if field != "blank"
    }
    rejected = pa.concat_arrays(
        [table.column("person_id").texts(np.flatnonzero(table.log.rejected)) for table in tables]
    )
    return People(person_id=ids.take(pa.array(order)), table=frame, **arrays), pc.unique(rejected)
