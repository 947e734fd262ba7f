"""Puts the example cohort together: draw, measure, fault, lay out, write, decide."""

import os
import shutil
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from audiokit.core.errors import OutOfScopeError, OutputError
from audiokit.example import faults
from audiokit.example.deciding import close_old_lines, record_decisions
from audiokit.example.layouts import (
    about,
    bottling_hall_csv,
    bottling_hall_table,
    cohort_toml,
    csv_bytes,
    print_hall_table,
    print_hall_workbook,
)
from audiokit.example.programme import Revisions, run_programme
from audiokit.example.scenario import DEFAULT_PEOPLE, DEFAULT_SEED, FEWEST_PEOPLE, MOST_PEOPLE, SITES
from audiokit.example.tables import constructed_people, constructed_tests, people_table, site_table
from audiokit.example.workforce import draw_workforce


@dataclass(frozen=True)
class Example:
    """What was made: its folder, and how many people and rows of tests the files hold, faulty ones included."""

    folder: Path
    people: int
    rows: dict[str, int]


def make_example(folder: Path | str, *, seed: int = DEFAULT_SEED, people: int = DEFAULT_PEOPLE) -> Example:
    """Write an invented cohort into a new or empty folder; the same seed and people give the same files, byte for byte.

    people : number of people, those constructed by hand for rare outcomes included (FEWEST_PEOPLE to MOST_PEOPLE)
    decisions.db holds the same decisions each time, but SQLite does not promise the same bytes.

    Raises: OutputError where the folder is a file, is not empty or cannot be written; OutOfScopeError for a seed below
    0 or a number of people outside the limits.
    """
    if not FEWEST_PEOPLE <= people <= MOST_PEOPLE:
        raise OutOfScopeError(f"{people} people cannot be made", f"ask for {FEWEST_PEOPLE} to {MOST_PEOPLE}")
    if seed < 0:
        raise OutOfScopeError(f"seed {seed} is below 0", "use a whole number from 0")
    place = Path(folder).resolve()
    _refuse_what_is_there(place)
    files, revisions, tests, rows = _build(seed, people)
    fresh = place.with_name(f".{place.name}.{os.getpid()}.part")
    try:
        fresh.mkdir(parents=True)
        for name, content in files.items():
            (fresh / name).write_bytes(content)
        record_decisions(fresh, revisions, tests)
        close_old_lines(fresh)
        _move(fresh, place)
    except OSError as error:
        mend = "check the rights and the room on the disk, or choose another folder"
        raise OutputError(f"{place} cannot be written: {error.strerror}", mend) from error
    finally:
        shutil.rmtree(fresh, ignore_errors=True)
    return Example(Path(folder), people, rows)


def _refuse_what_is_there(place: Path) -> None:
    try:
        if place.exists() and not place.is_dir():
            raise OutputError(f"{place} is a file", "name a new or empty folder")
        if place.is_dir() and any(place.iterdir()):
            raise OutputError(f"{place} is not empty; nothing was written", "name a new or empty folder")
    except OSError as error:
        raise OutputError(f"{place} cannot be read: {error.strerror}", "choose another folder") from error


def _move(fresh: Path, place: Path) -> None:
    """Give the finished folder its name; an empty folder that is there already is filled file by file."""
    if not place.exists():
        fresh.rename(place)
        return
    for file in sorted(fresh.iterdir()):
        file.rename(place / file.name)


def _build(seed: int, people: int) -> tuple[dict[str, bytes], Revisions, pd.DataFrame, dict[str, int]]:
    """Contents of all files by name, the reviewers' revisions, the sound tests by serial, and rows per tests file."""
    rng = np.random.default_rng(seed)
    constructed = constructed_people()
    workforce = draw_workforce(rng, people - len(constructed))
    tests, revisions = run_programme(rng, workforce)
    persons = people_table(rng, workforce)
    sawmill, print_hall, bottling_hall = (site_table(workforce, tests, site) for site in range(len(SITES)))
    spared = set(revisions.serial.tolist())
    sawmill_rows = _faulty_sawmill(rng, sawmill, spared)
    print_hall_rows = _faulty_print_hall(rng, print_hall_table(print_hall), spared)
    bottling_rows = _faulty_bottling_hall(rng, bottling_hall_table(bottling_hall), spared)
    undecided = np.setdiff1d(np.arange(len(persons)), revisions.person)
    persons_file = _faulty_people(rng, pd.concat([persons, constructed], ignore_index=True), undecided)
    files = {
        "people.csv": persons_file,
        "sawmill.csv": csv_bytes(sawmill_rows) + faults.SAWMILL_LAST_LINES.encode(),
        "print_hall.xlsx": print_hall_workbook(print_hall_rows),
        "bottling_hall.csv": bottling_hall_csv(bottling_rows),
        "cohort.toml": cohort_toml(),
        "about.md": about(seed, people),
    }
    rows = {"sawmill.csv": len(sawmill_rows), "print_hall.xlsx": len(print_hall_rows)}
    sound = pd.concat([sawmill, print_hall, bottling_hall])[["test_id", "person_id", "tested_on"]]
    return files, revisions, sound, rows | {"bottling_hall.csv": len(bottling_rows)}


def _faulty_sawmill(rng: np.random.Generator, drawn: pd.DataFrame, spared: set[int]) -> pd.DataFrame:
    whole = pd.concat([drawn, constructed_tests()])
    whole = whole.iloc[np.argsort(whole["tested_on"].to_numpy(dtype=str), kind="stable")]
    whole = faults.plant_cells(rng, whole, faults.SAWMILL, spared)
    whole = faults.repeat_rows(rng, whole, 3, spared)
    return faults.repeat_rows(rng, whole, 2, spared, column="right_4000")


def _faulty_print_hall(rng: np.random.Generator, table: pd.DataFrame, spared: set[int]) -> pd.DataFrame:
    table = faults.plant_cells(rng, table, faults.PRINT_HALL, spared)
    return faults.repeat_rows(rng, table, 2, spared)


def _faulty_bottling_hall(rng: np.random.Generator, table: pd.DataFrame, spared: set[int]) -> pd.DataFrame:
    table = faults.plant_cells(rng, table, faults.BOTTLING_HALL, spared)
    table = faults.repeat_rows(rng, table, 3, spared)
    return faults.repeat_rows(rng, table, 2, spared, column="threshold")


def _faulty_people(rng: np.random.Generator, persons: pd.DataFrame, undecided: NDArray[np.int64]) -> bytes:
    """One row twice, one of the people without decisions with two different rows, and rows that cannot be used."""
    twice, torn = rng.choice(undecided, size=2, replace=False)
    other = persons.iloc[[torn]].assign(job="job as the old list has it")
    whole = pd.concat([persons, persons.iloc[[twice]], other])
    extra = "".join(f"{line}\n" for line, _ in faults.PEOPLE)
    return csv_bytes(whole) + extra.encode()
