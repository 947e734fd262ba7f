"""The worklist and its deadlines (29 CFR 1910.95(g), 1904.10(b)(4)); dates by hand."""

import datetime

import pytest

from tests.surveillance.small_cohorts import RECORDABLE, STS, decide, hearing_test, reviewed, write_cohort


def day(text: str, more: int = 0) -> str:
    return (datetime.date.fromisoformat(text) + datetime.timedelta(days=more)).isoformat()


def person(name: str, **dates: str) -> dict[str, str]:
    return {"person_id": name, "sex": "female"} | dates


def test_every_deadline_of_an_event(tmp_path) -> None:
    """Retest 30 days, notice 21 days, entry 37 days after the test, or 7 days after the deciding retest."""
    base = hearing_test("A", "2023-01-31", 10, 10, "baseline")
    test = hearing_test("B", "2024-01-31", 30, 10)
    retest = hearing_test("R", "2024-02-29", 28, 10, "retest")
    folder = write_cohort(tmp_path, [base, test, retest])
    open_ = reviewed(folder, as_of="2024-02-10")
    assert open_.todo("retest") == [("2024-03-01", "no", "right", "B")]
    assert open_.todo("notify") == [("2024-02-21", "no", "right", "B")]
    assert open_.todo("record") == []
    assert open_.todo("annual_test") == [("2025-01-31", "no", "", "B")]
    retest = open_.one("worklist", action="retest")
    assert sorted(retest["criterion"].split(";")) == [RECORDABLE, STS], "two criteria ask for one retest"
    decided = reviewed(folder, as_of="2024-03-10")
    assert decided.todo("retest") == []
    assert decided.todo("notify") == [("2024-03-21", "no", "right", "B")]
    assert decided.todo("record") == [("2024-03-07", "yes", "right", "B")]
    assert decided.todo("annual_test") == [("2025-02-28", "no", "", "R")], "12 months after the deciding retest"
    decide(folder, "invalidate_test", "R")
    none = reviewed(folder, as_of="2024-03-10")
    assert none.todo("notify") == [("2024-02-21", "yes", "right", "B")]
    assert none.todo("record") == [("2024-03-08", "yes", "right", "B")]
    assert "review_baseline" not in {row["action"] for row in none.worklist}


@pytest.mark.parametrize(
    ("action", "due"),
    [("notify", "2024-02-21"), ("annual_test", "2025-01-31"), ("record", "2024-03-08"), ("retest", "2024-03-01")],
)
def test_overdue_from_the_day_after(tmp_path, action, due) -> None:
    rows = [hearing_test("A", "2023-01-31", 10, 10, "baseline"), hearing_test("B", "2024-01-31", 30, 10)]
    folder = write_cohort(tmp_path, rows)
    on_the_day, after = (reviewed(folder, as_of=day(due, more)).todo(action) for more in (0, 1))
    if action != "record":
        assert on_the_day == [(due, "no", "" if action == "annual_test" else "right", "B")]
    if action == "retest":
        assert after == [], "then the window is closed"
    else:
        assert after == [(due, "yes", "" if action == "annual_test" else "right", "B")]


def test_annual_tests_at_month_ends_and_after_retests(tmp_path) -> None:
    """29 CFR 1910.95(g)(6): a year after the latest effective test, also the baseline."""
    rows = [
        hearing_test("leap", "2024-02-29", 0, person="leap"),
        hearing_test("only", "2023-02-28", 0, purpose="baseline", person="only"),
        hearing_test("X1", "2022-01-10", 0, person="X"),
        hearing_test("X2", "2023-01-10", 20, person="X"),
        hearing_test("X3", "2023-01-20", 20, purpose="retest", person="X"),
        hearing_test("X4", "2023-01-30", "CNT", "CNT", purpose="retest", person="X"),
        hearing_test("Y1", "2022-01-10", 0, person="Y"),
        hearing_test("Y2", "2023-01-10", 20, person="Y"),
        hearing_test("Y3", "2023-01-30", "CNT", "CNT", purpose="retest", person="Y"),
        hearing_test("Z1", "2022-01-10", 0, person="Z"),
        hearing_test("Z2", "2023-01-10", 5, person="Z"),
        hearing_test("Z3", "2023-01-30", 5, purpose="retest", person="Z"),
    ]
    tables = reviewed(write_cohort(tmp_path, rows), as_of="2024-03-01")
    due = {name: tables.todo("annual_test", name) for name in ("leap", "only", "X", "Y", "Z")}
    assert due == {
        "leap": [("2025-02-28", "no", "", "leap")],
        "only": [("2024-02-28", "yes", "", "only")],
        "X": [("2024-01-20", "yes", "", "X3")],
        "Y": [("2024-01-10", "yes", "", "Y2")],
        "Z": [("2024-01-30", "yes", "", "Z3")],
    }


