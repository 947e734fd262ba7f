"""Invented cohorts for the benchmarks: long-tailed histories of 1 to 30 tests, 2 % missing, 0.5 % no response."""

import datetime
from pathlib import Path

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.parquet as pq

from audiokit.core.vocabulary import EARS, Purpose, Response, Sex
from audiokit.model.grid import People, ThresholdGrid

FREQUENCIES_HZ = (500, 1000, 2000, 3000, 4000, 6000, 8000)
AS_OF = datetime.date(2026, 3, 1)


def make_arrays(tests: int, seed: int = 1) -> tuple[People, ThresholdGrid]:
    """So many tests as the arrays that reading files would give. Growth of 0 to about 2 dB a year at 4 kHz, retests in
    a tenth of the cases, 5 dB steps: invented, plausible in the share of shifts."""
    rng = np.random.default_rng(seed)
    counts = np.minimum(1 + rng.geometric(0.13, size=tests // 2 + 1), 30)
    people = int(np.searchsorted(np.cumsum(counts), tests)) + 1
    counts = counts[:people]
    counts[-1] -= counts.sum() - tests
    first = np.concatenate(([0], np.cumsum(counts))).astype(np.int64)
    person = np.repeat(np.arange(people, dtype=np.int32), counts)
    gap = np.where(rng.random(tests) < 0.1, rng.integers(5, 45, tests), rng.integers(330, 400, tests))
    purpose = np.where(gap < 45, Purpose.RETEST, Purpose.ANNUAL).astype(np.int8)
    purpose[first[:-1]] = Purpose.BASELINE
    gap[first[:-1]] = 0
    since = np.cumsum(gap) - np.repeat(np.cumsum(gap)[first[:-1]], counts)
    started = rng.integers(9000, 10000, people)
    day = (np.repeat(started, counts) + since).astype(np.int32)
    shape = (2, len(FREQUENCIES_HZ), tests)
    threshold, response = np.zeros(shape, dtype=np.int16), np.zeros(shape, dtype=np.int8)
    for ear in (0, 1):
        level = np.repeat(rng.normal(6, 5, people), counts)
        growth = np.repeat(rng.exponential(0.35, people), counts) * since / 365.25
        for at in range(len(FREQUENCIES_HZ)):
            heard = level + growth * (0.4 + 0.3 * at) + rng.normal(0, 4, tests)
            threshold[ear, at] = np.clip(np.rint(heard / 5) * 50, -100, 1000)
            chance = rng.random(tests)
            response[ear, at] = np.where(chance < 0.02, Response.NOT_RECORDED, Response.MEASURED)
            response[ear, at][(chance >= 0.02) & (chance < 0.025)] = Response.NO_RESPONSE
            threshold[ear, at][response[ear, at] == Response.NOT_RECORDED] = 0
            threshold[ear, at][response[ear, at] == Response.NO_RESPONSE] = 1000
    born = (started - rng.integers(18 * 365, 50 * 365, people)).astype(np.int32)
    names = pa.array([f"p{number:07d}" for number in range(people)])
    unknown = np.full(people, np.iinfo(np.int32).min, dtype=np.int32)
    crowd = People(
        person_id=names,
        sex=rng.integers(Sex.FEMALE, Sex.MALE + 1, people).astype(np.int8),
        birth_day=born,
        birth_year=(born // 365.25 + 1970).astype(np.int16),
        left_day=unknown,
        noise_since_day=unknown,
        hired_day=unknown,
        table=pd.DataFrame({"person_id": names.to_pandas()}),
    )
    grid = ThresholdGrid(
        person=person,
        first=first,
        day=day,
        purpose=purpose,
        valid=np.ones(tests, dtype=bool),
        test_id=pa.array(np.arange(tests).astype(str)),
        frequencies_hz=FREQUENCIES_HZ,
        threshold=threshold,
        response=response,
    )
    return crowd, grid


def write_parquet_cohort(folder: Path, tests: int, seed: int = 1) -> None:
    """The same cohort as the files a user would bring: people.parquet, tests.parquet, cohort.toml."""
    people, grid = make_arrays(tests, seed)
    folder.mkdir(parents=True, exist_ok=True)
    sexes = pa.array(["unknown", "female", "male"]).take(pa.array(people.sex))
    birth = pa.array(people.birth_day).cast(pa.date32())
    table = pa.table({"person_id": people.person_id, "sex": sexes, "birth_date": birth})
    pq.write_table(table, folder / "people.parquet")
    purposes = pa.array(["", "baseline", "annual", "retest", "exit", "other"]).take(pa.array(grid.purpose))
    columns = {
        "person_id": people.person_id.take(pa.array(grid.person)),
        "test_id": grid.test_id,
        "tested_on": pa.array(grid.day).cast(pa.date32()),
        "purpose": purposes,
    }
    for ear, name in enumerate(EARS):
        for at, hz in enumerate(FREQUENCIES_HZ):
            level = pa.array(grid.threshold[ear, at] // 10, mask=grid.response[ear, at] == Response.NOT_RECORDED)
            open_ = pa.array(grid.response[ear, at] == Response.NO_RESPONSE)
            columns[f"{name}_{hz}"] = pa.compute.if_else(open_, pa.scalar("NR"), level.cast(pa.string()))
    pq.write_table(pa.table(columns), folder / "tests.parquet")
    (folder / "cohort.toml").write_text(f"name = 'benchmark'\nas_of = {AS_OF.isoformat()}\n", encoding="utf-8")
