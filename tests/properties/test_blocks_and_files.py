"""How the work is cut and who does it changes no byte of the files; and no row of a file is lost."""

import datetime
import json
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from audiokit.io.cohort import read_cohort
from audiokit.model.cohort import Cohort
from audiokit.reports import folder, shifts
from audiokit.reports.folder import write_review
from audiokit.surveillance import mechanics
from audiokit.surveillance.review import review
from tests.oracle.cohort_files import write_cohort
from tests.oracle.hostile import COMBINATIONS, hostile_cohort
from tests.properties.invented import Invented, cohorts, few
from tests.surveillance.small_cohorts import write_rows


def files_of(cohort: Cohort, out: Path) -> dict[str, bytes]:
    write_review(review(cohort), out)
    return {path.name: path.read_bytes() for path in out.iterdir()}


@pytest.fixture(scope="module", params=[(3, COMBINATIONS[0]), (4, COMBINATIONS[6])], ids=["reviewed", "automatic"])
def hostile(request, tmp_path_factory) -> tuple[Cohort, dict[str, bytes]]:
    """A cohort full of trouble, and the files of its review."""
    seed, combination = request.param
    place = tmp_path_factory.mktemp("hostile")
    write_cohort(hostile_cohort(seed, 60, combination), place / "cohort")
    cohort = read_cohort(place / "cohort")
    made = files_of(cohort, place / "out")
    assert len(made["shifts.csv"].splitlines()) > 200 and len(made) == 8
    return cohort, made


@pytest.mark.parametrize("tests", [1, 2, 13, 100])
def test_size_of_blocks(hostile, tmp_path, monkeypatch, tests) -> None:
    cohort, expected = hostile
    monkeypatch.setattr(mechanics, "BLOCK_TESTS", tests)
    monkeypatch.setattr(shifts, "BLOCK_TESTS", tests)
    assert files_of(cohort, tmp_path / "out") == expected


@pytest.mark.parametrize("workers", [1, 5])
def test_number_of_threads(hostile, tmp_path, monkeypatch, workers) -> None:
    cohort, expected = hostile
    started = []
    for module in (mechanics, folder):
        pool = module.ThreadPoolExecutor
        monkeypatch.setattr(
            module, "ThreadPoolExecutor", lambda max_workers, pool=pool: started.append(workers) or pool(workers)
        )
        monkeypatch.setattr(module, "BLOCK_TESTS", 13, raising=False)
    monkeypatch.setattr(shifts, "BLOCK_TESTS", 13)
    assert files_of(cohort, tmp_path / "out") == expected
    assert len(started) >= 2


def test_the_same_again(hostile, tmp_path) -> None:
    """Read anew and written over the old files, every byte is the same."""
    cohort, expected = hostile
    for _ in range(2):
        assert files_of(read_cohort(cohort.folder), tmp_path / "out") == expected


JUNK = ("x", "999", "-21", "121", "7.55", "NR@", "1e3", "ten", "NR@130")


@few
@given(data=st.data(), cohort=cohorts(people=3, decided=False))
def test_every_row_is_accepted_or_in_quarantine(tmp_path_factory, data: st.DataObject, cohort: Invented) -> None:
    """rows_read = accepted + quarantined, file by file; a row with a problem takes part in nothing."""
    rows = [dict(row) for row in cohort.tests]
    expected = set()
    for number in data.draw(st.sets(st.integers(0, len(rows) - 1), max_size=3)):
        column = data.draw(st.sampled_from(("right_2000", "left_500", "tested_on", "purpose", "person_id", "valid")))
        rows[number][column] = data.draw(st.sampled_from(JUNK))
        expected.add(number + 2)
    if data.draw(st.booleans()):
        rows.append(dict(rows[0]))
        expected.add(len(rows) + 1)
    place = tmp_path_factory.mktemp("cohort")
    source = Invented(cohort.people, rows, {}).write(place / "in")
    write_rows(source / "people.csv", cohort.people)
    read = read_cohort(source, as_of=datetime.date(2030, 1, 1))
    counts = {entry.file: entry for entry in read.intake}
    for file, written in (("people.csv", len(cohort.people)), ("tests.csv", len(rows))):
        assert counts[file].rows_read == written == counts[file].accepted + counts[file].quarantined
        rejected = read.quarantine[read.quarantine["file"] == file]
        assert rejected["row"].nunique() == counts[file].quarantined
    assert set(read.quarantine["row"].astype(int)) == expected
    assert len(read.grid) == counts["tests.csv"].accepted
    made = files_of(read, place / "out")
    intake = json.loads(made["intake.json"])["files"]
    assert {file: entry["accepted"] + entry["quarantined"] for file, entry in intake.items()} == {
        file: entry["rows_read"] for file, entry in intake.items()
    }
