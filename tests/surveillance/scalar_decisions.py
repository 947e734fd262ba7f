"""Reviewers' decisions on top of the scalar review, one person and one test at a time; written from the contract.

Readings that the contract leaves open: a revised baseline holds for periodic tests dated after the decision takes
effect, and for their retests; it takes effect at the earliest on its own test's day; of several the later effect
stands, on one day the later entry; proposals are those of the ear's present sequence.
"""

import datetime as dt
from collections import Counter
from dataclasses import dataclass

from tests.oracle.hostile import HostileCohort
from tests.oracle.records import EARS, STS, HearingTest, Person, Review, Settings
from tests.oracle.scalar_review import InForce, PersonReview, baseline_order, retest_run, row_order
from tests.oracle.scalar_worklist import worklist_of


@dataclass(frozen=True)
class Decision:
    """One entry of the decisions file that is in force; `number` as recorded."""

    number: int
    kind: str
    person_id: str
    test_id: str
    ear: str = ""
    effect: dt.date = dt.date(2000, 1, 1)


class DecidedReview(PersonReview):
    """The review of one person whose baselines are revised by decisions only."""

    def __init__(self, person: Person, tests: list[HearingTest], settings: Settings, decisions: list[Decision]):
        own = {test.test_id: test for test in tests}
        named = [decision for decision in decisions if decision.test_id in own]
        dated = [(max(d.effect, own[d.test_id].tested_on), d.number, d, own[d.test_id]) for d in named]
        self.answers = sorted(dated, key=lambda entry: entry[:2])
        in_time = [entry for entry in self.answers if entry[0] <= settings.as_of]
        self.pending = in_time if settings.baseline_revision == "reviewed" else []
        self.effective_numbers = {entry[1] for entry in self.pending}
        super().__init__(person, tests, settings)

    def walk_sts(self) -> None:
        """As without decisions, but each periodic test is preceded by the decisions that took effect before its day."""
        place = 0
        sequence: dict[str, list[HearingTest]] = {ear: [] for ear in EARS}
        while place < len(self.later):
            periodic = self.later[place]
            for ear in self.take_effect([entry for entry in self.pending if entry[0] < periodic.tested_on]):
                sequence[ear].clear()
                self.proposals[ear].clear()
            baselines = {ear: self.chains[ear][-1].test for ear in EARS}
            for ear in EARS:
                self.judge.compare(STS, periodic, ear, baselines[ear])
            met = [self.judge.met(STS, periodic, ear) for ear in EARS]
            run = retest_run(self.later, place) if "yes" in met else []
            for retest in run:
                for ear in EARS:
                    self.judge.compare(STS, retest, ear, baselines[ear])
            self.make_events(STS, periodic, run)
            for ear in EARS:
                effective = self.deciding_retest(STS, run, ear) or periodic
                sequence[ear].append(effective)
                self.effective[ear].append(effective)
                self.look_for_revision(ear, sequence[ear])
            place += 1 + len(run)
        self.take_effect(list(self.pending))

    def take_effect(self, due: list[tuple[dt.date, int, Decision, HearingTest]]) -> set[str]:
        """Put decisions into the chains of baselines; returns the ears."""
        for entry in due:
            day, _, decision, test = entry
            self.pending.remove(entry)
            since = max(day, self.initial.tested_on)
            before = self.chains[decision.ear][-1]
            before.until, before.status = since, "superseded"
            self.chains[decision.ear].append(InForce(test, since, None, "decision", "in_force"))
        return {entry[2].ear for entry in due}

    def drop_answered(self, refused: set[tuple[str, str]]) -> None:
        """Take away proposals that a reviewer refused, followed, or decided about from that day on."""
        for ear in EARS:
            answers = [entry for entry in self.answers if entry[2].ear == ear]
            chosen = {entry[3].test_id for entry in answers}
            latest = max((entry[0] for entry in answers), default=dt.date.min)
            self.proposals[ear] = [
                proposal
                for proposal in self.proposals[ear]
                if proposal.test.test_id not in chosen
                and (proposal.test.test_id, ear) not in refused
                and latest < proposal.since
            ]


def decided_review(cohort: HostileCohort, decisions: list[Decision]) -> tuple[Review, set[int]]:
    """The tables that a review with decisions should give, and the numbers of revisions without effect."""
    settings, result = cohort.settings, Review()
    by_kind = {kind: [d for d in decisions if d.kind == kind] for kind in {d.kind for d in decisions} | KINDS}
    invalid = {(d.person_id, d.test_id) for d in by_kind["invalidate_test"]}
    effective: set[int] = set()
    for person in cohort.persons:
        name = person.person_id
        own = [test for test in cohort.accepted if test.person_id == name and test.valid]
        own = [test for test in own if test.tested_on <= settings.as_of and (name, test.test_id) not in invalid]
        own.sort(key=lambda test: test.moment)
        revisions = [d for d in by_kind["revise_baseline"] if d.person_id == name]
        reviewed = DecidedReview(person, own, settings, revisions) if own else None
        if reviewed is not None:
            reviewed.drop_answered(_named(by_kind["refuse_baseline"], name))
            effective |= reviewed.effective_numbers
            result.shifts += reviewed.shift_rows()
            result.events += reviewed.events
            result.baselines += reviewed.baseline_rows()
        result.worklist += _open_lines(worklist_of(person, reviewed, settings), by_kind, name)
    result.shifts.sort(key=row_order)
    result.events.sort(key=row_order)
    result.baselines.sort(key=baseline_order)
    return result, {d.number for d in by_kind["revise_baseline"]} - effective


KINDS = {"invalidate_test", "revise_baseline", "refuse_baseline", "not_work_related", "notice_given", "entry_made"}
_CLOSED_BY = {"notify": ("notice_given",), "record": ("not_work_related", "entry_made")}


def _named(decisions: list[Decision], person_id: str) -> set[tuple[str, str]]:
    return {(d.test_id, d.ear) for d in decisions if d.person_id == person_id}


def _open_lines(lines: list[dict], by_kind: dict[str, list[Decision]], person_id: str) -> list[dict]:
    """The lines of the worklist that no decision has closed."""
    closed = {
        action: {key for kind in kinds for key in _named(by_kind[kind], person_id)}
        for action, kinds in _CLOSED_BY.items()
    }
    return [line for line in lines if (line["test_id"], line["ear"]) not in closed.get(line["action"], set())]


def cases(cohort: HostileCohort, decisions: list[Decision]) -> Counter[str]:
    """What occurs in a cohort, so that a test can say that it has seen it."""
    result, idle = decided_review(cohort, decisions)
    seen = Counter(row["reason"] for row in result.baselines)
    seen.update(row["status"] for row in result.baselines)
    without, _ = decided_review(cohort, [])
    seen["idle"] = len(idle)
    seen["proposals fewer"] = sum(row["status"] == "proposed" for row in without.baselines) > seen["proposed"]
    seen["verdicts changed"] = [row["met"] for row in without.shifts] != [row["met"] for row in result.shifts]
    seen["lines closed"] = len(without.worklist) > len(result.worklist)
    return seen
