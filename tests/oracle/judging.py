"""One test and ear against one baseline: shift, age correction, level, and whether a criterion is met."""

from dataclasses import dataclass
from fractions import Fraction

from tests.oracle import age_table
from tests.oracle.dates import age_on
from tests.oracle.intervals import Interval, change, mean, reaches, read_cell
from tests.oracle.records import RECORDABLE, STS, HearingTest, Person, Settings

MEAN_FREQUENCIES = (2000, 3000, 4000)  # 29 CFR 1910.95(g)(10)(i); 1904.10(a)
SHIFT_LIMIT = 10  # 29 CFR 1910.95(g)(10)(i): an average of 10 dB or more
LEVEL_LIMIT = 25  # 29 CFR 1904.10(a): 25 dB or more above audiometric zero


@dataclass(frozen=True)
class Verdict:
    """One criterion on one test and ear against one baseline."""

    baseline: HearingTest
    measured: Interval | None
    correction: Fraction
    value: Interval | None
    level: Interval | None
    met: str


def age_correction(person: Person, baseline: HearingTest, test: HearingTest, settings: Settings) -> Fraction:
    """Mean age correction in dB, 29 CFR 1910.95 App F; 0 when off, or when sex or birth is unknown."""
    then, now = age_on(person, baseline.tested_on), age_on(person, test.tested_on)
    if not settings.age_correction or person.sex not in ("male", "female") or then is None or now is None:
        return Fraction(0)
    return age_table.mean_value(person.sex, now) - age_table.mean_value(person.sex, then)


class Judge:
    """Judges the tests of one person and remembers every verdict."""

    def __init__(self, person: Person, settings: Settings):
        self.person = person
        self.settings = settings
        self.verdicts: dict[tuple[str, str, str], Verdict] = {}  # (criterion, test_id, ear)

    def threshold(self, test: HearingTest, ear: str, frequency: int) -> Interval | None:
        return read_cell(test.cells.get((ear, frequency), ""), frequency, self.settings.response_limits)

    def level(self, test: HearingTest, ear: str) -> Interval | None:
        """Mean hearing level over 2, 3 and 4 kHz, never age-corrected."""
        return mean([self.threshold(test, ear, frequency) for frequency in MEAN_FREQUENCIES])

    def compare(self, criterion: str, test: HearingTest, ear: str, baseline: HearingTest) -> Verdict:
        """Compare a test with a baseline."""
        shifts = [
            change(self.threshold(baseline, ear, frequency), self.threshold(test, ear, frequency))
            for frequency in MEAN_FREQUENCIES
        ]
        measured = mean(shifts)
        correction = age_correction(self.person, baseline, test, self.settings)
        value = None if measured is None else measured.minus(correction)
        level = self.level(test, ear)
        met = reaches(value, SHIFT_LIMIT)
        if criterion == RECORDABLE:
            met = both(met, reaches(level, LEVEL_LIMIT))
        verdict = Verdict(baseline, measured, correction, value, level, met)
        self.verdicts[criterion, test.test_id, ear] = verdict
        return verdict

    def met(self, criterion: str, test: HearingTest, ear: str) -> str:
        return self.verdicts[criterion, test.test_id, ear].met

    def shown_shift(self, test: HearingTest, ear: str) -> Fraction:
        """The shift as measured, not age-corrected; only asked of an exact one."""
        measured = self.verdicts[STS, test.test_id, ear].measured
        assert measured is not None and measured.low is not None
        return measured.low

    def exact_level(self, test: HearingTest, ear: str) -> Fraction:
        """Mean hearing level in dB HL; only asked of an exact one."""
        level = self.level(test, ear)
        assert level is not None and level.bound == "exact" and level.low is not None
        return level.low

    def is_exact(self, test: HearingTest, ear: str) -> bool:
        measured = self.verdicts[STS, test.test_id, ear].measured
        return measured is not None and measured.bound == "exact"


def both(one: str, other: str) -> str:
    """Three-valued "and"."""
    if "no" in (one, other):
        return "no"
    return "unknown" if "unknown" in (one, other) else "yes"
