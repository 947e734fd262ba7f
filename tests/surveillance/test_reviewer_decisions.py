"""Reviewers' decisions from `record_decision` to the tables of the review; expected values by hand."""

import pytest

from audiokit.io.decisions import record_decision
from tests.surveillance.small_cohorts import (
    RECORDABLE,
    SIGNED,
    STS,
    Tables,
    decide,
    hearing_test,
    reviewed,
    write_cohort,
)


def yearly(*levels, left=0, **changes: dict) -> list[dict[str, str]]:
    """Tests A, B, C, … of 1 June of 2020 and the following years, A the baseline; `B={...}` changes cells of B."""
    rows = []
    for number, level in enumerate(levels):
        name = "ABCDEFGHIJ"[number]
        purpose = "annual" if number else "baseline"
        rows.append(hearing_test(name, f"{2020 + number}-06-01", level, left, purpose) | changes.get(name, {}))
    return rows


def idle(tables: Tables) -> list[tuple[str, str, str, str]]:
    """The decisions without effect: number, person, test, ear."""
    found = tables.find("quality", check="decision_without_effect")
    return [(row["value"], row["person_id"], row["test_id"], row["ear"]) for row in found]


def undo(folder, number: int) -> int:
    return record_decision(folder, kind="undo", undoes=number, **SIGNED)


def test_invalidated_test_takes_part_in_nothing(tmp_path) -> None:
    folder = write_cohort(tmp_path, yearly(0, 15, 16))
    before = reviewed(folder)
    number = decide(folder, "invalidate_test", "B", on="2029-01-01")
    after = reviewed(folder)
    assert [row["test_id"] for row in after.find("events", criterion=STS)] == ["C"]
    assert after.met() == {"C": "yes"}
    assert after.history() == [("A", "2020-06-01", "", "initial", "in_force")]
    row = after.one("quality", check="invalidated_by_decision")
    assert (row["test_id"], row["tested_on"], row["value"]) == ("B", "2021-06-01", str(number))
    assert f"decision {number}" in row["why"]
    assert undo(folder, number) == 2
    assert reviewed(folder) == before, "an undo brings everything back"


def test_the_first_valid_audiogram_takes_the_place_of_an_invalid_baseline(tmp_path) -> None:
    """OSHA letter of 19 July 1989."""
    folder = write_cohort(tmp_path, yearly(30, 0, 15, 15))
    assert reviewed(folder).find("events") == []
    number = decide(folder, "invalidate_test", "A")
    tables = reviewed(folder)
    assert tables.history()[0] == ("B", "2021-06-01", "", "initial", "in_force")
    assert tables.compared_with() == {"C": "B", "D": "B"}
    assert tables.outcomes() == {("C", "right"): "no_retest", ("D", "right"): "no_retest"}
    marked = [*yearly(30, 0), hearing_test("M", "2021-07-01", 5, purpose="baseline")]
    other = write_cohort(tmp_path / "marked", marked)
    decide(other, "invalidate_test", "A")
    assert reviewed(other).history()[0][0] == "M", "the next one marked as baseline, before an earlier annual test"
    undo(folder, number)
    assert reviewed(folder).find("events") == []


def test_everything_invalidated_leaves_a_person_without_a_test(tmp_path) -> None:
    rows = yearly(0, 15)
    folder = write_cohort(tmp_path, rows, [{"person_id": "P", "sex": "f", "noise_since": "2020-08-31"}])
    for row in rows:
        decide(folder, "invalidate_test", row["test_id"])
    tables = reviewed(folder)
    assert (tables.shifts, tables.events, tables.baselines) == ([], [], [])
    assert tables.todo("baseline_test") == [("2021-02-28", "yes", "", "")]
    assert len(tables.worklist) == 1


def test_invalidated_retest(tmp_path) -> None:
    """Without the deciding retest the one before it decides, or none."""
    rows = [*yearly(0, 15), hearing_test("R", "2021-06-10", 0, purpose="retest")]
    rows.append(hearing_test("S", "2021-06-20", 12, purpose="retest"))
    folder = write_cohort(tmp_path, rows)
    assert reviewed(folder).outcomes() == {("B", "right"): "confirmed"}
    second = decide(folder, "invalidate_test", "S")
    assert reviewed(folder).outcomes() == {("B", "right"): "not_confirmed"}
    decide(folder, "invalidate_test", "R")
    assert reviewed(folder).outcomes() == {("B", "right"): "no_retest"}
    undo(folder, second)
    assert reviewed(folder).outcomes() == {("B", "right"): "confirmed"}


