"""Sums of thresholds over a set of frequencies, as exact integers with the state of the interval beside them."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from audiokit.core.vocabulary import Response
from audiokit.model.grid import ThresholdGrid

OPEN = np.uint8(1)
"""Flag: at least one of the thresholds is a no response, so that the sum has no upper end."""
MISSING = np.uint8(2)
"""Flag: at least one of the frequencies has no interval, so that no sum exists."""


_STATES = np.int8(Response.DID_NOT_TEST)
"""Codes up to here are the flags themselves: measured nothing, no response OPEN, all the others MISSING."""


@dataclass(frozen=True)
class Sums:
    """Sums over one frequency set, per ear and test.

    total : int16, tenths of a dB HL [ear, test]; the lower end of the interval; meaningless where MISSING
    flags : uint8 of OPEN and MISSING [ear, test]
    count : how many frequencies were summed; a mean is total / count, compared by cross-multiplication only
    """

    total: NDArray[np.int16]
    flags: NDArray[np.uint8]
    count: int

    @staticmethod
    def empty(tests: int, count: int) -> "Sums":
        """Room for so many tests."""
        return Sums(np.empty((2, tests), dtype=np.int16), np.empty((2, tests), dtype=np.uint8), count)

    def part(self, tests: slice) -> "Sums":
        """A view of a stretch of tests: what is written to it is written here."""
        return Sums(self.total[:, tests], self.flags[:, tests], self.count)


def threshold_sums(grid: ThresholdGrid, frequencies_hz: Sequence[int]) -> Sums:
    """Sum of the hearing threshold levels at `frequencies_hz` in each ear. [tenths of a dB HL]

    A frequency that the files do not hold at all counts as missing in every test.
    """
    sums = Sums.empty(len(grid), len(frequencies_hz))
    fill_sums(sums, grid, frequencies_hz, slice(0, len(grid)))
    return sums


def fill_sums(sums: Sums, grid: ThresholdGrid, frequencies_hz: Sequence[int], tests: slice) -> None:
    """`threshold_sums` of a stretch of tests, written to `sums`, which has room for just these."""
    sums.total[:] = 0
    sums.flags[:] = 0
    for frequency in frequencies_hz:
        if frequency not in grid.frequencies_hz:
            sums.flags[:] |= MISSING
            continue
        at = grid.frequencies_hz.index(frequency)
        for ear in (0, 1):
            sums.total[ear] += grid.threshold[ear, at, tests]
            sums.flags[ear] |= np.minimum(grid.response[ear, at, tests], _STATES).view(np.uint8)
