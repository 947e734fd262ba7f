"""The two persistence rules of 49 CFR 227 Appendix C (II and III.A), as contract and clause give them, by hand.

Each case is one ear (right) of one invented person; the left ear never changes.
"""

import datetime

import pytest

from tests.surveillance.small_cohorts import LATE, hearing_test, review_rows, reviewed, write_cohort


def history(name: str, *tests, base=0, base_cells=()):
    """A person with a baseline on 2020-01-15 and tests (date, level[, purpose][, {hertz: cell}])."""
    rows = [hearing_test(f"{name} 0", "2020-01-15", base, 0, "baseline", name, **dict(base_cells))]
    for number, (day, level, *rest) in enumerate(tests, start=1):
        purpose = next((item for item in rest if isinstance(item, str)), "annual")
        cells = next((item for item in rest if isinstance(item, dict)), {})
        named = {f"right_{hz}": cell for hz, cell in cells.items()}
        rows.append(hearing_test(f"{name} {number}", day, level, 0, purpose, name, **named))
    return rows


def revised(tables, name: str) -> list[tuple[str, str, str]]:
    """Number of the test, date in force from, and reason of every baseline of the right ear after the initial one."""
    found = tables.history(person=name)
    return [(test.removeprefix(f"{name} "), since, why) for test, since, _, why, _ in found if why != "initial"]


@pytest.fixture
def automatic(tmp_path):
    return lambda *people, **settings: review_rows(
        tmp_path, [row for person in people for row in person], baseline_revision="automatic", **settings
    )


def test_six_months_to_the_day(automatic) -> None:
    """Rule 2; from the 31st the month's last day."""
    cases = [
        ("2021-03-15", "2021-09-15", True),
        ("2021-03-15", "2021-09-14", False),
        ("2021-08-31", "2022-02-28", True),
        ("2021-08-31", "2022-02-27", False),
        ("2023-08-31", "2024-02-29", True),
        ("2023-08-31", "2024-02-28", False),
        ("2023-08-29", "2024-02-29", True),
        ("2021-08-28", "2022-02-28", True),
        ("2021-12-31", "2022-06-30", True),
    ]
    tables = automatic(*(history(f"P{n}", (first, 10), (latest, 10)) for n, (first, latest, _) in enumerate(cases)))
    for n, (_, latest, persists) in enumerate(cases):
        assert revised(tables, f"P{n}") == ([("1", latest, "persistent_shift")] if persists else []), cases[n]


def test_a_run_is_measured_from_its_first_test(automatic) -> None:
    """Rule 2 compares the first and the latest only, and ends with a test that did not meet the criterion."""
    tables = automatic(
        history("long", ("2021-01-10", 12), ("2021-04-10", 10), ("2021-07-10", 11)),
        history("short", ("2021-01-10", 12), ("2021-04-10", 10), ("2021-07-09", 11)),
        history("broken", ("2021-01-10", 12), ("2021-04-10", (9, 10, 10)), ("2021-07-10", 11), ("2022-01-09", 11)),
        history("again", ("2021-01-10", 12), ("2021-04-10", 9), ("2021-07-10", 11), ("2022-01-10", 11)),
    )
    assert revised(tables, "long") == [("3", "2021-07-10", "persistent_shift")]
    assert revised(tables, "short") == revised(tables, "broken") == []
    assert revised(tables, "again") == [("3", "2022-01-10", "persistent_shift")]


def test_rule_1_wants_five_decibels_twice_running(automatic) -> None:
    """Exactly 5.0 counts, 4.97 does not; the tests are consecutive; the time between them does not matter."""
    tables = automatic(
        history("five", ("2021-01-10", 10), ("2021-01-11", 10), base=15),
        history("short", ("2021-01-10", 10), ("2022-01-10", (10, 10, 10.1)), base=15),
        history("once", ("2021-01-10", 10), ("2022-01-10", 15), ("2023-01-10", 10), base=15),
        history("three", ("2021-01-10", 14), ("2022-01-10", 10), ("2023-01-10", (9, 10, 10)), base=15),
        history("uneven", ("2021-01-10", (15, 15, 0)), ("2022-01-10", (0, 15, 15)), base=15),
    )
    assert revised(tables, "five") == [("1", "2021-01-11", "improvement")]
    assert revised(tables, "short") == revised(tables, "once") == []
    assert revised(tables, "three") == [("3", "2023-01-10", "improvement")]
    assert revised(tables, "uneven") == [("1", "2022-01-10", "improvement")], "a tie: the earlier"


def test_rule_1_breaks_no_tie_elsewhere(automatic) -> None:
    tables = automatic(history("P", ("2021-01-10", 5, {500: 20}), ("2022-01-10", 5, {500: 10}), base=15))
    assert revised(tables, "P") == [("1", "2022-01-10", "improvement")]


