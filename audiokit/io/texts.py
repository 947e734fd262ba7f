"""Cells as text: one canonical text per value, whatever the file's own type was."""

from decimal import Decimal

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

_LARGEST_EXACT_INTEGER = 2.0**53


def number_text(value: float) -> str:
    """Shortest decimal text that reads back as the same number: 15.0 gives "15", 7.5 gives "7.5"."""
    if value != value:
        return ""
    if abs(value) < _LARGEST_EXACT_INTEGER and value % 1 == 0:
        return str(int(value))
    if 1e-12 < abs(value) < _LARGEST_EXACT_INTEGER:
        return np.format_float_positional(value, trim="-")
    return repr(float(value))


def _floats(values: pa.Array) -> pa.Array:
    if not pa.types.is_float64(values.type):
        # the shortest text of a 32-bit number is that of the number itself, not of its 64-bit neighbour
        texts = [number_text(float(str(v))) for v in values.fill_null(float("nan")).to_numpy(zero_copy_only=False)]
        return pa.array(texts, pa.string())
    array = values.fill_null(float("nan")).to_numpy(zero_copy_only=False)
    whole = np.abs(array) < _LARGEST_EXACT_INTEGER
    whole &= np.where(whole, array, 0.5) % 1 == 0
    if whole.all():
        return pa.array(array.astype(np.int64)).cast(pa.string())
    return pa.array([number_text(v) for v in array.tolist()], pa.string())


def _decimals(values: pa.Array) -> pa.Array:
    texts = [None if v is None else f"{Decimal(v):f}" for v in values.to_pylist()]
    return pa.array([t.rstrip("0").rstrip(".") if t and "." in t else t for t in texts], pa.string())


def _timestamps(values: pa.Array) -> pa.Array:
    texts = pc.replace_substring_regex(values.cast(pa.string()), r"^(-?\d+-\d\d-\d\d) ", r"\1T")
    texts = pc.replace_substring_regex(texts, r"\.(\d*?)0+(Z|[+-]\d\d:?\d\d)?$", r".\1\2")
    texts = pc.replace_substring_regex(texts, r"\.(Z|[+-]\d\d:?\d\d)?$", r"\1")
    return pc.replace_substring_regex(texts, r"T00:00:00$", "")


def is_text_type(kind: pa.DataType) -> bool:
    """True for plain texts, whatever the width of their offsets."""
    return pa.types.is_string(kind) or pa.types.is_large_string(kind) or pa.types.is_string_view(kind)


def is_readable_type(kind: pa.DataType) -> bool:
    """True where `as_text` knows how to write values of this type."""
    types = pa.types
    tests = (types.is_boolean, types.is_integer, types.is_floating, types.is_decimal)
    more = (types.is_date, types.is_timestamp, types.is_time, types.is_null)
    return is_text_type(kind) or any(test(kind) for test in (*tests, *more))


def as_text(values: pa.Array) -> pa.StringArray:
    """Canonical text of each value; null and NaN become the empty text.

    Whole numbers lose their ".0", dates and times are ISO (midnight is left out), booleans are yes and no.
    """
    kind = values.type
    if pa.types.is_boolean(kind):
        texts = pc.if_else(values, "yes", "no")
    elif pa.types.is_floating(kind):
        texts = _floats(values)
    elif pa.types.is_decimal(kind):
        texts = _decimals(values)
    elif pa.types.is_date(kind):
        texts = values.cast(pa.date32()).cast(pa.string())
    elif pa.types.is_timestamp(kind):
        texts = _timestamps(values)
    else:
        texts = values.cast(pa.string())
    return texts.fill_null("")


def strip(texts: pa.StringArray) -> pa.StringArray:
    """Texts without white space at either end."""
    return pc.utf8_trim_whitespace(texts)


def first_bytes(texts: pa.StringArray) -> NDArray[np.uint8]:
    """The first byte of each text, 0 where it is empty."""
    found = np.zeros(len(texts), np.uint8)
    _, offsets, data = texts.buffers()
    if data is not None and data.size:
        start = np.frombuffer(offsets, np.int32)[texts.offset : texts.offset + len(texts) + 1]
        filled = start[1:] > start[:-1]
        found[filled] = np.frombuffer(data, np.uint8)[start[:-1][filled]]
    return found
