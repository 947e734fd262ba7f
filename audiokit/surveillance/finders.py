"""What may change a baseline: the persistence rules, reviewers' decisions, or the criterion's own events."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from audiokit.surveillance.block import History, Judged
from audiokit.surveillance.revision import (
    DECISION,
    EVENT,
    Effective,
    Hits,
    OtherFrequencies,
    choose,
    find_hits,
)
from audiokit.surveillance.walk import Changes, Finder, Round, Trail

Indices = NDArray[np.int32]
Mask = NDArray[np.bool_]
_NEVER = np.int32(np.iinfo(np.int32).max)


def by_persistence(history: History, judged: Judged, months: int, other: OtherFrequencies) -> Finder:
    """The first revision in each person's present sequences; both ears where they change at the same test."""

    def find(view: Round, trail: Trail, since: Indices) -> tuple[Changes, Indices]:
        found = []
        for ear in (0, 1):
            hits = revision_hits(history, judged, trail, ear, view, months, since)
            hits = hits.where(_first_of_each(history.person[hits.slot]))
            changes = Changes(
                person=history.person[hits.slot],
                ear=np.full(len(hits.slot), ear, dtype=np.int8),
                found_at=hits.test,
                day=history.day[hits.test],
                test=choose(hits, judged.total[ear], ear, other),
                reason=hits.reason,
            )
            found.append((changes, _run_end(history, trail, hits.slot)))
        return _earliest(found, len(history.initial))

    return find


def revision_hits(
    history: History, judged: Judged, trail: Trail, ear: int, view: Round, months: int, since: Indices | None
) -> Hits:
    """The effective tests of one ear that reveal a revision, among those of a round.

    since : first test of each ear's present sequence [ear, person]; earlier ones are left out; None: all sequences

    Age never takes hearing for better, so a measured shift is at least the corrected one that the round was sieved by.
    """
    total = judged.total[ear]
    better = view.better[ear]
    better = better[total.take(better) - total.take(trail.base[ear].take(better)) <= -judged.improvement]
    return find_hits(
        _effective(history, trail, ear, _exact(judged, trail, ear, better), since),
        _effective(history, trail, ear, _exact(judged, trail, ear, view.yes[ear]), since),
        history.day,
        months,
    )


def _exact(judged: Judged, trail: Trail, ear: int, tests: Indices) -> Indices:
    """Those of some tests whose shift is one number."""
    low, high, base = judged.low[ear], judged.high[ear], trail.base[ear].take(tests)
    return tests[(low.take(tests) == high.take(tests)) & (low.take(base) == high.take(base))]


def _effective(history: History, trail: Trail, ear: int, tests: Indices, since: Indices | None) -> Effective:
    slot, test, _ = trail.standing(ear, tests)
    if since is not None:
        present = slot >= since[ear].take(history.person.take(slot))
        slot, test = slot[present], test[present]
    follows = np.zeros(len(slot), dtype=bool)
    sequence = trail.sequence[ear].take(slot)
    follows[1:] = slot[:-1] == trail.owner.take(slot[1:] - 1)
    follows[1:] &= sequence[1:] == sequence[:-1]
    return Effective(slot, test, follows)


def by_event(history: History, as_of_day: int, window_days: int) -> Finder:
    """The first event that stands in each person's present sequences: confirmed, without retest, or found at retest."""

    def find(view: Round, trail: Trail, since: Indices) -> tuple[Changes, Indices]:
        found = []
        for ear in (0, 1):
            slot, test, decided = trail.standing(ear, view.yes[ear])
            person = history.person[slot]
            stands = decided | (history.day[slot] + window_days < as_of_day)
            stands &= slot >= since[ear][person]
            slot, test, person = slot[stands], test[stands], person[stands]
            first = _first_of_each(person)
            slot, test = slot[first], test[first]
            changes = Changes(
                person=person[first],
                ear=np.full(len(test), ear, dtype=np.int8),
                found_at=test,
                day=history.day[test],
                test=test,
                reason=np.full(len(test), EVENT, dtype=np.int8),
            )
            found.append((changes, _run_end(history, trail, slot)))
        return _earliest(found, len(history.initial))

    return find


