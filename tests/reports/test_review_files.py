"""The files of a review as another program reads them: quoting, numbers, order, counts, and the page."""

import csv
import datetime
import io
import json
import re
from html.parser import HTMLParser
from pathlib import Path

import pytest

from audiokit.io.cohort import read_cohort
from audiokit.reports.folder import FILES, write_review
from audiokit.reports.shifts import shifts_table
from audiokit.surveillance.review import review
from tests.oracle.cohort_files import write_cohort as write_hostile
from tests.oracle.hostile import COMBINATIONS, hostile_cohort
from tests.surveillance.small_cohorts import LATE, decide, hearing_test, tables_of, write_cohort

DB = re.compile(r"-?(0|[1-9]\d*)(\.\d{0,3}[1-9])?")
NUMBERS = ("measured_db", "correction_db", "value_db", "mean_hl_db")
# The columns of the file contract, in its order.
COLUMNS = {
    "quarantine": "file,row,column,value,code,problem,mend,raw_json",
    "shifts": "person_id,test_id,tested_on,ear,criterion,baseline_test_id,measured_db,correction_db,value_db,bound,met,"
    "why",
    "events": "person_id,test_id,tested_on,ear,criterion,outcome,deciding_test_id,value_db,mean_hl_db,recordable,"
    "retest_by,notify_by,record_by,why",
    "baselines": "person_id,ear,test_id,in_force_from,in_force_until,reason,status,why",
    "worklist": "due_on,overdue,action,person_id,ear,test_id,criterion,why",
    "quality": "person_id,test_id,tested_on,ear,check,value,limit,why",
}


def read(out: Path, name: str) -> list[dict[str, str]]:
    with (out / f"{name}.csv").open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file, strict=True))


def written(folder: Path, out: Path) -> Path:
    write_review(review(read_cohort(folder, as_of=LATE)), out)
    return out


@pytest.fixture(scope="module")
def hostile(tmp_path_factory) -> Path:
    """The files of a cohort with ids of every kind, where nearly everything happens."""
    place = tmp_path_factory.mktemp("files")
    write_hostile(hostile_cohort(9, 60, COMBINATIONS[4]), place / "cohort")
    write_review(review(read_cohort(place / "cohort")), place / "out")
    return place / "out"


def test_all_files_and_columns(hostile: Path) -> None:
    assert {path.name for path in hostile.iterdir()} == set(FILES)
    for name, columns in COLUMNS.items():
        text = (hostile / f"{name}.csv").read_text(encoding="utf-8")
        assert [column.strip('"') for column in text.splitlines()[0].split(",")] == columns.split(",")
        for row in csv.reader(io.StringIO(text, newline=""), strict=True):
            assert len(row) == columns.count(",") + 1
        assert read(hostile, name)


def test_numbers_have_at_most_four_decimals(hostile: Path) -> None:
    found = [
        row[column]
        for name in ("shifts", "events")
        for row in read(hostile, name)
        for column in NUMBERS
        if column in row
    ]
    numbers = [text for text in found if text]
    assert len(numbers) > 500
    assert [text for text in numbers if not DB.fullmatch(text) or text == "-0"] == []
    assert any(text.endswith("3333") for text in numbers) and any("-" in text for text in numbers)


def test_words_and_dates_are_those_of_the_contract(hostile: Path) -> None:
    words = {
        "ear": {"right", "left", ""},
        "met": {"yes", "no", "unknown"},
        "bound": {"exact", "at_least", "at_most", "none"},
        "outcome": {"retest_open", "confirmed", "not_confirmed", "no_retest", "found_at_retest"},
        "recordable": {"yes", ""},
        "reason": {"initial", "improvement", "persistent_shift", "decision"},
        "status": {"in_force", "superseded", "proposed"},
        "overdue": {"yes", "no", "unknown"},
        "action": {"retest", "notify", "record", "annual_test", "baseline_test", "review_baseline", "review_test"},
    }
    dates = ("tested_on", "retest_by", "notify_by", "record_by", "in_force_from", "in_force_until", "due_on")
    for name in COLUMNS:
        for row in read(hostile, name):
            for column in words.keys() & row.keys():
                assert row[column] in words[column]
            for column in set(dates) & row.keys():
                assert row[column] == "" or datetime.date.fromisoformat(row[column]).isoformat() == row[column]


