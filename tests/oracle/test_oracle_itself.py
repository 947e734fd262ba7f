"""The scalar review against published and hand-made examples, so that what judges the package is judged too.

Sources stand beside each case. "printed": the text gives the result; "by hand": worked out from the clause by hand.
Where an example is about the change alone, both ears carry the same levels.
"""

import datetime as dt
from fractions import Fraction

import pytest

from tests.oracle.age_table import FEMALE, MALE
from tests.oracle.records import RECORDABLE, STS, HearingTest, Person
from tests.oracle.small_cohorts import Levels, made_test, outcomes, row, run

# Baseline levels, current levels, sum of the shift, sts met: derived by hand from 29 CFR 1910.95(g)(10).
SHIFTS = [
    ("D01 equal shifts", (10, 10, 10), (20, 20, 20), 30, "yes"),
    ("D02 uneven shifts", (15, 15, 10), (15, 25, 30), 30, "yes"),
    ("D03 floating means fall short", (10, 15, 15), (20, 25, 25), 30, "yes"),
    ("D04 8.33", (10, 10, 10), (15, 20, 20), 25, "no"),
    ("D12 improvement is no worsening", (20, 20, 20), (10, 10, 10), -30, "no"),
]


@pytest.mark.parametrize(("name", "baseline", "current", "total", "met"), SHIFTS, ids=[case[0] for case in SHIFTS])
def test_shift_from_baseline(name: str, baseline: Levels, current: Levels, total: int, met: str) -> None:
    result = run([made_test("2020-01-01", baseline, purpose="baseline"), made_test("2021-01-01", current)])
    found = row(result.shifts, criterion=STS, ear="left")
    assert (found["value_db"], found["bound"], found["met"]) == (Fraction(total, 3), "exact", met)


# Sex, ages, baseline, current, age differences, adjusted sum, sts adjusted. P02: 29 CFR 1910.95 App F (inputs printed,
# completed by hand); the others by hand from (g)(10)(ii), App F. D27 uses Table F-2, female, 51 years, 3000 Hz = 12.
AGE_CORRECTED = [
    ("P02", "male", 27, 32, (0, 0, 5), (10, 10, 25), (1, 1, 3), 35, "yes"),
    ("D05", "male", 23, 24, (10, 10, 10), (20, 20, 20), (0, 1, 0), 29, "no"),
    ("D06", "male", 27, 32, (0, 0, 5), (10, 10, 20), (1, 1, 3), 30, "yes"),
    ("D07", "female", 18, 22, (5, 5, 5), (15, 15, 15), (0, 1, 1), 28, "no"),
    ("D08", "male", 58, 67, (20, 25, 35), (30, 35, 50), (1, 1, 2), 31, "yes"),
    ("D09", "male", 61, 70, (20, 25, 35), (30, 35, 45), (0, 0, 0), 30, "yes"),
    ("D17", "male", 30, 58, (5, 10, 15), (20, 35, 50), (8, 16, 22), 29, "no"),
    ("D18", "female", 40, 50, (10, 10, 15), (20, 25, 30), (3, 3, 4), 30, "yes"),
    ("D27", "female", 40, 51, (5, 5, 5), (15, 20, 20), (3, 4, 4), 29, "no"),
]


@pytest.mark.parametrize(
    ("name", "sex", "then", "now", "baseline", "current", "difference", "total", "met"),
    AGE_CORRECTED,
    ids=[case[0] for case in AGE_CORRECTED],
)
def test_age_correction(
    name: str,
    sex: str,
    then: int,
    now: int,
    baseline: Levels,
    current: Levels,
    difference: tuple[int, int, int],
    total: int,
    met: str,
) -> None:
    table = MALE if sex == "male" else FEMALE
    clamped = [table[min(max(age, 20), 60)] for age in (then, now)]
    assert tuple(after - before for before, after in zip(*clamped, strict=True)) == difference
    tests = [made_test(f"{1950 + then}-06-01", baseline, purpose="baseline"), made_test(f"{1950 + now}-06-01", current)]
    result = run(tests, Person("P", sex, birth_date=dt.date(1950, 6, 1)), age_correction=True)
    found = row(result.shifts, criterion=STS, ear="right")
    assert found["correction_db"] == Fraction(sum(difference), 3)
    assert (found["value_db"], found["met"]) == (Fraction(total, 3), met)
    unknown_sex = run(tests, Person("P", "unknown", birth_date=dt.date(1950, 6, 1)), age_correction=True)
    assert row(unknown_sex.shifts, criterion=STS, ear="right")["correction_db"] == 0


