"""The review of the example holds every outcome of the file contract, and the constructed people come out as meant."""

from pathlib import Path

import pandas as pd
import pytest

from audiokit.cli.main import main

FOLDER = Path(__file__).parents[2] / "example_cohort"
TABLES = ("shifts", "events", "baselines", "worklist", "quality")
STS, RECORDABLE = "us-osha.sts", "us-osha.recordable"


def _review(folder, *options):
    assert main(["review", str(FOLDER), "--out", str(folder), *options]) == 0
    return {name: pd.read_csv(folder / f"{name}.csv", dtype=str, keep_default_na=False) for name in TABLES}


@pytest.fixture(scope="module")
def reviewed(tmp_path_factory):
    return _review(tmp_path_factory.mktemp("reviewed") / "out")


@pytest.fixture(scope="module")
def automatic(tmp_path_factory):
    return _review(tmp_path_factory.mktemp("automatic") / "out", "--baseline-revision", "automatic")


def test_every_outcome_of_both_criteria_occurs(reviewed):
    outcomes = {"retest_open", "confirmed", "not_confirmed", "no_retest", "found_at_retest"}
    events = reviewed["events"]
    assert set(events.loc[events["criterion"] == STS, "outcome"]) == outcomes
    assert set(events.loc[events["criterion"] == RECORDABLE, "outcome"]) == outcomes
    assert "yes" in set(events["recordable"])


def test_every_bound_and_verdict_occurs(reviewed):
    shifts = reviewed["shifts"]
    pairs = set(zip(shifts["bound"], shifts["met"], strict=True))
    assert {("exact", "yes"), ("exact", "no"), ("at_least", "yes"), ("at_least", "unknown")} <= pairs
    assert {("at_most", "unknown"), ("none", "unknown")} <= pairs


def test_every_reason_and_status_of_a_baseline_occurs(reviewed, automatic):
    pairs = set(zip(reviewed["baselines"]["reason"], reviewed["baselines"]["status"], strict=True))
    assert pairs == {
        ("initial", "in_force"),
        ("initial", "superseded"),
        ("decision", "in_force"),
        ("improvement", "proposed"),
        ("persistent_shift", "proposed"),
    } | ({("decision", "superseded")} & pairs)
    assert {"improvement", "persistent_shift"} <= set(automatic["baselines"]["reason"])


def test_every_action_occurs_and_some_are_overdue(reviewed):
    worklist = reviewed["worklist"]
    actions = {"retest", "notify", "record", "annual_test", "baseline_test", "review_baseline", "review_test"}
    assert actions <= set(worklist["action"])
    assert {"yes", "no"} <= set(worklist["overdue"])


def test_tests_after_the_review_date_and_invalid_ones_are_listed(reviewed):
    checks = set(reviewed["quality"]["check"])
    assert {"after_as_of", "marked_invalid", "invalidated_by_decision", "second_baseline", "recheck_1000_hz"} <= checks


def test_shifts_stay_plausible(reviewed):
    """Not a figure from any text: between 2 and 20 in a hundred ears of a yearly round, else the scenario is off."""
    shifts = reviewed["shifts"].query("criterion == @STS")
    assert 0.02 < (shifts["met"] == "yes").mean() < 0.20


# Worked out by hand from contract and history: (test, ear, outcome, deciding test).
EVENTS = {
    "S9001": [("S9001-3", "right", "retest_open", "S9001-3")],
    "S9002": [("S9002-3", "right", "confirmed", "S9002-4")],
    "S9003": [("S9003-2", "right", "no_retest", "S9003-2")],
    "S9004": [("S9004-2", "right", "not_confirmed", "S9004-3")],
    "S9005": [("S9005-2", "right", "confirmed", "S9005-3"), ("S9005-3", "left", "found_at_retest", "S9005-3")],
    "S9006": [("S9006-2", "right", "confirmed", "S9006-3")],
    "S9007": [("S9007-3", "right", "no_retest", "S9007-3"), ("S9007-4", "right", "no_retest", "S9007-4")],
    "S9008": [],
    "S9009": [],
    "S9010": [],
    "S9011": [],
    "S9012": [],
    "S9013": [("S9013-2", "right", "no_retest", "S9013-2")],
    "S9014": [],
    "S9015": [],
    "S9016": [],
    "S9017": [("S9017-2", "right", "no_retest", "S9017-2")],
    "S9018": [("S9018-2", "right", "not_confirmed", "S9018-3")],
    "S9019": [("S9019-2", "right", "confirmed", "S9019-3"), ("S9019-2", "left", "no_retest", "S9019-2")],
    "S9020": [("S9020-2", "right", "confirmed", "S9020-3")],
    "S9021": [("S9021-2", "right", "no_retest", "S9021-2")],
    "S9022": [("S9022-2", "right", "no_retest", "S9022-2"), ("S9022-3", "right", "no_retest", "S9022-3")],
    "S9023": [],
    "S9024": [("S9024-2", "right", "no_retest", "S9024-2")],
}


