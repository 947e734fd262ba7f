"""The mechanics alone against the plain part in polars, on all its threads, in the same run.

    python -m tests.benchmarks.mechanics --tests 1000000

Ours: arrays in; verdicts, events and baselines of all criteria out, in both revision modes. Reference: polars joins
each test to its person's first, age-corrects, averages 2, 3 and 4 kHz of both ears, compares and counts by year.
"""

import argparse
import datetime
import time
from collections.abc import Callable
from typing import Any

import numpy as np
import polars as pl

from audiokit.core.vocabulary import EARS, Response
from audiokit.model.cohort import Cohort, Settings
from audiokit.model.grid import People, ThresholdGrid
from audiokit.standards.age_tables import age_table
from audiokit.surveillance.review import review
from tests.benchmarks.cohorts import FREQUENCIES_HZ, make_arrays

MEAN_HZ = (2000, 3000, 4000)

AFTER_ALL = datetime.date(2031, 1, 1)
"""Date of the review, after every test: choosing the tests is no part of the mechanics."""


def best_of(work: Callable[[], Any], rounds: int) -> float:
    """Shortest wall time of several rounds. [seconds]"""
    times = []
    for _ in range(rounds):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return min(times)


def cohort_of(people: People, grid: ThresholdGrid, mode: str, age_correction: bool = True) -> Cohort:
    """The arrays as a cohort with the settings of one mode."""
    from pathlib import Path

    import pandas as pd

    settings = Settings("benchmark", AFTER_ALL, age_correction=age_correction, baseline_revision=mode)
    return Cohort(Path(), settings, people, grid, pd.DataFrame(), ())


def polars_plain(people: People, grid: ThresholdGrid) -> Callable[[], pl.DataFrame]:
    """The plain part as a lazy query over frames that lie ready in memory."""
    columns = [f"{ear}_{hz}" for ear in EARS for hz in MEAN_HZ]
    data: dict[str, Any] = {"person": grid.person, "day": pl.Series(grid.day).cast(pl.Date)}
    for ear, name in enumerate(EARS):
        for hz in MEAN_HZ:
            at = FREQUENCIES_HZ.index(hz)
            level = pl.Series("level", grid.threshold[ear, at] // 10)
            there = pl.Series("there", grid.response[ear, at] <= Response.NO_RESPONSE)
            data[f"{name}_{hz}"] = pl.select(pl.when(there).then(level)).to_series()
    tests = pl.DataFrame(data)
    crowd = pl.DataFrame(
        {
            "person": np.arange(len(people), dtype=np.int32),
            "sex": people.sex,
            "birth": pl.Series(people.birth_day).cast(pl.Date),
        }
    )
    table = age_table("us_29cfr1910_95_appendix_f")
    values = table.lookup(list(MEAN_HZ)).sum(axis=1)
    ages = pl.DataFrame(
        {
            "sex": np.repeat(np.array([1, 2], dtype=np.int8), 41),
            "age": np.tile(np.arange(20, 61, dtype=np.int32), 2),
            "c": values[1:, 20:61].reshape(-1).astype(np.int32),
        }
    ).lazy()

    def age(day: str) -> pl.Expr:
        number = [pl.col(c).dt.month().cast(pl.Int32) * 100 + pl.col(c).dt.day() for c in (day, "birth")]
        years = pl.col(day).dt.year() - pl.col("birth").dt.year() - (number[0] < number[1]).cast(pl.Int32)
        return years.clip(20, 60).cast(pl.Int32)

    def query() -> pl.DataFrame:
        firsts = [pl.col(column).first().alias(f"base_{column}") for column in columns]
        base = tests.lazy().group_by("person").agg(pl.col("day").first().alias("base_day"), *firsts)
        joined = (
            tests.lazy()
            .join(crowd.lazy(), on="person")
            .join(base, on="person")
            .with_columns(age("day").alias("age"), age("base_day").alias("base_age"))
            .join(ages, on=["sex", "age"])
            .join(ages.rename({"age": "base_age", "c": "base_c"}), on=["sex", "base_age"])
        )
        met = [
            sum((pl.col(f"{ear}_{hz}") - pl.col(f"base_{ear}_{hz}")).cast(pl.Int32) for hz in MEAN_HZ)
            - (pl.col("c") - pl.col("base_c"))
            >= 30
            for ear in EARS
        ]
        either = (met[0] | met[1]).alias("met")
        by_year = joined.with_columns(either).group_by(pl.col("day").dt.year().alias("year"))
        return by_year.agg(pl.len(), pl.col("met").sum()).sort("year").collect()

    return query


def measure(tests: int, rounds: int) -> dict[str, float]:
    """Seconds of the reference and of either mode, best of several rounds."""
    people, grid = make_arrays(tests)
    reference = polars_plain(people, grid)
    cohorts = {mode: cohort_of(people, grid, mode) for mode in ("reviewed", "automatic")}
    reference()
    times = {"polars": best_of(reference, rounds)}
    for mode, cohort in cohorts.items():
        times[mode] = best_of(lambda cohort=cohort: review(cohort), rounds)  # type: ignore[misc]
    times["polars"] = min(times["polars"], best_of(reference, rounds))
    return times


def main() -> None:
    """Print the figures."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--tests", type=int, default=1_000_000)
    parser.add_argument("--rounds", type=int, default=5)
    options = parser.parse_args()
    times = measure(options.tests, options.rounds)
    print(f"{options.tests} tests, best of {options.rounds}, polars on {pl.thread_pool_size()} threads")
    for name, seconds in times.items():
        print(f"{name:10} {seconds:7.3f} s  {seconds / times['polars']:5.2f} of polars")


if __name__ == "__main__":
    main()
