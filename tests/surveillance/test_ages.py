"""Ages and age corrections (29 CFR 1910.95 Appendix F) as a review shows them; worked out by hand."""

import pytest

from tests.surveillance.small_cohorts import RECORDABLE, STS, decide, hearing_test, review_rows, reviewed, write_cohort

# Sex, birth, dates of baseline and test, sum of the table's values at 2, 3, 4 kHz: now, then; ages now, then.
# Table F-1 (men): 20: 3+4+5, 21: 3+4+5, 23: 3+4+6, 24: 3+5+6, 59: 12+22+32, 60: 13+23+33.
# Table F-2 (women): 20: 4+3+3, 21: 4+4+3, 22: 4+4+4, 60: 12+16+17.
CASES = {
    "birthday": ("male", "1990-05-10", "2013-05-10", "2014-05-10", 14, 13, (24, 23)),
    "day before": ("male", "1990-05-10", "2013-05-10", "2014-05-09", 13, 13, (23, 23)),
    "young": ("female", "2005-03-01", "2020-03-01", "2026-03-01", 11, 10, (21, 15)),
    "young both": ("female", "2005-03-01", "2020-03-01", "2025-03-01", 10, 10, (20, 15)),
    "old": ("male", "1950-03-01", "2009-03-01", "2029-03-01", 69, 66, (79, 59)),
    "old both": ("male", "1930-03-01", "1995-03-01", "2025-03-01", 69, 69, (95, 65)),
    "leap": ("male", "2000-02-29", "2023-03-01", "2024-02-28", 13, 13, (23, 23)),
    "leap day": ("male", "2000-02-29", "2023-03-01", "2024-02-29", 14, 13, (24, 23)),
    "leap common": ("male", "2000-02-29", "2023-02-28", "2023-03-01", 13, 12, (23, 22)),
}


def two_tests(name: str, then: str, now: str) -> list[dict[str, str]]:
    return [
        hearing_test(f"{name} base", then, 10, 10, "baseline", name),
        hearing_test(f"{name} now", now, 20, ("CNT", 20, 20), "annual", name),
    ]


def test_completed_years_and_clamping(tmp_path) -> None:
    rows = [row for name, (_, _, then, now, *_) in CASES.items() for row in two_tests(name, then, now)]
    people = [{"person_id": name, "sex": case[0], "birth_date": case[1]} for name, case in CASES.items()]
    tables = review_rows(tmp_path, rows, people, age_correction=True)
    for name, (*_, now_sum, then_sum, (now, then)) in CASES.items():
        difference = now_sum - then_sum
        for criterion in (STS, RECORDABLE):
            row = tables.one("shifts", person_id=name, ear="right", criterion=criterion)
            assert row["correction_db"] == round(difference / 3, 4), name
            assert (row["measured_db"], row["value_db"]) == (10, round((30 - difference) / 3, 4))
            assert f"age correction for {now} less {then} years" in row["why"]
        row = tables.one("shifts", person_id=name, ear="right", criterion=STS)
        assert row["met"] == ("no" if difference else "yes")
        lacking = tables.one("shifts", person_id=name, ear="left", criterion=STS)
        assert (lacking["correction_db"], lacking["measured_db"]) == (row["correction_db"], ""), "given all the same"


def test_birth_year_only(tmp_path) -> None:
    """The difference of the years; with both, the date counts."""
    rows = [*two_tests("year", "2013-12-31", "2014-01-01"), *two_tests("both", "2013-12-31", "2014-01-01")]
    people = [
        {"person_id": "year", "sex": "m", "birth_year": "1990"},
        {"person_id": "both", "sex": "m", "birth_year": "1990", "birth_date": "1990-05-10"},
    ]
    tables = review_rows(tmp_path, rows, people, age_correction=True)
    year = tables.one("shifts", person_id="year", ear="right", criterion=STS)
    both = tables.one("shifts", person_id="both", ear="right", criterion=STS)
    assert (year["correction_db"], year["met"]) == (0.3333, "no")
    assert (both["correction_db"], both["met"]) == (0, "yes")
    assert "for 24 less 23 years" in year["why"] and "for 23 less 23 years" in both["why"]


@pytest.mark.parametrize(
    "person",
    [{"sex": "unknown", "birth_date": "1990-05-10"}, {"sex": "male"}, {"sex": ""}],
    ids=["sex", "birth", "none"],
)
def test_unknown_sex_or_birth_is_said(tmp_path, person) -> None:
    rows = two_tests("P", "2003-01-01", "2029-01-01")
    tables = review_rows(tmp_path, rows, [{"person_id": "P"} | person], age_correction=True)
    for criterion in (STS, RECORDABLE):
        row = tables.one("shifts", ear="right", criterion=criterion)
        assert (row["correction_db"], row["value_db"]) == (0, 10)
        assert "; no age correction (sex or birth not recorded); corrected shift = 10 dB" in row["why"]
    assert tables.met() == {"P now": "yes"}
    plain = reviewed(tmp_path, age_correction=False).find("shifts")
    assert plain and all(row["correction_db"] == 0 and "age" not in row["why"] for row in plain)


def test_each_ear_has_its_own_baseline_age(tmp_path) -> None:
    """Men: 40 years 6+10+14, 45 years 7+13+18, 48 years 8+14+20 (Table F-1)."""
    rows = [
        hearing_test("at 40", "2010-06-01", 5, 5, "baseline"),
        hearing_test("at 45", "2015-06-01", 5, 5),
        hearing_test("at 48", "2018-06-01", 20, 20),
    ]
    folder = write_cohort(tmp_path, rows, [{"person_id": "P", "sex": "male", "birth_date": "1970-06-01"}])
    decide(folder, "revise_baseline", "at 45", "left", on="2015-06-01")
    tables = reviewed(folder, age_correction=True)
    right, left = (tables.one("shifts", test_id="at 48", criterion=STS, ear=ear) for ear in ("right", "left"))
    assert (right["baseline_test_id"], right["correction_db"], right["value_db"]) == ("at 40", 4, 11)
    assert (left["baseline_test_id"], left["correction_db"], left["value_db"]) == ("at 45", 1.3333, 13.6667)
    assert "48 less 40" in right["why"] and "48 less 45" in left["why"]
    recordable = tables.one("shifts", test_id="at 48", criterion=RECORDABLE, ear="left")
    assert (recordable["baseline_test_id"], recordable["correction_db"]) == ("at 40", 4), "its own baseline's age"
