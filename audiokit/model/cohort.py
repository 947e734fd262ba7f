"""What reading a cohort folder gives: settings, people, tests, and every row that could not be used."""

import datetime
from dataclasses import dataclass, field
from pathlib import Path

import pandas as pd

from audiokit.model.grid import People, ThresholdGrid

QUARANTINE_COLUMNS = ("file", "row", "column", "value", "code", "problem", "mend", "raw_json")


@dataclass(frozen=True)
class Settings:
    """The cohort's own settings, as cohort.toml and the command line give them; figures of the law are not here.

    as_of : the date the review speaks for; later tests are left out and counted
    """

    name: str
    as_of: datetime.date
    rulebooks: tuple[str, ...] = ("us-osha",)
    age_correction: bool = False
    baseline_revision: str = "reviewed"
    recording_baseline: str = "original"


@dataclass(frozen=True)
class FileIntake:
    """How many data rows of one file were read, accepted and quarantined; read = accepted + quarantined."""

    file: str
    role: str
    rows_read: int
    accepted: int
    quarantined: int


@dataclass(frozen=True)
class Cohort:
    """One cohort folder in memory.

    quarantine : one row per problem, columns QUARANTINE_COLUMNS, in order of file, row, column
    decisions  : the reviewers' entries in force, columns as `audiokit.io.decisions.read_decisions` gives them
    """

    folder: Path
    settings: Settings
    people: People
    grid: ThresholdGrid
    quarantine: pd.DataFrame
    intake: tuple[FileIntake, ...]
    decisions: pd.DataFrame = field(default_factory=pd.DataFrame)
