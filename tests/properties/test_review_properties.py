"""What must hold for every cohort, whatever is in it."""

import datetime
import tempfile
from dataclasses import replace
from pathlib import Path
from typing import Any

from hypothesis import given
from hypothesis import strategies as st

from tests.properties.invented import GAPS, Invented, cells, cohorts, few
from tests.surveillance.small_cohorts import FREQUENCIES_HZ, STS, Row, Tables, hearing_test

RANK = {"no": 0, "unknown": 1, "yes": 2}
KEYS = ("person_id", "test_id", "ear", "criterion")


def review(cohort: Invented, only: str | None = None) -> Tables:
    with tempfile.TemporaryDirectory() as scratch:
        return cohort.review(Path(scratch, "cohort"), only)


def by_key(tables: Tables) -> dict[tuple[str, ...], dict[str, Any]]:
    return {tuple(row[key] for key in KEYS): row for row in tables.shifts}


@st.composite
def shuffled(draw: st.DrawFn, rows: list[Row]) -> list[Row]:
    """The rows in another order; tests of one person on one day keep theirs, and follow one another as before."""
    mixed = draw(st.permutations(rows))
    moment = lambda row: (row["person_id"], row["tested_on"])  # noqa: E731
    waiting = {key: [row for row in rows if moment(row) == key] for key in map(moment, rows)}
    return [waiting[moment(row)].pop(0) for row in mixed]


@few
@given(data=st.data(), cohort=cohorts())
def test_order_of_rows_and_people_does_not_matter(data: st.DataObject, cohort: Invented) -> None:
    people = data.draw(st.permutations(cohort.people))
    other = replace(cohort, tests=data.draw(shuffled(cohort.tests)), people=people)
    assert review(other) == review(cohort)


@few
@given(cohort=cohorts(people=3))
def test_people_are_judged_apart(cohort: Invented) -> None:
    """Split by person and joined again, every table is the same."""
    whole = review(cohort)
    parts = [review(cohort, person["person_id"]) for person in sorted(cohort.people, key=lambda row: row["person_id"])]
    for name in ("shifts", "events", "baselines"):
        assert [row for part in parts for row in getattr(part, name)] == getattr(whole, name)
    for name in ("worklist", "quality"):
        joined = [row for part in parts for row in getattr(part, name)]
        assert sorted(map(str, joined)) == sorted(map(str, getattr(whole, name)))


def _columns() -> st.SearchStrategy[str]:
    return st.sampled_from([f"{ear}_{hz}" for ear in ("right", "left") for hz in FREQUENCIES_HZ])


def _changed(cohort: Invented, number: int, column: str, cell: str) -> Invented:
    tests = [dict(row) for row in cohort.tests]
    tests[number][column] = cell
    return replace(cohort, tests=tests)


def _measured(cell: str) -> bool:
    return cell.replace(".", "").lstrip("-").isdigit()


@few
@given(data=st.data(), cohort=cohorts(people=2))
def test_widening_an_interval_turns_no_answer_round(data: st.DataObject, cohort: Invented) -> None:
    """A measured threshold becomes a no response at its level or below, or is missing: the comparisons of the test,
    and those with it as the same baseline, may become unknown and nothing else."""
    number = data.draw(st.integers(0, len(cohort.tests) - 1))
    column = data.draw(_columns())
    cell = cohort.tests[number][column]
    if _measured(cell):
        lower = float(cell) - data.draw(st.sampled_from((0, 0.1, 5, 15)))
        wider = data.draw(st.sampled_from((f"NR@{lower:g}", "CNT", "DNT", "")))
    else:
        wider = data.draw(st.sampled_from(("NR@15", "CNT"))) if cell.startswith("NR") else ""
    before, after = by_key(review(cohort)), by_key(review(_changed(cohort, number, column, wider)))
    test = cohort.tests[number]["test_id"]
    touched = 0
    for key, row in before.items():
        other = after[key]
        if other["baseline_test_id"] == row["baseline_test_id"] and test in (key[1], row["baseline_test_id"]):
            touched += 1
            assert other["met"] in (row["met"], "unknown"), (row["why"], other["why"])
            if column.startswith(key[2]) and test == key[1] and row["met"] == "unknown":
                assert other["met"] == "unknown" or key[3] != STS
    own = [key for key in before if key[1] == test]
    assert all(before[key]["baseline_test_id"] == after[key]["baseline_test_id"] for key in own), (
        "decided by earlier tests"
    )
    assert touched >= len(own)


