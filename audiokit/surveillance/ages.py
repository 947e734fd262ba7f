"""Ages at the tests, and the age correction that a rulebook's own table gives for each."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from audiokit.core.dates import NO_DATE, calendar_number
from audiokit.core.vocabulary import Sex
from audiokit.model.grid import People, ThresholdGrid
from audiokit.standards.age_tables import AgeTable


@dataclass(frozen=True)
class AgeCorrection:
    """What the age table says of each test; a correction is the difference between two tests of one person.

    age   : completed years, the difference of years where only the birth year is known [test]; -1 where unknown
    value : sum of the table values over the criterion's frequencies, ages clamped to the table [dB, test]; 0 where the
            sex or the birth is unknown, so that no difference arises
    known : sex and birth are known [test]
    """

    age: NDArray[np.int16]
    value: NDArray[np.int16]
    known: NDArray[np.bool_]


def ages_at_tests(people: People, grid: ThresholdGrid) -> NDArray[np.int16]:
    """Age at each test: completed years, the difference of years with only a birth year; -1 where unknown. [years]"""
    born = np.where(people.birth_day == NO_DATE, 0, people.birth_day)
    number = np.where(people.birth_day == NO_DATE, people.birth_year.astype(np.int32) * 10000, calendar_number(born))
    whole_years = people.birth_day == NO_DATE
    at_test = calendar_number(grid.day)
    if whole_years.any():
        at_test = np.where(whole_years[grid.person], at_test // 10000 * 10000, at_test)
    age = ((at_test - number[grid.person]) // 10000).astype(np.int16)
    unknown = people.birth_year == 0
    return np.where(unknown[grid.person], np.int16(-1), age) if unknown.any() else age


def age_correction(
    table: AgeTable, frequencies_hz: Sequence[int], people: People, grid: ThresholdGrid
) -> AgeCorrection:
    """The age table's sum over `frequencies_hz` at each test's age."""
    age = ages_at_tests(people, grid)
    sex = people.sex[grid.person]
    sums = table.lookup(list(frequencies_hz)).sum(axis=1).astype(np.int16)
    known = (sex != Sex.UNKNOWN) & (age >= 0)
    value = sums[sex, np.clip(age, table.youngest, table.oldest)]
    return AgeCorrection(age, np.where(known, value, np.int16(0)), known)
