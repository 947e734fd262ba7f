"""cohort.toml: every key, what overrides what, and an error with its mend for everything else."""

import datetime
import os
from pathlib import Path

import pytest
from cohort_folders import AS_OF, PEOPLE, TESTS, read, write

from audiokit.core.errors import CohortError
from audiokit.core.vocabulary import Response
from audiokit.io.cohort import read_cohort
from audiokit.io.settings import read_plan
from audiokit.model.cohort import Settings

FULL = """
name = "Example"
rulebook = ["us-osha", "us-niosh"]
age_correction = true
baseline_revision = "automatic"
as_of = 2025-01-31
recording_baseline = "in_force"
encoding = "utf-8"
delimiter = ","
date_order = "dmy"
decimal_comma = true
[files]
people = "people.csv"
tests = ["north.csv", "south.xlsx"]
[columns.people]
person_id = "Emp"
[columns.tests]
right_500 = "R500"
[cells]
no_response = ["999", 888]
did_not_test = "-"
[response_limits]
500 = 85
1000 = 92.5
[sheet]
name = "Sheet1"
header_row = 3
[codes.sex]
female = ["w", "2"]
[codes.purpose]
annual = ["Periodic"]
[[source]]
tests = "south.xlsx"
date_order = "mdy"
[source.columns]
person_id = "No"
[source.cells]
could_not_test = ["x"]
[source.codes.purpose]
other = ["z"]
[[source]]
tests = "west.csv"
"""


def plan(tmp_path, text: str):
    return read_plan(write(tmp_path, cohort_toml=text))


def test_every_key_is_read(tmp_path):
    found = plan(tmp_path, FULL)
    assert found.settings == Settings(
        "Example", datetime.date(2025, 1, 31), ("us-osha", "us-niosh"), True, "automatic", "in_force"
    )
    assert [f.name for f in found.people] == ["people.csv"]
    assert [f.name for f in found.tests] == ["north.csv", "south.xlsx", "west.csv"]
    assert found.people[0].settings.columns == {"person_id": "Emp"}
    assert found.people[0].settings.columns_section == "[columns.people]"
    north, _, west = (f.settings for f in found.tests)
    assert north == west
    assert north.columns == {"right_500": "R500"}
    assert north.cells == {"999": Response.NO_RESPONSE, "888": Response.NO_RESPONSE, "-": Response.DID_NOT_TEST}
    assert north.response_limits == {500: 850, 1000: 925}
    assert (north.sheet, north.header_row) == ("Sheet1", 3)
    assert (north.encoding, north.delimiter, north.date_order, north.decimal_comma) == ("utf-8", ",", "dmy", True)
    assert north.codes == {"sex": {"w": "female", "2": "female"}, "purpose": {"periodic": "annual"}}


def test_a_sources_own_table_replaces_the_general_one_whole(tmp_path):
    south = plan(tmp_path, FULL).tests[1].settings
    assert south.columns == {"person_id": "No"} and south.columns_section == "[source.columns]"
    assert south.cells == {"x": Response.COULD_NOT_TEST}
    assert south.codes == {"sex": {"w": "female", "2": "female"}, "purpose": {"z": "other"}}
    assert south.response_limits == {500: 850, 1000: 925}
    assert south.date_order == "mdy" and south.decimal_comma is True


def test_defaults(tmp_path):
    found = read_plan(write(tmp_path / "Plant"))
    assert found.settings.name == "Plant" and found.settings.as_of == datetime.date.today()
    assert found.settings == Settings("Plant", datetime.date.today())
    assert [f.name for f in (*found.people, *found.tests)] == ["people.csv", "tests.csv"]


def test_arguments_win_over_the_file(tmp_path):
    folder = write(tmp_path, cohort_toml='rulebook = "us-niosh"\nage_correction = true\nas_of = "2024-01-01"\n')
    assert read_cohort(folder).settings.as_of == datetime.date(2024, 1, 1)
    assert read_cohort(folder).settings.rulebooks == ("us-niosh",)
    found = read(folder, rulebooks="us-osha", age_correction=False, baseline_revision="automatic").settings
    assert found == Settings(tmp_path.name, AS_OF, ("us-osha",), False, "automatic")
    assert read(folder, rulebooks=["a", "b"]).settings.rulebooks == ("a", "b")
    for wrong in ({"baseline_revision": "now"}, {"recording_baseline": "x"}, {"rulebooks": []}):
        with pytest.raises(CohortError):
            read(folder, **wrong)