@pytest.mark.parametrize(
    ("effect", "baselines", "since"),
    [
        ("2022-06-01", {"B": "A", "C": "A", "D": "C", "E": "C"}, "2022-06-01"),
        ("2023-05-31", {"B": "A", "C": "A", "D": "C", "E": "C"}, "2023-05-31"),
        ("2023-06-01", {"B": "A", "C": "A", "D": "A", "E": "C"}, "2023-06-01"),
        ("2024-06-01", {"B": "A", "C": "A", "D": "A", "E": "A"}, "2024-06-01"),
        ("2020-01-01", {"B": "A", "C": "A", "D": "C", "E": "C"}, "2022-06-01"),
    ],
)
def test_tests_dated_after_the_effect_have_the_new_baseline(tmp_path, effect, baselines, since) -> None:
    """The test of that very day does not; before the new baseline's own test nothing takes effect."""
    folder = write_cohort(tmp_path, yearly(0, 15, 16, 17, 18))
    decide(folder, "revise_baseline", "C", "right", on=effect)
    tables = reviewed(folder)
    assert tables.compared_with() == baselines
    assert set(tables.compared_with(ear="left").values()) == {"A"}
    assert tables.met() == {test: "yes" if base == "A" else "no" for test, base in baselines.items()}
    decided = [line for line in tables.history() if line[4] != "proposed"]
    assert decided == [
        ("A", "2020-06-01", since, "initial", "superseded"),
        ("C", since, "", "decision", "in_force"),
    ]
    assert tables.history("left") == [("A", "2020-06-01", "", "initial", "in_force")]
    assert idle(tables) == []
    assert set(tables.compared_with(RECORDABLE).values()) == {"A"}, "recording has its own baseline"


def test_in_force_recording_baseline_is_that_of_sts(tmp_path) -> None:
    folder = write_cohort(tmp_path, yearly(10, 25, 26, 36))
    decide(folder, "revise_baseline", "C", "right", on="2022-06-01")
    assert reviewed(folder).compared_with(RECORDABLE) == {"B": "A", "C": "B", "D": "B"}
    tables = reviewed(folder, recording_baseline="in_force")
    assert tables.compared_with(RECORDABLE) == tables.compared_with() == {"B": "A", "C": "A", "D": "C"}
    assert tables.outcomes(RECORDABLE) == {(test, "right"): "no_retest" for test in "BCD"}


def test_a_run_that_straddles_the_effect_keeps_the_old_baseline(tmp_path) -> None:
    rows = [
        *yearly(0, 15),
        hearing_test("R", "2021-06-10", 15, purpose="retest"),
        hearing_test("S", "2021-06-20", 14, purpose=""),
        hearing_test("T", "2021-07-15", 15, purpose="retest"),
    ]
    folder = write_cohort(tmp_path, rows)
    decide(folder, "revise_baseline", "B", "right", on="2021-06-15")
    tables = reviewed(folder)
    assert tables.compared_with() == {"B": "A", "R": "A", "S": "A", "T": "B"}
    assert tables.outcomes() == {("B", "right"): "confirmed"}
    assert tables.one("events", criterion=STS)["deciding_test_id"] == "S"


def test_a_periodic_test_inside_the_old_window_has_the_new_baseline(tmp_path) -> None:
    """Not a run of retests but tests of their own: the effect counts for each."""
    rows = [*yearly(0, 15), hearing_test("X", "2021-06-20", 16), hearing_test("Y", "2021-06-25", 27)]
    folder = write_cohort(tmp_path, rows)
    decide(folder, "revise_baseline", "B", "right", on="2021-06-15")
    assert reviewed(folder).compared_with() == {"B": "A", "X": "B", "Y": "B"}
    assert reviewed(folder).outcomes() == {("B", "right"): "no_retest", ("Y", "right"): "no_retest"}


def test_two_decisions_on_one_ear(tmp_path) -> None:
    """In order of effect, whatever the order of entry; of two on one day the later entry stands."""
    rows = yearly(0, 15, 16, 30, 31, 45)
    folder = write_cohort(tmp_path / "order", rows)
    decide(folder, "revise_baseline", "D", "right", on="2024-01-01")
    decide(folder, "revise_baseline", "C", "right", on="2022-06-01")
    tables = reviewed(folder)
    assert tables.compared_with() == {"B": "A", "C": "A", "D": "C", "E": "D", "F": "D"}
    assert [line for line in tables.history() if line[4] != "proposed"] == [
        ("A", "2020-06-01", "2022-06-01", "initial", "superseded"),
        ("C", "2022-06-01", "2024-01-01", "decision", "superseded"),
        ("D", "2024-01-01", "", "decision", "in_force"),
    ]
    folder = write_cohort(tmp_path / "same", rows)
    first = decide(folder, "revise_baseline", "B", "right", on="2022-12-01")
    second = decide(folder, "revise_baseline", "C", "right", on="2022-12-01")
    assert reviewed(folder).compared_with()["D"] == "C"
    undo(folder, second)
    assert reviewed(folder).compared_with()["D"] == "B"
    undo(folder, first)
    assert reviewed(folder).compared_with()["D"] == "A"


