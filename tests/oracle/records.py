"""Plain records that go into and come out of the scalar review."""

import datetime as dt
from dataclasses import dataclass, field

EARS = ("right", "left")
STS = "us-osha.sts"
RECORDABLE = "us-osha.recordable"


@dataclass(frozen=True)
class Person:
    """One row of people. With both `birth_date` and `birth_year` the date counts."""

    person_id: str
    sex: str = "unknown"
    birth_date: dt.date | None = None
    birth_year: int | None = None
    left_on: dt.date | None = None
    noise_since: dt.date | None = None


@dataclass(frozen=True)
class HearingTest:
    """One test. `cells` maps (ear, frequency in Hz) to the cell as written; a missing key is a blank cell.

    `clock` is None for a date without a time. Tests are given to the review in input order.
    """

    test_id: str
    person_id: str
    tested_on: dt.date
    cells: dict[tuple[str, int], str] = field(hash=False)
    purpose: str = ""
    valid: bool = True
    clock: dt.time | None = None

    @property
    def moment(self) -> dt.datetime:
        """Date and time; a date without a time is 00:00."""
        return dt.datetime.combine(self.tested_on, self.clock or dt.time(0, 0))


@dataclass(frozen=True)
class Settings:
    """The settings of a review that change its verdicts."""

    as_of: dt.date
    age_correction: bool = False
    baseline_revision: str = "reviewed"
    recording_baseline: str = "original"
    response_limits: dict[int, int] = field(default_factory=dict, hash=False)


@dataclass
class Review:
    """Rows of the output tables as dicts, in the order of the files (the worklist: any order). No column `why`."""

    shifts: list[dict] = field(default_factory=list)
    events: list[dict] = field(default_factory=list)
    baselines: list[dict] = field(default_factory=list)
    worklist: list[dict] = field(default_factory=list)
