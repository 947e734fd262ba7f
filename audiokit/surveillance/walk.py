"""Steps one criterion through time for all people of a block at once.

Each whole series is judged against the baseline in force; then only the people whose baseline changed are judged again,
from that change on. What lies before a change never alters, so the rounds end after the longest row of changes.
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from audiokit.core.vocabulary import Met
from audiokit.measures.shifts import three_valued
from audiokit.surveillance.block import History, Judged
from audiokit.surveillance.runs import deciding_retests, find_runs, follows_within, index_ranges, sorted_union

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

    @staticmethod
    def empty(tests: int) -> "Trail":
        """Room for so many tests."""
        return Trail(
            base=np.empty((2, tests), dtype=np.int32),
            met=np.empty((2, tests), dtype=np.int8),
            owner=np.empty(tests, dtype=np.int32),
            decider=np.empty(tests, dtype=np.int32),
            sequence=np.empty((2, tests), dtype=np.int16),
            changes=Changes.none(),
        )

    def part(self, tests: slice) -> "Trail":
        """A view of a stretch of tests: what is written to it is written here."""
        return Trail(
            self.base[:, tests],
            self.met[:, tests],
            self.owner[tests],
            self.decider[tests],
            self.sequence[:, tests],
            Changes.none(),
        )

    def standing(self, ear: int, tests: Indices) -> tuple[Indices, Indices, Mask]:
        """Of some compared tests those that stand as a periodic result in one ear: the periodic test itself, or the
        retest that decides the ear.

        Returns the periodic tests, the tests that stand for them, and whether a retest decided; all ascending.
        """
        owner = self.owner.take(tests)
        decider = self.decider.take(owner)
        decided = decider >= 0
        decided[decided] = self.met[ear][decider[decided]] != Met.UNKNOWN
        stands = np.where(decided, decider, owner) == tests
        return owner[stands], tests[stands], decided[stands]


@dataclass(frozen=True)
class Round:
    """The few among the tests judged in a round that a baseline can change by, ascending; one array per ear.

    yes    : met the criterion
    better : perhaps better than the baseline by the revision limit: the corrected shift is, if it is a number at all
    """

    yes: tuple[Indices, Indices]
    better: tuple[Indices, Indices]


Finder = Callable[[Round, Trail, Indices], tuple[Changes, Indices]]
"""Given a round, the trail and the first test of each ear's present sequence [ear, person]: the next change of each
person (both ears where they change together) and the index of the first test that it holds for."""


def walk(
    history: History,
    judged: Judged,
    opened_by: Indices | None,
    window_days: int,
    find: Finder,
    trail: Trail,
    looks_back: bool = False,
) -> Round | None:
    """Judge every test of a block into `trail`. Returns the round of all tests where no baseline changed, else None.

    opened_by : tests that open the retest window by another criterion, ascending
    looks_back : the finder needs the whole of each ear's present sequence, not only what comes after the last change
    """
    _start(history, trail)
    follows = follows_within(history.linkable, history.day, window_days)
    begin = np.where(history.initial < 0, history.first[:-1], history.initial + 1).astype(np.int32)
    end = history.first[1:].astype(np.int32)
    since = np.stack((begin, begin))
    view = first = _judge_all(history, judged, trail, follows, opened_by, window_days)
    found: list[Changes] = []
    while True:
        changes, from_row = find(view, trail, since)
        if not len(changes.person):
            break
        found.append(changes)
        _apply(trail, changes, from_row, end)
        since[changes.ear, changes.person] = from_row
        active = sorted_union([changes.person])
        latest = np.maximum(since[0, active], since[1, active])
        unfinished = latest < end[active]
        active, latest = active[unfinished], latest[unfinished]
        if not len(active):
            break
        begin = np.minimum(since[0, active], since[1, active]) if looks_back else latest
        rows, _ = index_ranges(begin, end[active])
        view = _judge(history, judged, trail, rows, follows, opened_by, window_days)
    trail.changes = Changes.join(found)
    return None if found else first


def walk_fixed(
    history: History, judged: Judged, opened_by: Indices | None, window_days: int, base: Indices, trail: Trail
) -> None:
    """Judge every test against given baselines [ear, test]; nothing changes them here."""
    _start(history, trail)
    trail.base[:] = base
    trail.met[:] = Met.UNKNOWN
    follows = follows_within(history.linkable, history.day, window_days)
    rows = np.flatnonzero(~history.before).astype(np.int32)
    _judge(history, judged, trail, rows, follows, opened_by, window_days)


def candidates(history: History, judged: Judged, trail: Trail) -> Round:
    """The round that would judge all tests against the baselines that the trail has now."""
    rows = np.flatnonzero(~history.before).astype(np.int32)
    picked = [_compare(judged, trail, rows, ear) for ear in (0, 1)]
    return Round((picked[0][0], picked[1][0]), (picked[0][1], picked[1][1]))


def _start(history: History, trail: Trail) -> None:
    initial = history.initial.take(history.person)
    trail.base[0] = initial
    trail.base[1] = initial
    trail.owner[:] = np.arange(len(history), dtype=np.int32)
    trail.decider[:] = -1
    trail.sequence[:] = 0


def _judge_all(
    history: History, judged: Judged, trail: Trail, follows: Mask, opened_by: Indices | None, window_days: int
) -> Round:
    """First round, on whole columns: everybody is compared with the initial baseline."""
    picked = []
    after, before = ~history.before, history.before.view(np.int8) * np.int8(Met.UNKNOWN)
    for ear in (0, 1):
        low, high, base = judged.low[ear], judged.high[ear], trail.base[ear]
        base_high, base_low = high.take(base), low.take(base)
        lower, upper = np.subtract(low, base_high, out=base_high), np.subtract(high, base_low, out=base_low)
        met = three_valued(lower, upper, judged.limit)
        if judged.level is not None:
            np.minimum(met, judged.level[ear], out=met)
        met *= after.view(np.int8)  # sums instead of masks, which cost twenty times as much
        met += before
        trail.met[ear] = met
        better = upper <= -judged.improvement
        better &= after
        picked.append((_positions(met == Met.YES), _positions(better)))
    view = Round((picked[0][0], picked[1][0]), (picked[0][1], picked[1][1]))
    _link_retests(history, trail, view, follows, opened_by, window_days)
    return view


def _judge(
    history: History,
    judged: Judged,
    trail: Trail,
    rows: Indices,
    follows: Mask,
    opened_by: Indices | None,
    window_days: int,
) -> Round:
    """Compare some tests, always all of a person from one on, with their baselines and find their retest runs."""
    picked = [_compare(judged, trail, rows, ear) for ear in (0, 1)]
    trail.owner[rows] = rows
    trail.decider[rows] = -1
    view = Round((picked[0][0], picked[1][0]), (picked[0][1], picked[1][1]))
    if opened_by is not None:
        judged_now = np.zeros(len(history), dtype=bool)
        judged_now[rows] = True
        opened_by = opened_by[judged_now[opened_by]]
    _link_retests(history, trail, view, follows, opened_by, window_days)
    return view


def _compare(judged: Judged, trail: Trail, rows: Indices, ear: int) -> tuple[Indices, Indices]:
    """Judge some tests in one ear. Returns those that met the criterion and those that may be better."""
    low, high, base = judged.low[ear], judged.high[ear], trail.base[ear].take(rows)
    lower = low.take(rows)
    lower -= high.take(base)
    upper = high.take(rows)
    upper -= low.take(base)
    met = three_valued(lower, upper, judged.limit)
    if judged.level is not None:
        np.minimum(met, judged.level[ear].take(rows), out=met)
    trail.met[ear][rows] = met
    return rows[met == Met.YES], rows[upper <= -judged.improvement]


def _link_retests(
    history: History, trail: Trail, view: Round, follows: Mask, opened_by: Indices | None, window_days: int
) -> None:
    openers = [*view.yes] if opened_by is None else [*view.yes, opened_by]
    starts = sorted_union([tests[follows.take(tests)] for tests in openers])
    starts, ends = find_runs(starts, history.linkable, history.day, window_days)
    retests, lengths = index_ranges(starts + np.int32(1), ends)
    trail.owner[retests] = np.repeat(starts, lengths)
    trail.decider[starts] = deciding_retests(starts, ends, trail.met, Met.UNKNOWN)


def _positions(mask: Mask) -> Indices:
    return np.flatnonzero(mask).astype(np.int32)


def _apply(trail: Trail, changes: Changes, from_row: Indices, end: Indices) -> None:
    for ear in (0, 1):
        mine = changes.ear == ear
        rows, lengths = index_ranges(from_row[mine], end[changes.person[mine]])
        trail.base[ear][rows] = np.repeat(changes.test[mine], lengths)
        trail.sequence[ear][rows] += np.int16(1)
