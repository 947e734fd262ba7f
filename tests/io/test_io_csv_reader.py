"""Delimited texts: row numbers, encodings, odd rows, and errors that say what to do."""

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from audiokit.core.errors import CohortError
from audiokit.io.csv_reader import read_csv


def table(text: str | bytes, **options: object) -> list[tuple[int, list[str]]]:
    """Source row and cells of every record."""
    raw = read_csv(text if isinstance(text, bytes) else text.encode(), "t.csv", **options)  # type: ignore[arg-type]
    columns = [raw.encoded(heading).texts(raw=True).to_pylist() for heading in raw.headings]
    return [(int(row), list(cells)) for row, cells in zip(raw.rows, zip(*columns, strict=True), strict=True)]


def test_rows_are_physical_lines():
    text = 'a,b\n1,"x\ny"\n\n2,z\r\n\r\n,\n3,"q""q"\n'
    assert table(text) == [(2, ["1", "x\ny"]), (5, ["2", "z"]), (7, ["", ""]), (8, ["3", 'q"q'])]


def test_cells_are_taken_as_they_are():
    text = "a,b\n 007 ,1.50\nNA,null\n1e5,True\n"
    assert [cells for _, cells in table(text)] == [[" 007 ", "1.50"], ["NA", "null"], ["1e5", "True"]]


def test_quotation_marks_inside_cells_are_ordinary_characters():
    text = 'a,b\n1,room 5" left\n\n2,"x\ny"\n3,z\n'
    assert table(text) == [(2, ["1", 'room 5" left']), (4, ["2", "x\ny"]), (6, ["3", "z"])]


def test_rows_of_another_length_are_set_apart():
    raw = read_csv(b'a,b\n1,2\n1\n1,2,3\n"x\ny"\n4,5\n', "t.csv")
    assert raw.rows.tolist() == [2, 7]
    assert raw.ragged.rows.tolist() == [3, 4, 5]
    assert raw.ragged.texts == ("1", "1,2,3", '"x\ny"')
    assert raw.ragged.cells.tolist() == [1, 3, 1]


def test_rows_of_another_length_beside_quotation_marks_inside_cells():
    raw = read_csv(b'a,b\n1,5"\n1\n"p\nq",2,3\n4,5\n', "t.csv")
    assert raw.rows.tolist() == [2, 6]
    assert raw.ragged.rows.tolist() == [3, 4]
    assert raw.ragged.texts == ("1", '"p\nq",2,3')


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16"])
def test_marked_encodings_are_recognised(encoding):
    assert table("a,b\né,ü\n".encode(encoding)) == [(2, ["é", "ü"])]


def test_other_encodings_are_named_by_the_user():
    assert table("a,b\né,1\n".encode("cp1252"), encoding="cp1252") == [(2, ["é", "1"])]
    assert table("a,b\né,1\n".encode("utf-16-le"), encoding="utf-16-le") == [(2, ["é", "1"])]


@pytest.mark.parametrize(
    ("data", "words"),
    [
        (b"", ["t.csv", "empty"]),
        (b"\n\r\n\n", ["t.csv", "empty"]),
        (b"\xef\xbb\xbf", ["empty"]),
        (b"a,b\n1,\xe9\n", ["line 2", "byte 7", "0xE9", 'encoding = "cp1252"']),
        (b"a,b\n1,\0\n", ["line 2", "zero byte"]),
        ("a,b\n1,2\n".encode("utf-16-le"), ["zero byte", "utf-16-le"]),
        (b"a;b;c\n1;2;3\n", ["';'", 'delimiter = ";"']),
        (b"a\tb\n1\t2\n", ['delimiter = "\\t"']),
        (b'a,b\n1,"2\n3,4\n', ["line 2", "never closed"]),
        (b'a,b\n1,5"\n1,"2\n3,4\n', ["line 3", "never closed"]),
        (b"a,b,a\n1,2,3\n", ["columns 1 and 3", "'a'"]),
        (b'a,b\n1,2\n3,"open\n4,5\n6,"open\n7,8\n', ["line 3", "closes on a later line", "in the middle of a cell"]),
        (b'a,b\n"open,1\n"other,2\n', ["line 2", "closes on a later line"]),
    ],
)
def test_errors_name_the_place_and_the_mend(data, words):
    with pytest.raises(CohortError) as error:
        read_csv(data, "t.csv")
    for word in words:
        assert word in str(error.value)


def test_delimiter_and_header_row_are_set_by_the_user():
    assert table("report\n\na;b\n1;2\n", delimiter=";", header_row=3) == [(4, ["1", "2"])]
    with pytest.raises(CohortError, match="no row begins on line 9"):
        table("a,b\n1,2\n", header_row=9)
    with pytest.raises(CohortError, match="no row begins on line 9"):
        table('a,b\n1,2"\n', header_row=9)


def test_headings_are_stripped_and_empty_ones_named_by_place():
    raw = read_csv(b" a ,,b, \n1,,2,3\n", "t.csv")
    assert raw.headings == ("a", "b", "(column 4)")


def test_a_cell_of_ten_megabytes_is_read():
    big = "x" * 10_000_000
    assert table(f'a,b\n1,{big}\n2,"{big}"\n3,4\n') == [(2, ["1", big]), (3, ["2", big]), (4, ["3", "4"])]


@settings(max_examples=200, deadline=None)
@given(data=st.one_of(st.binary(max_size=60), st.text(alphabet='a,;"\n\r\t\0é', max_size=40).map(str.encode)))
def test_whatever_the_bytes_it_is_a_table_or_a_clear_error(data):
    try:
        raw = read_csv(data, "t.csv")
    except CohortError as error:
        assert error.message.startswith("t.csv") and error.mend
    else:
        assert all(len(column) == len(raw) for column in raw.columns)


def test_a_quotation_mark_that_closes_inside_a_cell_of_one_line_is_read_over():
    assert table('a,b\n1,"left" ear sore\n2,"x\ny"\n') == [(2, ["1", "left ear sore"]), (3, ["2", "x\ny"])]


@pytest.mark.parametrize(
    ("encoding", "data"),
    [("punycode", b"person_id,sex\nP1,f-\n"), ("utf-7", b"a,b\n+2AA-,x\n")],
)
def test_encodings_of_other_things_than_tables_make_a_clear_error(encoding, data):
    with pytest.raises(CohortError, match=rf"t\.csv.*not text in {encoding}") as error:
        read_csv(data, "t.csv", encoding=encoding)
    assert error.value.mend
