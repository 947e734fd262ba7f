"""What a reader should know of the tests themselves: which took no part, and where a test falls short."""

from dataclasses import dataclass

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import ArrayLike, NDArray

from audiokit.core.vocabulary import EARS, Purpose, Response
from audiokit.rules.spec import QualityLimits, tenths
from audiokit.surveillance.ordering import order_by
from audiokit.surveillance.review import AFTER_AS_OF, INVALIDATED_BY_DECISION, MARKED_INVALID, TAKES_PART, Review

COLUMNS = ("person_id", "test_id", "tested_on", "ear", "check", "value", "limit", "why")

_BOTH_EARS = 2


@dataclass(frozen=True)
class _Rows:
    """Findings of one check. test : index in cohort.grid; ear : of EARS, or _BOTH_EARS; the rest as text."""

    check: str
    test: NDArray[np.integer]
    ear: ArrayLike
    value: pa.Array
    limit: str
    why: pa.Array | str


def quality_table(review: Review) -> pd.DataFrame:
    """Rows of quality.csv, as text, by person, date, test, ear and check."""
    limits = review.books[0].rulebook.quality
    parts = [
        *_left_out(review),
        _second_baselines(review),
        _missing_frequencies(review, limits),
        *_noise_before_baseline(review, limits),
        *_rechecks(review, limits),
    ]
    grid = review.cohort.grid
    test = np.concatenate([part.test for part in parts]).astype(np.int64)
    ear = np.concatenate([np.broadcast_to(np.asarray(part.ear, dtype=np.int8), len(part.test)) for part in parts])
    place = np.empty(len(grid), dtype=np.int64)
    place[order_by((grid.person, grid.day), grid.test_id, ready=True)] = np.arange(len(grid))
    checks = sorted({part.check for part in parts})
    check = np.repeat([checks.index(part.check) for part in parts], [len(part.test) for part in parts])
    table = pa.table(
        {
            "person_id": review.cohort.people.person_id.take(pa.array(grid.person[test])),
            "test_id": grid.test_id.take(pa.array(test)),
            "tested_on": pc.strftime(pa.array(grid.day[test]).cast(pa.date32()), format="%Y-%m-%d"),
            "ear": pa.array([*EARS, ""]).take(pa.array(ear)),
            "check": pa.array(checks, type=pa.string()).take(pa.array(check)),
            "value": pa.concat_arrays([part.value.cast(pa.string()) for part in parts]),
            "limit": pa.concat_arrays([pa.repeat(pa.scalar(part.limit), len(part.test)) for part in parts]),
            "why": pa.concat_arrays([_column(part.why, len(part.test)) for part in parts]),
        }
    )
    order = np.lexsort((check, np.where(ear == _BOTH_EARS, -1, ear), place[test]))
    return pd.concat((table.take(pa.array(order)).to_pandas(), _idle_decisions(review)), ignore_index=True)


def _column(text: pa.Array | str, rows: int) -> pa.Array:
    return pa.repeat(pa.scalar(text), rows) if isinstance(text, str) else text.cast(pa.string())


def _in_cohort(review: Review, tests: NDArray[np.integer]) -> NDArray[np.int64]:
    """Indices of tests that take part, in cohort.grid."""
    return np.flatnonzero(review.left_out_code == TAKES_PART)[tests]


def _left_out(review: Review) -> list[_Rows]:
    code = review.left_out_code
    after, marked, decided = (np.flatnonzero(code == c) for c in (AFTER_AS_OF, MARKED_INVALID, INVALIDATED_BY_DECISION))
    number = pa.array(review.invalidated_by[decided]).cast(pa.string())
    why_decided = pc.binary_join_element_wise("invalidated by decision ", number, ": takes no part", "")
    as_of = review.cohort.settings.as_of.isoformat()
    blank, no = _column("", len(after)), _column("no", len(marked))
    late = "later than the date of the review: takes no part"
    return [
        _Rows("after_as_of", after, _BOTH_EARS, blank, as_of, late),
        _Rows("marked_invalid", marked, _BOTH_EARS, no, "", "the file says valid = no: takes no part"),
        _Rows("invalidated_by_decision", decided, _BOTH_EARS, number, "", why_decided),
    ]


