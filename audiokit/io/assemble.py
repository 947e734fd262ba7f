"""Batches of accepted tests to one `ThresholdGrid`: order by person and time, test ids, thresholds in place."""

from collections.abc import Sequence

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from audiokit.core.dates import iso_text
from audiokit.core.vocabulary import EARS, Response
from audiokit.io.batch import TestBatch
from audiokit.io.columns import RECHECK_COLUMNS, TEXT_DETAILS
from audiokit.model.grid import People, ThresholdGrid


def _order(person: NDArray[np.int32], stamp: NDArray[np.int64], place: NDArray[np.int64]) -> NDArray[np.int64]:
    """Tests by person, then time, then input."""
    if not len(person):
        return np.zeros(0, np.int64)
    moment, times = pd.factorize(stamp, sort=True)
    if (int(person.max()) + 1) * len(times) * (int(place.max()) + 1) > np.iinfo(np.int64).max:
        return np.lexsort((place, moment, person))
    # one number per test: numpy sorts these several times quicker than three keys
    return np.argsort((person.astype(np.int64) * len(times) + moment) * (int(place.max()) + 1) + place)


def _occurrence(person: NDArray[np.int32], day: NDArray[np.int32]) -> NDArray[np.int64]:
    """1 for the first of neighbouring tests of one person and day, 2 for the second, and so on. [test]"""
    starts = np.ones(len(person), np.bool_)
    starts[1:] = (np.diff(person) != 0) | (np.diff(day) != 0)
    first = np.flatnonzero(starts)
    return np.arange(len(person)) - np.repeat(first, np.diff(np.append(first, len(person)))) + 1


def make_ids(person_id: pa.StringArray, person: NDArray[np.int32], day: NDArray[np.int32]) -> pa.StringArray:
    """An id for each test from its person and day; later tests of the same person and day get #2, #3, …"""
    which, days = pd.factorize(day)
    dates = pa.array(iso_text(days), pa.string()).take(pa.array(which))
    ids = pc.binary_join_element_wise(person_id.take(pa.array(person)), dates, "@")
    number = _occurrence(person, day)
    later = np.flatnonzero(number > 1)
    if not len(later):
        return ids
    numbered = pc.binary_join_element_wise(ids.take(pa.array(later)), pa.array(number[later]).cast(pa.string()), "#")
    return pc.replace_with_mask(ids, pa.array(number > 1), numbered)


def _test_ids(
    given: pa.StringArray, people: People, person: NDArray[np.int32], day: NDArray[np.int32]
) -> pa.StringArray:
    """Given ids where there are any, else made ones that are none of the given."""
    blank = pc.equal(given, "").to_numpy(zero_copy_only=False)
    if not blank.any():
        return given
    made = make_ids(people.person_id, person[blank], day[blank])
    if blank.all():
        return made
    while pc.any(taken := pc.is_in(made, given)).as_py():
        made = pc.if_else(taken, pc.binary_join_element_wise(made, "~", ""), made)
    return pc.replace_with_mask(given, pa.array(blank), made)


def _details(batches: Sequence[TestBatch], order: NDArray[np.int64]) -> pd.DataFrame:
    """The optional columns of the tests, as far as the files have them, and where each test stands."""
    take = pa.array(order)
    columns: dict[str, pd.Series | NDArray] = {}
    if any(batch.hours is not None for batch in batches):
        parts = [np.full(len(batch), np.nan) if batch.hours is None else batch.hours for batch in batches]
        columns["hours_since_noise"] = np.concatenate(parts)[order]
    for name in (*TEXT_DETAILS, *RECHECK_COLUMNS):
        if any(name in batch.texts for batch in batches):
            absent = pa.scalar("", pa.string())
            parts = [batch.texts.get(name, pa.repeat(absent, len(batch))) for batch in batches]
            columns[name] = pa.concat_arrays(parts).take(take).to_pandas()
    columns["source_file"] = pa.concat_arrays([batch.source_file for batch in batches]).take(take).to_pandas()
    columns["source_row"] = np.concatenate([batch.source_row for batch in batches])[order]
    return pd.DataFrame(columns)


def assemble(batches: Sequence[TestBatch], people: People) -> ThresholdGrid:
    """All accepted tests as aligned arrays."""
    person = np.concatenate([batch.person for batch in batches])
    stamp = np.concatenate([batch.stamp for batch in batches])
    order = _order(person, stamp, np.concatenate([batch.place for batch in batches]))
    place = np.empty_like(order)
    place[order] = np.arange(len(order))
    person = person[order]
    day = np.concatenate([batch.day for batch in batches])[order]
    frequencies = tuple(sorted({hz for batch in batches for hz in batch.frequencies_hz}))
    axis = {hz: i for i, hz in enumerate(frequencies)}
    shape = (len(EARS), len(frequencies), len(order))
    threshold = np.zeros(shape, np.int16)
    response = np.full(shape, Response.NOT_RECORDED, np.int8)
    start = 0
    for batch in batches:
        batch.fill(axis, threshold, response, place[start : start + len(batch)])
        start += len(batch)
    counts = np.bincount(person, minlength=len(people))
    given = pa.concat_arrays([batch.given_id for batch in batches]).take(pa.array(order))
    return ThresholdGrid(
        person=person,
        first=np.concatenate(([0], np.cumsum(counts))).astype(np.int64),
        day=day,
        purpose=np.concatenate([batch.purpose for batch in batches])[order],
        valid=np.concatenate([batch.valid for batch in batches])[order],
        test_id=_test_ids(given, people, person, day),
        frequencies_hz=frequencies,
        threshold=threshold,
        response=response,
        details=_details(batches, order),
    )
