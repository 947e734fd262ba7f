"""What a quarantined row becomes: its place, its text, a safe value, a sentence and a mend."""

import json
import string

import pyarrow as pa
import pytest
from cohort_folders import parquet, problems, read, workbook, write
from pandas import DataFrame

from audiokit.core.problems import PROBLEMS
from audiokit.io.quarantine import guard, looks_like_formula, shorten
from audiokit.model.cohort import QUARANTINE_COLUMNS

HEAD = "person_id,tested_on,right_1000,remarks\n"


def quarantine(tmp_path, rows: str, **files: str):
    return read(write(tmp_path, tests_csv=HEAD + rows, **files)).quarantine


def test_columns_and_types(tmp_path):
    frame = quarantine(tmp_path, "P1,2020-01-01,x,\n")
    assert tuple(frame.columns) == QUARANTINE_COLUMNS
    assert frame["row"].dtype == "int64"
    assert all(isinstance(v, str) for c in QUARANTINE_COLUMNS if c != "row" for v in frame[c])
    empty = quarantine(tmp_path, "P1,2020-01-01,1,\n")
    assert tuple(empty.columns) == QUARANTINE_COLUMNS and len(empty) == 0 and empty["row"].dtype == "int64"


def test_the_sentence_names_file_row_column_value_and_what_is_allowed(tmp_path):
    row = quarantine(tmp_path, "P1,2020-01-01,15.25,\n").iloc[0]
    assert row["file"] == "tests.csv" and row["row"] == 2 and row["column"] == "right_1000" and row["value"] == "15.25"
    assert row["problem"] == 'tests.csv, row 2, column right_1000: "15.25" is finer than a tenth of a dB.'
    assert "at most one decimal" in row["mend"]


def test_columns_are_named_as_in_the_file(tmp_path):
    toml = '[columns.tests]\nright_1000 = "R 1k"\n'
    folder = write(tmp_path, tests_csv="person_id,tested_on,R 1k\nP1,2020-01-01,x\n", cohort_toml=toml)
    assert problems(read(folder)) == [[2, "R 1k", "unreadable_threshold"]]


@pytest.mark.parametrize(
    "cell",
    [
        "=1+1",
        "@SUM(A1)",
        "+cmd",
        "-2+3",
        "-cmd|x",
        '="x"',
        " spaces ",
        "é\u2028/\\",
        'q"q',
        "two\nlines",
        "\ttab",
        "\rreturn",
    ],
)
def test_raw_json_holds_the_row_exactly(tmp_path, cell):
    quoted = '"' + cell.replace('"', '""') + '"'
    row = quarantine(tmp_path, f"P1,2020-01-01,x,{quoted}\n").iloc[0]
    expected = {"person_id": "P1", "tested_on": "2020-01-01", "right_1000": "x", "remarks": cell}
    assert json.loads(row["raw_json"]) == expected and "\n" not in row["raw_json"]


@pytest.mark.parametrize(
    ("cell", "value"),
    [
        ("=1+1", "'=1+1"), ("@x", "'@x"), ("+x", "'+x"), ("-x", "'-x"), ("-2+3", "'-2+3"), ("-200", "-200"),
        ("+200", "+200"), ("-7.55", "-7.55"), ("200+", "200+"), ("-200+", "-200+"), ("+A1", "'+A1"), ("'x", "'x"),
        (" =x", " =x"), ("\t=x", "'\t=x"), ("x=1", "x=1"),
    ],
)  # fmt: skip
def test_values_that_a_spreadsheet_would_run_get_an_apostrophe(tmp_path, cell, value):
    frame = quarantine(tmp_path, f'P1,2020-01-01,"{cell}",\n')
    assert frame["value"].tolist() == [value]
    assert json.loads(frame["raw_json"][0])["right_1000"] == cell


