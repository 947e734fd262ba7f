"""People tables: whole faulty files with their lists of problems, and what the accepted rows become."""

import datetime

import pytest
from cohort_folders import TESTS, counts, problems, read, write

from audiokit.core.dates import NO_DATE, to_days
from audiokit.core.vocabulary import Sex

HEAD = "person_id,sex,birth_date,birth_year,left_on,hired_on,noise_since\n"


def people(tmp_path, rows: str, head: str = HEAD):
    return read(write(tmp_path, people_csv=head + rows))


def days(year: int, month: int, day: int) -> int:
    return to_days(datetime.date(year, month, day))


def test_people_are_in_order_of_identifier_by_code_point(tmp_path):
    cohort = people(tmp_path, "b,f,,,,,\nB,m,,,,,\n10,u,,,,,\n9,,,,,,\né,f,,,,,\n")
    assert cohort.people.person_id.to_pylist() == ["10", "9", "B", "b", "é"]
    assert cohort.people.sex.tolist() == [Sex.UNKNOWN, Sex.UNKNOWN, Sex.MALE, Sex.FEMALE, Sex.FEMALE]
    assert cohort.people.table["person_id"].tolist() == cohort.people.person_id.to_pylist()
    assert cohort.people.table.index.tolist() == [0, 1, 2, 3, 4]


def test_dates_and_years(tmp_path):
    rows = "A,f,1980-06-15,1980,2020-01-31,2001-02-03,2002-01-01\nB,f,,1975,,,\n"
    rows += "C,f,1850-01-01,,,,\nD,f,,,,,\nE,m,,1980.0,,,\n"
    cohort = people(tmp_path, rows)
    assert problems(cohort, "people.csv") == []
    found = cohort.people
    assert found.birth_day.tolist() == [days(1980, 6, 15), NO_DATE, days(1850, 1, 1), NO_DATE, NO_DATE]
    assert found.birth_year.tolist() == [1980, 1975, 1850, 0, 1980]
    assert found.left_day.tolist() == [days(2020, 1, 31)] + [NO_DATE] * 4
    assert found.hired_day[0] == days(2001, 2, 3) and found.noise_since_day[0] == days(2002, 1, 1)
    assert found.birth_year.dtype == "int16" and found.birth_day.dtype == "int32" and found.sex.dtype == "int8"


def test_columns_that_are_absent_are_not_recorded(tmp_path):
    found = people(tmp_path, "A,f,1980\n", "person_id,sex,birth_year\n").people
    assert found.left_day.tolist() == found.hired_day.tolist() == found.noise_since_day.tolist() == [NO_DATE]