def test_a_source_may_describe_the_people(tmp_path):
    text = '[[source]]\npeople = "staff.csv"\n[source.columns]\nperson_id = "No"\n'
    found = plan(tmp_path, text)
    assert [f.name for f in found.people] == ["staff.csv"]
    assert found.people[0].settings.columns == {"person_id": "No"}


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("nam = 1", ["unknown key 'nam'", "did you mean name?", "known keys are: name, rulebook"]),
        ("[files]\ntest = 'a.csv'", ["unknown key 'test' in [files]", "did you mean tests?"]),
        ("[columns]\npersons = {}", ["unknown key 'persons' in [columns]"]),
        ("[columns.tests]\nright_900 = 'R9'", ["unknown key 'right_900' in [columns.tests]"]),
        ("[columns.people]\nright_500 = 'R'", ["unknown key 'right_500' in [columns.people]"]),
        ("[cells]\nnr = ['x']", ["unknown key 'nr' in [cells]", "no_response"]),
        ("[codes.sex]\nwoman = ['w']", ["unknown key 'woman' in [codes.sex]", "female, male, unknown"]),
        ("[codes.job]\na = ['w']", ["unknown key 'job' in [codes]"]),
        ("[response_limits]\n900 = 90", ["unknown key '900' in [response_limits]"]),
        ("[sheet]\nrow = 3", ["unknown key 'row' in [sheet]"]),
        ("[[source]]\ntests = 'a.csv'\nfiles = 1", ["unknown key 'files' in [source]"]),
        ("[[source]]\ntests = 'tests.csv'\n[source.sheet]\nx = 1", ["unknown key 'x' in [source.sheet]"]),
        ("name = 3", ["cohort.toml, name", "3 is not text"]),
        ("name = ' '", ["cohort.toml, name", "blank"]),
        ("rulebook = [1]", ["rulebook", "list of texts"]),
        ("rulebook = []", ["rulebook", "list of texts"]),
        ("rulebook = ['a', 'a']", ["rulebook", "named twice"]),
        ("age_correction = 'yes'", ["age_correction", "true or false"]),
        ("baseline_revision = 'auto'", ["baseline_revision", "'auto'", "reviewed, automatic"]),
        ("recording_baseline = 'x'", ["recording_baseline", "original, in_force"]),
        ("as_of = 2024-01-01T10:00:00", ["as_of", "is not a date"]),
        ("as_of = 'May 2024'", ["as_of", "'May 2024' is not a date"]),
        ("as_of = 5", ["as_of", "is not a date"]),
        ("encoding = 'klingon'", ["encoding", "'klingon' is not known"]),
        ("encoding = 'hex'", ["encoding", "'hex' is not known"]),
        ("delimiter = ';;'", ["delimiter"]),
        ("delimiter = 'a'", ["delimiter"]),
        ("date_order = 'DMY'", ["date_order", "ymd, dmy, mdy"]),
        ("decimal_comma = 1", ["decimal_comma", "true or false"]),
        ("cells = 3", ["cells", "a table"]),
        ("[cells]\nno_response = [true]", ["[cells] no_response", "list of codes"]),
        ("[cells]\nno_response = ['x']\ndid_not_test = ['x']", ["'x' is given two meanings"]),
        ("[codes.sex]\nfemale = ['w']\nmale = ['W']", ["'W' is given two meanings"]),
        ("[codes]\nsex = 'w'", ["[codes] sex", "a table"]),
        ("[response_limits]\n500 = 121", ["[response_limits] 500", "121", "-20 to 120"]),
        ("[response_limits]\n500 = 90.05", ["[response_limits] 500"]),
        ("[response_limits]\n500 = true", ["[response_limits] 500"]),
        ("[response_limits]\n500 = nan", ["[response_limits] 500"]),
        ("[sheet]\nheader_row = 0", ["[sheet] header_row", "0 is not a row number"]),
        ("[columns.tests]\nright_500 = 5", ["[columns.tests] right_500", "5 is not text"]),
        ("source = 3", ["source", "a list"]),
        ("source = [3]", ["source", "list of tables"]),
        ("[[source]]\ndelimiter = ';'", ["[[source]]", "names no file"]),
        ("[[source]]\ntests = 'a.csv'\npeople = 'b.csv'", ["[[source]]", "names people and tests"]),
        (
            "[[source]]\ntests = 'tests.csv'\n[[source]]\ntests = 'tests.csv'",
            ["two [[source]] tables describe tests.csv"],
        ),
        ("[files]\ntests = ['tests.csv', 'tests.csv']", ["a file is named twice"]),
        ("[files]\ntests = ['tests.csv', './tests.csv']", ["a file is named twice"]),
        ("[[source]]\ntests = ['tests.csv', './tests.csv']", ["two [[source]] tables describe tests.csv"]),
        ('[files]\ntests = "a\\u0000.csv"', ["[files] tests", "zero character"]),
        ("[cells]\nno_response = [nan]", ["[cells] no_response", "list of codes"]),
        (f"[cells]\nno_response = [{'9' * 400}]", ["[cells] no_response", "list of codes"]),
        ("encoding = 'undefined'", ["encoding", "'undefined' is not known"]),
        ('encoding = "utf\\u0000"', ["encoding", "is not known"]),
        (f"name = 0x{'f' * 9000}", ["name", "thousands of digits", "not text"]),
        (f"as_of = 0x{'f' * 9000}", ["as_of", "thousands of digits", "not a date"]),
        (f"[sheet]\nheader_row = 0x{'f' * 9000}", ["header_row", "not a row number"]),
        (f"name = {'9' * 5000}", ["cohort.toml", "digits"]),
        (f"name = {'[' * 5000}{']' * 5000}", ["cohort.toml", "nested too deep"]),
        ("name = 'a'\nname = 'b'", ["cohort.toml", "line 2"]),
        ("name = unquoted", ["cohort.toml", "line 1"]),
    ],
)
def test_what_is_wrong_is_named_with_its_mend(tmp_path, text, words):
    with pytest.raises(CohortError) as error:
        plan(tmp_path, text)
    for word in words:
        assert word in str(error.value)
    assert error.value.mend