def test_ears_are_judged_apart() -> None:
    """By hand, 29 CFR 1910.95(g)(10): D10 (one ear only), D11 (no pooling of ears)."""
    one = run([made_test("2020-01-01", (5, 5, 5), (0, 0, 0)), made_test("2021-01-01", (5, 5, 10), (15, 15, 15))])
    assert outcomes(one) == {("2021-01-01", "left"): "no_retest"}
    pooled = run([made_test("2020-01-01", (5, 5, 5)), made_test("2021-01-01", (15, 15, 10), (10, 15, 15))])
    assert outcomes(pooled) == {}
    assert {found["value_db"] for found in pooled.shifts} == {Fraction(25, 3)}


# Baseline, current, mean hearing level, recordable: by hand from 29 CFR 1904.10(a), (b)(2).
LEVELS = [
    ("D13", (10, 15, 20), (20, 25, 30), Fraction(25), "yes"),
    ("D14", (10, 15, 10), (20, 25, 25), Fraction(70, 3), "no"),
    ("D15", (14, 14, 15), (24, 25, 25), Fraction(74, 3), "no"),
    ("P02", (0, 0, 5), (10, 10, 25), Fraction(15), "no"),
]


@pytest.mark.parametrize(("name", "baseline", "current", "level", "met"), LEVELS, ids=[case[0] for case in LEVELS])
def test_level_of_recordable_case(name: str, baseline: Levels, current: Levels, level: Fraction, met: str) -> None:
    result = run([made_test("2020-01-01", baseline), made_test("2021-01-01", current)])
    assert row(result.events, criterion=STS, ear="right")["mean_hl_db"] == level
    assert row(result.shifts, criterion=RECORDABLE, ear="right")["met"] == met
    assert len([event for event in result.events if event["recordable"] == "yes"]) == (2 if met == "yes" else 0)


def test_both_limits_in_the_same_ear() -> None:
    """By hand, 29 CFR 1904.10(a): D16."""
    result = run(
        [made_test("2020-01-01", (30, 30, 30), (0, 0, 0)), made_test("2021-01-01", (30, 30, 35), (10, 10, 15))]
    )
    assert outcomes(result, RECORDABLE) == {}
    assert outcomes(result) == {("2021-01-01", "left"): "no_retest"}


@pytest.mark.parametrize(("age_correction", "met"), [(True, "no"), (False, "yes")])
def test_level_alone_is_not_recordable(age_correction: bool, met: str) -> None:
    """By hand, 29 CFR 1904.10(b)(3), App F: D17 (level 35)."""
    tests = [made_test("1980-06-01", (5, 10, 15)), made_test("2008-06-01", (20, 35, 50))]
    result = run(tests, Person("P", "male", dt.date(1950, 6, 1)), age_correction=age_correction)
    assert row(result.shifts, criterion=RECORDABLE, ear="right")["met"] == met


def test_level_is_never_age_corrected() -> None:
    """By hand, 29 CFR 1904.10(b)(3): D18 (level 25.0, corrected it would be 21.67)."""
    tests = [made_test("1990-06-01", (10, 10, 15)), made_test("2000-06-01", (20, 25, 30))]
    result = run(tests, Person("P", "female", dt.date(1950, 6, 1)), age_correction=True)
    event = row(result.events, criterion=RECORDABLE, ear="right")
    assert (event["value_db"], event["mean_hl_db"], event["recordable"]) == (10, 25, "yes")


def test_each_ear_has_the_age_of_its_own_baseline() -> None:
    """By hand, 29 CFR 1910.95(g)(9), (g)(10), App F: D19 (left revised at 45, right from 40, tested at 48).

    The left ear is brought to its revised baseline by an improvement on two tests (Rule 1).
    """
    tests = [
        made_test("1990-06-01", (5, 5, 10), (25, 30, 35), "baseline"),
        made_test("1995-06-01", (5, 5, 10), (20, 25, 30)),
        made_test("1996-06-01", (5, 5, 10), (20, 25, 30)),
        made_test("1998-06-01", (15, 15, 20), (25, 30, 35)),
    ]
    person = Person("P", "male", dt.date(1950, 6, 1))
    result = run(tests, person, age_correction=True, baseline_revision="automatic")
    left = row(result.shifts, criterion=STS, ear="left", test_id="1998-06-01")
    right = row(result.shifts, criterion=STS, ear="right", test_id="1998-06-01")
    assert (left["baseline_test_id"], right["baseline_test_id"]) == ("1995-06-01", "1990-06-01")
    assert (left["measured_db"], right["measured_db"]) == (5, 10)
    assert (left["value_db"], right["value_db"]) == (Fraction(11, 3), 6)
    assert (left["met"], right["met"]) == ("no", "no")


