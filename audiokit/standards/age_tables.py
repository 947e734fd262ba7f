"""Age-correction tables of the regulations: whole decibels by sex, age and frequency."""

import functools
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from audiokit.core.errors import OutOfScopeError
from audiokit.core.vocabulary import Sex
from audiokit.standards.registry import SourceSheet, TableError, load_table

_SEX_ROWS = {"female": Sex.FEMALE, "male": Sex.MALE}


@dataclass(frozen=True)
class AgeTable:
    """An age-correction table. Only differences between two ages may be subtracted, never one value alone.

    youngest, oldest : first and last row; they stand for everybody younger or older [years]
    dense            : int16 [sex code 0–2, frequency, age 0…oldest], ages below `youngest` filled with the first row,
                       zero for an unknown sex [dB]
    """

    sheet: SourceSheet
    frequencies_hz: tuple[int, ...]
    youngest: int
    oldest: int
    dense: NDArray[np.int16]

    def lookup(self, frequencies_hz: ArrayLike) -> NDArray[np.int16]:
        """Array [sex code 0–2, frequency, age 0…oldest] for direct indexing. [dB]

        Clip ages to 0…oldest before indexing; ages below `youngest` hold the first row already. Row 0 (sex unknown)
        is zero: the tables exist for women and men only, so the caller must say that no correction was applied.

        Raises: OutOfScopeError for a frequency that the table does not have; it lists those that it has.
        """
        wanted = [int(frequency) for frequency in np.atleast_1d(np.asarray(frequencies_hz))]
        absent = [frequency for frequency in wanted if frequency not in self.frequencies_hz]
        if absent:
            raise OutOfScopeError(
                f"{self.sheet.name} has no values at {', '.join(map(str, absent))} Hz",
                f"use some of: {', '.join(map(str, self.frequencies_hz))} Hz",
            )
        return self.dense[:, [self.frequencies_hz.index(frequency) for frequency in wanted]]

    def values(self, sex: ArrayLike, age_years: ArrayLike, frequency_hz: int) -> NDArray[np.int16]:
        """Table values, ages clamped to the first and last row. [dB]

        sex : codes of `Sex`      age_years : completed years, integers; both any shape, broadcast together
        Where `covers(sex)` is False the result is 0, which means "no correction known", not "no change with age".

        Raises: OutOfScopeError for a frequency that the table does not have.
        """
        row = np.clip(np.asarray(age_years, dtype=np.int64), 0, self.oldest)
        return self.lookup(frequency_hz)[np.asarray(sex, dtype=np.int64), 0, row]

    def covers(self, sex: ArrayLike) -> NDArray[np.bool_]:
        """True where the table has values for the sex; False where it is unknown."""
        return np.asarray(sex) != Sex.UNKNOWN


@functools.cache
def age_table(name: str) -> AgeTable:
    """An age-correction table of the register by its name, for example "us_29cfr1910_95_appendix_f".

    Raises: TableError for an unknown name or for a table of another kind.
    """
    table = load_table(name)
    frame = table.frame
    columns = [column for column in frame.columns if column.startswith("db_")]
    if list(frame.columns) != ["sex", "age_years", *columns] or not columns:
        raise TableError(
            f"{name} is no age-correction table: its columns are {', '.join(frame.columns)}",
            "such a table has sex, age_years and one column db_<frequency in Hz> per frequency",
        )
    youngest, oldest = int(frame["age_years"].min()), int(frame["age_years"].max())
    dense = np.zeros((len(Sex), len(columns), oldest + 1), dtype=np.int16)
    for text, code in _SEX_ROWS.items():
        rows = frame[frame["sex"] == text].sort_values("age_years")
        if rows["age_years"].tolist() != list(range(youngest, oldest + 1)):
            raise TableError(f"{name}: the rows for {text} do not run from {youngest} to {oldest}", "complete the CSV")
        dense[code, :, youngest:] = rows[columns].to_numpy().T
        dense[code, :, :youngest] = dense[code, :, youngest : youngest + 1]
    dense.setflags(write=False)
    frequencies = tuple(int(column.removeprefix("db_")) for column in columns)
    return AgeTable(table.sheet, frequencies, youngest, oldest, dense)
