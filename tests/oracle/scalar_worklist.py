"""The worklist of one person, from that person's finished review."""

from __future__ import annotations

import datetime as dt
from typing import TYPE_CHECKING

from tests.oracle.dates import add_months
from tests.oracle.judging import MEAN_FREQUENCIES
from tests.oracle.records import EARS, RECORDABLE, STS, Person, Settings

if TYPE_CHECKING:
    from tests.oracle.scalar_review import PersonReview

ANNUAL_MONTHS = 12  # 29 CFR 1910.95(g)(6)
BASELINE_MONTHS = 6  # 29 CFR 1910.95(g)(5)(i)


def worklist_of(person: Person, reviewed: PersonReview | None, settings: Settings) -> list[dict]:
    """Rows (due_on, overdue, action, person_id, ear, test_id) of a person; `reviewed` is None without a valid test."""
    lines: list[tuple[dt.date | None, str, str, str]] = []
    if reviewed is None:
        due = None if person.noise_since is None else add_months(person.noise_since, BASELINE_MONTHS)
        lines.append((due, "baseline_test", "", ""))
    else:
        lines += [*event_lines(reviewed), annual_line(reviewed), *review_lines(reviewed, settings)]
    if person.left_on is not None and person.left_on <= settings.as_of:
        lines = [
            line
            for line in lines
            if line[1] in ("notify", "record") and line[0] is not None and line[0] < person.left_on
        ]
    rows = []
    for due, action, ear, test_id in dict.fromkeys(lines):  # one line per person, test, ear and action
        overdue = "yes" if due is not None and due < settings.as_of else "no"
        if due is None and action == "baseline_test":
            overdue = "unknown"
        rows.append(
            {
                "due_on": due,
                "overdue": overdue,
                "action": action,
                "person_id": person.person_id,
                "ear": ear,
                "test_id": test_id,
            }
        )
    return rows


def event_lines(reviewed: PersonReview) -> list[tuple[dt.date | None, str, str, str]]:
    """Retests that are open, notices to give and cases to record."""
    lines = []
    for event in reviewed.events:
        for action, column in (("retest", "retest_by"), ("notify", "notify_by"), ("record", "record_by")):
            if event[column] is not None:
                lines.append((event[column], action, event["ear"], event["test_id"]))
    return lines


def annual_line(reviewed: PersonReview) -> tuple[dt.date | None, str, str, str]:
    """The next annual test: a year after the latest effective test of either ear."""
    latest = reviewed.initial
    for test in reviewed.later:
        if any(test in reviewed.effective[ear] for ear in EARS):
            latest = test
    return add_months(latest.tested_on, ANNUAL_MONTHS), "annual_test", "", latest.test_id


def review_lines(reviewed: PersonReview, settings: Settings) -> list[tuple[dt.date | None, str, str, str]]:
    """Baselines and tests that a reviewer should look at."""
    lines: list[tuple[dt.date | None, str, str, str]] = []
    for ear in EARS:
        if settings.baseline_revision == "reviewed" and reviewed.proposals[ear]:
            lines.append((None, "review_baseline", ear, reviewed.proposals[ear][-1].test.test_id))
        in_force = reviewed.chains[ear][-1].test
        if any(reviewed.judge.threshold(in_force, ear, frequency) is None for frequency in MEAN_FREQUENCIES):
            lines.append((None, "review_baseline", ear, in_force.test_id))
        for test in reviewed.later:
            unknown = reviewed.judge.met(RECORDABLE, test, ear) == "unknown"
            if unknown and reviewed.judge.met(STS, test, ear) == "yes":
                lines.append((None, "review_test", ear, test.test_id))
    return lines
