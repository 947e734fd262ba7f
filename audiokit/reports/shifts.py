"""The shifts table: one row per criterion, compared test and ear, with the arithmetic in words."""

from dataclasses import dataclass

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from audiokit.core.vocabulary import EARS, Bound, Met
from audiokit.measures.shifts import bound_of
from audiokit.measures.sums import MISSING, OPEN, Sums
from audiokit.reports.wording import (
    cell_index,
    cell_texts,
    choose,
    date_texts,
    join,
    lookup,
    quotient_text,
)
from audiokit.rules.spec import Criterion, tenths
from audiokit.surveillance.review import BookReview, Review

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


@dataclass(frozen=True)
class Rows:
    """Tests and ears for which one criterion's numbers are wanted. [row]"""

    test: NDArray[np.int32]
    ear: NDArray[np.int64]


@dataclass(frozen=True)
class Numbers:
    """One criterion's exact numbers for some rows; dB values are numerators over ten times the frequency count.

    shift : difference of the sums as measured      correction : difference of the age table's sums, dB × count
    bound : codes of `Bound`      met : codes of `Met`      base : the baseline's index
    """

    base: NDArray[np.int32]
    shift: NDArray[np.int32]
    correction: NDArray[np.int32]
    bound: NDArray[np.int8]
    met: NDArray[np.int8]
    count: int

    def value(self) -> NDArray[np.int32]:
        """The shift less its correction."""
        return self.shift - 10 * self.correction

    def db(self, numerator: NDArray[np.integer]) -> NDArray[np.float64]:
        """Numerators as dB with at most four decimals."""
        return np.rint(numerator * (1000 / self.count)) / 10000


def numbers_of(book: BookReview, criterion_id: str, rows: Rows) -> Numbers:
    """A criterion's numbers for some rows, from the findings that every other file is made of."""
    found, sums = book.findings[criterion_id], book.sums[criterion_id]
    base = found.trail.base[rows.ear, rows.test]
    shift = sums.total[rows.ear, rows.test].astype(np.int32) - sums.total[rows.ear, base]
    ages = book.ages.get(criterion_id)
    correction = np.zeros(len(base), dtype=np.int32)
    if ages is not None:
        correction = ages.value[rows.test].astype(np.int32) - ages.value[base]
    bound = bound_of(sums.flags[rows.ear, rows.test], sums.flags[rows.ear, base])
    return Numbers(base, shift, correction, bound, found.trail.met[rows.ear, rows.test], sums.count)


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
        names = review.grid.test_id.take(pa.array(at))
        rank = np.empty(len(at), dtype=np.int64)
        rank[pa.compute.sort_indices(names).to_numpy()] = np.arange(len(at))
        order[at] = at[np.lexsort((rank, day[at], person[at]))]
    return order


def shifts_table(review: Review, tests: NDArray[np.integer] | None = None) -> pa.Table:
    """Rows of shifts.csv.

    tests : which tests, in the order wanted; default: every compared test in the order of the file
    """
    if tests is None:
        tests = output_order(review)
    tests = tests[~review.history.before[tests]].astype(np.int32)
    criteria = sorted(((name, book) for book in review.books for name in book.findings), key=lambda pair: pair[0])
    test = np.repeat(tests, 2)
    rows = Rows(test, np.tile(np.array([0, 1]), len(tests)))
    parts = [_criterion_rows(review, book, name, rows) for name, book in criteria]
    if len(parts) == 1:
        return parts[0]
    places = np.arange(len(parts) * len(test)).reshape(len(parts), len(test)).T.reshape(-1)
    return pa.concat_tables(parts).take(pa.array(places))


def _criterion_rows(review: Review, book: BookReview, name: str, rows: Rows) -> pa.Table:
    numbers = numbers_of(book, name, rows)
    no_value = numbers.bound == Bound.NONE
    at = pa.array(rows.test)
    return pa.table(
        [
            review.cohort.people.person_id.take(pa.array(review.grid.person[rows.test])),
            review.grid.test_id.take(at),
            date_texts(review.grid.day[rows.test]),
            choose(EARS, rows.ear),
            pa.repeat(pa.scalar(name), len(rows.test)),
            review.grid.test_id.take(pa.array(numbers.base)),
            pa.array(numbers.db(numbers.shift), mask=no_value),
            pa.array(numbers.db(10 * numbers.correction)),
            pa.array(numbers.db(numbers.value()), mask=no_value),
            choose(BOUND_TEXTS, numbers.bound),
            choose(MET_TEXTS, numbers.met),
            shift_words(review, book, name, rows, numbers),
        ],
        schema=SCHEMA,
    )


def shift_words(review: Review, book: BookReview, name: str, rows: Rows, numbers: Numbers) -> pa.Array:
    """The arithmetic of each row in one line, clause named."""
    criterion, sums = book.findings[name].criterion, book.sums[name]
    count = sums.count
    pieces = [
        f"{criterion.shift_at_least_db.at}: sum at {'+'.join(map(str, criterion.frequencies_hz.value))} Hz ",
        sum_words(review, criterion, sums, rows),
        " less baseline ",
        review.grid.test_id.take(pa.array(numbers.base)),
        " of ",
        date_texts(review.grid.day[numbers.base]),
        " ",
        sum_words(review, criterion, sums, Rows(numbers.base, rows.ear)),
    ]
    if name in book.ages:
        pieces.append(_shift_words(numbers, count))
        pieces.append(_age_words(review, book, name, rows, numbers))
    pieces.append(_verdict_words(criterion, numbers, name in book.ages))
    if criterion.level_at_least_db is not None:
        pieces.append(_level_words(criterion, sums, rows, numbers))
    return join(*pieces)


