"""The arithmetic of a shift in words: from the thresholds to the verdict, with the clauses."""

from collections.abc import Callable
from functools import cache

import numpy as np

from audiokit.core.vocabulary import Bound, Met, Response
from audiokit.measures.sums import MISSING, OPEN, Sums
from audiokit.reports.numbers import Numbers, Rows, quotient_text, tenths_text
from audiokit.reports.text_rows import Piece, Row, date_texts, inside_quotes, lookup, side_by_side
from audiokit.rules.spec import Criterion, tenths
from audiokit.surveillance.review import BookReview, Review

_SIGNS = {Bound.EXACT: "=", Bound.AT_LEAST: ">=", Bound.AT_MOST: "<="}
_STATES = {
    Response.DID_NOT_TEST: "did not test",
    Response.COULD_NOT_TEST: "could not test",
    Response.NOT_RECORDED: "not recorded",
}

_NO_CORRECTION = -1000

Words = Callable[[int], str]


class Explainer:
    """Makes one criterion's `why`; each wording is made once per distinct value over all stretches."""

    def __init__(self, book: BookReview, name: str) -> None:
        self.criterion: Criterion = book.findings[name].criterion
        self.sums: Sums = book.sums[name]
        self.ages = book.ages.get(name)
        count = self.sums.count
        self._mean = cache(_mean_words(count))
        self._years = cache(_years_words(self.criterion))
        self._amount = cache(_amount_words(count))
        self._verdict = cache(_verdict_words(self.criterion, count, self.ages is not None))
        self._level = cache(_level_words(self.criterion, count))
        limit = self.criterion.shift_at_least_db
        frequencies = "+".join(map(str, self.criterion.frequencies_hz.value))
        self.opening = f"{limit.at}: sum at {frequencies} Hz "

    def pieces(self, rows: Rows, numbers: Numbers, names: Piece, sums: Piece, tests: slice) -> list[Piece]:
        """What follows `opening`, piece by piece.

        names, sums : `baseline_names` and `sum_words` of every test of the stretch      tests : the stretch
        """
        stretch = tests.stop - tests.start
        made = [
            sums.take(rows.ear * stretch + (rows.test - tests.start)),
            names.take(numbers.base - tests.start),
            sums.take(rows.ear * stretch + (numbers.base - tests.start)),
        ]
        if self.ages is not None:
            known = self.ages.known[rows.test]
            years = self.ages.age[numbers.base].astype(np.int32) * 256 + self.ages.age[rows.test]
            made.append(lookup(self._mean, numbers.shift * 4 + numbers.bound))
            made.append(lookup(self._years, np.where(known, years, -1)))
            made.append(lookup(self._amount, np.where(known, numbers.correction, _NO_CORRECTION)))
        made.append(lookup(self._verdict, numbers.value() * 4 + numbers.bound))
        if self.criterion.level_at_least_db is not None:
            total = self.sums.total[rows.ear, rows.test].astype(np.int32)
            flags = np.minimum(self.sums.flags[rows.ear, rows.test], MISSING)
            made.append(lookup(self._level, (total * 4 + flags) * 4 + numbers.met))
        return made


def sum_words(review: Review, criterion: Criterion, sums: Sums, tests: slice) -> Piece:
    """The thresholds of every test of a stretch and their sum: "25+30+35=90"; open and missing sums say so.

    One row per test of the right ear, then of the left.
    """
    grid = review.grid
    pieces: list[Piece | str] = []
    for position, hz in enumerate(criterion.frequencies_hz.value):
        plus = "+" if position else ""
        if hz in grid.frequencies_hz:
            at = grid.frequencies_hz.index(hz)
            level = grid.threshold[:, at, tests].reshape(-1).astype(np.int32)
            response = grid.response[:, at, tests].reshape(-1)
            measured = response <= Response.NO_RESPONSE
            pieces.append(lookup(_cell_words(hz, plus), np.where(measured, level, 0) * 8 + response))
        else:
            pieces.append(f"{plus}{hz} Hz not recorded")
    total = sums.total[:, tests].reshape(-1).astype(np.int32)
    pieces.append(lookup(_sum_text, total * 4 + np.minimum(sums.flags[:, tests].reshape(-1), MISSING)))
    return Piece(side_by_side(pieces))


@cache
def _cell_words(hz: int, plus: str) -> Words:
    @cache
    def text(code: int) -> str:
        level, response = divmod(code, 8)
        if response in _STATES:
            return f"{plus}{hz} Hz {_STATES[Response(response)]}"
        return f"{plus}{'' if response == Response.MEASURED else 'NR@'}{tenths_text(level)}"

    return text


@cache
def _sum_text(code: int) -> str:
    total, flags = divmod(code, 4)
    if flags >= MISSING:
        return ": no sum"
    return f"{'>=' if flags == OPEN else '='}{tenths_text(total)}"


def baseline_names(review: Review, tests: slice) -> Piece:
    """How every test of a stretch is named as a baseline, as it stands inside quotes."""
    dates = date_texts(review.grid.day[tests])
    named: Row = [" less baseline ", inside_quotes(review.grid.test_id[tests]), " of ", dates, " "]
    return Piece(side_by_side(named))


def _mean_words(count: int) -> Words:
    def text(code: int) -> str:
        shift, bound = divmod(code, 4)
        if bound == Bound.NONE:
            return "; mean shift not computable"
        mean = f"{_SIGNS[Bound(bound)]} {quotient_text(shift, 10 * count)} dB"
        return f"; mean shift {tenths_text(shift)}/{count} {mean}"

    return text


def _years_words(criterion: Criterion) -> Words:
    clause = criterion.age_table.at if criterion.age_table is not None else ""

    def text(code: int) -> str:
        if code < 0:
            return "; no age correction (sex or birth not recorded)"
        then, now = divmod(code, 256)
        return f"; age correction for {now} less {then} years ({clause}) "

    return text


def _amount_words(count: int) -> Words:
    def text(correction: int) -> str:
        if correction == _NO_CORRECTION:
            return ""
        return f"{correction}/{count} = {quotient_text(correction, count)} dB"

    return text


def _verdict_words(criterion: Criterion, count: int, corrected: bool) -> Words:
    limit = criterion.shift_at_least_db
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

    return text


def _level_words(criterion: Criterion, count: int) -> Words:
    level = criterion.level_at_least_db
    if level is None:
        return lambda code: ""
    limit = tenths(level, count)

    def text(code: int) -> str:
        rest, met = divmod(code, 4)
        total, flags = divmod(rest, 4)
        asked = f"at least {level.value} ({level.at})?"
        both = f"; both: {('no', 'unknown', 'yes')[met]}"
        if flags >= MISSING:
            return f"; mean level not computable, {asked} unknown{both}"
        open_ = flags == OPEN
        answer = "yes" if total >= limit else "unknown" if open_ else "no"
        mean = f"{'>=' if open_ else '='} {quotient_text(total, 10 * count)} dB"
        return f"; mean level {tenths_text(total)}/{count} {mean}, {asked} {answer}{both}"

    return text
