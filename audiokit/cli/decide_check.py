"""Checks that what a decision is about is in the cohort, before it is recorded for good."""

import datetime
import difflib
from collections.abc import Iterable
from pathlib import Path

import pyarrow.compute as pc

from audiokit.core.dates import to_date
from audiokit.core.errors import DecisionError
from audiokit.io.cohort import read_cohort
from audiokit.model.cohort import Cohort

_MOST_SHOWN = 30


def check_subject(folder: Path, kind: str, person: str, test: str | None, effect: datetime.date) -> None:
    """Refuse a decision about a person or test that the cohort does not have, or that do not belong together.

    effect : from when a revised baseline counts; not before the date of the test that becomes the baseline
    Raises DecisionError with near matches; CohortError where the cohort cannot be read.
    """
    cohort = read_cohort(folder)
    row = _person(cohort, person)
    if test is None:
        return
    index = _test(cohort, row, person, test)
    if kind == "revise_baseline":
        _check_new_baseline(cohort, index, test, effect)


def _person(cohort: Cohort, person: str) -> int:
    ids = cohort.people.person_id
    row = pc.index(ids, person).as_py()
    if row < 0:
        raise DecisionError(
            f"person {person!r} is not among the {len(ids)} people of {cohort.settings.name}",
            _near(person, ids.to_pylist()) or "check the id; a person whose row is quarantined cannot be found",
        )
    return row


def _test(cohort: Cohort, row: int, person: str, test: str) -> int:
    grid = cohort.grid
    index = pc.index(grid.test_id, test).as_py()
    if index >= 0 and grid.person[index] == row:
        return index
    first, end = (int(offset) for offset in grid.first[row : row + 2])
    ids, days = grid.test_id[first:end].to_pylist(), grid.day[first:end]
    dated = [f"{identity} ({to_date(day)})" for identity, day in zip(ids, days, strict=True)]
    listed = f"the tests of person {person}: {', '.join(dated[-_MOST_SHOWN:]) or 'none'}"
    if index < 0:
        near = _near(test, ids)
        raise DecisionError(f"there is no test {test!r}", f"{near} {listed}" if near else listed)
    other = cohort.people.person_id[int(grid.person[index])]
    raise DecisionError(f"test {test!r} is not of person {person} but of {other}", listed)


def _check_new_baseline(cohort: Cohort, index: int, test: str, effect: datetime.date) -> None:
    tested_on = to_date(cohort.grid.day[index])
    if effect < tested_on:
        raise DecisionError(
            f"test {test} is of {tested_on}, so it cannot be the baseline from {effect}",
            f"let it take effect on {tested_on} or later (--takes-effect)",
        )
    if not cohort.grid.valid[index]:
        raise DecisionError(f"the file says that test {test} is not valid", "choose a valid test as baseline")
    decisions = cohort.decisions
    invalid = decisions[(decisions["kind"] == "invalidate_test") & (decisions["test_id"] == test)]
    if len(invalid):
        number = invalid["decision_id"].iloc[0]
        raise DecisionError(f"test {test} is invalid by decision {number}", f"choose another, or undo number {number}")


def _near(text: str, known: Iterable[str]) -> str:
    """Which known ids look like the one given; upper and lower case count the same. Blank where none does."""
    by_folded = {identity.casefold(): identity for identity in known}
    found = difflib.get_close_matches(text.casefold(), by_folded, n=5)
    return f"did you mean {', '.join(by_folded[folded] for folded in found)}?" if found else ""
