"""What is shown of a shift is what stands in shifts.csv: nothing left out, nothing worked out anew."""

import re

import numpy as np
import pandas as pd
import pytest

from audiokit.core.vocabulary import EARS, Response
from audiokit.surveillance.review import Review
from audiokit.widgets.arithmetic import clauses, difference
from audiokit.widgets.audiogram_svg import Cell
from audiokit.widgets.review_lookup import ReviewLookup

MEASURED, OPEN, ABSENT = Response.MEASURED, Response.NO_RESPONSE, Response.DID_NOT_TEST


def _bare(text: str) -> str:
    return re.sub(r"[;:\s]", "", text)


@pytest.fixture(scope="module")
def people_shown(example_review: Review) -> list[tuple[ReviewLookup, int]]:
    lookup = ReviewLookup(example_review)
    return [(lookup, row) for row in range(0, len(example_review.cohort.people), 9)]


def test_every_clause_of_why_has_its_line_and_none_is_lost(people_shown: list[tuple[ReviewLookup, int]]) -> None:
    seen = 0
    for lookup, row in people_shown:
        for line in lookup.shifts(row).to_dict("records"):
            clause = lookup.criteria()[line["criterion"]].shift_at_least_db.at
            parts = clauses(line["why"], clause, line["baseline_test_id"])
            assert _bare("".join(parts)) == _bare(line["why"])
            assert parts[0] == clause
            assert parts[2].startswith(f"less baseline {line['baseline_test_id']} of ")
            assert len(parts) >= 4
            seen += 1
    assert seen > 300


def test_an_id_that_holds_a_separator_is_not_cut() -> None:
    why = "29 CFR 1; x: sum 1=1 less baseline A; 7 of 2020-01-01 0=0; mean shift 1/1 = 1 dB, below 10: no"
    assert clauses(why, "29 CFR 1; x", "A; 7") == [
        "29 CFR 1; x",
        "sum 1=1",
        "less baseline A; 7 of 2020-01-01 0=0",
        "mean shift 1/1 = 1 dB, below 10: no",
    ]


@pytest.mark.parametrize(
    ("current", "baseline", "shown"),
    [
        (Cell(1000, 250, MEASURED), Cell(1000, 100, MEASURED), "+15"),
        (Cell(1000, 100, MEASURED), Cell(1000, 125, MEASURED), "−2.5"),
        (Cell(1000, 100, MEASURED), Cell(1000, 100, MEASURED), "0"),
        (Cell(1000, 900, OPEN), Cell(1000, 700, MEASURED), "≥ +20"),
        (Cell(1000, 700, MEASURED), Cell(1000, 900, OPEN), "≤ −20"),
        (Cell(1000, 900, OPEN), Cell(1000, 900, OPEN), "?"),
        (Cell(1000, 0, ABSENT), Cell(1000, 100, MEASURED), "?"),
        (Cell(1000, 100, MEASURED), Cell(1000, 0, Response.NOT_RECORDED), "?"),
    ],
)
def test_differences_at_one_frequency(current: Cell, baseline: Cell, shown: str) -> None:
    """Interval arithmetic: [current.lo - baseline.hi, current.hi - baseline.lo]."""
    assert difference(current, baseline) == shown


def test_the_differences_shown_have_the_mean_that_the_review_found(
    people_shown: list[tuple[ReviewLookup, int]],
) -> None:
    """The cells come from the grid and the mean from the findings: they must tell one story."""
    checked = 0
    for lookup, row in people_shown:
        tests = {test.test_id: test for test in lookup.tests(row)}
        shifts = lookup.shifts(row)
        for line in shifts[shifts["bound"] == "exact"].to_dict("records"):
            hz = tuple(lookup.criteria()[line["criterion"]].frequencies_hz.value)
            now = lookup.cells(tests[line["test_id"]], line["ear"], hz)
            then = lookup.cells(tests[line["baseline_test_id"]], line["ear"], hz)
            shown = [float(difference(a, b).replace("−", "-")) for a, b in zip(now, then, strict=True)]
            assert np.isclose(sum(shown) / len(shown), line["measured_db"], atol=1e-4)
            checked += 1
    assert checked > 300


def test_a_persons_shifts_are_the_rows_of_the_whole_table(example_review: Review) -> None:
    from audiokit.reports.shifts import shifts_table
    from audiokit.reports.tables import to_frame

    lookup = ReviewLookup(example_review)
    whole = to_frame(shifts_table(example_review))
    for row in range(0, len(example_review.cohort.people), 40):
        person = example_review.cohort.people.person_id[row].as_py()
        expected = whole[whole["person_id"] == person].reset_index(drop=True)
        pd.testing.assert_frame_equal(lookup.shifts(row).reset_index(drop=True), expected, check_dtype=False)


def test_tests_of_a_person_are_those_of_the_cohort(example_review: Review) -> None:
    """Each test of the cohort's grid is listed once; those in the review's grid point to themselves there."""
    lookup = ReviewLookup(example_review)
    listed = [test for row in range(len(example_review.cohort.people)) for test in lookup.tests(row)]
    assert [test.test_id for test in listed] == example_review.cohort.grid.test_id.to_pylist()
    assert {test.standing for test in listed} == {"compared", "baseline", "left out", "earlier"} or {
        test.standing for test in listed
    } == {"compared", "baseline", "left out"}
    for test in listed:
        if test.at >= 0:
            assert example_review.grid.test_id[test.at].as_py() == test.test_id
            assert test.left_out == ""
        else:
            assert test.left_out


def test_cells_are_as_recorded(example_review: Review) -> None:
    grid, lookup = example_review.cohort.grid, ReviewLookup(example_review)
    for row in range(0, len(example_review.cohort.people), 25):
        for test in lookup.tests(row):
            for side, ear in enumerate(EARS):
                for cell in lookup.cells(test, ear, grid.frequencies_hz):
                    at = grid.frequencies_hz.index(cell.hz)
                    assert cell.response == grid.response[side, at, test.index]
                    if cell.drawn:
                        assert cell.tenths == grid.threshold[side, at, test.index]
