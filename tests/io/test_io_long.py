"""Long tests tables: rows to tests, whole faulty files with their lists of problems, wide beside long."""

import pytest
from cohort_folders import counts, grid_rows, problems, read, write

from audiokit.core.vocabulary import Response

PEOPLE = "person_id,sex,birth_year\nP1,f,1980\nP2,m,1975\nP4,x,\n"
HEAD = "person_id,tested_on,ear,frequency_hz,threshold\n"
WITH_ID = "person_id,tested_on,ear,frequency_hz,threshold,test_id,purpose,tester,hours_since_noise\n"


def with_tests(tmp_path, rows: str, head: str = HEAD, toml: str = ""):
    return read(write(tmp_path, people_csv=PEOPLE, tests_csv=head + rows, cohort_toml=toml))


def test_rows_make_tests_by_person_and_time(tmp_path):
    rows = (
        "P2,2020-01-01,right,1000,10\nP1,2020-01-01,R,1000,NR\nP1,2020-01-01,left,500,5\nP2,2020-01-01T00:00,L,1000.0,DNT\n"
        "P1,2020-01-01T09:00,left,500,15\n"
    )
    cohort = with_tests(tmp_path, rows)
    grid = cohort.grid
    assert counts(cohort)["tests.csv"] == (5, 5, 0)
    assert grid.test_id.to_pylist() == ["P1@2020-01-01", "P1@2020-01-01#2", "P2@2020-01-01"]
    assert grid.frequencies_hz == (500, 1000)
    assert grid.threshold.tolist() == [[[0, 0, 0], [1000, 0, 100]], [[50, 150, 0], [0, 0, 0]]]
    measured, none, did_not, _, blank = list(Response)
    assert grid.response.tolist() == [
        [[blank, blank, blank], [none, blank, measured]],
        [[measured, measured, blank], [blank, blank, did_not]],
    ]
    assert grid.details["source_row"].tolist() == [3, 6, 2]


def test_rows_make_tests_by_test_id_where_given(tmp_path):
    rows = "P1,2020-01-01,r,1000,10,A,baseline,,\nP1,2020-01-01,l,1000,20,B,annual,X,2\n"
    rows += "P1,2020-01-01,r,1000,30,B,Annual,X,2.0\nP1,2020-01-01,r,500,5,,,,\n"
    grid = with_tests(tmp_path, rows, WITH_ID).grid
    assert grid.test_id.to_pylist() == ["A", "B", "P1@2020-01-01"]
    assert grid.purpose.tolist() == [1, 2, 0]
    assert grid.details["tester"].tolist() == ["", "X", ""]
    assert grid.details["hours_since_noise"][1] == 2
    assert grid.threshold[0, 1].tolist() == [100, 300, 0]


@pytest.mark.parametrize(
    ("rows", "expected", "tests"),
    [
        ("P1,2020-01-01,both,1000,1\nP1,2020-01-01,r,900,1\nP1,2020-01-01,l,1000,x\nP1,2020-01-01,l,500,5\n",
         [[2, "ear", "unknown_ear"], [3, "frequency_hz", "unknown_frequency"],
          [4, "threshold", "unreadable_threshold"]], 1),
        ("P1,2020-01-01,,,\n", [[2, "ear", "unknown_ear"], [2, "frequency_hz", "unknown_frequency"]], 0),
        (",,,,\n", [[2, "", "blank_row"]], 0),
        ("P1,2020-01-01,r,1000,1\nP1,2020-01-01,r,1000,1\n", [[3, "", "duplicate_row"]], 1),
        ("P1,2020-01-01,r,1000,1\nP1,2020-01-01,R,1000,2\nP1,2020-01-01,l,1000,2\n",
         [[2, "threshold", "conflicting_key"], [3, "threshold", "conflicting_key"]], 1),
        ("P1,2020-01-01,r,1000,1\nP1,2020-01-01T00:00,r,1000.0,1\n",
         [[2, "threshold", "conflicting_key"], [3, "threshold", "conflicting_key"]], 0),
        ("P9,2020-01-01,r,1000,1\nP4,2020-01-01,r,1000,1\nP1,,r,1000,1\n,2020-01-01,r,1000,1\nP1,1979-01-01,r,1000,1\n",
         [[2, "person_id", "unknown_person"], [3, "person_id", "unknown_person"], [4, "tested_on", "missing_date"],
          [5, "person_id", "missing_person_id"], [6, "tested_on", "before_birth"]], 0),
        ("P1,2020-01-01,r,1000,1\nP1,2020-01-01,r,1000\n", [[3, "", "ragged_row"]], 1),
    ],
)  # fmt: skip
def test_faulty_rows(tmp_path, rows, expected, tests):
    cohort = with_tests(tmp_path, rows)
    assert problems(cohort, "tests.csv") == expected
    read_rows, accepted, quarantined = counts(cohort)["tests.csv"]
    assert read_rows == accepted + quarantined == rows.count("\n")
    assert quarantined == len({row for row, _, _ in expected})
    assert len(cohort.grid) == tests


