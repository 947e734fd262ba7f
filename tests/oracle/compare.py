"""Runs `audiokit review` on hostile cohorts and compares its CSV files with the scalar review, row by row.

As a script: `python -m tests.oracle.compare --seeds 0:200 --people 40 --layout long`. The first cohort that differs
is cut down to one person and as few tests as still differ, and shown.
"""

import argparse
import contextlib
import csv
import datetime as dt
import io
import sys
import tempfile
import traceback
from collections import Counter
from dataclasses import replace
from fractions import Fraction
from pathlib import Path

from tests.oracle.cohort_files import write_cohort
from tests.oracle.hostile import HostileCohort, hostile_cohort
from tests.oracle.records import Review
from tests.oracle.scalar_review import review

EVENT_KEY = ("person_id", "test_id", "ear", "criterion")
KEYS = {
    "shifts": EVENT_KEY,
    "events": EVENT_KEY,
    "baselines": ("person_id", "ear", "test_id", "reason", "in_force_from"),
}
WORKLIST_COLUMNS = ("due_on", "overdue", "action", "person_id", "ear", "test_id")


class ReviewFailed(Exception):
    """The command did not end with exit status 0."""


def run_review(folder: Path, out: Path) -> None:
    """Run `audiokit review` in this process."""
    run_command(["review", str(folder), "--out", str(out)])


def run_command(arguments: list[str]) -> None:
    """Run `audiokit` with these arguments in this process."""
    from audiokit.cli.main import main

    said = io.StringIO()
    with contextlib.redirect_stdout(said), contextlib.redirect_stderr(said):
        try:
            status = main(arguments)
        except SystemExit as stop:
            status = stop.code  # type: ignore[assignment]
        except Exception:
            raise ReviewFailed(traceback.format_exc()) from None
    if status not in (0, None):
        raise ReviewFailed(f"exit status {status}: {said.getvalue()[-2000:]}")


