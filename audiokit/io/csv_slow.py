"""Records of a delimited text one by one, for the few files whose quotation marks no whole-array scan can place.

A quotation mark inside an unquoted cell (`Room 5", left booth`) is an ordinary character; where one stands, quotation
marks cannot be paired by counting. One that closes inside a cell (`"left" ear sore`) is read over, unless the cell has
line breaks: then whole rows may have been taken for its text.
"""

import csv
import io
import sys
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass

from audiokit.core.errors import CohortError

_LIMIT = threading.Lock()
_SENTINEL = "end of the text"
_MEND = "close it, or write a quotation mark inside a text twice and put the whole text in quotation marks"


@dataclass(frozen=True)
class SlowRecords:
    """cells, first physical line and text of each record that is not blank."""

    cells: list[list[str]]
    lines: list[int]
    texts: list[str]


@contextmanager
def _cells_of_any_length() -> Iterator[None]:
    with _LIMIT:
        limit = csv.field_size_limit(sys.maxsize)
        try:
            yield
        finally:
            csv.field_size_limit(limit)


def never_closed(file: str, line: int) -> CohortError:
    """The error for a quotation mark without its partner."""
    return CohortError(f"{file}: a quotation mark opened near line {line} is never closed", _MEND)


def _check_quotes(record: str, file: str, line: int, delimiter: str) -> None:
    try:
        list(csv.reader(io.StringIO(record, newline=""), delimiter=delimiter, strict=True))
    except csv.Error:
        raise CohortError(
            f"{file}: a quotation mark opened near line {line} closes on a later line, in the middle of a cell",
            _MEND,
        ) from None


def split_record(text: str, delimiter: str) -> list[str]:
    """Cells of one record."""
    with _cells_of_any_length():
        return next(csv.reader(io.StringIO(text, newline=""), delimiter=delimiter), [])


def slow_records(text: str, file: str, delimiter: str) -> SlowRecords:
    """All records of a text.

    Raises CohortError where a quotation mark is never closed, or on a later line in the middle of a cell.
    """
    physical = list(io.StringIO(f"{text}\n{_SENTINEL}", newline=""))
    found = SlowRecords([], [], [])
    with _cells_of_any_length():
        reader = csv.reader(physical, delimiter=delimiter)
        before = 0
        for cells in reader:
            if cells:
                found.cells.append(cells)
                found.lines.append(before + 1)
                found.texts.append("".join(physical[before : reader.line_num]).rstrip("\r\n"))
            before = reader.line_num
        if found.cells[-1] != [_SENTINEL]:
            raise never_closed(file, found.lines[-1])
        for record, line in zip(found.texts, found.lines, strict=True):
            if "\n" in record or "\r" in record:
                _check_quotes(record, file, line, delimiter)
    return SlowRecords(found.cells[:-1], found.lines[:-1], found.texts[:-1])
