"""Retest runs and stretches of people on arrays, against one loop per test written from the contract."""

import itertools

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from audiokit.core.vocabulary import Met
from audiokit.surveillance.block import stretches
from audiokit.surveillance.runs import deciding_retests, find_runs, follows_within, index_ranges

WINDOW = 30


@st.composite
def histories(draw: st.DrawFn) -> tuple[list[int], list[int], list[bool], list[bool]]:
    """Tests of several people: person, day, may be a retest of the test before, opens the window."""
    person, day, linkable, opens = [], [], [], []
    for who in range(draw(st.integers(1, 3))):
        today = draw(st.integers(0, 50))
        for number in range(draw(st.integers(1, 7))):
            today += draw(st.sampled_from((0, 1, 10, 29, 30, 31))) if number else 0
            person.append(who)
            day.append(today)
            linkable.append(number > 0 and draw(st.booleans()))
            opens.append(draw(st.booleans()))
    return person, day, linkable, opens


def scalar_runs(person: list[int], day: list[int], linkable: list[bool], opens: list[bool]) -> list[tuple[int, int]]:
    """(periodic test, one past its last retest) of every run, walking from test to test."""
    runs, at = [], 0
    while at < len(day):
        end = at + 1
        if opens[at]:
            while end < len(day) and person[end] == person[at] and linkable[end] and day[end] - day[at] <= WINDOW:
                end += 1
            if end > at + 1:
                runs.append((at, end))
        at = end
    return runs


@settings(deadline=None, max_examples=300)
@given(histories())
def test_runs(history: tuple[list[int], list[int], list[bool], list[bool]]) -> None:
    person, day, linkable, opens = history
    days, links = np.array(day, dtype=np.int32), np.array(linkable)
    follows = follows_within(links, days, WINDOW)
    candidates = np.flatnonzero(np.array(opens) & follows).astype(np.int32)
    starts, ends = find_runs(candidates, links, days, WINDOW)
    assert list(zip(starts.tolist(), ends.tolist(), strict=True)) == scalar_runs(person, day, linkable, opens)


@settings(deadline=None, max_examples=200)
@given(history=histories(), data=st.data())
def test_the_deciding_retest(history: tuple[list[int], list[int], list[bool], list[bool]], data: st.DataObject) -> None:
    """The last of each run that is known in at least one ear."""
    runs = scalar_runs(*history)
    answers = st.lists(st.sampled_from([0, 1, 1, 2]), min_size=len(history[0]), max_size=len(history[0]))
    met = np.array([data.draw(answers), data.draw(answers)], dtype=np.int8)
    starts, ends = (np.array([run[n] for run in runs], dtype=np.int32) for n in (0, 1))
    expected = []
    for start, end in runs:
        known = [at for at in range(start + 1, end) if (met[:, at] != Met.UNKNOWN).any()]
        expected.append(known[-1] if known else -1)
    assert deciding_retests(starts, ends, met, Met.UNKNOWN).tolist() == expected


def test_a_run_inside_another_is_none() -> None:
    """By hand: the second test met it too, but is the first one's retest; the fourth lies outside and starts anew."""
    day = np.array([0, 20, 30, 40, 60], dtype=np.int32)
    linkable = np.array([False, True, True, True, True])
    starts, ends = find_runs(np.array([0, 1, 2, 3], dtype=np.int32), linkable, day, WINDOW)
    assert (starts.tolist(), ends.tolist()) == ([0, 3], [3, 5])


def test_index_ranges() -> None:
    rows, lengths = index_ranges(np.array([2, 5, 9]), np.array([4, 5, 12]))
    assert (rows.tolist(), lengths.tolist()) == ([2, 3, 9, 10, 11], [2, 0, 3])
    empty, none = index_ranges(np.empty(0, dtype=np.int32), np.empty(0, dtype=np.int32))
    assert (len(empty), len(none)) == (0, 0)


@settings(deadline=None, max_examples=200)
@given(counts=st.lists(st.integers(0, 9), max_size=30), tests=st.integers(1, 12))
def test_stretches_hold_everybody_once(counts: list[int], tests: int) -> None:
    """Whole people in their order; no stretch is larger than asked for unless one person alone is."""
    first = np.concatenate(([0], np.cumsum(counts))).astype(np.int64)
    parts = stretches(first, tests)
    assert [person for part in parts for person in range(part.start, part.stop)] == list(range(len(counts)))
    for part in parts:
        size = int(first[part.stop] - first[part.start])
        assert part.stop > part.start
        assert size <= tests or part.stop == part.start + 1
    for one, other in itertools.pairwise(parts):
        assert first[other.start + 1] - first[one.start] > tests, "as large as may be"