def test_both_ears_each_at_its_time(tmp_path) -> None:
    folder = write_cohort(tmp_path, yearly(0, 15, 16, 17, 18, left=0))
    decide(folder, "revise_baseline", "C", "right", on="2022-06-01")
    decide(folder, "revise_baseline", "B", "left", on="2023-12-01")
    tables = reviewed(folder)
    assert tables.compared_with(ear="right") == {"B": "A", "C": "A", "D": "C", "E": "C"}
    assert tables.compared_with(ear="left") == {"B": "A", "C": "A", "D": "A", "E": "B"}
    assert tables.history("left")[-1] == ("B", "2023-12-01", "", "decision", "in_force")


def test_an_earlier_test_may_become_the_baseline(tmp_path) -> None:
    """Also one before the initial baseline: from the initial baseline's day at the earliest."""
    rows = [hearing_test("early", "2019-06-01", 8), *yearly(0, 15)]
    folder = write_cohort(tmp_path, rows)
    assert "early" not in reviewed(folder).met()
    decide(folder, "revise_baseline", "early", "right", on="2019-06-01")
    tables = reviewed(folder)
    assert tables.compared_with() == {"B": "early"}
    assert tables.history() == [
        ("A", "2020-06-01", "2020-06-01", "initial", "superseded"),
        ("early", "2020-06-01", "", "decision", "in_force"),
    ]


def test_decisions_without_effect_are_seen(tmp_path) -> None:
    folder = write_cohort(tmp_path, yearly(0, 15, 16, C={"valid": "no"}))
    decide(folder, "revise_baseline", "C", "right", on="2022-06-01")
    decide(folder, "revise_baseline", "nowhere", "left", on="2022-06-01")
    decide(folder, "revise_baseline", "B", "left", on="2030-01-02")
    decide(folder, "revise_baseline", "B", "right", on="2030-01-01")
    decide(folder, "revise_baseline", "B", "right", person="stranger")
    tables = reviewed(folder)
    assert sorted(idle(tables)) == [
        ("1", "P", "C", "right"),
        ("2", "P", "nowhere", "left"),
        ("3", "P", "B", "left"),
        ("5", "stranger", "B", "right"),
    ]
    whys = {row["value"]: row["why"] for row in tables.find("quality", check="decision_without_effect")}
    assert "takes no part" in whys["1"] and "after the date of the review" in whys["3"]
    assert tables.compared_with() == {"B": "A"}
    assert tables.history()[-1] == ("B", "2030-01-01", "", "decision", "in_force")
    assert [line[4] for line in tables.history("left")] == ["in_force"]


def test_automatic_mode_leaves_decisions_on_baselines_out(tmp_path) -> None:
    folder = write_cohort(tmp_path, yearly(0, 15, 16, 17))
    number = decide(folder, "revise_baseline", "C", "right", on="2022-06-01")
    invalid = decide(folder, "invalidate_test", "D")
    tables = reviewed(folder, baseline_revision="automatic")
    assert tables.history()[-1] == ("B", "2022-06-01", "", "persistent_shift", "in_force")
    assert idle(tables) == [(str(number), "P", "C", "right")]
    assert tables.one("quality", check="invalidated_by_decision")["value"] == str(invalid), "which still counts"
    assert tables.compared_with() == {"B": "A", "C": "A"}


def proposals(tables: Tables, ear: str = "right") -> list[str]:
    return [test for test, _, _, _, status in tables.history(ear) if status == "proposed"]


def test_answered_proposals_disappear(tmp_path) -> None:
    """By making that test the baseline, or by deciding on the ear on or after the day that revealed the proposal."""
    folder = write_cohort(tmp_path, yearly(0, 15, 16, 17))
    assert proposals(reviewed(folder)) == ["B"]
    same = decide(folder, "revise_baseline", "B", "right", on="2021-06-01")
    tables = reviewed(folder)
    assert (proposals(tables), tables.todo("review_baseline")) == ([], [])
    assert tables.compared_with() == {"B": "A", "C": "B", "D": "B"}
    undo(folder, same)
    assert proposals(reviewed(folder)) == ["B"]
    other = decide(folder, "revise_baseline", "A", "right", on="2022-06-01")
    tables = reviewed(folder)
    assert (proposals(tables), tables.met()["D"]) == ([], "yes")
    undo(folder, other)
    decide(folder, "revise_baseline", "A", "right", on="2022-05-31")
    tables = reviewed(folder)
    assert proposals(tables) == ["C"], "the sequence began anew on the day before C: C and D reveal another"
    decide(folder, "revise_baseline", "A", "left", on="2029-01-01")
    assert proposals(reviewed(folder)) == ["C"], "the other ear answers nothing"


