"""Wide tests tables: whole faulty files with their lists of problems, and what the accepted rows become."""

import datetime

import numpy as np
import pytest
from cohort_folders import counts, grid_rows, problems, read, write

from audiokit.core.dates import to_days
from audiokit.core.vocabulary import Purpose, Response

PEOPLE = "person_id,sex,birth_date,birth_year\nP1,f,1980-01-01,\nP2,m,,1975\nP3,m,,\nP4,x,,\n"
HEAD = "person_id,tested_on,purpose,right_1000,left_1000\n"


def with_tests(tmp_path, rows: str, head: str = HEAD, toml: str = ""):
    return read(write(tmp_path, people_csv=PEOPLE, tests_csv=head + rows, cohort_toml=toml))


def day(year: int, month: int, date: int) -> int:
    return to_days(datetime.date(year, month, date))


def test_the_grid_of_a_small_file(tmp_path):
    rows = (
        "P2,2021-03-01,Annual,15,NR@90\nP1,2020-01-01,baseline,-5,DNT\nP2,2020-03-01,,7.5,CNT\nP1,2030-01-01,exit,NR,\n"
    )
    grid = with_tests(tmp_path, rows).grid
    assert grid.person.tolist() == [0, 0, 1, 1]
    assert grid.first.tolist() == [0, 2, 4, 4]
    assert grid.day.tolist() == [day(2020, 1, 1), day(2030, 1, 1), day(2020, 3, 1), day(2021, 3, 1)]
    assert grid.purpose.tolist() == [Purpose.BASELINE, Purpose.EXIT, Purpose.BLANK, Purpose.ANNUAL]
    assert grid.valid.tolist() == [True] * 4
    assert grid.frequencies_hz == (1000,)
    assert grid.threshold.tolist() == [[[-50, 1000, 75, 150]], [[0, 0, 0, 900]]]
    measured, none, did_not, could_not, blank = list(Response)
    assert grid.response.tolist() == [[[measured, none, measured, measured]], [[did_not, blank, could_not, none]]]
    assert grid.test_id.to_pylist() == ["P1@2020-01-01", "P1@2030-01-01", "P2@2020-03-01", "P2@2021-03-01"]
    assert grid.details["source_row"].tolist() == [3, 5, 4, 2]
    assert set(grid.details["source_file"]) == {"tests.csv"}


def test_types_of_the_arrays(tmp_path):
    grid = with_tests(tmp_path, "P1,2020-01-01,,1,2\n").grid
    found = [
        a.dtype for a in (grid.person, grid.first, grid.day, grid.purpose, grid.valid, grid.threshold, grid.response)
    ]
    assert found == [np.int32, np.int64, np.int32, np.int8, np.bool_, np.int16, np.int8]


@pytest.mark.parametrize(
    ("rows", "expected"),
    [
        ("P1,2020-01-01,,15.05,121\nP1,2020-01-02,,-20,120\n",
         [[2, "right_1000", "finer_than_tenth"], [2, "left_1000", "out_of_range"]]),
        ("P1,2020-01-01,,x,666\n", [[2, "right_1000", "unreadable_threshold"], [2, "left_1000", "out_of_range"]]),
        ("P1,,,1,2\nP1,01/02/2020,,1,2\nP1,2020-02-30,,1,2\nP1,2020-01-01T08:00Z,,1,2\n",
         [[2, "tested_on", "missing_date"], [3, "tested_on", "unreadable_date"], [4, "tested_on", "impossible_date"],
          [5, "tested_on", "zone_offset"]]),
        ("P9,2020-01-01,,1,2\nP4,2020-01-01,,1,2\np1,2020-01-01,,1,2\n",
         [[2, "person_id", "unknown_person"], [3, "person_id", "unknown_person"], [4, "person_id", "unknown_person"]]),
        (",2020-01-01,,1,2\n=P1,2020-01-01,,1,2\n",
         [[2, "person_id", "missing_person_id"], [3, "person_id", "formula_like_id"]]),
        (",,,,\n", [[2, "", "blank_row"]]),
        ("P1,2020-01-01,yearly,1,2\n", [[2, "purpose", "unknown_purpose"]]),
        ("P1,1979-12-31,,1,2\nP1,1980-01-01,,1,2\nP2,1974-12-31,,1,2\nP2,1975-01-01,,1,2\nP3,1900-01-01,,1,2\n",
         [[2, "tested_on", "before_birth"], [4, "tested_on", "before_birth"]]),
        ("P1,2020-01-01,,1,2\nP1,2020-01-01,,1,2\nP1,2020-01-01, ,1, 2\n",
         [[3, "", "duplicate_row"], [4, "", "duplicate_row"]]),
        ("P1,2020-01-01,,1,2\nP1,2020-01-01,,1,3\nP1,2020-01-01,,1.0,2\n", []),
        ("P9,2020-01-01,,x,2\nP9,2020-01-01,,x,2\n",
         [[2, "person_id", "unknown_person"], [2, "right_1000", "unreadable_threshold"], [3, "", "duplicate_row"],
          [3, "person_id", "unknown_person"], [3, "right_1000", "unreadable_threshold"]]),
        ("P1,2020-01-01,,1\nP1,2020-01-01,,1,2\n", [[2, "", "ragged_row"]]),
    ],
)  # fmt: skip
def test_faulty_rows(tmp_path, rows, expected):
    cohort = with_tests(tmp_path, rows)
    assert problems(cohort, "tests.csv") == expected
    read_rows, accepted, quarantined = counts(cohort)["tests.csv"]
    assert read_rows == accepted + quarantined == rows.count("\n")
    assert quarantined == len({row for row, _, _ in expected})
    assert accepted == len(cohort.grid)


