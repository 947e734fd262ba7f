"""A table as it stands in its file: headings, columns, and the source row of each record."""

from dataclasses import dataclass, field

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from audiokit.io.texts import as_text, is_text_type, strip


@dataclass(frozen=True)
class Encoded:
    """A column as its distinct texts and, per row, which of them stands there.

    codes    : int32 index into `raw` and `stripped` [row]
    raw      : texts exactly as in the file, never null; distinct, or all rows where nearly all differ
    stripped : the same without white space at either end; may hold equal texts twice
    """

    codes: NDArray[np.int32]
    raw: pa.StringArray
    stripped: pa.StringArray

    def __len__(self) -> int:
        return len(self.codes)

    def blank(self) -> NDArray[np.bool_]:
        """True where the cell is empty or white space only. [row]"""
        return self.spread(pc.equal(self.stripped, "").to_numpy(zero_copy_only=False))

    def spread(self, per_text: NDArray) -> NDArray:
        """Values that belong to the distinct texts, given to every row. [row]"""
        return np.take(per_text, self.codes)

    def texts(self, rows: NDArray[np.integer] | None = None, *, raw: bool = False) -> pa.StringArray:
        """Text of the rows, stripped unless `raw`; of all rows by default."""
        codes = self.codes if rows is None else self.codes[rows]
        return (self.raw if raw else self.stripped).take(pa.array(codes))


def encode(column: pa.ChunkedArray) -> Encoded:
    """Distinct texts of a column and their places; a column of plain texts is taken as it is."""
    if is_text_type(column.type):
        raw = as_text(pa.concat_arrays(column.chunks) if column.num_chunks else pa.array([], column.type))
        return Encoded(np.arange(len(raw), dtype=np.int32), raw, strip(raw))
    if pa.types.is_dictionary(column.type):
        column = column.unify_dictionaries()
    else:
        column = pc.dictionary_encode(column, null_encoding="encode")
    if column.num_chunks == 0 or len(column) == 0:
        return Encoded(np.zeros(0, np.int32), pa.array([], pa.string()), pa.array([], pa.string()))
    raw = as_text(column.chunk(0).dictionary)
    indices = pa.chunked_array([chunk.indices for chunk in column.chunks])
    if indices.null_count:
        indices = indices.fill_null(len(raw))
        raw = pa.concat_arrays([raw, pa.array([""], pa.string())])
    codes = indices.to_numpy().astype(np.int32, copy=False)
    return Encoded(codes, raw, strip(raw))


@dataclass(frozen=True)
class RaggedRows:
    """Records whose number of cells differs from that of the headings.

    rows  : int64 source row [record]
    texts : the record as it stands in the file [record]
    cells : int64 number of cells found [record]
    """

    rows: NDArray[np.int64] = field(default_factory=lambda: np.zeros(0, np.int64))
    texts: tuple[str, ...] = ()
    cells: NDArray[np.int64] = field(default_factory=lambda: np.zeros(0, np.int64))


@dataclass(frozen=True)
class RawTable:
    """One file's table, nothing interpreted yet.

    file     : the file's name as cohort.toml writes it
    headings : stripped, unique; "(column N)" where a column with data has none
    columns  : one chunked array per heading: the file's own type for numbers and dates, a dictionary for texts, or
               plain texts where nearly all differ
    rows     : int64 source row of each record, counted from 1 [row]
    typed    : True where numbers come as numbers (xlsx, parquet), so that codes are compared by number too
    """

    file: str
    headings: tuple[str, ...]
    columns: tuple[pa.ChunkedArray, ...]
    rows: NDArray[np.int64]
    ragged: RaggedRows = field(default_factory=RaggedRows)
    typed: bool = False
    _encoded: dict[str, Encoded] = field(default_factory=dict, repr=False, compare=False)

    def __len__(self) -> int:
        return len(self.rows)

    def encoded(self, heading: str) -> Encoded:
        """The column under a heading by distinct texts; kept for the next asker."""
        if heading not in self._encoded:
            self._encoded[heading] = encode(self.columns[self.headings.index(heading)])
        return self._encoded[heading]

    def raw_texts(self, heading: str, rows: NDArray[np.integer]) -> pa.StringArray:
        """Exact texts of some rows of one column."""
        if heading in self._encoded:
            return self._encoded[heading].texts(rows, raw=True)
        column = self.columns[self.headings.index(heading)].take(pa.array(rows))
        if pa.types.is_dictionary(column.type):
            column = column.cast(column.type.value_type)
        return pa.concat_arrays([as_text(chunk) for chunk in column.chunks] or [pa.array([], pa.string())])
