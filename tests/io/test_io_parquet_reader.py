"""Parquet files: types of every kind to the same texts as the other formats give."""

import datetime
import decimal
import io

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from audiokit.core.errors import CohortError
from audiokit.io.parquet_reader import read_parquet


def stored(**columns: pa.Array) -> bytes:
    data = io.BytesIO()
    pq.write_table(pa.table(columns), data, row_group_size=2)
    return data.getvalue()


MOMENT = datetime.datetime(2024, 1, 5, 8, 30, 0, 250000)
MIDNIGHT = datetime.datetime(2024, 1, 5)


@pytest.mark.parametrize(
    ("column", "texts"),
    [
        (pa.array([" a ", None, "b"]), [" a ", "", "b"]),
        (pa.array(["a", None, "b"]).cast(pa.large_string()), ["a", "", "b"]),
        (pa.array(["a", None, "a"]).dictionary_encode(), ["a", "", "a"]),
        (pa.array([15, None, -5], pa.int16()), ["15", "", "-5"]),
        (pa.array([2**63, None, 0], pa.uint64()), ["9223372036854775808", "", "0"]),
        (pa.array([15.0, None, float("nan")]), ["15", "", ""]),
        (pa.array([7.5, 1e-7, -0.0]), ["7.5", "0.0000001", "0"]),
        (pa.array([7.1, 15.0, None], pa.float32()), ["7.1", "15", ""]),
        (pa.array([1e300, float("inf"), 2.0**60]), ["1e+300", "inf", "1.152921504606847e+18"]),
        (pa.array([decimal.Decimal("15.50"), None, decimal.Decimal("100.00")]), ["15.5", "", "100"]),
        (pa.array([True, None, False]), ["yes", "", "no"]),
        (pa.array([MIDNIGHT.date(), None, MIDNIGHT.date()]), ["2024-01-05", "", "2024-01-05"]),
        (pa.array([MIDNIGHT.date()] * 3, pa.date64()), ["2024-01-05"] * 3),
        (pa.array([MOMENT, MIDNIGHT, None], pa.timestamp("us")), ["2024-01-05T08:30:00.25", "2024-01-05", ""]),
        (pa.array([MOMENT, MIDNIGHT, None], pa.timestamp("ns")), ["2024-01-05T08:30:00.25", "2024-01-05", ""]),
        (pa.array([MIDNIGHT] * 3, pa.timestamp("s")), ["2024-01-05"] * 3),
        (pa.array([MIDNIGHT] * 3, pa.timestamp("us", "UTC")), ["2024-01-05T00:00:00Z"] * 3),
        (
            pa.array([2**62, None, 0]).cast(pa.timestamp("us")),
            ["<value out of range: 4611686018427387904>", "", "1970-01-01"],
        ),
        (pa.nulls(3), ["", "", ""]),
    ],
)
def test_types_become_canonical_text(column, texts):
    raw = read_parquet(stored(a=column), "t.parquet")
    assert raw.encoded("a").texts(raw=True).to_pylist() == texts
    assert (
        read_parquet(stored(a=column), "t.parquet", all_different=["a"]).encoded("a").texts(raw=True).to_pylist()
        == texts
    )
    assert raw.rows.tolist() == [2, 3, 4]


def test_two_columns_of_the_same_name_are_refused():
    data = io.BytesIO()
    pq.write_table(pa.Table.from_arrays([pa.array([1])] * 3, names=["a", "b", "a"]), data)
    with pytest.raises(CohortError, match="columns 1 and 3 have the same heading 'a'"):
        read_parquet(data.getvalue(), "t.parquet")


def test_raw_texts_of_some_rows_are_the_same_before_and_after_encoding():
    raw = read_parquet(stored(a=pa.array([1.0, 2.5, None, 4.0])), "t.parquet")
    rows = np.array([3, 1])
    before = raw.raw_texts("a", rows).to_pylist()
    raw.encoded("a")
    assert before == raw.raw_texts("a", rows).to_pylist() == ["4", "2.5"]


@pytest.mark.parametrize(
    ("data", "words"),
    [
        (b"PAR1 and then nothing", "damaged"),
        (stored(a=pa.array(["x"] * 50))[:-20] + b"PAR1", "damaged"),
        (stored(a=pa.array([[1], [2]])), "column 'a' holds list"),
        (stored(a=pa.array([b"x"])), "column 'a' holds binary"),
        (stored(a=pa.array([b"x", b"\xff"]).view(pa.string())), "damaged"),
        (stored(a=pa.array([b"x", b"\xff"]).view(pa.string()).dictionary_encode()), "damaged"),
    ],
)
def test_damaged_nested_and_empty_files(data, words):
    with pytest.raises(CohortError, match=words) as error:
        read_parquet(data, "t.parquet")
    assert error.value.mend
