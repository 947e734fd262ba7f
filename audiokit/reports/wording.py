"""Pieces of text for whole columns: numbers come from tables of ready-made texts."""

from collections.abc import Callable, Sequence
from functools import cache
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from audiokit.core.vocabulary import Response

REACH = 16000
"""Look-up tables run from -REACH to +REACH tenths of a dB."""

_SPAN = 2 * REACH + 1
_STATES = {
    Response.DID_NOT_TEST: "did not test",
    Response.COULD_NOT_TEST: "could not test",
    Response.NOT_RECORDED: "not recorded",
}


def quotient_text(numerator: int, denominator: int, decimals: int = 4) -> str:
    """A fraction in decimals without trailing noughts, rounded half to even at the last one."""
    scaled = round_quotient(numerator * 10**decimals, denominator)
    sign, scaled = ("-", -scaled) if scaled < 0 else ("", scaled)
    text = f"{sign}{scaled // 10**decimals}.{scaled % 10**decimals:0{decimals}d}"
    return text.rstrip("0").rstrip(".")


def round_quotient(numerator: int, denominator: int) -> int:
    """The quotient as a whole number, halves to even."""
    whole, rest = divmod(numerator, denominator)
    return whole + (2 * rest > denominator or (2 * rest == denominator and whole % 2 == 1))


@cache
def tenths_texts() -> pa.Array:
    """Texts of tenths of a dB, from -REACH to REACH: 75 stands as 7.5, 150 as 15."""
    return pa.array([quotient_text(value, 10, 1) for value in range(-REACH, REACH + 1)])


@cache
def cell_texts(frequency_hz: int) -> pa.Array:
    """Texts of the threshold cells at one frequency, to be indexed by `cell_index`."""
    numbers = tenths_texts()
    open_ = pc.binary_join_element_wise("NR@", numbers, "")
    absent = pa.array([f"{frequency_hz} Hz {text}" for text in _STATES.values()])
    return pa.concat_arrays([numbers, open_, absent])


def cell_index(threshold: NDArray[np.int16], response: NDArray[np.int8]) -> NDArray[np.int32]:
    """Position of each cell's text in `cell_texts`."""
    value = threshold.astype(np.int32) + REACH
    value[response == Response.NO_RESPONSE] += _SPAN
    absent = response > Response.NO_RESPONSE
    value[absent] = response[absent].astype(np.int32) + (2 * _SPAN - int(Response.DID_NOT_TEST))
    return value


def lookup(make: Callable[[int], str], values: NDArray[np.integer]) -> pa.Array:
    """make(value) for whole arrays: made once per distinct value."""
    if not len(values):
        return pa.array([], type=pa.string())
    low = int(values.min())
    occurs = np.zeros(int(values.max()) - low + 1, dtype=bool)
    occurs[values - low] = True
    texts = pa.array([make(value) for value in (np.flatnonzero(occurs) + low).tolist()], type=pa.string())
    rank = np.cumsum(occurs, dtype=np.int32) - np.int32(1)
    return texts.take(pa.array(rank[values - low]))


def join(*pieces: Any) -> pa.Array:
    """Texts row by row, constants and columns mixed."""
    scalars = [pa.scalar(piece) if isinstance(piece, str) else piece for piece in pieces]
    return pc.binary_join_element_wise(*scalars, "")


def choose(texts: Sequence[str], codes: NDArray[np.integer]) -> pa.Array:
    """One of a few texts by code."""
    return pa.array(texts, type=pa.string()).take(pa.array(codes))


def date_texts(days: NDArray[np.int32]) -> pa.Array:
    """ISO dates as text."""
    return pc.strftime(pa.array(days.astype(np.int32), type=pa.int32()).cast(pa.date32()), format="%Y-%m-%d")


def blank_where(mask: NDArray[np.bool_], texts: pa.Array) -> pa.Array:
    """The texts, null (an empty cell in the file) where the mask is True."""
    return pc.if_else(pa.array(mask), pa.scalar(None, type=texts.type), texts)
