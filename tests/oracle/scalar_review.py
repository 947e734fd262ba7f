"""The yearly review under 29 CFR 1910.95 and 1904.10, one person and one test at a time: obvious, not fast.

The numbers are typed in here on purpose, not read from the package's rule file.
"""

import datetime as dt
from dataclasses import dataclass

from tests.oracle.judging import Judge
from tests.oracle.records import EARS, RECORDABLE, STS, HearingTest, Person, Review, Settings
from tests.oracle.revision import improved, persistent
from tests.oracle.scalar_worklist import worklist_of

RETEST_DAYS = 30  # 29 CFR 1910.95(g)(7)(ii)
NOTIFY_DAYS = 21  # 29 CFR 1910.95(g)(8)(i)
RECORD_DAYS = 7  # 29 CFR 1904.10(b)(4)
RECORD_DAYS_WITHOUT_RETEST = RETEST_DAYS + RECORD_DAYS  # the project's own choice: window plus seven, no text
STANDS = ("confirmed", "no_retest", "found_at_retest")


@dataclass
class InForce:
    """A baseline and the time it is in force."""

    test: HearingTest
    since: dt.date
    until: dt.date | None
    reason: str
    status: str


class PersonReview:
    """All that is worked out for one person who has at least one valid test."""

    def __init__(self, person: Person, tests: list[HearingTest], settings: Settings):
        self.person = person
        self.settings = settings
        self.initial, self.later = split_at_baseline(tests)
        self.judge = Judge(person, settings)
        self.events: list[dict] = []
        self.chains: dict[str, list[InForce]] = {
            ear: [InForce(self.initial, self.initial.tested_on, None, "initial", "in_force")] for ear in EARS
        }
        self.proposals: dict[str, list[InForce]] = {ear: [] for ear in EARS}
        self.effective: dict[str, list[HearingTest]] = {ear: [] for ear in EARS}
        self.walk_sts()
        self.walk_recordable()

    def walk_sts(self) -> None:
        """Step through the tests under the criterion sts, with revisions of the baseline per ear."""
        place = 0
        since_revision: dict[str, list[HearingTest]] = {ear: [] for ear in EARS}
        while place < len(self.later):
            periodic = self.later[place]
            baselines = {ear: self.chains[ear][-1].test for ear in EARS}
            for ear in EARS:
                self.judge.compare(STS, periodic, ear, baselines[ear])
            run: list[HearingTest] = []
            if "yes" in [self.judge.met(STS, periodic, ear) for ear in EARS]:
                run = retest_run(self.later, place)
            for retest in run:
                for ear in EARS:
                    self.judge.compare(STS, retest, ear, baselines[ear])
            self.make_events(STS, periodic, run)
            for ear in EARS:
                effective = self.deciding_retest(STS, run, ear) or periodic
                since_revision[ear].append(effective)
                self.effective[ear].append(effective)
                self.look_for_revision(ear, since_revision[ear])
            place += 1 + len(run)

    def walk_recordable(self) -> None:
        """Step through the tests under the criterion recordable, with its own runs and its own moving baseline."""
        place = 0
        recording = {ear: self.initial for ear in EARS}
        while place < len(self.later):
            periodic = self.later[place]
            self.judge_recordable(periodic, recording)
            run: list[HearingTest] = []
            if "yes" in [self.judge.met(criterion, periodic, ear) for criterion in (STS, RECORDABLE) for ear in EARS]:
                run = retest_run(self.later, place)
            for retest in run:
                self.judge_recordable(retest, recording)
            for ear, outcome in self.make_events(RECORDABLE, periodic, run).items():
                if outcome in STANDS:
                    recording[ear] = self.deciding_retest(RECORDABLE, run, ear) or periodic
            place += 1 + len(run)

    def judge_recordable(self, test: HearingTest, recording: dict[str, HearingTest]) -> None:
        for ear in EARS:
            baseline = recording[ear]
            if self.settings.recording_baseline == "in_force":
                baseline = self.judge.verdicts[STS, test.test_id, ear].baseline
            self.judge.compare(RECORDABLE, test, ear, baseline)

    def deciding_retest(self, criterion: str, run: list[HearingTest], ear: str) -> HearingTest | None:
        """The last retest known in at least one ear, if it is known in this ear; else None: the periodic test stays."""
        for retest in reversed(run):
            if any(self.judge.met(criterion, retest, either) != "unknown" for either in EARS):
                return retest if self.judge.met(criterion, retest, ear) != "unknown" else None
        return None

    def make_events(self, criterion: str, periodic: HearingTest, run: list[HearingTest]) -> dict[str, str]:
        """Make the events of a periodic test and its retests; return the outcome of each ear that has one."""
        outcomes = {}
        for ear in EARS:
            met_first = self.judge.met(criterion, periodic, ear) == "yes"
            retest = self.deciding_retest(criterion, run, ear)
            met_again = retest is not None and self.judge.met(criterion, retest, ear) == "yes"
            last_day = periodic.tested_on + dt.timedelta(days=RETEST_DAYS)
            if met_first and retest is None:
                outcomes[ear] = "retest_open" if self.settings.as_of <= last_day else "no_retest"
            elif met_first:
                outcomes[ear] = "confirmed" if met_again else "not_confirmed"
            elif met_again:
                outcomes[ear] = "found_at_retest"
            else:
                continue
            shown = periodic if met_first or retest is None else retest
            self.add_event(criterion, ear, shown, retest, outcomes[ear])
        return outcomes

    def add_event(self, criterion: str, ear: str, test: HearingTest, retest: HearingTest | None, outcome: str) -> None:
        """Add a row of events; `retest` is the retest that decided this ear, None when there is none."""
        deciding = retest or test
        verdict = self.judge.verdicts[criterion, deciding.test_id, ear]
        row: dict = {
            "person_id": self.person.person_id,
            "test_id": test.test_id,
            "tested_on": test.tested_on,
            "ear": ear,
            "criterion": criterion,
            "outcome": outcome,
            "deciding_test_id": deciding.test_id,
            "value_db": verdict.value.shown if verdict.value else None,
            "mean_hl_db": verdict.level.shown if verdict.level else None,
            "recordable": "",
            "retest_by": None,
            "notify_by": None,
            "record_by": None,
        }
        if outcome == "retest_open":
            row["retest_by"] = test.tested_on + dt.timedelta(days=RETEST_DAYS)
        if criterion == STS and outcome != "not_confirmed":
            row["notify_by"] = deciding.tested_on + dt.timedelta(days=NOTIFY_DAYS)
        if criterion == RECORDABLE and outcome in STANDS:
            row["recordable"] = "yes"
            if retest is not None:
                row["record_by"] = retest.tested_on + dt.timedelta(days=RECORD_DAYS)
            else:
                row["record_by"] = test.tested_on + dt.timedelta(days=RECORD_DAYS_WITHOUT_RETEST)
        self.events.append(row)

    def look_for_revision(self, ear: str, sequence: list[HearingTest]) -> None:
        """Look for a revision at the last test of `sequence`: the ear's effective tests under its baseline.

        A revision that takes effect empties the sequence.
        """
        reason, best = "improvement", improved(self.judge, ear, sequence)
        if best is None:
            reason, best = "persistent_shift", persistent(self.judge, ear, sequence)
        if best is None:
            return
        found_on = sequence[-1].tested_on
        if self.settings.baseline_revision == "automatic":
            before = self.chains[ear][-1]
            before.until, before.status = found_on, "superseded"
            self.chains[ear].append(InForce(best, found_on, None, reason, "in_force"))
            sequence.clear()
        elif not any(p.test.test_id == best.test_id and p.reason == reason for p in self.proposals[ear]):
            self.proposals[ear].append(InForce(best, found_on, None, reason, "proposed"))

    def shift_rows(self) -> list[dict]:
        rows = []
        for test in self.later:
            for ear in EARS:
                for criterion in (RECORDABLE, STS):
                    verdict = self.judge.verdicts[criterion, test.test_id, ear]
                    rows.append(
                        {
                            "person_id": self.person.person_id,
                            "test_id": test.test_id,
                            "tested_on": test.tested_on,
                            "ear": ear,
                            "criterion": criterion,
                            "baseline_test_id": verdict.baseline.test_id,
                            "measured_db": verdict.measured.shown if verdict.measured else None,
                            "correction_db": verdict.correction,
                            "value_db": verdict.value.shown if verdict.value else None,
                            "bound": verdict.measured.bound if verdict.measured else "none",
                            "met": verdict.met,
                        }
                    )
        return rows

    def baseline_rows(self) -> list[dict]:
        return [
            {
                "person_id": self.person.person_id,
                "ear": ear,
                "test_id": entry.test.test_id,
                "in_force_from": entry.since,
                "in_force_until": entry.until,
                "reason": entry.reason,
                "status": entry.status,
            }
            for ear in EARS
            for entry in self.chains[ear] + self.proposals[ear]
        ]


