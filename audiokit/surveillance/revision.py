"""The two published persistence rules for revising a baseline, on whole sequences of effective tests."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from audiokit.core.dates import add_months
from audiokit.core.vocabulary import Response

Indices = NDArray[np.int32]
Mask = NDArray[np.bool_]

IMPROVEMENT, PERSISTENT_SHIFT, DECISION, INITIAL, EVENT = range(5)
REASONS = ("improvement", "persistent_shift", "decision", "initial", "event")


@dataclass(frozen=True)
class Effective:
    """Some effective tests of one ear, in order: periodic tests, each replaced by the retest that decided it.

    slot : the periodic test, which marks the place in the sequence      test : the test that stands there
    follows : the entry before is the effective test directly before this one in the same sequence
    """

    slot: Indices
    test: Indices
    follows: Mask


@dataclass(frozen=True)
class Hits:
    """Effective tests that reveal a revision; one ear.

    slot, test : as in `Effective`      earlier : the other test of the pair
    reason : IMPROVEMENT or PERSISTENT_SHIFT
    """

    slot: Indices
    test: Indices
    earlier: Indices
    reason: NDArray[np.int8]

    def where(self, keep: Mask) -> "Hits":
        """The entries that a mask selects."""
        return Hits(self.slot[keep], self.test[keep], self.earlier[keep], self.reason[keep])


def find_hits(better: Effective, held: Effective, day: NDArray[np.int32], months: int) -> Hits:
    """Every effective test at which a rule holds; one ear.

    better : those with an exact shift, never age-corrected, that is better by the revision limit
    held   : those with an exact shift that met the criterion, so that none is in both
    months : calendar months from a run's first test to the one that shows it to persist

    A test that is in neither interrupts: it is no partner of the first rule and ends a run of the second.
    """
    improved = np.flatnonzero(better.follows)
    later = np.flatnonzero(held.follows)
    first = np.maximum.accumulate(np.where(held.follows, 0, np.arange(len(held.slot))))[later]
    persists = day[held.test[later]] >= add_months(day[held.test[first]], months)
    later, first = later[persists], first[persists]
    slot = np.concatenate((better.slot[improved], held.slot[later]))
    order = np.argsort(slot, kind="stable")
    reason = np.repeat(np.array([IMPROVEMENT, PERSISTENT_SHIFT], dtype=np.int8), (len(improved), len(later)))
    return Hits(
        slot=slot[order],
        test=np.concatenate((better.test[improved], held.test[later]))[order],
        earlier=np.concatenate((better.test[improved - 1], held.test[first]))[order],
        reason=reason[order],
    )


@dataclass(frozen=True)
class OtherFrequencies:
    """Thresholds to break ties by, outside the criterion's own frequencies.

    threshold, response : as in `ThresholdGrid` [ear, frequency, test]      at : positions of those frequencies
    """

    threshold: NDArray[np.int16]
    response: NDArray[np.int8]
    at: tuple[int, ...]

    def part(self, tests: slice) -> "OtherFrequencies":
        """The same for a stretch of tests."""
        return OtherFrequencies(self.threshold[:, :, tests], self.response[:, :, tests], self.at)

    def later_is_better(self, ear: int, earlier: Indices, later: Indices) -> Mask:
        """True where the later test is better elsewhere: at none of the frequencies worse, at one surely better.

        Only frequencies with an interval in both tests count. A pair that is not surely equal or better counts as
        worse; two no responses at one level are equal.
        """
        worse = np.zeros(len(later), dtype=bool)
        better = np.zeros(len(later), dtype=bool)
        for at in self.at:
            level, response = self.threshold[ear, at], self.response[ear, at]
            difference = level.take(later) - level.take(earlier)
            then, now = response.take(earlier), response.take(later)
            usable = (then <= Response.NO_RESPONSE) & (now <= Response.NO_RESPONSE)
            closed = now == Response.MEASURED
            both_open = (then == Response.NO_RESPONSE) & ~closed
            not_worse = (closed & (difference <= 0)) | (both_open & (difference == 0))
            worse |= usable & ~not_worse
            better |= usable & closed & (difference < 0)
        return better & ~worse


def choose(hits: Hits, total: NDArray[np.int16], ear: int, other: OtherFrequencies) -> Indices:
    """The test that should become the baseline at each hit: the lower mean hearing level, tie: the earlier.

    For a persistent shift the later wins a tie when it is better at the other frequencies.
    total : sums of thresholds of all tests in this ear, never age-corrected
    """
    difference = total.take(hits.test) - total.take(hits.earlier)
    take_later = difference < 0
    tied = np.flatnonzero((difference == 0) & (hits.reason == PERSISTENT_SHIFT))
    if len(tied):
        take_later[tied] = other.later_is_better(ear, hits.earlier[tied], hits.test[tied])
    return np.where(take_later, hits.test, hits.earlier)
