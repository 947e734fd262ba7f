"""The shifts table: one row per criterion, compared test and ear, with the arithmetic in words."""

import io
from functools import cache

import numpy as np
import pyarrow as pa
import pyarrow.csv
from numpy.typing import NDArray

from audiokit.core.vocabulary import EARS, Bound
from audiokit.reports.explain import Explainer, Words, baseline_names, sum_words
from audiokit.reports.numbers import Numbers, Rows, numbers_of, quotient_text
from audiokit.reports.text_rows import Piece, content, csv_field, date_texts, lookup, side_by_side, texts
from audiokit.surveillance.block import stretches
from audiokit.surveillance.ordering import order_by
from audiokit.surveillance.review import BookReview, Review

BLOCK_TESTS = 1 << 14
"""Tests whose rows are made at a time: bounds the memory, and gives the threads their unit."""

MET_TEXTS = ("no", "unknown", "yes")
BOUND_TEXTS = ("exact", "at_least", "at_most", "none")

SCHEMA = pa.schema(
    [
        ("person_id", pa.string()),
        ("test_id", pa.string()),
        ("tested_on", pa.string()),
        ("ear", pa.string()),
        ("criterion", pa.string()),
        ("baseline_test_id", pa.string()),
        ("measured_db", pa.float64()),
        ("correction_db", pa.float64()),
        ("value_db", pa.float64()),
        ("bound", pa.string()),
        ("met", pa.string()),
        ("why", pa.string()),
    ]
)

HEADER = (",".join(SCHEMA.names) + "\n").encode()


def output_order(review: Review) -> NDArray[np.int64]:
    """The tests by person, date and test_id as text; differs from the order of time only within one day."""
    return order_by((review.grid.person, review.grid.day), review.grid.test_id, ready=True)


class ShiftLines:
    """Makes the lines of shifts.csv, stretch by stretch of consecutive people; safe to use from several threads."""

    def __init__(self, review: Review) -> None:
        self.review = review
        self.stretches = stretches(review.history.first, BLOCK_TESTS)
        self._order = output_order(review)
        books = {name: book for book in review.books for name in book.findings}
        self._criteria = [_CriterionFields(books[name], name) for name in sorted(books)]

    def of(self, people: slice) -> memoryview:
        """The lines of a stretch of people, without the header, as UTF-8 bytes."""
        review, grid = self.review, self.review.grid
        tests = slice(int(review.history.first[people.start]), int(review.history.first[people.stop]))
        compared = self._order[tests]
        compared = compared[~review.history.before[compared]].astype(np.int32)
        rows = Rows(np.repeat(compared, 2), np.tile(np.array([0, 1]), len(compared)))
        identifiers = csv_field(grid.test_id[tests])
        persons = csv_field(review.cohort.people.person_id.take(pa.array(grid.person[tests])))
        heads = Piece(side_by_side([persons, ",", identifiers, ",", date_texts(grid.day[tests]), ","]))
        references = Piece(side_by_side([identifiers, ","]))
        names = baseline_names(review, tests)
        sums: dict[tuple[int, ...], Piece] = {}
        line: list[Piece | str] = []
        for fields in self._criteria:
            explainer = fields.explainer
            frequencies = tuple(explainer.criterion.frequencies_hz.value)
            if frequencies not in sums:
                sums[frequencies] = sum_words(review, explainer.criterion, explainer.sums, tests)
            numbers = numbers_of(fields.book, explainer.criterion.id, rows)
            line += [
                heads.take(rows.test - tests.start),
                Piece(fields.ears, rows.ear),
                references.take(numbers.base - tests.start),
                *fields.numbers(numbers),
                *explainer.pieces(rows, numbers, names, sums[frequencies], tests),
                '"\n',
            ]
        return content(side_by_side(line))


class _CriterionFields:
    """The fields of one criterion's lines; each text is made once per distinct value."""

    def __init__(self, book: BookReview, name: str) -> None:
        self.book = book
        self.explainer = Explainer(book, name)
        self.ears = texts([f"{ear},{name}," for ear in EARS])
        self._db = cache(_db_words(book.sums[name].count))
        self._correction = cache(_correction_words(book.sums[name].count))
        opening = f'"{self.explainer.opening}'
        self._answers = texts([f"{bound},{met},{opening}" for bound in BOUND_TEXTS for met in MET_TEXTS])

    def numbers(self, numbers: Numbers) -> list[Piece]:
        """From measured_db to the opening of `why`."""
        measured = lookup(self._db, numbers.shift * 4 + numbers.bound)
        corrected = self.explainer.ages is not None
        return [
            measured,
            lookup(self._correction, numbers.correction),
            lookup(self._db, numbers.value() * 4 + numbers.bound) if corrected else measured,
            Piece(self._answers, numbers.bound * np.int8(len(MET_TEXTS)) + numbers.met),
        ]


def _db_words(count: int) -> Words:
    def text(code: int) -> str:
        value, bound = divmod(code, 4)
        return "," if bound == Bound.NONE else f"{quotient_text(value, 10 * count)},"

    return text


def _correction_words(count: int) -> Words:
    return lambda correction: f"{quotient_text(correction, count)},"


def shifts_table(review: Review, people: slice | None = None) -> pa.Table:
    """Rows of shifts.csv as a table, read from the very lines that the file gets.

    people : a stretch of consecutive rows of the people table; default everybody
    """
    lines = ShiftLines(review)
    parts = [lines.of(stretch) for stretch in (lines.stretches if people is None else [people])]
    whole = HEADER + b"".join(parts)
    options = pyarrow.csv.ConvertOptions(column_types=SCHEMA, strings_can_be_null=True, null_values=[""])
    parsing = pyarrow.csv.ParseOptions(newlines_in_values=True)
    reading = pyarrow.csv.ReadOptions(block_size=len(whole) + 1)
    return pyarrow.csv.read_csv(io.BytesIO(whole), reading, parsing, options)
