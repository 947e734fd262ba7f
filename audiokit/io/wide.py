"""Tests tables with one row per test and one column per ear and frequency."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
import pyarrow as pa
from numpy.typing import NDArray

from audiokit.io.batch import TestBatch, detail_texts, given_ids
from audiokit.io.cells import ParsedCells
from audiokit.io.columns import THRESHOLD_COLUMNS
from audiokit.io.repeats import Key, Stack, check_repeats, pair
from audiokit.io.shared_columns import SharedColumns, cell_rules, threshold_cells


@dataclass(frozen=True)
class _Column:
    """One column of thresholds: the ear and frequency it belongs to, and what its distinct cells say."""

    ear: int
    frequency_hz: int
    codes: NDArray[np.int32]
    parsed: ParsedCells


def check_wide_repeats(shared: Sequence[SharedColumns]) -> None:
    """Note repeated rows of all wide tables, and different rows that share a test_id."""
    stack = Stack([s.table for s in shared])
    stamps = pd.factorize(np.concatenate([s.stamp for s in shared]))[0].astype(np.int64)
    near = pair(stack.codes("person_id"), stamps)
    key = None
    if any(table.has("test_id") for table in stack.tables):
        what = "the same test_id stands with other contents in"
        key = Key(stack.repeated_codes("test_id"), "test_id", what)
    check_repeats(stack, near, key, np.concatenate([s.blank for s in shared]))


def read_wide_cells(shared: SharedColumns) -> list[_Column]:
    """The thresholds of a wide table; faulty cells are noted."""
    table, rules = shared.table, cell_rules(shared.table)
    found = []
    for name in table.mapped.heading:
        if name in THRESHOLD_COLUMNS:
            ear, frequency_hz = THRESHOLD_COLUMNS[name]
            found.append(_Column(ear, frequency_hz, table.column(name).codes, threshold_cells(table, name, rules)))
    return found


def wide_batch(shared: SharedColumns, columns: list[_Column], first_place: int) -> TestBatch:
    """The accepted tests of a wide table. `first_place` is the place of the table's first row among all rows."""
    rules = cell_rules(shared.table)
    raw = shared.table.raw
    rows = np.flatnonzero(~shared.table.log.rejected)
    every = len(rows) == len(raw)

    def fill(
        axis: dict[int, int], threshold: NDArray[np.int16], response: NDArray[np.int8], place: NDArray[np.int64]
    ) -> None:
        for column in columns:
            at = column.ear, axis[column.frequency_hz]
            codes = column.codes if every else column.codes[rows]
            threshold[(*at, place)] = column.parsed.levels(rules.limit(column.frequency_hz))[codes]
            response[(*at, place)] = column.parsed.response[codes]

    return TestBatch(
        person=shared.person[rows],
        stamp=shared.stamp[rows],
        day=shared.day[rows],
        purpose=shared.purpose[rows].astype(np.int8),
        valid=shared.valid[rows] != 0,
        given_id=given_ids(shared, rows),
        place=first_place + rows,
        source_file=pa.repeat(pa.scalar(raw.file, pa.string()), len(rows)),
        source_row=raw.rows[rows],
        frequencies_hz=tuple(column.frequency_hz for column in columns),
        fill=fill,
        texts=detail_texts(shared, rows),
        hours=None if shared.hours is None else shared.hours[rows],
    )
