"""One person on the screen: whoever it is, the panel shows them or says why it cannot."""

import re
from pathlib import Path

import pytest
from cohorts import ARABIC, CHINESE, FREQUENCIES, HEBREW_TEST, MARKUP, person, write
from cohorts import test_row as row

import audiokit
from audiokit.widgets import YearlyReview


def _shown(panel: YearlyReview) -> str:
    """Everything the person's part says, as HTML."""
    part = panel.person
    views = [view.svg for view in part.audiograms.values()]
    texts = [part.told, part.facts, part.verdicts, part.arithmetic, part.findings]
    return "\n".join([*views, *(html.value for html in texts)])


def _current_dates(panel: YearlyReview) -> set[str]:
    return {found for view in panel.person.audiograms.values() for found in re.findall(r">current ([\d-]+)<", view.svg)}


def test_nobody_is_shown_before_somebody_is_chosen(panel: YearlyReview) -> None:
    assert panel.person.person_id == ""
    assert panel.person.shown.layout.display == "none"
    assert "Click a line" in panel.person.told.value


def test_a_shift_of_exactly_ten_is_met_and_a_little_less_is_not(panel: YearlyReview) -> None:
    """10.0 dB is met, 9.6 dB is not: 29 CFR 1910.95(g)(10)(i), "an average of 10 dB or more"."""
    assert panel.choose_person("A1", "A1-2")
    blocks = panel.person.arithmetic.value.split("<section")[1:]
    assert "Right ear: <b>● met</b>" in blocks[0]
    assert "mean shift 30/3 = 10 dB, at least 10: yes" in blocks[0]
    assert "Left ear: <b>○ not met</b>" in blocks[1]
    assert "= 9.6 dB, below 10: no" in blocks[1]
    for block in blocks:
        assert "<li><bdi>29 CFR 1910.95(g)(10)(i)</bdi></li>" in block
        assert "less baseline <bdi>A1-1</bdi> of 2022-03-01 10+10+10=30" in block


def test_the_latest_test_that_takes_part_comes_first(panel: YearlyReview) -> None:
    panel.choose_person("A1")
    assert _current_dates(panel) == {"2024-05-20"}
    assert next(label for label, _ in panel.person.test.options).startswith("2024-07-01, A1-4")
    panel.choose_person("A3")
    assert _current_dates(panel) == {"2023-03-01"}


def test_another_test_becomes_current_by_its_line(panel: YearlyReview) -> None:
    panel.choose_person("A1")
    tests = panel.person.tests
    second = next(r for r in tests.view["rows"] if r["cells"][1] == "A1-2")
    tests._handle_custom_msg({"do": "pick", "id": second["id"], "stamp": tests.view["stamp"]}, [])
    assert _current_dates(panel) == {"2023-03-01"}
    assert [r["cells"][1] for r in tests.view["rows"] if r["picked"]] == ["A1-2"]
    assert "= 10 dB, at least 10: yes" in panel.person.arithmetic.value


def test_the_test_and_criterion_of_a_worklist_line_are_shown(panel: YearlyReview) -> None:
    lines = panel.worklist.lines
    panel.worklist.search.value = "A1 notify"
    line = lines.view["rows"][0]
    lines._handle_custom_msg({"do": "pick", "id": line["id"], "stamp": lines.view["stamp"]}, [])
    assert panel.person.person_id == "A1"
    wanted = panel.worklist.lines.frame.loc[line["id"]]
    assert panel.person._tests[panel.person.test.value].test_id == wanted["test_id"]
    assert panel.person.criterion.value == "us-osha.sts"


@pytest.mark.parametrize(
    ("test_id", "said"),
    [
        ("A1-1", "initial baseline"),
        ("A1-4", "takes no part: after as of"),
        ("A3-3", "takes no part: marked invalid"),
        ("zh-0", "earlier than the initial baseline"),
    ],
)
def test_a_test_that_is_not_compared_says_why(panel: YearlyReview, test_id: str, said: str) -> None:
    who = {"A": test_id[:2], "z": CHINESE}[test_id[0]]
    assert panel.choose_person(who, test_id)
    assert said in panel.person.arithmetic.value
    assert 'class="ak-baseline"' not in "".join(view.svg for view in panel.person.audiograms.values())
    assert panel.person.verdicts.value == ""


def test_all_no_response_cannot_be_told(panel: YearlyReview) -> None:
    assert panel.choose_person("A2")
    assert panel.person.arithmetic.value.count("? cannot tell") == 2
    assert "mean shift not computable" in panel.person.arithmetic.value
    for view in panel.person.audiograms.values():
        assert view.svg.count("no response at 90 dB HL") >= 2 * len(FREQUENCIES)


def test_missing_cells_stay_three_states(panel: YearlyReview) -> None:
    panel.choose_person("A3", "A3-2")
    right, left = panel.person.arithmetic.value.split("<section")[1:]
    assert "<bdi>DNT</bdi>" in right
    assert "3000 Hz did not test" in right
    assert "<bdi>CNT</bdi>" in left
    assert "<bdi>–</bdi>" in left
    assert panel.person.arithmetic.value.count("? cannot tell") == 2


