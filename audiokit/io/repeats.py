"""Rows that repeat each other, within a file and across files of the same kind: equal ones, and ones that conflict."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from audiokit.io.hashes import hash_texts, repeated
from audiokit.io.raw import Encoded
from audiokit.io.source_table import SourceTable

NO_KEY = -1

Rows = NDArray[np.int64]


class Stack:
    """The rows of several tables numbered through, in the order in which they were read."""

    def __init__(self, tables: Sequence[SourceTable]) -> None:
        self.tables = tables
        self.first = np.concatenate(([0], np.cumsum([len(table) for table in tables]))).astype(np.int64)

    def __len__(self) -> int:
        return int(self.first[-1])

    def split(self, rows: Rows) -> Iterator[tuple[SourceTable, Rows, slice]]:
        """For ascending rows: each table, the rows in it by its own numbering, and which of `rows` they are."""
        cuts = np.searchsorted(rows, self.first)
        for i, table in enumerate(self.tables):
            piece = slice(int(cuts[i]), int(cuts[i + 1]))
            yield table, rows[piece] - self.first[i], piece

    def label(self, rows: Rows) -> pa.StringArray:
        """File and source row of any rows, as text."""
        which = np.searchsorted(self.first, rows, side="right") - 1
        source = np.concatenate([table.raw.rows for table in self.tables])[rows] if len(rows) else rows
        files = pa.array([table.raw.file for table in self.tables]).take(pa.array(which))
        return pc.binary_join_element_wise(files, pa.array(source).cast(pa.string()), ", row ")

    def add(self, code: str, rows: Rows, name: str, detail: pa.StringArray) -> None:
        """Note a problem of ascending rows, each in its own table."""
        for table, own, piece in self.split(rows):
            table.add(code, own, name if table.has(name) else "", detail.slice(piece.start, piece.stop - piece.start))

    def codes(self, name: str, rows: Rows | None = None) -> Rows:
        """The stripped texts of a column as numbers, equal for equal texts in all tables; "" has a number too.

        rows : ascending rows; all by default
        """
        columns = [table.named(name) for table in self.tables]
        numbers, empty = _unify(columns)
        every = np.arange(len(self)) if rows is None else rows
        found = np.full(len(every), empty, np.int64)
        for column, number, (_, own, piece) in zip(columns, numbers, self.split(every), strict=True):
            if column is not None:
                found[piece] = number[column.codes if rows is None else column.codes[own]]
        return found

    def repeated_codes(self, name: str) -> Rows:
        """Numbers as `codes` gives them, but NO_KEY for blank cells and for texts that occur once. [row]"""
        hashes = np.zeros(len(self), np.int64)
        blank = np.ones(len(self), np.bool_)
        for i, table in enumerate(self.tables):
            column = table.named(name)
            if column is not None:
                hashes[self.first[i] : self.first[i + 1]] = column.spread(hash_texts(column.stripped))
                blank[self.first[i] : self.first[i + 1]] = column.blank()
        rows = np.flatnonzero(repeated(hashes) & ~blank)
        found = np.full(len(self), NO_KEY, np.int64)
        found[rows] = self.codes(name, rows)
        return found


def _unify(columns: Sequence[Encoded | None]) -> tuple[list[NDArray[np.int64]], int]:
    """A number for each distinct text of each column, equal for equal texts; and the number of the empty text."""
    texts = [pa.array([""], pa.string()), *(c.stripped for c in columns if c is not None)]
    numbers = pc.dictionary_encode(pa.chunked_array(texts)).combine_chunks().indices.to_numpy().astype(np.int64)
    found, at = [], 1
    for column in columns:
        length = 0 if column is None else len(column.stripped)
        found.append(numbers[at : at + length])
        at += length
    return found, int(numbers[0])


def pair(first: Rows, second: Rows) -> Rows:
    """One number for each pair of numbers, equal for equal pairs; both are numbers of distinct things, from 0."""
    return first * (int(second.max(initial=0)) + 1) + second


def signatures(stack: Stack, rows: Rows) -> Rows:
    """A number for the contents of each row: the set of its cells that are not blank, by column.

    Compared exactly, column by column; an absent column equals a blank cell.
    """
    names = dict.fromkeys(name for table in stack.tables for name in (*table.mapped.heading, *table.mapped.others))
    found = np.zeros(len(rows), np.int64)
    for name in names:
        found = pd.factorize(pair(found, stack.codes(name, rows)))[0].astype(np.int64)
    return found


@dataclass(frozen=True)
class Key:
    """What no two different rows may share.

    numbers : equal for equal keys, NO_KEY where the row has none [row of the stack]
    name    : column that the problem is reported in
    what    : words that go before the file and row of a conflicting row
    is_near : True where rows that share the key also share `near` of `check_repeats`
    """

    numbers: Rows
    name: str
    what: str
    is_near: bool = False


def check_repeats(stack: Stack, near: Rows, key: Key | None, skip: NDArray[np.bool_]) -> None:
    """Note rows equal to an earlier one, and all rows that share a key but differ.

    near : numbers that rows share only if they mean the same where files write it in their own ways (person, time);
           only rows that share one can be equal
    skip : rows that take no part [row of the stack]
    """
    candidate = repeated(near)
    if key is not None and not key.is_near:
        candidate = candidate | (repeated(key.numbers) & (key.numbers != NO_KEY))
    rows = np.flatnonzero(candidate & ~skip)
    if not len(rows):
        return
    contents = pd.factorize(pair(signatures(stack, rows), pd.factorize(near[rows])[0].astype(np.int64)))[0]
    _, first = np.unique(contents, return_index=True)
    later = np.flatnonzero(first[contents] != np.arange(len(rows)))
    stack.add("duplicate_row", rows[later], "", stack.label(rows[first[contents[later]]]))
    if key is not None:
        check_conflicts(stack, rows, contents, key)


def check_conflicts(stack: Stack, rows: Rows, contents: Rows, key: Key) -> None:
    """Note all of the given, ascending rows that share a key and have different contents."""
    keyed = np.flatnonzero(key.numbers[rows] != NO_KEY)
    _, first, which = np.unique(key.numbers[rows[keyed]], return_index=True, return_inverse=True)
    contents = contents[keyed]
    differs = contents != contents[first[which]]
    if not differs.any():
        return
    other = np.full(len(first), -1, np.int64)
    other[which[differs][::-1]] = np.flatnonzero(differs)[::-1]
    conflict = other[which] >= 0
    partner = np.where(differs, first[which], other[which])[conflict]
    detail = pc.binary_join_element_wise(key.what, stack.label(rows[keyed][partner]), " ")
    stack.add("conflicting_key", rows[keyed[conflict]], key.name, detail)


def check_shared_test_ids(wide: Sequence[SourceTable], long: Sequence[SourceTable]) -> None:
    """Note all rows whose test_id stands in a wide and in a long table."""

    def ids(tables: Sequence[SourceTable]) -> pa.ChunkedArray:
        return pa.chunked_array([t.column("test_id").stripped for t in tables if t.has("test_id")], pa.string())

    shared = ids(wide).filter(pc.is_in(ids(wide), ids(long).combine_chunks()))
    shared = shared.filter(pc.not_equal(shared, "")).combine_chunks()
    if not len(shared):
        return
    for tables, other in ((wide, "row per threshold"), (long, "row per test")):
        for table in tables:
            if table.has("test_id"):
                column = table.column("test_id")
                where = column.spread(pc.is_in(column.stripped, shared).to_numpy(zero_copy_only=False))
                table.add("conflicting_key", where, "test_id", f"the same test_id stands in a table with one {other}")