@pytest.mark.parametrize("effect", ["2022-06-01", "2029-12-31", "2031-01-01"])
def test_a_proposal_of_the_last_test_is_answered_from_its_day_on(tmp_path, effect) -> None:
    """Also by a decision that no test follows yet, or that counts only after the date of the review."""
    folder = write_cohort(tmp_path, yearly(0, 15, 16))
    assert proposals(reviewed(folder)) == ["B"]
    decide(folder, "revise_baseline", "A", "right", on=effect)
    tables = reviewed(folder)
    assert (proposals(tables), tables.met()) == ([], {"B": "yes", "C": "yes"})
    assert len(idle(tables)) == (effect > "2030-01-01")


def test_proposals_are_those_of_the_present_sequence(tmp_path) -> None:
    """A retest after the effect reveals one on the old sequence; it is listed until a test has begun the new one."""
    rows = [*yearly(0, 15, 16), hearing_test("R", "2022-06-20", 14, purpose="retest")]
    folder = write_cohort(tmp_path, [*rows, hearing_test("D", "2023-06-01", 5)])
    decide(folder, "revise_baseline", "A", "right", on="2022-06-10")
    tables = reviewed(folder, as_of="2022-12-31")
    assert tables.history()[-1] == ("R", "2022-06-20", "", "persistent_shift", "proposed")
    assert proposals(reviewed(folder)) == []


def test_a_refused_proposal_disappears_and_nothing_else_changes(tmp_path) -> None:
    folder = write_cohort(tmp_path, yearly(0, 15, 16, 17))
    before = reviewed(folder)
    number = decide(folder, "refuse_baseline", "B", "left")
    assert reviewed(folder) == before, "the other ear"
    decide(folder, "refuse_baseline", "B", "right")
    after = reviewed(folder)
    assert (proposals(after), after.todo("review_baseline")) == ([], [])
    assert (after.shifts, after.events) == (before.shifts, before.events)
    undo(folder, number)
    undo(folder, number + 1)
    assert reviewed(folder) == before


def test_a_proposal_of_an_invalidated_test_is_not_listed(tmp_path) -> None:
    folder = write_cohort(tmp_path, yearly(0, 15, 16, 17))
    decide(folder, "invalidate_test", "B")
    assert proposals(reviewed(folder)) == ["C"]


def test_not_work_related_takes_the_record_line_and_nothing_else(tmp_path) -> None:
    """29 CFR 1904.10(b)(6); the event's row stays, to be read "if work-related", and so does the recording baseline."""
    folder = write_cohort(tmp_path, yearly(10, 30, 31, left=10))
    before = reviewed(folder)
    assert before.todo("record") == [("2021-07-08", "yes", "right", "B")]
    decide(folder, "not_work_related", "B", "left")
    assert reviewed(folder) == before, "the other ear"
    number = decide(folder, "not_work_related", "B", "right")
    after = reviewed(folder)
    assert after.todo("record") == []
    assert (after.shifts, after.events, after.baselines) == (before.shifts, before.events, before.baselines)
    assert after.one("events", criterion=RECORDABLE)["recordable"] == "yes"
    rest = [row for row in before.worklist if row["action"] != "record"]
    assert after.worklist == rest
    undo(folder, number)
    assert reviewed(folder) == before


def test_notices_and_entries_close_their_own_lines(tmp_path) -> None:
    folder = write_cohort(tmp_path, yearly(10, 30, left=10))
    before = reviewed(folder)
    assert len(before.todo("notify")) == len(before.todo("record")) == 1
    notice = decide(folder, "notice_given", "B", "right")
    after = reviewed(folder)
    assert (after.todo("notify"), after.todo("record")) == ([], before.todo("record"))
    assert (after.events, after.shifts, after.quality) == (before.events, before.shifts, before.quality)
    decide(folder, "entry_made", "B", "right")
    assert (reviewed(folder).todo("notify"), reviewed(folder).todo("record")) == ([], [])
    undo(folder, notice)
    assert (reviewed(folder).todo("notify"), reviewed(folder).todo("record")) == (before.todo("notify"), [])


def test_notes_change_nothing(tmp_path) -> None:
    folder = write_cohort(tmp_path, yearly(0, 15, 16))
    before = reviewed(folder)
    decide(folder, "note", "B", "right")
    record_decision(folder, kind="note", person_id="P", **SIGNED)
    assert reviewed(folder) == before
