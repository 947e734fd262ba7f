"""Another rulebook, known from its file alone, goes through the same mechanics: no figure of a law is in the code.

The jurisdiction is invented; expected values are worked out by hand from its file.
"""

from pathlib import Path

import pytest

from audiokit.core.errors import AudiokitError
from audiokit.io.cohort import read_cohort
from audiokit.reports.summary import summary_page
from audiokit.surveillance.review import review
from tests.rules.rule_files import RULE_FILE, install, value
from tests.surveillance.small_cohorts import RECORDABLE, STS, Row, decide, hearing_test, reviewed, write_cohort

BOOK = "xx-invented"
SHIFT = "xx-invented.shift"
OSHA = Path(__file__).parents[2] / "audiokit" / "rules" / "data" / "us-osha.toml"


def made(
    test_id: str, day: str, right: float, left: float = 10, purpose: str = "annual", person: str = "P", **cells
) -> Row:
    """Levels at 500, 1000, 2000 and 4000 Hz; 3000 Hz, which this jurisdiction does not ask for, stays at 0."""
    four = {f"{ear}_{hz}": level for ear, level in (("right", right), ("left", left)) for hz in (500, 1000)}
    return hearing_test(test_id, day, (right, 0, right), (left, 0, left), purpose, person, **(four | cells))


@pytest.fixture
def rules(tmp_path, monkeypatch):
    """Installs the invented rulebook, changed where pairs (before, after) say so."""

    def put(*swaps: tuple[str, str], **others: str) -> None:
        text = RULE_FILE
        for before, after in swaps:
            assert before in text
            text = text.replace(before, after)
        install(monkeypatch, tmp_path, xx_invented=text, **others)

    return put


def test_its_own_frequencies_and_limit(rules, tmp_path) -> None:
    """Sections 2 and 3: the mean of four frequencies, at least 15; 3000 Hz takes no part."""
    rules()
    rows = [
        made("A", "2020-01-31", 10, purpose="baseline"),
        made("B", "2021-01-31", 25, 10, right_3000=-10, left_3000=100),
        made("C", "2022-01-31", 25, 10, right_500=24.9),
        made("D", "2023-01-31", 25, 10, right_1000="CNT", left_500="NR@70"),
    ]
    tables = reviewed(write_cohort(tmp_path / "cohort", rows), rulebooks=BOOK)
    assert {row["criterion"] for row in tables.shifts} == {SHIFT}
    assert tables.met(SHIFT) == {"B": "yes", "C": "no", "D": "unknown"}
    assert tables.met(SHIFT, "left") == {"B": "no", "C": "no", "D": "yes"}
    shown = [(row["measured_db"], row["value_db"], row["bound"]) for row in tables.find("shifts", ear="right")]
    assert shown == [(15, 15, "exact"), (14.975, 14.975, "exact"), ("", "", "none")]
    assert tables.one("shifts", test_id="D", ear="left")["bound"] == "at_least"
    why = tables.one("shifts", test_id="B", ear="right")["why"]
    assert why.startswith("Decree 1, section 3: sum at 500+1000+2000+4000 Hz 25+25+25+25=100 less baseline A")
    assert "60/4 = 15 dB, at least 15: yes" in why


def test_its_own_window_and_no_notices(rules, tmp_path) -> None:
    """Section 4: 90 days; the file names no notice, no log, no level and no age table."""
    rules()
    rows = []
    for name, day in (("in", "2021-05-01"), ("out", "2021-05-02")):
        rows += [made(f"{name} A", "2020-01-31", 10, purpose="baseline", person=name)]
        rows += [made(f"{name} B", "2021-01-31", 25, person=name), made(f"{name} C", day, 10, person=name, purpose="")]
    people = [{"person_id": "in", "sex": "m", "birth_date": "1960-01-01"}]
    folder = write_cohort(tmp_path / "cohort", rows, people)
    tables = reviewed(folder, rulebooks=BOOK, age_correction=True)
    assert tables.outcomes(SHIFT, "in") == {("in B", "right"): "not_confirmed"}
    assert tables.outcomes(SHIFT, "out") == {("out B", "right"): "no_retest"}
    for event in tables.events:
        assert (event["recordable"], event["notify_by"], event["record_by"]) == ("", "", "")
        assert "Decree 1, section" in event["why"] and "OSHA" not in event["why"]
    assert {row["correction_db"] for row in tables.shifts} == {0}
    assert "day 90 of 90 (Decree 1, section 4)" in tables.one("events", person_id="in")["why"]
    assert {row["action"] for row in tables.worklist} == {"annual_test"}
    last_day = reviewed(folder, rulebooks=BOOK, as_of="2021-05-01")
    assert last_day.one("events", person_id="out")["retest_by"] == "2021-05-01"
    assert last_day.todo("retest", "out") == [("2021-05-01", "no", "right", "out B")]


