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

    @staticmethod
    def empty(tests: int) -> "AgeCorrection":
        """Room for so many tests."""
        return AgeCorrection(
            np.empty(tests, dtype=np.int16), np.empty(tests, dtype=np.int16), np.empty(tests, dtype=bool)
        )

    def part(self, tests: slice) -> "AgeCorrection":
        """A view of a stretch of tests: what is written to it is written here."""
        return AgeCorrection(self.age[tests], self.value[tests], self.known[tests])


def ages_at_tests(people: People, grid: ThresholdGrid, tests: slice) -> NDArray[np.int16]:
    """Age at a stretch of tests: completed years, the difference of years with only a birth year. [years]

    -1 where neither birth date nor birth year is known.
    """
    if not len(grid.person[tests]):
        return np.empty(0, dtype=np.int16)
    crowd = slice(int(grid.person[tests][0]), int(grid.person[tests][-1]) + 1)
    person = grid.person[tests] - np.int32(crowd.start)
    only_year = people.birth_day[crowd] == NO_DATE
    year = people.birth_year[crowd].astype(np.int32)
    born = np.where(only_year, year * 10000, calendar_number(np.where(only_year, 0, people.birth_day[crowd])))
    at_test = calendar_number(grid.day[tests])
    if only_year.any():
        at_test = np.where(only_year.take(person), at_test // 10000 * 10000, at_test)
    age = ((at_test - born.take(person)) // 10000).astype(np.int16)
    if (year == 0).any():
        age[(year == 0).take(person)] = -1
    return age


def fill_age_correction(
    ages: AgeCorrection,
    table: AgeTable,
    frequencies_hz: Sequence[int],
    people: People,
    grid: ThresholdGrid,
    tests: slice,
) -> None:
    """The age table's sum over `frequencies_hz` at the ages of a stretch of tests, written to `ages`."""
    ages.age[:] = ages_at_tests(people, grid, tests)
    sex = people.sex.take(grid.person[tests])
    sums = table.lookup(list(frequencies_hz)).sum(axis=1).astype(np.int16)
    np.greater_equal(ages.age, 0, out=ages.known)
    ages.known[:] &= sex != Sex.UNKNOWN
    clamped = np.minimum(np.maximum(ages.age, table.youngest), table.oldest)
    ages.value[:] = sums.reshape(-1).take(clamped + sex * np.int16(sums.shape[1]))
    ages.value[:] *= ages.known.view(np.int8)