# The later test's cells at other frequencies against the earlier one's; True where it is better elsewhere.
TIES = [
    ({500: 10, 6000: 30}, {500: 10, 6000: 25}, True),
    ({500: 10, 6000: 30}, {500: 10, 6000: 30}, False),
    ({500: 10, 6000: 30}, {500: 15, 6000: 20}, False),
    ({500: 10, 6000: 30}, {500: 9.9, 6000: 30}, True),
    ({500: 10, 6000: "NR@90"}, {500: 5, 6000: "NR@90"}, True),
    ({500: 10, 6000: "NR@90"}, {500: 10, 6000: "NR@90"}, False),
    ({500: 10, 6000: "NR@90"}, {500: 5, 6000: "NR@95"}, False),
    ({500: 10, 6000: "NR@95"}, {500: 5, 6000: "NR@90"}, False),
    ({500: 10, 6000: "NR@90"}, {500: 10, 6000: 85}, True),
    ({500: 10, 6000: "NR@90"}, {500: 5, 6000: 90}, True),
    ({500: 10, 6000: "NR@90"}, {500: 10, 6000: 90}, False),
    ({500: 10, 6000: "NR@90"}, {500: 5, 6000: 95}, False),
    ({500: 10, 6000: 85}, {500: 5, 6000: "NR@90"}, False),
    ({500: 10, 6000: 85}, {500: 5, 6000: "NR@80"}, False),
    ({500: 10, 6000: "CNT"}, {500: 5, 6000: 60}, True),
    ({500: 10, 6000: 20}, {500: 5, 6000: ""}, True),
    ({500: "DNT", 6000: 20}, {500: 5, 6000: "DNT"}, False),
    ({}, {}, False),
]


def test_ties_of_rule_2_are_broken_elsewhere(automatic) -> None:
    """None is worse and one is better among the pairs with an interval in both; not surely equal counts as worse."""
    people = [
        history(f"{n:02}", ("2021-01-10", (15, 20, 20), earlier), ("2022-01-10", (20, 20, 15), later))
        for n, (earlier, later, _) in enumerate(TIES)
    ]
    tables = automatic(*people)
    found = {n: revised(tables, f"{n:02}") for n in range(len(TIES))}
    assert found == {
        n: [("2" if better else "1", "2022-01-10", "persistent_shift")] for n, (_, _, better) in enumerate(TIES)
    }


def test_an_inexact_shift_interrupts_both_rules(automatic) -> None:
    """A test whose shift is no exact number stays in the sequence: no partner for Rule 1, end of a run of Rule 2."""
    silent = ("NR@90", 60, 60)
    tables = automatic(
        history("nr", ("2021-01-10", 15), ("2021-03-10", silent), ("2022-01-10", 15)),
        history("missing", ("2021-01-10", 15), ("2021-03-10", ("CNT", 15, 15)), ("2022-01-10", 15)),
        history("after", ("2021-01-10", silent), ("2021-03-10", 15), ("2021-09-10", 15)),
        history("too soon", ("2021-01-10", silent), ("2021-03-10", 15), ("2021-09-09", 15)),
        history("better", ("2021-01-10", 5), ("2021-03-10", (5, 5, "DNT")), ("2022-01-10", 5), base=20),
        history("baseline", ("2021-01-10", 15), ("2022-01-10", 15), base=(0, 0, "NR@80")),
        history("better nr", ("2021-01-10", 5), ("2022-01-10", 5), base=("NR@90", 60, 60)),
    )
    assert tables.met(person="nr") == {"nr 1": "yes", "nr 2": "yes", "nr 3": "yes"}, "met, and yet it ends the run"
    assert revised(tables, "after") == [("2", "2021-09-10", "persistent_shift")]
    for name in ("nr", "missing", "too soon", "better", "baseline", "better nr"):
        assert revised(tables, name) == [], name


def test_the_sequence_starts_anew_after_a_revision(automatic) -> None:
    """Later tests are compared with the new baseline, and count anew."""
    steps = [("2021-01-10", 12), ("2022-01-10", 14), ("2023-01-10", 22), ("2024-01-10", 21), ("2025-01-10", 21)]
    tables = automatic(history("P", *steps))
    assert tables.history() == [
        ("P 0", "2020-01-15", "2022-01-10", "initial", "superseded"),
        ("P 1", "2022-01-10", "", "persistent_shift", "in_force"),
    ]
    assert tables.compared_with() == {"P 1": "P 0", "P 2": "P 0", "P 3": "P 1", "P 4": "P 1", "P 5": "P 1"}
    assert tables.met() == {"P 1": "yes", "P 2": "yes", "P 3": "yes", "P 4": "no", "P 5": "no"}
    assert tables.history("left") == [("P 0", "2020-01-15", "", "initial", "in_force")]
    assert set(tables.compared_with(ear="left").values()) == {"P 0"}


def test_revisions_follow_one_another(automatic) -> None:
    """Worse, then better than the revised baseline: Rule 2, then Rule 1, each from the date that revealed it."""
    levels = [12, 12, 7, 6, 6]
    tables = automatic(history("P", *((f"{2021 + n}-01-10", level) for n, level in enumerate(levels))))
    assert tables.history() == [
        ("P 0", "2020-01-15", "2022-01-10", "initial", "superseded"),
        ("P 1", "2022-01-10", "2024-01-10", "persistent_shift", "superseded"),
        ("P 4", "2024-01-10", "", "improvement", "in_force"),
    ]
    assert tables.compared_with()["P 5"] == "P 4"


