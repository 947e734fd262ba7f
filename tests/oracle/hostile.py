"""Seeded random cohorts full of trouble. Everything in them is invented.

Levels are kept near the limits (shift 10 dB, level 25 dB HL, improvement 5 dB), dates near the windows (30 days, six
months, the day of the review), so that most people have events, retests and revisions.
"""

import datetime as dt
import random
from dataclasses import dataclass, field, replace

from tests.oracle import age_table
from tests.oracle.dates import add_months, age_on
from tests.oracle.hostile_cells import EarStory
from tests.oracle.records import EARS, HearingTest, Person, Settings

TRICKY_IDS = (
    *("10", "9", "007", "7", "1e3", "1.0", "1", "NA", "null", "nan", "None", "True", "a,b", 'say "x"', "a b"),
    *("Ä1", "ä-2", "é", "e\u0301", "Ω7", "佐藤-3", "أ-5", "Ж", "ß", "ss", "😀", "\uff21", "_", "~", "A", "a", "Z"),
    "#8",
)
TELLING_GAPS = (("months", 12), ("months", 6), ("months", 6), ("almost", 6))
FIRST_AGES = (16, 18, 19, 22, 40, 45, 50, 54, 57, 59, 61)
COMBINATIONS = [
    (age_correction, revision, recording)
    for age_correction in (False, True)
    for revision in ("reviewed", "automatic")
    for recording in ("original", "in_force")
]


@dataclass
class HostileCohort:
    """A cohort as written to files (`tests` in file order) and what of it a reader must reject."""

    persons: list[Person]
    tests: list[HearingTest]
    settings: Settings
    frequencies: list[int]
    sex_spelling: dict[str, str] = field(default_factory=dict)
    rejected: list[HearingTest] = field(default_factory=list)

    @property
    def accepted(self) -> list[HearingTest]:
        """Tests that take part, in file order."""
        turned_away = {id(test) for test in self.rejected}
        return [test for test in self.tests if id(test) not in turned_away]


def hostile_cohort(seed: int, people: int = 40, combination: tuple[bool, str, str] | None = None) -> HostileCohort:
    """A cohort of `people`; the same arguments give the same cohort. `combination` is one of COMBINATIONS."""
    rng = random.Random(seed)
    as_of = dt.date(2024, 1, 1) + dt.timedelta(days=rng.randrange(366))
    limits = (
        {}
        if rng.random() < 0.4
        else {hz: rng.choice((25, 40, 80, 95)) for hz in rng.sample((500, 2000, 4000, 8000), 3)}
    )
    age_correction, revision, recording = combination or COMBINATIONS[seed % len(COMBINATIONS)]
    settings = Settings(as_of, age_correction, revision, recording, limits)
    frequencies = [2000, 3000, 4000, *rng.sample((250, 500, 1000, 1500, 6000, 8000, 12500), rng.randint(0, 5))]
    cohort = HostileCohort([], [], settings, sorted(frequencies))
    test_ids = make_ids(rng, people * 40)
    for person_id in make_ids(rng, people):
        person, tests = make_person(rng, person_id, cohort, test_ids)
        cohort.persons.append(person)
        cohort.tests += tests
    add_rejected(rng, cohort, test_ids)
    order = rng.random()
    if order < 0.5:
        rng.shuffle(cohort.tests)
    elif order < 0.7:
        cohort.tests.reverse()
    add_duplicates(rng, cohort)
    rng.shuffle(cohort.persons)
    return cohort


