"""A rulebook's criteria over all people: arrays in; baselines, verdicts and proposals out, block by block."""

import itertools
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from audiokit.core.vocabulary import Met
from audiokit.rules.spec import Criterion, Rulebook, tenths
from audiokit.surveillance.block import History, Judged
from audiokit.surveillance.finders import BaselineDecisions, by_decision, by_event, by_persistence, revision_hits
from audiokit.surveillance.revision import OtherFrequencies, RevisionLimits, choose
from audiokit.surveillance.walk import Changes, Trail, walk, walk_fixed

BLOCK_TESTS = 1 << 16
"""Tests in a block: small enough for the cache, large enough that the cost of each numpy call vanishes."""


@dataclass(frozen=True)
class Plan:
    """How the cohort's settings want the mechanics to run.

    as_of_day : days since 1970-01-01      automatic : the persistence rules revise, else only decisions
    in_force : the recording criterion uses the baseline in force of the criterion it names
    """

    as_of_day: int
    automatic: bool
    in_force: bool
    workers: int = 2


@dataclass(frozen=True)
class Findings:
    """One criterion over all tests. `trail` indexes tests of the whole history; see `walk.Trail`.

    proposals : revisions the persistence rules suggest to a reviewer, each distinct (person, ear, test, reason) once
    """

    criterion: Criterion
    judged: Judged
    trail: Trail
    proposals: Changes


def run_mechanics(
    rulebook: Rulebook,
    history: History,
    judged: dict[str, Judged],
    other: OtherFrequencies,
    decisions: BaselineDecisions,
    plan: Plan,
    progress: Callable[[str, int | None, int | None], None] | None = None,
) -> dict[str, Findings]:
    """Every criterion of a rulebook, in the file's order, over all people.

    judged : by criterion id, what each compares      other : the frequencies outside the revision criterion's own
    """
    stretches = _stretches(history.first)
    trails = {c.id: _empty_trail(len(history)) for c in rulebook.criteria}
    changes: dict[str, list[Changes]] = {c.id: [] for c in rulebook.criteria}
    proposals: dict[str, list[Changes]] = {c.id: [] for c in rulebook.criteria}

    def work(people: slice) -> dict[str, tuple[Trail, Changes]]:
        return _block(rulebook, history, judged, other, decisions, plan, people)

    with ThreadPoolExecutor(max_workers=plan.workers) as pool:
        for number, (people, made) in enumerate(zip(stretches, pool.map(work, stretches), strict=True), start=1):
            offset = int(history.first[people.start])
            for criterion_id, (trail, proposed) in made.items():
                _place(trails[criterion_id], trail, offset)
                changes[criterion_id].append(_shifted(trail.changes, people.start, offset))
                proposals[criterion_id].append(_shifted(proposed, people.start, offset))
            if progress is not None:
                progress("judging", number, len(stretches))
    findings = {}
    for criterion in rulebook.criteria:
        trail = trails[criterion.id]
        trail.changes = Changes.join(changes[criterion.id])
        findings[criterion.id] = Findings(criterion, judged[criterion.id], trail, Changes.join(proposals[criterion.id]))
    return findings


def _stretches(first: NDArray[np.int64]) -> list[slice]:
    """Consecutive people, cut so that each stretch holds about BLOCK_TESTS tests."""
    people = len(first) - 1
    cuts = [0]
    while cuts[-1] < people:
        target = first[cuts[-1]] + BLOCK_TESTS
        cuts.append(min(people, max(cuts[-1] + 1, int(np.searchsorted(first, target, side="right")) - 1)))
    return [slice(a, b) for a, b in itertools.pairwise(cuts)]


def _block(
    rulebook: Rulebook,
    history: History,
    judged: dict[str, Judged],
    other: OtherFrequencies,
    decisions: BaselineDecisions,
    plan: Plan,
    people: slice,
) -> dict[str, tuple[Trail, Changes]]:
    part = history.part(people)
    tests = slice(int(history.first[people.start]), int(history.first[people.stop]))
    made: dict[str, tuple[Trail, Changes]] = {}
    for criterion in rulebook.criteria:
        mine = judged[criterion.id].part(tests)
        opened = [made[o][0].met for o in criterion.retest_started_by.value if o != criterion.id]
        opened_by = (np.stack(opened) == Met.YES).any(axis=(0, 1)) if opened else None
        window = criterion.retest_window_days.value
        proposed = Changes.none()
        if criterion.baseline.value == "revised":
            limits = _limits(rulebook, criterion)
            elsewhere = other.part(tests)
            if plan.automatic:
                trail = walk(part, mine, opened_by, window, by_persistence(part, mine, limits, elsewhere))
            else:
                own = decisions.part(people, tests.start)
                trail = walk(part, mine, opened_by, window, by_decision(part, own))
                proposed = _proposals(part, mine, trail, limits, elsewhere)
        elif plan.in_force and criterion.baseline_in_force_of is not None:
            trail = walk_fixed(part, mine, opened_by, window, made[criterion.baseline_in_force_of.value][0].base)
        else:
            trail = walk(part, mine, opened_by, window, by_event(part, plan.as_of_day, window))
        made[criterion.id] = (trail, proposed)
    return made


def _limits(rulebook: Rulebook, criterion: Criterion) -> RevisionLimits:
    count = len(criterion.frequencies_hz.value)
    revision = rulebook.revision
    return RevisionLimits(tenths(revision.improvement_at_least_db, count), revision.persistence_months.value)


def _proposals(
    history: History, judged: Judged, trail: Trail, limits: RevisionLimits, other: OtherFrequencies
) -> Changes:
    """Every revision the rules would make on the sequences as they are, each distinct one where it is first revealed."""
    found = []
    for ear in (0, 1):
        hits = revision_hits(history, judged, trail, ear, None, limits, None)
        new = choose(hits, judged.total[ear], ear, other)
        _, first = np.unique(new.astype(np.int64) * 2 + hits.reason, return_index=True)
        first.sort()
        revealed = hits.test[first]
        found.append(
            Changes(
                person=history.person[revealed],
                ear=np.full(len(first), ear, dtype=np.int8),
                found_at=revealed,
                day=history.day[revealed],
                test=new[first],
                reason=hits.reason[first],
            )
        )
    return Changes.join(found)


def _empty_trail(tests: int) -> Trail:
    return Trail(
        base=np.empty((2, tests), dtype=np.int32),
        met=np.empty((2, tests), dtype=np.int8),
        owner=np.empty(tests, dtype=np.int32),
        decider=np.empty(tests, dtype=np.int32),
        sequence=np.empty((2, tests), dtype=np.int16),
        changes=Changes.none(),
    )


def _place(whole: Trail, part: Trail, offset: int) -> None:
    tests = slice(offset, offset + len(part.owner))
    whole.base[:, tests] = part.base + np.int32(offset)
    whole.met[:, tests] = part.met
    whole.owner[tests] = part.owner + np.int32(offset)
    whole.decider[tests] = np.where(part.decider < 0, -1, part.decider + np.int32(offset))
    whole.sequence[:, tests] = part.sequence


def _shifted(changes: Changes, person: int, test: int) -> Changes:
    return Changes(
        person=changes.person + np.int32(person),
        ear=changes.ear,
        found_at=np.where(changes.found_at < 0, -1, changes.found_at + np.int32(test)).astype(np.int32),
        day=changes.day,
        test=changes.test + np.int32(test),
        reason=changes.reason,
    )