@pytest.mark.parametrize("person", EVENTS)
def test_constructed_people_have_the_shifts_they_are_for(reviewed, person):
    events = reviewed["events"].query("criterion == @STS and person_id == @person")
    got = events[["test_id", "ear", "outcome", "deciding_test_id"]].itertuples(index=False, name=None)
    assert list(got) == EVENTS[person]


@pytest.mark.parametrize(
    ("person", "test", "bound", "met"),
    [
        ("S9009", "S9009-2", "none", "unknown"),
        ("S9010", "S9010-2", "at_most", "unknown"),
        ("S9011", "S9011-2", "at_least", "unknown"),
        ("S9012", "S9012-2", "none", "unknown"),
        ("S9013", "S9013-2", "at_least", "yes"),
        ("S9024", "S9024-2", "exact", "yes"),
    ],
)
def test_constructed_bounds(reviewed, person, test, bound, met):
    row = reviewed["shifts"].query("criterion == @STS and test_id == @test and ear == 'right'").iloc[0]
    assert (row["person_id"], row["bound"], row["met"]) == (person, bound, met)


@pytest.mark.parametrize(
    ("person", "expected"),
    [
        ("S9001", {("retest", "right", "2026-03-18"), ("notify", "right", "2026-03-09")}),
        ("S9006", {("record", "right", "2026-02-27"), ("notify", "right", "2026-03-13")}),
        ("S9007", {("review_baseline", "right", "")}),
        ("S9008", {("review_baseline", "right", "")}),
        ("S9009", {("review_baseline", "right", "")}),
        ("S9013", {("review_test", "right", "")}),
        ("S9014", {("baseline_test", "", "2026-05-10")}),
        ("S9015", {("baseline_test", "", "2025-03-02")}),
    ],
)
def test_constructed_worklist(reviewed, person, expected):
    lines = reviewed["worklist"].query("person_id == @person")
    assert expected <= set(zip(lines["action"], lines["ear"], lines["due_on"], strict=True))


def test_a_person_who_left_asks_for_nothing_that_came_due_later(reviewed):
    """S9017 left on 2025-11-28; notice and record of the last test fell due after that."""
    assert reviewed["worklist"].query("person_id == 'S9017'").empty


def test_decisions_on_constructed_people_take_effect(reviewed):
    worklist, baselines = reviewed["worklist"], reviewed["baselines"]
    unrelated = worklist.query("person_id == 'S9020'")
    assert "record" not in set(unrelated["action"]), "found not work-related"
    revised = baselines.query("person_id == 'S9022' and ear == 'right'")
    assert list(zip(revised["test_id"], revised["reason"], revised["status"], strict=True)) == [
        ("S9022-1", "initial", "superseded"),
        ("S9022-2", "decision", "in_force"),
    ]
    assert "S9023-2" not in set(reviewed["shifts"]["test_id"]), "invalidated"
    assert "S9016-3" in set(reviewed["shifts"]["test_id"]), "its invalidation was undone"


def test_people_without_tests_have_no_rows_but_a_line_of_work(reviewed):
    for name in ("shifts", "events", "baselines"):
        assert not {"S9014", "S9015"} & set(reviewed[name]["person_id"])


def test_unknown_sex_means_no_age_correction_and_is_said(tmp_path):
    shifts = _review(tmp_path / "out", "--age-correction")["shifts"]
    rows = shifts.query("person_id == 'S9021'")
    assert set(rows["correction_db"].astype(float)) == {0.0}
    assert rows["why"].str.contains("sex").all()
    assert (shifts["correction_db"].replace("", "0").astype(float) > 0).any()
