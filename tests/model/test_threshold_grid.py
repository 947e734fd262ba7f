"""The grid keeps what it is given: offsets, states apart from levels, and selections of tests."""

import numpy as np
import pandas as pd
import pyarrow as pa
import pytest

from audiokit.core.vocabulary import Response
from audiokit.model.grid import ThresholdGrid


@pytest.fixture
def grid() -> ThresholdGrid:
    """Four people with 2, 0, 1 and 3 tests at two frequencies."""
    rng = np.random.default_rng(5)
    return ThresholdGrid(
        person=np.array([0, 0, 2, 3, 3, 3], dtype=np.int32),
        first=np.array([0, 2, 2, 3, 6]),
        day=np.arange(6, dtype=np.int32) * 100,
        purpose=np.array([1, 2, 0, 1, 2, 3], dtype=np.int8),
        valid=np.array([True, False, True, True, True, False]),
        test_id=pa.array(list("abcdef")),
        frequencies_hz=(2000, 3000),
        threshold=rng.integers(-200, 1200, (2, 2, 6)).astype(np.int16),
        response=rng.integers(0, 5, (2, 2, 6)).astype(np.int8),
        details=pd.DataFrame({"tester": list("uvwxyz")}),
    )


def rows(grid: ThresholdGrid) -> list[tuple[object, ...]]:
    return [
        (
            int(grid.person[t]),
            int(grid.day[t]),
            int(grid.purpose[t]),
            bool(grid.valid[t]),
            grid.test_id[t].as_py(),
            grid.threshold[:, :, t].tolist(),
            grid.response[:, :, t].tolist(),
            grid.details["tester"].iloc[t],
        )
        for t in range(len(grid))
    ]


@pytest.mark.parametrize(
    "keep",
    [[1, 0, 1, 0, 1, 1], [1, 1, 0, 0, 0, 0], [0, 0, 0, 0, 0, 1], [0] * 6, [1] * 6],
    ids=lambda k: "".join(map(str, k)),
)
def test_take(grid: ThresholdGrid, keep: list[int]) -> None:
    mask = np.array(keep, dtype=bool)
    before = rows(grid)
    taken = grid.take(mask)
    assert rows(taken) == [row for row, kept in zip(before, keep, strict=True) if kept]
    assert len(taken) == sum(keep)
    assert len(taken.first) == len(grid.first), "all people stay"
    counts = np.diff(taken.first).tolist()
    assert counts == [sum(kept for kept, p in zip(keep, grid.person, strict=True) if p == who) for who in range(4)]
    assert taken.first[0] == 0 and taken.first[-1] == len(taken)
    assert (taken.threshold.dtype, taken.response.dtype, taken.first.dtype) == (np.int16, np.int8, np.int64)
    assert rows(grid) == before, "the whole is not changed"


def test_take_without_details(grid: ThresholdGrid) -> None:
    bare = ThresholdGrid(**{**vars(grid), "details": pd.DataFrame()})
    taken = bare.take(np.array([True, False] * 3))
    assert len(taken) == 3 and len(taken.details.columns) == 0


def test_a_level_is_there_where_it_was_measured_or_not_heard(grid: ThresholdGrid) -> None:
    states = grid.response.ravel().tolist()
    with_level = (Response.MEASURED, Response.NO_RESPONSE)
    assert grid.has_level().ravel().tolist() == [state in with_level for state in states]
    assert set(states) == set(map(int, Response)), "every state occurs here"