def test_its_own_revision(rules, tmp_path) -> None:
    """Sections 5 and 6: 10 dB better on two consecutive tests; worse over three months."""
    rules()
    rows = []
    for name, levels, days in (
        ("better", (10, 0, 0), ("2020-01-31", "2021-01-31", "2021-02-01")),
        ("not yet", (10, 0, 0.1), ("2020-01-31", "2021-01-31", "2021-02-01")),
        ("worse", (10, 26, 25), ("2020-01-31", "2021-01-31", "2021-04-30")),
        ("too soon", (10, 26, 25), ("2020-01-31", "2021-01-30", "2021-04-29")),
        ("tie", (10, 25, 25), ("2020-01-31", "2021-01-31", "2022-01-31")),
    ):
        purposes = ("baseline", "annual", "annual")
        for number, (day, level, purpose) in enumerate(zip(days, levels, purposes, strict=True)):
            rows.append(made(f"{name} {number}", day, level, purpose=purpose, person=name))
    rows[-1]["right_3000"] = "-5"  # 3000 Hz is one of the others here, and better at the later test
    tables = reviewed(write_cohort(tmp_path / "cohort", rows), rulebooks=BOOK, baseline_revision="automatic")
    revised = {name: tables.history(person=name)[1:] for name in ("better", "not yet", "worse", "too soon", "tie")}
    assert revised == {
        "better": [("better 1", "2021-02-01", "", "improvement", "in_force")],
        "not yet": [],
        "worse": [("worse 2", "2021-04-30", "", "persistent_shift", "in_force")],
        "too soon": [],
        "tie": [("tie 2", "2022-01-31", "", "persistent_shift", "in_force")],
    }
    assert "(Decree 1, section 6)" in tables.one("baselines", test_id="worse 2", ear="right")["why"]


def test_its_own_schedule_and_checks(rules, tmp_path) -> None:
    """Sections 7 to 9: 24 months, 1 month; 500 and 4000 Hz, 12 hours, 10 dB."""
    rules()
    rows = [made("A", "2024-02-29", 10, purpose="baseline", hours_since_noise=11, left_500="CNT", left_1000_recheck=21)]
    people = [{"person_id": "new", "sex": "f", "noise_since": "2023-01-31"}]
    tables = reviewed(write_cohort(tmp_path / "cohort", rows, people), rulebooks=BOOK)
    assert tables.todo("annual_test") == [("2026-02-28", "yes", "", "A")]
    assert tables.todo("baseline_test", "new") == [("2023-02-28", "yes", "", "")]
    assert [(row["check"], row["ear"], row["value"], row["limit"]) for row in tables.quality] == [
        ("noise_before_baseline", "", "11", "12"),
        ("missing_frequencies", "left", "500", "500 4000"),
        ("recheck_1000_hz", "left", "11", "10"),
    ]
    assert all("Decree 1, section 9" in row["why"] for row in tables.quality)


NOTICE_AND_LOG = (
    f"retest_window_days = {value('90', 4)}",
    "\n".join(
        (
            f"retest_window_days = {value('90', 4)}",
            f"level_at_least_db = {value('30', 10)}",
            f"notify_days = {value('14', 11)}",
            f"record_days_after_retest = {value('3', 12)}",
            f"record_days_without_retest = {value('100', 12)}",
        )
    ),
)


def test_one_criterion_may_have_notice_log_and_level(rules, tmp_path) -> None:
    """Each deadline is its own: sections 10 to 12."""
    rules(NOTICE_AND_LOG)
    rows = []
    for name, level, retest in (("below", 29.9, None), ("stands", 30, None), ("again", 40, 35)):
        rows += [made(f"{name} A", "2020-01-31", 10, purpose="baseline", person=name)]
        rows += [made(f"{name} B", "2021-01-31", level, person=name)]
        if retest:
            rows += [made(f"{name} C", "2021-02-10", retest, person=name, purpose="retest")]
    tables = reviewed(write_cohort(tmp_path / "cohort", rows), rulebooks=BOOK)
    met = [tables.met(SHIFT, person=name)[f"{name} B"] for name in ("below", "stands", "again")]
    assert met == ["no", "yes", "yes"]
    events = {row["person_id"]: row for row in tables.events}
    assert {name: (row["notify_by"], row["record_by"], row["recordable"]) for name, row in events.items()} == {
        "stands": ("2021-02-14", "2021-05-11", "yes"),
        "again": ("2021-02-24", "2021-02-13", "yes"),
    }
    assert tables.todo("notify", "stands") == [("2021-02-14", "yes", "right", "stands B")]
    assert tables.todo("record", "stands") == [("2021-05-11", "yes", "right", "stands B")]
    assert tables.todo("record", "again") == [("2021-02-13", "yes", "right", "again B")]


