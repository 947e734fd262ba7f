"""The command on real files, with nothing replaced."""

import csv
import os
from pathlib import Path

import pytest

from audiokit.cli.main import main

FREQUENCIES = (500, 1000, 2000, 3000, 4000, 6000)
CELLS = [f"{ear}_{frequency}" for ear in ("right", "left") for frequency in FREQUENCIES]


def wide_line(start: str, right: int, left: int) -> str:
    return ",".join([start, *[str(right)] * len(FREQUENCIES), *[str(left)] * len(FREQUENCIES)])


@pytest.fixture
def cohort(tmp_path):
    """E-1's left ear shifts by 10 dB in 2021; one test is of nobody in people."""
    folder = tmp_path / "plant"
    folder.mkdir()
    (folder / "people.csv").write_text("person_id,sex,birth_date\nE-1,female,1980-01-01\n")
    lines = [
        "person_id,test_id,tested_on,purpose," + ",".join(CELLS),
        wide_line("E-1,T-1,2020-05-01,baseline", 10, 10),
        wide_line("E-1,T-2,2021-05-01,annual", 10, 20),
        wide_line("E-9,T-9,2021-05-01,annual", 10, 20),
    ]
    (folder / "tests.csv").write_text("\n".join(lines) + "\n")
    return folder


def review(cohort, out, *options: str) -> int:
    return main(["review", str(cohort), "--out", str(out), "--as-of", "2021-06-01", *options])


def events(out) -> list[tuple[str, str, str]]:
    with (out / "events.csv").open(newline="", encoding="utf-8") as file:
        return [(row["criterion"], row["ear"], row["outcome"]) for row in csv.DictReader(file)]


def test_review_decide_and_review_again(cohort, tmp_path, capsys):
    out = tmp_path / "review"
    assert review(cohort, out) == 0
    said = capsys.readouterr()
    assert said.err == ""
    assert "us-osha.sts: 1 no_retest" in said.out and "1 row could not be used" in said.out and str(out) in said.out
    assert ("us-osha.sts", "left", "no_retest") in events(out)
    signed = ["--reviewer", "R. Example", "--role", "audiologist", "--reason", "ear infection"]
    assert main(["decide", str(cohort), "invalidate_test", "--person", "E-1", "--test", "T-2", *signed]) == 0
    (out / "notes.txt").write_text("mine")
    assert review(cohort, out) == 0
    assert events(out) == []
    assert "1 test, 1 more left out" in capsys.readouterr().out
    assert main(["decide", str(cohort), "undo", "1", *signed]) == 0
    assert review(cohort, out) == 0
    assert ("us-osha.sts", "left", "no_retest") in events(out)
    assert (out / "notes.txt").read_text() == "mine"
    assert sorted(entry.name for entry in tmp_path.iterdir()) == ["plant", "review"]


@pytest.mark.parametrize("options", [["--rulebook", "no-such"], ["--rulebook", "us-osha", "no-such"]])
def test_unknown_rulebook_writes_nothing(cohort, tmp_path, capsys, options):
    assert review(cohort, tmp_path / "deep" / "review", *options) == 2
    said = capsys.readouterr()
    assert said.out == "" and "unknown rulebook 'no-such'" in said.err and "us-osha" in said.err
    assert [entry.name for entry in tmp_path.iterdir()] == ["plant"]


def test_unreadable_cohort_leaves_the_earlier_review(cohort, tmp_path, capsys):
    out = tmp_path / "review"
    assert review(cohort, out) == 0
    before = {entry.name: entry.read_bytes() for entry in out.iterdir()}
    for damage in ("not,a\ntable", "", "\0\0"):
        (cohort / "tests.csv").write_text(damage)
        assert review(cohort, out) == 2
        assert "Traceback" not in capsys.readouterr().err
    assert {entry.name: entry.read_bytes() for entry in out.iterdir()} == before
    assert sorted(entry.name for entry in tmp_path.iterdir()) == ["plant", "review"]


def test_a_cohort_behind_links_in_a_circle_is_refused(tmp_path, capsys):
    (tmp_path / "plant").symlink_to("plant")
    assert review(tmp_path / "plant", tmp_path / "review") == 2
    assert "plant is no path that can be followed" in capsys.readouterr().err


def test_a_cohort_whose_folder_name_is_no_text_is_reviewed(cohort, tmp_path):
    folder = Path(os.fsdecode(os.fsencode(tmp_path) + b"/caf\xe9"))
    try:
        cohort.rename(folder)
    except OSError:
        pytest.skip("this file system takes no such name")
    assert review(folder, tmp_path / "review") == 0


def test_a_date_that_no_file_may_hold_is_refused(cohort, tmp_path, capsys):
    assert review(cohort, tmp_path / "review", "--as-of", "9999-12-31") == 2
    assert "as_of: 9999-12-31 lies outside the years 1900 to 2200" in capsys.readouterr().err
    assert not (tmp_path / "review").exists()
