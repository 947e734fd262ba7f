"""The example cohort: the same seed gives the same files, and the committed folder is what the generator makes."""

import io
import zipfile
from pathlib import Path

import openpyxl
import pandas as pd
import pytest

from audiokit.core.errors import OutOfScopeError, OutputError
from audiokit.example.layouts import HEADER_ROW, SHEET, TITLES
from audiokit.example.maker import make_example
from audiokit.example.scenario import DEFAULT_PEOPLE, DEFAULT_SEED, FEWEST_PEOPLE
from audiokit.io.decisions import read_log

COMMITTED = Path(__file__).parents[2] / "example_cohort"
FILES = {"about.md", "people.csv", "sawmill.csv", "print_hall.xlsx", "bottling_hall.csv", "cohort.toml", "decisions.db"}
TEXT_FILES = sorted(FILES - {"print_hall.xlsx", "decisions.db"})


@pytest.fixture(scope="module")
def made(tmp_path_factory):
    folder = tmp_path_factory.mktemp("made") / "cohort"
    make_example(folder)
    return folder


def _sheet(path):
    sheet = openpyxl.load_workbook(path)[SHEET]
    return [[cell.value for cell in row] for row in sheet.iter_rows()], sorted(map(str, sheet.merged_cells.ranges))


def test_the_committed_folder_is_what_the_default_seed_makes(made):
    assert {path.name for path in COMMITTED.iterdir()} == FILES
    for name in TEXT_FILES:
        assert (COMMITTED / name).read_bytes() == (made / name).read_bytes(), name
    assert _sheet(COMMITTED / "print_hall.xlsx") == _sheet(made / "print_hall.xlsx")
    pd.testing.assert_frame_equal(read_log(COMMITTED), read_log(made))


def test_the_committed_folder_is_small():
    assert sum(path.stat().st_size for path in COMMITTED.iterdir()) < 2_000_000


def test_the_same_seed_gives_the_same_bytes(made, tmp_path):
    make_example(tmp_path / "again", seed=DEFAULT_SEED, people=DEFAULT_PEOPLE)
    for name in sorted(FILES - {"decisions.db"}):
        assert (tmp_path / "again" / name).read_bytes() == (made / name).read_bytes(), name
    pd.testing.assert_frame_equal(read_log(tmp_path / "again"), read_log(made))


def test_another_seed_gives_other_people(made, tmp_path):
    make_example(tmp_path / "other", seed=DEFAULT_SEED + 1)
    for name in ("people.csv", "sawmill.csv", "print_hall.xlsx", "bottling_hall.csv"):
        assert (tmp_path / "other" / name).read_bytes() != (made / name).read_bytes()


def test_the_workbook_carries_no_trace_of_the_clock(made):
    with zipfile.ZipFile(made / "print_hall.xlsx") as archive:
        assert {member.date_time for member in archive.infolist()} == {(2026, 3, 5, 0, 0, 0)}
        core = archive.read("docProps/core.xml").decode()
    assert core.count("2026-03-05T00:00:00Z") == 2


def test_the_workbook_has_merged_titles_over_its_headings(made):
    rows, merged = _sheet(made / "print_hall.xlsx")
    assert len(merged) == len(TITLES)
    assert [rows[0][0], rows[1][0]] == list(TITLES)
    assert rows[HEADER_ROW - 1][:3] == ["Emp No", "Date of test", "Reason"]
    formulas = [value for row in rows for value in row if isinstance(value, str) and value.startswith("=")]
    assert len(formulas) == 1
    sheet = openpyxl.load_workbook(made / "print_hall.xlsx")[SHEET]
    assert not [cell for row in sheet.iter_rows() for cell in row if cell.data_type == "f"], "text, not a formula"


def test_number_of_people_includes_the_constructed_ones(made):
    people = pd.read_csv(made / "people.csv", dtype=str, keep_default_na=False)
    real = people[~people["person_id"].str.lstrip("+").str[1:].str.startswith("700") & (people["person_id"] != "")]
    assert real["person_id"].nunique() == DEFAULT_PEOPLE
    assert (people["note"] != "").sum() == 24


def test_every_site_has_its_layout(made):
    wide = pd.read_csv(made / "sawmill.csv", dtype=str, on_bad_lines="skip")
    long = pd.read_csv(io.StringIO((made / "bottling_hall.csv").read_text("cp1252")), sep=";", dtype=str)
    assert {"person_id", "tested_on", "right_500", "left_8000", "right_1000_recheck"} <= set(wide.columns)
    assert list(long.columns) == ["Person", "Visit", "Day", "Occasion", "OK", "Device", "Ear", "Hz", "dB", "Remarks"]
    with pytest.raises(UnicodeDecodeError):
        (made / "bottling_hall.csv").read_text("utf-8")


def test_decisions_stand_in_order_of_time_and_include_an_undo(made):
    log = read_log(made)
    assert log["recorded_at"].is_monotonic_increasing
    kinds = {"revise_baseline", "invalidate_test", "not_work_related", "note", "undo", "notice_given", "entry_made"}
    assert set(log["kind"]) == kinds
    assert (~log["in_force"]).sum() == 1


@pytest.mark.parametrize("people", [FEWEST_PEOPLE - 1, 20_001, 0, -5])
def test_numbers_of_people_outside_the_limits_are_refused(tmp_path, people):
    with pytest.raises(OutOfScopeError, match=f"{people} people cannot be made"):
        make_example(tmp_path / "cohort", people=people)
    assert not (tmp_path / "cohort").exists()


def test_a_negative_seed_is_refused(tmp_path):
    with pytest.raises(OutOfScopeError, match="seed -1"):
        make_example(tmp_path / "cohort", seed=-1)


def test_a_folder_with_something_in_it_is_left_alone(tmp_path):
    (tmp_path / "notes.txt").write_text("mine")
    with pytest.raises(OutputError, match="is not empty; nothing was written"):
        make_example(tmp_path)
    assert [path.name for path in tmp_path.iterdir()] == ["notes.txt"]


def test_a_file_in_the_way_is_left_alone(tmp_path):
    (tmp_path / "cohort").write_text("mine")
    with pytest.raises(OutputError, match="is a file"):
        make_example(tmp_path / "cohort")
    assert (tmp_path / "cohort").read_text() == "mine"


def test_an_empty_folder_is_filled_and_nothing_is_left_beside_it(tmp_path):
    (tmp_path / "cohort").mkdir()
    make_example(tmp_path / "cohort", people=FEWEST_PEOPLE)
    assert {path.name for path in (tmp_path / "cohort").iterdir()} == FILES
    assert [path.name for path in tmp_path.iterdir()] == ["cohort"]


def test_a_failure_on_the_way_leaves_nothing(tmp_path, monkeypatch):
    def full(*_):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("audiokit.example.maker.record_decisions", full)
    with pytest.raises(OutputError, match="No space left"):
        make_example(tmp_path / "cohort", people=FEWEST_PEOPLE)
    assert list(tmp_path.iterdir()) == []


def test_a_place_that_cannot_be_made_is_an_error_without_traceback(tmp_path):
    (tmp_path / "file").write_text("mine")
    with pytest.raises(OutputError, match="cannot be written"):
        make_example(tmp_path / "file" / "cohort")


@pytest.mark.parametrize("seed", range(4))
def test_the_smallest_cohort_works_with_any_seed(tmp_path, seed):
    example = make_example(tmp_path / "small", seed=seed, people=FEWEST_PEOPLE)
    assert {path.name for path in (tmp_path / "small").iterdir()} == FILES
    assert min(example.rows.values()) > 100
