"""The yearly tests of the example: baselines, campaigns, retests, and the baselines that its reviewers revised."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from audiokit.core.dates import NO_DATE, to_days
from audiokit.core.vocabulary import EARS, Purpose
from audiokit.example.measuring import TestBlock, join, measure
from audiokit.example.scenario import CAMPAIGN_YEARS, DELIVERED, SHIFT_FREQUENCIES, SITES
from audiokit.example.workforce import Workforce

_LAST_DAY = to_days(DELIVERED)
_RETEST_SHARE = 0.88
_LATE_RETEST_SHARE = 0.12
_ATTENDANCE = 0.94
_REVISION_SHARE = 0.85
_RETEST_WINDOW_DAYS = 30
_EXIT_TEST_DAYS = 60
_SHIFT_DB = 10.0
_IMPROVEMENT_DB = 5.0


@dataclass(frozen=True)
class Revisions:
    """Baselines that a reviewer revised: person, ear (0 right, 1 left), serial of the test, day of the decision."""

    person: NDArray[np.int64]
    ear: NDArray[np.int64]
    serial: NDArray[np.int64]
    day: NDArray[np.int32]
    improved: NDArray[np.bool_]


@dataclass
class _Ears:
    """What the scenario's staff know of each ear [person, ear]; means over 2000, 3000, 4000 Hz, NaN = not computable.

    baseline : mean of the baseline in force      last : mean of the latest result, NaN at the start of a sequence
    serial   : serial of the latest result
    """

    baseline: NDArray[np.float64]
    last: NDArray[np.float64]
    serial: NDArray[np.int64]


def run_programme(rng: np.random.Generator, workforce: Workforce) -> tuple[TestBlock, Revisions]:
    """All tests of the drawn people, and the decisions that follow from them, in order of campaigns."""
    shape = (len(workforce), len(EARS))
    ears = _Ears(np.full(shape, np.nan), np.full(shape, np.nan), np.full(shape, -1, dtype=np.int64))
    days = _schedule(rng, workforce)
    blocks: list[TestBlock] = []
    revisions: list[Revisions] = []
    serial = 0
    for slot, day in enumerate(days):
        person = np.flatnonzero(day != NO_DATE)
        tests = measure(rng, workforce, person, day[person], _purpose(workforce, person, day[person], slot), serial)
        serial += len(tests)
        blocks.append(tests)
        means = _exact_means(tests)
        if slot == 0:
            ears.baseline[person] = means
            continue
        shifted = (means - ears.baseline[person] >= _SHIFT_DB).any(axis=1) & tests.valid
        retests, of = _retest(rng, workforce, tests, shifted, serial)
        serial += len(retests)
        blocks.append(retests)
        serials = np.repeat(tests.serial[:, None], len(EARS), axis=1)
        _let_retests_decide(tests, means, serials, retests, of)
        revisions.append(
            _advance(rng, workforce, ears, person[tests.valid], means[tests.valid], serials[tests.valid], day)
        )
    return join(blocks), _join_revisions(revisions)


def _purpose(workforce: Workforce, person: NDArray[np.int64], day: NDArray[np.int32], slot: int) -> NDArray[np.int64]:
    """Baseline in the first slot, then annual; exit for people who leave within the next weeks."""
    left = workforce.left_day[person].astype(np.int64)
    leaves = (left != NO_DATE) & (left - day <= _EXIT_TEST_DAYS)
    later = np.where(leaves, Purpose.EXIT, Purpose.ANNUAL)
    return np.full(len(person), Purpose.BASELINE, dtype=np.int64) if slot == 0 else later


def _schedule(rng: np.random.Generator, workforce: Workforce) -> list[NDArray[np.int32]]:
    """Day of each person's baseline, then of each campaign; NO_DATE where the person is not tested."""
    month = np.array([site.campaign_month for site in SITES])[workforce.site]
    first = np.array([site.campaign_day for site in SITES])[workforce.site]
    length = np.array([site.campaign_length for site in SITES])[workforce.site]
    leaves = np.where(workforce.left_day == NO_DATE, _LAST_DAY, workforce.left_day)
    campaigns = []
    for year in CAMPAIGN_YEARS:
        start = (
            ((year - 1970) * 12 + month - 1).astype("datetime64[M]").astype("datetime64[D]").astype(np.int64)
            + first
            - 1
        )
        day = _workday(start + (rng.random(len(workforce)) * length).astype(np.int64))
        campaigns.append(day)
    programme_start = campaigns[0]
    at_hire = _workday(workforce.hired_day + 3 + (rng.random(len(workforce)) * 140).astype(np.int64))
    veteran = workforce.hired_day < programme_start
    baseline = np.where(veteran, programme_start, at_hire)
    tested_at_all = (baseline <= leaves) & (rng.random(len(workforce)) < 0.99)
    days = [np.where(tested_at_all, baseline, NO_DATE).astype(np.int32)]
    for day in campaigns:
        attends = tested_at_all & (day >= baseline + 200) & (day <= leaves)
        attends &= rng.random(len(workforce)) < _ATTENDANCE
        days.append(np.where(attends, day, NO_DATE).astype(np.int32))
    return days


