"""decisions.db of the example: what its invented reviewers decided, each entry at a fixed time."""

import datetime
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd

from audiokit.core.dates import to_date
from audiokit.core.vocabulary import EARS
from audiokit.example.programme import Revisions
from audiokit.example.scenario import AS_OF, SITES
from audiokit.io.cohort import read_cohort
from audiokit.io.decisions import record_decision
from audiokit.surveillance.review import review

CLOSED_UNTIL = datetime.date(2025, 10, 1)
"""Notices and log entries due before this day were made."""

_REVIEWERS = {site.prefix: site.reviewer for site in SITES if site.reviewer[0]}


@dataclass(frozen=True)
class _Entry:
    """One decision; an undo names the person and test of the entry it undoes."""

    day: datetime.date
    kind: str
    person_id: str
    test_id: str
    reason: str
    ear: str | None = None


_CONSTRUCTED = (
    _Entry(
        datetime.date(2024, 9, 19),
        "revise_baseline",
        "S9022",
        "S9022-2",
        "shift seen in 2023 and 2024; the better of the two tests becomes the baseline",
        "right",
    ),
    _Entry(
        datetime.date(2025, 2, 24),
        "not_work_related",
        "S9020",
        "S9020-2",
        "sudden loss after an infection, seen by the ear clinic; noise neither caused nor worsened it",
        "right",
    ),
    _Entry(datetime.date(2025, 9, 10), "invalidate_test", "S9016", "S9016-3", "the booth door stood open"),
    _Entry(datetime.date(2025, 9, 11), "undo", "S9016", "S9016-3", "wrong person: it was another test"),
    _Entry(
        datetime.date(2025, 9, 15),
        "invalidate_test",
        "S9023",
        "S9023-2",
        "answers at random, confirmed by the tester; test to be repeated",
    ),
    _Entry(
        datetime.date(2026, 2, 24),
        "note",
        "S9006",
        "S9006-3",
        "papers asked from the earlier employer before the log entry is made",
        "right",
    ),
)
"""Decisions on people constructed by hand."""


def record_decisions(folder: Path, revisions: Revisions, tests: pd.DataFrame) -> None:
    """Record all decisions up to AS_OF in order of time: revised baselines of drawn people, and the constructed ones.

    tests : test_id and person_id by serial
    """
    entries = sorted([*_revision_entries(revisions, tests), *_CONSTRUCTED], key=lambda entry: entry.day)
    numbers: dict[str, int] = {}
    for entry in entries:
        numbers[entry.test_id] = _record(folder, entry, numbers.get(entry.test_id))


def close_old_lines(folder: Path) -> None:
    """Record that the notices and entries due before CLOSED_UNTIL were made, where the site has a reviewer.

    The people constructed by hand keep theirs, so that old lines stay on the worklist as well.
    """
    lines = review(read_cohort(folder)).worklist
    kinds = {"notify": "notice_given", "record": "entry_made"}
    old = lines["action"].isin(kinds) & (lines["due_on"] < CLOSED_UNTIL.isoformat())
    old &= ~lines["person_id"].str.startswith("S9") & lines["person_id"].str[0].isin(_REVIEWERS)
    columns = [lines.loc[old, name].tolist() for name in ("action", "person_id", "test_id", "ear")]
    for action, person_id, test_id, ear in zip(*columns, strict=True):
        _record(folder, _Entry(AS_OF, kinds[action], person_id, test_id, "copy in the person's file", ear), None)


def _revision_entries(revisions: Revisions, tests: pd.DataFrame) -> list[_Entry]:
    order = np.lexsort((revisions.ear, revisions.serial, revisions.day))
    named = tests.loc[revisions.serial[order]]
    reasons = ("shift persists on two tests in a row", "better on two tests in a row")
    entries = [
        _Entry(to_date(day), "revise_baseline", person_id, test_id, reasons[better], EARS[ear])
        for day, person_id, test_id, better, ear in zip(
            revisions.day[order],
            named["person_id"],
            named["test_id"],
            revisions.improved[order].astype(int),
            revisions.ear[order],
            strict=True,
        )
    ]
    return [entry for entry in entries if entry.day <= AS_OF]


def _record(folder: Path, entry: _Entry, earlier: int | None) -> int:
    """Append one entry; `earlier` is the number of the latest entry on the same test."""
    reviewer, role = _REVIEWERS[entry.person_id[0]]
    undo = entry.kind == "undo"
    return record_decision(
        folder,
        kind=entry.kind,
        person_id=None if undo else entry.person_id,
        ear=entry.ear,
        test_id=None if undo else entry.test_id,
        takes_effect_on=entry.day,
        reviewer=reviewer,
        role=role,
        reason=entry.reason,
        recorded_at=datetime.datetime.combine(entry.day, datetime.time(10, 0), datetime.UTC),
        undoes=earlier if undo else None,
    )