def read_table(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as stream:
        return list(csv.DictReader(stream))


def agree(expected: object, written: str | None) -> bool:
    """Whether a written cell says what is expected; numbers as exact to four decimals."""
    if written is None:
        return False
    if isinstance(expected, Fraction):
        try:
            number = Fraction(written)
        except ValueError:
            return False
        decimals = len(written.partition(".")[2])
        return number == round(expected, 4) and decimals <= 4 and written not in ("-0", "-0.0")
    return written == text_of(expected)


def text_of(expected: object) -> str:
    """An expected value as a cell shows it (for a number: as the report of a difference shows it)."""
    if expected is None:
        return ""
    if isinstance(expected, dt.date):
        return expected.isoformat()
    return f"{float(expected):.4f}" if isinstance(expected, Fraction) else str(expected)


def compare_table(name: str, expected: list[dict], written: list[dict[str, str]]) -> list[str]:
    """Differences of one table, in words."""
    if expected and written and (lacking := set(expected[0]) - set(written[0])):
        return [f"{name}.csv: columns {sorted(lacking)} are lacking"]
    key_columns = KEYS[name]
    theirs = {tuple(row[column] for column in key_columns): row for row in written}
    ours = {tuple(text_of(row[column]) for column in key_columns): row for row in expected}
    problems = [f"{name}.csv: {len(written) - len(theirs)} rows repeat a key"] if len(theirs) != len(written) else []
    problems += [f"{name}.csv: no row {key}, expected {shown(ours[key])}" for key in ours if key not in theirs]
    problems += [f"{name}.csv: row not expected: {shown(theirs[key])}" for key in theirs if key not in ours]
    for key, row in ours.items():
        for column, value in row.items():
            if key in theirs and not agree(value, theirs[key][column]):
                problems.append(
                    f"{name}.csv {key} {column}: written {theirs[key][column]!r}, expected {text_of(value)!r};"
                    f" why: {theirs[key].get('why')}"
                )
    if not problems and list(theirs) != list(ours):
        place = next(i for i, (a, b) in enumerate(zip(theirs, ours, strict=True)) if a != b)
        problems.append(f"{name}.csv: order: row {place + 2} is {list(theirs)[place]}, expected {list(ours)[place]}")
    return problems


def compare_worklist(expected: list[dict], written: list[dict[str, str]]) -> list[str]:
    """Differences of the worklist: the same lines, those with a date soonest first."""
    ours = Counter(tuple(text_of(row[column]) for column in WORKLIST_COLUMNS) for row in expected)
    theirs = Counter(tuple(row[column] for column in WORKLIST_COLUMNS) for row in written)
    problems = [f"worklist.csv: {count} x no line {line}" for line, count in (ours - theirs).items()]
    problems += [f"worklist.csv: {count} x line not expected {line}" for line, count in (theirs - ours).items()]
    dates = [row["due_on"] for row in written if row["due_on"]]
    if dates != sorted(dates):
        problems.append("worklist.csv: not soonest first")
    return problems


def shown(row: dict) -> str:
    return " ".join(f"{column}={text_of(value)}" for column, value in row.items() if column != "why")


def differences(cohort: HostileCohort, layout: str = "wide") -> list[str]:
    """All differences between the command and the scalar review on a cohort, in words; empty when they agree."""
    expected = review(cohort.persons, cohort.accepted, cohort.settings)
    with tempfile.TemporaryDirectory() as scratch:
        folder, out = Path(scratch, "cohort"), Path(scratch, "out")
        write_cohort(cohort, folder, layout)
        try:
            run_review(folder, out)
        except ReviewFailed as failure:
            return [str(failure)]
        return compare_folder(expected, out)


def compare_folder(expected: Review, out: Path) -> list[str]:
    """Differences between a review and the files of a finished one."""
    problems = []
    for name in KEYS:
        problems += compare_table(name, getattr(expected, name), read_table(out / f"{name}.csv"))
    return problems + compare_worklist(expected.worklist, read_table(out / "worklist.csv"))


def cut_down(cohort: HostileCohort, layout: str) -> HostileCohort:
    """The smallest cohort found that still differs: one person if possible, and no test that is not needed."""
    for person in cohort.persons:
        own = [test for test in cohort.accepted if test.person_id == person.person_id]
        small = replace(cohort, persons=[person], tests=own, rejected=[])
        if own and differences(small, layout):
            cohort = small
            break
    else:
        return cohort
    for test in list(cohort.tests):
        smaller = replace(cohort, tests=[other for other in cohort.tests if other is not test])
        if smaller.tests and differences(smaller, layout):
            cohort = smaller
    return cohort


def describe(cohort: HostileCohort) -> str:
    """Settings, people and tests of a small cohort, to be read."""
    lines = [str(cohort.settings), *map(str, cohort.persons)]
    for test in cohort.tests:
        cells = " ".join(f"{ear[0]}{hz}={text}" for (ear, hz), text in sorted(test.cells.items(), reverse=True))
        lines.append(f"{test.test_id!r} {test.moment} {test.purpose or 'blank'} valid={test.valid} {cells}")
    return "\n".join(lines)


def main(arguments: list[str] | None = None) -> int:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])  # type: ignore[union-attr]
    parser.add_argument("--seeds", default="0:40", help="first:end")
    parser.add_argument("--people", type=int, default=40)
    parser.add_argument("--layout", choices=("wide", "long", "split"), default="wide")
    parser.add_argument("--keep-going", action="store_true", help="list the differing seeds, show none in full")
    options = parser.parse_args(arguments)
    first, _, end = options.seeds.partition(":")
    differing = 0
    for seed in range(int(first), int(end or int(first) + 1)):
        cohort = hostile_cohort(seed, options.people)
        problems = differences(cohort, options.layout)
        if not problems:
            continue
        differing += 1
        print(f"seed {seed}: {len(problems)} differences, the first: {problems[0]}")
        if not options.keep_going:
            small = cut_down(cohort, options.layout)
            print(describe(small), *differences(small, options.layout), sep="\n")
            return 1
    print(f"seeds {options.seeds}, {options.people} people each: {differing} cohorts differ")
    return 1 if differing else 0


if __name__ == "__main__":
    sys.exit(main())
