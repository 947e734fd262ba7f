"""Events, baselines and quality as tables, made from the findings when they are written or shown."""

import numpy as np
import pandas as pd
import pyarrow as pa

from audiokit.core.dates import NO_DATE
from audiokit.core.vocabulary import EARS
from audiokit.measures.sums import MISSING
from audiokit.reports.numbers import Rows, numbers_of, quotient_text
from audiokit.reports.shifts import output_order
from audiokit.reports.text_rows import blank_where, choose, date_texts, lookup, side_by_side
from audiokit.surveillance.baselines import PROPOSED, STATUSES
from audiokit.surveillance.events import FOUND_AT_RETEST, NO_RETEST, NOT_CONFIRMED, OUTCOMES, RETEST_OPEN
from audiokit.surveillance.ordering import order_by
from audiokit.surveillance.review import BookReview, Review
from audiokit.surveillance.revision import REASONS
from audiokit.surveillance.worklist import deadlines

EVENT_COLUMNS = (
    "person_id", "test_id", "tested_on", "ear", "criterion", "outcome", "deciding_test_id", "value_db", "mean_hl_db",
    "recordable", "retest_by", "notify_by", "record_by", "why",
)  # fmt: skip
BASELINE_COLUMNS = ("person_id", "ear", "test_id", "in_force_from", "in_force_until", "reason", "status", "why")


def events_table(review: Review) -> pa.Table:
    """Rows of events.csv: one per criterion, test and ear that met it."""
    named = [(book, name) for book in review.books for name in book.findings]
    if not named:
        return pa.table({name: pa.array([], type=pa.string()) for name in EVENT_COLUMNS})
    place = np.empty(len(review.grid), dtype=np.int64)
    place[output_order(review)] = np.arange(len(review.grid))
    events = [book.events[name] for book, name in named]
    ranks = {name: rank for rank, name in enumerate(sorted(name for _, name in named))}
    rank = np.repeat([ranks[name] for _, name in named], [len(found.test) for found in events])
    test, ear = (np.concatenate([getattr(found, key) for found in events]) for key in ("test", "ear"))
    table = pa.concat_tables([_events_of(review, book, name) for book, name in named])
    return table.take(pa.array(np.lexsort((rank, ear, place[test]))))


def _events_of(review: Review, book: BookReview, name: str) -> pa.Table:
    events, criterion = book.events[name], book.findings[name].criterion
    day = review.grid.day
    window = criterion.retest_window_days.value
    numbers = numbers_of(book, name, Rows(events.deciding, events.ear.astype(np.int64)))
    sums = book.sums[name]
    level = sums.total[events.ear, events.deciding].astype(np.int64)
    no_level = sums.flags[events.ear, events.deciding] >= MISSING
    notice, asks_notice = deadlines(review, book, name, "notify")
    entry, asks_entry = deadlines(review, book, name, "record")
    columns = [
        review.cohort.people.person_id.take(pa.array(review.grid.person[events.test])),
        review.grid.test_id.take(pa.array(events.test)),
        date_texts(day[events.test]),
        choose(EARS, events.ear),
        pa.repeat(pa.scalar(name), len(events.test)),
        choose(OUTCOMES, events.outcome),
        review.grid.test_id.take(pa.array(events.deciding)),
        pa.array(numbers.db(numbers.value()), mask=numbers.bound == 3),
        pa.array(numbers.db(level), mask=no_level),
        blank_where(~asks_entry, pa.repeat(pa.scalar("yes"), len(asks_entry))),
        blank_where(events.outcome != RETEST_OPEN, date_texts(day[events.test] + np.int32(window))),
        blank_where(~asks_notice, date_texts(notice)),
        blank_where(~asks_entry, date_texts(entry)),
        _event_words(review, book, name),
    ]
    return pa.table(columns, names=list(EVENT_COLUMNS))


_OUTCOME_WORDS = {
    RETEST_OPEN: "; no deciding retest yet, the window is open",
    NO_RETEST: "; no deciding retest in the window: the shift stands",
}