def test_rows_are_in_order(hostile: Path) -> None:
    ear = {"right": 0, "left": 1}
    for name in ("shifts", "events"):
        keys = [
            (r["person_id"], r["tested_on"], r["test_id"], ear[r["ear"]], r["criterion"]) for r in read(hostile, name)
        ]
        assert keys == sorted(keys) and len(set(keys)) == len(keys)
    keys = [
        (r["person_id"], ear[r["ear"]], r["in_force_from"], r["test_id"], r["reason"])
        for r in read(hostile, "baselines")
    ]
    assert keys == sorted(keys)
    due = [row["due_on"] or "9999" for row in read(hostile, "worklist")]
    assert due == sorted(due)


IDS = (
    'say "x", twice',
    '""',
    "a,b",
    "line\nbreak",
    "line\r\nbreak",
    "semi;colon|pipe\ttab",
    "'single'",
    "佐藤-3",
    "أحمد",
    "e\u0301",
    "é",
    "😀",
    "0007",
    "1e3",
    "NA",
    "null",
    "True",
    "#8",
    "a b",
    "less baseline x of 2020-01-01 ",
)


def test_ids_of_any_script_come_back_whole(tmp_path) -> None:
    """Commas, quotes, breaks and every alphabet, in persons and tests, through every file."""
    rows, people = [], []
    for number, name in enumerate(IDS):
        people.append({"person_id": name, "sex": "f"})
        rows.append(hearing_test(f"{name}/A", "2020-01-01", 10, 10, "baseline", name))
        rows.append(
            hearing_test(f"{name}/B", "2021-01-01", 30, "CNT", "annual", name, valid="no" if number == 0 else "")
        )
        rows.append(hearing_test(f"{name}/C", "2022-01-01", 31, 10, "annual", name))
    folder = write_cohort(tmp_path / "cohort", rows, people)
    cohort = read_cohort(folder, as_of=LATE)
    kept = [name.strip() for name in IDS]
    assert sorted(cohort.people.person_id.to_pylist()) == sorted(kept) and cohort.quarantine.empty
    out = written(folder, tmp_path / "out")
    for name in ("shifts", "events", "baselines", "worklist"):
        assert {row["person_id"] for row in read(out, name)} == set(kept), name
    shifts = read(out, "shifts")
    assert {row["test_id"].rpartition("/")[0].strip() for row in shifts} == set(kept)
    for row in shifts:
        before = "B" if row["criterion"].endswith("recordable") and row["test_id"].endswith("C") else "A"
        if row["ear"] == "right" and row["person_id"] != kept[0]:
            assert row["baseline_test_id"] == f"{row['test_id'].rpartition('/')[0]}/{before}"
        assert f" less baseline {row['baseline_test_id']} of 202" in row["why"]
    assert [row["person_id"] for row in read(out, "quality") if row["check"] == "marked_invalid"] == [kept[0]]


def test_the_table_is_the_file(hostile: Path, tmp_path) -> None:
    """What panels show is what the file holds."""
    folder = write_cohort(
        tmp_path / "cohort", [hearing_test(t, f"202{n}-01-01", 13 * n, f"NR@{n}0") for n, t in enumerate("ABC")]
    )
    decide(folder, "note", "A")
    found = review(read_cohort(folder, as_of=LATE))
    write_review(found, tmp_path / "out")
    tables = tables_of(found)
    for name in ("shifts", "events", "baselines", "worklist", "quality"):
        rows = read(tmp_path / "out", name)
        shown = getattr(tables, name)
        assert len(rows) == len(shown) > 0
        for row, other in zip(rows, shown, strict=True):
            assert {
                k: f"{v:g}" if isinstance(v, float) and round(v, 4) == float(f"{v:g}") else v for k, v in other.items()
            } == {k: f"{float(v):g}" if k in NUMBERS and v else v for k, v in row.items()}
    person = shifts_table(found, slice(0, 1)).to_pylist()
    assert person == shifts_table(found).to_pylist()


