"""Writes a hostile cohort as a cohort folder: people.csv, the tests (wide, long, or wide in two files), cohort.toml."""

import csv
import random
from pathlib import Path

from tests.oracle.hostile import HostileCohort
from tests.oracle.records import EARS, HearingTest, Person

SETTINGS = """name = "hostile"
rulebook = "us-osha"
age_correction = {age_correction}
baseline_revision = "{baseline_revision}"
recording_baseline = "{recording_baseline}"
as_of = {as_of}
"""


def write_cohort(cohort: HostileCohort, folder: Path, layout: str = "wide") -> None:
    """Write the folder. `layout` is wide, long, or split: two files, listed against the order of their names."""
    folder.mkdir(parents=True, exist_ok=True)
    half = len(cohort.tests) // 2 if layout == "split" else len(cohort.tests)
    names = ["z first.csv", "a second.csv"] if 0 < half < len(cohort.tests) else ["tests.csv"]
    (folder / "cohort.toml").write_text(settings_text(cohort, names), encoding="utf-8")
    write_table(folder / "people.csv", [person_row(person, cohort) for person in cohort.persons])
    for name, tests in zip(names, (cohort.tests[:half], cohort.tests[half:]), strict=False):
        make_rows = long_rows if layout == "long" else wide_rows
        write_table(folder / name, [row for test in tests for row in make_rows(test, cohort)])


def settings_text(cohort: HostileCohort, names: list[str]) -> str:
    """Text of cohort.toml."""
    settings = cohort.settings
    text = SETTINGS.format(
        age_correction=str(settings.age_correction).lower(),
        baseline_revision=settings.baseline_revision,
        recording_baseline=settings.recording_baseline,
        as_of=settings.as_of.isoformat(),
    )
    if len(names) > 1:
        listed = ", ".join(f'"{name}"' for name in names)
        text += f"[files]\ntests = [{listed}]\n"
    if settings.response_limits:
        text += "[response_limits]\n" + "".join(f"{hz} = {db}\n" for hz, db in settings.response_limits.items())
    return text


def write_table(path: Path, rows: list[dict[str, str]]) -> None:
    with path.open("w", encoding="utf-8", newline="") as stream:
        writer = csv.DictWriter(stream, list(rows[0]))
        writer.writeheader()
        writer.writerows(rows)


def person_row(person: Person, cohort: HostileCohort) -> dict[str, str]:
    return {
        "person_id": person.person_id,
        "sex": cohort.sex_spelling.get(person.person_id, person.sex),
        "birth_date": str(person.birth_date or ""),
        "birth_year": str(person.birth_year or ""),
        "left_on": str(person.left_on or ""),
        "noise_since": str(person.noise_since or ""),
    }


def columns_of_test(test: HearingTest) -> dict[str, str]:
    style = random.Random(test.test_id)
    clock = "" if test.clock is None else test.clock.strftime(style.choice(("T%H:%M", " %H:%M", "T%H:%M:%S")))
    spelled = style.choice(("yes", "")) if test.valid else "no"
    return {
        "person_id": test.person_id,
        "test_id": test.test_id,
        "tested_on": f"{test.tested_on}{clock}",
        "purpose": test.purpose,
        "valid": spelled,
    }


def wide_rows(test: HearingTest, cohort: HostileCohort) -> list[dict[str, str]]:
    cells = {f"{ear}_{hz}": test.cells.get((ear, hz), "") for ear in EARS for hz in cohort.frequencies}
    return [columns_of_test(test) | cells]


def long_rows(test: HearingTest, cohort: HostileCohort) -> list[dict[str, str]]:
    """One row per threshold; a blank cell has a row only at the lowest frequency, so that no test is left out."""
    rows = []
    for ear in EARS:
        for hz in cohort.frequencies:
            text = test.cells.get((ear, hz), "")
            if text or hz == cohort.frequencies[0]:
                rows.append(columns_of_test(test) | {"ear": ear, "frequency_hz": str(hz), "threshold": text})
    return rows