def split_at_baseline(tests: list[HearingTest]) -> tuple[HearingTest, list[HearingTest]]:
    """The initial baseline of a person's tests in time order, and the tests after it."""
    place = 0
    for candidate, test in enumerate(tests):
        if test.purpose == "baseline":
            place = candidate
            break
    return tests[place], tests[place + 1 :]


def retest_run(tests: list[HearingTest], place: int) -> list[HearingTest]:
    """The unbroken run of retests directly after the periodic test at `place`."""
    run = []
    for test in tests[place + 1 :]:
        days = (test.tested_on - tests[place].tested_on).days
        if days > RETEST_DAYS or test.purpose not in ("retest", ""):
            break
        run.append(test)
    return run


def row_order(row: dict) -> tuple:
    """Order of shifts and events."""
    return row["person_id"], row["tested_on"], row["test_id"], EARS.index(row["ear"]), row["criterion"]


def baseline_order(row: dict) -> tuple:
    return row["person_id"], EARS.index(row["ear"]), row["in_force_from"], row["test_id"], row["reason"]


def review(persons: list[Person], tests: list[HearingTest], settings: Settings) -> Review:
    """Review accepted people and tests (tests in input order)."""
    result = Review()
    valid: dict[str, list[HearingTest]] = {person.person_id: [] for person in persons}
    for test in tests:
        if test.valid and test.tested_on <= settings.as_of:
            valid[test.person_id].append(test)
    for person in persons:
        own = valid[person.person_id]
        own.sort(key=lambda test: test.moment)  # stable: equal moments keep their input order
        reviewed = PersonReview(person, own, settings) if own else None
        if reviewed is not None:
            result.shifts += reviewed.shift_rows()
            result.events += reviewed.events
            result.baselines += reviewed.baseline_rows()
        result.worklist += worklist_of(person, reviewed, settings)
    result.shifts.sort(key=row_order)
    result.events.sort(key=row_order)
    result.baselines.sort(key=baseline_order)
    return result
