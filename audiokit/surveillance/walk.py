"""Steps one criterion through time for all people of a block at once.

Each whole series is judged against the baseline in force; then only the people whose baseline changed are judged again,
from that change on. What lies before a change never alters, so the rounds end after the longest row of changes.
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from audiokit.core.vocabulary import Met
from audiokit.measures.shifts import both_met, shift_met
from audiokit.surveillance.block import History, Judged
from audiokit.surveillance.runs import deciding_retests, find_runs, follows_within, index_ranges

Indices = NDArray[np.int32]
Mask = NDArray[np.bool_]


@dataclass(frozen=True)
class Changes:
    """Baselines that change, one entry per person and ear.

    found_at : index of the effective test that revealed it, -1 for a decision
    day      : the date from which the new baseline is in force
    test     : index of the new baseline      reason : code of `revision.REASONS`
    """

    person: Indices
    ear: NDArray[np.int8]
    found_at: Indices
    day: NDArray[np.int32]
    test: Indices
    reason: NDArray[np.int8]

    @staticmethod
    def none() -> "Changes":
        """No change at all."""
        empty = np.empty(0, dtype=np.int32)
        return Changes(empty, empty.astype(np.int8), empty, empty, empty, empty.astype(np.int8))

    @staticmethod
    def join(parts: list["Changes"]) -> "Changes":
        """All entries one after the other."""
        if not parts:
            return Changes.none()
        names = Changes.__dataclass_fields__
        return Changes(**{name: np.concatenate([getattr(part, name) for part in parts]) for name in names})

    def where(self, keep: NDArray[np.generic]) -> "Changes":
        """The entries that a mask or an array of positions selects."""
        return Changes(**{name: getattr(self, name)[keep] for name in Changes.__dataclass_fields__})


@dataclass
class Trail:
    """What a criterion says of every test.

    base  : index of the baseline the test is compared with [ear, test]; the initial one before any comparison
    met : codes of `Met` [ear, test]
    owner : the periodic test a retest belongs to, the test itself where it is periodic [test]
    decider  : the deciding retest of a periodic test, -1 where there is none [test]
    sequence : number of the baselines the person had before, counted per ear [ear, test]
    changes  : baselines that changed

    Tests up to the initial baseline are not compared: met unknown, owner themselves.
    """

    base: Indices
    met: NDArray[np.int8]
    owner: Indices
    decider: Indices
    sequence: NDArray[np.int16]
    changes: Changes

    def standing(self, ear: int, tests: Indices) -> tuple[Indices, Indices, Mask]:
        """Of some compared tests those that stand as a periodic result in one ear: the periodic test itself, or the
        retest that decides the ear.

        Returns the periodic tests, the tests that stand for them, and whether a retest decided; all ascending.
        """
        owner = self.owner[tests]
        decider = self.decider[owner]
        decided = decider >= 0
        decided[decided] = self.met[ear][decider[decided]] != Met.UNKNOWN
        stands = np.where(decided, decider, owner) == tests
        return owner[stands], tests[stands], decided[stands]


Finder = Callable[[Indices | None, Trail, Indices], tuple[Changes, Indices]]
"""Given the tests judged in this round (None: all), the trail and the first test of each ear's present sequence
[ear, person]: the next change of each person (both ears where they change together) and the index of the first test
that it holds for."""


def walk(history: History, judged: Judged, opened_by: Mask | None, window_days: int, find: Finder) -> Trail:
    """Judge every test of a block. `opened_by` marks tests that open the retest window by another criterion."""
    trail = _blank_trail(history)
    follows = follows_within(history.linkable, history.day, window_days)
    follows &= ~history.before
    begin = np.where(history.initial < 0, history.first[:-1], history.initial + 1).astype(np.int32)
    end = history.first[1:].astype(np.int32)
    since = np.stack((begin, begin))
    rows: Indices | None = None
    found: list[Changes] = []
    while True:
        _judge(history, judged, trail, rows, follows, opened_by, window_days)
        changes, from_row = find(rows, trail, since)
        if not len(changes.person):
            break
        found.append(changes)
        _apply(trail, changes, from_row, end)
        since[changes.ear, changes.person] = from_row
        active = np.unique(changes.person)
        latest = np.maximum(since[0, active], since[1, active])
        active = active[latest < end[active]]
        if not len(active):
            break
        rows, _ = index_ranges(np.minimum(since[0, active], since[1, active]), end[active])
    trail.changes = Changes.join(found)
    return trail


def walk_fixed(history: History, judged: Judged, opened_by: Mask | None, window_days: int, base: Indices) -> Trail:
    """Judge every test against given baselines [ear, test]; nothing changes them here."""
    trail = _blank_trail(history)
    trail.base = base
    follows = follows_within(history.linkable, history.day, window_days)
    follows &= ~history.before
    _judge(history, judged, trail, np.flatnonzero(~history.before).astype(np.int32), follows, opened_by, window_days)
    return trail


def _blank_trail(history: History) -> Trail:
    tests = len(history)
    initial = np.repeat(history.initial, np.diff(history.first))
    return Trail(
        base=np.stack((initial, initial)),
        met=np.full((2, tests), Met.UNKNOWN, dtype=np.int8),
        owner=np.arange(tests, dtype=np.int32),
        decider=np.full(tests, -1, dtype=np.int32),
        sequence=np.zeros((2, tests), dtype=np.int16),
        changes=Changes.none(),
    )


def _judge(
    history: History,
    judged: Judged,
    trail: Trail,
    rows: Indices | None,
    follows: Mask,
    opened_by: Mask | None,
    window_days: int,
) -> None:
    """Compare the tests of this round with their baselines and find their retest runs."""
    triggers = _compare_all(history, judged, trail) if rows is None else _compare(judged, trail, rows)
    if opened_by is not None:
        triggers |= opened_by if rows is None else opened_by[rows]
    triggers &= follows if rows is None else follows[rows]
    candidates = np.flatnonzero(triggers)
    candidates = candidates.astype(np.int32) if rows is None else rows[candidates]
    starts, ends = find_runs(candidates, history.linkable, history.day, window_days)
    if rows is not None:
        trail.owner[rows] = rows
        trail.decider[rows] = -1
    retests, lengths = index_ranges(starts + np.int32(1), ends)
    trail.owner[retests] = np.repeat(starts, lengths)
    trail.decider[starts] = deciding_retests(starts, ends, trail.met, Met.UNKNOWN)


def _compare_all(history: History, judged: Judged, trail: Trail) -> Mask:
    """First round, without gathering: everybody has the initial baseline. Returns "yes in either ear"."""
    triggers = np.zeros(len(history), dtype=bool)
    for ear in (0, 1):
        low, high, base = judged.low[ear], judged.high[ear], trail.base[ear]
        met = shift_met(low, high, low[base], high[base], judged.limit)
        if judged.level is not None:
            met = both_met(met, judged.level[ear])
        np.putmask(met, history.before, Met.UNKNOWN)
        trail.met[ear] = met
        triggers |= met == Met.YES
    return triggers


def _compare(judged: Judged, trail: Trail, rows: Indices) -> Mask:
    triggers = np.zeros(len(rows), dtype=bool)
    for ear in (0, 1):
        low, high, base = judged.low[ear], judged.high[ear], trail.base[ear][rows]
        met = shift_met(low[rows], high[rows], low[base], high[base], judged.limit)
        if judged.level is not None:
            met = both_met(met, judged.level[ear][rows])
        trail.met[ear][rows] = met
        triggers |= met == Met.YES
    return triggers


def _apply(trail: Trail, changes: Changes, from_row: Indices, end: Indices) -> None:
    for ear in (0, 1):
        mine = changes.ear == ear
        rows, lengths = index_ranges(from_row[mine], end[changes.person[mine]])
        trail.base[ear][rows] = np.repeat(changes.test[mine], lengths)
        trail.sequence[ear][rows] += np.int16(1)
