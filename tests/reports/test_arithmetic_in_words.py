"""The `why` of every shift recomputes its verdict: thresholds of the file, sums, means, limits and clauses."""

import csv
from fractions import Fraction
from pathlib import Path

import pytest

from audiokit.io.cohort import read_cohort
from audiokit.reports.folder import write_review
from audiokit.surveillance.review import review
from tests.oracle.cohort_files import write_cohort
from tests.oracle.hostile import COMBINATIONS, HostileCohort, hostile_cohort
from tests.oracle.intervals import read_cell
from tests.reports.why_words import Words, read_why

CLAUSES = {"us-osha.sts": "29 CFR 1910.95(g)(10)(i)", "us-osha.recordable": "29 CFR 1904.10(a), (b)(1)"}
FREQUENCIES_HZ = (2000, 3000, 4000)  # 29 CFR 1910.95(g)(10)(i)


@pytest.fixture(scope="module", params=[COMBINATIONS[0], COMBINATIONS[5]], ids=["plain", "age"])
def written(request, tmp_path_factory) -> tuple[HostileCohort, Path, list[dict[str, str]]]:
    """A hostile cohort, the folder of its review, and the rows of its shifts."""
    cohort = hostile_cohort(11, 60, request.param)
    place = tmp_path_factory.mktemp("words")
    write_cohort(cohort, place / "cohort")
    write_review(review(read_cohort(place / "cohort")), place / "out")
    rows = read_table(place / "out" / "shifts.csv")
    assert len(rows) > 400
    return cohort, place / "out", rows


def read_table(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def total(cells) -> tuple[Fraction, Fraction | None] | None:
    """Ends of the sum of cells; None where one has no interval."""
    if None in cells:
        return None
    low = sum((cell[0] for cell in cells), Fraction(0))
    return low, None if any(cell[1] is None for cell in cells) else sum((cell[1] for cell in cells), Fraction(0))


def shift_of(words: Words) -> tuple[Fraction | None, Fraction | None]:
    """Ends of the sum of shifts, None where open; both None where it cannot be computed."""
    now, base = total(words.now), total(words.base)
    if now is None or base is None:
        return None, None
    low = None if base[1] is None else now[0] - base[1]
    return low, None if now[1] is None else now[1] - base[0]


def test_thresholds_are_those_of_the_file(written) -> None:
    cohort, _, rows = written
    tests = {test.test_id: test for test in cohort.accepted}
    limits = cohort.settings.response_limits
    for row in rows:
        words = read_why(row["why"])
        assert (words.base_id, words.base_on) == (
            row["baseline_test_id"],
            tests[row["baseline_test_id"]].tested_on.isoformat(),
        )
        assert words.hertz == FREQUENCIES_HZ
        for test_id, said in ((row["test_id"], words.now), (row["baseline_test_id"], words.base)):
            cells = [read_cell(tests[test_id].cells.get((row["ear"], hz), ""), hz, limits) for hz in FREQUENCIES_HZ]
            assert said == [None if cell is None else (cell.low, cell.high) for cell in cells]


def test_sums_means_and_verdicts(written) -> None:
    _, _, rows = written
    seen = set()
    for row in rows:
        words = read_why(row["why"])
        assert words.clause == CLAUSES[row["criterion"]]
        for cells, said in ((words.now, words.now_sum), (words.base, words.base_sum)):
            ends = total(cells)
            assert said == (None if ends is None else ends[0])
        low, high = shift_of(words)
        correction = Fraction(words.ages[2]) if words.ages else Fraction(0)
        low, high = (None if end is None else (end - correction) / 3 for end in (low, high))
        answer = (
            "yes"
            if low is not None and low >= words.limit
            else "no"
            if high is not None and high < words.limit
            else "unknown"
        )
        assert (words.limit, words.answer) == (10, answer), row["why"]
        bound = {(True, True): "exact", (True, False): "at_least", (False, True): "at_most"}.get(
            (low is not None, high is not None), "none"
        )
        assert row["bound"] == bound
        shown = words.corrected or words.mean
        if bound != "none":
            assert shown is not None
            value = low if low is not None else high
            assert value is not None
            assert shown[0] == {"exact": "=", "at_least": ">=", "at_most": "<="}[bound]
            assert shown[1] == Fraction(row["value_db"]) == round(value, 4)
            assert Fraction(row["measured_db"]) == round(value + correction / 3, 4)
        if row["criterion"] == "us-osha.sts":
            assert row["met"] == words.answer
        seen.add((row["criterion"], bound, row["met"]))
    assert {("us-osha.sts", bound) for bound in ("exact", "at_least", "at_most", "none")} <= {key[:2] for key in seen}


def test_levels_and_the_two_conditions(written) -> None:
    """29 CFR 1904.10(a), (b)(2)(ii): the level is never age-corrected, and both conditions must hold."""
    _, _, rows = written
    rank = ("no", "unknown", "yes")
    seen = set()
    for row in rows:
        words = read_why(row["why"])
        if row["criterion"] == "us-osha.sts":
            assert words.level is words.level_answer is words.both is None
            continue
        ends = total(words.now)
        if ends is None:
            answer = "unknown"
            assert words.level is None
        else:
            answer = "yes" if ends[0] >= 75 else "no" if ends[1] is not None else "unknown"
            assert words.level == ("=" if ends[1] is not None else ">=", round(ends[0] / 3, 4))
        assert (words.level_limit, words.level_answer) == (25, answer)
        assert "29 CFR 1904.10(a), (b)(2)(ii)" in row["why"]
        assert words.both == row["met"] == min(words.answer, answer, key=rank.index)
        seen.add((words.answer, answer))
    assert len(seen) >= 6, "most of the combinations occur"


def test_age_corrections(written) -> None:
    cohort, _, rows = written
    said = 0
    for row in rows:
        words = read_why(row["why"])
        if not cohort.settings.age_correction:
            assert row["correction_db"] == "0" and words.ages is None and "age correction" not in row["why"]
        elif words.ages is None:
            assert row["correction_db"] == "0" and "no age correction (sex or birth not recorded)" in row["why"]
        else:
            now, then, years_sum, mean = words.ages
            assert now >= then and mean == round(Fraction(years_sum, 3), 4) == Fraction(row["correction_db"])
            assert "29 CFR 19" in row["why"].split("years (")[1]
            said += 1
    assert (said > 100) == cohort.settings.age_correction


def test_every_line_of_every_file_has_its_reason(written) -> None:
    """Clause, or what the file says; never an empty `why`."""
    _, out, _ = written
    for name in ("shifts", "events", "baselines", "worklist", "quality"):
        rows = read_table(out / f"{name}.csv")
        assert rows and all(row["why"].strip() == row["why"] != "" for row in rows)
        if name in ("events", "worklist"):
            assert all(
                "CFR" in row["why"] or "cannot be told" in row["why"] or "lacks a threshold" in row["why"]
                for row in rows
            )
    outcomes = {row["outcome"] for row in read_table(out / "events.csv")}
    assert len(outcomes) >= 4
    for row in read_table(out / "events.csv"):
        text = {
            "retest_open": "the window is open",
            "no_retest": "the shift stands",
            "confirmed": "confirmed",
            "not_confirmed": "not confirmed",
            "found_at_retest": "found at the retest",
        }[row["outcome"]]
        assert text in row["why"]
        assert row["test_id"] in row["why"] and row["deciding_test_id"] in row["why"]