def test_an_unknown_person_whose_own_row_was_quarantined_is_said_so(tmp_path):
    cohort = with_tests(tmp_path, "P9,2020-01-01,,1,2\nP4,2020-01-01,,1,2\n")
    found = cohort.quarantine[cohort.quarantine["code"] == "unknown_person"]["problem"].tolist()
    assert '"P9" is not in the people table' in found[0]
    assert '"P4" stands only in quarantined rows of the people table' in found[1]


OPTIONAL = HEAD.strip() + ",test_id,valid,hours_since_noise,remarks,right_1000_recheck,results_on\n"


def test_optional_columns(tmp_path):
    rows = "P1,2020-01-01,,1,2,T2,No,14.5,loud,NR@90,soon\nP1,2019-01-01,,1,2,T1,,,,,\n"
    cohort = with_tests(tmp_path, rows, OPTIONAL)
    grid = cohort.grid
    assert problems(cohort, "tests.csv") == []
    assert grid.test_id.to_pylist() == ["T1", "T2"] and grid.valid.tolist() == [True, False]
    assert list(grid.details.columns) == [
        "hours_since_noise", "results_on", "remarks", "right_1000_recheck", "source_file", "source_row",
    ]  # fmt: skip
    assert np.isnan(grid.details["hours_since_noise"][0]) and grid.details["hours_since_noise"][1] == 14.5
    assert grid.details["remarks"].tolist() == ["", "loud"]
    assert grid.details["right_1000_recheck"].tolist() == ["", "NR@90"]


@pytest.mark.parametrize(
    ("rows", "expected"),
    [
        ("P1,2020-01-01,,1,2,,maybe,-1,,150,\n",
         [[2, "valid", "unknown_valid"], [2, "hours_since_noise", "unreadable_number"],
          [2, "right_1000_recheck", "out_of_range"]]),
        ("P1,2020-01-01,,1,2,=T,,,,,\n", [[2, "test_id", "formula_like_id"]]),
        ("P9,2020-01-01,,1,2,=T,,,,,\n", [[2, "person_id", "unknown_person"], [2, "test_id", "formula_like_id"]]),
        ("P1,2020-01-01,,1,2,T,,,,,\nP1,2020-01-02,,1,2,T,,,,,\nP1,2020-01-03,,1,2,U,,,,,\n",
         [[2, "test_id", "conflicting_key"], [3, "test_id", "conflicting_key"]]),
        ("P1,2020-01-01,,1,2,T,,,,,\nP1,2020-01-01,,1,2, T,,,,,\n", [[3, "", "duplicate_row"]]),
        ("P1,2020-01-01,,1,2,T,,,,,\nP1,2020-01-01,,1,2,T,,,x,,\nP1,2020-01-01,,1,2,,,,,,\n",
         [[2, "test_id", "conflicting_key"], [3, "test_id", "conflicting_key"]]),
    ],
)  # fmt: skip
def test_faulty_optional_columns(tmp_path, rows, expected):
    assert problems(with_tests(tmp_path, rows, OPTIONAL), "tests.csv") == expected


