"""Retest runs: which tests belong to the periodic test before them, found for all people at once."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

Indices = NDArray[np.int32]
Mask = NDArray[np.bool_]


def follows_within(linkable: Mask, day: NDArray[np.int32], window_days: int) -> Mask:
    """True where the next test can be a retest of this one. [test]

    linkable : the test can be a retest of the test before it: same person, purpose retest or blank [test]
    """
    follows = np.zeros_like(linkable)
    follows[:-1] = linkable[1:] & (day[1:] - day[:-1] <= window_days)
    return follows


def find_runs(candidates: Indices, linkable: Mask, day: NDArray[np.int32], window_days: int) -> tuple[Indices, Indices]:
    """The periodic tests that have retests, and one past each one's last retest.

    candidates  : tests that open the window and are followed by a possible retest, ascending
    window_days : a retest lies at most so many days after its periodic test

    A run is the unbroken row of linkable tests in the window directly after a periodic test. A test inside a run starts
    none of its own.
    """
    ends = _run_ends(candidates, linkable, day, window_days)
    active = _outermost(candidates, ends)
    return candidates[active], ends[active]


def sorted_union(arrays: Sequence[Indices]) -> Indices:
    """The different values of some ascending arrays, ascending; a merge, where a hash of all values costs far more."""
    together = np.sort(np.concatenate(arrays), kind="stable")
    different = np.ones(len(together), dtype=bool)
    different[1:] = together[1:] != together[:-1]
    return together[different]


def index_ranges(starts: NDArray[np.integer], ends: NDArray[np.integer]) -> tuple[Indices, NDArray[np.int64]]:
    """All indices of the half-open ranges starts:ends, one after the other, and the length of each range."""
    lengths = (ends - starts).astype(np.int64)
    total = int(lengths.sum())
    shift = np.repeat((starts - (np.cumsum(lengths) - lengths)).astype(np.int32), lengths)
    shift += np.arange(total, dtype=np.int32)
    return shift, lengths


def _run_ends(starts: Indices, linkable: Mask, day: NDArray[np.int32], window_days: int) -> Indices:
    ends = starts + np.int32(1)
    live = np.arange(len(starts))
    while len(live):
        ahead = ends[live]
        inside = ahead < len(day)
        live, ahead = live[inside], ahead[inside]
        goes_on = linkable[ahead] & (day[ahead] - day[starts[live]] <= window_days)
        live = live[goes_on]
        ends[live] += 1
    return ends


def _outermost(starts: Indices, ends: Indices) -> NDArray[np.int64]:
    """Of overlapping candidate runs, taken in order of time, those that no earlier one has swallowed."""
    chosen = []
    left = np.arange(len(starts))
    while len(left):
        reach = np.maximum.accumulate(ends[left])
        head = np.ones(len(left), dtype=bool)
        head[1:] = starts[left[1:]] >= reach[:-1]
        last_head = np.maximum.accumulate(np.where(head, np.arange(len(left)), 0))
        swallowed = ~head & (starts[left] < ends[left[last_head]])
        chosen.append(left[head])
        left = left[~head & ~swallowed]
    return np.sort(np.concatenate(chosen)) if chosen else np.empty(0, dtype=np.int64)


def deciding_retests(starts: Indices, ends: Indices, met: NDArray[np.int8], unknown: int) -> Indices:
    """The last test of each run whose answer is yes or no in at least one ear, -1 where there is none. [run]

    met : answers [ear, test], `unknown` is the code of no answer
    """
    last = ends - np.int32(1)
    found = np.full(len(last), -1, dtype=np.int32)
    live = np.arange(len(last))
    while len(live):
        at = last[live]
        hit = (met[0][at] != unknown) | (met[1][at] != unknown)
        found[live[hit]] = at[hit]
        live = live[~hit]
        last[live] -= 1
        live = live[last[live] > starts[live]]
    return found