def make_ids(rng: random.Random, count: int) -> list[str]:
    """Distinct ids in one of several styles, in a shuffled order, the tricky ones among them."""
    style = rng.randrange(4)
    tricky = rng.sample(TRICKY_IDS, min(len(TRICKY_IDS), max(1, count // 3)))
    plain = [str(number) for number in range(11, 11 + count)]
    if style == 1:
        plain = [f"P{number:04d}" for number in range(count)]
    if style == 2:
        plain = [f"{number * 7919 % 2147483647:x}" for number in range(count)]
    if style == 3:
        plain = [str(number) for number in range(11, 11 + count)]
    if style == 1:
        plain = [f"P{number:04d}" for number in range(count)]
    elif style == 2:
        plain = [f"{number * 7919 % 2147483647:x}" for number in range(count)]
    elif style == 3:
        plain = [f"{rng.choice(TRICKY_IDS)}/{number}" for number in range(count)]
    ids = list(dict.fromkeys(tricky + plain))[:count]
    rng.shuffle(ids)
    return ids


def make_person(
    rng: random.Random, person_id: str, cohort: HostileCohort, test_ids: list[str]
) -> tuple[Person, list[HearingTest]]:
    """One person and that person's tests in time order."""
    purposes, gaps = make_plan(rng)
    start = rng.choice((dt.date(2019, 8, 31), dt.date(2018, 3, 31), dt.date(2020, 2, 29), dt.date(2016, 6, 15)))
    start += dt.timedelta(days=rng.choice((0, 0, rng.randrange(700))))
    dates = lay_out(start, gaps)
    as_of = cohort.settings.as_of
    if purposes and rng.random() < 0.6:  # one test comes to lie at a telling distance from as_of
        anchor = rng.choice(dates[-3:])
        aim = as_of - dt.timedelta(days=rng.choice((-1, 0, 1, 5, 20, 21, 22, 29, 30, 31, 36, 37, 38, 365, 366)))
        start += aim - anchor
        dates = lay_out(start, gaps)
    person, spelling = make_identity(rng, person_id, start, as_of)
    cohort.sex_spelling[person_id] = spelling
    if purposes and rng.random() < 0.1:  # leaves on the very day that something is due, or beside it
        left_on = rng.choice(dates[-3:]) + dt.timedelta(days=rng.choice((7, 21, 37)) + rng.choice((0, 0, 1)))
        person = replace(person, left_on=left_on)
    stories = {ear: EarStory(rng, cohort.frequencies) for ear in EARS}
    same_clock = rng.random() < 0.6
    tests: list[HearingTest] = []
    for day, purpose in zip(dates[: len(purposes)], purposes, strict=True):
        cells = {}
        allowances = [allowance(person, earlier.tested_on, day) for earlier in tests]
        for ear in EARS:
            for frequency, text in stories[ear].next_cells(allowances, purpose in ("retest", "")).items():
                cells[ear, frequency] = text
        if tests and rng.random() < (0.1 if purpose == "retest" else 0.01):  # nothing could be tested
            cells = dict.fromkeys(cells, "CNT")
        clock = None if same_clock or rng.random() < 0.5 else dt.time(rng.randrange(24), rng.choice((0, 30)))
        valid = rng.random() > 0.05
        tests.append(HearingTest(test_ids.pop(), person_id, day, cells, purpose, valid, clock))
    return person, tests


def make_plan(rng: random.Random) -> tuple[list[str], list[tuple[str, int]]]:
    """Purposes of a person's tests, and the gap (unit, number) before each but the first."""
    count = rng.choice((0, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12, 25))
    purposes = [rng.choice(("baseline", "baseline", "annual", "", "other"))][:count]
    gaps: list[tuple[str, int]] = []
    while len(purposes) < count:
        gaps.append(rng.choice((*TELLING_GAPS, ("days", rng.randrange(500)))))
        purposes.append(rng.choice(("annual", "annual", "annual", "annual", "", "other", "exit", "baseline", "retest")))
        left = 30
        for _ in range(rng.choice((0, 0, 1, 1, 2, 3, 6))):
            days = rng.choice((0, 0, 1, 7, left, left + 1, rng.randrange(left + 2)))
            left = max(0, left - days)
            gaps.append(("days", days))
            purposes.append(rng.choice(("retest", "retest", "retest", "", "", "annual")))
    return purposes[:count], gaps[: max(0, count - 1)]


def lay_out(start: dt.date, gaps: list[tuple[str, int]]) -> list[dt.date]:
    """Dates of the tests from the first and the gaps."""
    dates = [start]
    for unit, number in gaps:
        if unit == "days":
            dates.append(dates[-1] + dt.timedelta(days=number))
        else:
            day_short = dt.timedelta(days=1 if unit == "almost" else 0)
            dates.append(add_months(dates[-1], number) - day_short)
    return dates


def make_identity(rng: random.Random, person_id: str, first: dt.date, as_of: dt.date) -> tuple[Person, str]:
    """A person of suitable age, and how the file spells the sex."""
    sex = rng.choice(("male", "male", "male", "female", "female", "unknown"))
    spelling = {"male": ("male", "M", "Male"), "female": ("female", "F", "FEMALE"), "unknown": ("unknown",)}[sex]
    born = dt.date(first.year - rng.choice(FIRST_AGES), first.month, min(first.day, 28))
    born += dt.timedelta(days=rng.choice((-1, 0, 1, rng.randrange(-200, 200))))
    if rng.random() < 0.1:
        born = dt.date(1964, 2, 29)
    known = rng.random()
    person = Person(
        person_id,
        sex,
        birth_date=born if known < 0.65 else None,
        birth_year=born.year if 0.55 < known < 0.9 else None,
        left_on=as_of - dt.timedelta(days=rng.choice((-40, -1, 0, 1, 2, 15, 30, 200))) if rng.random() < 0.2 else None,
        noise_since=rng.choice((None, dt.date(2023, 8, 31), add_months(as_of, -6), add_months(as_of, -7), as_of)),
    )
    return person, rng.choice(spelling)


def allowance(person: Person, then: dt.date, now: dt.date) -> int:
    """Sum over 2, 3 and 4 kHz of the age correction between two days, in dB; 0 when it cannot be known."""
    age_then, age_now = age_on(person, then), age_on(person, now)
    if age_then is None or age_now is None or person.sex == "unknown":
        return 0
    return int(3 * (age_table.mean_value(person.sex, age_now) - age_table.mean_value(person.sex, age_then)))


def add_rejected(rng: random.Random, cohort: HostileCohort, test_ids: list[str]) -> None:
    """Tests of nobody, and tests before birth."""
    for known in rng.sample(cohort.tests, min(2, len(cohort.tests))):
        stranger = replace(known, test_id=test_ids.pop(), person_id=f"nobody {rng.randrange(100)}")
        cohort.rejected.append(stranger)
    some_test = {test.person_id: test for test in cohort.tests}
    for person in cohort.persons:
        example = some_test.get(person.person_id)
        if person.birth_date is not None and example is not None and rng.random() < 0.1:
            unborn = person.birth_date - dt.timedelta(days=1)
            cohort.rejected.append(replace(example, test_id=test_ids.pop(), tested_on=unborn, purpose="baseline"))
    cohort.tests += cohort.rejected


def add_duplicates(rng: random.Random, cohort: HostileCohort) -> None:
    """Rows that repeat an earlier one in every field."""
    for test in rng.sample(cohort.tests, min(3, len(cohort.tests))):
        copy = replace(test)
        cohort.tests.append(copy)
        cohort.rejected.append(copy)
