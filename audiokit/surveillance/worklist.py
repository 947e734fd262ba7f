"""Who needs what by when: one line per person, test, ear and action, soonest first."""

from dataclasses import dataclass, field

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import ArrayLike, NDArray

from audiokit.core.dates import NO_DATE, add_months
from audiokit.core.vocabulary import EARS, Met
from audiokit.rules.spec import Rulebook
from audiokit.surveillance.baselines import IN_FORCE, PROPOSED
from audiokit.surveillance.decided import named_ear_tests
from audiokit.surveillance.events import RETEST_OPEN
from audiokit.surveillance.review import BookReview, Review
from audiokit.surveillance.revision import REASONS

COLUMNS = ("due_on", "overdue", "action", "person_id", "ear", "test_id", "criterion", "why")

_CLOSED_BY = {"notify": ("notice_given",), "record": ("entry_made", "not_work_related")}
"""The decisions that take a line off the list, by action."""

ACTIONS = ("annual_test", "baseline_test", "notify", "record", "retest", "review_baseline", "review_test")

_NO_EAR = 2


@dataclass
class _Lines:
    """Columns under construction, all whole numbers; texts are kept once and named by their position."""

    parts: list[dict[str, NDArray[np.int32]]] = field(default_factory=list)
    criteria: list[str] = field(default_factory=list)
    whys: list[str] = field(default_factory=list)

    def add(
        self,
        action: str,
        person: NDArray[np.integer],
        ear: ArrayLike,
        test: ArrayLike,
        due: ArrayLike,
        criterion: str,
        why: str,
    ) -> None:
        """Lines of one kind; `ear` and `test` may be _NO_EAR and -1 for all."""
        self.criteria.append(criterion)
        self.whys.append(why)
        kind = len(self.whys) - 1
        columns = {
            "due": due,
            "action": ACTIONS.index(action),
            "person": person,
            "ear": ear,
            "test": test,
            "kind": kind,
        }
        self.parts.append(
            {name: np.broadcast_to(np.asarray(column, dtype=np.int32), len(person)) for name, column in columns.items()}
        )

    def columns(self) -> dict[str, NDArray[np.int32]]:
        """All lines so far."""
        return {name: np.concatenate([part[name] for part in self.parts]) for name in self.parts[0]}


def worklist(review: Review) -> pd.DataFrame:
    """The worklist with the columns of worklist.csv, as text; dates ISO, blank where nothing is due.

    A person who has left is on it only for notices and records that became due before.
    """
    lines = _Lines()
    for book in review.books:
        _event_lines(review, book, lines)
        _review_lines(review, book, lines)
    _schedule_lines(review, review.books[0].rulebook, lines)
    columns = lines.columns()
    keep = _still_concerned(review, columns)
    columns = {name: column[keep] for name, column in columns.items()}
    soonest = np.where(columns["due"] == NO_DATE, np.iinfo(np.int32).max, columns["due"])
    order = np.lexsort(
        (columns["kind"], columns["test"], columns["ear"], columns["person"], columns["action"], soonest)
    )
    columns = {name: column[order] for name, column in columns.items()}
    return _one_line_each(_as_text(review, lines, columns), columns)


def _as_text(review: Review, lines: _Lines, columns: dict[str, NDArray[np.int32]]) -> pd.DataFrame:
    due, action = columns["due"], columns["action"]
    no_date = due == NO_DATE
    overdue = np.where(no_date, np.where(action == ACTIONS.index("baseline_test"), 2, 0), due < review.as_of_day)
    tests = pa.concat_arrays([review.grid.test_id, pa.array([""])])
    dates = pc.strftime(pa.array(np.where(no_date, 0, due)).cast(pa.date32()), format="%Y-%m-%d")
    table = pa.table(
        {
            "due_on": pc.if_else(pa.array(no_date), pa.scalar(""), dates),
            "overdue": pa.array(["no", "yes", "unknown"]).take(pa.array(overdue)),
            "action": pa.array(ACTIONS).take(pa.array(action)),
            "person_id": review.cohort.people.person_id.take(pa.array(columns["person"])),
            "ear": pa.array([*EARS, ""]).take(pa.array(columns["ear"])),
            "test_id": tests.take(pa.array(np.where(columns["test"] < 0, len(tests) - 1, columns["test"]))),
            "criterion": pa.array(lines.criteria, type=pa.string()).take(pa.array(columns["kind"])),
            "why": pa.array(lines.whys, type=pa.string()).take(pa.array(columns["kind"])),
        }
    )
    return table.to_pandas()


