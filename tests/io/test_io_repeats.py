"""Finding repeated rows: hashes only ever narrow the search, the comparison itself is exact."""

import numpy as np
import pyarrow as pa
import pytest
from cohort_folders import problems, read, write
from hypothesis import given
from hypothesis import strategies as st

from audiokit.io import repeats
from audiokit.io.hashes import hash_texts, repeated

TEXTS = st.lists(st.one_of(st.text(max_size=12), st.text(alphabet="ab", min_size=60, max_size=70)), max_size=30)


@given(texts=TEXTS, skip=st.integers(0, 3))
def test_equal_texts_have_equal_hashes_and_others_do_not(texts, skip):
    array = pa.array(["pad"] * skip + texts, pa.string()).slice(skip)
    hashes = hash_texts(array).tolist()
    assert len(set(hashes)) == len(set(texts))
    assert len(set(zip(texts, hashes, strict=True))) == len(set(texts))
    assert hash_texts(pa.array(texts[::-1], pa.string())).tolist() == hashes[::-1]


def test_texts_of_similar_identifiers_differ():
    texts = pa.array([f"{letter}{i:07d}" for letter in "AB" for i in range(20_000)])
    assert len(np.unique(hash_texts(texts))) == 40_000


@given(numbers=st.lists(st.integers(-3, 8), max_size=20))
def test_repeated_numbers(numbers):
    assert repeated(np.array(numbers, np.int64)).tolist() == [numbers.count(n) > 1 for n in numbers]


@pytest.mark.parametrize("collide", [False, True])
def test_texts_that_share_a_hash_are_still_told_apart(tmp_path, monkeypatch, collide):
    if collide:
        monkeypatch.setattr(repeats, "hash_texts", lambda texts: np.zeros(len(texts), np.int64))
    rows = ["P1,2020-01-01,1,A", "P1,2020-01-02,1,B", "P1,2020-01-03,1,C", "P1,2020-01-04,1,A", "P1,2020-01-05,1,"]
    tests = "person_id,tested_on,right_1000,test_id\n" + "\n".join(rows) + "\n"
    cohort = read(write(tmp_path, tests_csv=tests))
    assert problems(cohort) == [[2, "test_id", "conflicting_key"], [5, "test_id", "conflicting_key"]]


def test_the_partner_of_a_conflict_is_named(tmp_path):
    rows = ["P1,2020-01-01,1,A", "P1,2020-01-01,1,A", "P1,2020-01-02,1,A", "P1,2020-01-02,1,A"]
    tests = "person_id,tested_on,right_1000,test_id\n" + "\n".join(rows) + "\n"
    frame = read(write(tmp_path, tests_csv=tests)).quarantine
    partners = (
        frame[frame["code"] == "conflicting_key"].set_index("row")["problem"].str.extract(r"in (tests.csv, row \d)")
    )
    assert partners[0].tolist() == [f"tests.csv, row {n}" for n in (4, 4, 2, 2)]
    firsts = frame[frame["code"] == "duplicate_row"].set_index("row")["problem"].str.extract(r"to (tests.csv, row \d)")
    assert firsts[0].to_dict() == {3: "tests.csv, row 2", 5: "tests.csv, row 4"}


def test_rows_written_alike_in_files_of_other_date_orders_are_no_repeats(tmp_path):
    tests = "person_id,tested_on,right_1000\nP1,03/04/2020,10\nP1,03/04/2020,20\n"
    toml = "".join(f'[[source]]\ntests = "{order}.csv"\ndate_order = "{order}"\n' for order in ("dmy", "mdy"))
    cohort = read(write(tmp_path, dmy_csv=tests, mdy_csv=tests, cohort_toml=toml))
    assert problems(cohort) == []
    assert sorted(cohort.grid.test_id.to_pylist()) == [
        "P1@2020-03-04", "P1@2020-03-04#2", "P1@2020-04-03", "P1@2020-04-03#2",
    ]  # fmt: skip
