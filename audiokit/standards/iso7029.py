"""ISO 7029: how hearing threshold levels of otologically normal people are distributed at each age.

Levels are relative to the median at 18 years. Half a normal distribution stands on each side of the median: s_u on the
worse side, s_l on the better. The edition is always an argument; the two editions differ by up to 10 dB.
"""

import functools
import statistics
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from audiokit.core.errors import OutOfScopeError
from audiokit.core.vocabulary import Sex
from audiokit.standards.registry import SourceSheet, TableError, load_table

EDITIONS = ("2000", "2017")

Decibels = NDArray[np.float64]


@dataclass(frozen=True)
class _Coefficients:
    """Arrays are [sex code 1–2 minus 1, frequency]; spreads hold one tuple of arrays each."""

    sheet: SourceSheet
    frequencies_hz: NDArray[np.int64]
    youngest: float
    oldest: NDArray[np.float64]
    oldest_informative: NDArray[np.float64]
    a: NDArray[np.float64]
    b: NDArray[np.float64]
    upper: tuple[NDArray[np.float64], ...]
    lower: tuple[NDArray[np.float64], ...]


@functools.cache
def _coefficients(edition: str) -> _Coefficients:
    if edition not in EDITIONS:
        raise TableError(f"there is no edition '{edition}' of ISO 7029 here", f"use one of: {', '.join(EDITIONS)}")
    table = load_table(f"iso7029_{edition}")
    frame = table.frame.assign(code=table.frame["sex"].map({"female": 0, "male": 1}))
    frequencies = np.sort(frame["frequency_hz"].unique()).astype(np.int64)
    shape = (2, len(frequencies))
    frame = frame.sort_values(["code", "frequency_hz"])

    def grid(column: str) -> NDArray[np.float64]:
        return frame[column].to_numpy(dtype=np.float64).reshape(shape)

    if edition == "2000":
        upper, lower = ["b_u", "slope_u"], ["b_l", "slope_l"]
        exponent, informative = np.full(shape, 2.0), grid("oldest_age_years")
    else:
        upper = [f"su_c{power}" for power in range(6)]
        lower = [f"sl_c{power}" for power in range(6)]
        exponent, informative = grid("b"), grid("oldest_age_years_informative")
    return _Coefficients(
        sheet=table.sheet,
        frequencies_hz=frequencies,
        youngest=float(table.sheet.limits["youngest_age_years"]),
        oldest=grid("oldest_age_years"),
        oldest_informative=informative,
        a=grid("a"),
        b=exponent,
        upper=tuple(map(grid, upper)),
        lower=tuple(map(grid, lower)),
    )


def _place(
    edition: str, sex: ArrayLike, age_years: ArrayLike, frequency_hz: ArrayLike, informative: bool
) -> tuple[_Coefficients, tuple[Any, Any], Decibels]:
    """Coefficients, the index of each cell in their arrays, and years since the youngest age; limits are checked."""
    table = _coefficients(edition)
    sex_code, age, frequency = np.broadcast_arrays(
        np.asarray(sex), np.asarray(age_years, dtype=np.float64), np.asarray(frequency_hz)
    )
    if np.any((sex_code != Sex.FEMALE) & (sex_code != Sex.MALE)):
        raise OutOfScopeError(f"{table.sheet.name} has women and men only", "leave out people of unknown sex")
    column = np.minimum(np.searchsorted(table.frequencies_hz, frequency), len(table.frequencies_hz) - 1)
    absent = table.frequencies_hz[column] != frequency
    if np.any(absent):
        known = ", ".join(map(str, table.frequencies_hz))
        raise OutOfScopeError(f"{table.sheet.name} has no values at {frequency[absent][0]} Hz", f"use: {known} Hz")
    where = (sex_code.astype(np.int64) - Sex.FEMALE, column)
    oldest = (table.oldest_informative if informative else table.oldest)[where]
    outside = (age < table.youngest) | (age > oldest)
    if np.any(outside):
        raise OutOfScopeError(
            f"{table.sheet.name}: age {age[outside][0]:g} years at {frequency[outside][0]} Hz is outside "
            f"{table.youngest:g} to {oldest[outside][0]:g}",
            "leave out these ages; the standard is not extrapolated",
        )
    return table, where, age - table.youngest


def _median(table: _Coefficients, where: tuple[Any, Any], years: Decibels) -> Decibels:
    return table.a[where] * years ** table.b[where]


