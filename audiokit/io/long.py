"""Tests tables with one row per threshold: rows to tests, and their cells to the grid."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
import pyarrow as pa
from numpy.typing import NDArray

from audiokit.core.vocabulary import EARS, FREQUENCIES_HZ
from audiokit.io.batch import TestBatch
from audiokit.io.columns import OPTIONAL_TEST_COLUMNS, RECHECK_COLUMNS, TEXT_DETAILS
from audiokit.io.date_cells import NO_STAMP
from audiokit.io.repeats import NO_KEY, Key, Rows, Stack, check_conflicts, check_repeats, pair
from audiokit.io.shared_columns import SharedColumns, cell_rules, threshold_cells
from audiokit.io.words import EAR_WORDS, parse_frequencies

_NO_TEST = -1


@dataclass(frozen=True)
class _Cells:
    """Ear, frequency and cell of each row: ear -1 or frequency 0 where unreadable; level in tenths of a dB HL."""

    ear: NDArray[np.int8]
    frequency_hz: NDArray[np.int32]
    level: NDArray[np.int16]
    response: NDArray[np.int8]


@dataclass(frozen=True)
class LongTests:
    """The rows of all long tables, each with the test it belongs to.

    test   : int64 number of the test, -1 where the row belongs to none [row of the stack]
    places : int64 place among all rows of all files [row of the stack]
    """

    stack: Stack
    shared: Sequence[SharedColumns]
    cells: _Cells
    test: Rows
    places: Rows

    def joined(self, name: str) -> NDArray:
        """One shared column of all tables. [row of the stack]"""
        return np.concatenate([getattr(s, name) for s in self.shared])


def _read_cells(shared: SharedColumns) -> _Cells:
    table, rules = shared.table, cell_rules(shared.table)
    ear = table.words("ear", EAR_WORDS, shared.blank)
    column = table.column("frequency_hz")
    frequencies = parse_frequencies(column.stripped.to_pylist(), table.settings.decimal_comma)
    frequency_hz = column.spread(frequencies)
    unknown = (frequency_hz == 0) & ~shared.blank
    table.add("unknown_frequency", unknown, "frequency_hz", ", ".join(map(str, FREQUENCIES_HZ)))
    parsed = threshold_cells(table, "threshold", rules)
    codes = table.column("threshold").codes
    level = parsed.level[codes]
    at_limit = parsed.at_limit[codes]
    for hz in FREQUENCIES_HZ if at_limit.any() else ():
        level[at_limit & (frequency_hz == hz)] = rules.limit(hz)
    return _Cells(ear, frequency_hz, level, parsed.response[codes])


def _number_tests(stack: Stack, shared: Sequence[SharedColumns]) -> Rows:
    """The test of each row: by test_id where given, else by person and time; conflicting ids are noted."""
    stamp = np.concatenate([s.stamp for s in shared])
    unnamed = np.concatenate([s.table.column("person_id").blank() for s in shared])
    keyed = np.flatnonzero(~unnamed & (stamp != NO_STAMP))
    moment = pair(stack.codes("person_id", keyed), pd.factorize(stamp[keyed])[0].astype(np.int64))
    number = moment * 2
    if any(s.table.has("test_id") for s in shared):
        given = stack.codes("test_id", keyed)
        has_id = np.concatenate(
            [
                ~s.table.column("test_id").blank() if s.table.has("test_id") else np.zeros(len(s), np.bool_)
                for s in shared
            ]
        )[keyed]
        number = np.where(has_id, given * 2 + 1, number)
        key = Key(np.full(len(stack), NO_KEY), "test_id", "the same test_id stands for another person or time in")
        key.numbers[keyed[has_id]] = given[has_id]
        check_conflicts(stack, keyed, moment, key)
    test = np.full(len(stack), _NO_TEST, np.int64)
    test[keyed] = pd.factorize(number)[0]
    return test


def _first_rows(test: Rows, rows: Rows) -> Rows:
    """The first of the given rows of each test; 0 where a test has none of them."""
    first = np.zeros(int(test.max(initial=_NO_TEST)) + 1, np.int64)
    first[test[rows][::-1]] = rows[::-1]
    return first


def _hours(shared: Sequence[SharedColumns]) -> NDArray[np.float64]:
    return np.concatenate([np.full(len(s), np.nan) if s.hours is None else s.hours for s in shared])


def _check_constant(stack: Stack, shared: Sequence[SharedColumns], test: Rows) -> None:
    """Note every test whose optional columns are not the same in all its rows."""
    rows = np.flatnonzero(test != _NO_TEST)
    first = _first_rows(test, rows)
    for name in OPTIONAL_TEST_COLUMNS[1:]:
        if not any(s.table.has(name) for s in shared):
            continue
        if name in ("purpose", "valid"):
            values = np.concatenate([getattr(s, name) for s in shared])
        elif name == "hours_since_noise":
            values = np.nan_to_num(_hours(shared), nan=-1.0)
        else:
            values = stack.codes(name)
        differs = values[rows] != values[first[test[rows]]]
        if differs.any():
            odd = np.zeros(len(first), np.bool_)
            odd[test[rows[differs]]] = True
            flagged = rows[odd[test[rows]]]
            stack.add("inconsistent_test", flagged, name, pa.repeat(pa.scalar(name, pa.string()), len(flagged)))


def read_long(shared: Sequence[SharedColumns], first_places: Sequence[int]) -> LongTests:
    """The rows of all long tables with their tests; every problem is noted in the log of its table.

    first_places : place of each table's first row among all rows of all files
    """
    stack = Stack([s.table for s in shared])
    cells = [_read_cells(s) for s in shared]
    joined = _Cells(*(np.concatenate([getattr(c, f) for c in cells]) for f in _Cells.__dataclass_fields__))
    test = _number_tests(stack, shared)
    _check_constant(stack, shared, test)
    frequency = np.searchsorted(np.array((0, *FREQUENCIES_HZ)), joined.frequency_hz)
    ears = len(EARS) + 1
    near = ((test + 1) * ears + joined.ear + 1) * (len(FREQUENCIES_HZ) + 1) + frequency
    keyed = (test != _NO_TEST) & (joined.ear >= 0) & (joined.frequency_hz > 0)
    what = "the same test, ear and frequency stand with other contents in"
    key = Key(np.where(keyed, near, NO_KEY), "threshold", what, is_near=True)
    check_repeats(stack, near, key, np.concatenate([s.blank for s in shared]))
    places = np.concatenate([first + np.arange(len(s)) for first, s in zip(first_places, shared, strict=True)])
    return LongTests(stack, shared, joined, test, places)


def _texts(tests: LongTests, name: str, rows: Rows) -> pa.StringArray:
    """A text column of some rows, in any order; "" where a table has no such column."""
    columns = [table.named(name) for table in tests.stack.tables]
    parts = [
        pa.repeat(pa.scalar("", pa.string()), len(t)) if c is None else c.texts()
        for t, c in zip(tests.stack.tables, columns, strict=True)
    ]
    return pa.chunked_array(parts).take(pa.array(rows)).combine_chunks()


def long_batch(tests: LongTests) -> TestBatch:
    """The tests that have at least one accepted row."""
    rows = np.flatnonzero(~np.concatenate([table.log.rejected for table in tests.stack.tables]))
    test = pd.factorize(tests.test[rows])[0]
    first = np.zeros(int(test.max(initial=-1)) + 1, np.int64)
    first[test[::-1]] = rows[::-1]
    cells = _Cells(*(getattr(tests.cells, f)[rows] for f in _Cells.__dataclass_fields__))

    def fill(
        axis: dict[int, int], threshold: NDArray[np.int16], response: NDArray[np.int8], place: NDArray[np.int64]
    ) -> None:
        along = np.zeros(max(FREQUENCIES_HZ) + 1, np.int64)
        along[list(axis)] = list(axis.values())
        at = cells.ear, along[cells.frequency_hz], place[test]
        threshold[at] = cells.level
        response[at] = cells.response

    tables = tests.stack.tables
    which = np.searchsorted(tests.stack.first, first, side="right") - 1
    names = [name for name in (*TEXT_DETAILS, *RECHECK_COLUMNS) if any(table.has(name) for table in tables)]
    return TestBatch(
        person=tests.joined("person")[first],
        stamp=tests.joined("stamp")[first],
        day=tests.joined("day")[first],
        purpose=tests.joined("purpose")[first].astype(np.int8),
        valid=tests.joined("valid")[first] != 0,
        given_id=_texts(tests, "test_id", first),
        place=tests.places[first],
        source_file=pa.array([table.raw.file for table in tables]).take(pa.array(which)),
        source_row=np.concatenate([table.raw.rows for table in tables])[first],
        frequencies_hz=tuple(np.unique(cells.frequency_hz).tolist()),
        fill=fill,
        texts={name: _texts(tests, name, first) for name in names},
        hours=_hours(tests.shared)[first] if any(s.hours is not None for s in tests.shared) else None,
    )
