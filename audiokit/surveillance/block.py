"""The compact arrays that one criterion is judged on, for a stretch of people that is small enough for the cache."""

import itertools
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from audiokit.core.vocabulary import Purpose
from audiokit.model.grid import ThresholdGrid

Indices = NDArray[np.int32]
Mask = NDArray[np.bool_]


@dataclass(frozen=True)
class History:
    """The tests that take part, in order of person and time, without their thresholds.

    person, day : as in `ThresholdGrid` [test]      first : offsets [person + 1]
    initial  : index of the initial baseline, -1 for a person without tests [person]
    before   : True up to and with the initial baseline: not compared [test]
    linkable : True where the test can be a retest of the test just before it [test]
    """

    person: Indices
    first: NDArray[np.int64]
    day: NDArray[np.int32]
    initial: Indices
    before: Mask
    linkable: Mask

    def __len__(self) -> int:
        return len(self.day)

    @cached_property
    def counts(self) -> NDArray[np.int64]:
        """Number of tests of each person."""
        return np.diff(self.first)

    def part(self, people: slice) -> "History":
        """The stretch of consecutive people, with indices that start at nought."""
        first = self.first[people.start : people.stop + 1]
        tests = slice(int(first[0]), int(first[-1]))
        initial = self.initial[people]
        return History(
            person=self.person[tests] - np.int32(people.start),
            first=first - first[0],
            day=self.day[tests],
            initial=np.where(initial < 0, -1, initial - np.int32(first[0])).astype(np.int32),
            before=self.before[tests],
            linkable=self.linkable[tests],
        )


@dataclass(frozen=True)
class Judged:
    """What one criterion compares, all arrays [ear, test].

    low, high : ends of the sums of thresholds, less the age correction where one applies; see `measures.shifts.Ends`
    total : the lower end of the sums as measured, never corrected, tenths of a dB
    level : codes of `Met` for the criterion's level condition, None where it has none
    limit : the shift's limit, tenths of a dB times the number of frequencies
    improvement : the revision rule's limit for a better test, in the same unit
    """

    low: NDArray[np.int16]
    high: NDArray[np.int16]
    total: NDArray[np.int16]
    level: NDArray[np.int8] | None
    limit: int
    improvement: int


def history_of(grid: ThresholdGrid) -> History:
    """The order of the tests: initial baselines and possible retests.

    The initial baseline of both ears is the earliest test with purpose baseline, else the earliest test.
    """
    people = len(grid.first) - 1
    tests = len(grid)
    index = np.arange(tests, dtype=np.int32)
    marked = np.flatnonzero(grid.purpose == Purpose.BASELINE)[::-1]
    initial = np.where(np.diff(grid.first) > 0, grid.first[:-1], -1).astype(np.int32)
    initial[grid.person[marked]] = marked
    linkable = (grid.purpose == Purpose.RETEST) | (grid.purpose == Purpose.BLANK)
    if tests:
        linkable[grid.first[:-1][np.diff(grid.first) > 0]] = False
    before = index <= initial.take(grid.person) if people else np.zeros(0, dtype=bool)
    return History(grid.person, grid.first, grid.day, initial, before, linkable)


def stretches(first: NDArray[np.int64], tests: int) -> list[slice]:
    """Consecutive people, cut so that each stretch holds about so many tests, always at least one person."""
    people = len(first) - 1
    cuts = [0]
    while cuts[-1] < people:
        target = first[cuts[-1]] + tests
        cuts.append(min(people, max(cuts[-1] + 1, int(np.searchsorted(first, target, side="right")) - 1)))
    return [slice(a, b) for a, b in itertools.pairwise(cuts)]