@pytest.mark.parametrize(
    ("rows", "expected"),
    [
        ("A,f,,1980,,,\n,f,,1980,,,\n", [[3, "person_id", "missing_person_id"]]),
        ("A,f,,,,,\n,,,,,,\n , ,,,,,\n", [[3, "", "blank_row"], [4, "", "blank_row"]]),
        ("A,x,,,,,\nB,2,,,,,\n", [[2, "sex", "unknown_sex"], [3, "sex", "unknown_sex"]]),
        ("A,f,1980-01-01,1981,,,\nB,f,1980-01-01,1980,,,\n", [[2, "birth_year", "conflicting_birth"]]),
        ("A,f,1849-12-31,,,,\nB,f,01/02/1980,,,,\nC,f,1980-02-30,,,,\n",
         [[2, "birth_date", "impossible_date"], [3, "birth_date", "unreadable_date"],
          [4, "birth_date", "impossible_date"]]),
        ("A,f,,1849,,,\nB,f,,2201,,,\nC,f,,80,,,\nD,f,,1980.5,,,\nE,f,,1850,,,\nF,f,,2200,,,\n",
         [[r, "birth_year", "unreadable_year"] for r in (2, 3, 4, 5)]),
        ("A,f,,,x,1899-01-01,2020-01-01T00:00Z\n",
         [[2, "left_on", "unreadable_date"], [2, "hired_on", "impossible_date"], [2, "noise_since", "zone_offset"]]),
        ("=A,f,,,,,\n+B,f,,,,,\n-C,f,,,,,\n@D,f,,,,,\n-5,f,,,,,\n+5,f,,,,,\n+-5,f,,,,,\n",
         [[r, "person_id", "formula_like_id"] for r in (2, 3, 4, 5, 8)]),
        ("A,f,,,,,\nA,f,,,,,\n A ,f,,,,,\nB,f,,,,,\n", [[3, "", "duplicate_row"], [4, "", "duplicate_row"]]),
        ("A,f,,,,,\nB,f,,,,,\nA,m,,,,,\n", [[2, "person_id", "conflicting_key"], [4, "person_id", "conflicting_key"]]),
        ("A,f,,,,,\nA,f,,,,,\nA,m,,,,,\n",
         [[2, "person_id", "conflicting_key"], [3, "", "duplicate_row"], [3, "person_id", "conflicting_key"],
          [4, "person_id", "conflicting_key"]]),
        ("A,f,,,,,\na,f,,,,,\n", []),
        ("A,f,,,,,\nA,x,,,,,\n",
         [[2, "person_id", "conflicting_key"], [3, "person_id", "conflicting_key"], [3, "sex", "unknown_sex"]]),
        (",f,,,,,\n,f,,,,,\n,m,,,,,\n",
         [[2, "person_id", "missing_person_id"], [3, "", "duplicate_row"], [3, "person_id", "missing_person_id"],
          [4, "person_id", "missing_person_id"]]),
        ("A,f\nB,f,,,,,\nC,f,,,,,,\n", [[2, "", "ragged_row"], [4, "", "ragged_row"]]),
    ],
)  # fmt: skip
def test_faulty_rows(tmp_path, rows, expected):
    cohort = people(tmp_path, rows)
    assert problems(cohort, "people.csv") == expected
    read_rows, accepted, quarantined = counts(cohort)["people.csv"]
    assert read_rows == accepted + quarantined == rows.count("\n")
    assert quarantined == len({row for row, _, _ in expected})
    assert accepted == len(cohort.people)


def test_own_words_for_sex(tmp_path):
    toml = '[codes.sex]\nfemale = ["2", "W"]\nmale = [1]\nunknown = ["9"]\n'
    rows = "A,2,1980-01-01\nB,w,1980-01-01\nC,1,1980-01-01\nD,9,1980-01-01\nE,m,1980-01-01\n"
    cohort = read(write(tmp_path, people_csv="person_id,sex,birth_date\n" + rows, cohort_toml=toml))
    assert cohort.people.sex.tolist() == [Sex.FEMALE, Sex.FEMALE, Sex.MALE, Sex.UNKNOWN, Sex.MALE]


def test_several_people_tables_are_joined_and_compared(tmp_path):
    folder = write(
        tmp_path,
        people_csv="person_id,sex,birth_year,site\nA,f,1980,North\nB,m,1970,North\n",
        more_csv="person_id,sex,birth_year,crew\nA,f,1980,\nB,m,1971,red\nC,u,1960,blue\n",
        tests_csv=TESTS,
        cohort_toml='[files]\npeople = ["people.csv", "more.csv"]\n',
    )
    cohort = read(folder)
    assert problems(cohort, "more.csv") == [[2, "person_id", "conflicting_key"], [3, "person_id", "conflicting_key"]]
    assert problems(cohort, "people.csv") == [[2, "person_id", "conflicting_key"], [3, "person_id", "conflicting_key"]]
    assert cohort.people.person_id.to_pylist() == ["C"]
    assert cohort.people.table.iloc[0].to_dict() == {
        "person_id": "C", "sex": "u", "birth_year": "1960", "site": "", "crew": "blue",
    }  # fmt: skip


def test_an_absent_column_equals_a_blank_cell(tmp_path):
    folder = write(
        tmp_path,
        people_csv="person_id,sex,birth_year,site\nA,f,1980,\n",
        more_csv="birth_year,person_id,sex\n1980,A,f\n",
        tests_csv=TESTS,
        cohort_toml='[files]\npeople = ["people.csv", "more.csv"]\n',
    )
    assert problems(read(folder), "more.csv") == [[2, "", "duplicate_row"]]


def test_nobody_is_accepted(tmp_path):
    cohort = people(tmp_path, "A,x,,,,,\n")
    assert len(cohort.people) == 0 and len(cohort.grid) == 0
    assert cohort.grid.first.tolist() == [0]
