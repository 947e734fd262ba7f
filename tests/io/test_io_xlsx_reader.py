"""Excel workbooks: values as canonical text, sheet rows, and errors that say what to do."""

import datetime
import io
import re
import zipfile

import openpyxl
import pytest
from cohort_folders import workbook

from audiokit.core.errors import CohortError
from audiokit.io.xlsx_reader import cell_text, read_xlsx


def two_sheets() -> bytes:
    book = openpyxl.Workbook()
    book.active.append(["a"])
    book.create_sheet("Other").append(["b"])
    data = io.BytesIO()
    book.save(data)
    return data.getvalue()


def rewritten(data: bytes, change) -> bytes:
    """A workbook with its first sheet's XML changed."""
    out = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(data)) as source, zipfile.ZipFile(out, "w") as target:
        for item in source.namelist():
            content = source.read(item)
            target.writestr(item, change(content) if item.endswith("sheet1.xml") else content)
    return out.getvalue()


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (15, "15"), (15.0, "15"), (7.5, "7.5"), (-0.1, "-0.1"), (1e15, "1000000000000000"), (True, "yes"),
        (False, "no"), (None, ""), (" x ", " x "), (datetime.datetime(2024, 1, 5), "2024-01-05"),
        (datetime.datetime(2024, 1, 5, 8, 30), "2024-01-05T08:30:00"), (datetime.date(2024, 1, 5), "2024-01-05"),
        (datetime.time(8, 30), "08:30:00"),
    ],
)  # fmt: skip
def test_values_become_canonical_text(value, text):
    assert cell_text(value) == text


def test_rows_are_those_of_the_sheet_and_empty_rows_are_none():
    raw = read_xlsx(workbook([["a", 500, 1000.0], [1, 2, 3], [None, None, None], [4.0, None, "x"]]), "t.xlsx")
    assert raw.headings == ("a", "500", "1000")
    assert raw.rows.tolist() == [2, 4]
    assert raw.encoded("a").texts().to_pylist() == ["1", "4"]
    assert raw.encoded("500").texts().to_pylist() == ["2", ""]
    assert raw.typed


def test_rows_above_the_headings_are_ignored():
    rows = [["Report", None], [None, None], ["a", "b"], [1, 2]]
    raw = read_xlsx(workbook(rows), "t.xlsx", header_row=3)
    assert raw.headings == ("a", "b") and raw.rows.tolist() == [4]


def test_data_beyond_the_headings_get_a_column_named_by_place():
    raw = read_xlsx(workbook([["a", "b"], [1, 2, None, 9]]), "t.xlsx")
    assert raw.headings == ("a", "b", "(column 4)")


def test_the_sheet_is_chosen_by_name_and_never_guessed():
    with pytest.raises(CohortError, match=r"2 of the sheets hold data \(Sheet, Other\)"):
        read_xlsx(two_sheets(), "t.xlsx")
    with pytest.raises(CohortError, match="no sheet 'North'"):
        read_xlsx(two_sheets(), "t.xlsx", sheet="North")


def test_a_wrong_stated_size_does_not_hide_cells():
    data = rewritten(workbook([["a", "b"], [1, 2]]), lambda xml: xml.replace(b'ref="A1:B2"', b'ref="A1"'))
    assert read_xlsx(data, "t.xlsx").headings == ("a", "b")


def test_a_formula_without_stored_result_is_refused():
    data = workbook([["a", "b"], ["x", "=1+1"]], formulas=True)
    with pytest.raises(CohortError, match=r"cell B2: the formula has no stored result"):
        read_xlsx(data, "t.xlsx")


@pytest.mark.parametrize(
    ("cell", "text"),
    [
        (b'<c r="A3"><f>1+1</f><v>2</v></c>', "2"),
        (b'<c r="A3" t="str"><f>IF(1,"",2)</f><v></v></c>', ""),
        (b'<c t="str" r="A3"><f>"x"</f><v>x</v></c>', "x"),
    ],
)
def test_a_formula_with_stored_result_is_read(cell, text):
    data = rewritten(workbook([["a", "b"], ["y", 1], [1, 2]]), lambda xml: re.sub(rb'<c r="A3".*?</c>', cell, xml))
    assert read_xlsx(data, "t.xlsx").encoded("a").texts().to_pylist() == ["y", text]


def test_a_formula_without_stored_result_is_noticed_whatever_the_prefix():
    cell = b'<x:c s="1" r="A3" xmlns:x="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><x:f>1+1</x:f></x:c>'
    data = rewritten(workbook([["a"], ["y"], [1]]), lambda xml: re.sub(rb'<c r="A3".*?</c>', cell, xml))
    with pytest.raises(CohortError, match="cell A3: the formula has no stored result"):
        read_xlsx(data, "t.xlsx")


@pytest.mark.parametrize(
    ("data", "words"),
    [
        (workbook([["a"], [1]])[:500], "damaged"),
        (b"PK\x03\x04 no archive", "damaged"),
        (workbook([]), "none of the sheets hold data"),
        (rewritten(workbook([["a"], [1]]), lambda xml: xml[: len(xml) // 2]), "damaged"),
    ],
)
def test_damaged_and_empty_workbooks(data, words):
    with pytest.raises(CohortError, match=words) as error:
        read_xlsx(data, "t.xlsx")
    assert error.value.mend


def test_a_missing_heading_row_is_named():
    with pytest.raises(CohortError, match="no row 7 with headings"):
        read_xlsx(workbook([["a"], [1]]), "t.xlsx", header_row=7)


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        (b'<row r="3"', b'<row r="0"', "row 0 stands out of order"),
        (b'<row r="4"', b'<row r="3"', "row 3 stands out of order"),
        (b'r="B3"', b'r="A3"', "cell A3 stands out of order"),
        (b'r="A3"', b'r="C3"', "cell B3 stands out of order"),
    ],
)
def test_rows_and_cells_out_of_order_would_be_dropped_and_are_refused(old, new, words):
    data = rewritten(workbook([["a", "b"], [1, 2], [3, 4], [5, 6]]), lambda xml: xml.replace(old, new, 1))
    with pytest.raises(CohortError, match=words):
        read_xlsx(data, "t.xlsx")


def test_columns_beyond_z_are_in_order():
    row = [f"h{i}" for i in range(60)]
    assert read_xlsx(workbook([row, list(range(60))]), "t.xlsx").headings == tuple(row)


def test_what_the_workbook_library_warns_of_is_not_shown(recwarn):
    book = openpyxl.Workbook()
    for value in ("a", 99999999999):
        book.active.append([value])
    book.active["A2"].number_format = "yyyy-mm-dd"
    data = io.BytesIO()
    book.save(data)
    assert read_xlsx(data.getvalue(), "t.xlsx").encoded("a").texts().to_pylist() == ["#VALUE!"]
    assert not recwarn.list
