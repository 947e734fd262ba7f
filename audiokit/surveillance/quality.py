"""What a reader should know of the tests themselves: which took no part, and where a test falls short."""

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from audiokit.core.dates import iso_text
from audiokit.core.vocabulary import EARS, Purpose, Response
from audiokit.model.grid import ThresholdGrid
from audiokit.rules.spec import QualityLimits, tenths
from audiokit.surveillance.review import AFTER_AS_OF, INVALIDATED_BY_DECISION, MARKED_INVALID, Review

COLUMNS = ("person_id", "test_id", "tested_on", "ear", "check", "value", "limit", "why")


def quality_table(review: Review) -> pd.DataFrame:
    """Rows of quality.csv, as text, by person, date, test, ear and check."""
    limits = review.books[0].rulebook.quality
    parts = [
        _left_out(review),
        _second_baselines(review),
        _missing_frequencies(review, limits),
        _noise_before_baseline(review, limits),
        _rechecks(review, limits),
        _idle_decisions(review),
    ]
    table = pd.concat(parts, ignore_index=True)
    side = table["ear"].map({"": 0, **{ear: n for n, ear in enumerate(EARS, start=1)}})
    keys = ["person_id", "tested_on", "test_id", "side", "check", "why"]
    order = table.assign(side=side).sort_values(keys, kind="stable").index
    return table.loc[order, list(COLUMNS)].reset_index(drop=True)


def _rows(
    review: Review,
    grid: ThresholdGrid,
    tests: NDArray[np.int64],
    check: str,
    why: object,
    *,
    ear: object = "",
    value: object = "",
    limit: object = "",
) -> pd.DataFrame:
    people = review.cohort.people.person_id.to_numpy(zero_copy_only=False)
    return pd.DataFrame(
        {
            "person_id": people[grid.person[tests]],
            "test_id": grid.test_id.to_numpy(zero_copy_only=False)[tests],
            "tested_on": iso_text(grid.day[tests]),
            "ear": ear,
            "check": check,
            "value": value,
            "limit": limit,
            "why": why,
        },
        index=range(len(tests)),
    ).astype(object)


def _left_out(review: Review) -> pd.DataFrame:
    grid, reason = review.cohort.grid, review.left_out_code
    as_of = review.cohort.settings.as_of.isoformat()
    after = np.flatnonzero(reason == AFTER_AS_OF)
    marked = np.flatnonzero(reason == MARKED_INVALID)
    decided = np.flatnonzero(reason == INVALIDATED_BY_DECISION)
    number = review.invalidated_by[decided].astype(str).astype(object)
    return pd.concat(
        (
            _rows(review, grid, after, "after_as_of", "later than the date of the review: takes no part", limit=as_of),
            _rows(review, grid, marked, "marked_invalid", "the file says valid = no: takes no part", value="no"),
            _rows(
                review,
                grid,
                decided,
                "invalidated_by_decision",
                "invalidated by decision " + number + ": takes no part",
                value=number,
            ),
        ),
        ignore_index=True,
    )


def _second_baselines(review: Review) -> pd.DataFrame:
    later = np.flatnonzero((review.grid.purpose == Purpose.BASELINE) & ~review.history.before)
    why = "a later test with purpose baseline revises nothing by itself: compared as a periodic test"
    return _rows(review, review.grid, later, "second_baseline", why, value="baseline")


def _missing_frequencies(review: Review, limits: QualityLimits) -> pd.DataFrame:
    """Tests without a level at a frequency that the rule requires; one row per test and ear, the frequencies named."""
    grid, required = review.grid, limits.required_frequencies_hz
    named = np.full((2, len(grid)), "", dtype=object)
    for hz in required.value:
        if hz in grid.frequencies_hz:
            absent = grid.response[:, grid.frequencies_hz.index(hz)] > Response.NO_RESPONSE
        else:
            absent = np.ones((2, len(grid)), dtype=bool)
        named[absent] += f" {hz}"
    ear, test = np.nonzero(named != "")
    value = np.array([text.strip() for text in named[ear, test]], dtype=object)
    why = f"no level at a frequency that the rule requires ({required.at})"
    limit = " ".join(map(str, required.value))
    sides = np.array(EARS, dtype=object)[ear]
    return _rows(review, grid, test, "missing_frequencies", why, ear=sides, value=value, limit=limit)


def _noise_before_baseline(review: Review, limits: QualityLimits) -> pd.DataFrame:
    grid, limit = review.grid, limits.quiet_hours_before_baseline
    initial = review.history.initial[review.history.initial >= 0]
    if "hours_since_noise" not in grid.details:
        return _rows(review, grid, initial[:0], "noise_before_baseline", "")
    hours = grid.details["hours_since_noise"].to_numpy(dtype=float)[initial]
    short = hours < limit.value
    value = np.array([f"{hour:g}" for hour in hours[short]], dtype=object)
    why = f"the baseline needs {limit.value} hours without workplace noise ({limit.at}); protectors may have stood in"
    return _rows(review, grid, initial[short], "noise_before_baseline", why, value=value, limit=str(limit.value))


def _rechecks(review: Review, limits: QualityLimits) -> pd.DataFrame:
    """Tests whose repeat at 1000 Hz differs from the first reading by more than the limit."""
    grid, limit = review.grid, limits.recheck_agreement_db
    parts = [_rows(review, grid, np.empty(0, dtype=np.int64), "recheck_1000_hz", "")]
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
        value = np.array([f"{step / 10:g}" for step in difference[apart]], dtype=object)
        why = f"the repeat at 1000 Hz differs by more than {limit.value} dB ({limit.at}; {limit.standing})"
        parts.append(_rows(review, grid, apart, "recheck_1000_hz", why, ear=name, value=value, limit=str(limit.value)))
    return pd.concat(parts, ignore_index=True)


def _idle_decisions(review: Review) -> pd.DataFrame:
    """Decisions on baselines that have no effect in this review, so that none goes unseen."""
    rows = review.books[0].decisions.idle
    return pd.DataFrame(
        {
            "person_id": rows["person_id"],
            "test_id": rows["test_id"],
            "tested_on": "",
            "ear": rows["ear"],
            "check": "decision_without_effect",
            "value": rows["decision_id"].astype(str),
            "limit": "",
            "why": "decision " + rows["decision_id"].astype(str) + " " + rows["why"],
        },
        index=rows.index,
    ).astype(object)
