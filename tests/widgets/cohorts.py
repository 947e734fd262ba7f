"""Small cohorts written by hand, for what a panel must show of each kind of person. Nobody in them exists."""

import csv
from collections.abc import Mapping, Sequence
from pathlib import Path

FREQUENCIES = (500, 1000, 2000, 3000, 4000, 6000, 8000)
FLAT = dict.fromkeys(FREQUENCIES, "10")

ARABIC, CHINESE, MARKUP, HEBREW_TEST = "عامل-٧", "工人 七", '<b>x</b>&"y"', "בדיקה; 1"


def levels(right: Mapping[int, str] | None = None, left: Mapping[int, str] | None = None) -> dict[str, str]:
    """Cells of a wide row: 10 dB HL in both ears, and what is given instead."""
    ears = {"right": {**FLAT, **(right or {})}, "left": {**FLAT, **(left or {})}}
    return {f"{ear}_{hz}": level for ear, cells in ears.items() for hz, level in cells.items()}


def speech(level: str) -> dict[int, str]:
    """One level at 2000, 3000 and 4000 Hz."""
    return dict.fromkeys((2000, 3000, 4000), level)


def write(
    folder: Path, people: Sequence[Mapping[str, str]], tests: Sequence[Mapping[str, str]], toml: str = ""
) -> Path:
    """A cohort folder reviewed as of 2024-06-01."""
    folder.mkdir(parents=True)
    (folder / "cohort.toml").write_text(f'name = "by hand"\nas_of = 2024-06-01\n{toml}', encoding="utf-8")
    columns = ("person_id", "test_id", "tested_on", "purpose", "valid", *levels())
    _write(folder / "people.csv", ("person_id", "sex", "birth_date", "site", "job"), people)
    _write(folder / "tests.csv", columns, tests)
    return folder


def _write(path: Path, columns: Sequence[str], rows: Sequence[Mapping[str, str]]) -> None:
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, columns, restval="")
        writer.writeheader()
        writer.writerows(rows)


def person(person_id: str, **more: str) -> dict[str, str]:
    """A row of people.csv."""
    return {"person_id": person_id, "sex": "female", "birth_date": "1980-05-05", "site": "north", **more}


def test_row(person_id: str, test_id: str, day: str, purpose: str = "annual", **cells: str) -> dict[str, str]:
    """A row of tests.csv."""
    return {"person_id": person_id, "test_id": test_id, "tested_on": day, "purpose": purpose, **levels(), **cells}


test_row.__test__ = False  # type: ignore[attr-defined]


def mixed(folder: Path) -> Path:
    """Persons of every kind: exactly 10 dB, no responses, missing cells, no tests, names of other scripts."""
    people = [
        person("A1", site="north"),
        person("A2", site="south"),
        person("A3", site=""),
        person("A4", site="south", job="<i>sorter</i>"),
        person(ARABIC),
        person(CHINESE),
        person(MARKUP),
        person("NA"),
    ]
    silent = levels(dict.fromkeys(FREQUENCIES, "NR@90"), dict.fromkeys(FREQUENCIES, "NR@90"))
    tests = [
        test_row("A1", "A1-1", "2022-03-01", "baseline"),
        test_row("A1", "A1-2", "2023-03-01", **levels(right=speech("20"), left=speech("19.6"))),
        test_row("A1", "A1-3", "2024-05-20", **levels(right=speech("25"))),
        test_row("A1", "A1-4", "2024-07-01", **levels(right=speech("40"))),
        test_row("A2", "A2-1", "2022-03-01", "baseline", **silent),
        test_row("A2", "A2-2", "2023-03-01", **silent),
        test_row("A3", "A3-1", "2022-03-01", "baseline"),
        test_row("A3", "A3-2", "2023-03-01", **levels(right={3000: "DNT"}, left={4000: "CNT", 6000: ""})),
        test_row("A3", "A3-3", "2024-03-01", valid="no"),
        test_row(ARABIC, HEBREW_TEST, "2021-02-02", "baseline"),
        test_row(ARABIC, "ar-2", "2024-02-02", **levels(left=speech("30"))),
        test_row(CHINESE, "zh-0", "2020-02-02"),
        test_row(CHINESE, "zh-1", "2021-02-02", "baseline"),
        test_row(MARKUP, '<script>alert("t")</script>', "2021-02-02", "baseline"),
        test_row(MARKUP, "m-2", "2024-02-02", **levels(left=speech("30"))),
        test_row("NA", "null", "2021-02-02", "baseline"),
        test_row("NA", "n/a", "2024-02-02", **levels(left=speech("30"))),
        test_row("A1", "A1-9", "2023-09-01", **levels(right={500: "999"})),
        test_row("nobody", "n-1", "2023-09-01"),
    ]
    return write(folder, people, tests)