def test_baseline_tests(tmp_path) -> None:
    """29 CFR 1910.95(g)(5)(i): six months after the first exposure; without a date there is none to be late for."""
    people = [
        person("Aug 31", noise_since="2023-08-31"),
        person("due today", noise_since="2023-09-01"),
        person("late", noise_since="2023-08-01"),
        person("no date"),
        person("has one", noise_since="2023-08-01"),
        person("future", noise_since="2024-12-31"),
        person("invalid", noise_since="2024-01-15"),
    ]
    rows = [
        hearing_test("T", "2024-01-01", 0, person="has one"),
        hearing_test("U", "2024-01-20", 0, person="invalid", valid="no"),
        hearing_test("V", "2024-03-02", 0, person="due today"),
    ]
    tables = reviewed(write_cohort(tmp_path, rows, people), as_of="2024-03-01")
    due = {row["person_id"]: tables.todo("baseline_test", row["person_id"]) for row in people}
    assert due == {
        "Aug 31": [("2024-02-29", "yes", "", "")],
        "due today": [("2024-03-01", "no", "", "")],
        "late": [("2024-02-01", "yes", "", "")],
        "no date": [("", "unknown", "", "")],
        "has one": [],
        "future": [("2025-06-30", "no", "", "")],
        "invalid": [("2024-07-15", "no", "", "")],
    }
    assert {row["person_id"] for row in tables.worklist} == {row["person_id"] for row in people}


def test_people_who_left(tmp_path) -> None:
    """Only notices and records that became due before they left; from the day they leave."""
    rows, people = [], []
    for name, left_on in (
        ("stays", ""),
        ("tomorrow", "2024-03-11"),
        ("today", "2024-03-10"),
        ("before record", "2024-03-08"),
        ("after record", "2024-03-09"),
        ("before notice", "2024-02-21"),
        ("after notice", "2024-02-22"),
    ):
        people.append(person(name, left_on=left_on))
        rows.append(hearing_test(f"{name} A", "2023-01-31", 10, 10, "baseline", name))
        rows.append(hearing_test(f"{name} B", "2024-01-31", 30, 10, "annual", name))
    people.append(person("never tested", left_on="2024-03-01", noise_since="2022-01-01"))
    tables = reviewed(write_cohort(tmp_path, rows, people), as_of="2024-03-10")
    found = {row["person_id"]: {line["action"] for line in tables.worklist if line["person_id"] == row["person_id"]}
             for row in people}  # fmt: skip
    everything = {"notify", "record", "annual_test"}
    assert found == {
        "stays": everything,
        "tomorrow": everything,
        "today": {"notify", "record"},
        "before record": {"notify"},
        "after record": {"notify", "record"},
        "before notice": set(),
        "after notice": {"notify"},
        "never tested": set(),
    }


def test_baselines_and_tests_that_cannot_be_judged(tmp_path) -> None:
    """A baseline without 2, 3 or 4 kHz makes that ear unknown; a level that cannot be told asks for a look."""
    rows = [
        hearing_test("A", "2023-01-31", (10, "CNT", 10), 10, "baseline"),
        hearing_test("B", "2024-01-31", 30, ("NR@24", 20, 20)),
        hearing_test("C", "2025-01-31", 30, ("NR@40", 20, 15)),
    ]
    tables = reviewed(write_cohort(tmp_path, rows))
    assert set(tables.met().values()) == set(tables.met(RECORDABLE).values()) == {"unknown"}
    assert tables.todo("review_baseline") == [("", "no", "right", "A")]
    assert tables.met(ear="left") == {"B": "yes", "C": "yes"}
    assert tables.met(RECORDABLE, "left") == {"B": "unknown", "C": "yes"}
    assert tables.todo("review_test") == [("", "no", "left", "B")]
    assert not any(row["baseline_test_id"] != "A" for row in tables.shifts if row["test_id"] == "B")


def test_a_baseline_in_force_by_decision_is_looked_at(tmp_path) -> None:
    rows = [hearing_test("A", "2023-01-31", 0), hearing_test("B", "2024-01-31", ("DNT", 0, 0))]
    folder = write_cohort(tmp_path, rows)
    assert reviewed(folder).todo("review_baseline") == []
    decide(folder, "revise_baseline", "B", "right", on="2024-01-31")
    assert reviewed(folder).todo("review_baseline") == [("", "no", "right", "B")]


def test_soonest_first_and_one_line_each(tmp_path) -> None:
    rows = []
    for number in range(12):
        name = f"P{number:02}"
        rows.append(hearing_test(f"{name} A", f"2022-{number + 1:02}-03", 10, 10, "baseline", name))
        rows.append(hearing_test(f"{name} B", f"2023-{12 - number:02}-03", 30, "CNT", "annual", name))
        rows.append(hearing_test(f"{name} C", f"2024-{12 - number:02}-03", 32, 10, "annual", name))
    tables = reviewed(write_cohort(tmp_path, rows), as_of="2024-06-20")
    dates = [row["due_on"] for row in tables.worklist]
    dated = [date for date in dates if date]
    assert dated == sorted(dated) and dates[: len(dated)] == dated, "lines without a date come last"
    keys = [(row["person_id"], row["test_id"], row["ear"], row["action"]) for row in tables.worklist]
    assert len(set(keys)) == len(keys)
    assert {row["action"] for row in tables.worklist} >= {"retest", "notify", "record", "annual_test"}
    assert all(
        row["why"] and (row["overdue"] == "yes") == ("" < row["due_on"] < "2024-06-20") for row in tables.worklist
    )
