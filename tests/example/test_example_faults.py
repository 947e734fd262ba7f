"""Every fault planted into the example is found where it was planted, and nothing else is refused."""

from collections import Counter
from pathlib import Path

import pytest

from audiokit.core.problems import PROBLEMS
from audiokit.example import faults
from audiokit.io.cohort import read_cohort

FOLDER = Path(__file__).parents[2] / "example_cohort"
PLANTED = {
    "sawmill.csv": faults.SAWMILL,
    "print_hall.xlsx": faults.PRINT_HALL,
    "bottling_hall.csv": faults.BOTTLING_HALL,
}
REPEATS = {
    "people.csv": {"duplicate_row": 1, "conflicting_key": 2},
    "sawmill.csv": {"duplicate_row": 3, "conflicting_key": 4, "blank_row": 1, "ragged_row": 1},
    "print_hall.xlsx": {"duplicate_row": 2},
    "bottling_hall.csv": {"duplicate_row": 3, "conflicting_key": 4},
}
ROWS_OF_A_TEST = 14


@pytest.fixture(scope="module")
def cohort():
    return read_cohort(FOLDER)


@pytest.mark.parametrize("file", PLANTED)
def test_each_cell_fault_is_named_with_its_value(cohort, file):
    quarantine = cohort.quarantine[cohort.quarantine["file"] == file]
    # An apostrophe keeps a spreadsheet from taking a value for a formula.
    found = set(zip(quarantine["code"], quarantine["value"].str.removeprefix("'"), strict=True))
    for fault in PLANTED[file]:
        if fault.code and fault.code != "inconsistent_test":
            assert (fault.code, fault.text) in found, fault


def test_the_counts_are_those_planted(cohort):
    torn_person = cohort.quarantine.query("file == 'people.csv' and code == 'conflicting_key'")["raw_json"].iloc[0]
    for file in [*PLANTED, "people.csv"]:
        quarantine = cohort.quarantine[cohort.quarantine["file"] == file]
        expected = Counter(fault.code for fault in PLANTED.get(file, ()) if fault.code) + Counter(REPEATS[file])
        if file == "people.csv":
            expected += Counter(code for _, code in faults.PEOPLE)
        if expected.pop("inconsistent_test", 0):
            expected["inconsistent_test"] = ROWS_OF_A_TEST
        found = Counter(quarantine["code"])
        # Tests of the person whose two rows conflict are those of nobody.
        own = quarantine[(quarantine["code"] == "unknown_person") & ~quarantine["value"].str.endswith("8888")]
        assert all(f'"{value}"' in torn_person for value in own["value"])
        found["unknown_person"] -= len(own)
        assert +found == expected, file


def test_the_example_shows_every_kind_of_problem(cohort):
    assert set(cohort.quarantine["code"]) == set(PROBLEMS)


def test_rows_read_are_accepted_or_quarantined(cohort):
    for intake in cohort.intake:
        assert intake.rows_read == intake.accepted + intake.quarantined
        assert intake.accepted > 0.95 * intake.rows_read


def test_rows_with_odd_remarks_stay_usable(cohort):
    remarks = set(cohort.grid.details["remarks"])
    kept = {fault.text for fault in [*faults.SAWMILL, *faults.PRINT_HALL] if fault.column == "remarks"}
    assert kept <= remarks
    assert "naïve listener, explained twice" in remarks
