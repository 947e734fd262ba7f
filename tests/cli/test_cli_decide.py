"""`audiokit decide` records only what fits the cohort, and says what would."""

import datetime
import re

import pytest

from audiokit.cli.main import main
from audiokit.io.decisions import read_decisions, read_log, record_decision

SIGNED = ["--reviewer", "R. Example", "--role", "audiologist, licence X-1", "--reason", "ear infection"]
FREQUENCIES = (500, 1000, 2000, 3000, 4000, 6000)
TODAY = datetime.date.today().isoformat()


@pytest.fixture
def cohort(tmp_path):
    """Two people of an invented site: E-1 with three tests, the last marked invalid, and E-2 with one."""
    folder = tmp_path / "plant"
    folder.mkdir()
    (folder / "people.csv").write_text("person_id,sex,birth_date\nE-1,female,1980-01-01\nE-2,male,1970-02-03\n")
    cells = [f"{ear}_{frequency}" for ear in ("right", "left") for frequency in FREQUENCIES]
    rows = ["person_id,test_id,tested_on,purpose,valid," + ",".join(cells)]
    for start in (
        "E-1,T-11,2020-05-01,baseline,",
        "E-1,T-12,2021-05-03,annual,",
        "E-1,T-13,2022-05-02,annual,no",
        "E-2,T-21,2021-06-01,baseline,",
    ):
        rows.append(start + ",10" * len(cells))
    (folder / "tests.csv").write_text("\n".join(rows) + "\n")
    return folder


def decide(cohort, *arguments: str) -> int:
    return main(["decide", str(cohort), *arguments])


def test_each_kind_is_recorded(cohort, capsys):
    assert decide(cohort, "invalidate_test", "--person", "E-1", "--test", "T-12", *SIGNED) == 0
    new_baseline = ["--person", "E-2", "--ear", "left", "--test", "T-21"]
    assert decide(cohort, "revise_baseline", *new_baseline, "--takes-effect", "2021-06-01", *SIGNED) == 0
    assert decide(cohort, "revise_baseline", *new_baseline, *SIGNED) == 0
    assert decide(cohort, "not_work_related", "--person", "E-1", "--ear", "right", "--test", "T-12", *SIGNED) == 0
    assert decide(cohort, "note", "--person", "E-1", *SIGNED) == 0
    assert decide(cohort, "note", "--person", "E-1", "--test", "T-13", "--ear", "left", *SIGNED) == 0
    said = capsys.readouterr()
    assert said.err == ""
    assert said.out.splitlines()[:3] == [
        "decision 1 recorded: invalidate_test, person E-1, test T-12",
        "decision 2 recorded: revise_baseline, person E-2, left ear, test T-21, for tests after 2021-06-01",
        f"decision 3 recorded: revise_baseline, person E-2, left ear, test T-21, for tests after {TODAY}",
    ]
    frame = read_decisions(cohort)
    assert frame.drop(columns=["recorded_at", "reviewer", "role", "reason"]).to_numpy().tolist() == [
        [1, "invalidate_test", "E-1", None, "T-12", None, TODAY],
        [2, "revise_baseline", "E-2", "left", "T-21", None, "2021-06-01"],
        [3, "revise_baseline", "E-2", "left", "T-21", None, TODAY],
        [4, "not_work_related", "E-1", "right", "T-12", "us-osha.recordable", TODAY],
        [5, "note", "E-1", None, None, None, TODAY],
        [6, "note", "E-1", "left", "T-13", None, TODAY],
    ]
    assert set(frame["role"]) == {"audiologist, licence X-1"}


@pytest.mark.parametrize(
    ("arguments", "problem", "mend"),
    [
        (["note", "--person", "e-1"], "person 'e-1' is not among the 2 people of plant", "did you mean E-1, E-2?"),
        (["note", "--person", "Z99"], "person 'Z99' is not among", "check the id"),
        (
            ["invalidate_test", "--person", "E-1", "--test", "t-12"],
            "there is no test 't-12'",
            "did you mean T-12, T-13, T-11? the tests of person E-1: T-11 (2020-05-01), T-12 (2021-05-03), T-13",
        ),
        (
            ["invalidate_test", "--person", "E-2", "--test", "T-12"],
            "test 'T-12' is not of person E-2 but of E-1",
            "the tests of person E-2: T-21 (2021-06-01)",
        ),
        (
            ["revise_baseline", "--person", "E-1", "--ear", "left", "--test", "T-12", "--takes-effect", "2021-05-02"],
            "test T-12 is of 2021-05-03, so it cannot be the baseline from 2021-05-02",
            "take effect on 2021-05-03 or later (--takes-effect)",
        ),
        (
            ["revise_baseline", "--person", "E-1", "--ear", "left", "--test", "T-13"],
            "the file says that test T-13 is not valid",
            "choose a valid test",
        ),
        (["note", "--person", "E-1", "--reason", " "], "reason is blank", "every decision names"),
    ],
)
def test_what_does_not_fit_is_refused(cohort, capsys, arguments, problem, mend):
    assert decide(cohort, arguments[0], *SIGNED, *arguments[1:]) == 2
    said = capsys.readouterr()
    assert said.out == ""
    assert said.err.startswith("audiokit: ") and problem in said.err and mend in said.err
    assert not (cohort / "decisions.db").exists()