def _event_words(review: Review, book: BookReview, name: str) -> pa.Array:
    """What the retest said of each event, clause named."""
    events, criterion = book.events[name], book.findings[name].criterion
    day, window = review.grid.day, criterion.retest_window_days
    days_after = day[events.deciding] - day[events.slot]
    found = events.outcome == FOUND_AT_RETEST
    first = side_by_side(
        [
            f"{criterion.shift_at_least_db.at}: ",
            pa.compute.if_else(pa.array(found), pa.scalar("not met"), pa.scalar("met")),
            " at test ",
            review.grid.test_id.take(pa.array(events.slot)),
            " of ",
            date_texts(day[events.slot]),
        ]
    )
    said = {NOT_CONFIRMED: ": not met there, not confirmed", FOUND_AT_RETEST: ": met there, found at the retest"}
    verdicts = [said.get(code, ": met there, confirmed") for code in range(len(OUTCOMES))]
    retest = side_by_side(
        [
            "; deciding retest ",
            review.grid.test_id.take(pa.array(events.deciding)),
            lookup(lambda days: f" on day {days} of {window.value} ({window.at})", days_after),
            choose(verdicts, events.outcome),
        ]
    )
    open_ = choose([_OUTCOME_WORDS.get(code, "") for code in range(len(OUTCOMES))], events.outcome)
    return side_by_side([first, pa.compute.if_else(pa.array(events.decided), retest, open_)])


def baselines_table(review: Review) -> pa.Table:
    """Rows of baselines.csv: the history of each ear's baseline by the revision criterion of each rulebook."""
    kept = [book.baselines for book in review.books]
    keys = ("person", "ear", "from_day", "test", "reason")
    person, ear, day, test, reason = (np.concatenate([getattr(entry, key) for entry in kept]) for key in keys)
    table = pa.concat_tables([_baselines_of(review, book) for book in review.books])
    texts = side_by_side([review.grid.test_id.take(pa.array(test)), "\t", choose(REASONS, reason)])
    return table.take(pa.array(order_by((person, ear, day), texts)))


def _baselines_of(review: Review, book: BookReview) -> pa.Table:
    kept = book.baselines
    open_ended = kept.until_day == NO_DATE
    columns = [
        review.cohort.people.person_id.take(pa.array(kept.person)),
        choose(EARS, kept.ear),
        review.grid.test_id.take(pa.array(kept.test)),
        date_texts(kept.from_day),
        blank_where(open_ended, date_texts(np.where(open_ended, np.int32(0), kept.until_day))),
        choose(REASONS, kept.reason),
        choose(STATUSES, kept.status),
        _baseline_words(review, book),
    ]
    return pa.table(columns, names=list(BASELINE_COLUMNS))


def _baseline_words(review: Review, book: BookReview) -> pa.Array:
    kept, revision = book.baselines, book.rulebook.revision
    criterion = book.findings[revision.criterion].criterion
    grid, sums = review.grid, book.sums[revision.criterion]
    better, persists = revision.improvement_at_least_db, revision.persistence_months
    lead = choose(
        [
            f"better by at least {better.value} dB on two consecutive tests ({better.at}), revealed by test ",
            f"shift met on tests at least {persists.value} months apart ({persists.at}), revealed by test ",
            f"a reviewer's decision ({criterion.baseline.at}) names test ",
            "earliest valid test with purpose baseline, else earliest valid test: ",
            "",
        ],
        kept.reason,
    )
    named = np.where(kept.found_at < 0, kept.test, kept.found_at)
    mean = lookup(
        lambda total: (
            f"; mean hearing threshold level {quotient_text(total, 10, 1)}/{sums.count} = "
            f"{quotient_text(total, 10 * sums.count)} dB"
        ),
        sums.total[kept.ear, kept.test],
    )
    known = sums.flags[kept.ear, kept.test] == 0
    return side_by_side(
        [
            lead,
            grid.test_id.take(pa.array(named)),
            pa.compute.if_else(pa.array(known), mean.column(), pa.scalar("; no exact mean hearing threshold level")),
            pa.compute.if_else(
                pa.array(kept.status == PROPOSED), pa.scalar("; a licensed reviewer decides"), pa.scalar("")
            ),
        ]
    )


def to_frame(table: pa.Table) -> pd.DataFrame:
    """A table as a frame for display: empty cells as empty text, numbers as numbers."""
    frame = table.to_pandas()
    texts = frame.columns[[str(dtype) in ("object", "str", "string") for dtype in frame.dtypes]]
    frame[texts] = frame[texts].fillna("")
    return frame
