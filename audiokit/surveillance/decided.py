"""Reviewers' decisions turned into the arrays that the mechanics take."""

from dataclasses import dataclass

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from audiokit.core.dates import to_days
from audiokit.core.vocabulary import EARS
from audiokit.model.grid import People, ThresholdGrid
from audiokit.surveillance.finders import BaselineDecisions

_ABSENT = -1


def index_in(values: pa.Array, wanted: pd.Series) -> NDArray[np.int64]:
    """Position of each wanted text in an array of unique texts, -1 where it is not there."""
    if not len(wanted):
        return np.empty(0, dtype=np.int64)
    found = pc.index_in(pa.array(wanted, type=pa.string()), value_set=values.cast(pa.string()))
    return found.fill_null(_ABSENT).to_numpy(zero_copy_only=False).astype(np.int64)


def invalidated_tests(decisions: pd.DataFrame, grid: ThresholdGrid, people: People) -> NDArray[np.int64]:
    """For each test the number of the decision that invalidates it, 0 where none does. [test]"""
    number = np.zeros(len(grid), dtype=np.int64)
    if len(decisions):
        rows = decisions[decisions["kind"] == "invalidate_test"]
        test = _tests_of(rows, grid, people)
        number[test[test >= 0]] = rows["decision_id"].to_numpy(dtype=np.int64)[test >= 0]
    return number


def _tests_of(rows: pd.DataFrame, grid: ThresholdGrid, people: People) -> NDArray[np.int64]:
    """Index of the test each decision names, -1 where that person has no such test."""
    test = index_in(grid.test_id, rows["test_id"])
    person = index_in(people.person_id, rows["person_id"])
    if len(grid):
        test = np.where((test >= 0) & (grid.person[test] == person), test, _ABSENT)
    return test


@dataclass(frozen=True)
class EarTests:
    """Some ears of some tests, as they are named by decisions."""

    test: NDArray[np.int64]
    ear: NDArray[np.int64]

    def holds(self, test: NDArray[np.integer], ear: NDArray[np.integer]) -> NDArray[np.bool_]:
        """Which of the given tests and ears are among them."""
        return np.isin(test.astype(np.int64) * 2 + ear, self.test * 2 + self.ear)


def named_ear_tests(
    decisions: pd.DataFrame, kind: str, grid: ThresholdGrid, people: People, criterion: str | None = None
) -> EarTests:
    """The tests and ears that decisions of one kind name, of one criterion where it is given."""
    rows = decisions[decisions["kind"] == kind] if len(decisions) else _no_rows()
    if criterion is not None and len(rows):
        rows = rows[rows["criterion"] == criterion]
    test = _tests_of(rows, grid, people)
    ear = rows["ear"].map(EARS.index).to_numpy(dtype=np.int64)
    return EarTests(test[test >= 0], ear[test >= 0])


@dataclass(frozen=True)
class DecisionEffect:
    """Decisions on baselines, and why the others have no effect.

    baselines : those that take effect      answers : all that name a test still in use, to answer proposals
    refused : tests that a reviewer refused as baseline, and in which ear
    idle : decision_id, person_id, test_id, ear, why: one row per decision on a baseline without effect
    """

    baselines: BaselineDecisions
    answers: BaselineDecisions
    refused: EarTests
    idle: pd.DataFrame


def baseline_decisions(
    decisions: pd.DataFrame, grid: ThresholdGrid, people: People, as_of_day: int, automatic: bool
) -> DecisionEffect:
    """The revise_baseline decisions, as tests of the grid that takes part in the review.

    A decision counts from its day of effect, at the earliest from its test's own day.
    """
    rows = decisions[decisions["kind"] == "revise_baseline"] if len(decisions) else _no_rows()
    person = index_in(people.person_id, rows["person_id"])
    test = _tests_of(rows, grid, people)
    named = test >= 0
    day = pd.to_datetime(rows["takes_effect_on"]).map(lambda date: to_days(date.date())).to_numpy(dtype=np.int64)
    if len(grid):
        day = np.where(named, np.maximum(day, grid.day[test]), day)
    in_time = day <= as_of_day
    why = np.full(len(rows), "", dtype=object)
    why[~in_time] = "takes effect after the date of the review"
    why[~named] = "names a test that takes no part in the review"
    if automatic:
        why[why == ""] = "baselines are revised automatically in this review"
    effective = why == ""
    ear = rows["ear"].map(EARS.index).to_numpy(dtype=np.int8)
    idle = rows.assign(why=why)[~effective]
    return DecisionEffect(
        baselines=_ordered(person, ear, day, test, effective),
        answers=_ordered(person, ear, day, test, named),
        refused=named_ear_tests(decisions, "refuse_baseline", grid, people),
        idle=idle,
    )


def _ordered(
    person: NDArray[np.int64],
    ear: NDArray[np.int8],
    day: NDArray[np.int64],
    test: NDArray[np.int64],
    keep: NDArray[np.bool_],
) -> BaselineDecisions:
    order = np.lexsort((np.arange(len(person)), day, person))
    order = order[keep[order]]
    as_index = [array[order].astype(np.int32) for array in (person, day, test)]
    return BaselineDecisions(person=as_index[0], ear=ear[order], day=as_index[1], test=as_index[2])


def _no_rows() -> pd.DataFrame:
    columns = ("decision_id", "kind", "person_id", "ear", "test_id", "takes_effect_on")
    return pd.DataFrame({name: pd.Series(dtype=object) for name in columns})
