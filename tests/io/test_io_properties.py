"""What holds for any table: nothing is lost, formats agree, order does not matter, a plain reader agrees."""

import datetime
import shutil
from pathlib import Path

import pandas as pd
from cohort_folders import grid_rows, parquet, problems, read, workbook, write
from hypothesis import given, settings
from hypothesis import strategies as st

from audiokit.io.cohort import read_cohort

PEOPLE_IDS = ["P1", "P2", "P3", " P1", "", "=P", "p1", "9"]
DATES = ["2020-01-01", "2020-01-02", "2020-01-01T08:00", "2019-02-29", "01/02/2020", "", "1979-01-01"]
CELLS = ["10", "15.0", "NR", "NR@90", "90+", "DNT", "CNT", "", " ", "x", "15.25", "130", "-20"]
PURPOSES = ["", "baseline", "Annual", "retest", "nonsense"]
TEST_IDS = ["", "", "A", "B"]

people_rows = st.lists(
    st.tuples(st.sampled_from(PEOPLE_IDS), st.sampled_from(["f", "M", "", "x"]), st.sampled_from(["1980", "", "80"])),
    min_size=1, max_size=8,
)  # fmt: skip
wide_rows = st.lists(
    st.tuples(
        st.sampled_from(PEOPLE_IDS), st.sampled_from(DATES), st.sampled_from(PURPOSES), st.sampled_from(TEST_IDS),
        st.sampled_from(CELLS), st.sampled_from(CELLS),
    ),
    min_size=1, max_size=10,
)  # fmt: skip
long_rows = st.lists(
    st.tuples(
        st.sampled_from(PEOPLE_IDS), st.sampled_from(DATES), st.sampled_from(PURPOSES), st.sampled_from(TEST_IDS),
        st.sampled_from(["right", "L", "both", ""]), st.sampled_from(["500", "1000", "900"]), st.sampled_from(CELLS),
    ),
    min_size=1, max_size=12,
)  # fmt: skip
PEOPLE_HEAD = ["person_id", "sex", "birth_year"]
WIDE_HEAD = ["person_id", "tested_on", "purpose", "test_id", "right_1000", "left_500"]
LONG_HEAD = ["person_id", "tested_on", "purpose", "test_id", "ear", "frequency_hz", "threshold"]
GOOD_PEOPLE = "person_id,sex,birth_year\nP1,f,1980\nP2,m,1980\np1,f,1980\n9,m,\n"

quick = settings(max_examples=30, deadline=None)


def text(head: list[str], rows: list[tuple[str, ...]]) -> str:
    return "".join(",".join(row) + "\n" for row in [tuple(head), *rows])


def fresh(tmp: Path) -> Path:
    shutil.rmtree(tmp, ignore_errors=True)
    return tmp


@quick
@given(people=people_rows, wide=wide_rows, long=long_rows)
def test_every_row_is_accepted_or_quarantined(tmp_path_factory, people, wide, long):
    folder = write(
        fresh(tmp_path_factory.getbasetemp() / "counts"),
        people_csv=text(PEOPLE_HEAD, people),
        wide_csv=text(WIDE_HEAD, wide),
        long_csv=text(LONG_HEAD, long),
        cohort_toml='[files]\ntests = ["wide.csv", "long.csv"]\n',
    )
    cohort = read(folder)
    given = {"people.csv": len(people), "wide.csv": len(wide), "long.csv": len(long)}
    for intake in cohort.intake:
        bad = cohort.quarantine[cohort.quarantine["file"] == intake.file]
        assert intake.rows_read == given[intake.file] == intake.accepted + intake.quarantined
        assert intake.quarantined == bad["row"].nunique()
    by_file = {i.file: i for i in cohort.intake}
    assert len(cohort.people) == by_file["people.csv"].accepted
    grid = cohort.grid
    assert len(set(grid.test_id.to_pylist())) == len(grid)
    assert (grid.details["source_file"] == "wide.csv").sum() == by_file["wide.csv"].accepted
    from_long = (grid.details["source_file"] == "long.csv").to_numpy()
    assert from_long.sum() <= by_file["long.csv"].accepted
    assert grid.first[-1] == len(grid) and (grid.person[1:] >= grid.person[:-1]).all()


