"""Rows that cannot be used: collected per file while it is read, then written out as one table of problems."""

import string
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import TypeAlias

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from audiokit.core.problems import PROBLEMS
from audiokit.io.raw import RawTable
from audiokit.io.texts import first_bytes
from audiokit.model.cohort import QUARANTINE_COLUMNS

_LONGEST_VALUE = 200
_PLAIN = r"^[+-]?[0-9]+(?:[.,][0-9]+)?\s*\+?$"
_FORMULA_STARTS = np.frombuffer(b"=@\t\r+-", np.uint8)

Texts: TypeAlias = pa.StringArray


def looks_like_formula(texts: Texts) -> NDArray[np.bool_]:
    """True for texts that a spreadsheet would run: they begin with = @ tab CR, or with + or - and are no number."""
    found = np.isin(first_bytes(texts), _FORMULA_STARTS)
    suspects = np.flatnonzero(found)
    if len(suspects):
        plain = pc.match_substring_regex(texts.take(pa.array(suspects)), _PLAIN)
        found[suspects] = ~plain.to_numpy(zero_copy_only=False)
    return found


def guard(texts: Texts) -> Texts:
    """Texts that a spreadsheet shows and does not run: an apostrophe before what looks like a formula."""
    return pc.if_else(pa.array(looks_like_formula(texts)), pc.binary_join_element_wise("'", texts, ""), texts)


def shorten(texts: Texts) -> Texts:
    """Texts of at most 200 characters; longer ones end in an ellipsis."""
    long = pc.greater(pc.utf8_length(texts), _LONGEST_VALUE)
    if not pc.any(long).as_py():
        return texts
    return pc.if_else(
        long, pc.binary_join_element_wise(pc.utf8_slice_codeunits(texts, 0, _LONGEST_VALUE - 1), "…", ""), texts
    )


def _constant(text: str, length: int) -> Texts:
    return pa.repeat(pa.scalar(text, pa.string()), length)


def render(template: str, length: int, **fields: Texts) -> Texts:
    """A sentence template filled for many rows at once. Fields are string arrays of the given length."""
    pieces: list[Texts] = []
    for literal, name, _, _ in string.Formatter().parse(template):
        if literal:
            pieces.append(_constant(literal, length))
        if name:
            pieces.append(fields[name])
    return pc.binary_join_element_wise(*pieces, "")


@dataclass(frozen=True)
class _Batch:
    """One kind of problem in one column of one file; `rows` are places in the table, or in its ragged rows."""

    code: str
    rows: NDArray[np.int64]
    heading: str
    detail: Texts
    ragged: bool = False


