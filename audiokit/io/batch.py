"""Accepted tests of one source, on their way into the grid."""

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from audiokit.io.columns import RECHECK_COLUMNS, TEXT_DETAILS
from audiokit.io.shared_columns import SharedColumns

FillGrid = Callable[[dict[int, int], NDArray[np.int16], NDArray[np.int8], NDArray[np.int64]], None]


@dataclass(frozen=True)
class TestBatch:
    """Accepted tests in order of input; every array is [test].

    person, stamp, day, purpose, valid : as in SharedColumns
    given_id       : test ids as the file gives them, "" where it gives none
    place          : int64 place of the test's first row among all rows of all files
    source_file, source_row : where that row stands
    frequencies_hz : the frequencies that occur
    fill           : puts the thresholds into grid arrays; called with (frequency -> place on the frequency axis,
                     threshold and response [ear, frequency, test of the grid], place in the grid [test])
    texts          : the optional columns that are text, by name
    hours          : hours since noise, NaN where blank; None where the source has no such column
    """

    __test__ = False

    person: NDArray[np.int32]
    stamp: NDArray[np.int64]
    day: NDArray[np.int32]
    purpose: NDArray[np.int8]
    valid: NDArray[np.bool_]
    given_id: pa.StringArray
    place: NDArray[np.int64]
    source_file: pa.StringArray
    source_row: NDArray[np.int64]
    frequencies_hz: tuple[int, ...]
    fill: FillGrid
    texts: dict[str, pa.StringArray] = field(default_factory=dict)
    hours: NDArray[np.float64] | None = None

    def __len__(self) -> int:
        return len(self.person)


def detail_texts(shared: SharedColumns, rows: NDArray[np.int64]) -> dict[str, pa.StringArray]:
    """The optional text columns of some rows, as far as the file has them."""
    table = shared.table
    names = [name for name in (*TEXT_DETAILS, *RECHECK_COLUMNS) if table.has(name)]
    return {name: table.column(name).texts(rows) for name in names}


def given_ids(shared: SharedColumns, rows: NDArray[np.int64]) -> pa.StringArray:
    """The test ids of some rows, "" where there is none."""
    if shared.table.has("test_id"):
        return shared.table.column("test_id").texts(rows)
    return pa.repeat(pa.scalar("", pa.string()), len(rows))