@few
@given(data=st.data(), cohort=cohorts(people=2))
def test_a_later_test_changes_no_earlier_shift(data: st.DataObject, cohort: Invented) -> None:
    row = data.draw(st.sampled_from(cohort.tests))
    name = row["person_id"]
    latest = max(other["tested_on"] for other in cohort.tests if other["person_id"] == name)
    day = datetime.date.fromisoformat(latest) + datetime.timedelta(days=data.draw(st.sampled_from(GAPS)))
    purpose = data.draw(st.sampled_from(("annual", "retest", "", "other", "exit")))
    test = hearing_test(f"{name} later", day.isoformat(), data.draw(cells()), data.draw(cells()), purpose, name)
    before = review(cohort)
    after = review(replace(cohort, tests=[*cohort.tests, test]))
    assert [row for row in after.shifts if row["test_id"] != f"{name} later"] == before.shifts


@few
@given(data=st.data(), cohort=cohorts(people=2))
def test_a_worse_threshold_takes_no_flag_away(data: st.DataObject, cohort: Invented) -> None:
    number = data.draw(st.integers(0, len(cohort.tests) - 1))
    column = data.draw(_columns())
    cell = cohort.tests[number][column]
    if not _measured(cell):
        return
    worse = f"{float(cell) + data.draw(st.sampled_from((0.1, 5, 30))):.1f}"
    before, after = by_key(review(cohort)), by_key(review(_changed(cohort, number, column, worse)))
    for key, row in before.items():
        if key[1] == cohort.tests[number]["test_id"]:
            assert RANK[after[key]["met"]] >= RANK[row["met"]], (row["why"], after[key]["why"])
            assert after[key]["baseline_test_id"] == row["baseline_test_id"]


@few
@given(cohort=cohorts(people=3))
def test_the_tables_agree_with_one_another(cohort: Invented) -> None:
    """Every event was met, every verdict has its baseline in force, every line of work its reason."""
    tables = review(cohort)
    shifts = by_key(tables)
    for event in tables.events:
        assert shifts[tuple(event[key] for key in KEYS)]["met"] == "yes"
        decided = shifts[event["person_id"], event["deciding_test_id"], event["ear"], event["criterion"]]
        assert decided["value_db"] == event["value_db"]
        met = {"confirmed": "yes", "not_confirmed": "no", "found_at_retest": "yes"}.get(event["outcome"])
        assert met in (None, decided["met"])
    for row in tables.shifts:
        if row["criterion"] == STS:
            assert row["met"] in {"exact": ("yes", "no"), "none": ("unknown",)}.get(row["bound"], RANK)
            held = tables.find("baselines", person_id=row["person_id"], ear=row["ear"], test_id=row["baseline_test_id"])
            assert any(line["status"] != "proposed" and line["in_force_from"] <= row["tested_on"] for line in held)
    in_force = [row for row in tables.baselines if row["status"] == "in_force"]
    assert len(in_force) == 2 * len({row["person_id"] for row in tables.baselines}), "one for each ear"
    asked = {(row["person_id"], row["test_id"], row["ear"]) for row in tables.find("worklist", action="retest")}
    left = {person["person_id"] for person in cohort.people if "" < person["left_on"] <= str(cohort.options["as_of"])}
    open_ = {(e["person_id"], e["test_id"], e["ear"]) for e in tables.events if e["outcome"] == "retest_open"}
    assert asked == {key for key in open_ if key[0] not in left}
