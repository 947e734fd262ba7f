"""Where records of a delimited text lie, against the standard library's reader."""

import csv
import io

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from audiokit.io import csv_records
from audiokit.io.csv_records import find_records


def standard(text: str) -> tuple[list[int], list[int]]:
    """First physical line and number of cells of every record that is not blank."""
    lines, cells, before = [], [], 0
    reader = csv.reader(io.StringIO(text, newline=""))
    for row in reader:
        if row:
            lines.append(before + 1)
            cells.append(len(row))
        before = reader.line_num
    return lines, cells


def quoted(cell: str) -> str:
    return '"' + cell.replace('"', '""') + '"'


CELLS = st.text(alphabet='ab,"\n\r é', max_size=6)
PLAIN = st.text(alphabet="ab é", max_size=4)
RECORDS = st.lists(st.lists(st.one_of(PLAIN, CELLS.map(quoted)), min_size=1, max_size=4), max_size=8)


@settings(max_examples=300, deadline=None)
@given(
    records=RECORDS, end=st.sampled_from(["\n", "\r\n", "\r"]), last=st.booleans(), block=st.sampled_from([1, 2, 7, 64])
)
def test_lines_and_cells_agree_with_the_standard_reader(records, end, last, block):
    text = end.join(",".join(record) for record in records) + (end if last else "")
    data = np.frombuffer(text.encode(), np.uint8)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(csv_records, "_BLOCK", block)
        found = find_records(data, ord(","))
    lines, cells = standard(text)
    assert not found.stray_quote and not found.open_quote
    assert found.line.tolist() == lines
    assert found.cells.tolist() == cells
    for start, stop, line in zip(found.start, found.stop, lines, strict=True):
        assert text.encode()[start:stop].decode(), f"record on line {line} is empty"


@pytest.mark.parametrize("text", ['a,5" b,c\n', 'a,b "x" c\n', '"a" "b",c\n'])
def test_a_quotation_mark_inside_a_cell_is_noticed(text):
    assert find_records(np.frombuffer(text.encode(), np.uint8), ord(",")).stray_quote


def test_an_open_quotation_mark_is_noticed_with_its_line():
    found = find_records(np.frombuffer(b'a,b\n1,2\n3,"4\n5,6\n', np.uint8), ord(","))
    assert found.open_quote == 3
