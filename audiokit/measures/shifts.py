"""Threshold shifts between a test and its baseline as intervals, and the three-valued answer to "at least x?".

A shift's lower end is current.lo − baseline.hi and its upper end current.hi − baseline.lo, so a no response in the
current test leaves it open above and one in the baseline leaves it open below. All comparisons are between integers.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from audiokit.core.vocabulary import Bound, Met
from audiokit.measures.sums import MISSING, OPEN, Sums

FAR = np.int16(16000)
"""Stands for an open or missing end in arrays of ends: beyond every sum, yet a difference of two still fits int16."""


@dataclass(frozen=True)
class Ends:
    """Both ends of intervals of sums, ready for differences; tenths of a dB, [ear, test] or any shape.

    low  : lower end, -FAR where the sum is missing
    high : upper end, +FAR where it is open or missing
    """

    low: NDArray[np.int16]
    high: NDArray[np.int16]


def interval_ends(sums: Sums, correction: NDArray[np.int16] | None = None) -> Ends:
    """The ends of the sums, less a correction in the same unit [test] where one is given."""
    total = sums.total if correction is None else sums.total - correction
    # Sums instead of masks, which cost several times as much.
    present = (sums.flags < MISSING).astype(np.int16)
    closed = (sums.flags == 0).astype(np.int16)
    low, high = total * present, total * closed
    present -= np.int16(1)
    closed -= np.int16(1)
    low += present * FAR
    high -= closed * FAR
    return Ends(low, high)


def three_valued(low: NDArray[np.int16], high: NDArray[np.int16], limit: int) -> NDArray[np.int8]:
    """Whether intervals reach `limit`: yes if low does, no if high does not. One integer unit; codes of `Met`."""
    met = (low >= limit).view(np.int8)
    met -= (high < limit).view(np.int8)
    met += np.int8(Met.UNKNOWN)
    return met


def bound_of(flags: NDArray[np.uint8], base_flags: NDArray[np.uint8]) -> NDArray[np.int8]:
    """How the difference of two sums stands to the true shift; codes of `Bound`."""
    table = np.full((4, 4), Bound.NONE, dtype=np.int8)
    table[0, 0] = Bound.EXACT
    table[OPEN, 0] = Bound.AT_LEAST
    table[0, OPEN] = Bound.AT_MOST
    return table[flags, base_flags]
