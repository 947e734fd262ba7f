"""Delimited text to a RawTable: every cell as text, nothing inferred, rows of another length set apart."""

from collections.abc import Collection, Sequence

import numpy as np
import pyarrow as pa
import pyarrow.csv
from numpy.typing import NDArray

from audiokit.core.errors import CohortError
from audiokit.io.csv_records import Records, find_records
from audiokit.io.csv_slow import never_closed, slow_records, split_record
from audiokit.io.csv_text import decode
from audiokit.io.headings import clean_headings
from audiokit.io.raw import RaggedRows, RawTable

_SMALLEST_BLOCK = 1 << 22
_LARGEST_RECORD = 1 << 29


def _no_such_line(file: str, header_row: int) -> CohortError:
    return CohortError(f"{file}: no row begins on line {header_row}", "correct header_row in cohort.toml")


def _check_delimiter(names: list[str], file: str, delimiter: str) -> None:
    for other, written in ((";", ";"), ("\t", "\\t"), ("|", "|"), (",", ",")):
        if len(names) == 1 and other != delimiter and other in names[0]:
            raise CohortError(
                f"{file}: the headings hold no {delimiter!r}, but {names[0].count(other)} times {other!r}",
                f'if that stands between the columns, set delimiter = "{written}" for this file in cohort.toml',
            )


def _arrow_columns(
    text: memoryview, records: Records, plain: Sequence[bool], delimiter: str
) -> tuple[pa.ChunkedArray, ...] | None:
    """The columns as pyarrow reads them, by distinct texts; None where it sees other records than `records` says."""
    keys = [str(i) for i in range(len(plain))]
    distinct = pa.dictionary(pa.int32(), pa.string())
    longest = int((records.stop - records.start).max())
    table = pyarrow.csv.read_csv(
        pa.BufferReader(pa.py_buffer(text)),
        read_options=pyarrow.csv.ReadOptions(column_names=keys, block_size=max(_SMALLEST_BLOCK, 2 * longest + 16)),
        parse_options=pyarrow.csv.ParseOptions(
            delimiter=delimiter,
            newlines_in_values=bool(np.any(np.diff(records.line) > 1)),
            invalid_row_handler=lambda row: "skip",
        ),
        convert_options=pyarrow.csv.ConvertOptions(
            column_types={key: pa.string() if whole else distinct for key, whole in zip(keys, plain, strict=True)},
            strings_can_be_null=False,
            null_values=[],
        ),
    )
    return tuple(table.columns) if len(table) == np.count_nonzero(records.cells == len(plain)) else None


def _table(
    file: str,
    names: list[str],
    columns: tuple[pa.ChunkedArray, ...],
    rows: NDArray[np.int64],
    ragged: RaggedRows,
) -> RawTable:
    headings, kept = clean_headings(names, columns, file)
    return RawTable(file, headings, kept, rows, ragged)


def _read_slowly(text: bytes, file: str, delimiter: str, header_row: int | None) -> RawTable:
    found = slow_records(text.decode(), file, delimiter)
    head = 0
    if header_row is not None:
        if header_row not in found.lines:
            raise _no_such_line(file, header_row)
        head = found.lines.index(header_row)
    names, body = found.cells[head], found.cells[head + 1 :]
    _check_delimiter(names, file, delimiter)
    lines = np.asarray(found.lines[head + 1 :], np.int64)
    counts = np.fromiter((len(cells) for cells in body), np.int64, len(body))
    kept = [cells for cells in body if len(cells) == len(names)]
    columns = tuple(
        pa.chunked_array([pa.array([cells[i] for cells in kept], pa.string()).dictionary_encode()])
        for i in range(len(names))
    )
    odd = counts != len(names)
    texts = tuple(found.texts[head + 1 + i] for i in np.flatnonzero(odd))
    return _table(file, names, columns, lines[~odd], RaggedRows(lines[odd], texts, counts[odd]))


def _body(records: Records, text: bytes, file: str, header_row: int | None) -> tuple[str, Records]:
    """Text of the headings, and the records below them."""
    if not len(records):
        raise CohortError(f"{file}: the file is empty", "export the table again, with its row of headings")
    head = 0 if header_row is None else int(np.searchsorted(records.line, header_row))
    if header_row is not None and (head == len(records) or records.line[head] != header_row):
        raise _no_such_line(file, header_row)
    below = slice(head + 1, None)
    body = Records(records.start[below], records.stop[below], records.line[below], records.cells[below], False, 0)
    if len(body):
        longest = int(np.argmax(body.stop - body.start))
        if body.stop[longest] - body.start[longest] > _LARGEST_RECORD:
            raise CohortError(
                f"{file}, line {body.line[longest]}: a single row of more than half a gigabyte",
                "look for a missing line break or a quotation mark that was not closed",
            )
    return text[records.start[head] : records.stop[head]].decode(), body


def read_csv(
    data: bytes,
    file: str,
    *,
    encoding: str | None = None,
    delimiter: str = ",",
    header_row: int | None = None,
    all_different: Collection[str] = (),
) -> RawTable:
    """A delimited text. Row numbers are physical lines, quoted line breaks and blank lines counted.

    header_row    : line of the headings, counted from 1; by default the first that is not blank
    all_different : headings of columns whose texts are likely to be all different
    Raises CohortError where the bytes are no text, the text has no rows, or a quotation mark never closes.
    """
    text = decode(data, file, encoding)
    records = find_records(np.frombuffer(text, np.uint8), ord(delimiter))
    if records.stray_quote:
        return _read_slowly(text, file, delimiter, header_row)
    if records.open_quote:
        raise never_closed(file, records.open_quote)
    heading_text, body = _body(records, text, file, header_row)
    names = split_record(heading_text, delimiter)
    _check_delimiter(names, file, delimiter)
    even = body.cells == len(names)
    columns: tuple[pa.ChunkedArray, ...] | None = (pa.chunked_array([], pa.string()),) * len(names)
    if even.any():
        plain = [name.strip() in all_different for name in names]
        columns = _arrow_columns(memoryview(text)[body.start[0] :], body, plain, delimiter)
        if columns is None:
            return _read_slowly(text, file, delimiter, header_row)
    odd = np.flatnonzero(~even)
    texts = tuple(text[body.start[i] : body.stop[i]].decode() for i in odd)
    return _table(file, names, columns or (), body.line[even], RaggedRows(body.line[odd], texts, body.cells[odd]))
