"""Threshold cells as intervals of dB HL, and the few operations the review needs on them."""

from dataclasses import dataclass
from fractions import Fraction

# Limits of the audiometer assumed for a bare "NR" (the project's stated default, no published source).
DEFAULT_LIMITS = {250: 90, 8000: 90}
DEFAULT_LIMIT_ELSEWHERE = 100


@dataclass(frozen=True)
class Interval:
    """[low, high] in dB; None at an end means that it is open (minus or plus infinity)."""

    low: Fraction | None
    high: Fraction | None

    @property
    def bound(self) -> str:
        if self.low is not None and self.high is not None:
            return "exact"
        if self.low is not None:
            return "at_least"
        if self.high is not None:
            return "at_most"
        return "none"

    @property
    def shown(self) -> Fraction | None:
        """The number that stands for the interval: its lower end when open above, its upper end when open below."""
        return self.low if self.low is not None else self.high

    def minus(self, number: Fraction) -> "Interval":
        low = None if self.low is None else self.low - number
        high = None if self.high is None else self.high - number
        return Interval(low, high)


def read_cell(text: str, frequency: int, limits: dict[int, int]) -> Interval | None:
    """Interval of a threshold cell; None for did not test, could not test and not recorded."""
    text = text.strip()
    if text in ("", "DNT", "CNT"):
        return None
    if text == "NR":
        limit = limits.get(frequency, DEFAULT_LIMITS.get(frequency, DEFAULT_LIMIT_ELSEWHERE))
        return Interval(Fraction(limit), None)
    for open_above in (text.removeprefix("NR@"), text.removeprefix(">"), text.removesuffix("+")):
        if open_above != text:
            return Interval(Fraction(open_above), None)
    return Interval(Fraction(text), Fraction(text))


def change(baseline: Interval | None, current: Interval | None) -> Interval | None:
    """Shift from baseline to current; None when either has no interval."""
    if baseline is None or current is None:
        return None
    low = None if current.low is None or baseline.high is None else current.low - baseline.high
    high = None if current.high is None or baseline.low is None else current.high - baseline.low
    return Interval(low, high)


def mean(intervals: list[Interval | None]) -> Interval | None:
    """Mean of the ends; None (not computable) when one of them has no interval."""
    lows: list[Fraction] = []
    highs: list[Fraction] = []
    low_is_open = high_is_open = False
    for interval in intervals:
        if interval is None:
            return None
        if interval.low is None:
            low_is_open = True
        else:
            lows.append(interval.low)
        if interval.high is None:
            high_is_open = True
        else:
            highs.append(interval.high)
    low = None if low_is_open else sum(lows, Fraction(0)) / len(intervals)
    high = None if high_is_open else sum(highs, Fraction(0)) / len(intervals)
    return Interval(low, high)


def reaches(interval: Interval | None, limit: int) -> str:
    """Whether the interval is at least `limit`: yes, no or unknown."""
    if interval is None:
        return "unknown"
    if interval.low is not None and interval.low >= limit:
        return "yes"
    if interval.high is not None and interval.high < limit:
        return "no"
    return "unknown"


def later_is_better_elsewhere(pairs: list[tuple[Interval | None, Interval | None]]) -> bool:
    """Whether, among (earlier, later) pairs with an interval in both, none is worse and one is better.

    A pair that is not surely equal or better counts as worse; two equal no responses are equal.
    """
    better = 0
    for earlier, later in pairs:
        if earlier is None or later is None:
            continue
        if earlier.high is None and later.high is None and earlier.low == later.low:
            continue
        if later.high is None or earlier.low is None or later.high > earlier.low:
            return False
        if later.high < earlier.low:
            better += 1
    return better > 0
