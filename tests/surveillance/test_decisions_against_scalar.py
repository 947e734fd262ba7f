"""Random decisions on hostile cohorts, through `audiokit review` and through the scalar review: no cell may differ."""

import datetime as dt
import random
from collections import Counter
from pathlib import Path

import pytest

from audiokit.io.decisions import record_decision
from tests.oracle.cohort_files import write_cohort
from tests.oracle.compare import compare_folder, read_table, run_review
from tests.oracle.hostile import COMBINATIONS, HostileCohort, hostile_cohort
from tests.oracle.records import EARS
from tests.surveillance.scalar_decisions import KINDS, Decision, cases, decided_review
from tests.surveillance.small_cohorts import SIGNED

REVIEWED = [combination for combination in COMBINATIONS if combination[1] == "reviewed"]
CASES = [(101, REVIEWED[0]), (102, REVIEWED[1]), (103, REVIEWED[2]), (104, REVIEWED[3]), (105, COMBINATIONS[2])]
CASES += [(seed, REVIEWED[seed % 4]) for seed in range(106, 110)]


def decided(folder: Path, cohort: HostileCohort, seed: int) -> list[Decision]:
    """Record random decisions and undo some; returns those in force."""
    rng = random.Random(seed)
    made: list[Decision] = []
    kinds = [*sorted(KINDS), *["revise_baseline"] * 6, "refuse_baseline"]
    for person in cohort.persons:
        own = [test for test in cohort.accepted if test.person_id == person.person_id]
        for _ in range(rng.choice((0, 1, 2, 4)) if own else 0):
            test, other = rng.choice(own), rng.choice(own)
            effect = rng.choice((test.tested_on, other.tested_on)) + dt.timedelta(
                days=rng.choice((-1, 0, 0, 1, 20, 400))
            )
            kind = rng.choice(kinds)
            test_id = test.test_id if rng.random() < 0.95 else rng.choice(("nowhere", cohort.tests[0].test_id))
            ear = "" if kind == "invalidate_test" else rng.choice(EARS)
            if any((kind, test_id, ear) == (entry.kind, entry.test_id, entry.ear) for entry in made):
                continue  # said twice, it would make two rows with one key
            number = record_decision(
                folder,
                kind=kind,
                person_id=person.person_id,
                test_id=test_id,
                ear=ear or None,
                takes_effect_on=effect,
                **SIGNED,
            )
            made.append(Decision(number, kind, person.person_id, test_id, ear, effect))
    undone = {decision.number for decision in rng.sample(made, len(made) // 8)}
    for number in sorted(undone):
        record_decision(folder, kind="undo", undoes=number, **SIGNED)
    return [decision for decision in made if decision.number not in undone]


@pytest.mark.parametrize(("seed", "combination"), CASES)
def test_no_cell_differs(tmp_path, seed, combination) -> None:
    cohort = hostile_cohort(seed, 25, combination)
    write_cohort(cohort, tmp_path / "cohort")
    decisions = decided(tmp_path / "cohort", cohort, seed)
    expected, idle = decided_review(cohort, decisions)
    run_review(tmp_path / "cohort", tmp_path / "out")
    assert compare_folder(expected, tmp_path / "out") == []
    notes = read_table(tmp_path / "out" / "quality.csv")
    revisions = {decision.number for decision in decisions if decision.kind == "revise_baseline"}
    said = {int(row["value"]) for row in notes if row["check"] == "decision_without_effect"}
    assert said & revisions == idle


def test_the_cases_occur(tmp_path) -> None:
    """Random decisions that change nothing would test nothing; told by the scalar review alone."""
    seen: Counter[str] = Counter()
    for seed, combination in CASES[:4]:
        cohort = hostile_cohort(seed, 25, combination)
        (tmp_path / str(seed)).mkdir()
        seen.update(cases(cohort, decided(tmp_path / str(seed), cohort, seed)))
    for what in ("superseded", "proposed", "idle", "proposals fewer", "verdicts changed", "lines closed"):
        assert seen[what] > 0, what
    assert seen["decision"] > 25
