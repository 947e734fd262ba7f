"""The arithmetic of a shift in words: from the thresholds to the verdict, with the clauses."""

from collections.abc import Callable

import numpy as np

from audiokit.core.vocabulary import Bound, Met, Response
from audiokit.measures.sums import MISSING, OPEN, Sums
from audiokit.reports.numbers import Numbers, Rows, quotient_text, tenths_text
from audiokit.reports.text_rows import Piece, Row, date_texts, inside_quotes, lookup, side_by_side, texts
from audiokit.rules.spec import Criterion, tenths
from audiokit.surveillance.review import BookReview, Review

_SIGNS = {Bound.EXACT: "=", Bound.AT_LEAST: ">=", Bound.AT_MOST: "<="}
_STATES = {
    Response.DID_NOT_TEST: "did not test",
    Response.COULD_NOT_TEST: "could not test",
    Response.NOT_RECORDED: "not recorded",
}


def shift_words(
    book: BookReview, name: str, rows: Rows, numbers: Numbers, names: Piece, sums: Piece, tests: slice
) -> Row:
    """The pieces of one criterion's `why`.

    names, sums : `test_names` and `sum_words` of every test of the stretch      tests : the stretch
    """
    criterion = book.findings[name].criterion
    stretch = tests.stop - tests.start
    now = rows.ear * stretch + (rows.test - tests.start)
    base = rows.ear * stretch + (numbers.base - tests.start)
    pieces: list[Piece | str] = [
        f"{criterion.shift_at_least_db.at}: sum at {'+'.join(map(str, criterion.frequencies_hz.value))} Hz ",
        sums.take(now),
        " less baseline ",
        names.take(numbers.base - tests.start),
        sums.take(base),
    ]
    corrected = name in book.ages
    if corrected:
        pieces.append(_mean_words(numbers))
        pieces += _age_words(book, name, rows, numbers)
    pieces.append(_verdict_words(criterion, numbers, corrected))
    if criterion.level_at_least_db is not None:
        pieces.append(_level_words(criterion, book.sums[name], rows))
        pieces.append(Piece(texts(["; both: no", "; both: unknown", "; both: yes"]), numbers.met))
    return pieces


def sum_words(review: Review, criterion: Criterion, sums: Sums, tests: slice) -> Piece:
    """The thresholds of every test of a stretch and their sum: "25+30+35=90"; open and missing sums say so.

    One row per test of the right ear, then of the left.
    """
    grid = review.grid
    pieces: list[Piece | str] = []
    for hz in criterion.frequencies_hz.value:
        pieces.append("+")
        if hz in grid.frequencies_hz:
            at = grid.frequencies_hz.index(hz)
            level = grid.threshold[:, at, tests].reshape(-1).astype(np.int32)
            response = grid.response[:, at, tests].reshape(-1)
            pieces.append(lookup(_cell_text(hz), np.where(response <= 1, level, 0) * 8 + response))
        else:
            pieces.append(f"{hz} Hz not recorded")
    total = sums.total[:, tests].reshape(-1).astype(np.int32)
    pieces.append(lookup(_sum_text, total * 4 + np.minimum(sums.flags[:, tests].reshape(-1), MISSING)))
    return Piece(side_by_side(pieces[1:]))


def _cell_text(hz: int) -> Callable[[int], str]:
    def text(code: int) -> str:
        level, response = divmod(code, 8)
        if response in _STATES:
            return f"{hz} Hz {_STATES[Response(response)]}"
        return tenths_text(level) if response == Response.MEASURED else f"NR@{tenths_text(level)}"

    return text


def _sum_text(code: int) -> str:
    total, flags = divmod(code, 4)
    if flags >= MISSING:
        return ": no sum"
    return f"{'>=' if flags == OPEN else '='}{tenths_text(total)}"


def test_names(review: Review, tests: slice) -> Piece:
    """Identifier and date of every test of a stretch, as they stand inside quotes."""
    dates = date_texts(review.grid.day[tests])
    return Piece(side_by_side([Piece(inside_quotes(review.grid.test_id[tests])), " of ", Piece(dates), " "]))


def _mean_words(numbers: Numbers) -> Piece:
    def text(code: int) -> str:
        shift, bound = divmod(code, 4)
        if bound == Bound.NONE:
            return "; mean shift not computable"
        mean = f"{_SIGNS[Bound(bound)]} {quotient_text(shift, 10 * numbers.count)} dB"
        return f"; mean shift {tenths_text(shift)}/{numbers.count} {mean}"

    return lookup(text, numbers.shift * 4 + numbers.bound)


def _age_words(book: BookReview, name: str, rows: Rows, numbers: Numbers) -> list[Piece | str]:
    ages = book.ages[name]
    table = book.findings[name].criterion.age_table
    clause = table.at if table is not None else ""

    def years(code: int) -> str:
        if code < 0:
            return "; no age correction (sex or birth not recorded)"
        then, now = divmod(code, 256)
        return f"; age correction for {now} less {then} years ({clause}) "

    def amount(correction: int) -> str:
        return f"{correction}/{numbers.count} = {quotient_text(correction, numbers.count)} dB"

    known = ages.known[rows.test]
    code = np.where(known, ages.age[numbers.base].astype(np.int32) * 256 + ages.age[rows.test], -1)
    return [lookup(years, code), lookup(amount, numbers.correction)]


def _verdict_words(criterion: Criterion, numbers: Numbers, corrected: bool) -> Piece:
    limit, count = criterion.shift_at_least_db, numbers.count
    exact = tenths(limit, count)

    def text(code: int) -> str:
        value, bound = divmod(code, 4)
        if bound == Bound.NONE:
            return f"{'' if corrected else '; mean shift not computable'}; at least {limit.value}? unknown"
        met = Met.UNKNOWN
        if value >= exact and bound != Bound.AT_MOST:
            met = Met.YES
        elif value < exact and bound != Bound.AT_LEAST:
            met = Met.NO
        shown = f"{_SIGNS[Bound(bound)]} {quotient_text(value, 10 * count)} dB"
        lead = "corrected shift" if corrected else f"mean shift {tenths_text(value)}/{count}"
        compare = {Met.YES: f"at least {limit.value}: yes", Met.NO: f"below {limit.value}: no"}
        return f"; {lead} {shown}, {compare.get(met, f'at least {limit.value}? unknown')}"

    return lookup(text, numbers.value() * 4 + numbers.bound)


def _level_words(criterion: Criterion, sums: Sums, rows: Rows) -> Piece:
    level = criterion.level_at_least_db
    assert level is not None
    limit = tenths(level, sums.count)

    def text(code: int) -> str:
        total, flags = divmod(code, 4)
        if flags >= MISSING:
            return f"; mean level not computable, at least {level.value} ({level.at})? unknown"
        open_ = flags == OPEN
        answer = "yes" if total >= limit else "unknown" if open_ else "no"
        mean = f"{'>=' if open_ else '='} {quotient_text(total, 10 * sums.count)} dB"
        return f"; mean level {tenths_text(total)}/{sums.count} {mean}, at least {level.value} ({level.at})? {answer}"

    total = sums.total[rows.ear, rows.test].astype(np.int32)
    return lookup(text, total * 4 + np.minimum(sums.flags[rows.ear, rows.test], MISSING))