def test_a_person_without_tests_is_shown_and_said(panel: YearlyReview) -> None:
    assert panel.choose_person("A4")
    assert "No test of this person was accepted" in panel.person.told.value
    assert panel.person.test.options == ()
    assert panel.person._of_tests.layout.display == "none"
    assert "&lt;i&gt;sorter" in panel.person.facts.value
    assert panel.person.tests.view["rows"] == []
    assert (
        "baseline test" in panel.person.findings.value or "Lines of the worklist: none" in panel.person.findings.value
    )


@pytest.mark.parametrize("who", [ARABIC, CHINESE, MARKUP, "NA"])
def test_names_in_any_script(panel: YearlyReview, who: str) -> None:
    assert panel.choose_person(who)
    assert panel.person.spot.name == who
    assert panel.person.tests.view["rows"]
    assert "<script>" not in _shown(panel)
    assert "<b>x</b>" not in _shown(panel)


@pytest.mark.parametrize(("who", "base"), [(ARABIC, HEBREW_TEST), (MARKUP, "&lt;script&gt;"), ("NA", "null")])
def test_test_ids_in_any_script_find_their_baseline(panel: YearlyReview, who: str, base: str) -> None:
    """An id that a table reader could take for an empty cell, or for a separator, is an id."""
    panel.choose_person(who)
    assert "Left ear: <b>● met</b>" in panel.person.arithmetic.value
    assert base in panel.person.arithmetic.value


def test_an_unknown_person_is_said_with_near_ids_and_nobody_else_stays(panel: YearlyReview) -> None:
    panel.choose_person("A1")
    assert not panel.choose_person("a")
    assert panel.person.person_id == ""
    assert panel.person.shown.layout.display == "none"
    assert "There is no person a among the 8 people" in panel.person.told.value
    assert "A1, A2, A3, A4, NA" in panel.person.told.value


def test_the_field_finds_a_person_and_is_ready_for_the_next(panel: YearlyReview) -> None:
    panel.person.asked.value = " A2 "
    assert panel.person.person_id == "A2"
    assert panel.person.asked.value == ""
    panel.person.asked.value = "A22"
    assert "There is no person A22" in panel.person.told.value
    assert panel.person.asked.value == "A22"


def test_a_defect_shows_nobody_rather_than_half_of_two(panel: YearlyReview, monkeypatch: pytest.MonkeyPatch) -> None:
    def broken(_row: int) -> None:
        raise ValueError("a defect made for this test")

    panel.choose_person("A1")
    assert panel.person._lookup is not None
    monkeypatch.setattr(panel.person._lookup, "shifts", broken)
    with pytest.raises(ValueError, match="made for this test"):
        panel.choose_person("A2")
    assert panel.person.shown.layout.display == "none"
    assert "cannot be shown" in panel.person.told.value


def test_what_is_shown_is_what_the_files_say(mixed_folder: Path, panel: YearlyReview, tmp_path: Path) -> None:
    """Each answer in the list of tests against shifts.csv, read as text."""
    import csv

    assert panel.review is not None
    audiokit.write_review(panel.review, tmp_path / "out")
    with (tmp_path / "out" / "shifts.csv").open(encoding="utf-8", newline="") as file:
        lines = [line for line in csv.DictReader(file) if line["criterion"] == "us-osha.sts"]
    words = {"yes": "● met", "no": "○ not met", "unknown": "? cannot tell"}
    assert len(lines) == 2 * 7
    for line in lines:
        panel.choose_person(line["person_id"])
        shown = next(r for r in panel.person.tests.view["rows"] if r["cells"][1] == line["test_id"])
        answer = shown["cells"][4 if line["ear"] == "right" else 5]
        assert answer.startswith(words[line["met"]])
        value = line["value_db"] or "not computable"
        assert value.replace("-", "−") in answer


def test_frequencies_that_nobody_of_this_person_had_are_not_listed(tmp_path: Path) -> None:
    cells = {"right_750": "15", "left_750": ""}
    folder = write(
        tmp_path / "more",
        [person("B1"), person("B2")],
        [row("B1", "b1", "2022-01-01"), row("B1", "b2", "2023-01-01"), row("B2", "b3", "2022-01-01")],
    )
    text = (folder / "tests.csv").read_text(encoding="utf-8").splitlines()
    extended = [line + tail for line, tail in zip(text, [",right_750,left_750", ",,", ",,", ",15,"], strict=True)]
    (folder / "tests.csv").write_text("\n".join(extended) + "\n", encoding="utf-8")
    made = YearlyReview(base=tmp_path)
    made.load()
    made.choose_person("B1")
    assert ">750<" not in _shown(made)
    made.choose_person("B2")
    assert ">750<" in made.person.audiograms["right"].svg
    assert cells["right_750"] in made.person.audiograms["right"].svg