def _still_concerned(review: Review, columns: dict[str, NDArray[np.int32]]) -> NDArray[np.bool_]:
    left = review.cohort.people.left_day[columns["person"]]
    gone = (left != NO_DATE) & (left <= review.as_of_day)
    dated = np.isin(columns["action"], [ACTIONS.index("notify"), ACTIONS.index("record")])
    return ~gone | (dated & (columns["due"] < left))


def _one_line_each(table: pd.DataFrame, columns: dict[str, NDArray[np.int32]]) -> pd.DataFrame:
    """Two criteria that ask for the same action make one line that names both."""
    key = pd.DataFrame({name: columns[name] for name in ("action", "person", "test", "ear")})
    again = key.duplicated(keep="first").to_numpy()
    if not again.any():
        return table
    twice = key.duplicated(keep=False).to_numpy()
    both = table[twice].groupby(key[twice].apply(tuple, axis=1), sort=False)
    joined = both.agg({"criterion": ";".join, "why": " | ".join})
    table.loc[twice & ~again, ["criterion", "why"]] = joined.to_numpy()
    return table[~again].reset_index(drop=True)


def _event_lines(review: Review, book: BookReview, lines: _Lines) -> None:
    person_of, day = review.history.person, review.history.day
    for name, events in book.events.items():
        criterion = book.findings[name].criterion
        window = criterion.retest_window_days
        waiting = events.outcome == RETEST_OPEN
        deadline = day[events.test] + window.value
        why = f"{criterion.name}; retest within {window.value} days of the test ({window.at})"
        lines.add(
            "retest",
            person_of[events.test][waiting],
            events.ear[waiting],
            events.test[waiting],
            deadline[waiting],
            name,
            why,
        )
        for action, value in (("notify", criterion.notify_days), ("record", criterion.record_days_after_retest)):
            if value is None:
                continue
            due, asks = deadlines(review, book, name, action)
            open_ = asks.copy()
            for kind in _CLOSED_BY[action]:
                named = name if kind == "not_work_related" else None
                closing = named_ear_tests(review.cohort.decisions, kind, review.grid, review.cohort.people, named)
                open_ &= ~closing.holds(events.test, events.ear)
            why = {
                "notify": f"{criterion.name}: written notice within {value.value} days of determining it ({value.at})",
                "record": f"{criterion.name}: entry in the log if work-related ({value.at})",
            }[action]
            lines.add(
                action, person_of[events.test][open_], events.ear[open_], events.test[open_], due[open_], name, why
            )


def deadlines(
    review: Review, book: BookReview, criterion_id: str, action: str
) -> tuple[NDArray[np.int32], NDArray[np.bool_]]:
    """Day by which each event of a criterion asks for a notice or an entry in the log, and whether it asks for one.

    action : "notify" or "record"
    """
    events, criterion = book.events[criterion_id], book.findings[criterion_id].criterion
    day = review.history.day
    nothing = np.zeros(len(events.test), dtype=np.int32), np.zeros(len(events.test), dtype=bool)
    if action == "notify":
        if criterion.notify_days is None:
            return nothing
        asks = events.stands() | (events.outcome == RETEST_OPEN)
        return day[events.deciding] + np.int32(criterion.notify_days.value), asks
    if criterion.record_days_after_retest is None or criterion.record_days_without_retest is None:
        return nothing
    after_retest = day[events.deciding] + np.int32(criterion.record_days_after_retest.value)
    without = day[events.test] + np.int32(criterion.record_days_without_retest.value)
    return np.where(events.decided, after_retest, without), events.stands()