def test_tests_are_ordered_by_time_then_by_input(tmp_path):
    rows = (
        "P1,2020-01-01T09:00,,1,\nP1,2020-01-01,,2,\nP1,2020-01-01 08:59:59.5,,3,\nP1,2020-01-01T00:00,,4,\n"
        "P1,2020-01-01T08:59:59.25,,5,\n"
    )
    grid = with_tests(tmp_path, rows).grid
    assert (grid.threshold[0, 0] // 10).tolist() == [2, 4, 5, 3, 1]
    assert set(grid.day.tolist()) == {day(2020, 1, 1)}
    assert grid.test_id.to_pylist() == [f"P1@2020-01-01{end}" for end in ("", "#2", "#3", "#4", "#5")]


def test_made_ids_never_meet_given_ones(tmp_path):
    head = "person_id,tested_on,right_1000,test_id\n"
    rows = "P1,2020-01-01,1,\nP1,2020-01-01,2,\nP2,2020-01-01,3,P1@2020-01-01\nP2,2020-01-01,4,P1@2020-01-01~\n"
    rows += "P2,2020-01-01,5,P1@2020-01-01#2\n"
    grid = with_tests(tmp_path, rows, head).grid
    assert grid.test_id.to_pylist()[:2] == ["P1@2020-01-01~~", "P1@2020-01-01#2~"]
    assert len(set(grid.test_id.to_pylist())) == 5


def test_rows_of_several_files_are_compared_and_follow_the_order_of_the_list(tmp_path):
    folder = write(
        tmp_path,
        people_csv=PEOPLE,
        b_csv="person_id,tested_on,right_1000\nP1,2020-01-01,10\nP2,2020-01-01,10\n",
        a_csv="left_500,tested_on,person_id,right_1000\n,2020-01-01,P1,10\n5,2020-01-01,P2,10\n,2019-01-01,P2,NR\n",
        cohort_toml='[files]\ntests = ["b.csv", "a.csv"]\n[response_limits]\n1000 = 85\n',
    )
    cohort = read(folder)
    assert problems(cohort, "a.csv") == [[2, "", "duplicate_row"]]
    assert "b.csv, row 2" in cohort.quarantine[cohort.quarantine["file"] == "a.csv"]["problem"].iloc[0]
    assert cohort.grid.frequencies_hz == (500, 1000)
    assert cohort.grid.details["source_file"].tolist() == ["b.csv", "a.csv", "b.csv", "a.csv"]
    assert cohort.grid.details["source_row"].tolist() == [2, 4, 3, 3]
    assert cohort.grid.response[1, 0].tolist() == [4, 4, 4, 0]
    assert cohort.grid.threshold[0, 1].tolist() == [100, 850, 100, 100]
    assert [i.file for i in cohort.intake] == ["people.csv", "b.csv", "a.csv"]


def test_no_response_codes_take_the_limit_of_their_frequency(tmp_path):
    head = "person_id,tested_on,right_250,right_500,right_1000,left_8000\n"
    toml = '[cells]\nno_response = ["999"]\n[response_limits]\n500 = 80\n'
    grid = with_tests(tmp_path, "P1,2020-01-01,999,NR,999,999\n", head, toml).grid
    assert grid.frequencies_hz == (250, 500, 1000, 8000)
    assert grid.threshold[0, :3, 0].tolist() == [900, 800, 1000] and grid.threshold[1, 3, 0] == 900


def test_dates_in_another_order_by_setting(tmp_path):
    rows = "P1,03/02/2020,,1,2\nP1,2020-02-04,,1,2\n"
    assert with_tests(tmp_path / "a", rows, toml='date_order = "dmy"').grid.day.tolist() == [
        day(2020, 2, 3),
        day(2020, 2, 4),
    ]
    assert with_tests(tmp_path / "b", rows, toml='date_order = "mdy"').grid.day.tolist() == [
        day(2020, 2, 4),
        day(2020, 3, 2),
    ]
    assert problems(with_tests(tmp_path / "c", rows), "tests.csv") == [[2, "tested_on", "unreadable_date"]]


def test_semicolons_and_decimal_commas_by_setting(tmp_path):
    rows = "P1;2020-01-01;annual;7,5;NR@92,5\n"
    toml = 'delimiter = ";"\ndecimal_comma = true\n[[source]]\npeople = "people.csv"\ndelimiter = ","\n'
    grid = with_tests(tmp_path, rows, HEAD.replace(",", ";"), toml).grid
    assert grid.threshold[:, 0, 0].tolist() == [75, 925]


def test_all_rows_quarantined_gives_an_empty_grid(tmp_path):
    grid = with_tests(tmp_path, "P1,x,,1,2\n").grid
    assert len(grid) == 0 and grid.threshold.shape == (2, 1, 0) and grid.first.tolist() == [0, 0, 0, 0]


def test_order_of_rows_and_people_does_not_matter(tmp_path):
    rng = np.random.default_rng(5)
    rows = [
        f"P{p},20{y:02d}-0{m}-01T0{h}:00,annual,{p + y},{m}\n"
        for p in (1, 2, 3)
        for y in (10, 11)
        for m in (1, 2)
        for h in (1, 2)
    ]
    first = with_tests(tmp_path / "a", "".join(rows))
    shuffled = with_tests(tmp_path / "b", "".join(rng.permutation(rows)))
    assert grid_rows(first) == grid_rows(shuffled)
