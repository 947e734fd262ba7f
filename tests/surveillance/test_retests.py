"""Retests: who belongs to a run, which one decides, and what becomes of the event (29 CFR 1910.95(g)(7)(ii)).

All people, tests and dates are invented; the expected values are worked out by hand from the file contract.
"""

import datetime

import pytest

from tests.surveillance.small_cohorts import RECORDABLE, STS, hearing_test, review_rows, reviewed, write_cohort

FIRST = datetime.date(2024, 2, 10)  # the 30 days hold a 29 February


def after(days: int) -> str:
    return (FIRST + datetime.timedelta(days=days)).isoformat()


def case(name: str, *later, first=15, first_left=0):
    """A person with a baseline at 0 dB, a test that met sts on FIRST, and later ones (days, right[, left, purpose])."""
    rows = [
        hearing_test(f"{name} base", "2023-02-10", 0, 0, "baseline", name),
        hearing_test(f"{name} first", after(0), first, first_left, "annual", name),
    ]
    for number, (days, right, *rest) in enumerate(later, start=1):
        left = rest[0] if rest else 0
        purpose = rest[1] if len(rest) > 1 else "retest"
        rows.append(hearing_test(f"{name} {number}", after(days), right, left, purpose, name))
    return rows


def outcomes(tables, name: str, criterion: str = STS) -> dict[tuple[str, str], str]:
    """Outcome by the number of the test and the ear."""
    return {
        (test.removeprefix(f"{name} "), ear): outcome
        for (test, ear), outcome in tables.outcomes(criterion, person=name).items()
    }


@pytest.mark.parametrize("purpose", ["retest", ""])
def test_the_window_is_thirty_days(tmp_path, purpose) -> None:
    """29 CFR 1910.95(g)(7)(ii); day 30 counts, day 31 does not: letters of 17 April 1991 and 4 March 2004."""
    days = (0, 1, 29, 30, 31)
    tables = review_rows(tmp_path, [row for day in days for row in case(f"P{day}", (day, 0, 0, purpose))])
    found = {day: outcomes(tables, f"P{day}") for day in days}
    expected = {day: "not_confirmed" if day <= 30 else "no_retest" for day in days}
    assert found == {day: {("first", "right"): outcome} for day, outcome in expected.items()}
    for day in days:
        event = tables.one("events", person_id=f"P{day}")
        assert event["deciding_test_id"] == (f"P{day} 1" if day <= 30 else f"P{day} first")
        assert f"on day {day} of 30" in event["why"] or day == 31


def test_only_blank_and_retest_are_retests(tmp_path) -> None:
    purposes = ("annual", "exit", "other", "baseline")
    rows = [row for purpose in purposes for row in case(purpose, (7, 0, 0, purpose), (9, 0))]
    tables = review_rows(tmp_path, rows)
    for purpose in purposes:
        assert outcomes(tables, purpose) == {("first", "right"): "no_retest"}


def test_a_retest_needs_a_periodic_test_that_met_sts(tmp_path) -> None:
    """After a test that did not meet it, "retest" is a word: the test is periodic and makes its own event."""
    tables = review_rows(tmp_path, [*case("none", (7, 15), first=5), *case("unknown", (7, 15), first="CNT")])
    for name in ("none", "unknown"):
        assert outcomes(tables, name) == {("1", "right"): "no_retest"}
        assert tables.one("events", person_id=name)["notify_by"] == after(7 + 21)


def test_other_ear_opens_the_window_too(tmp_path) -> None:
    """The retest counts for both ears: OSHA letter of 18 June 1985."""
    tables = review_rows(tmp_path, case("P", (10, 0, 15), first=0, first_left=15) + case("Q", (10, 15, 15)))
    assert outcomes(tables, "P") == {("first", "left"): "confirmed"}
    assert outcomes(tables, "Q") == {("first", "right"): "confirmed", ("1", "left"): "found_at_retest"}


def test_a_periodic_test_breaks_the_run(tmp_path) -> None:
    """Tests after it belong to it, or to nobody, though they lie in the first window."""
    tables = review_rows(
        tmp_path,
        [
            *case("clean", (5, 15), (10, 0, 0, "annual"), (15, 0)),
            *case("met", (5, 15), (10, 15, 0, "annual"), (15, 0)),
            *case("alone", (10, 0, 0, "annual"), (15, 0)),
        ],
    )
    assert outcomes(tables, "clean") == {("first", "right"): "confirmed"}
    assert outcomes(tables, "met") == {("first", "right"): "confirmed", ("2", "right"): "not_confirmed"}
    assert outcomes(tables, "alone") == {("first", "right"): "no_retest"}


