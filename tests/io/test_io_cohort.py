"""Reading a whole folder: broken files of every kind, and what is left of the order of things."""

import datetime
import gzip
import io
import os

import openpyxl
import pytest
from cohort_folders import AS_OF, PEOPLE, TESTS, counts, read, workbook, write

from audiokit.core.errors import CohortError
from audiokit.io.cohort import read_cohort

OLE = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + b"\0" * 600


@pytest.mark.parametrize(
    ("file", "content", "words"),
    [
        ("tests_csv", b"", ["tests.csv", "empty"]),
        ("tests_csv", workbook([["a"], [1]]), ["tests.csv", "Excel workbook", "suffix"]),
        ("tests_csv", OLE, ["password-protected", "without password"]),
        ("tests_csv", b"PAR1....", ["parquet file"]),
        ("tests_csv", gzip.compress(TESTS.encode()), ["packed with gzip", "unpack"]),
        ("tests_csv", b"%PDF-1.7", ["PDF document"]),
        ("tests_csv", b"\x89PNG\r\n\x1a\n", ["a picture"]),
        ("tests_csv", bytes(range(256)), ["tests.csv", "line 1"]),
        ("tests_csv", TESTS.encode("utf-16-le"), ["tests.csv", "zero byte"]),
        ("tests_csv", TESTS.replace(",", ";"), ["tests.csv", 'delimiter = ";"']),
        ("tests_csv", TESTS.encode() + b"P1,2020-01-01,\xe9,1,2\n", ["tests.csv", "line 4", "cp1252"]),
        ("tests_xlsx", workbook([["a"], [1]])[:900], ["tests.xlsx", "damaged"]),
        ("tests_xlsx", TESTS, ["tests.xlsx", "damaged"]),
        ("tests_xlsx", OLE, ["password-protected"]),
        ("tests_parquet", TESTS, ["tests.parquet", "damaged"]),
        ("people_csv", b"", ["people.csv", "empty"]),
    ],
)
def test_broken_files_are_refused_with_the_mend(tmp_path, file, content, words):
    with pytest.raises(CohortError) as error:
        read(write(tmp_path, **{file: content}))
    for word in words:
        assert word in str(error.value)
    assert error.value.mend


@pytest.mark.parametrize(
    ("toml", "words"),
    [
        ('[files]\ntests = "north.csv"', ["north.csv", "no such file"]),
        ('[files]\ntests = "inner"', ["inner", "files that end in nothing"]),
        ('[files]\ntests = "tests.xls"', ["files that end in .xls", ".csv, .xlsx, .parquet"]),
        ('[files]\ntests = "inner.csv"', ["inner.csv", "a folder"]),
    ],
)
def test_files_that_cannot_be_opened(tmp_path, toml, words):
    folder = write(tmp_path, cohort_toml=toml)
    (folder / "inner.csv").mkdir()
    with pytest.raises(CohortError) as error:
        read(folder)
    for word in words:
        assert word in str(error.value)


def test_a_file_without_rights(tmp_path, monkeypatch):
    folder = write(tmp_path)
    true_read = type(folder).read_bytes

    def refuse(self):
        if self.name == "tests.csv":
            raise PermissionError(13, "Permission denied")
        return true_read(self)

    monkeypatch.setattr(type(folder), "read_bytes", refuse)
    with pytest.raises(CohortError, match=r"tests.csv: the file cannot be read \(Permission denied\)"):
        read(folder)


def test_what_is_returned(tmp_path):
    told: list[str] = []
    cohort = read_cohort(str(write(tmp_path)), as_of=AS_OF, progress=told.append)
    assert cohort.folder == tmp_path and cohort.settings.as_of == AS_OF
    assert counts(cohort) == {"people.csv": (2, 2, 0), "tests.csv": (2, 2, 0)}
    assert [i.role for i in cohort.intake] == ["people", "tests"]
    assert told[:2] == ["reading people.csv", "reading tests.csv"]
    assert len(cohort.decisions) == 0


