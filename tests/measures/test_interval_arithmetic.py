"""Sums, ends and three-valued answers against fractions and infinities worked out one by one."""

import itertools
import math

import numpy as np
import pandas as pd
import pyarrow as pa
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from audiokit.core.vocabulary import Bound, Met, Response
from audiokit.measures.shifts import bound_of, interval_ends, three_valued
from audiokit.measures.sums import MISSING, OPEN, threshold_sums
from audiokit.model.grid import ThresholdGrid

HZ = (500, 2000, 3000, 4000)
Cell = tuple[int, int]  # tenths of a dB, code of Response


def grid_of(tests: list[tuple[list[Cell], list[Cell]]]) -> ThresholdGrid:
    """Tests of one person; each is the cells of the right ear, then of the left, at HZ."""
    cells = np.array(tests, dtype=np.int16).reshape(len(tests), 2, len(HZ), 2)
    count = len(tests)
    return ThresholdGrid(
        person=np.zeros(count, dtype=np.int32),
        first=np.array([0, count]),
        day=np.arange(count, dtype=np.int32),
        purpose=np.zeros(count, dtype=np.int8),
        valid=np.ones(count, dtype=bool),
        test_id=pa.array([str(n) for n in range(count)], type=pa.string()),
        frequencies_hz=HZ,
        threshold=np.ascontiguousarray(np.moveaxis(cells[..., 0], 0, -1)),
        response=np.ascontiguousarray(np.moveaxis(cells[..., 1], 0, -1)).astype(np.int8),
        details=pd.DataFrame(),
    )


def interval(cells: list[Cell]) -> tuple[float, float] | None:
    """Ends of the sum, by hand: a no response has no upper end, a cell without a level leaves no sum."""
    if any(response > Response.NO_RESPONSE for _, response in cells):
        return None
    low = sum(level for level, _ in cells)
    return low, math.inf if any(response == Response.NO_RESPONSE for _, response in cells) else low


CELLS = st.one_of(
    st.tuples(st.integers(-200, 1200), st.just(int(Response.MEASURED))),
    st.tuples(st.integers(-200, 1200), st.just(int(Response.NO_RESPONSE))),
    st.tuples(st.just(0), st.sampled_from([int(r) for r in Response if r > Response.NO_RESPONSE])),
)
EARS = st.lists(
    st.one_of(CELLS, st.tuples(st.integers(-5, 25).map(lambda n: n * 50), st.just(0))), min_size=4, max_size=4
)


@settings(deadline=None, max_examples=200)
@given(tests=st.lists(st.tuples(EARS, EARS), min_size=2, max_size=2), limit=st.sampled_from((300, 150, 299, 301, -150)))
def test_shifts_of_every_kind(tests, limit: int) -> None:
    """Base and current: shift = [current low less base high, current high less base low], in exact tenths."""
    sums = threshold_sums(grid_of(tests), HZ[1:])
    ends = interval_ends(sums)
    low = ends.low[:, 1] - ends.high[:, 0]
    high = ends.high[:, 1] - ends.low[:, 0]
    answers = three_valued(low, high, limit)
    bounds = bound_of(sums.flags[:, 1], sums.flags[:, 0])
    for ear in (0, 1):
        base, now = (interval(test[ear][1:]) for test in tests)
        if base is None or now is None:
            assert (answers[ear], bounds[ear]) == (Met.UNKNOWN, Bound.NONE)
            continue
        lower, upper = now[0] - base[1], now[1] - base[0]
        expected = Met.YES if lower >= limit else Met.NO if upper < limit else Met.UNKNOWN
        assert answers[ear] == expected
        kinds = {(False, False): Bound.EXACT, (True, False): Bound.AT_LEAST, (False, True): Bound.AT_MOST}
        assert bounds[ear] == kinds.get((math.isinf(now[1]), math.isinf(base[1])), Bound.NONE)


def test_sums_and_flags_by_hand() -> None:
    measured, silent, missing = (150, 0), (900, 1), (0, 3)
    sums = threshold_sums(
        grid_of(
            [
                ([measured] * 4, [missing, *[measured] * 3]),
                ([measured, measured, silent, measured], [measured, missing, silent, measured]),
                ([measured, (-100, 0), (75, 0), (1, 0)], [measured, silent, silent, silent]),
            ]
        ),
        (2000, 3000, 4000),
    )
    assert sums.count == 3
    assert sums.flags.tolist() == [[0, OPEN, 0], [0, OPEN | MISSING, OPEN]]
    assert sums.total[0].tolist() == [450, 1200, -24]
    assert (sums.total[1, 0], sums.total[1, 2]) == (450, 2700)
    assert sums.total.dtype == np.int16


def test_a_frequency_that_no_file_has_is_missing() -> None:
    sums = threshold_sums(grid_of([([(10, 0)] * 4, [(10, 0)] * 4)]), (2000, 6000))
    assert (sums.flags >= MISSING).all()
    assert three_valued(*(getattr(interval_ends(sums), end) for end in ("low", "high")), 0).tolist() == [[1], [1]]


@pytest.mark.parametrize("state", [r for r in Response if r > Response.NO_RESPONSE])
def test_every_state_without_a_level_is_missing(state: Response) -> None:
    sums = threshold_sums(grid_of([([(0, int(state))] + [(10, 0)] * 3, [(10, 0)] * 4)]), (500, 2000))
    assert (sums.flags[:, 0] >= MISSING).tolist() == [True, False]


def test_three_values_at_the_limit() -> None:
    """At least 300: reached exactly is yes; an upper end just below is no; between them nobody can tell."""
    low = np.array([300, 299, 301, 200, 200, 200, -16000, -32000], dtype=np.int16)
    high = np.array([300, 299, 301, 300, 299, 16000, 16000, 32000], dtype=np.int16)
    words = [Met(code).name.lower() for code in three_valued(low, high, 300)]
    assert words == ["yes", "no", "yes", "unknown", "no", "unknown", "unknown", "unknown"]
    assert three_valued(low, high, 300).dtype == np.int8


def test_a_correction_moves_both_ends_and_leaves_open_ones_open() -> None:
    cells = [[(100, 0)] * 4, [(100, 0), (900, 1), (100, 0), (100, 0)]]
    sums = threshold_sums(grid_of([(cells[0], cells[1])]), (2000, 3000, 4000))
    plain, corrected = interval_ends(sums), interval_ends(sums, np.array([70], dtype=np.int16))
    assert (plain.low[:, 0] - corrected.low[:, 0]).tolist() == [70, 70]
    assert plain.high[0, 0] - corrected.high[0, 0] == 70
    assert plain.high[1, 0] == corrected.high[1, 0] == 16000, "no upper end stays none"


def test_extremes_do_not_overflow() -> None:
    """The largest and smallest sums of files, and missing ones, with and against one another."""
    top, bottom, silent, none = [(1200, 0)] * 4, [(-200, 0)] * 4, [(1200, 1)] * 4, [(0, 2)] * 4
    kinds = [top, bottom, silent, none]
    sums = threshold_sums(grid_of([(kind, kind) for kind in kinds]), HZ)
    ends = interval_ends(sums)
    for (a, now), (b, base) in itertools.product(enumerate(kinds), repeat=2):
        low, high = ends.low[0, a] - ends.high[0, b], ends.high[0, a] - ends.low[0, b]
        answer = Met(int(three_valued(np.array([low]), np.array([high]), 400)[0]))
        if none in (now, base) or (now is silent and base is not bottom) or (now is base is silent):
            expected = Met.UNKNOWN
        else:
            expected = Met.YES if now in (top, silent) and base is bottom else Met.NO
        assert answer == expected, (now, base)