@dataclass
class ProblemLog:
    """The problems of one file.

    rejected : True for each row that has at least one [row]
    """

    table: RawTable
    rejected: NDArray[np.bool_] = field(init=False)
    _batches: list[_Batch] = field(default_factory=list)

    def __post_init__(self) -> None:
        self.rejected = np.zeros(len(self.table), np.bool_)
        ragged = self.table.ragged
        if len(ragged.rows):
            width = f" cells; the headings have {len(self.table.headings)}"
            detail = pc.binary_join_element_wise("the row has ", pa.array(ragged.cells).cast(pa.string()), width, "")
            self._batches.append(_Batch("ragged_row", np.arange(len(ragged.rows)), "", detail, True))

    def add(self, code: str, where: NDArray, heading: str = "", detail: str | Texts = "") -> None:
        """Note a problem.

        where   : boolean mask [row], or int places of rows
        heading : the column's heading in the file; "" where the whole row is meant
        detail  : one text, or one per row marked in `where`
        """
        rows = np.flatnonzero(where) if where.dtype == np.bool_ else where
        if len(rows):
            self.rejected[rows] = True
            texts = _constant(detail, len(rows)) if isinstance(detail, str) else detail
            self._batches.append(_Batch(code, rows.astype(np.int64), heading, texts))

    @property
    def rows_read(self) -> int:
        """Number of data rows of the file, ragged ones included."""
        return len(self.table) + len(self.table.ragged.rows)

    @property
    def accepted(self) -> int:
        """Number of rows without a problem."""
        return int(np.count_nonzero(~self.rejected))

    def frame(self) -> pd.DataFrame:
        """One row per problem, columns QUARANTINE_COLUMNS, in order of row, then column as in the file."""
        if not self._batches:
            return empty_quarantine()
        places = {heading: place for place, heading in enumerate(("", *self.table.headings))}
        raw = _RawJson(self.table, self.rejected)
        parts = [self._part(batch, raw, places[batch.heading]) for batch in self._batches]
        frame = pd.concat(parts, ignore_index=True)
        frame = frame.sort_values(["row", "place"], kind="stable", ignore_index=True)
        return frame[list(QUARANTINE_COLUMNS)]

    def _part(self, batch: _Batch, raw: "_RawJson", place: int) -> pd.DataFrame:
        length = len(batch.rows)
        if batch.ragged:
            rows, values, raw_json = (
                self.table.ragged.rows,
                pa.array(self.table.ragged.texts, pa.string()),
                raw.ragged(),
            )
        else:
            rows = self.table.rows[batch.rows]
            named = bool(batch.heading)
            values = self.table.raw_texts(batch.heading, batch.rows) if named else _constant("", length)
            raw_json = raw.of(batch.rows)
        values = shorten(values)
        kind = PROBLEMS[batch.code]
        fields = {
            "file": _constant(self.table.file, length),
            "row": pa.array(rows).cast(pa.string()),
            "column": _constant(batch.heading, length),
            "value": pc.binary_join_element_wise('"', values, '"', ""),
            "detail": shorten(batch.detail),
        }
        return pd.DataFrame(
            {
                "file": guard(fields["file"]).to_pandas(),
                "row": rows,
                "column": guard(fields["column"]).to_pandas(),
                "value": guard(values).to_pandas(),
                "code": _constant(batch.code, length).to_pandas(),
                "problem": guard(render(kind.problem, length, **fields)).to_pandas(),
                "mend": render(kind.mend, length, **fields).to_pandas(),
                "raw_json": raw_json,
                "place": place,
            }
        )


class _RawJson:
    """Rejected rows as JSON objects, each made once."""

    def __init__(self, table: RawTable, rejected: NDArray[np.bool_]) -> None:
        self._table = table
        self._rows = np.flatnonzero(rejected)
        frame = pd.DataFrame({h: table.raw_texts(h, self._rows).to_pandas() for h in table.headings})
        self._json = _json_lines(frame) if len(self._rows) else np.zeros(0, object)

    def of(self, rows: NDArray[np.int64]) -> NDArray[np.object_]:
        """JSON objects of some rejected rows."""
        return self._json[np.searchsorted(self._rows, rows)]

    def ragged(self) -> NDArray[np.object_]:
        """JSON objects of the ragged rows, which have no cells under the headings."""
        return _json_lines(pd.DataFrame({"(whole row)": pd.Series(self._table.ragged.texts, dtype="str")}))


def _json_lines(frame: pd.DataFrame) -> NDArray[np.object_]:
    text = frame.to_json(orient="records", lines=True, force_ascii=False)
    return np.array(text.rstrip("\n").split("\n"), object)


def empty_quarantine() -> pd.DataFrame:
    """A table of problems without any."""
    frame = pd.DataFrame({name: pd.Series(dtype="str") for name in QUARANTINE_COLUMNS})
    return frame.astype({"row": np.int64})


def join_quarantines(frames: Sequence[pd.DataFrame]) -> pd.DataFrame:
    """The problems of all files, in the order in which the files were read."""
    filled = [frame for frame in frames if len(frame)]
    return pd.concat(filled, ignore_index=True) if filled else empty_quarantine()
