"""The faults that real files have, planted into the tables of text. Each list names what a reader should say of it."""

from collections.abc import Collection, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray


@dataclass(frozen=True)
class CellFault:
    """One cell of one row overwritten; `code` is that of the catalogue of problems, "" where the row stays usable."""

    column: str
    text: str
    code: str


USED = -1
"""Serial of rows that have a fault, or that nobody may fault."""

BEFORE_BIRTH = "1922-03-14"

SAWMILL = (
    CellFault("right_4000", "205", "out_of_range"),
    CellFault("left_3000", "7.55", "finer_than_tenth"),
    CellFault("left_500", "-35", "out_of_range"),
    CellFault("right_2000", "n/a", "unreadable_threshold"),
    CellFault("tested_on", "2023-25-09", "impossible_date"),
    CellFault("tested_on", "09/14/2022", "unreadable_date"),
    CellFault("tested_on", "2021-09-14T08:30Z", "zone_offset"),
    CellFault("tested_on", "", "missing_date"),
    CellFault("tested_on", BEFORE_BIRTH, "before_birth"),
    CellFault("person_id", "S8888", "unknown_person"),
    CellFault("person_id", "", "missing_person_id"),
    CellFault("person_id", "=S1002", "formula_like_id"),
    CellFault("purpose", "anual", "unknown_purpose"),
    CellFault("valid", "maybe", "unknown_valid"),
    CellFault("hours_since_noise", "all night", "unreadable_number"),
    CellFault("remarks", "=SUM(A1:A9)", ""),
    CellFault("remarks", "@noise, +cold, -late", ""),
    CellFault("right_3000", "", ""),
    CellFault("left_4000", "", ""),
)
"""Wide CSV with our own headings."""

SAWMILL_LAST_LINES = f"{',' * 23}\nS99999,S1001,2025-09-30,annual,yes,16,SAW-1\n"
"""A row without any cell filled (blank_row), and one that breaks off in the middle (ragged_row)."""

PRINT_HALL = (
    CellFault("right_1000", "888", "out_of_range"),
    CellFault("left_6000", "205", "out_of_range"),
    CellFault("tested_on", "14.05.2022", "unreadable_date"),
    CellFault("person_id", "P8888", "unknown_person"),
    CellFault("purpose", "Q", "unknown_purpose"),
    CellFault("remarks", '=HYPERLINK("row 3","open")', ""),
    CellFault("left_2000", "ok", "unreadable_threshold"),
)
"""Sheet with its own headings and codes."""

BOTTLING_HALL = (
    CellFault("threshold", "7,55", "unreadable_threshold"),
    CellFault("threshold", "140", "out_of_range"),
    CellFault("frequency_hz", "4K", "unknown_frequency"),
    CellFault("ear", "both", "unknown_ear"),
    CellFault("tested_on", "02/25/2023", "impossible_date"),
    CellFault("purpose", "exit", "inconsistent_test"),
)
"""Long CSV, one row per threshold; the last one differs from the other rows of its test."""

PEOPLE = (
    ("S7001,x,1980-01-01,,sawmill,yard,yard driver,2020-01-06,,2020-01-06,early,", "unknown_sex"),
    ("S7002,male,1980-01-01,1981,sawmill,yard,yard driver,2020-01-06,,2020-01-06,early,", "conflicting_birth"),
    ("P7003,female,,19-72,print hall,finishing,binder,2020-01-06,,2020-01-06,late,", "unreadable_year"),
    ("P7004,female,1980-02-30,,print hall,finishing,binder,2020-01-06,,2020-01-06,late,", "impossible_date"),
    (",male,1975-06-01,,bottling hall,filling,filler operator,2020-01-06,,2020-01-06,night,", "missing_person_id"),
    ("+B7005,male,1975-06-01,,bottling hall,filling,filler operator,2020-01-06,,2020-01-06,night,", "formula_like_id"),
)
"""Rows added to the people table, and what is wrong with each."""


def plant_cells(
    rng: np.random.Generator, table: pd.DataFrame, faults: Sequence[CellFault], spared: Collection[int]
) -> pd.DataFrame:
    """Overwrite one cell each, in rows of as many different tests as there are faults.

    table  : its index holds the serial of each row's test; tests that have a fault get the serial USED
    spared : serials of tests that must stay sound
    """
    rows = _pick(rng, table, len(faults), spared)
    cells = table.to_numpy(dtype=object, copy=True)
    columns = table.columns.get_indexer(pd.Index([fault.column for fault in faults]))
    cells[rows, columns] = [fault.text for fault in faults]
    return pd.DataFrame(cells, columns=table.columns, index=_used(table, rows))


def repeat_rows(
    rng: np.random.Generator,
    table: pd.DataFrame,
    count: int,
    spared: Collection[int],
    column: str | None = None,
) -> pd.DataFrame:
    """Repeat one row each of `count` tests further down; with a threshold `column`, the copy differs there by 20 dB."""
    rows = _pick(rng, table, count, spared)
    copies = table.iloc[rows].copy()
    if column is not None:
        copies[column] = [str(int(text) + 20) if text.lstrip("-").isdigit() else "20" for text in copies[column]]
    copies.index = pd.Index([USED] * count)
    whole = table.set_axis(_used(table, rows), axis=0)
    return _insert(whole, copies, np.minimum(rows + rng.integers(1, 40, count), len(table)))


def _pick(rng: np.random.Generator, table: pd.DataFrame, count: int, spared: Collection[int]) -> NDArray[np.int64]:
    """Row numbers, one of each of `count` different tests that have no fault yet."""
    serials = table.index.to_numpy()
    free = np.unique(serials[(serials != USED) & ~np.isin(serials, list(spared))])
    chosen = rng.choice(free, size=count, replace=False)
    return np.array([rng.choice(np.flatnonzero(serials == serial)) for serial in chosen], dtype=np.int64)


def _used(table: pd.DataFrame, rows: NDArray[np.int64]) -> pd.Index:
    serials = table.index.to_numpy()
    return pd.Index(np.where(np.isin(serials, serials[rows]), USED, serials))


def _insert(table: pd.DataFrame, extra: pd.DataFrame, before: NDArray[np.integer]) -> pd.DataFrame:
    """Put rows into a table before the rows given; the rest keeps its order."""
    keys = np.concatenate([np.arange(len(table)) * 2 + 1, before * 2])
    return pd.concat([table, extra]).iloc[np.argsort(keys, kind="stable")]