def sum_words(review: Review, criterion: Criterion, sums: Sums, rows: Rows) -> pa.Array:
    """The thresholds of each row and their sum: "25+30+35=90"; open and missing sums say so."""
    grid = review.grid
    pieces: list[pa.Array | str] = []
    for hz in criterion.frequencies_hz.value:
        if hz in grid.frequencies_hz:
            at = grid.frequencies_hz.index(hz)
            index = cell_index(grid.threshold[rows.ear, at, rows.test], grid.response[rows.ear, at, rows.test])
            pieces += ["+", cell_texts(hz).take(pa.array(index))]
        else:
            pieces += ["+", f"{hz} Hz not recorded"]
    flags = sums.flags[rows.ear, rows.test]
    signed = sums.total[rows.ear, rows.test].astype(np.int32)
    code = signed * 4 + np.minimum(flags, MISSING)
    return join(*pieces[1:], lookup(_sum_text, code))


def _sum_text(code: int) -> str:
    total, flags = divmod(code, 4)
    if flags >= MISSING:
        return ": no sum"
    return f"{'>=' if flags == OPEN else '='}{quotient_text(total, 10, 1)}"


_SIGNS = {Bound.EXACT: "=", Bound.AT_LEAST: ">=", Bound.AT_MOST: "<="}


def _shift_words(numbers: Numbers, count: int) -> pa.Array:
    def text(code: int) -> str:
        shift, bound = divmod(code, 4)
        if bound == Bound.NONE:
            return "; mean shift not computable"
        mean = f"{_SIGNS[Bound(bound)]} {quotient_text(shift, 10 * count)} dB"
        return f"; mean shift {quotient_text(shift, 10, 1)}/{count} {mean}"

    return lookup(text, numbers.shift * 4 + numbers.bound)


def _age_words(review: Review, book: BookReview, name: str, rows: Rows, numbers: Numbers) -> pa.Array:
    ages = book.ages[name]
    table = book.findings[name].criterion.age_table
    clause = table.at if table is not None else ""

    def text(code: int) -> str:
        then, now = divmod(code, 256)
        return f"; age correction for {now} less {then} years ({clause}) "

    def amount(correction: int) -> str:
        return f"{correction}/{numbers.count} = {quotient_text(correction, numbers.count)} dB"

    known = ages.known[rows.test]
    code = np.where(known, ages.age[numbers.base].astype(np.int32) * 256 + ages.age[rows.test], 0)
    told = join(lookup(text, code), lookup(amount, numbers.correction))
    return pa.compute.if_else(pa.array(known), told, pa.scalar("; no age correction: sex or birth not recorded"))


def _verdict_words(criterion: Criterion, numbers: Numbers, corrected: bool) -> pa.Array:
    limit, count = criterion.shift_at_least_db, numbers.count

    def text(code: int) -> str:
        rest, met = divmod(code, 4)
        value, bound = divmod(rest, 4)
        if bound == Bound.NONE:
            return f"{'' if corrected else '; mean shift not computable'}; at least {limit.value}? unknown"
        sign = _SIGNS[Bound(bound)]
        shown = f"{sign} {quotient_text(value, 10 * count)} dB"
        lead = "corrected shift" if corrected else f"mean shift {quotient_text(value, 10, 1)}/{count}"
        compare = {Met.YES: f"at least {limit.value}: yes", Met.NO: f"below {limit.value}: no"}
        return f"; {lead} {shown}, {compare.get(Met(met), f'at least {limit.value}? unknown')}"

    value = numbers.value()
    reached = value >= tenths(limit, count)
    yes = reached & ((numbers.bound == Bound.EXACT) | (numbers.bound == Bound.AT_LEAST))
    no = ~reached & ((numbers.bound == Bound.EXACT) | (numbers.bound == Bound.AT_MOST))
    met = np.where(
        yes, Met.YES, np.where(no, Met.NO, Met.UNKNOWN)
    )  # of the shift alone; the criterion may ask for more
    return lookup(text, (value * 4 + numbers.bound) * 4 + met)


def _level_words(criterion: Criterion, sums: Sums, rows: Rows, numbers: Numbers) -> pa.Array:
    level = criterion.level_at_least_db
    assert level is not None
    limit = tenths(level, sums.count)

    def text(code: int) -> str:
        total, flags = divmod(code, 4)
        if flags >= MISSING:
            return f"; mean level not computable, at least {level.value} ({level.at})? unknown"
        open_ = flags == OPEN
        answer = "yes" if total >= limit else "unknown" if open_ else "no"
        mean = quotient_text(total, 10 * sums.count)
        summed = quotient_text(total, 10, 1)
        sign = ">=" if open_ else "="
        return f"; mean level {summed}/{sums.count} {sign} {mean} dB, at least {level.value} ({level.at})? {answer}"

    signed = sums.total[rows.ear, rows.test].astype(np.int32)
    code = signed * 4 + np.minimum(sums.flags[rows.ear, rows.test], MISSING)
    return join(lookup(text, code), choose(("; both: no", "; both: unknown", "; both: yes"), numbers.met))
