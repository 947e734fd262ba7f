"""quality.csv: which tests took no part, and where a test falls short of what 29 CFR 1910.95 asks."""

from audiokit.io.cohort import read_cohort
from audiokit.surveillance.review import review
from tests.surveillance.small_cohorts import decide, hearing_test, review_rows, write_cohort

ALL_HZ = {f"hz{hz}": 10 for hz in (500, 1000, 6000)}  # with 2, 3, 4 kHz the six of (h)(1)


def noted(tables, check: str) -> list[tuple[str, str, str, str]]:
    return [(row["test_id"], row["ear"], row["value"], row["limit"]) for row in tables.find("quality", check=check)]


def test_a_sound_cohort_has_no_notes(tmp_path) -> None:
    rows = [hearing_test("A", "2020-01-01", 10, purpose="baseline", **ALL_HZ, hours_since_noise=14)]
    rows.append(hearing_test("B", "2021-01-01", 10, **ALL_HZ, hours_since_noise=0))
    assert review_rows(tmp_path, rows).quality == []


def test_left_out_tests_are_listed_once_each(tmp_path) -> None:
    rows = [hearing_test(name, f"202{n}-01-01", 10, **ALL_HZ) for n, name in enumerate("ABCD")]
    rows[1]["valid"] = rows[3]["valid"] = "no"
    folder = write_cohort(tmp_path, rows)
    for test in "BCD":
        decide(folder, "invalidate_test", test)
    cohort = read_cohort(folder)
    found = review(cohort)
    assert found.left_out.tolist() == ["", "marked_invalid", "invalidated_by_decision", "marked_invalid"]
    assert len(found.grid) == 1 and found.summary()["tests_left_out"] == 3
    tables = review_rows(tmp_path / "b", rows, as_of="2022-06-01")
    assert noted(tables, "after_as_of") == [("D", "", "", "2022-06-01")]
    assert noted(tables, "marked_invalid") == [("B", "", "no", "")]


def test_second_baselines(tmp_path) -> None:
    """Compared as periodic tests; they revise nothing by themselves."""
    rows = [
        hearing_test("early", "2019-01-01", 0, **ALL_HZ),
        hearing_test("A", "2020-01-01", 0, purpose="baseline", **ALL_HZ),
        hearing_test("B", "2021-01-01", 20, purpose="baseline", **ALL_HZ),
        hearing_test("C", "2022-01-01", 20, **ALL_HZ),
    ]
    tables = review_rows(tmp_path, rows)
    assert noted(tables, "second_baseline") == [("B", "", "baseline", "")]
    assert tables.compared_with() == {"B": "A", "C": "A"}
    assert tables.met() == {"B": "yes", "C": "yes"}


def test_missing_frequencies(tmp_path) -> None:
    """29 CFR 1910.95(h)(1): 500 to 6000 Hz; a no response is a level, the states without one are not."""
    cells = {"right_500": "NR", "left_500": "DNT", "hz1000": 5, "right_6000": "CNT", "left_6000": ""}
    tables = review_rows(tmp_path, [hearing_test("A", "2020-01-01", ("", 5, 5), 5, **cells)])
    required = "500 1000 2000 3000 4000 6000"
    assert noted(tables, "missing_frequencies") == [
        ("A", "right", "2000 6000", required),
        ("A", "left", "500 6000", required),
    ]
    lacking = review_rows(tmp_path / "b", [hearing_test("A", "2020-01-01", 5)])
    assert {row[2] for row in noted(lacking, "missing_frequencies")} == {"500 1000 6000"}
    assert all("29 CFR 1910.95(h)(1)" in row["why"] for row in lacking.quality)


def test_noise_before_the_baseline(tmp_path) -> None:
    """29 CFR 1910.95(g)(5)(iii): 14 hours, for the baseline only; not recorded is not too short."""
    rows = [
        hearing_test(name, "2020-01-01", 5, person=name, **ALL_HZ) | {"hours_since_noise": hours}
        for name, hours in (("A", "13.9"), ("B", "14"), ("C", ""), ("D", "0"))
    ]
    rows.append(hearing_test("D2", "2021-01-01", 5, person="D", **ALL_HZ) | {"hours_since_noise": "1"})
    found = noted(review_rows(tmp_path, rows), "noise_before_baseline")
    assert found == [("A", "", "13.9", "14"), ("D", "", "0", "14")]


def test_rechecks(tmp_path) -> None:
    """A repeat at 1000 Hz that is off by more than 5 dB, either way; exactly 5 is not."""
    cells = [("20", "15"), ("20", "14.9"), ("20", "25"), ("20", "25.1"), ("NR", "20"), ("20", ""), ("20", "NR")]
    rows = []
    for number, (first, again) in enumerate(cells):
        test = hearing_test(f"T{number}", "2020-01-01", 5, person=f"T{number}", **ALL_HZ)
        rows.append(test | {"left_1000": first, "left_1000_recheck": again})
    tables = review_rows(tmp_path, rows)
    assert noted(tables, "recheck_1000_hz") == [("T1", "left", "-5.1", "5"), ("T3", "left", "5.1", "5")]
    assert tables.events == [], "a check of the test decides no verdict"


def test_order(tmp_path) -> None:
    rows = [
        hearing_test(f"{name}{year}", f"{year}-01-01", "CNT", "DNT", "baseline", name)
        for name in "BA"
        for year in (2022, 2020, 2021)
    ]
    keys = [(row["person_id"], row["tested_on"], row["ear"] == "left") for row in review_rows(tmp_path, rows).quality]
    assert keys == sorted(keys) and len(keys) == 6 * 2 + 4