def _workday(day: NDArray[np.integer]) -> NDArray[np.integer]:
    """The same day, or the Monday after a weekend; 1970-01-01 was a Thursday."""
    weekday = (day + 3) % 7
    return day + np.where(weekday >= 5, 7 - weekday, 0)


def _exact_means(tests: TestBlock) -> NDArray[np.float64]:
    """Mean over 2000, 3000, 4000 Hz, NaN unless all three were measured. [test, ear] [dB HL]"""
    means = tests.threshold[:, :, SHIFT_FREQUENCIES].mean(axis=2)
    means[(tests.response[:, :, SHIFT_FREQUENCIES] != 0).any(axis=2)] = np.nan
    return means


def _retest(
    rng: np.random.Generator, workforce: Workforce, tests: TestBlock, shifted: NDArray[np.bool_], serial: int
) -> tuple[TestBlock, NDArray[np.int64]]:
    """Retests of some of the shifted tests, and the row of the test each belongs to; a few come after day 30."""
    late = rng.random(len(tests)) < _LATE_RETEST_SHARE
    delay = np.where(late, rng.integers(31, 61, len(tests)), rng.integers(3, 31, len(tests)))
    day = tests.day + delay
    left = workforce.left_day[tests.person]
    chosen = (
        shifted & (rng.random(len(tests)) < _RETEST_SHARE) & (day <= _LAST_DAY) & ((left == NO_DATE) | (day <= left))
    )
    of = np.flatnonzero(chosen)
    purpose = np.where(rng.random(len(of)) < 0.1, Purpose.BLANK, Purpose.RETEST)
    return measure(rng, workforce, tests.person[of], day[of].astype(np.int32), purpose, serial), of


def _let_retests_decide(
    tests: TestBlock, means: NDArray[np.float64], serials: NDArray[np.int64], retests: TestBlock, of: NDArray[np.int64]
) -> None:
    """A valid retest in time takes the place of its test, in each ear whose mean it has."""
    retest_means = _exact_means(retests)
    counts = retests.valid & (retests.day - tests.day[of] <= _RETEST_WINDOW_DAYS)
    decides = counts[:, None] & ~np.isnan(retest_means)
    means[of] = np.where(decides, retest_means, means[of])
    serials[of] = np.where(decides, retests.serial[:, None], serials[of])


def _advance(
    rng: np.random.Generator,
    workforce: Workforce,
    ears: _Ears,
    person: NDArray[np.int64],
    means: NDArray[np.float64],
    serials: NDArray[np.int64],
    day: NDArray[np.int32],
) -> Revisions:
    """Compare two results in a row with the baseline; where both agree, the site's reviewer, if any, revises most.

    Changes `ears`. The scenario's staff follow their own simple habit here; what the rules make of it is for a review.
    """
    baseline, last, last_serial = ears.baseline[person], ears.last[person], ears.serial[person]
    shifted = (means - baseline >= _SHIFT_DB) & (last - baseline >= _SHIFT_DB)
    improved = (baseline - means >= _IMPROVEMENT_DB) & (baseline - last >= _IMPROVEMENT_DB)
    has_reviewer = np.array([bool(site.reviewer[0]) for site in SITES])[workforce.site[person]]
    revised = (shifted | improved) & has_reviewer[:, None] & (rng.random(means.shape) < _REVISION_SHARE)
    earlier = last <= means
    new_serial = np.where(earlier, last_serial, serials)
    row, ear = np.nonzero(revised)
    ears.baseline[person] = np.where(revised, np.minimum(last, means), baseline)
    ears.last[person] = np.where(revised, np.nan, means)
    ears.serial[person] = serials
    return Revisions(person[row], ear, new_serial[row, ear], day[person[row]] + np.int32(14), improved[row, ear])


def _join_revisions(parts: list[Revisions]) -> Revisions:
    fields = ("person", "ear", "serial", "day", "improved")
    return Revisions(*(np.concatenate([getattr(part, name) for part in parts]) for name in fields))