def test_no_retest_the_shift_stands() -> None:
    """Printed, OSHA letter of 24 May 1983: P04."""
    result = run([made_test("2020-01-01", (0, 0, 0)), made_test("2021-01-01", (10, 10, 10), (0, 0, 0))])
    assert outcomes(result) == {("2021-01-01", "right"): "no_retest"}


def test_notice_every_year_until_revised() -> None:
    """Printed, OSHA letter of 27 September 1983: P05 (three annual tests, no revision in between)."""
    tests = [made_test(f"202{year}-01-01", (0, 0, 0) if year == 0 else (12, 12, 12), (0, 0, 0)) for year in range(4)]
    notices = [event["notify_by"] for event in run(tests).events if event["criterion"] == STS]
    assert notices == [dt.date(2021, 1, 22), dt.date(2022, 1, 22), dt.date(2023, 1, 22)]


def test_retest_stands_for_both_ears() -> None:
    """Printed, OSHA letter of 18 June 1985: P06 (shift in one ear, at the retest in both)."""
    tests = [
        made_test("2020-01-01", (0, 0, 0)),
        made_test("2021-01-01", (10, 10, 10), (5, 5, 5)),
        made_test("2021-01-20", (10, 10, 10), (10, 10, 10), "retest"),
    ]
    assert outcomes(run(tests)) == {("2021-01-01", "right"): "confirmed", ("2021-01-20", "left"): "found_at_retest"}


def test_only_the_ear_that_shifted_is_revised() -> None:
    """Printed, OSHA FAQ 380 and letters of 9 September 2005 and 10 February 2006: P07."""
    tests = [made_test(f"202{year}-01-01", (0, 0, 0), (12, 12, 12) if year else (0, 0, 0)) for year in range(3)]
    result = run(tests, baseline_revision="automatic")
    assert [line["reason"] for line in result.baselines if line["ear"] == "right"] == ["initial"]
    assert [line["reason"] for line in result.baselines if line["ear"] == "left"] == ["initial", "persistent_shift"]


@pytest.mark.parametrize(("day", "outcome"), [("2024-03-31", "not_confirmed"), ("2024-04-01", "no_retest")])
def test_thirty_calendar_days(day: str, outcome: str) -> None:
    """Rule printed in OSHA letters of 17 April 1991 and 4 March 2004, dates by hand: P09, D21."""
    tests = [
        made_test("2023-03-01", (0, 0, 0)),
        made_test("2024-03-01", (10, 10, 10), (0, 0, 0)),
        made_test(day, (0, 0, 0), purpose="retest"),
    ]
    assert outcomes(run(tests)) == {("2024-03-01", "right"): outcome}


def test_retest_removes_the_shift() -> None:
    """By hand, 29 CFR 1910.95(g)(7)(ii), 1904.10(b)(4): D20 (retest on day 21 with 8.33)."""
    tests = [
        made_test("2023-03-01", (20, 20, 20)),
        made_test("2024-03-01", (30, 30, 30), (20, 20, 20)),
        made_test("2024-03-22", (25, 30, 30), (20, 20, 25), "retest"),
    ]
    result = run(tests)
    assert outcomes(result) == {("2024-03-01", "right"): "not_confirmed"}
    event = row(result.events, criterion=RECORDABLE)
    assert (event["outcome"], event["value_db"], event["record_by"]) == ("not_confirmed", Fraction(25, 3), None)