def test_headings_that_a_spreadsheet_would_run_get_an_apostrophe(tmp_path):
    toml = '[columns.tests]\nright_1000 = "=R"\n'
    folder = write(tmp_path, tests_csv="person_id,tested_on,=R\nP1,2020-01-01,x\n", cohort_toml=toml)
    assert read(folder).quarantine["column"].tolist() == ["'=R"]


def test_long_values_are_shortened_but_kept_in_raw_json(tmp_path):
    row = quarantine(tmp_path, f"P1,2020-01-01,{'é' * 100_000},\n").iloc[0]
    assert row["value"] == "é" * 199 + "…"
    assert len(row["problem"]) < 500
    assert json.loads(row["raw_json"])["right_1000"] == "é" * 100_000


def test_a_cell_of_ten_megabytes_is_quarantined(tmp_path):
    frame = quarantine(tmp_path, f"P1,2020-01-01,{'9' * 10_000_000},\nP2,2020-01-01,1,{'x' * 10_000_000}\n")
    assert frame["code"].tolist() == ["out_of_range"]


def test_ragged_rows_are_kept_whole(tmp_path):
    row = quarantine(tmp_path, 'P1,2020-01-01,"=a,b"\n').iloc[0]
    assert row["code"] == "ragged_row" and row["value"] == 'P1,2020-01-01,"=a,b"'
    assert json.loads(row["raw_json"]) == {"(whole row)": 'P1,2020-01-01,"=a,b"'}
    assert "the row has 3 cells; the headings have 4" in row["problem"]


def test_several_problems_of_a_row_follow_the_columns_of_the_file(tmp_path):
    frame = quarantine(tmp_path, "P9,x,x,\nP1,2020-01-01,x,\n")
    assert frame[["row", "column"]].values.tolist() == [
        [2, "person_id"], [2, "tested_on"], [2, "right_1000"], [3, "right_1000"],
    ]  # fmt: skip
    assert frame["raw_json"][0] == frame["raw_json"][1] == frame["raw_json"][2]


def test_raw_texts_of_sheets_and_parquet(tmp_path):
    rows = [["person_id", "tested_on", "right_1000"], ["P1", "2020-01-01", 150.0], ["P1", "2020-01-02", 7.25]]
    book = read(write(tmp_path / "x", tests_xlsx=workbook(rows))).quarantine
    table = read(write(tmp_path / "p", tests_parquet=parquet(DataFrame(rows[1:], columns=rows[0])))).quarantine
    for frame in (book, table):
        assert frame["value"].tolist() == ["150", "7.25"]
        assert json.loads(frame["raw_json"][0]) == {"person_id": "P1", "tested_on": "2020-01-01", "right_1000": "150"}
        assert frame["row"].tolist() == [2, 3]


def test_templates_use_only_what_is_filled():
    for code, kind in PROBLEMS.items():
        assert kind.code == code and kind.mend and kind.problem.startswith("{file}, row {row}")
        names = {name for t in (kind.problem, kind.mend) for _, name, _, _ in string.Formatter().parse(t) if name}
        assert names <= {"file", "row", "column", "value", "detail"}
        assert ("detail" in names) == bool(kind.detail)


def test_guard_and_shorten_on_nothing():
    none = pa.array([], pa.string())
    assert len(guard(none)) == len(shorten(none)) == len(looks_like_formula(none)) == 0


def test_texts_of_a_slice_are_guarded_by_their_own_first_letter():
    sliced = pa.array(["=a", "b", "", "=c"]).slice(1)
    assert guard(sliced).to_pylist() == ["b", "", "'=c"]


def test_the_name_of_a_file_does_not_make_a_problem_a_formula(tmp_path):
    folder = write(tmp_path, cohort_toml='[files]\ntests = "=x.csv"\n')
    (folder / "=x.csv").write_text("person_id,tested_on,right_1000\nP9,2020-01-01,1\n")
    frame = read(folder).quarantine
    assert frame["file"].tolist() == ["'=x.csv"]
    assert frame["problem"].iloc[0].startswith("'=x.csv, row 2, column person_id:")