def test_retests_of_a_retest_count_from_the_periodic_test(tmp_path) -> None:
    """Day 40 lies 15 days after the retest of day 25, but not in the window: it is periodic, and has its own."""
    tables = review_rows(tmp_path, case("P", (25, 15), (40, 15), (70, 0), (71, 0)))
    assert outcomes(tables, "P") == {("first", "right"): "confirmed", ("2", "right"): "not_confirmed"}
    assert tables.one("events", test_id="P 2")["deciding_test_id"] == "P 3"
    assert tables.todo("annual_test") == [("2025-04-21", "yes", "", "P 4")], "day 71 is a periodic test: 2024-04-21"


def test_invalid_test_neither_retests_nor_breaks(tmp_path) -> None:
    rows = case("P", (5, 15, 0, "annual"), (9, 0), (20, 15))
    for row in rows:
        if row["test_id"] in ("P 1", "P 3"):
            row["valid"] = "no"
    tables = review_rows(tmp_path, rows)
    assert outcomes(tables, "P") == {("first", "right"): "not_confirmed"}
    assert [row["test_id"] for row in tables.find("quality", check="marked_invalid")] == ["P 1", "P 3"]
    assert not tables.find("shifts", test_id="P 1")


@pytest.mark.parametrize(
    ("levels", "outcome", "decides"),
    [
        ((15, 0), "not_confirmed", "2"),
        ((0, 15), "confirmed", "2"),
        ((0, "CNT"), "not_confirmed", "1"),
        ((15, "", "DNT"), "confirmed", "1"),
        (("CNT", "CNT"), "no_retest", "first"),
    ],
)
def test_the_last_that_knows_decides(tmp_path, levels, outcome, decides) -> None:
    """A retest that is known in neither ear decides nothing; then the one before it does."""
    later = [(5 + n, level, "CNT") for n, level in enumerate(levels)]
    tables = review_rows(tmp_path, case("P", *later))
    event = tables.one("events", criterion=STS)
    assert (event["test_id"], event["outcome"], event["deciding_test_id"]) == ("P first", outcome, f"P {decides}")
    assert (
        event["notify_by"]
        == {
            "not_confirmed": "",
            "confirmed": after(21 + (5 if decides == "1" else 6)),
            "no_retest": after(21),
        }[outcome]
    )


def test_an_ear_unknown_at_the_deciding_retest_keeps_its_periodic_test(tmp_path) -> None:
    """The last retest decides the right ear; the left stays, though an earlier retest knew it."""
    tables = review_rows(tmp_path, case("P", (5, 0, 0), (9, 15, "CNT"), first_left=15))
    assert outcomes(tables, "P") == {("first", "right"): "confirmed", ("first", "left"): "no_retest"}
    left = tables.one("events", ear="left")
    assert (left["deciding_test_id"], left["value_db"], left["notify_by"]) == ("P first", 15, after(21))
    assert tables.one("events", ear="right")["deciding_test_id"] == "P 2"


def test_found_at_retest(tmp_path) -> None:
    """Met at the deciding retest only, also where the periodic test was unknown; other retests make no event."""
    rows = [
        *case("known", (5, 15, 15)),
        *case("unknown", (5, 15, 15), first_left="CNT"),
        *case("between", (5, 15, 15), (6, 15, 0)),
        *case("undecided", (5, 15, 15), (6, 15, "CNT")),
    ]
    tables = review_rows(tmp_path, rows)
    for name in ("known", "unknown"):
        assert outcomes(tables, name) == {("first", "right"): "confirmed", ("1", "left"): "found_at_retest"}
        event = tables.one("events", person_id=name, ear="left")
        assert (event["tested_on"], event["deciding_test_id"], event["value_db"]) == (after(5), f"{name} 1", 15)
        assert (event["notify_by"], event["retest_by"]) == (after(26), "")
    for name in ("between", "undecided"):
        assert outcomes(tables, name) == {("first", "right"): "confirmed"}
        assert tables.met(ear="left", person=name)[f"{name} 1"] == "yes"


@pytest.mark.parametrize(
    ("days", "outcome", "retest_by"),
    [(0, "retest_open", after(30)), (30, "retest_open", after(30)), (31, "no_retest", "")],
)
def test_open_until_the_thirtieth_day(tmp_path, days, outcome, retest_by) -> None:
    """Also with a retest that decides nothing; later tests do not count yet."""
    rows = [*case("P", (29, "CNT", "CNT"), (32, 0)), *case("Q", (31, 0))]
    tables = reviewed(write_cohort(tmp_path, rows), as_of=after(days))
    for name in "PQ":
        event = tables.one("events", person_id=name, criterion=STS)
        assert (event["outcome"], event["retest_by"]) == (outcome, retest_by)
        assert (event["deciding_test_id"], event["notify_by"]) == (f"{name} first", after(21))
        assert [line[0] for line in tables.todo("retest", name)] == ([after(30)] if retest_by else [])
    late = {row["test_id"] for row in tables.find("quality", check="after_as_of")}
    assert late == {row["test_id"] for row in rows if row["tested_on"] > after(days)}