@quick
@given(rows=wide_rows)
def test_csv_xlsx_and_parquet_agree(tmp_path_factory, rows):
    base = tmp_path_factory.getbasetemp()
    rows = [row for row in rows if any(cell.strip() for cell in row)] or [("P1", "2020-01-01", "", "", "1", "2")]
    frame = pd.DataFrame(rows, columns=WIDE_HEAD)
    found = []
    for name, content in (
        ("tests_csv", text(WIDE_HEAD, rows)),
        ("tests_xlsx", workbook([WIDE_HEAD, *map(list, rows)])),
        ("tests_parquet", parquet(frame)),
    ):
        cohort = read(write(fresh(base / "formats"), people_csv=GOOD_PEOPLE, **{name: content}))
        found.append((grid_rows(cohort), problems(cohort, name.replace("_", "."))))
    assert found[0] == found[1] == found[2]


@quick
@given(rows=st.lists(
    st.tuples(st.sampled_from(["P1", "P2", "9"]), st.dates(datetime.date(1990, 1, 1), datetime.date(2020, 1, 1)),
              st.sampled_from([None, -5, 0, 15]), st.sampled_from([None, 7.5, 10.0, -0.5])),
    min_size=1, max_size=8, unique_by=lambda r: r[:2],
))  # fmt: skip
def test_numbers_and_dates_of_typed_files_agree_with_text(tmp_path_factory, rows):
    base = tmp_path_factory.getbasetemp()
    head = ["person_id", "tested_on", "right_1000", "left_500"]
    plain = [tuple("" if v is None else str(v) for v in row) for row in rows]
    frame = pd.DataFrame(rows, columns=head).astype({"right_1000": "Int16", "left_500": "float64"})
    found = []
    for name, content in (
        ("tests_csv", text(head, plain)),
        ("tests_xlsx", workbook([head, *map(list, rows)])),
        ("tests_parquet", parquet(frame)),
        ("tests_parquet", parquet(frame.assign(tested_on=pd.to_datetime(frame["tested_on"])))),
    ):
        cohort = read(write(fresh(base / "typed"), people_csv=GOOD_PEOPLE, **{name: content}))
        assert problems(cohort) == []
        found.append(grid_rows(cohort))
    assert found[0] == found[1] == found[2] == found[3]


@quick
@given(rows=wide_rows, people=people_rows, data=st.data())
def test_order_of_rows_and_people_does_not_matter(tmp_path_factory, rows, people, data):
    """Tests of one person at the very same time keep their order, so these are given apart."""
    base = tmp_path_factory.getbasetemp()
    rows = list({(row[0].strip(), row[1]): row for row in rows}.values())
    people = list({row[0].strip(): row for row in people}.values())
    first = read(write(fresh(base / "a"), people_csv=text(PEOPLE_HEAD, people), tests_csv=text(WIDE_HEAD, rows)))
    moved = data.draw(st.permutations(rows))
    moved_people = data.draw(st.permutations(people))
    second = read(
        write(fresh(base / "b"), people_csv=text(PEOPLE_HEAD, moved_people), tests_csv=text(WIDE_HEAD, moved))
    )
    assert grid_rows(first) == grid_rows(second)
    assert first.people.table.equals(second.people.table)
    assert sorted(c for _, _, c in problems(first)) == sorted(c for _, _, c in problems(second))


def _plain_problems(rows: list[tuple[str, ...]]) -> list[list[object]]:
    """The same checks of repeated rows and shared test ids, row by row."""
    known = {"P1", "P2", "p1", "9"}
    born = {"P1": 1980, "P2": 1980, "p1": 1980}
    stripped = [tuple(cell.strip() for cell in row) for row in rows]
    found: list[list[object]] = []
    for number, row in enumerate(stripped):
        line = number + 2
        person, date, purpose, test_id, right, left = row
        if not any(row):
            found.append([line, "", "blank_row"])
            continue
        if row in stripped[:number]:
            found.append([line, "", "duplicate_row"])
        if not person:
            found.append([line, "person_id", "missing_person_id"])
        elif person.startswith("="):
            found.append([line, "person_id", "formula_like_id"])
        elif person not in known:
            found.append([line, "person_id", "unknown_person"])
        if not date:
            found.append([line, "tested_on", "missing_date"])
        elif "/" in date:
            found.append([line, "tested_on", "unreadable_date"])
        elif date == "2019-02-29":
            found.append([line, "tested_on", "impossible_date"])
        elif person in born and int(date[:4]) < born[person]:
            found.append([line, "tested_on", "before_birth"])
        if purpose == "nonsense":
            found.append([line, "purpose", "unknown_purpose"])
        if test_id and any(other[3] == test_id and other != row for other in stripped):
            found.append([line, "test_id", "conflicting_key"])
        faults = {"x": "unreadable_threshold", "15.25": "finer_than_tenth", "130": "out_of_range"}
        for name, cell in (("right_1000", right), ("left_500", left)):
            if cell in faults:
                found.append([line, name, faults[cell]])
    return found


