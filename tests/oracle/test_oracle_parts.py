"""The parts of the scalar review and the hostile cohorts, against values worked out by hand."""

import datetime as dt
from fractions import Fraction

from tests.oracle.age_table import FEMALE, MALE, mean_value
from tests.oracle.dates import add_months, age_on
from tests.oracle.hostile import COMBINATIONS, hostile_cohort
from tests.oracle.intervals import Interval, change, later_is_better_elsewhere, mean, reaches, read_cell
from tests.oracle.records import RECORDABLE, STS, Person
from tests.oracle.scalar_review import review


def test_cells_and_intervals() -> None:
    """By hand from the cell syntax."""
    assert read_cell("7.5", 500, {}) == Interval(Fraction(15, 2), Fraction(15, 2))
    assert [read_cell(text, 500, {}) for text in ("NR@90", ">90", "90+")] == [Interval(Fraction(90), None)] * 3
    limits = [read_cell("NR", hz, {500: 80}) for hz in (250, 500, 1000, 8000)]
    assert [limit.low for limit in limits if limit] == [90, 80, 100, 90]
    assert [read_cell(text, 500, {}) for text in ("", "DNT", "CNT")] == [None] * 3
    measured, silent = Interval(Fraction(20), Fraction(20)), Interval(Fraction(90), None)
    assert change(measured, silent) == Interval(Fraction(70), None)
    assert change(silent, measured) == Interval(None, Fraction(-70))
    assert change(silent, silent) == Interval(None, None)
    assert mean([measured, None, measured]) is None
    assert mean([measured, silent]) == Interval(Fraction(55), None)
    assert [reaches(shift, 10) for shift in (change(measured, silent), change(silent, measured), None)] == [
        *("yes", "no", "unknown")
    ]
    assert reaches(Interval(Fraction(5), None), 10) == reaches(Interval(None, Fraction(15)), 10) == "unknown"


def test_better_elsewhere() -> None:
    """By hand: equal no responses are equal; a pair not surely equal or better counts as worse."""
    five, ten, ninety = (Interval(Fraction(n), Fraction(n)) for n in (5, 10, 90))
    silent, higher = Interval(Fraction(90), None), Interval(Fraction(95), None)
    assert later_is_better_elsewhere([(ten, five), (silent, silent)])
    assert later_is_better_elsewhere([(ten, five), (None, ten)])
    assert later_is_better_elsewhere([(silent, ten)])
    assert not later_is_better_elsewhere([(silent, silent), (ten, ten), (silent, ninety)])
    assert not later_is_better_elsewhere([(ten, five), (higher, silent)])
    assert not later_is_better_elsewhere([(ten, five), (ten, silent)])
    assert not later_is_better_elsewhere([])


def test_calendar_and_ages() -> None:
    """By hand; ages are completed years, App F tables clamp to 20 and 60 years."""
    assert add_months(dt.date(2023, 8, 31), 6) == dt.date(2024, 2, 29)
    assert add_months(dt.date(2024, 2, 29), 12) == dt.date(2025, 2, 28)
    born = Person("P", birth_date=dt.date(2000, 6, 15))
    assert [age_on(born, dt.date(2020, 6, day)) for day in (14, 15)] == [19, 20]
    assert age_on(Person("P", birth_year=2000), dt.date(2020, 1, 1)) == 20
    assert mean_value("male", 75) == Fraction(13 + 23 + 33, 3)
    assert mean_value("female", 12) == Fraction(4 + 3 + 3, 3)
    assert sorted(MALE) == sorted(FEMALE) == list(range(20, 61))


def test_hostile_cohorts_hold_every_case() -> None:
    """A generator that misses a case tests nothing of it; and the same seed must give the same cohort."""
    seen: set[tuple] = set()
    for seed, combination in enumerate(COMBINATIONS):
        cohort = hostile_cohort(seed, 40, combination)
        assert cohort.tests == hostile_cohort(seed, 40, combination).tests
        result = review(cohort.persons, cohort.accepted, cohort.settings)
        seen |= {(found["criterion"], found["bound"], found["met"]) for found in result.shifts}
        seen |= {(event["criterion"], event["outcome"]) for event in result.events}
        seen |= {(line["reason"], line["status"]) for line in result.baselines}
        seen |= {(line["action"], line["overdue"]) for line in result.worklist}
    for criterion in (STS, RECORDABLE):
        for outcome in ("retest_open", "confirmed", "not_confirmed", "no_retest", "found_at_retest"):
            assert (criterion, outcome) in seen
        for bound, met in (("at_least", "yes"), ("at_least", "unknown"), ("at_most", "no"), ("none", "unknown")):
            assert (criterion, bound, met) in seen
    for reason in ("improvement", "persistent_shift"):
        assert {(reason, "proposed"), (reason, "in_force"), (reason, "superseded")} <= seen
    for action in ("retest", "review_baseline", "review_test"):
        assert (action, "no") in seen
    for action in ("notify", "record", "annual_test", "baseline_test"):
        assert {(action, "no"), (action, "yes")} <= seen
    assert ("baseline_test", "unknown") in seen