def test_recordable_has_its_own_runs(tmp_path) -> None:
    """29 CFR 1904.10(b)(4): it is opened by either criterion and decided by its own verdict."""
    base = {"first": 26, "first_left": 0}
    rows = [*case("below", (10, 24), **base), *case("stays", (10, 26), **base), *case("none", **base)]
    rows += [*case("reached", (10, 25), first=24), *case("lost", (10, ("CNT", 26, 26)), **base)]
    tables = review_rows(tmp_path, rows)
    names = ("below", "stays", "none", "reached", "lost")
    sts, recordable = ([outcomes(tables, name, c) for name in names] for c in (STS, RECORDABLE))
    first = ("first", "right")
    assert sts == [{first: o} for o in ("confirmed", "confirmed", "no_retest", "confirmed", "no_retest")]
    assert recordable == [
        {first: "not_confirmed"},
        {first: "confirmed"},
        {first: "no_retest"},
        {("1", "right"): "found_at_retest"},
        {first: "no_retest"},
    ]
    events = {name: tables.one("events", person_id=name, criterion=RECORDABLE) for name in names}
    found = {name: (e["recordable"], e["record_by"], e["mean_hl_db"], e["notify_by"]) for name, e in events.items()}
    assert found == {
        "below": ("", "", 24, ""),
        "stays": ("yes", after(17), 26, ""),
        "none": ("yes", after(37), 26, ""),
        "reached": ("yes", after(17), 25, ""),
        "lost": ("yes", after(37), 26, ""),
    }


def test_recordable_without_sts_opens_no_run_of_sts(tmp_path) -> None:
    """After a revision the shift from the first baseline may be recordable while sts is not met: then the retest is a
    periodic test to sts, and a retest to recordable."""
    rows = [
        hearing_test("base", "2020-06-01", 0, purpose="baseline"),
        hearing_test("A", "2021-06-01", 18),
        hearing_test("B", "2022-06-01", 19),
        hearing_test("C", "2023-06-01", 25),
        hearing_test("D", "2023-06-15", 24, purpose="retest"),
    ]
    tables = review_rows(tmp_path, rows, baseline_revision="automatic")
    assert tables.compared_with() == {"A": "base", "B": "base", "C": "A", "D": "A"}
    assert tables.outcomes() == {("A", "right"): "no_retest", ("B", "right"): "no_retest"}
    assert tables.outcomes(RECORDABLE) == {("C", "right"): "not_confirmed"}
    assert tables.one("events", test_id="C")["deciding_test_id"] == "D"


def test_recording_baseline_moves_after_the_run(tmp_path) -> None:
    """29 CFR 1904.10(b)(2)(i): to the deciding test, per ear, for tests after the run; an open event moves nothing."""
    rows = [
        *case("P", (5, 25), (9, 27), first=30, first_left=0),
        hearing_test("P late", "2025-02-10", 30, 0, "annual", "P"),
    ]
    folder = write_cohort(tmp_path, [*rows, *case("Q", (29, 30, 0, "annual"), first=30)])
    tables = reviewed(folder)
    assert tables.compared_with(RECORDABLE) == {
        "P first": "P base",
        "P 1": "P base",
        "P 2": "P base",
        "P late": "P 2",
    }
    assert set(tables.compared_with(RECORDABLE, "left").values()) == {"P base"}
    for as_of, baseline in ((after(30), "Q base"), (after(31), "Q first")):
        assert reviewed(folder, as_of=as_of).compared_with(RECORDABLE, person="Q")["Q 1"] == baseline


def test_the_periodic_test_stands_where_the_retest_cannot_tell(tmp_path) -> None:
    """In the right ear it stays the effective test: for the persistence rule, and for the recording baseline."""
    rows = [
        *case("P", (9, "CNT", 0), first=30, first_left=30),
        hearing_test("P late", "2025-02-10", 41, 0, "annual", "P"),
    ]
    folder = write_cohort(tmp_path, rows)
    tables = reviewed(folder, baseline_revision="automatic")
    assert outcomes(tables, "P") == {
        ("first", "right"): "no_retest",
        ("first", "left"): "not_confirmed",
        ("late", "right"): "no_retest",
    }
    assert tables.history()[1:] == [("P first", "2025-02-10", "", "persistent_shift", "in_force")]
    assert tables.compared_with(RECORDABLE)["P late"] == "P first"
    assert tables.history("left") == [("P base", "2023-02-10", "", "initial", "in_force")]
    assert tables.compared_with(RECORDABLE, "left")["P late"] == "P base"