def test_railroad_retest_confirms_but_does_not_revise(rules, tmp_path) -> None:
    """49 CFR 227 Appendix C, III.C (printed): retest on day 60 of 90 confirms the shift; six months have not passed."""
    rules(
        ("[500, 1000, 2000, 4000]", "[2000, 3000, 4000]"), ("value = 15,", "value = 10,"), ("value = 3,", "value = 6,")
    )
    rows = [
        hearing_test("base", "2023-01-10", 10, 10, "baseline"),
        hearing_test("periodic", "2024-01-10", 20, 10),
        hearing_test("retest", "2024-03-10", 20, 10, "retest"),
    ]
    folder = write_cohort(tmp_path / "cohort", rows)
    for mode in ("automatic", "reviewed"):
        tables = reviewed(folder, rulebooks=BOOK, baseline_revision=mode)
        assert tables.outcomes(SHIFT) == {("periodic", "right"): "confirmed"}
        assert tables.history() == [("base", "2023-01-10", "", "initial", "in_force")]
    assert "on day 60 of 90" in tables.one("events")["why"]


def test_decisions_serve_it_too(rules, tmp_path) -> None:
    rules()
    rows = [made("A", "2020-01-31", 10), made("B", "2021-01-31", 25), made("C", "2022-01-31", 27)]
    folder = write_cohort(tmp_path / "cohort", rows)
    assert [line[4] for line in reviewed(folder, rulebooks=BOOK).history()] == ["in_force", "proposed"]
    decide(folder, "revise_baseline", "B", "right", on="2021-01-31")
    tables = reviewed(folder, rulebooks=BOOK)
    assert tables.compared_with(SHIFT) == {"B": "A", "C": "B"}
    assert [line[4] for line in tables.history()] == ["superseded", "in_force"]


def test_two_rulebooks_at_once(rules, tmp_path) -> None:
    """Each judges by its own figures; the shifts of both stand in one file, in order of the criterion's name."""
    rules(us_osha=OSHA.read_text(encoding="utf-8"))
    rows = [made("A", "2020-01-31", 10, purpose="baseline"), made("B", "2021-01-31", 26, right_3000=0)]
    rows.append(made("C", "2021-03-31", 10, purpose="retest"))
    folder = write_cohort(tmp_path / "cohort", rows)
    apart = {name: reviewed(folder, rulebooks=name) for name in ("us-osha", BOOK)}
    tables = reviewed(folder, rulebooks=["us-osha", BOOK])
    assert [row["criterion"] for row in tables.shifts[:3]] == [RECORDABLE, STS, SHIFT]
    for name, prefix in (("us-osha", "us-osha."), (BOOK, "xx-invented.")):
        for table in ("shifts", "events"):
            mine = [row for row in getattr(tables, table) if row["criterion"].startswith(prefix)]
            assert mine == getattr(apart[name], table)
    assert tables.outcomes(STS) == {("B", "right"): "no_retest"}
    assert tables.outcomes(SHIFT) == {("B", "right"): "not_confirmed"}
    page = summary_page(review(read_cohort(folder, rulebooks=["us-osha", BOOK])))
    assert "An invented decree" not in page and "An invented jurisdiction" in page and "29 CFR 1910.95" in page


@pytest.mark.parametrize(
    ("swap", "named"),
    [
        (("value = 15,", "value = 15.01,"), "15.01"),
        (
            (f"retest_window_days = {value('90', 4)}", f"retest_window_days = {value('90', 4)}\nage_table = AGE"),
            "no values at 500 Hz",
        ),
    ],
    ids=["limit", "age table"],
)
def test_what_cannot_be_judged_is_said(rules, tmp_path, swap, named) -> None:
    """A limit finer than the thresholds, or an age table without the frequencies, ends in words, not in a verdict."""
    rules((swap[0], swap[1].replace("AGE", value('"us_29cfr1910_95_appendix_f"'))))
    folder = write_cohort(tmp_path / "cohort", [made("A", "2020-01-31", 10)])
    with pytest.raises(AudiokitError) as caught:
        reviewed(folder, rulebooks=BOOK, age_correction=True)
    assert named in caught.value.message
