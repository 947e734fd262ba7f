"""Rows of text for millions of rows at once: pieces side by side, every piece a row of a small table of texts.

Making each explanation as a string of its own costs many times the writing. Here every number is written once per
distinct value, and one join of whole columns gives the lines of the file.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cache

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray


@dataclass(frozen=True)
class Piece:
    """One text per row: row i shows table[index[i]], or table[i] where there is no index."""

    table: pa.StringArray
    index: NDArray[np.integer] | None = None

    def take(self, rows: NDArray[np.integer]) -> "Piece":
        """The piece for other rows."""
        return Piece(self.table, rows if self.index is None else self.index[rows])

    def column(self) -> pa.StringArray:
        """The texts row by row."""
        return self.table if self.index is None else self.table.take(pa.array(self.index))


Row = Sequence[Piece | pa.StringArray | str]
"""The pieces of each row: a text for every row, a column of texts, or a text that stands in all rows."""


def texts(values: Sequence[str]) -> pa.StringArray:
    """A table of texts."""
    return pa.array(values, type=pa.string())


def choose(values: Sequence[str], codes: NDArray[np.integer]) -> pa.StringArray:
    """One of a few texts by code."""
    return texts(values).take(pa.array(codes))


def date_texts(days: NDArray[np.int32]) -> pa.StringArray:
    """ISO dates of days since 1970-01-01."""
    if not len(days):
        return texts([])
    first, last = int(days.min()) // _DATES, int(days.max()) // _DATES
    table = pa.concat_arrays([_dates(block) for block in range(first, last + 1)])
    return table.take(pa.array(days - np.int32(first * _DATES)))


_DATES = 2048


@cache
def _dates(block: int) -> pa.StringArray:
    """ISO dates of so many consecutive days: formatting a date costs ten times a look-up."""
    days = np.arange(block * _DATES, (block + 1) * _DATES, dtype=np.int32)
    return pc.strftime(pa.array(days).cast(pa.date32()), format="%Y-%m-%d")


def blank_where(mask: NDArray[np.bool_], strings: pa.StringArray) -> pa.StringArray:
    """The texts, null (an empty field in the file) where the mask is True."""
    return pc.if_else(pa.array(mask), pa.scalar(None, type=pa.string()), strings)


def lookup(make: Callable[[int], str], values: NDArray[np.integer]) -> Piece:
    """make(value) for whole arrays, made once per distinct value."""
    if not len(values):
        return Piece(texts([]))
    low = int(values.min())
    occurs = np.zeros(int(values.max()) - low + 1, dtype=bool)
    occurs[values - low] = True
    rank = np.cumsum(occurs, dtype=np.int32) - np.int32(1)
    return Piece(texts([make(value) for value in (np.flatnonzero(occurs) + low).tolist()]), rank[values - low])


def side_by_side(pieces: Row) -> pa.StringArray:
    """The pieces of each row as one text."""
    return pc.binary_join_element_wise(*(p.column() if isinstance(p, Piece) else p for p in pieces), "")


def content(strings: pa.StringArray) -> memoryview:
    """The UTF-8 bytes of all texts, one after the other."""
    ends = np.frombuffer(strings.buffers()[1], dtype=np.int32)[strings.offset : strings.offset + len(strings) + 1]
    return memoryview(strings.buffers()[2] or b"")[int(ends[0]) : int(ends[-1])]


def csv_field(strings: pa.StringArray) -> pa.StringArray:
    """Strings as fields of a CSV file: quoted where they hold a comma, a quote or a line break."""
    special = [pc.match_substring(strings, mark) for mark in ('"', ",", "\n", "\r")]
    if not any(pc.any(found).as_py() for found in special):
        return strings
    either = pc.or_(pc.or_(special[0], special[1]), pc.or_(special[2], special[3]))
    return pc.if_else(either, pc.binary_join_element_wise('"', inside_quotes(strings), '"', ""), strings)


def inside_quotes(strings: pa.StringArray) -> pa.StringArray:
    """Strings as they stand inside a quoted field."""
    if not pc.any(pc.match_substring(strings, '"')).as_py():
        return strings
    return pc.replace_substring(strings, '"', '""')