@settings(max_examples=80, deadline=None)
@given(rows=wide_rows)
def test_problems_agree_with_a_plain_reader(tmp_path_factory, rows):
    folder = write(
        fresh(tmp_path_factory.getbasetemp() / "plain"), people_csv=GOOD_PEOPLE, tests_csv=text(WIDE_HEAD, rows)
    )
    assert problems(read(folder), "tests.csv") == _plain_problems(rows)


def test_the_same_files_read_twice_are_the_same(tmp_path):
    folder = write(tmp_path, people_csv=GOOD_PEOPLE, tests_csv=text(WIDE_HEAD, [("P1", "x", "", "", "y", "1")] * 3))
    first, second = read_cohort(folder), read_cohort(folder)
    assert first.quarantine.equals(second.quarantine) and grid_rows(first) == grid_rows(second)


def _plain_tests(rows: list[tuple[str, ...]]) -> dict[tuple[str, ...], dict[tuple[str, str], str]]:
    """Tests of a long table row by row: key -> cells that are accepted; tests without accepted rows are absent."""
    known = {"P1", "P2", "p1", "9"}
    found: dict[tuple[str, ...], dict[tuple[str, str], str]] = {}
    keyed: dict[tuple[str, ...], list[tuple[str, ...]]] = {}
    stripped = [tuple(cell.strip() for cell in row) for row in rows]
    moment = {"2020-01-01": "2020-01-01T00:00"}
    for person, date, purpose, test_id, ear, hz, cell in stripped:
        if person and date in [*DATES[:3], "1979-01-01"]:
            key = ("id", test_id) if test_id else (person, moment.get(date, date))
            keyed.setdefault(key, []).append((person, moment.get(date, date), purpose.lower(), ear, hz, cell, test_id))
    for key, members in keyed.items():
        if len({m[:2] for m in members}) > 1 or len({"?" if m[2] == "nonsense" else m[2] for m in members}) > 1:
            continue
        person, date, purpose = members[0][:3]
        if person not in known or purpose == "nonsense" or (date < "1980" and person != "9"):
            continue
        for ear, hz in {(m[3], m[4]) for m in members}:
            cells = {tuple(r) for r in stripped if _same_cell(r, key, ear, hz, moment)}
            cell = next(iter(cells))[-1]
            if len(cells) == 1 and ear in ("right", "L") and hz != "900" and cell not in ("x", "15.25", "130"):
                found.setdefault(key, {})[(ear, hz)] = cell
    return found


def _same_cell(row: tuple[str, ...], key: tuple[str, ...], ear: str, hz: str, moment: dict[str, str]) -> bool:
    own = ("id", row[3]) if row[3] else (row[0], moment.get(row[1], row[1]))
    return own == key and row[4:6] == (ear, hz) and row[1] in [*DATES[:3], "1979-01-01"] and bool(row[0])


@settings(max_examples=60, deadline=None)
@given(rows=long_rows)
def test_long_tests_agree_with_a_plain_reader(tmp_path_factory, rows):
    folder = write(
        fresh(tmp_path_factory.getbasetemp() / "long"), people_csv=GOOD_PEOPLE, tests_csv=text(LONG_HEAD, rows)
    )
    grid = read(folder).grid
    expected = _plain_tests(rows)
    assert len(grid) == len(expected)
    assert {key[1] for key in expected if key[0] == "id"} == {i for i in grid.test_id.to_pylist() if "@" not in i}
    level = {"10": 100, "15.0": 150, "NR": 1000, "NR@90": 900, "90+": 900, "-20": -200}
    wanted = sorted(
        (("right", "L").index(ear), int(hz), level.get(cell, 0))
        for cells in expected.values()
        for (ear, hz), cell in cells.items()
        if cell
    )
    recorded = [
        (ear, hz, int(grid.threshold[ear, f, t]))
        for ear in (0, 1)
        for f, hz in enumerate(grid.frequencies_hz)
        for t in range(len(grid))
        if grid.response[ear, f, t] != 4
    ]
    assert sorted(recorded) == wanted
