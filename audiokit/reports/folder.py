"""Writes a review as a folder of files that appears whole or not at all."""

import dataclasses
import io
import json
from collections.abc import Callable, Iterator
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.csv
from numpy.typing import NDArray

from audiokit.io.atomic import replace_folder
from audiokit.reports.shifts import output_order, shifts_table
from audiokit.reports.summary import summary_page
from audiokit.reports.tables import baselines_table, events_table
from audiokit.surveillance.quality import quality_table
from audiokit.surveillance.review import Progress, Review

FILES = frozenset(
    {
        "quarantine.csv",
        "intake.json",
        "shifts.csv",
        "events.csv",
        "baselines.csv",
        "worklist.csv",
        "quality.csv",
        "summary.html",
    }
)

BLOCK_TESTS = 1 << 15
"""Tests whose rows are made and written at a time: bounds the memory, and gives the threads their unit."""


def write_review(review: Review, out: str | Path, progress: Progress | None = None) -> None:
    """Write quarantine, intake, shifts, events, baselines, worklist, quality and summary into `out`.

    The folder is replaced as a whole: a killed run leaves the earlier files or the new ones, never a mixture.
    Raises OutputError: the folder cannot be written or holds something that is not a review's.
    """

    def fill(folder: Path) -> None:
        _write_shifts(review, folder / "shifts.csv", progress)
        _write_table(events_table(review), folder / "events.csv")
        _write_table(baselines_table(review), folder / "baselines.csv")
        _write_frame(review.worklist, folder / "worklist.csv")
        _write_frame(quality_table(review), folder / "quality.csv")
        _write_frame(review.cohort.quarantine, folder / "quarantine.csv")
        (folder / "intake.json").write_text(_intake(review), encoding="utf-8")
        (folder / "summary.html").write_text(summary_page(review), encoding="utf-8")

    replace_folder(Path(out), fill, FILES)


def _intake(review: Review) -> str:
    files = {
        entry.file: {k: v for k, v in dataclasses.asdict(entry).items() if k != "file"}
        for entry in review.cohort.intake
    }
    content = {
        "as_of": review.cohort.settings.as_of.isoformat(),
        "tests_after_as_of": review.tests_after_as_of(),
        "files": files,
    }
    return json.dumps(content, indent=2, ensure_ascii=False) + "\n"


def _write_frame(frame: pd.DataFrame, path: Path) -> None:
    _write_table(pa.Table.from_pandas(frame.replace("", None), preserve_index=False), path)


def _write_table(table: pa.Table, path: Path) -> None:
    pyarrow.csv.write_csv(table, path)


def _write_shifts(review: Review, path: Path, progress: Progress | None) -> None:
    order = output_order(review)
    order = order[~review.history.before[order]]
    blocks = [order[start : start + BLOCK_TESTS] for start in range(0, len(order), BLOCK_TESTS)] or [order]

    def make(tests: NDArray[np.integer], header: bool) -> bytes:
        buffer = io.BytesIO()
        options = pyarrow.csv.WriteOptions(include_header=header)
        pyarrow.csv.write_csv(shifts_table(review, tests), buffer, options)
        return buffer.getvalue()

    with path.open("wb") as file:
        for number, text in enumerate(_in_order(make, blocks), start=1):
            file.write(text)
            if progress is not None:
                progress("writing shifts", number, len(blocks))


def _in_order(
    make: Callable[[NDArray[np.integer], bool], bytes], blocks: list[NDArray[np.integer]], workers: int = 2
) -> Iterator[bytes]:
    """Results of `make` in order, only a few blocks ahead of the writer, so that memory stays flat."""
    with ThreadPoolExecutor(max_workers=workers) as pool:
        ahead = [pool.submit(make, block, number == 0) for number, block in enumerate(blocks[: workers + 1])]
        for number in range(len(blocks)):
            yield ahead.pop(0).result()
            following = number + workers + 1
            if following < len(blocks):
                ahead.append(pool.submit(make, blocks[following], False))
