"""Exact numbers as text and as decimals, and one criterion's numbers for chosen rows."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from audiokit.measures.shifts import bound_of
from audiokit.surveillance.review import BookReview


def quotient_text(numerator: int, denominator: int, decimals: int = 4) -> str:
    """A fraction in decimals without trailing noughts, rounded half to even at the last one."""
    scaled = _round_quotient(numerator * 10**decimals, denominator)
    sign, scaled = ("-", -scaled) if scaled < 0 else ("", scaled)
    text = f"{sign}{scaled // 10**decimals}.{scaled % 10**decimals:0{decimals}d}"
    return text.rstrip("0").rstrip(".")


def _round_quotient(numerator: int, denominator: int) -> int:
    whole, rest = divmod(numerator, denominator)
    return whole + (2 * rest > denominator or (2 * rest == denominator and whole % 2 == 1))


def tenths_text(tenths: int) -> str:
    """Tenths of a dB in dB: 75 stands as 7.5, 150 as 15."""
    return quotient_text(tenths, 10, 1)


@dataclass(frozen=True)
class Rows:
    """Tests and ears for which one criterion's numbers are wanted. [row]"""

    test: NDArray[np.int32]
    ear: NDArray[np.int64]


@dataclass(frozen=True)
class Numbers:
    """One criterion's exact numbers for some rows; dB values are numerators over ten times the frequency count.

    base : the baseline's index      shift : difference of the sums as measured
    correction : difference of the age table's sums, dB × count      bound : codes of `Bound`      met : codes of `Met`
    """

    base: NDArray[np.int32]
    shift: NDArray[np.int32]
    correction: NDArray[np.int32]
    bound: NDArray[np.int8]
    met: NDArray[np.int8]
    count: int

    def value(self) -> NDArray[np.int32]:
        """The shift less its correction."""
        return self.shift - 10 * self.correction

    def db(self, numerator: NDArray[np.integer]) -> NDArray[np.float64]:
        """Numerators as dB with at most four decimals."""
        return np.rint(numerator * (1000 / self.count)) / 10000


def numbers_of(book: BookReview, criterion_id: str, rows: Rows) -> Numbers:
    """A criterion's numbers for some rows, from the findings that every other file is made of."""
    found, sums = book.findings[criterion_id], book.sums[criterion_id]
    base = found.trail.base[rows.ear, rows.test]
    shift = sums.total[rows.ear, rows.test].astype(np.int32) - sums.total[rows.ear, base]
    ages = book.ages.get(criterion_id)
    correction = np.zeros(len(base), dtype=np.int32)
    if ages is not None:
        correction = ages.value[rows.test].astype(np.int32) - ages.value[base]
    bound = bound_of(sums.flags[rows.ear, rows.test], sums.flags[rows.ear, base])
    return Numbers(base, shift, correction, bound, found.trail.met[rows.ear, rows.test], sums.count)