def test_intake_adds_up(hostile: Path, tmp_path) -> None:
    intake = json.loads((hostile / "intake.json").read_text(encoding="utf-8"))
    assert datetime.date.fromisoformat(intake["as_of"])
    rejected = read(hostile, "quarantine")
    assert set(intake["files"]) >= {row["file"] for row in rejected}
    for name, counts in intake["files"].items():
        assert counts["rows_read"] == counts["accepted"] + counts["quarantined"]
        assert counts["quarantined"] == len({row["row"] for row in rejected if row["file"] == name})
    assert intake["tests_after_as_of"] == sum(row["check"] == "after_as_of" for row in read(hostile, "quality"))
    folder = write_cohort(tmp_path / "cohort", [hearing_test(t, f"203{n}-01-01", 0) for n, t in enumerate("ABC")])
    out = written(folder, tmp_path / "out")
    later = json.loads((out / "intake.json").read_text(encoding="utf-8"))
    assert (later["as_of"], later["tests_after_as_of"]) == ("2030-01-01", 2), "the day itself is not after"


class _Page(HTMLParser):
    """Collects what a page would fetch, and its text."""

    def __init__(self) -> None:
        super().__init__()
        self.fetched: list[tuple[str, str | None]] = []
        self.tags: list[str] = []
        self.text = ""

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append(tag)
        names = ("src", "href", "srcset", "action", "data", "poster", "background", "formaction", "ping")
        self.fetched += [(name, text) for name, text in attrs if name in names]

    def handle_data(self, data: str) -> None:
        self.text += data


def test_the_page_stands_alone(hostile: Path) -> None:
    """Nothing is fetched and nothing runs; the cautions, the settings and the counts are there."""
    text = (hostile / "summary.html").read_text(encoding="utf-8")
    page = _Page()
    page.feed(text)
    assert page.fetched == []
    assert not {"script", "link", "iframe", "object", "embed", "img", "form", "base"} & set(page.tags)
    assert not re.search(r"https?:|//[a-z]|@import|url\(|http-equiv", text, re.IGNORECASE)
    assert page.tags[0] == "html" and "title" in page.tags and text.startswith("<!doctype html>")
    words = " ".join(page.text.split())
    for needed in ("Decision support", "licensed audiologists and physicians", "us-osha", "rows in quarantine"):
        assert needed in words
    for action in {row["action"] for row in read(hostile, "worklist")}:
        assert action.replace("_", " ") in words


def test_the_page_shows_names_as_text(tmp_path) -> None:
    folder = write_cohort(
        tmp_path / "c", [hearing_test("A", "2020-01-01", 0)], toml='name = "<script>alert(1)</script> & co"\n'
    )
    text = (written(folder, tmp_path / "out") / "summary.html").read_text(encoding="utf-8")
    assert "<script" not in text and "&lt;script&gt;alert(1)&lt;/script&gt; &amp; co" in text


def test_a_cohort_without_tests_that_count(tmp_path) -> None:
    """Everything after the date of the review: files with headings, people on the worklist."""
    people = [{"person_id": "P", "sex": "f", "noise_since": "2029-12-31"}, {"person_id": "Q", "sex": "m"}]
    folder = write_cohort(tmp_path / "cohort", [hearing_test("A", "2031-01-01", 0)], people)
    out = written(folder, tmp_path / "out")
    assert (read(out, "shifts"), read(out, "events"), read(out, "baselines")) == ([], [], [])
    assert [(row["person_id"], row["due_on"], row["overdue"]) for row in read(out, "worklist")] == [
        ("P", "2030-06-30", "no"),
        ("Q", "", "unknown"),
    ]
    for name, columns in COLUMNS.items():
        heading = (out / f"{name}.csv").read_text(encoding="utf-8").splitlines()[0]
        assert heading.replace('"', "") == columns