def test_two_tables_of_one_kind_are_not_chosen_between(tmp_path):
    folder = write(tmp_path, people_csv=PEOPLE, people_xlsx="", tests_csv=TESTS)
    with pytest.raises(CohortError, match=r"people.csv and people.xlsx"):
        read_plan(folder)


@pytest.mark.parametrize("kind", ["people", "tests"])
def test_a_missing_table_is_named(tmp_path, kind):
    (write(tmp_path) / f"{kind}.csv").unlink()
    with pytest.raises(CohortError, match=f"there is no {kind} table"):
        read_plan(tmp_path)
    for name in (f"{kind.upper()}.csv", f"{kind}.xls"):
        (tmp_path / name).touch()
    with pytest.raises(CohortError, match=rf"there is no {kind} table .*; {kind.upper()}.csv and {kind}.xls cannot be"):
        read_plan(tmp_path)


def test_folders_that_are_none(tmp_path, monkeypatch):
    with pytest.raises(CohortError, match="no such folder"):
        read_plan(tmp_path / "none")
    write(tmp_path)
    with pytest.raises(CohortError, match="this is a file"):
        read_plan(tmp_path / "people.csv")

    def refuse(self):
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(type(tmp_path), "iterdir", refuse)
    with pytest.raises(CohortError, match="cannot be read"):
        read_plan(tmp_path)


def test_settings_that_are_no_text(tmp_path):
    with pytest.raises(CohortError, match="line 2: not UTF-8"):
        read_plan(write(tmp_path, cohort_toml=b"age_correction = true\nname = '\xe9'\n"))
    (tmp_path / "cohort.toml").unlink()
    (tmp_path / "cohort.toml").mkdir()
    with pytest.raises(CohortError, match=r"cohort.toml cannot be read"):
        read_plan(tmp_path)


@pytest.mark.parametrize("date", [datetime.date(1899, 12, 31), datetime.date(2201, 1, 1), datetime.date.max])
def test_a_review_speaks_for_a_date_that_files_may_hold(tmp_path, date):
    folder = write(tmp_path)
    with pytest.raises(CohortError, match=f"as_of: {date} lies outside the years 1900 to 2200"):
        read_cohort(folder, as_of=date)
    write(tmp_path, cohort_toml=f"as_of = {date}\n")
    with pytest.raises(CohortError, match=f"as_of: {date} lies outside the years 1900 to 2200"):
        read_cohort(folder)


def test_the_current_folder_is_called_by_its_name(tmp_path, monkeypatch):
    monkeypatch.chdir(write(tmp_path / "Plant"))
    (tmp_path / "Plant" / "tests.csv").unlink()
    with pytest.raises(CohortError, match=r"^Plant: there is no tests table"):
        read_plan(Path())


def test_a_folder_whose_name_is_no_text_has_a_name_that_is(tmp_path):
    folder = Path(os.fsdecode(os.fsencode(tmp_path) + b"/caf\xe9"))
    try:
        write(folder)
    except OSError:
        pytest.skip("this file system takes no such name")
    assert read_plan(folder).settings.name == "caf\N{REPLACEMENT CHARACTER}"


def test_a_file_written_in_two_ways_is_one_file(tmp_path):
    found = plan(tmp_path, "[[source]]\ntests = './tests.csv'\ndate_order = 'dmy'\n")
    assert [(f.name, f.settings.date_order) for f in found.tests] == [("tests.csv", "dmy")]
