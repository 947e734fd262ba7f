"""64-bit hashes of texts from whole arrays, to find the few texts that may be equal before comparing them exactly."""

import numpy as np
import pandas as pd
import pyarrow as pa
from numpy.typing import NDArray

_LONGEST = 64
_MULTIPLIER = np.uint64(0x9E3779B97F4A7C15)
_SHIFT = np.uint64(29)


def _mix(words: NDArray[np.uint64]) -> NDArray[np.uint64]:
    """One number from the 8-byte words of each text. [text, word] -> [text]"""
    found = np.zeros(len(words), np.uint64)
    for i in range(words.shape[1]):
        found = (found ^ words[:, i]) * _MULTIPLIER
        found ^= found >> _SHIFT
    return found


def hash_texts(texts: pa.StringArray) -> NDArray[np.int64]:
    """A number for each text, equal for equal texts; different texts share one about once in 2**64 pairs."""
    _, offsets, data = texts.buffers()
    if data is None or not len(texts):
        return np.zeros(len(texts), np.int64)
    start = np.frombuffer(offsets, np.int32)[texts.offset : texts.offset + len(texts) + 1].astype(np.int64)
    content = np.frombuffer(data, np.uint8)
    lengths = np.diff(start)
    found = np.zeros(len(texts), np.uint64)
    for length in np.unique(lengths[(lengths > 0) & (lengths <= _LONGEST)]):
        rows = np.flatnonzero(lengths == length)
        padded = np.zeros((len(rows), -(-int(length) // 8) * 8), np.uint8)
        if rows[-1] - rows[0] + 1 == len(rows):
            padded[:, :length] = content[start[rows[0]] : start[rows[-1] + 1]].reshape(len(rows), length)
        else:
            padded[:, :length] = content[start[rows][:, None] + np.arange(length)]
        found[rows] = _mix(padded.view(np.uint64)) + np.uint64(length)
    long = np.flatnonzero(lengths > _LONGEST)
    if len(long):
        objects = texts.take(pa.array(long)).to_numpy(zero_copy_only=False)
        found[long] = pd.util.hash_array(objects, categorize=False)
    return found.view(np.int64)


def repeated(numbers: NDArray[np.int64]) -> NDArray[np.bool_]:
    """True for each number that occurs more than once. [row]"""
    ordered = np.sort(numbers)
    twice = np.unique(ordered[1:][ordered[1:] == ordered[:-1]])
    if not len(twice):
        return np.zeros(len(numbers), np.bool_)
    at = np.minimum(np.searchsorted(twice, numbers), len(twice) - 1)
    return twice[at] == numbers