def _second_baselines(review: Review) -> _Rows:
    later = np.flatnonzero((review.grid.purpose == Purpose.BASELINE) & ~review.history.before)
    why = "a later test with purpose baseline revises nothing by itself: compared as a periodic test"
    return _Rows("second_baseline", _in_cohort(review, later), _BOTH_EARS, _column("baseline", len(later)), "", why)


def _missing_frequencies(review: Review, limits: QualityLimits) -> _Rows:
    """Tests without a level at a frequency that the rule requires; one row per test and ear, the frequencies named."""
    grid, required = review.grid, limits.required_frequencies_hz
    lacking = np.zeros((2, len(grid)), dtype=np.int64)
    for bit, hz in enumerate(required.value):
        if hz in grid.frequencies_hz:
            absent = grid.response[:, grid.frequencies_hz.index(hz)] > Response.NO_RESPONSE
            lacking |= absent.astype(np.int64) << bit
        else:
            lacking |= 1 << bit
    ear, test = np.nonzero(lacking)
    codes, which = np.unique(lacking[ear, test], return_inverse=True)
    named = [" ".join(str(hz) for bit, hz in enumerate(required.value) if code >> bit & 1) for code in codes.tolist()]
    value = pa.array(named, type=pa.string()).take(pa.array(which))
    why = f"no level at a frequency that the rule requires ({required.at})"
    limit = " ".join(map(str, required.value))
    return _Rows("missing_frequencies", _in_cohort(review, test), ear, value, limit, why)


def _noise_before_baseline(review: Review, limits: QualityLimits) -> list[_Rows]:
    grid, limit = review.grid, limits.quiet_hours_before_baseline
    if "hours_since_noise" not in grid.details:
        return []
    initial = review.history.initial[review.history.initial >= 0]
    hours = grid.details["hours_since_noise"].to_numpy(dtype=float)[initial]
    short = hours < limit.value
    value = pa.array([f"{hour:g}" for hour in hours[short]], type=pa.string())
    why = f"the baseline needs {limit.value} hours without workplace noise ({limit.at}); protectors may have stood in"
    tests = _in_cohort(review, initial[short])
    return [_Rows("noise_before_baseline", tests, _BOTH_EARS, value, str(limit.value), why)]


def _rechecks(review: Review, limits: QualityLimits) -> list[_Rows]:
    """Tests whose repeat at 1000 Hz differs from the first reading by more than the limit."""
    grid, limit = review.grid, limits.recheck_agreement_db
    found = []
    for ear, name in enumerate(EARS):
        column = f"{name}_1000_recheck"
        if column not in grid.details or 1000 not in grid.frequencies_hz:
            continue
        again = pd.to_numeric(grid.details[column], errors="coerce").to_numpy(dtype=float)
        at = grid.frequencies_hz.index(1000)
        usable = ~np.isnan(again) & (grid.response[ear, at] == Response.MEASURED)
        difference = np.zeros(len(grid), dtype=np.int64)
        difference[usable] = np.rint(again[usable] * 10).astype(np.int64) - grid.threshold[ear, at][usable]
        apart = np.flatnonzero(np.abs(difference) > tenths(limit))
        value = pa.array([f"{step / 10:g}" for step in difference[apart]], type=pa.string())
        why = f"the repeat at 1000 Hz differs by more than {limit.value} dB ({limit.at}; {limit.standing})"
        found.append(_Rows("recheck_1000_hz", _in_cohort(review, apart), ear, value, str(limit.value), why))
    return found


def _idle_decisions(review: Review) -> pd.DataFrame:
    """Decisions on baselines that have no effect in this review, so that none goes unseen; after all the tests."""
    rows = review.books[0].decisions.idle
    number = rows["decision_id"].astype(str)
    return pd.DataFrame(
        {
            "person_id": rows["person_id"],
            "test_id": rows["test_id"],
            "tested_on": "",
            "ear": rows["ear"],
            "check": "decision_without_effect",
            "value": number,
            "limit": "",
            "why": "decision " + number + " " + rows["why"],
        },
        columns=list(COLUMNS),
    )
