"""All tests of all people as aligned arrays, ordered by person, then time."""

from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pandas as pd
import pyarrow as pa
from numpy.typing import NDArray

from audiokit.core.vocabulary import Response


@dataclass(frozen=True)
class People:
    """One row per accepted person, ordered by `person_id` as text (by code point).

    person_id  : string array [person]
    sex        : int8 codes of `Sex` [person]
    birth_day  : int32 days since 1970-01-01, NO_DATE where not recorded [person]
    birth_year : int16, 0 where neither birth date nor birth year is recorded; the year of birth_day where that is known
    left_day, noise_since_day, hired_day : int32 days, NO_DATE where not recorded [person]
    table      : every column of the file as text, for grouping and display; indexed 0…P-1 in the same order
    """

    person_id: pa.StringArray
    sex: NDArray[np.int8]
    birth_day: NDArray[np.int32]
    birth_year: NDArray[np.int16]
    left_day: NDArray[np.int32]
    noise_since_day: NDArray[np.int32]
    hired_day: NDArray[np.int32]
    table: pd.DataFrame

    def __len__(self) -> int:
        return len(self.person_id)


@dataclass(frozen=True)
class ThresholdGrid:
    """Every accepted test; test axis last, so that each ear and frequency is one contiguous column.

    person    : int32 row in `People` [test]; non-decreasing
    first     : int64 offsets [person + 1]; tests of person p are first[p]:first[p + 1], in order of time, then of input
    day       : int32 days since 1970-01-01 [test]
    purpose   : int8 codes of `Purpose` [test]
    valid     : bool, False where the file says so [test]
    test_id   : string array [test], unique
    frequencies_hz : the F frequencies that occur in the files, ascending
    threshold : int16 tenths of a dB HL [ear, frequency, test]; the limit where there was no response, else 0
    response  : int8 codes of `Response` [ear, frequency, test]
    details   : the optional test columns, one row per test: hours_since_noise (float), audiometer_id, transducer,
                room_id, tester, results_on, remarks (text), right_1000_recheck, left_1000_recheck (text as written),
                source_file, source_row; only those that the files have
    """

    person: NDArray[np.int32]
    first: NDArray[np.int64]
    day: NDArray[np.int32]
    purpose: NDArray[np.int8]
    valid: NDArray[np.bool_]
    test_id: pa.StringArray
    frequencies_hz: tuple[int, ...]
    threshold: NDArray[np.int16]
    response: NDArray[np.int8]
    details: pd.DataFrame = field(default_factory=pd.DataFrame)

    def __len__(self) -> int:
        return len(self.day)

    def has_level(self) -> NDArray[np.bool_]:
        """True where the cell carries an interval: measured or no response. [ear, frequency, test]"""
        return self.response <= Response.NO_RESPONSE

    def take(self, keep: NDArray[np.bool_]) -> "ThresholdGrid":
        """The tests marked in `keep`, all people kept."""
        if keep.all():
            return self
        counts = np.bincount(self.person[keep], minlength=len(self.first) - 1)
        return ThresholdGrid(
            person=self.person[keep],
            first=np.concatenate(([0], np.cumsum(counts))).astype(np.int64),
            day=self.day[keep],
            purpose=self.purpose[keep],
            valid=self.valid[keep],
            test_id=self.test_id.filter(pa.array(keep)),
            frequencies_hz=self.frequencies_hz,
            threshold=_kept(self.threshold, keep),
            response=_kept(self.response, keep),
            details=self.details[keep] if len(self.details.columns) else self.details,
        )


def _kept(columns: NDArray[Any], keep: NDArray[np.bool_]) -> NDArray[Any]:
    """The tests marked in `keep`, column by column: a mask over the whole would leave the columns in pieces."""
    kept = np.empty((*columns.shape[:2], int(keep.sum())), dtype=columns.dtype)
    for ear in range(columns.shape[0]):
        for at in range(columns.shape[1]):
            kept[ear, at] = columns[ear, at][keep]
    return kept