def _review_lines(review: Review, book: BookReview, lines: _Lines) -> None:
    name = book.rulebook.revision.criterion
    clause = book.findings[name].criterion.baseline.at
    kept = book.baselines
    waiting = np.flatnonzero(kept.status == PROPOSED)
    order = waiting[np.lexsort((kept.found_at[waiting], kept.ear[waiting], kept.person[waiting]))]
    key = kept.person[order].astype(np.int64) * 2 + kept.ear[order]
    latest = order[np.append(key[1:] != key[:-1], True)] if len(order) else order
    for code in np.unique(kept.reason[latest]):
        mine = latest[kept.reason[latest] == code]
        why = f"a licensed reviewer decides whether this test becomes the baseline: {REASONS[code]} ({clause})"
        lines.add("review_baseline", kept.person[mine], kept.ear[mine], kept.test[mine], NO_DATE, name, why)
    flags = book.sums[name].flags
    in_force = np.flatnonzero(kept.status == IN_FORCE)
    lacking = in_force[flags[kept.ear[in_force], kept.test[in_force]] >= 2]
    why = "the baseline in force lacks a threshold at one of the criterion's frequencies: no shift can be computed"
    lines.add("review_baseline", kept.person[lacking], kept.ear[lacking], kept.test[lacking], NO_DATE, name, why)
    _undecided_levels(review, book, lines)


def _undecided_levels(review: Review, book: BookReview, lines: _Lines) -> None:
    """Tests where another criterion is met but one that depends on it cannot be told."""
    for name, found in book.findings.items():
        for opener in found.criterion.retest_started_by.value:
            if opener == name:
                continue
            unclear = (found.trail.met == Met.UNKNOWN) & (book.findings[opener].trail.met == Met.YES)
            ear, test = np.nonzero(unclear)
            why = f"{opener} is met, but whether {name} is met cannot be told from this test"
            lines.add("review_test", review.history.person[test], ear, test.astype(np.int32), NO_DATE, name, why)


def latest_effective_tests(review: Review) -> tuple[NDArray[np.int64], NDArray[np.int32]]:
    """People with a test that takes part, and each one's latest periodic result: its deciding retest where there is
    one, the initial baseline where nothing came later."""
    book = review.books[0]
    trail = book.findings[book.rulebook.revision.criterion].trail
    people = np.flatnonzero(review.history.initial >= 0)
    slot = trail.owner[review.history.first[1:][people] - 1]
    decider = trail.decider[slot]
    return people, np.where(decider >= 0, decider, slot)


def _schedule_lines(review: Review, rulebook: Rulebook, lines: _Lines) -> None:
    schedule = rulebook.schedule
    people, test = latest_effective_tests(review)
    months = schedule.periodic_test_months
    due = add_months(review.history.day[test], months.value)
    why = f"periodic test {months.value} months after the latest one ({months.at})"
    lines.add("annual_test", people, _NO_EAR, test, due, "", why)
    without = np.flatnonzero(review.history.initial < 0)
    since = review.cohort.people.noise_since_day[without]
    known = since != NO_DATE
    months = schedule.baseline_test_months
    due = np.full(len(without), NO_DATE, dtype=np.int32)
    due[known] = add_months(since[known], months.value)
    for dated, said in (
        (known, f"baseline within {months.value} months of first exposure"),
        (~known, "the date of first exposure is not recorded, so no due date can be given"),
    ):
        why = f"no valid test yet; {said} ({months.at})"
        lines.add("baseline_test", without[dated], _NO_EAR, -1, due[dated], "", why)
