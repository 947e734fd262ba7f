"""Where the records of a delimited text lie: byte extents, physical lines and numbers of cells, from whole arrays."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

_QUOTE, _LINE_FEED, _RETURN = 34, 10, 13
_BLOCK = 1 << 20


@dataclass(frozen=True)
class Records:
    """The records of a text, blank lines left out.

    start, stop : int64 byte offsets, line end excluded [record]
    line        : int64 physical line on which the record begins, counted from 1 [record]
    cells       : int64 number of cells [record]
    stray_quote : True where a quotation mark opens inside a cell: the extents are then not to be trusted
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
    """What is carried from block to block."""

    quotes: int = 0
    delimiters: int = 0
    stray_quote: bool = False


def _inside(block: NDArray[np.uint8], before: int, delimiter: int, scan: _Scan) -> NDArray[np.bool_] | None:
    """True for bytes between quotation marks; None where the block has none and lies outside."""
    is_quote = block == _QUOTE
    at = np.flatnonzero(is_quote)
    if not len(at):
        return np.ones(len(block), np.bool_) if scan.quotes & 1 else None
    opening = at[(np.arange(len(at)) + scan.quotes) % 2 == 0]
    previous = np.where(opening > 0, block[opening - 1], before)
    allowed = np.isin(previous, (delimiter, _LINE_FEED, _RETURN, _QUOTE))
    scan.stray_quote |= not allowed.all()
    inside = (np.cumsum(is_quote, dtype=np.uint8) + np.uint8(scan.quotes & 1)) & 1
    scan.quotes += len(at)
    return inside.astype(np.bool_)


def _line_ends(block: NDArray[np.uint8], after: int) -> NDArray[np.int64]:
    """Offsets of the bytes that end a physical line: LF, or CR that no LF follows."""
    ends = block == _LINE_FEED
    returns = np.flatnonzero(block == _RETURN)
    if len(returns):
        following = np.where(returns + 1 < len(block), block[np.minimum(returns + 1, len(block) - 1)], after)
        ends[returns[following != _LINE_FEED]] = True
    return np.flatnonzero(ends)


def find_records(text: NDArray[np.uint8], delimiter: int) -> Records:
    """Extents of all records of a UTF-8 text; works in blocks, so that memory stays flat.

    text      : bytes, without byte-order mark
    delimiter : the byte between cells
    """
    if not len(text):
        none = np.zeros(0, np.int64)
        return Records(none, none, none, none, False, 0)
    scan = _Scan()
    ends, lines, delimiters, lines_before = [], [], [], 0
    for offset in range(0, len(text), _BLOCK):
        block = text[offset : offset + _BLOCK]
        before = int(text[offset - 1]) if offset else _LINE_FEED
        after = int(text[offset + len(block)]) if offset + len(block) < len(text) else 0
        inside = _inside(block, before, delimiter, scan)
        is_delimiter = block == delimiter
        all_ends = _line_ends(block, after)
        line_of_end = lines_before + 1 + np.arange(len(all_ends))
        lines_before += len(all_ends)
        if inside is not None:
            is_delimiter &= ~inside
            outside = ~inside[all_ends]
            all_ends, line_of_end = all_ends[outside], line_of_end[outside]
        places = np.flatnonzero(is_delimiter)
        delimiters.append(scan.delimiters + np.searchsorted(places, all_ends))
        scan.delimiters += len(places)
        ends.append(offset + all_ends)
        lines.append(line_of_end)
    return _assemble(text, scan, np.concatenate(ends), np.concatenate(lines), np.concatenate(delimiters))


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