def _spread(
    table: _Coefficients, where: tuple[Any, Any], years: Decibels, terms: tuple[NDArray[np.float64], ...]
) -> Decibels:
    """Edition 2000: constant plus slope times median; edition 2017: polynomial in the years since 18."""
    if len(terms) == 2:
        return terms[0][where] + terms[1][where] * _median(table, where, years)
    total = np.zeros_like(years)
    for term in reversed(terms):
        total = total * years + term[where]
    return total


def median(
    sex: ArrayLike, age_years: ArrayLike, frequency_hz: ArrayLike, *, edition: str, informative: bool = False
) -> Decibels:
    """Median hearing threshold level relative to 18 years. [dB]

    sex : codes of `Sex`, female or male      age_years : may be fractional; NaN gives NaN [years]
    frequency_hz : tabulated frequencies only [Hz]; the three broadcast together
    edition : "2000" (D = a(Y−18)²) or "2017" (D = a(Y−18)^b)
    informative : edition 2017 only: also the ages 70 to 80 at 3000 Hz and above, which it gives as information

    Raises: OutOfScopeError for an unknown sex, an age or a frequency outside the edition's limits; TableError for an
    unknown edition. Source: ISO 7029, sheets iso7029_2000 and iso7029_2017. Man, 60 years, 4000 Hz, 2017: 20.2085.
    """
    return _median(*_place(edition, sex, age_years, frequency_hz, informative))[()]


def spread_upper(
    sex: ArrayLike, age_years: ArrayLike, frequency_hz: ArrayLike, *, edition: str, informative: bool = False
) -> Decibels:
    """s_u, the standard deviation of the half distribution on the worse side; arguments and errors of `median`. [dB]

    Man, 60 years, 1000 Hz, 2017: 10.1533.
    """
    place = _place(edition, sex, age_years, frequency_hz, informative)
    return _spread(*place, terms=place[0].upper)[()]


def spread_lower(
    sex: ArrayLike, age_years: ArrayLike, frequency_hz: ArrayLike, *, edition: str, informative: bool = False
) -> Decibels:
    """s_l, the standard deviation on the better side; arguments and errors of `median`. [dB]"""
    place = _place(edition, sex, age_years, frequency_hz, informative)
    return _spread(*place, terms=place[0].lower)[()]


def threshold_at_deviate(
    deviate: ArrayLike,
    sex: ArrayLike,
    age_years: ArrayLike,
    frequency_hz: ArrayLike,
    *,
    edition: str,
    informative: bool = False,
) -> Decibels:
    """Threshold level relative to 18 years of people `deviate` standard deviations from the median. [dB]

    deviate : standard normal deviate, positive = worse hearing than the median; broadcasts with the others
    D + k·s_u where k ≥ 0, D + k·s_l where k < 0; arguments and errors of `median`.
    """
    k, sex_code, age, frequency = np.broadcast_arrays(
        np.asarray(deviate, dtype=np.float64), np.asarray(sex), np.asarray(age_years), np.asarray(frequency_hz)
    )
    place = _place(edition, sex_code, age, frequency, informative)
    table = place[0]
    spread = np.where(k >= 0, _spread(*place, terms=table.upper), _spread(*place, terms=table.lower))
    return (_median(*place) + k * spread)[()]


def normal_deviate(per_cent_worse: ArrayLike) -> Decibels:
    """Standard normal deviate that `per_cent_worse` per cent of people exceed (10 gives 1.2816, 90 gives −1.2816).

    Raises: OutOfScopeError unless every value lies strictly between 0 and 100; NaN gives NaN.
    Source: AS 241 (Wichura 1988) as implemented by `statistics.NormalDist`.
    """
    share = np.asarray(per_cent_worse, dtype=np.float64)
    if np.any((share <= 0) | (share >= 100)):
        raise OutOfScopeError("a percentage of people must lie between 0 and 100, ends excluded", "for example 10")
    distinct, position = np.unique(share, return_inverse=True)
    normal = statistics.NormalDist()
    deviates = np.array([-normal.inv_cdf(value / 100) if value == value else np.nan for value in distinct])
    return deviates[position].reshape(share.shape)[()]


def threshold_at_fractile(
    per_cent_worse: ArrayLike,
    sex: ArrayLike,
    age_years: ArrayLike,
    frequency_hz: ArrayLike,
    *,
    edition: str,
    informative: bool = False,
) -> Decibels:
    """Threshold level relative to 18 years that `per_cent_worse` per cent of people exceed. [dB]

    per_cent_worse : percentage with worse hearing, 0 to 100, ends excluded; broadcasts with the others
    Arguments and errors of `median`; man, 50 years, 4000 Hz, 10 %, edition 2000: 36.4.
    """
    return threshold_at_deviate(
        normal_deviate(per_cent_worse), sex, age_years, frequency_hz, edition=edition, informative=informative
    )
