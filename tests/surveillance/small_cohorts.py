"""Small invented cohorts as folders on disk, reviewed by the package, and their tables as rows of text and numbers."""

import csv
import datetime
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from audiokit.io.cohort import read_cohort
from audiokit.io.decisions import record_decision
from audiokit.reports.shifts import shifts_table
from audiokit.reports.tables import baselines_table, events_table
from audiokit.surveillance.quality import quality_table
from audiokit.surveillance.review import Review, review

FREQUENCIES_HZ = (2000, 3000, 4000)
STS = "us-osha.sts"
RECORDABLE = "us-osha.recordable"
LATE = datetime.date(2030, 1, 1)
"""A date of review long after every window of the tests that do not ask for another."""

SIGNED = {"reviewer": "R. Example", "role": "audiologist, licence X-1", "reason": "invented"}

Row = dict[str, str]
Levels = float | str | tuple[float | str, float | str, float | str]


def hearing_test(
    test_id: str,
    tested_on: str,
    right: Levels,
    left: Levels = 0,
    purpose: str = "annual",
    person: str = "P",
    valid: str = "",
    **cells: float | str,
) -> Row:
    """One row of a wide tests file.

    right, left : cells at 2, 3 and 4 kHz as they are written, or one for all three
    cells       : further columns; `hz500=10` fills both ears, `right_500=10` one
    """
    row = {"person_id": person, "test_id": test_id, "tested_on": tested_on, "purpose": purpose, "valid": valid}
    for ear, levels in (("right", right), ("left", left)):
        three = levels if isinstance(levels, tuple) else (levels,) * 3
        row |= {f"{ear}_{hz}": str(level) for hz, level in zip(FREQUENCIES_HZ, three, strict=True)}
    for name, value in cells.items():
        columns = [f"{ear}_{name[2:]}" for ear in ("right", "left")] if name.startswith("hz") else [name]
        row |= dict.fromkeys(columns, str(value))
    return row


def write_rows(path: Path, rows: Iterable[Row], columns: tuple[str, ...] = ()) -> None:
    """A csv file with the columns of all rows; what a row does not have is blank."""
    rows = list(rows)
    names = list(dict.fromkeys([*columns, *(name for row in rows for name in row)]))
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, names, restval="")
        writer.writeheader()
        writer.writerows(rows)


def write_cohort(
    folder: Path, tests: Iterable[Row], people: Iterable[Row] = (), toml: str = 'name = "invented"\n'
) -> Path:
    """A cohort folder. People who are not given are women of unknown birth, one for each person of the tests."""
    folder.mkdir(parents=True, exist_ok=True)
    tests, people = list(tests), list(people)
    named = {row["person_id"] for row in people}
    people += [
        {"person_id": person, "sex": "female"}
        for person in dict.fromkeys(row["person_id"] for row in tests)
        if person not in named
    ]
    write_rows(folder / "people.csv", people, ("person_id", "sex", "birth_date", "birth_year"))
    empty = tuple(hearing_test("", "", "", ""))
    write_rows(folder / "tests.csv", tests, empty)
    (folder / "cohort.toml").write_text(toml, encoding="utf-8")
    return folder


def decide(folder: Path, kind: str, test_id: str, ear: str | None = None, *, on: str = "", person: str = "P") -> int:
    """Record a reviewer's decision; `on` is the date from which it counts."""
    return record_decision(
        folder, kind=kind, person_id=person, ear=ear, test_id=test_id, takes_effect_on=on or None, **SIGNED
    )


@dataclass
class Tables:
    """The tables of a review; blank cells are empty texts, dB are numbers."""

    shifts: list[dict[str, Any]]
    events: list[dict[str, Any]]
    baselines: list[dict[str, Any]]
    worklist: list[dict[str, Any]]
    quality: list[dict[str, Any]]

    def find(self, table: str, **wanted: str) -> list[dict[str, Any]]:
        """The rows of a table that agree with all of `wanted`."""
        rows: list[dict[str, Any]] = getattr(self, table)
        return [row for row in rows if all(row[column] == value for column, value in wanted.items())]

    def one(self, table: str, **wanted: str) -> dict[str, Any]:
        """The only such row."""
        rows = self.find(table, **wanted)
        assert len(rows) == 1, (table, wanted, rows)
        return rows[0]

    def met(self, criterion: str = STS, ear: str = "right", person: str = "P") -> dict[str, str]:
        """Verdict of every compared test in one ear."""
        rows = self.find("shifts", criterion=criterion, ear=ear, person_id=person)
        return {row["test_id"]: row["met"] for row in rows}

    def compared_with(self, criterion: str = STS, ear: str = "right", person: str = "P") -> dict[str, str]:
        """Baseline of every compared test in one ear."""
        rows = self.find("shifts", criterion=criterion, ear=ear, person_id=person)
        return {row["test_id"]: row["baseline_test_id"] for row in rows}

    def outcomes(self, criterion: str = STS, person: str = "P") -> dict[tuple[str, str], str]:
        """Outcome of every event by test and ear."""
        rows = self.find("events", criterion=criterion, person_id=person)
        return {(row["test_id"], row["ear"]): row["outcome"] for row in rows}

    def history(self, ear: str = "right", person: str = "P") -> list[tuple[str, str, str, str, str]]:
        """Baselines of one ear: test, from, until, reason, status; in order of the file."""
        columns = ("test_id", "in_force_from", "in_force_until", "reason", "status")
        rows = self.find("baselines", ear=ear, person_id=person)
        return [tuple(row[column] for column in columns) for row in rows]  # type: ignore[misc]

    def todo(self, action: str, person: str = "P") -> list[tuple[str, str, str, str]]:
        """Lines of the worklist: due date, overdue, ear, test."""
        rows = self.find("worklist", action=action, person_id=person)
        return [(row["due_on"], row["overdue"], row["ear"], row["test_id"]) for row in rows]


def tables_of(found: Review) -> Tables:
    """The tables of a review, by the functions that write its files."""
    frames = (shifts_table(found), events_table(found), baselines_table(found))
    rows = [frame.to_pylist() for frame in frames]
    rows += [found.worklist.to_dict("records"), quality_table(found).to_dict("records")]
    return Tables(*([{k: "" if v is None else v for k, v in row.items()} for row in table] for table in rows))


def reviewed(folder: Path, as_of: datetime.date | str = LATE, **settings: Any) -> Tables:
    """The tables of the review of a folder; settings as `read_cohort` takes them."""
    date = datetime.date.fromisoformat(as_of) if isinstance(as_of, str) else as_of
    return tables_of(review(read_cohort(folder, as_of=date, **settings)))


def review_rows(
    folder: Path, tests: Iterable[Row], people: Iterable[Mapping[str, str]] = (), **settings: Any
) -> Tables:
    """Write a cohort and review it."""
    return reviewed(write_cohort(folder, tests, [dict(row) for row in people]), **settings)