def test_invalidated_test_cannot_be_a_baseline_until_undone(cohort, capsys):
    revise = ["revise_baseline", "--person", "E-1", "--ear", "left", "--test", "T-12", *SIGNED]
    assert decide(cohort, "invalidate_test", "--person", "E-1", "--test", "T-12", *SIGNED) == 0
    assert decide(cohort, *revise) == 2
    assert "test T-12 is invalid by decision 1" in capsys.readouterr().err
    assert decide(cohort, "undo", "1", *SIGNED) == 0
    assert decide(cohort, *revise) == 0
    assert read_decisions(cohort)["decision_id"].tolist() == [3]


def test_undo_and_list(cohort, capsys):
    assert decide(cohort, "list") == 0
    assert capsys.readouterr().out == "no decision is recorded\n"
    decide(cohort, "not_work_related", "--person", "E-1", "--ear", "right", "--test", "T-12", *SIGNED)
    decide(cohort, "revise_baseline", "--person", "E-1", "--ear", "left", "--test", "T-12", *SIGNED)
    assert decide(cohort, "undo", "1", *SIGNED[:-1], "wrong ear\nlook again") == 0
    assert decide(cohort, "undo", "1", *SIGNED) == 2
    assert decide(cohort, "undo", "9", *SIGNED) == 2
    said = capsys.readouterr()
    assert said.out.endswith("decision 3 recorded: undo of 1\n")
    assert "decision 1 is already undone by 3\n  mend: to restore it, undo number 3" in said.err
    assert "there is no decision number 9\n  mend: the numbers so far are 1 to 3" in said.err
    assert decide(cohort, "list") == 0
    listed = re.sub(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ", "TIME", capsys.readouterr().out)
    assert listed == (
        "1  TIME  not_work_related, person E-1, right ear, test T-12, us-osha.recordable [undone by 3]\n"
        "    R. Example, audiologist, licence X-1: ear infection\n"
        f"2  TIME  revise_baseline, person E-1, left ear, test T-12, for tests after {TODAY}\n"
        "    R. Example, audiologist, licence X-1: ear infection\n"
        "3  TIME  undo of 1\n"
        "    R. Example, audiologist, licence X-1: wrong ear\n    look again\n"
    )


def test_no_text_of_an_entry_looks_like_an_entry_of_its_own(cohort, capsys):
    signed = ["--reviewer", "R. Example\n2  2020-01-01", "--role", "x\n3  y", "--reason", "z\n4"]
    assert decide(cohort, "note", "--person", "E-1", *signed) == 0
    capsys.readouterr()
    assert decide(cohort, "list") == 0
    first, *more = capsys.readouterr().out.splitlines()
    assert first.startswith("1  ") and len(more) == 4 and all(line.startswith("    ") for line in more)


def test_undo_needs_no_readable_tables(cohort):
    record_decision(cohort, kind="note", person_id="E-1", reviewer="R", role="r", reason="x")
    (cohort / "tests.csv").unlink()
    assert decide(cohort, "undo", "1", *SIGNED) == 0
    assert read_log(cohort)["in_force"].tolist() == [False, True]


def test_unreadable_cohort_or_decisions(cohort, capsys):
    note = ["note", "--person", "E-1", *SIGNED]
    (cohort / "decisions.db").write_bytes(b"no database " * 100)
    for arguments in (note, ["undo", "1", *SIGNED], ["list"]):
        assert decide(cohort, *arguments) == 2
        assert "decisions.db is damaged" in capsys.readouterr().err
    (cohort / "decisions.db").unlink()
    (cohort / "people.csv").unlink()
    assert decide(cohort, *note) == 2
    assert "there is no people table" in capsys.readouterr().err
    assert decide(cohort / "none", *note) == 2
    assert "no such folder" in capsys.readouterr().err
    assert [entry.name for entry in cohort.iterdir()] == ["tests.csv"]


def test_control_characters_do_not_reach_the_terminal(cohort, capsys):
    decide(cohort, "note", "--person", "E-1", *SIGNED[:-1], "a\x1b[2Jb")
    decide(cohort, "list")
    assert capsys.readouterr().out.endswith(": a\\x1b[2Jb\n")
    assert read_decisions(cohort)["reason"].tolist() == ["a\x1b[2Jb"]
