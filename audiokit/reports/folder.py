"""Writes a review as a folder of files that appears whole or not at all."""

import dataclasses
import json
import os
from collections import deque
from collections.abc import Callable, Iterator
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import pandas as pd
import pyarrow as pa
import pyarrow.csv

from audiokit.io.atomic import replace_folder
from audiokit.reports.shifts import HEADER, ShiftLines
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


_TO_DISK = 1 << 27
"""Bytes written between two orders to the disk."""


def write_review(review: Review, out: str | Path, progress: Progress | None = None) -> None:
    """Write quarantine, intake, shifts, events, baselines, worklist, quality and summary into `out`.

    The folder is replaced as a whole: a killed run leaves the earlier files or the new ones, never a mixture.
    Raises OutputError: the folder cannot be written or holds something that is not a review's.
    """

    def fill(folder: Path) -> None:
        with ThreadPoolExecutor(max_workers=1) as beside:
            others = beside.submit(fill_others, folder)
            _write_shifts(review, folder / "shifts.csv", progress)
            others.result()

    def fill_others(folder: Path) -> None:
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
    lines = ShiftLines(review)
    with path.open("wb") as file, ThreadPoolExecutor(max_workers=1) as disk:
        file.write(HEADER)
        waiting = 0
        for number, part in enumerate(_in_order(lines.of, lines.stretches), start=1):
            waiting += file.write(part)
            if waiting > _TO_DISK:  # the disk works while lines are made, so that the end need not wait for it
                file.flush()
                disk.submit(os.fsync, file.fileno())
                waiting = 0
            if progress is not None:
                progress("writing shifts", number, len(lines.stretches))


def _in_order(make: Callable[[slice], memoryview], stretches: list[slice], workers: int = 2) -> Iterator[memoryview]:
    """Results of `make` in order, only a few ahead of the writer, so that memory stays flat."""
    with ThreadPoolExecutor(max_workers=workers) as pool:
        ahead = deque(pool.submit(make, stretch) for stretch in stretches[: workers + 1])
        for following in [*stretches[workers + 1 :], *[None] * len(ahead)]:
            yield ahead.popleft().result()
            if following is not None:
                ahead.append(pool.submit(make, following))
