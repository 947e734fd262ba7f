"""Events of a criterion: where it was met, what the retest said, and which test decides."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from audiokit.core.vocabulary import Met
from audiokit.surveillance.block import History
from audiokit.surveillance.walk import Trail

Indices = NDArray[np.int32]

RETEST_OPEN, CONFIRMED, NOT_CONFIRMED, NO_RETEST, FOUND_AT_RETEST = range(5)
OUTCOMES = ("retest_open", "confirmed", "not_confirmed", "no_retest", "found_at_retest")


@dataclass(frozen=True)
class Events:
    """One entry per test and ear that met the criterion, in order of test, right ear first.

    test : the test that met it      slot : the periodic test of its run
    deciding : the retest that decided the ear, else the test itself      decided : a retest decided
    outcome : position in OUTCOMES
    """

    test: Indices
    ear: NDArray[np.int8]
    slot: Indices
    deciding: Indices
    outcome: NDArray[np.int8]
    decided: NDArray[np.bool_]

    def stands(self) -> NDArray[np.bool_]:
        """The shift stands: confirmed, no retest in time, or found at the retest."""
        return (self.outcome != RETEST_OPEN) & (self.outcome != NOT_CONFIRMED)


def find_events(trail: Trail, history: History, as_of_day: int, window_days: int) -> Events:
    """All events of a criterion as they stand on a date."""
    parts = [_events_of_ear(trail, history, as_of_day, window_days, ear) for ear in (0, 1)]
    test = np.concatenate([part[0] for part in parts])
    ear = np.repeat(np.array([0, 1], dtype=np.int8), [len(part[0]) for part in parts])
    order = np.lexsort((ear, test))
    slot, deciding, outcome, decided = (np.concatenate([part[i] for part in parts])[order] for i in range(1, 5))
    return Events(test[order], ear[order], slot, deciding, outcome, decided)


def _events_of_ear(
    trail: Trail, history: History, as_of_day: int, window_days: int, ear: int
) -> tuple[Indices, Indices, Indices, NDArray[np.int8], NDArray[np.bool_]]:
    met = trail.met[ear]
    yes = np.flatnonzero(met == Met.YES).astype(np.int32)
    slot = trail.owner.take(yes)
    decider = trail.decider.take(slot)
    answer = np.where(decider < 0, np.int8(Met.UNKNOWN), met.take(np.maximum(decider, 0)))
    decided = answer != Met.UNKNOWN
    periodic = slot == yes
    found = ~periodic & (decider == yes) & (met.take(slot) != Met.YES)
    outcome = np.where(history.day[slot] + window_days >= as_of_day, RETEST_OPEN, NO_RETEST).astype(np.int8)
    outcome[answer == Met.YES] = CONFIRMED
    outcome[answer == Met.NO] = NOT_CONFIRMED
    outcome[found] = FOUND_AT_RETEST
    deciding = np.where(decided, decider, yes)
    keep = periodic | found
    return yes[keep], slot[keep], deciding[keep], outcome[keep], decided[keep]
