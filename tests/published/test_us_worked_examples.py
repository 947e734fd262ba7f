"""Worked examples of 29 CFR 1910.95, 1904.10 and 49 CFR 227 Appendix C through `review`, value by value.

Sources and status stand in us_worked_examples.csv, what the tables mean in SOURCES.md.
"""

import contextlib
import csv
import io
from fractions import Fraction
from pathlib import Path

import pytest

from audiokit.cli.main import main
from audiokit.core.vocabulary import Sex
from audiokit.io.cohort import read_cohort
from audiokit.standards.age_tables import age_table
from audiokit.surveillance.review import review
from tests.reports.why_words import read_why
from tests.surveillance.small_cohorts import decide, tables_of, write_cohort

HERE = Path(__file__).parent
THIRDS = ("measured_db", "correction_db", "value_db", "mean_hl_db")
TOML = """name = "worked example"
as_of = 2030-01-01
age_correction = {age}
baseline_revision = "{revision}"
recording_baseline = "{recording}"
"""


def read_table(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


EXAMPLES = {row["id"]: row for row in read_table(HERE / "us_worked_examples.csv")}
TESTS = read_table(HERE / "us_worked_examples_tests.csv")
EXPECTED = read_table(HERE / "us_worked_examples_expected.csv")
CASES = list(dict.fromkeys((row["id"], row["settings"]) for row in EXPECTED))


def write_examples(folder: Path, examples: list[str], settings: str, prefix: str = "") -> Path:
    """A cohort folder with the people of some examples; `prefix` stands before their ids, {id} is the example's."""
    people, rows, decisions = {}, [], []
    for line in (dict(row) for row in TESTS if row["id"] in examples):
        example = EXAMPLES[line.pop("id")]
        before = prefix.format(id=example["id"])
        line |= {name: before + line[name] for name in ("person_id", "test_id")}
        ear = line.pop("becomes_baseline_of")
        if ear:
            decisions.append((line["test_id"], ear, line["tested_on"], line["person_id"]))
        people[line["person_id"]] = {name: example[name] for name in ("sex", "birth_date")}
        rows.append(line)
    text = TOML.format(
        age=str("age" in settings).lower(),
        revision="automatic" if "automatic" in settings else "reviewed",
        recording="in_force" if "in_force" in settings else "original",
    )
    write_cohort(folder, rows, [{"person_id": person} | who for person, who in people.items()], text)
    for test, ear, day, person in decisions:
        decide(folder, "revise_baseline", test, ear, on=day, person=person)
    return folder


def shown(column: str, row: dict[str, str]) -> str:
    """What a row shows: one of its cells, or a number of its `why`."""
    if column == "shift_2_3_4_khz":
        return " ".join(map(str, read_why(row["why"]).shifts()))
    if column == "level_answer":
        return str(read_why(row["why"]).level_answer)
    if column == "mean_level":
        if "met" not in row:  # baselines.csv
            return row["why"].partition("; mean hearing threshold level ")[2].split(" ")[2]
        sign, level = read_why(row["why"]).level or ("", "")
        return f"{level}" if sign == "=" else f"{sign}{level}"
    return row[column]


def same(column: str, expected: str, found: str) -> bool:
    if column in THIRDS or column == "mean_level":
        return Fraction(found) == round(Fraction(expected), 4)
    return found == expected


def test_every_example_has_source_status_tests_and_values() -> None:
    assert {row["id"] for row in TESTS} == set(EXAMPLES) == {row["id"] for row in EXPECTED}
    assert all(row["source"] and row["status"] for row in EXAMPLES.values())
    statuses = {row["status"].partition(" by hand")[0].partition(",")[0] for row in EXAMPLES.values()}
    assert statuses == {"printed", "printed inputs", "printed rule", "derived", "contested"}
    numbered = [f"P{n:02}" for n in (1, 2, 4, 5, 6, 7, 9)] + [f"D{n:02}" for n in (*range(1, 24), *range(27, 34))]
    assert list(EXAMPLES) == numbered


def differences(example: str, settings: str, tables: dict[str, list[dict[str, str]]], prefix: str = "") -> list[object]:
    """The expected values of an example that the tables do not show."""
    wrong: list[object] = []
    for line in (row for row in EXPECTED if (row["id"], row["settings"]) == (example, settings)):
        column, expected, table = line["column"], line["value"], line["table"]
        if table == "age table":
            found = [age_values(column, expected.count(" ") + 1)]
        else:
            keys = [key for key in ("person_id", "test_id", "ear", "criterion") if line[key]]
            if table == "baselines":
                keys.remove("criterion")
            wanted = {key: (prefix if key.endswith("_id") else "") + line[key] for key in keys}
            rows = [row for row in tables[table] if all(row[key] == wanted[key] for key in keys)]
            found = [str(len(rows))] if column == "rows" else [shown(column, row) for row in rows]
        if column in ("baseline_test_id", "deciding_test_id"):
            expected = prefix + expected
        if len(found) != 1 or not same(column, expected, found[0]):
            wrong.append((line, found))
    return wrong


def age_values(of: str, count: int) -> str:
    """Values of Appendix F for a sex and an age, at 2, 3, 4 kHz or, where five are wanted, at all its frequencies."""
    sex, age = of.split()
    table = age_table("us_29cfr1910_95_appendix_f")
    hertz = (1000, 2000, 3000, 4000, 6000) if count == 5 else (2000, 3000, 4000)
    return " ".join(str(table.values(Sex[sex.upper()], int(age), hz)) for hz in hertz)


@pytest.mark.parametrize(("example", "settings"), CASES, ids=lambda text: text or "plain")
def test_worked_example(tmp_path: Path, example: str, settings: str) -> None:
    """Each example alone, from its own folder."""
    cohort = read_cohort(write_examples(tmp_path, [example], settings))
    assert cohort.quarantine.empty
    found = tables_of(review(cohort))
    tables = {name: [texts(row) for row in getattr(found, name)] for name in ("shifts", "events", "baselines")}
    assert differences(example, settings, tables) == []


def texts(row: dict[str, object]) -> dict[str, str]:
    return {column: str(value) for column, value in row.items()}


@pytest.mark.parametrize("settings", ["", "age"], ids=["plain", "age"])
def test_all_together_through_the_command(tmp_path: Path, settings: str) -> None:
    """All of them in one cohort, through `audiokit review` and its files: nobody's result depends on anybody else."""
    examples = [example for example, under in CASES if under == settings]
    cohort = write_examples(tmp_path / "cohort", examples, settings, prefix="{id}: ")
    with contextlib.redirect_stdout(io.StringIO()), contextlib.redirect_stderr(io.StringIO()):
        assert main(["review", str(cohort), "--out", str(tmp_path / "out")]) == 0
    assert read_table(tmp_path / "out" / "quarantine.csv") == []
    tables = {name: read_table(tmp_path / "out" / f"{name}.csv") for name in ("shifts", "events", "baselines")}
    for example in examples:
        assert differences(example, settings, tables, f"{example}: ") == []
