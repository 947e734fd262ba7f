"""A cohort folder to a `Cohort`: settings, people, tests, decisions, and every row that could not be used."""

import datetime
from collections.abc import Callable, Sequence
from pathlib import Path

import numpy as np

from audiokit.io.assemble import assemble
from audiokit.io.batch import TestBatch
from audiokit.io.headings import map_people, map_tests
from audiokit.io.long import long_batch, read_long
from audiokit.io.people import read_people
from audiokit.io.quarantine import ProblemLog, join_quarantines
from audiokit.io.read_table import read_table
from audiokit.io.repeats import check_shared_test_ids
from audiokit.io.settings import SourceFile, override, read_plan
from audiokit.io.shared_columns import KnownPeople, read_shared_columns
from audiokit.io.source_table import SourceTable
from audiokit.io.wide import check_wide_repeats, read_wide_cells, wide_batch
from audiokit.model.cohort import Cohort, FileIntake
from audiokit.model.grid import ThresholdGrid

Progress = Callable[[str], None]


def _open(source: SourceFile, kind: str, progress: Progress) -> SourceTable:
    progress(f"reading {source.name}")
    raw = read_table(source)
    mapping = map_people if kind == "people" else map_tests
    mapped = mapping(raw, source.settings.columns, source.settings.columns_section)
    return SourceTable(raw, mapped, source.settings, ProblemLog(raw))


def _read_tests(tables: Sequence[SourceTable], known: KnownPeople) -> ThresholdGrid:
    shared = [read_shared_columns(table, known) for table in tables]
    first = np.concatenate(([0], np.cumsum([len(table) for table in tables]))).tolist()
    wide = [(i, s) for i, s in enumerate(shared) if not s.table.mapped.is_long]
    long = [(i, s) for i, s in enumerate(shared) if s.table.mapped.is_long]
    columns = [read_wide_cells(s) for _, s in wide]
    if wide:
        check_wide_repeats([s for _, s in wide])
    long_tests = read_long([s for _, s in long], [first[i] for i, _ in long]) if long else None
    if wide and long:
        check_shared_test_ids([s.table for _, s in wide], [s.table for _, s in long])
    batches: list[TestBatch] = [wide_batch(s, c, first[i]) for (i, s), c in zip(wide, columns, strict=True)]
    if long_tests is not None:
        batches.append(long_batch(long_tests))
    return assemble(batches, known.people)


def _intake(role: str, tables: Sequence[SourceTable]) -> list[FileIntake]:
    return [
        FileIntake(t.raw.file, role, t.log.rows_read, t.log.accepted, t.log.rows_read - t.log.accepted) for t in tables
    ]


def read_cohort(
    folder: str | Path,
    *,
    rulebooks: str | Sequence[str] | None = None,
    as_of: datetime.date | None = None,
    age_correction: bool | None = None,
    baseline_revision: str | None = None,
    recording_baseline: str | None = None,
    progress: Progress | None = None,
) -> Cohort:
    """Everything of a cohort folder, checked row by row.

    The arguments override cohort.toml; as_of is today where neither says. Tests after as_of are accepted and stay in
    the grid. Rows that cannot be used are in `quarantine`, one line per problem. `progress` is called with a few words
    at each step.

    Raises CohortError where the folder, its settings or one of its tables cannot be read; it names the file, and the
    mend.
    """
    from audiokit.io.decisions import read_decisions

    folder = Path(folder)
    tell = progress or (lambda words: None)
    plan = read_plan(folder)
    settings = override(
        plan.settings,
        rulebooks=rulebooks,
        as_of=as_of,
        age_correction=age_correction,
        baseline_revision=baseline_revision,
        recording_baseline=recording_baseline,
    )
    people_tables = [_open(source, "people", tell) for source in plan.people]
    people, rejected = read_people(people_tables)
    tests_tables = [_open(source, "tests", tell) for source in plan.tests]
    tell("checking the tests")
    grid = _read_tests(tests_tables, KnownPeople(people, rejected))
    tell("listing what could not be used")
    return Cohort(
        folder=folder,
        settings=settings,
        people=people,
        grid=grid,
        quarantine=join_quarantines([table.log.frame() for table in (*people_tables, *tests_tables)]),
        intake=(*_intake("people", people_tables), *_intake("tests", tests_tables)),
        decisions=read_decisions(folder),
    )
