"""The yearly review: one cohort against its rulebooks, as known on a date."""

from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from audiokit.core.dates import to_days
from audiokit.measures.sums import Sums
from audiokit.model.cohort import Cohort
from audiokit.model.grid import ThresholdGrid
from audiokit.rules.catalogue import load_rulebook
from audiokit.rules.spec import Criterion, Rulebook
from audiokit.surveillance.ages import AgeCorrection
from audiokit.surveillance.baselines import BaselineHistory, baseline_history, unanswered
from audiokit.surveillance.block import History, history_of
from audiokit.surveillance.decided import DecisionEffect, baseline_decisions, invalidated_tests
from audiokit.surveillance.events import OUTCOMES, Events, find_events
from audiokit.surveillance.inputs import Inputs
from audiokit.surveillance.mechanics import Findings, Plan, run_mechanics
from audiokit.surveillance.revision import OtherFrequencies

TAKES_PART, AFTER_AS_OF, MARKED_INVALID, INVALIDATED_BY_DECISION = range(4)
LEFT_OUT = ("", "after_as_of", "marked_invalid", "invalidated_by_decision")

Progress = Callable[[str, int | None, int | None], None]


@dataclass(frozen=True)
class BookReview:
    """What one rulebook says: by criterion id its findings, sums, age corrections (where applied) and events."""

    rulebook: Rulebook
    findings: dict[str, Findings]
    sums: dict[str, Sums]
    ages: dict[str, AgeCorrection]
    events: dict[str, Events]
    baselines: BaselineHistory
    decisions: DecisionEffect


@dataclass(frozen=True)
class Review:
    """A review in arrays; tables are made from it by `audiokit.reports`.

    grid    : the tests that take part: valid, not invalidated, not after as_of; every index below counts in it
    history : their order      left_out_code : for each test of cohort.grid why it takes no part: position in LEFT_OUT
    invalidated_by : number of the decision that invalidates a test of cohort.grid, else 0
    """

    cohort: Cohort
    grid: ThresholdGrid
    history: History
    left_out_code: NDArray[np.int8]
    invalidated_by: NDArray[np.int64]
    books: tuple[BookReview, ...]

    @property
    def as_of_day(self) -> int:
        """Date of the review in days since 1970-01-01."""
        return to_days(self.cohort.settings.as_of)

    @cached_property
    def left_out(self) -> NDArray[np.object_]:
        """For each test of cohort.grid why it takes no part, as text; "" where it does."""
        return np.array(LEFT_OUT, dtype=object)[self.left_out_code]

    def tests_after_as_of(self) -> int:
        """How many accepted tests are dated after the review's date."""
        return int((self.cohort.grid.day > self.as_of_day).sum())

    @cached_property
    def worklist(self) -> pd.DataFrame:
        """Who needs what by when, with the columns of worklist.csv."""
        from audiokit.surveillance.worklist import worklist

        return worklist(self)

    def summary(self) -> dict[str, Any]:
        """Counts for a first look: people, tests, events by criterion and outcome, worklist by action."""
        events = {
            criterion: {name: int((found.outcome == code).sum()) for code, name in enumerate(OUTCOMES)}
            for book in self.books
            for criterion, found in book.events.items()
        }
        actions = {
            str(action): (len(group), int((group["overdue"] == "yes").sum()))
            for action, group in self.worklist.groupby("action", sort=True)
        }
        return {
            "people": len(self.cohort.people),
            "tests": len(self.grid),
            "tests_left_out": int((self.left_out_code != TAKES_PART).sum()),
            "events": events,
            "worklist": actions,
        }


def review(cohort: Cohort, progress: Progress | None = None) -> Review:
    """Judge a cohort by its rulebooks.

    Raises RuleFileError: a rulebook that does not exist or is not in force on the review's date.
    """
    settings = cohort.settings
    as_of_day = to_days(settings.as_of)
    rulebooks = [load_rulebook(name, settings.as_of) for name in settings.rulebooks]
    invalidated_by = invalidated_tests(cohort.decisions, cohort.grid, cohort.people)
    left_out = np.where(invalidated_by > 0, np.int8(INVALIDATED_BY_DECISION), np.int8(TAKES_PART))
    left_out[~cohort.grid.valid] = MARKED_INVALID
    left_out[cohort.grid.day > as_of_day] = AFTER_AS_OF
    grid = cohort.grid.take(left_out == TAKES_PART)
    history = history_of(grid)
    books = tuple(_review_book(book, cohort, grid, history, as_of_day, progress) for book in rulebooks)
    return Review(cohort, grid, history, left_out, invalidated_by, books)


def _review_book(
    rulebook: Rulebook,
    cohort: Cohort,
    grid: ThresholdGrid,
    history: History,
    as_of_day: int,
    progress: Progress | None,
) -> BookReview:
    settings = cohort.settings
    inputs = Inputs(rulebook, cohort.people, grid, settings.age_correction)
    automatic = settings.baseline_revision == "automatic"
    decisions = baseline_decisions(cohort.decisions, grid, cohort.people, as_of_day, automatic)
    plan = Plan(as_of_day, automatic, settings.recording_baseline == "in_force")
    other = _other_frequencies(grid, rulebook.criterion(rulebook.revision.criterion))
    findings = run_mechanics(rulebook, history, inputs, other, decisions.baselines, plan, progress)
    with ThreadPoolExecutor() as pool:
        windows = {name: found.criterion.retest_window_days.value for name, found in findings.items()}
        waiting = {
            name: pool.submit(find_events, found.trail, history, as_of_day, windows[name])
            for name, found in findings.items()
        }
        revised = findings[rulebook.revision.criterion]
        proposals = unanswered(revised.proposals, decisions)
        baselines = baseline_history(history, revised.trail.changes, proposals)
        events = {name: found.result() for name, found in waiting.items()}
    return BookReview(rulebook, findings, inputs.sums, inputs.ages, events, baselines, decisions)


def _other_frequencies(grid: ThresholdGrid, criterion: Criterion) -> OtherFrequencies:
    at = [n for n, hz in enumerate(grid.frequencies_hz) if hz not in criterion.frequencies_hz.value]
    return OtherFrequencies(grid.threshold, grid.response, tuple(at))
