"""One person's share of a review: rows of the finished tables and cells of the grid, looked up, never judged again."""

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc

from audiokit.core.dates import to_date
from audiokit.core.vocabulary import EARS, Purpose, Response
from audiokit.reports.shifts import shifts_table
from audiokit.reports.tables import baselines_table, events_table, to_frame
from audiokit.rules.spec import Criterion
from audiokit.surveillance.quality import quality_table
from audiokit.surveillance.review import Review
from audiokit.widgets.audiogram_svg import Cell


@dataclass(frozen=True)
class TestLine:
    """One accepted test of a person.

    index : its place in the cohort's grid      at : its place in the review's grid, -1 where it takes no part
    left_out : why it takes no part, blank where it does
    standing : "compared", "baseline" (the initial one), "earlier" (before the initial one) or "left out"
    """

    __test__ = False

    index: int
    at: int
    test_id: str
    tested_on: str
    purpose: str
    left_out: str
    standing: str


class ReviewLookup:
    """Finds what a review says of one person. The tables of the whole cohort are made when first asked for."""

    def __init__(self, review: Review) -> None:
        self.review = review

    def person_row(self, person_id: str) -> int:
        """The person's place in the cohort, -1 where there is none of that id."""
        return int(pc.index(self.review.cohort.people.person_id, pa.scalar(person_id)).as_py())

    def similar(self, person_id: str, most: int = 5) -> list[str]:
        """Ids that contain the text, whatever the case."""
        ids = self.review.cohort.people.person_id
        found = ids.filter(pc.match_substring(ids, person_id, ignore_case=True))
        return found.slice(0, most).to_pylist()

    def facts(self, row: int) -> dict[str, str]:
        """What the people table says of a person, blanks left out."""
        told = self.review.cohort.people.table.iloc[row].to_dict()
        return {
            str(name): str(value) for name, value in told.items() if name != "person_id" and value not in ("", None)
        }

    def column(self, name: str) -> pd.Series | None:
        """A column of the people table in the order of people, None where the table has none."""
        table = self.review.cohort.people.table
        return table[name] if name in table.columns else None

    def tests(self, row: int) -> list[TestLine]:
        """All accepted tests of a person in order of time, those that take no part included."""
        grid, review = self.review.cohort.grid, self.review
        lines = []
        for index in range(int(grid.first[row]), int(grid.first[row + 1])):
            left_out = str(review.left_out[index])
            at = -1 if left_out else int(self._place[index])
            lines.append(
                TestLine(
                    index=index,
                    at=at,
                    test_id=grid.test_id[index].as_py(),
                    tested_on=to_date(grid.day[index]).isoformat(),
                    purpose=Purpose(int(grid.purpose[index])).name.lower().replace("blank", ""),
                    left_out=left_out,
                    standing=self._standing(row, at),
                )
            )
        return lines

    def _standing(self, row: int, at: int) -> str:
        if at < 0:
            return "left out"
        initial = int(self.review.history.initial[row])
        return "baseline" if at == initial else "earlier" if at < initial else "compared"

    @cached_property
    def _place(self) -> np.ndarray:
        """Place in the review's grid of each test of the cohort's grid that takes part."""
        return np.cumsum(self.review.left_out == "") - 1

    def shifts(self, row: int) -> pd.DataFrame:
        """A person's rows of the shifts table: a row per compared test, ear and criterion."""
        return to_frame(shifts_table(self.review, slice(row, row + 1)))

    def frequencies(self, row: int) -> tuple[int, ...]:
        """The frequencies recorded in any of a person's tests, and those that a criterion takes its mean of. [Hz]"""
        grid = self.review.cohort.grid
        own = grid.response[:, :, int(grid.first[row]) : int(grid.first[row + 1])] != Response.NOT_RECORDED
        recorded = {hz for hz, seen in zip(grid.frequencies_hz, own.any(axis=(0, 2)), strict=True) if seen}
        asked = {hz for criterion in self.criteria().values() for hz in criterion.frequencies_hz.value}
        return tuple(sorted(recorded | asked))

    def cells(self, test: TestLine, ear: str, frequencies_hz: tuple[int, ...]) -> tuple[Cell, ...]:
        """The cells of one ear of a test, as recorded, at some frequencies; not recorded where the files have none."""
        grid, side = self.review.cohort.grid, EARS.index(ear)
        cells = []
        for hz in frequencies_hz:
            if hz in grid.frequencies_hz:
                at = grid.frequencies_hz.index(hz)
                level, response = grid.threshold[side, at, test.index], grid.response[side, at, test.index]
                cells.append(Cell(hz, int(level), Response(int(response))))
            else:
                cells.append(Cell(hz, 0, Response.NOT_RECORDED))
        return tuple(cells)

    def criteria(self) -> dict[str, Criterion]:
        """Every criterion of the review's rulebooks by its id, in the rulebooks' order."""
        return {name: found.criterion for book in self.review.books for name, found in book.findings.items()}

    def events(self, person_id: str) -> pd.DataFrame:
        """The person's rows of the events table."""
        return _rows_of(self._events, person_id)

    def baselines(self, person_id: str) -> pd.DataFrame:
        """The person's rows of the baselines table."""
        return _rows_of(self._baselines, person_id)

    def quality(self, person_id: str) -> pd.DataFrame:
        """The person's rows of the quality table."""
        return self._quality[self._quality["person_id"] == person_id]

    def worklist(self, person_id: str) -> pd.DataFrame:
        """The person's lines of the worklist."""
        return self.review.worklist[self.review.worklist["person_id"] == person_id]

    @cached_property
    def _events(self) -> pa.Table:
        return events_table(self.review)

    @cached_property
    def _baselines(self) -> pa.Table:
        return baselines_table(self.review)

    @cached_property
    def _quality(self) -> pd.DataFrame:
        return quality_table(self.review)

    def people_column(self, person_ids: pd.Series, name: str) -> pd.Series:
        """A column of the people table for a column of ids; blank where the table has none."""
        column = self.column(name)
        if column is None:
            return pd.Series("", index=person_ids.index, dtype=object)
        ids = self.review.cohort.people.person_id
        at = pc.index_in(pa.array(person_ids.tolist(), type=pa.string()), value_set=ids).to_numpy(zero_copy_only=False)
        return pd.Series(column.to_numpy(dtype=object)[at.astype(np.int64)], index=person_ids.index)


def _rows_of(table: pa.Table, person_id: str) -> pd.DataFrame:
    return to_frame(table.filter(pc.equal(table["person_id"], person_id)))


Pick = Callable[[str, str, str], None]
"""Told when somebody picks a person: person_id, test_id and criterion, the last two blank where none is meant."""
