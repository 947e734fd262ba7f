"""A mean shift of exactly 10 dB meets sts however the levels are written; 29/3 does not (29 CFR 1910.95(g)(10))."""

import io

import openpyxl
import pandas as pd
import pytest

from audiokit.io.cohort import read_cohort
from audiokit.surveillance.review import review
from tests.surveillance.small_cohorts import FREQUENCIES_HZ, STS, hearing_test, reviewed, tables_of, write_cohort

# Baseline and current cells at 2, 3, 4 kHz; measured shift in thirds of a dB as tenths; bound; met. By hand.
WRITTEN = [
    (("5", "5", "5"), ("15", "15", "15"), "10", "exact", "yes"),
    (("5.0", "5.00", "5"), ("15.0", "15.00", "15"), "10", "exact", "yes"),
    (("7.5", "7.5", "7.5"), ("17.5", "17.5", "17.5"), "10", "exact", "yes"),
    (("0.1", "0.2", "0.3"), ("10.2", "10.1", "10.3"), "10", "exact", "yes"),
    (("0.1", "0.1", "0.1"), ("10.1", "10.1", "10.1"), "10", "exact", "yes"),
    (("-10", "-5", "-7.5"), ("0", "5", "2.5"), "10", "exact", "yes"),
    (("10", "15", "15"), ("20", "25", "25"), "10", "exact", "yes"),
    (("15", "15", "10"), ("15", "25", "30"), "10", "exact", "yes"),
    (("5", "5", "80"), ("15", "15", "NR@90"), "10", "at_least", "yes"),
    (("5", "5", "80"), ("15", "15", ">90"), "10", "at_least", "yes"),
    (("5", "5", "80"), ("15", "15", "90+"), "10", "at_least", "yes"),
    (("5", "5", "90"), ("15", "15", "NR"), "10", "at_least", "yes"),
    (("5", "5", "80"), ("15", "14", "NR@90"), "9.6667", "at_least", "unknown"),
    (("5", "5", "NR@80"), ("15", "15", "90"), "10", "at_most", "unknown"),
    (("5", "5", "NR@80"), ("15", "14.9", "90"), "9.9667", "at_most", "no"),
    (("5", "5", "NR@80"), ("15", "15", "NR@90"), "", "none", "unknown"),
    (("5", "5", "5"), ("15", "15", "14"), "9.6667", "exact", "no"),
    (("5", "5", "5"), ("15", "15", "14.9"), "9.9667", "exact", "no"),
    (("0.1", "0.1", "0.1"), ("10.1", "10.1", "10.0"), "9.9667", "exact", "no"),
    (("5", "5", "5"), ("15", "15", "15.1"), "10.0333", "exact", "yes"),
    (("5", "5", "5"), ("15", "15", "DNT"), "", "none", "unknown"),
]


def test_csv(tmp_path) -> None:
    rows = []
    for n, (baseline, current, *_) in enumerate(WRITTEN):
        rows.append(hearing_test(f"{n:02} base", "2020-01-01", baseline, baseline, "baseline", f"{n:02}"))
        rows.append(hearing_test(f"{n:02} now", "2021-01-01", current, current, "annual", f"{n:02}"))
    tables = reviewed(write_cohort(tmp_path, rows))
    for ear in ("right", "left"):
        found = tables.find("shifts", criterion=STS, ear=ear)
        shown = [(f"{row['measured_db']:g}" if row["measured_db"] != "" else "", row["bound"]) for row in found]
        assert shown == [(f"{float(m):g}" if m else "", bound) for _, _, m, bound, _ in WRITTEN]
        assert [row["met"] for row in found] == [met for *_, met in WRITTEN]
        assert [row["value_db"] for row in found] == [row["measured_db"] for row in found]


TYPES = {
    "int64": lambda value: int(value),
    "float64": float,
    "float32": float,
    "string": str,
    "Int16": lambda value: int(value),
}


