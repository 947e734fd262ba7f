"""A rulebook's criteria over all people: arrays in; baselines, verdicts and proposals out, block by block."""

from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from audiokit.core.vocabulary import Met
from audiokit.rules.spec import Criterion, Rulebook
from audiokit.surveillance.block import History, Judged, stretches
from audiokit.surveillance.finders import BaselineDecisions, by_decision, by_event, by_persistence, revision_hits
from audiokit.surveillance.inputs import Inputs
from audiokit.surveillance.revision import OtherFrequencies, choose
from audiokit.surveillance.walk import Changes, Round, Trail, candidates, walk, walk_fixed

BLOCK_TESTS = 1 << 18
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
    trail: Trail
    proposals: Changes


def run_mechanics(
    rulebook: Rulebook,
    history: History,
    inputs: Inputs,
    other: OtherFrequencies,
    decisions: BaselineDecisions,
    plan: Plan,
    progress: Callable[[str, int | None, int | None], None] | None = None,
) -> dict[str, Findings]:
    """Every criterion of a rulebook, in the file's order, over all people.

    inputs : what each criterion compares      other : the frequencies outside the revision criterion's own
    """
    parts_of_people = stretches(history.first, BLOCK_TESTS)
    trails = {criterion.id: Trail.empty(len(history)) for criterion in rulebook.criteria}

    def work(people: slice) -> dict[str, tuple[Changes, Changes]]:
        return _block(rulebook, history, inputs, other, decisions, plan, people, trails)

    parts: list[dict[str, tuple[Changes, Changes]]] = []
    with ThreadPoolExecutor(max_workers=plan.workers) as pool:
        for number, (people, made) in enumerate(
            zip(parts_of_people, pool.map(work, parts_of_people), strict=True), start=1
        ):
            offset = int(history.first[people.start])
            parts.append(
                {
                    k: (_shifted(c, people.start, offset), _shifted(p, people.start, offset))
                    for k, (c, p) in made.items()
                }
            )
            if progress is not None:
                progress("judging", number, len(parts_of_people))
    findings = {}
    for criterion in rulebook.criteria:
        trail = trails[criterion.id]
        trail.changes = Changes.join([part[criterion.id][0] for part in parts])
        proposals = Changes.join([part[criterion.id][1] for part in parts])
        findings[criterion.id] = Findings(criterion, trail, proposals)
    return findings


def _block(
    rulebook: Rulebook,
    history: History,
    inputs: Inputs,
    other: OtherFrequencies,
    decisions: BaselineDecisions,
    plan: Plan,
    people: slice,
    trails: dict[str, Trail],
) -> dict[str, tuple[Changes, Changes]]:
    """Judge a stretch of people into the trails. Returns each criterion's changes and proposals."""
    tests = slice(int(history.first[people.start]), int(history.first[people.stop]))
    if tests.start == tests.stop:
        return {criterion.id: (Changes.none(), Changes.none()) for criterion in rulebook.criteria}
    part = history.part(people)
    judged = inputs.judged(tests)
    trail_of = {name: trail.part(tests) for name, trail in trails.items()}
    proposals: dict[str, Changes] = {}
    for criterion in rulebook.criteria:
        mine, trail = judged[criterion.id], trail_of[criterion.id]
        openers = [trail_of[o].met for o in criterion.retest_started_by.value if o != criterion.id]
        opened_by = _met_in_either_ear(openers) if openers else None
        window = criterion.retest_window_days.value
        reference = criterion.baseline_in_force_of
        proposals[criterion.id] = Changes.none()
        if criterion.baseline.value == "revised":
            months, elsewhere = rulebook.revision.persistence_months.value, other.part(tests)
            if plan.automatic:
                find = by_persistence(part, mine, months, elsewhere)
            else:
                find = by_decision(part, decisions.part(people, tests.start))
            view = walk(part, mine, opened_by, window, find, trail, looks_back=plan.automatic)
            if not plan.automatic:
                view = view or candidates(part, mine, trail)
                proposals[criterion.id] = _proposals(part, mine, trail, view, months, elsewhere)
        elif plan.in_force and reference is not None:
            base = trail_of[reference.value].base
            walk_fixed(part, mine, opened_by, window, base, trail)
        else:
            find = by_event(part, plan.as_of_day, window)
            walk(part, mine, opened_by, window, find, trail)
    for trail in trail_of.values():
        _count_from_start(trail, tests.start)
    return {name: (trail_of[name].changes, proposals[name]) for name in trail_of}


def _met_in_either_ear(answers: list[NDArray[np.int8]]) -> NDArray[np.int32]:
    """Tests that met one of some criteria in one ear or the other, ascending; answers [ear, test] of each."""
    met = np.zeros(answers[0].shape[1], dtype=bool)
    for answer in answers:
        met |= (answer[0] == Met.YES) | (answer[1] == Met.YES)
    return np.flatnonzero(met).astype(np.int32)


def _proposals(
    history: History, judged: Judged, trail: Trail, view: Round, months: int, other: OtherFrequencies
) -> Changes:
    """Every revision the rules would make on each ear's present sequence, each distinct one where first revealed."""
    found = []
    for ear in (0, 1):
        hits = revision_hits(history, judged, trail, ear, view, months, None)
        latest = trail.sequence[ear][history.first[1:][history.person[hits.slot]] - 1]
        hits = hits.where(trail.sequence[ear][hits.slot] == latest)
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


def _count_from_start(trail: Trail, offset: int) -> None:
    """Turn a block's indices into those of the whole history."""
    shift = np.int32(offset)
    trail.base += shift
    trail.owner += shift
    trail.decider[trail.decider >= 0] += shift


def _shifted(changes: Changes, person: int, test: int) -> Changes:
    return Changes(
        person=changes.person + np.int32(person),
        ear=changes.ear,
        found_at=np.where(changes.found_at < 0, -1, changes.found_at + np.int32(test)).astype(np.int32),
        day=changes.day,
        test=changes.test + np.int32(test),
        reason=changes.reason,
    )
