"""`audiokit review` against the scalar review on hostile random cohorts: not one cell may differ."""

import csv
import datetime as dt
from dataclasses import replace
from pathlib import Path

import pytest

from tests.oracle.cohort_files import write_cohort
from tests.oracle.compare import WORKLIST_COLUMNS, compare_folder, differences, run_command, run_review, text_of
from tests.oracle.hostile import COMBINATIONS, hostile_cohort
from tests.oracle.records import Review
from tests.oracle.scalar_review import review

SEEDS_PER_COMBINATION = 3
LAYOUTS = ("wide", "long", "split")
CASES = [(8 * turn + place, place) for place in range(len(COMBINATIONS)) for turn in range(SEEDS_PER_COMBINATION)]


@pytest.mark.parametrize(("seed", "place"), CASES)
def test_no_cell_differs(seed: int, place: int) -> None:
    cohort = hostile_cohort(seed, 24, COMBINATIONS[place])
    problems = differences(cohort, layout=LAYOUTS[seed % 3])
    assert not problems, f"{len(problems)} differences, the first:\n" + "\n".join(problems[:5])


@pytest.mark.parametrize("seed", [300, 301])
def test_invalidated_tests_take_part_in_nothing(seed: int, tmp_path: Path) -> None:
    """A test that a reviewer invalidated by `audiokit decide` counts like one marked as not valid in the file."""
    cohort = hostile_cohort(seed, 20)
    write_cohort(cohort, tmp_path / "cohort")
    invalidated = {test.test_id: test.person_id for test in cohort.accepted[:8]}
    for test_id, person_id in invalidated.items():
        who = ["--reviewer", "R. Invented", "--role", "audiologist", "--reason", "noise in the booth"]
        run_command(
            ["decide", str(tmp_path / "cohort"), "invalidate_test", "--person", person_id, "--test", test_id, *who]
        )
    run_review(tmp_path / "cohort", tmp_path / "out")
    left = [replace(test, valid=test.valid and test.test_id not in invalidated) for test in cohort.accepted]
    assert compare_folder(review(cohort.persons, left, cohort.settings), tmp_path / "out") == []
    assert compare_folder(review(cohort.persons, cohort.accepted, cohort.settings), tmp_path / "out") != []


def write_review(result: Review, folder: Path) -> None:
    """The scalar review as files, to compare it with itself."""
    for name in ("shifts", "events", "baselines", "worklist"):
        rows = getattr(result, name)
        if name == "worklist":
            rows = sorted(rows, key=lambda row: (row["due_on"] is None, row["due_on"] or dt.date.min))
        with (folder / f"{name}.csv").open("w", encoding="utf-8", newline="") as stream:
            writer = csv.writer(stream)
            writer.writerow(list(rows[0]))
            writer.writerows([[text_of(value) for value in row.values()] for row in rows])


@pytest.mark.parametrize(
    ("name", "column"),
    [("shifts", c) for c in ("baseline_test_id", "measured_db", "correction_db", "value_db", "bound", "met")]
    + [("events", c) for c in ("outcome", "deciding_test_id", "mean_hl_db", "recordable", "notify_by", "record_by")]
    + [("baselines", c) for c in ("in_force_until", "status", "test_id")]
    + [("worklist", c) for c in WORKLIST_COLUMNS],
)
def test_comparison_sees_one_wrong_cell(name: str, column: str, tmp_path: Path) -> None:
    cohort = hostile_cohort(1, 20, COMBINATIONS[1])
    result = review(cohort.persons, cohort.accepted, cohort.settings)
    write_review(result, tmp_path)
    assert compare_folder(result, tmp_path) == []
    path = tmp_path / f"{name}.csv"
    with path.open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream))
    rows[len(rows) // 2][column] += "1"
    with path.open("w", encoding="utf-8", newline="") as stream:
        writer = csv.DictWriter(stream, list(rows[0]))
        writer.writeheader()
        writer.writerows(rows)
    assert compare_folder(result, tmp_path) != []


@pytest.mark.parametrize("name", ["shifts", "events", "baselines", "worklist"])
def test_comparison_sees_a_lost_row_and_a_wrong_order(name: str, tmp_path: Path) -> None:
    cohort = hostile_cohort(2, 20, COMBINATIONS[0])
    result = review(cohort.persons, cohort.accepted, cohort.settings)
    write_review(result, tmp_path)
    path = tmp_path / f"{name}.csv"
    lines = path.read_text(encoding="utf-8").splitlines(keepends=True)
    path.write_text("".join(lines[:2] + lines[3:]), encoding="utf-8")
    assert compare_folder(result, tmp_path) != []
    path.write_text("".join([lines[0], *reversed(lines[1:])]), encoding="utf-8")
    assert compare_folder(result, tmp_path) != []
