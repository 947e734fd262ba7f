"""ISO 1999:2013: noise-induced permanent threshold shift of a population exposed to noise at work.

The level is the noise exposure level normalized to an 8-hour day, L_EX,8h. [dB]
"""

import functools
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from audiokit.core.errors import OutOfScopeError
from audiokit.standards.iso7029 import normal_deviate
from audiokit.standards.registry import SourceSheet, load_table

Decibels = NDArray[np.float64]

_FULL_RULE_YEARS = 10.0
"""From here on the median follows lg t; below it the rule for under ten years holds (ISO 1999:2013, Formula 3)."""

COMBINATIONS = ("everywhere", "above_40_db")
"""Two readings of where H·N/120 is subtracted; see `combine`."""


@dataclass(frozen=True)
class _Coefficients:
    sheet: SourceSheet
    frequencies_hz: NDArray[np.int64]
    columns: dict[str, NDArray[np.float64]]


@dataclass(frozen=True)
class _Place:
    """Exposure of each cell, limits checked: squared excess over L0, years, and the index of its frequency."""

    table: _Coefficients
    excess_squared: Decibels
    years: Decibels
    column: NDArray[np.int64]

    def term(self, constant: str, slope: str, log_years: Decibels) -> Decibels:
        columns = self.table.columns
        return (columns[constant][self.column] + columns[slope][self.column] * log_years) * self.excess_squared


@functools.cache
def _coefficients() -> _Coefficients:
    table = load_table("iso1999_2013")
    frame = table.frame.sort_values("frequency_hz")
    columns = {name: frame[name].to_numpy(dtype=np.float64) for name in ("u", "v", "l0_db", "x_u", "y_u", "x_l", "y_l")}
    return _Coefficients(table.sheet, frame["frequency_hz"].to_numpy(dtype=np.int64), columns)


def _place(level_db: ArrayLike, years: ArrayLike, frequency_hz: ArrayLike) -> _Place:
    table = _coefficients()
    limits = table.sheet.limits
    level, duration, frequency = np.broadcast_arrays(
        np.asarray(level_db, dtype=np.float64), np.asarray(years, dtype=np.float64), np.asarray(frequency_hz)
    )
    column = np.minimum(np.searchsorted(table.frequencies_hz, frequency), len(table.frequencies_hz) - 1)
    absent = table.frequencies_hz[column] != frequency
    if np.any(absent):
        known = ", ".join(map(str, table.frequencies_hz))
        raise OutOfScopeError(f"{table.sheet.name} has no values at {frequency[absent][0]} Hz", f"use: {known} Hz")
    shortest, longest, highest = limits["shortest_years"], limits["longest_years"], limits["highest_level_db"]
    outside = ((duration < shortest) & (duration != 0)) | (duration > longest)
    if np.any(outside):
        raise OutOfScopeError(
            f"{table.sheet.name}: {duration[outside][0]:g} years of exposure are outside {shortest} to {longest}",
            "0 stands for no exposure; other durations are not extrapolated",
        )
    if np.any(level > highest):
        raise OutOfScopeError(
            f"{table.sheet.name}: a level of {level[level > highest][0]:g} dB is above {highest} dB",
            "levels above the tables are not extrapolated",
        )
    # Clamp before squaring: a level below L0 counts as L0.
    excess = np.maximum(level - table.columns["l0_db"][column], 0.0)
    excess = np.where(np.isnan(level), np.nan, excess)
    return _Place(table, np.where(duration == 0, 0.0, excess) ** 2, duration, column)


def _median(place: _Place) -> Decibels:
    full = place.term("u", "v", np.log10(np.maximum(place.years, _FULL_RULE_YEARS)))
    early = np.log10(np.minimum(place.years, _FULL_RULE_YEARS) + 1) / np.log10(_FULL_RULE_YEARS + 1)
    return full * early


def median_shift(level_db: ArrayLike, years: ArrayLike, frequency_hz: ArrayLike) -> Decibels:
    """Median noise-induced permanent threshold shift N50. [dB]

    level_db : L_EX,8h, at most 100; below the frequency's L0 the shift is 0 [dB]
    years : duration of exposure, 0 (no exposure) or 1 to 40 [years]
    frequency_hz : 500, 1000, 2000, 3000, 4000, 6000 [Hz]; the three broadcast together, NaN gives NaN

    (u + v lg t)(L − L0)² from 10 years on; below, N50(10)·lg(t + 1)/lg 11.
    Raises: OutOfScopeError outside these limits. Source: ISO 1999:2013 Table 1, formulas of N50 (Formula 3 for under
    ten years), sheet iso1999_2013 (read in a secondary text). 90 dB, 20 years, 4000 Hz: 13 printed in Annex D.
    """
    return _median(_place(level_db, years, frequency_hz))[()]


