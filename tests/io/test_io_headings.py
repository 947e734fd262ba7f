"""Which column is which: mapping, required columns, and headings that cannot be."""

import pytest
from cohort_folders import PEOPLE, read, workbook, write

from audiokit.core.errors import CohortError

WIDE = "person_id,tested_on,right_1000\nP1,2020-01-01,10\n"


def refuse(tmp_path, words: list[str], **files: str | bytes) -> None:
    with pytest.raises(CohortError) as error:
        read(write(tmp_path, **files))
    for word in words:
        assert word in str(error.value)
    assert error.value.mend


@pytest.mark.parametrize(
    ("tests", "words"),
    [
        (
            "Emp No,tested_on,right_1000\n1,2,3\n",
            ["column person_id is missing", "[columns.tests]", "Emp No, tested_on"],
        ),
        ("persn_id,tested_on,right_1000\n1,2,3\n", ["person_id may be the column 'persn_id'"]),
        ("person_id,right_1000\n1,2\n", ["column tested_on is missing"]),
        ("a,right_1000\n1,2\n", ["column person_id and tested_on is missing"]),
        ("person_id,tested_on,R1000\nP1,2020-01-01,10\n", ["no column holds thresholds", "R1000"]),
        ("person_id,tested_on,500,1000\nP1,2020-01-01,10,5\n", ["no column holds thresholds", "500, 1000"]),
        ("person_id,tested_on,ear,threshold\nP1,2020-01-01,right,10\n", ["column frequency_hz is missing"]),
        ("person_id,tested_on,right_900,left_1000\nP1,2020-01-01,1,1\n", ["'right_900'", "no audiometric frequency"]),
        ("person_id,tested_on,right_500.0,left_1000\nP1,2020-01-01,1,1\n", ["'right_500.0'"]),
        ("person_id,tested_on,ear,frequency_hz,threshold,left_1000\nP1,2020-01-01,r,1,1,1\n", ["keep one of the two"]),
        ("person_id,tested_on,right_1000,right_1000\nP1,2020-01-01,1,1\n", ["columns 3 and 4", "'right_1000'"]),
        ("person_id,tested_on, right_1000,right_1000 \nP1,2020-01-01,1,1\n", ["columns 3 and 4"]),
        ("person_id,tested_on,right_1000,Valid\nP1,2020-01-01,1,no\n", ["'Valid'", "not be read", 'valid = "Valid"']),
        ("person_id,tested_on,right_1000,Left 1000\nP1,2020-01-01,1,1\n", ["'Left 1000'", "written left_1000"]),
        ("Tests of 2020,\nperson_id,tested_on\n", ["person_id and tested_on", "header_row under [sheet]"]),
    ],
)
def test_tests_tables_that_cannot_be_read(tmp_path, tests, words):
    refuse(tmp_path, ["tests.csv", *words], tests_csv=tests)


@pytest.mark.parametrize(
    ("people", "words"),
    [
        ("person_id,birth_date\nP1,\n", ["column sex is missing", "[columns.people]"]),
        ("id,sex,birth_year\nP1,f,\n", ["column person_id is missing"]),
        ("person_id,sex,born\nP1,f,\n", ["birth_date or birth_year is missing"]),
        ("person_id,sex\nP1,f\n", ["birth_date or birth_year is missing"]),
    ],
)
def test_people_tables_that_cannot_be_read(tmp_path, people, words):
    refuse(tmp_path, ["people.csv", *words], people_csv=people)


@pytest.mark.parametrize(
    ("setting", "words"),
    [
        (
            '[columns.tests]\nperson_id = "Emp No"',
            ["heading 'Emp No'", "[columns.tests]", "person_id, tested_on, right_1000"],
        ),
        ('[columns.tests]\nperson_id = "Person_id"', ["the nearest is 'person_id'"]),
        ('[columns.tests]\nremarks = "tested_on"', []),
        ('[columns.tests]\ntester = "right_1000"\nremarks = "right_1000"', ["two columns"]),
    ],
)
def test_mappings_that_do_not_fit(tmp_path, setting, words):
    refuse(tmp_path, ["tests.csv", *words], tests_csv=WIDE, cohort_toml=setting)


