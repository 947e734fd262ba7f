"""The shifts table: one row per criterion, compared test and ear, with the arithmetic in words."""

import io

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
import pyarrow.csv
from numpy.typing import NDArray

from audiokit.core.vocabulary import EARS, Bound
from audiokit.reports.explain import shift_words, sum_words, test_names
from audiokit.reports.numbers import Numbers, Rows, numbers_of, quotient_text
from audiokit.reports.text_rows import Piece, Row, content, csv_field, date_texts, lookup, side_by_side, texts
from audiokit.surveillance.block import stretches
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
    day, person = review.grid.day, review.grid.person
    order = np.arange(len(day))
    same = (day[1:] == day[:-1]) & (person[1:] == person[:-1])
    tied = np.zeros(len(day), dtype=bool)
    tied[1:] |= same
    tied[:-1] |= same
    at = np.flatnonzero(tied)
    if len(at):
        rank = np.empty(len(at), dtype=np.int64)
        rank[pc.sort_indices(review.grid.test_id.take(pa.array(at))).to_numpy()] = np.arange(len(at))
        order[at] = at[np.lexsort((rank, day[at], person[at]))]
    return order


def shift_blocks(review: Review) -> list[slice]:
    """Stretches of consecutive people whose rows are made together."""
    return stretches(review.history.first, BLOCK_TESTS)


def shift_lines(review: Review, order: NDArray[np.integer], people: slice) -> memoryview:
    """The lines of shifts.csv of a stretch of people, without the header, as UTF-8 bytes.

    order : `output_order` of the review
    """
    tests = slice(int(review.history.first[people.start]), int(review.history.first[people.stop]))
    compared = order[tests]
    compared = compared[~review.history.before[compared]].astype(np.int32)
    rows = Rows(np.repeat(compared, 2), np.tile(np.array([0, 1]), len(compared)))
    criteria = sorted(((name, book) for book in review.books for name in book.findings), key=lambda pair: pair[0])
    stretch = _Stretch(review, tests)
    line: list[Piece | str] = []
    for name, book in criteria:
        line += stretch.line(book, name, rows)
    return content(side_by_side(line))


class _Stretch:
    """The texts that all lines of a stretch of tests share, each made once per test."""

    def __init__(self, review: Review, tests: slice) -> None:
        grid = review.grid
        identifiers = Piece(csv_field(grid.test_id[tests]))
        persons = Piece(csv_field(review.cohort.people.person_id.take(pa.array(grid.person[tests]))))
        dates = Piece(date_texts(grid.day[tests]))
        self.review, self.tests = review, tests
        self.heads = Piece(side_by_side([persons, ",", identifiers, ",", dates, ","]))
        self.references = Piece(side_by_side([identifiers, ","]))
        self.names = test_names(review, tests)
        self.sums: dict[tuple[int, ...], Piece] = {}

    def line(self, book: BookReview, name: str, rows: Rows) -> Row:
        """The pieces of one criterion's lines."""
        criterion = book.findings[name].criterion
        numbers = numbers_of(book, name, rows)
        frequencies = tuple(criterion.frequencies_hz.value)
        if frequencies not in self.sums:
            self.sums[frequencies] = sum_words(self.review, criterion, book.sums[name], self.tests)
        return [
            self.heads.take(rows.test - self.tests.start),
            Piece(texts([f"{ear},{name}," for ear in EARS]), rows.ear),
            self.references.take(numbers.base - self.tests.start),
            *_number_fields(numbers),
            '"',
            *shift_words(book, name, rows, numbers, self.names, self.sums[frequencies], self.tests),
            '"\n',
        ]


def _number_fields(numbers: Numbers) -> list[Piece]:
    count = numbers.count

    def db(code: int) -> str:
        value, bound = divmod(code, 4)
        return "," if bound == Bound.NONE else f"{quotient_text(value, 10 * count)},"

    bounds = [f"{bound},{met}," for bound in BOUND_TEXTS for met in MET_TEXTS]
    return [
        lookup(db, numbers.shift * 4 + numbers.bound),
        lookup(lambda correction: f"{quotient_text(correction, count)},", numbers.correction),
        lookup(db, numbers.value() * 4 + numbers.bound),
        Piece(texts(bounds), numbers.bound * np.int8(len(MET_TEXTS)) + numbers.met),
    ]


def shifts_table(review: Review, people: slice | None = None) -> pa.Table:
    """Rows of shifts.csv as a table, read from the very lines that the file gets.

    people : a stretch of consecutive rows of the people table; default everybody
    """
    order = output_order(review)
    blocks = shift_blocks(review) if people is None else [people]
    lines = HEADER + b"".join(shift_lines(review, order, block) for block in blocks)
    options = pyarrow.csv.ConvertOptions(column_types=SCHEMA, strings_can_be_null=True)
    parsing = pyarrow.csv.ParseOptions(newlines_in_values=True)
    reading = pyarrow.csv.ReadOptions(block_size=len(lines) + 1)
    return pyarrow.csv.read_csv(io.BytesIO(lines), reading, parsing, options)