def _log_years(place: _Place) -> Decibels:
    return np.log10(np.where(place.years == 0, 1.0, place.years))


def spread_upper(level_db: ArrayLike, years: ArrayLike, frequency_hz: ArrayLike) -> Decibels:
    """d_u, the spread on the worse side, (X_u + Y_u lg t)(L − L0)²; arguments and errors of `median_shift`. [dB]

    Under ten years lg t is taken as it stands: the rule for under ten years is written for the median only, and no
    printed value settles whether it holds for the spreads (contested).
    """
    place = _place(level_db, years, frequency_hz)
    return place.term("x_u", "y_u", _log_years(place))[()]


def spread_lower(level_db: ArrayLike, years: ArrayLike, frequency_hz: ArrayLike) -> Decibels:
    """d_l, the spread on the better side, (X_l + Y_l lg t)(L − L0)²; otherwise as `spread_upper`. [dB]"""
    place = _place(level_db, years, frequency_hz)
    return place.term("x_l", "y_l", _log_years(place))[()]


def shift_at_deviate(deviate: ArrayLike, level_db: ArrayLike, years: ArrayLike, frequency_hz: ArrayLike) -> Decibels:
    """Shift of people `deviate` standard deviations from the median, positive = worse; never below 0. [dB]

    Raises: OutOfScopeError as `median_shift`, and for a deviate beyond the 5 % tails, which the standard calls
    unreliable.
    """
    k, level, duration, frequency = np.broadcast_arrays(
        np.asarray(deviate, dtype=np.float64), np.asarray(level_db), np.asarray(years), np.asarray(frequency_hz)
    )
    place = _place(level, duration, frequency)
    lowest = place.table.sheet.limits["lowest_per_cent_worse"]
    tail = float(normal_deviate(lowest))
    if np.any(np.abs(k) > tail + 1e-12):
        raise OutOfScopeError(
            f"{place.table.sheet.name}: the tails beyond {lowest} % are unreliable",
            f"stay within {lowest} to {place.table.sheet.limits['highest_per_cent_worse']} per cent",
        )
    log_years = _log_years(place)
    spread = np.where(k >= 0, place.term("x_u", "y_u", log_years), place.term("x_l", "y_l", log_years))
    return np.maximum(_median(place) + k * spread, 0.0)[()]


def shift_at_fractile(
    per_cent_worse: ArrayLike, level_db: ArrayLike, years: ArrayLike, frequency_hz: ArrayLike
) -> Decibels:
    """Shift N_Q that `per_cent_worse` per cent of the exposed exceed, 5 to 95; otherwise as `shift_at_deviate`. [dB]

    95 dB, 10 years, 4000 Hz, 10 %: 27 printed in Annex D.
    """
    return shift_at_deviate(normal_deviate(per_cent_worse), level_db, years, frequency_hz)


def combine(age_level_db: ArrayLike, noise_shift_db: ArrayLike, *, compress: str) -> Decibels:
    """Threshold level of a noise-exposed population, H' = H + N − H·N/120, same fractile in all three. [dB]

    age_level_db : H, the age-related level      noise_shift_db : N; both any shape, broadcast together
    compress : "everywhere" (the formula) or "above_40_db" (the last term only where H + N > 40 dB, as the example of
    Annex C does). No default: the two readings differ by up to 3.3 dB.

    Raises: OutOfScopeError for another reading. Source: ISO 1999:2013, Annex C (read in a secondary text).
    """
    if compress not in COMBINATIONS:
        raise OutOfScopeError(f"unknown reading compress='{compress}'", f"use one of: {', '.join(COMBINATIONS)}")
    age_level, shift = np.asarray(age_level_db, dtype=np.float64), np.asarray(noise_shift_db, dtype=np.float64)
    product = age_level * shift / 120.0
    if compress == "above_40_db":
        product = np.where(age_level + shift > 40.0, product, 0.0)
    return (age_level + shift - product)[()]