def test_second_case_counts_from_the_first() -> None:
    """By hand, 29 CFR 1904.10(b)(2)(i): D22. The initial baseline lies 15 dB below the first case."""
    tests = [
        made_test("2019-01-01", (10, 10, 15)),
        made_test("2020-01-01", (25, 25, 30)),
        made_test("2021-01-01", (30, 35, 35)),
        made_test("2022-01-01", (35, 40, 40)),
    ]
    result = run(tests)
    rows = [found for found in result.shifts if found["criterion"] == RECORDABLE and found["ear"] == "right"]
    assert [found["value_db"] for found in rows] == [15, Fraction(20, 3), Fraction(35, 3)]
    assert [found["met"] for found in rows] == ["yes", "no", "yes"]


@pytest.mark.parametrize(("recording", "value", "met"), [("original", 20, "yes"), ("in_force", Fraction(20, 3), "no")])
def test_contested_recording_baseline(recording: str, value: Fraction, met: str) -> None:
    """D23, contested: 1904.10(b)(2)(i) and the 2002 preamble against an OSHA training slide on 1904.10."""
    tests = [
        made_test("2019-01-01", (5, 5, 5)),
        made_test("2020-01-01", (15, 20, 20)),
        made_test("2021-01-01", (15, 20, 20)),
        made_test("2022-01-01", (20, 25, 30)),
    ]
    result = run(tests, baseline_revision="automatic", recording_baseline=recording)
    found = row(result.shifts, criterion=RECORDABLE, ear="left", test_id="2022-01-01")
    assert (found["value_db"], found["met"]) == (value, met)


# Baseline, two tests, which of them becomes the baseline (None: neither). By hand from 49 CFR 227 App C, II (D28-D30)
# and III.A (D31-D33), which 29 CFR 1910.95(g)(9) leaves to judgment.
REVISIONS = [
    ("D28", (15, 15, 15), made_test("2021-05-03", (10, 10, 10)), made_test("2022-05-02", (10, 10, 5)), 1),
    ("D29", (15, 15, 15), made_test("2021-05-03", (10, 10, 10)), made_test("2022-05-02", (5, 10, 15)), 0),
    ("D30", (5, 5, 10), made_test("2021-05-03", (0, 0, 5)), made_test("2022-05-02", (0, 0, 10)), None),
    ("D31", (5, 5, 10), made_test("2021-05-03", (15, 20, 20)), made_test("2022-05-02", (20, 20, 20)), 0),
    (
        "D32",
        (5, 5, 10),
        made_test("2021-05-03", (15, 20, 20), hz500=10, hz1000=10, hz6000=30),
        made_test("2022-05-02", (20, 15, 20), hz500=10, hz1000=5, hz6000=25),
        1,
    ),
    ("D33", (5, 5, 10), made_test("2021-05-03", (15, 20, 20)), made_test("2022-05-02", (10, 15, 20)), None),
]


@pytest.mark.parametrize("revision", ["reviewed", "automatic"])
@pytest.mark.parametrize(("name", "baseline", "first", "second", "expected"), REVISIONS, ids=[c[0] for c in REVISIONS])
def test_revision(
    name: str, baseline: Levels, first: HearingTest, second: HearingTest, expected: int | None, revision: str
) -> None:
    result = run([made_test("2020-05-04", baseline), first, second], baseline_revision=revision)
    found = [line for line in result.baselines if line["ear"] == "right" and line["reason"] != "initial"]
    if expected is None:
        assert found == []
        return
    assert [line["test_id"] for line in found] == [(first, second)[expected].test_id]
    assert found[0]["in_force_from"] == second.tested_on
    assert found[0]["status"] == ("proposed" if revision == "reviewed" else "in_force")


@pytest.mark.parametrize(("day", "revised"), [("2024-02-28", False), ("2024-02-29", True)])
def test_six_calendar_months_from_the_31st(day: str, revised: bool) -> None:
    """The project's reading of 49 CFR 227 App C, III.A: from the 31st to the last day of the month."""
    tests = [made_test("2023-01-01", (0, 0, 0)), made_test("2023-08-31", (12, 12, 12)), made_test(day, (12, 12, 12))]
    assert any(line["status"] == "proposed" for line in run(tests).baselines) is revised


def test_confirming_retest_does_not_revise() -> None:
    """Printed, 49 CFR 227 App C, III.C: P08, with a retest inside OSHA's 30 days."""
    tests = [
        made_test("2023-01-01", (0, 0, 0)),
        made_test("2024-01-01", (12, 12, 12)),
        made_test("2024-01-20", (12, 12, 12), purpose="retest"),
    ]
    assert {line["reason"] for line in run(tests).baselines} == {"initial"}