def _frame(make, dtype: str, last: object) -> pd.DataFrame:
    frame = pd.DataFrame({"person_id": ["P", "P"], "test_id": ["A", "B"], "tested_on": ["2020-01-01", "2021-01-01"]})
    for ear in ("right", "left"):
        for hz in FREQUENCIES_HZ:
            levels = [make(5), make(15 if hz != 4000 else last)]
            frame[f"{ear}_{hz}"] = pd.array(levels, dtype=dtype) if dtype else levels
    return frame


@pytest.mark.parametrize("dtype", TYPES)
def test_parquet_of_every_type(tmp_path, dtype) -> None:
    for last, met in ((15, "yes"), (14, "no")):
        folder = write_cohort(tmp_path / str(last), [hearing_test("A", "2020-01-01", 0)])
        (folder / "tests.csv").unlink()
        _frame(TYPES[dtype], dtype, last).to_parquet(folder / "tests.parquet", index=False)
        found = reviewed(folder)
        assert (found.met(), found.met(ear="left")) == ({"B": met}, {"B": met})
        assert found.one("shifts", criterion=STS, ear="left")["measured_db"] == (10 if met == "yes" else 9.6667)


def test_parquet_of_tenths(tmp_path) -> None:
    """Floats of one decimal are read as what they were written for."""
    folder = write_cohort(tmp_path, [hearing_test("A", "2020-01-01", 0)])
    (folder / "tests.csv").unlink()
    frame = _frame(float, "float64", 15)
    for ear in ("right", "left"):
        for hz in FREQUENCIES_HZ:
            frame[f"{ear}_{hz}"] = [0.1, 10.1]
    frame.to_parquet(folder / "tests.parquet", index=False)
    assert reviewed(folder).met() == {"B": "yes"}


@pytest.mark.parametrize("make", [int, float, str, lambda value: f"{value}.0"], ids=["int", "float", "text", "text.0"])
def test_xlsx(tmp_path, make) -> None:
    for last, met in ((15, "yes"), (14, "no")):
        folder = write_cohort(tmp_path / str(last), [hearing_test("A", "2020-01-01", 0)])
        (folder / "tests.csv").unlink()
        book = openpyxl.Workbook()
        frame = _frame(make, "", last).astype(object)
        for row in (list(frame.columns), *frame.to_numpy().tolist()):
            book.active.append(row)
        data = io.BytesIO()
        book.save(data)
        (folder / "tests.xlsx").write_bytes(data.getvalue())
        assert reviewed(folder).met() == {"B": met}


def test_long_file(tmp_path) -> None:
    folder = write_cohort(tmp_path, [hearing_test("A", "2020-01-01", 0)])
    lines = ["person_id,test_id,tested_on,ear,frequency_hz,threshold"]
    for test, day, level in (("A", "2020-01-01", "7.5"), ("B", "2021-01-01", "17.50")):
        lines += [f"P,{test},{day},{ear},{hz},{level}" for ear in ("right", "left") for hz in FREQUENCIES_HZ]
    (folder / "tests.csv").write_text("\n".join(lines) + "\n")
    assert reviewed(folder).met() == {"B": "yes"}


def test_no_verdict_is_taken_from_a_float(tmp_path) -> None:
    """Every sum of tenths near the limit, in one go: yes from exactly 30.0 on."""
    sums = range(280, 321)
    rows = [hearing_test(f"{s} base", "2020-01-01", (0.1, 0.7, 1.3), 0, "baseline", f"{s}") for s in sums]
    for total in sums:
        first, second = total // 3 + 7, total // 5
        cells = [(a + b) / 10 for a, b in zip((1, 7, 13), (first, second, total - first - second), strict=True)]
        rows.append(
            hearing_test(f"{total} now", "2021-01-01", tuple(f"{cell:.1f}" for cell in cells), person=f"{total}")
        )
    folder = write_cohort(tmp_path, rows)
    tables = tables_of(review(read_cohort(folder)))
    found = {int(row["person_id"]): row for row in tables.find("shifts", criterion=STS, ear="right")}
    assert {total: found[total]["met"] for total in sums} == {total: "yes" if total >= 300 else "no" for total in sums}
    assert all(found[total]["measured_db"] == round(total / 30, 4) for total in sums)
