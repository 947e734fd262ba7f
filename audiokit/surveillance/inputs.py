"""What the criteria of a rulebook compare: sums of thresholds and age corrections, made stretch by stretch."""

import numpy as np

from audiokit.measures.shifts import Ends, interval_ends, three_valued
from audiokit.measures.sums import Sums, fill_sums
from audiokit.model.grid import People, ThresholdGrid
from audiokit.rules.spec import Criterion, Rulebook, tenths
from audiokit.standards.age_tables import age_table
from audiokit.surveillance.ages import AgeCorrection, fill_age_correction
from audiokit.surveillance.block import Judged


class Inputs:
    """Sums and, where they apply, age corrections of all tests by criterion id; criteria that agree share them.

    They are filled by `judged`, stretch by stretch, so that each stretch is worked on while it lies in the cache.
    """

    def __init__(self, rulebook: Rulebook, people: People, grid: ThresholdGrid, age_corrected: bool) -> None:
        self._rulebook, self._people, self._grid = rulebook, people, grid
        self._sums: dict[tuple[int, ...], Sums] = {}
        self._ages: dict[tuple[str, tuple[int, ...]], AgeCorrection] = {}
        self._names: dict[str, tuple[tuple[int, ...], str]] = {}
        for criterion in rulebook.criteria:
            frequencies = tuple(criterion.frequencies_hz.value)
            table = criterion.age_table.value if age_corrected and criterion.age_table is not None else ""
            self._names[criterion.id] = (frequencies, table)
            self._sums.setdefault(frequencies, Sums.empty(len(grid), len(frequencies)))
            if table:
                self._ages.setdefault((table, frequencies), AgeCorrection.empty(len(grid)))

    @property
    def sums(self) -> dict[str, Sums]:
        """By criterion id."""
        return {name: self._sums[frequencies] for name, (frequencies, _) in self._names.items()}

    @property
    def ages(self) -> dict[str, AgeCorrection]:
        """By criterion id, only of those that are age-corrected."""
        return {name: self._ages[table, hz] for name, (hz, table) in self._names.items() if table}

    def judged(self, tests: slice) -> dict[str, Judged]:
        """What each criterion compares in a stretch of tests."""
        for frequencies, sums in self._sums.items():
            fill_sums(sums.part(tests), self._grid, frequencies, tests)
        for (table, frequencies), ages in self._ages.items():
            fill_age_correction(ages.part(tests), age_table(table), frequencies, self._people, self._grid, tests)
        ends: dict[tuple[tuple[int, ...], str], Ends] = {}
        for frequencies, table in {*self._names.values(), *((hz, "") for hz in self._sums)}:
            correction = self._ages[table, frequencies].part(tests).value * np.int16(10) if table else None
            ends[frequencies, table] = interval_ends(self._sums[frequencies].part(tests), correction)
        return {criterion.id: self._judged(criterion, tests, ends) for criterion in self._rulebook.criteria}

    def _judged(self, criterion: Criterion, tests: slice, ends: dict[tuple[tuple[int, ...], str], Ends]) -> Judged:
        frequencies, table = self._names[criterion.id]
        sums, shift, measured = self._sums[frequencies], ends[frequencies, table], ends[frequencies, ""]
        level = None
        if criterion.level_at_least_db is not None:
            level = three_valued(measured.low, measured.high, tenths(criterion.level_at_least_db, sums.count))
        return Judged(
            low=shift.low,
            high=shift.high,
            total=sums.part(tests).total,
            level=level,
            limit=tenths(criterion.shift_at_least_db, sums.count),
            improvement=tenths(self._rulebook.revision.improvement_at_least_db, sums.count),
        )