def _run_end(history: History, trail: Trail, slots: Indices) -> Indices:
    """Index of the first test after each periodic test's run, at most one past the person's tests."""
    ends = slots + np.int32(1)
    live = np.arange(len(slots))
    while len(live):
        live = live[ends[live] < len(history)]
        live = live[trail.owner[ends[live]] == slots[live]]
        ends[live] += 1
    return ends


@dataclass(frozen=True)
class BaselineDecisions:
    """Reviewers' revisions in order of person, effect and entry. Tests dated after `day` are compared with `test`."""

    person: Indices
    ear: NDArray[np.int8]
    day: NDArray[np.int32]
    test: Indices

    def part(self, people: slice, first_test: int) -> "BaselineDecisions":
        """Those of a stretch of people, with indices that start at nought."""
        low, high = np.searchsorted(self.person, (people.start, people.stop))
        cut = slice(int(low), int(high))
        return BaselineDecisions(
            self.person[cut] - np.int32(people.start),
            self.ear[cut],
            self.day[cut],
            self.test[cut] - np.int32(first_test),
        )


def by_decision(history: History, decisions: BaselineDecisions) -> Finder:
    """The next decisions of each person, from the first periodic test dated after they take effect.

    A run of retests is never cut: its tests keep the baseline of their periodic test.
    """
    pending = np.ones(len(decisions.person), dtype=bool)

    def find(view: Round, trail: Trail, since: Indices) -> tuple[Changes, Indices]:
        left = np.flatnonzero(pending).astype(np.int32)
        position = _first_slot_after(history, trail, decisions, left)
        soonest = np.full(len(history.initial), _NEVER, dtype=np.int32)
        np.minimum.at(soonest, decisions.person[left], position)
        now = left[position == soonest[decisions.person[left]]]
        pending[now] = False
        changes = Changes(
            person=decisions.person[now],
            ear=decisions.ear[now],
            found_at=np.full(len(now), -1, dtype=np.int32),
            day=decisions.day[now],
            test=decisions.test[now],
            reason=np.full(len(now), DECISION, dtype=np.int8),
        )
        return changes, soonest[changes.person]

    return find


def _first_slot_after(history: History, trail: Trail, decisions: BaselineDecisions, which: Indices) -> Indices:
    """First compared periodic test dated after each decision's effect, else one past the person's tests."""
    person = decisions.person[which]
    end = history.first[1:].astype(np.int32)[person]
    at = np.maximum(history.initial[person] + 1, 0).astype(np.int32)
    live = np.flatnonzero(at < end)
    while len(live):
        row = at[live]
        too_early = (history.day[row] <= decisions.day[which[live]]) | (trail.owner[row] != row)
        live = live[too_early]
        at[live] += 1
        live = live[at[live] < end[live]]
    return at


def _first_of_each(person: Indices) -> NDArray[np.bool_]:
    """Marks the first entry of each person in an array ordered by person."""
    first = np.ones(len(person), dtype=bool)
    first[1:] = person[1:] != person[:-1]
    return first


def _earliest(found: list[tuple[Changes, Indices]], people: int) -> tuple[Changes, Indices]:
    """Of both ears' changes, those at each person's earliest place."""
    soonest = np.full(people, _NEVER, dtype=np.int32)
    for changes, from_row in found:
        soonest[changes.person] = np.minimum(soonest[changes.person], from_row)
    parts, rows = [], []
    for changes, from_row in found:
        keep = from_row == soonest[changes.person]
        parts.append(changes.where(keep))
        rows.append(from_row[keep])
    return Changes.join(parts), np.concatenate(rows)