def test_a_deciding_retest_stands_in_the_sequence(automatic) -> None:
    """The new baseline may be the retest, in force from the date of the test that revealed it."""
    tables = automatic(
        history(
            "P", ("2021-01-10", 15), ("2021-01-20", 14, "retest"), ("2021-01-25", 12, "retest"), ("2022-01-10", 13)
        ),
        history("Q", ("2021-01-10", 15), ("2021-07-20", 15), ("2021-08-01", 11, "retest"), ("2022-07-20", 15)),
        history("R", ("2021-01-10", 15), ("2021-07-20", 15), ("2021-08-01", 0, "retest"), ("2022-01-31", 15)),
    )
    assert revised(tables, "P") == [("3", "2022-01-10", "persistent_shift")]
    assert revised(tables, "Q") == [("3", "2021-08-01", "persistent_shift")]
    assert revised(tables, "R") == []


def test_both_rules_leave_age_out(tmp_path) -> None:
    """Rule 1 and the choice of Rule 2 take hearing levels as measured; whether sts is met takes the correction."""
    man = {"sex": "male", "birth_date": "1970-01-10"}
    rows = [
        *history("better", ("2021-01-10", 9), ("2022-01-10", (10, 10, 10)), base=15),
        *history("nearly", ("2021-01-10", 9), ("2022-01-10", (10, 10, 10.1)), base=15),
        *history("held", ("2021-01-10", 10), ("2022-01-10", 10)),
    ]
    people = [{"person_id": name} | man for name in ("better", "nearly", "held")]
    tables = review_rows(tmp_path, rows, people, baseline_revision="automatic", age_correction=True)
    assert revised(tables, "better") == [("1", "2022-01-10", "improvement")]
    assert revised(tables, "nearly") == []
    assert tables.met(person="held") == {"held 1": "no", "held 2": "no"}
    assert revised(tables, "held") == []


def test_reviewed_only_proposes(tmp_path) -> None:
    """Every distinct proposal once, where it was first revealed; the worklist asks about the latest only."""
    levels = (15, 16, 12, 12, 11)
    steps = [(f"{2021 + n}-01-10", level) for n, level in enumerate(levels)]
    folder = write_cohort(tmp_path, history("P", *steps))
    tables = reviewed(folder)
    proposals = (("P 1", 2022), ("P 3", 2023), ("P 4", 2024), ("P 5", 2025))
    assert tables.history() == [
        ("P 0", "2020-01-15", "", "initial", "in_force"),
        *((test, f"{year}-01-10", "", "persistent_shift", "proposed") for test, year in proposals),
    ]
    assert tables.todo("review_baseline") == [("", "no", "right", "P 5")]
    assert set(tables.compared_with().values()) == {"P 0"}
    earlier = reviewed(folder, as_of=datetime.date(2022, 6, 1))
    assert earlier.todo("review_baseline") == [("", "no", "right", "P 1")]


def test_one_test_may_be_proposed_for_both_reasons_and_in_both_ears(tmp_path) -> None:
    rows = [
        hearing_test("base", "2020-01-15", 20, 20, "baseline"),
        hearing_test("A", "2021-01-10", 10, 30),
        hearing_test("B", "2022-01-10", 5, 31),
    ]
    tables = review_rows(tmp_path, rows)
    assert tables.history("right")[1:] == [("B", "2022-01-10", "", "improvement", "proposed")]
    assert tables.history("left")[1:] == [("A", "2022-01-10", "", "persistent_shift", "proposed")]
    assert sorted(tables.todo("review_baseline")) == [("", "no", "left", "A"), ("", "no", "right", "B")]
    whys = {row["test_id"]: row["why"] for row in tables.find("worklist", action="review_baseline")}
    assert "improvement" in whys["B"] and "29 CFR 1910.95(g)(9)" in whys["A"]


def test_a_proposal_is_as_good_as_its_tests(tmp_path) -> None:
    """Where a test does not count, what it revealed does not either."""
    rows = history("P", ("2021-01-10", 12), ("2022-01-10", 13), ("2022-02-10", 14))
    assert [row[0] for row in review_rows(tmp_path / "a", rows).history()] == ["P 0", "P 1"]
    rows[1]["valid"] = "no"
    assert [row[0] for row in review_rows(tmp_path / "b", rows).history()] == ["P 0"]


def test_both_modes_agree_up_to_the_first_revision(tmp_path) -> None:
    """The first proposal of each ear is the first revision."""
    steps = [(f"{2021 + n}-01-10", level) for n, level in enumerate((12, 14, 3, 2, 25, 26, 24))]
    folder = write_cohort(tmp_path, history("P", *steps))
    first = {mode: reviewed(folder, LATE, baseline_revision=mode).history()[1] for mode in ("reviewed", "automatic")}
    assert first["reviewed"][:2] == first["automatic"][:2] == ("P 1", "2022-01-10")
