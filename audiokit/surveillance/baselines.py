"""The history of each ear's baseline, and what the rules propose to a reviewer."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from audiokit.core.dates import NO_DATE
from audiokit.surveillance.block import History
from audiokit.surveillance.decided import DecisionEffect
from audiokit.surveillance.revision import INITIAL
from audiokit.surveillance.walk import Changes

Indices = NDArray[np.int32]

IN_FORCE, SUPERSEDED, PROPOSED = range(3)
STATUSES = ("in_force", "superseded", "proposed")


@dataclass(frozen=True)
class BaselineHistory:
    """One entry per person, ear and baseline that was, is or is proposed to be in force.

    found_at : the effective test that revealed a revision, -1 for initial ones and decisions
    until_day : NO_DATE while in force or proposed      reason : code of `revision.REASONS`; status : of STATUSES
    """

    person: Indices
    ear: NDArray[np.int8]
    test: Indices
    from_day: NDArray[np.int32]
    until_day: NDArray[np.int32]
    found_at: Indices
    reason: NDArray[np.int8]
    status: NDArray[np.int8]


def baseline_history(history: History, changes: Changes, proposals: Changes) -> BaselineHistory:
    """Initial baselines of everybody with a test, what took their place, and the proposals, in no particular order."""
    people = np.flatnonzero(history.initial >= 0).astype(np.int32)
    person = np.concatenate((np.repeat(people, 2), changes.person))
    ear = np.concatenate((np.tile(np.array([0, 1], dtype=np.int8), len(people)), changes.ear))
    test = np.concatenate((np.repeat(history.initial[people], 2), changes.test))
    started = history.day[history.initial[changes.person]]  # a decision may count from before the initial baseline
    from_day = np.concatenate((history.day[np.repeat(history.initial[people], 2)], np.maximum(changes.day, started)))
    found_at = np.concatenate((np.full(2 * len(people), -1, dtype=np.int32), changes.found_at))
    reason = np.concatenate((np.full(2 * len(people), INITIAL, dtype=np.int8), changes.reason))
    order = np.argsort(person * 2 + ear, kind="stable")  # within an ear in the order in which they took effect
    person, ear, from_day = person[order], ear[order], from_day[order]
    until = np.full(len(order), NO_DATE, dtype=np.int32)
    replaced = np.flatnonzero((person[1:] == person[:-1]) & (ear[1:] == ear[:-1]))
    until[replaced] = from_day[replaced + 1]
    status = np.full(len(order), IN_FORCE, dtype=np.int8)
    status[replaced] = SUPERSEDED
    waiting = len(proposals.person)
    return BaselineHistory(
        person=np.concatenate((person, proposals.person)),
        ear=np.concatenate((ear, proposals.ear)),
        test=np.concatenate((test[order], proposals.test)),
        from_day=np.concatenate((from_day, proposals.day)),
        until_day=np.concatenate((until, np.full(waiting, NO_DATE, dtype=np.int32))),
        found_at=np.concatenate((found_at[order], proposals.found_at)),
        reason=np.concatenate((reason[order], proposals.reason)),
        status=np.concatenate((status, np.full(waiting, PROPOSED, dtype=np.int8))),
    )


def unanswered(proposals: Changes, decided: DecisionEffect) -> Changes:
    """The proposals that no reviewer has answered.

    A proposal is answered where a reviewer made that very test the baseline of the ear or refused it, or decided on
    the ear's baseline with effect on or after the day on which the proposal was first revealed.
    """
    proposals = proposals.where(~decided.refused.holds(proposals.test, proposals.ear))
    decisions = decided.answers
    if not len(decisions.person) or not len(proposals.person):
        return proposals
    ear_of_proposal = proposals.person.astype(np.int64) * 2 + proposals.ear
    ear_of_decision = decisions.person.astype(np.int64) * 2 + decisions.ear
    keys, place = np.unique(ear_of_decision, return_inverse=True)
    latest = np.full(len(keys), NO_DATE, dtype=np.int32)
    np.maximum.at(latest, place, decisions.day)
    at = np.minimum(np.searchsorted(keys, ear_of_proposal), len(keys) - 1)
    covered = (keys[at] == ear_of_proposal) & (latest[at] >= proposals.day)
    chosen = np.isin(
        (proposals.test.astype(np.int64) << 1) + proposals.ear, (decisions.test.astype(np.int64) << 1) + decisions.ear
    )
    return proposals.where(~(covered | chosen))