@pytest.mark.parametrize(
    ("rows", "expected", "ids"),
    [
        ("P1,2020-01-01,r,1000,1,A,annual,,\nP1,2020-01-01,l,1000,1,A,exit,,\nP1,2020-01-01,l,500,1,B,exit,,\n",
         [[2, "purpose", "inconsistent_test"], [3, "purpose", "inconsistent_test"]], ["B"]),
        ("P1,2020-01-01,r,1000,1,,,X,\nP1,2020-01-01,l,1000,1,,,,3\n",
         [[r, c, "inconsistent_test"] for r in (2, 3) for c in ("tester", "hours_since_noise")], []),
        ("P1,2020-01-01,r,1000,1,A,,,\nP2,2020-01-01,l,1000,1,A,,,\nP2,2020-01-01,l,1000,1,B,,,\n",
         [[2, "test_id", "conflicting_key"], [3, "test_id", "conflicting_key"]], ["B"]),
        ("P1,2020-01-01,r,1000,1,A,,,\nP1,2020-01-02,l,1000,1,A,,,\n",
         [[2, "test_id", "conflicting_key"], [3, "test_id", "conflicting_key"]], []),
        ("P1,2020-01-01,r,1000,1,A,,,\nP1,bad,l,1000,1,A,,,\n", [[3, "tested_on", "unreadable_date"]], ["A"]),
        ("P1,2020-01-01,r,1000,1,A,x,,\nP1,2020-01-01,l,1000,1,A,x,,\n",
         [[2, "purpose", "unknown_purpose"], [3, "purpose", "unknown_purpose"]], []),
        ("P1,2020-01-01,r,1000,1,=A,,,\n", [[2, "test_id", "formula_like_id"]], []),
    ],
)  # fmt: skip
def test_faulty_tests(tmp_path, rows, expected, ids):
    cohort = with_tests(tmp_path, rows, WITH_ID)
    assert problems(cohort, "tests.csv") == expected
    assert cohort.grid.test_id.to_pylist() == ids


def test_the_fault_of_one_row_does_not_touch_the_others(tmp_path):
    rows = "P1,2020-01-01,r,1000,200\nP1,2020-01-01,l,1000,20\n"
    grid = with_tests(tmp_path, rows).grid
    assert grid.response[:, 0, 0].tolist() == [Response.NOT_RECORDED, Response.MEASURED]


def test_no_response_codes_take_the_limit_of_their_frequency(tmp_path):
    rows = "P1,2020-01-01,r,250,NR\nP1,2020-01-01,r,500,x\nP1,2020-01-01,r,1000,NR\nP1,2020-01-01,r,2000,NR@70\n"
    toml = '[cells]\nno_response = ["x"]\n[response_limits]\n500 = 80\n[codes.ear]\nright = ["r"]\n'
    grid = with_tests(tmp_path, rows, toml=toml).grid
    assert grid.threshold[0, :, 0].tolist() == [900, 800, 1000, 700]


