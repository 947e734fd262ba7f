"""Hand-made tests of one person, and how to find a row of their review."""

import datetime as dt

from tests.oracle.records import STS, HearingTest, Person, Review, Settings
from tests.oracle.scalar_review import review

FREQUENCIES = (2000, 3000, 4000)
LATE = dt.date(2030, 1, 1)
Levels = tuple[float, float, float]


def made_test(
    day: str, right: Levels, left: Levels | None = None, purpose: str = "annual", **others: float
) -> HearingTest:
    """A test named after its day; `others` are further frequencies of both ears, as hz500=10."""
    cells = {}
    for ear, levels in (("right", right), ("left", left or right)):
        for hz, level in zip(FREQUENCIES, levels, strict=True):
            cells[ear, hz] = str(level)
        for name, level in others.items():
            cells[ear, int(name.removeprefix("hz"))] = str(level)
    return HearingTest(day, "P", dt.date.fromisoformat(day[:10]), cells, purpose)


def run(tests: list[HearingTest], person: Person | None = None, **settings: object) -> Review:
    return review([person or Person("P")], tests, Settings(**({"as_of": LATE} | settings)))  # type: ignore[arg-type]


def row(rows: list[dict], **wanted: str) -> dict:
    """The only row that agrees with `wanted`."""
    found = [row for row in rows if all(row[column] == value for column, value in wanted.items())]
    assert len(found) == 1, found
    return found[0]


def outcomes(result: Review, criterion: str = STS) -> dict[tuple[str, str], str]:
    return {(e["test_id"], e["ear"]): e["outcome"] for e in result.events if e["criterion"] == criterion}