def test_a_mapped_heading_beside_our_own_name(tmp_path):
    tests = "person_id,No,tested_on,right_1000\nP1,P1,2020-01-01,10\n"
    words = ["takes person_id from 'No'", "also has a column 'person_id'"]
    refuse(tmp_path, words, tests_csv=tests, cohort_toml='[columns.tests]\nperson_id = "No"')


def test_our_name_may_be_mapped_to_itself(tmp_path):
    folder = write(tmp_path, tests_csv=WIDE, cohort_toml='[columns.tests]\nperson_id = "person_id"')
    assert len(read(folder).grid) == 1


def test_two_of_our_names_may_be_swapped(tmp_path):
    tests = "person_id,tested_on,left_1000,right_1000\nP1,2020-01-01,10,20\n"
    setting = '[columns.tests]\nleft_1000 = "right_1000"\nright_1000 = "left_1000"'
    grid = read(write(tmp_path, tests_csv=tests, cohort_toml=setting)).grid
    assert grid.threshold[:, 0, 0].tolist() == [100, 200]


def test_headings_that_look_like_numbers_are_mapped_as_text(tmp_path):
    sheet = workbook([["No", "Date", 500, 1000.0], ["P1", "2020-01-01", 10, 20]])
    setting = '[columns.tests]\nperson_id = "No"\ntested_on = "Date"\nright_500 = "500"\nright_1000 = "1000"'
    folder = write(tmp_path, tests_xlsx=sheet, cohort_toml=setting)
    grid = read(folder).grid
    assert grid.frequencies_hz == (500, 1000)
    assert grid.threshold[0, :, 0].tolist() == [100, 200]


def test_other_columns_of_people_are_kept_and_of_tests_ignored(tmp_path):
    people = "person_id,sex,birth_year,Shift, ,\nP1,f,1980,night,,x\n"
    tests = "person_id,tested_on,right_1000,mood\nP1,2020-01-01,10,good\n"
    cohort = read(write(tmp_path, people_csv=people, tests_csv=tests))
    assert list(cohort.people.table.columns) == ["person_id", "sex", "birth_year", "Shift", "(column 6)"]
    assert cohort.people.table.iloc[0].tolist() == ["P1", "f", "1980", "night", "x"]
    assert list(cohort.grid.details.columns) == ["source_file", "source_row"]


def test_people_alone_are_described_by_their_own_table(tmp_path):
    people = PEOPLE.replace("person_id", "No")
    folder = write(tmp_path, people_csv=people, cohort_toml='[columns.people]\nperson_id = "No"')
    assert len(read(folder).people) == 2


def test_a_name_written_in_another_way_beside_ours_is_another_column(tmp_path):
    tests = "person_id,tested_on,right_1000,purpose,Purpose\nP1,2020-01-01,10,baseline,x\n"
    assert read(write(tmp_path, tests_csv=tests)).grid.purpose.tolist() == [1]


def test_a_name_written_in_another_way_may_be_mapped(tmp_path):
    tests = "person_id,tested_on,right_1000,Purpose\nP1,2020-01-01,10,baseline\n"
    folder = write(tmp_path, tests_csv=tests, cohort_toml='[columns.tests]\npurpose = "Purpose"\n')
    assert read(folder).grid.purpose.tolist() == [1]


def test_no_more_headings_are_listed_than_can_be_read(tmp_path):
    headings = ["h" * 1000, *(f"h{i}" for i in range(5000))]
    with pytest.raises(CohortError) as error:
        read(write(tmp_path, tests_csv=",".join(headings) + "\n"))
    assert len(str(error.value)) < 1000 and "h58, …" in str(error.value)