def test_own_words_for_ears(tmp_path):
    toml = '[codes.ear]\nright = ["D"]\nleft = ["G", "2"]\n'
    grid = with_tests(tmp_path, "P1,2020-01-01,d,1000,1\nP1,2020-01-01,2,1000,2\n", toml=toml).grid
    assert grid.threshold[:, 0, 0].tolist() == [10, 20]


def test_a_test_may_lie_in_two_long_files(tmp_path):
    folder = write(
        tmp_path,
        people_csv=PEOPLE,
        right_csv=HEAD + "P1,2020-01-01,r,1000,10\nP1,2020-01-01,r,500,5\n",
        left_csv=HEAD + "P1,2020-01-01,l,1000,20\nP1,2020-01-01,r,500,15\n",
        cohort_toml='[files]\ntests = ["right.csv", "left.csv"]\n',
    )
    cohort = read(folder)
    assert problems(cohort) == [
        [4, "sex", "unknown_sex"],
        [3, "threshold", "conflicting_key"],
        [3, "threshold", "conflicting_key"],
    ]
    assert cohort.grid.threshold.tolist() == [[[100]], [[200]]]
    assert cohort.grid.details["source_file"].tolist() == ["right.csv"]


def test_wide_and_long_files_in_one_cohort(tmp_path):
    folder = write(
        tmp_path,
        people_csv=PEOPLE,
        wide_csv="person_id,tested_on,right_1000,test_id\nP1,2020-01-01,10,A\nP1,2021-01-01,10,B\nP2,2020-01-01,5,\n",
        long_csv=WITH_ID + "P1,2020-01-01,r,1000,20,A,,,\nP1,2020-01-01,l,1000,20,C,,,\nP2,2020-01-01,l,1000,30,,,Z,\n",
        cohort_toml='[files]\ntests = ["long.csv", "wide.csv"]\n',
    )
    cohort = read(folder)
    assert problems(cohort, "wide.csv") == [[2, "test_id", "conflicting_key"]]
    assert problems(cohort, "long.csv") == [[2, "test_id", "conflicting_key"]]
    assert cohort.grid.test_id.to_pylist() == ["C", "B", "P2@2020-01-01", "P2@2020-01-01#2"]
    assert cohort.grid.details["source_file"].tolist() == ["long.csv", "wide.csv", "long.csv", "wide.csv"]
    assert cohort.grid.details["tester"].tolist() == ["", "", "Z", ""]


def test_wide_and_long_give_the_same_grid(tmp_path):
    wide_head = "person_id,tested_on,purpose,valid,right_500,right_1000,left_500,left_1000\n"
    tests = [
        ("P1", "2020-01-01", "baseline", "yes", "10", "NR@85", "DNT", ""),
        ("P2", "2020-05-01T08:00", "", "no", "-5", "7.5", "CNT", "90+"),
        ("P1", "2020-01-01T10:00", "retest", "", "0", "NR", "NR", "5"),
    ]
    columns = [("right", 500), ("right", 1000), ("left", 500), ("left", 1000)]
    wide = wide_head + "".join(",".join(test) + "\n" for test in tests)
    long = "person_id,tested_on,purpose,valid,ear,frequency_hz,threshold\n" + "".join(
        ",".join((*test[:4], ear, str(hz), cell)) + "\n"
        for test in tests
        for (ear, hz), cell in zip(columns, test[4:], strict=True)
    )
    first = read(write(tmp_path / "wide", people_csv=PEOPLE, tests_csv=wide))
    second = read(write(tmp_path / "long", people_csv=PEOPLE, tests_csv=long))
    assert problems(first, "tests.csv") == problems(second, "tests.csv") == []
    assert grid_rows(first) == grid_rows(second)


def test_all_rows_quarantined_gives_an_empty_grid(tmp_path):
    grid = with_tests(tmp_path, "P1,x,r,1000,1\n").grid
    assert len(grid) == 0 and grid.threshold.shape == (2, 0, 0) and grid.first.tolist() == [0, 0, 0]
