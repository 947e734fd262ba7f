"""Where the records of a delimited text lie: byte extents, physical lines and numbers of cells, from whole arrays."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

_QUOTE, _LINE_FEED, _RETURN = 34, 10, 13
_END = 0
"""Stands for the byte after the last one; no text holds it."""
_BLOCK = 1 << 18


@dataclass(frozen=True)
class Records:
    """The records of a text, blank lines left out.

    start, stop : int64 byte offsets, line end excluded [record]
    line        : int64 physical line on which the record begins, counted from 1 [record]
    cells       : int64 number of cells [record]
    stray_quote : True where a quotation mark opens or closes inside a cell: the extents are then not to be trusted
    open_quote  : line of the last quotation mark that opens and never closes, 0 where there is none
    """

    start: NDArray[np.int64]
    stop: NDArray[np.int64]
    line: NDArray[np.int64]
    cells: NDArray[np.int64]
    stray_quote: bool
    open_quote: int

    def __len__(self) -> int:
        return len(self.start)


@dataclass
class _Scan:
    """What is carried from block to block: quotation marks and delimiters counted, lines ended."""

    quotes: int = 0
    delimiters: int = 0
    lines: int = 0
    stray_quote: bool = False


@dataclass(frozen=True)
class _Block:
    """A stretch of the text, its bytes of interest, and the bytes just before and after it."""

    bytes: NDArray[np.uint8]
    at: NDArray[np.int64]
    kind: NDArray[np.uint8]
    before: int
    after: int


def _blocks(text: NDArray[np.uint8], delimiter: int) -> Iterator[tuple[int, _Block]]:
    """The text in stretches, with the offset of each."""
    for offset in range(0, len(text), _BLOCK):
        block = text[offset : offset + _BLOCK]
        end = offset + len(block)
        of_interest = (block == _QUOTE) | (block == delimiter) | (block == _LINE_FEED) | (block == _RETURN)
        at = np.flatnonzero(of_interest)
        before = int(text[offset - 1]) if offset else _LINE_FEED
        after = int(text[end]) if end < len(text) else _END
        yield offset, _Block(block, at, block[at], before, after)


def _outside(block: _Block, delimiter: int, scan: _Scan) -> NDArray[np.bool_] | None:
    """True for bytes of interest that do not lie between quotation marks; None where all do not."""
    is_quote = block.kind == _QUOTE
    quotes = np.flatnonzero(is_quote)
    if not len(quotes):
        return np.zeros(len(block.at), np.bool_) if scan.quotes & 1 else None
    opening = block.at[quotes[scan.quotes & 1 :: 2]]
    previous = block.bytes[opening - 1]
    if len(opening) and opening[0] == 0:
        previous[0] = block.before
    following = _bytes_after(block, block.at[quotes[1 - (scan.quotes & 1) :: 2]])
    beside = np.array((delimiter, _QUOTE, _LINE_FEED, _RETURN), np.uint8)
    scan.stray_quote |= not (np.isin(previous, beside).all() and np.isin(following, (*beside, _END)).all())
    inside = np.cumsum(is_quote, dtype=np.uint8)
    inside += np.uint8(scan.quotes & 1)
    scan.quotes += len(quotes)
    return (inside & 1) == 0


def _line_ends(block: _Block) -> NDArray[np.bool_]:
    """True for bytes of interest that end a physical line: LF, or CR that no LF follows."""
    ends = block.kind == _LINE_FEED
    returns = np.flatnonzero(block.kind == _RETURN)
    if len(returns):
        ends[returns[_bytes_after(block, block.at[returns]) != _LINE_FEED]] = True
    return ends


def _bytes_after(block: _Block, at: NDArray[np.int64]) -> NDArray[np.uint8]:
    """The byte that follows each of some places of the block."""
    last = len(block.bytes) - 1
    return np.where(at < last, block.bytes[np.minimum(at + 1, last)], np.uint8(block.after))


def find_records(text: NDArray[np.uint8], delimiter: int) -> Records:
    """Extents of all records of a UTF-8 text; works in blocks, so that memory stays flat.

    text      : bytes, without byte-order mark
    delimiter : the byte between cells
    """
    if not len(text):
        none = np.zeros(0, np.int64)
        return Records(none, none, none, none, False, 0)
    scan = _Scan()
    stops, lines, delimiters = [], [], []
    for offset, block in _blocks(text, delimiter):
        outside = _outside(block, delimiter, scan)
        is_delimiter = block.kind == delimiter
        line_ends = np.flatnonzero(_line_ends(block))
        ends, line = line_ends, scan.lines + 1 + np.arange(len(line_ends))
        if outside is not None:
            is_delimiter &= outside
            ends, line = ends[outside[ends]], line[outside[ends]]
        places = np.flatnonzero(is_delimiter)
        delimiters.append(scan.delimiters + np.searchsorted(places, ends))
        lines.append(line)
        stops.append(offset + block.at[ends])
        scan.delimiters += len(places)
        scan.lines += len(line_ends)
    return _assemble(text, scan, np.concatenate(stops), np.concatenate(lines), np.concatenate(delimiters))


def _assemble(
    text: NDArray[np.uint8], scan: _Scan, stop: NDArray[np.int64], last: NDArray[np.int64], before: NDArray[np.int64]
) -> Records:
    """Records from the offsets of their ends, the lines they end on, and the delimiters counted up to there."""
    if not len(stop) or stop[-1] != len(text) - 1:
        stop = np.append(stop, len(text))
        last = np.append(last, 0)
        before = np.append(before, scan.delimiters)
    start = np.concatenate(([0], stop[:-1] + 1))
    line = np.concatenate(([1], last[:-1] + 1))
    cells = np.diff(before, prepend=0) + 1
    stop = stop - ((stop > start) & (text[stop - 1] == _RETURN))
    filled = stop > start
    open_quote = 0
    if scan.quotes & 1:
        open_quote = int(np.count_nonzero(text[: np.flatnonzero(text == _QUOTE)[-1]] == _LINE_FEED)) + 1
    return Records(start[filled], stop[filled], line[filled], cells[filled], scan.stray_quote, open_quote)