def test_tests_after_as_of_stay_in_the_grid(tmp_path):
    cohort = read_cohort(write(tmp_path), as_of=datetime.date(2020, 1, 15))
    assert len(cohort.grid) == 2


def test_three_sites_in_three_layouts(tmp_path):
    sheet = [
        ["Site South", None, None, None],
        [None] * 4,
        ["No", "Date", "Kind", 1000],
        ["P2", datetime.datetime(2020, 1, 5), "P", 999],
    ]
    toml = """
[files]
tests = ["north.csv", "south.xlsx"]
[[source]]
tests = "south.xlsx"
[source.sheet]
name = "Data"
header_row = 3
[source.columns]
person_id = "No"
tested_on = "Date"
purpose = "Kind"
left_1000 = "1000"
[source.cells]
no_response = ["999"]
[source.response_limits]
1000 = 80
[source.codes.purpose]
annual = ["P"]
[[source]]
tests = "west.csv"
date_order = "dmy"
delimiter = ";"
encoding = "cp1252"
"""
    folder = write(
        tmp_path,
        north_csv="person_id,tested_on,right_1000\nP1,2020-01-01,10\n",
        south_xlsx=workbook(sheet, "Data"),
        west_csv="person_id;tested_on;ear;frequency_hz;threshold;remarks\nP1;3.1.2020;left;1000;15;né\n".encode(
            "cp1252"
        ),
        cohort_toml=toml,
    )
    cohort = read(folder)
    assert len(cohort.quarantine) == 0
    assert cohort.grid.test_id.to_pylist() == ["P1@2020-01-01", "P1@2020-01-03", "P2@2020-01-05"]
    assert cohort.grid.threshold.tolist() == [[[100, 0, 0]], [[0, 150, 800]]]
    assert cohort.grid.response.tolist() == [[[0, 4, 4]], [[4, 0, 1]]]
    assert cohort.grid.purpose.tolist() == [0, 0, 2]
    assert cohort.grid.details["remarks"].tolist() == ["", "né", ""]
    assert cohort.grid.details["source_row"].tolist() == [2, 2, 4]


def test_a_workbook_of_people_and_tests_goes_by_its_sheets(tmp_path):
    book = openpyxl.Workbook()
    staff, tested = book.active, book.create_sheet("Tested")
    staff.title = "Staff"
    for sheet, lines in ((staff, PEOPLE), (tested, TESTS + "P9,2020-01-01,,1,1\n")):
        for line in lines.splitlines():
            sheet.append(line.split(","))
    data = io.BytesIO()
    book.save(data)
    toml = "".join(
        f'[[source]]\n{kind} = "book.xlsx"\n[source.sheet]\nname = "{sheet}"\n'
        for kind, sheet in (("people", "Staff"), ("tests", "Tested"))
    )
    folder = write(tmp_path, book_xlsx=data.getvalue(), cohort_toml=toml)
    (folder / "tests.csv").unlink(missing_ok=True)
    cohort = read(folder)
    assert counts(cohort) == {"book.xlsx [Staff]": (2, 2, 0), "book.xlsx [Tested]": (3, 2, 1)}
    assert cohort.quarantine["file"].tolist() == ["book.xlsx [Tested]"]


def test_links_that_lead_nowhere_are_named(tmp_path):
    folder = write(tmp_path)
    (folder / "tests.csv").unlink()
    for target in ("gone.csv", "tests.csv"):
        (folder / "tests.csv").symlink_to(target)
        with pytest.raises(CohortError, match=r"tests.csv: (a link to a file that is not there|.*symbolic links)"):
            read(folder)
        (folder / "tests.csv").unlink()


@pytest.mark.skipif(os.name == "nt", reason="Windows has no such devices")
def test_pipes_and_devices_are_not_read(tmp_path):
    folder = write(tmp_path)
    (folder / "tests.csv").unlink()
    (folder / "tests.csv").symlink_to("/dev/null")
    with pytest.raises(CohortError, match=r"tests.csv: this is a pipe or a device"):
        read(folder)
