"""Small cohort folders for tests: written from text, bytes or frames, read, and their problems listed."""

import datetime
import io
from pathlib import Path

import openpyxl
import pandas as pd

from audiokit.io.cohort import read_cohort
from audiokit.model.cohort import Cohort

AS_OF = datetime.date(2026, 3, 1)
PEOPLE = "person_id,sex,birth_date\nP1,f,1980-01-01\nP2,m,1975-05-05\n"
TESTS = "person_id,tested_on,purpose,right_1000,left_1000\nP1,2020-01-01,baseline,10,15\nP2,2020-02-01,annual,NR,DNT\n"


def write(folder: Path, **files: str | bytes) -> Path:
    """A folder with files; a name such as tests_csv stands for tests.csv. People and tests are there by default."""
    folder.mkdir(exist_ok=True)
    names = {name.rsplit("_", 1)[0] for name in files}
    if "people" not in names:
        (folder / "people.csv").write_text(PEOPLE, encoding="utf-8")
    if "tests" not in names and not any("tests =" in str(text) for text in files.values()):
        (folder / "tests.csv").write_text(TESTS, encoding="utf-8")
    for name, content in files.items():
        path = folder / ".".join(name.rsplit("_", 1))
        path.write_bytes(content if isinstance(content, bytes) else content.encode())
    return folder


def read(folder: Path, **arguments: object) -> Cohort:
    """The folder's cohort, as of a fixed date."""
    return read_cohort(folder, as_of=AS_OF, **arguments)  # type: ignore[arg-type]


def problems(cohort: Cohort, file: str | None = None) -> list[list[object]]:
    """[row, column, code] of every problem, in order."""
    frame = cohort.quarantine if file is None else cohort.quarantine[cohort.quarantine["file"] == file]
    return frame[["row", "column", "code"]].values.tolist()


def counts(cohort: Cohort) -> dict[str, tuple[int, int, int]]:
    """Per file: rows read, accepted, quarantined."""
    return {i.file: (i.rows_read, i.accepted, i.quarantined) for i in cohort.intake}


def workbook(rows: list[list[object]], title: str = "Sheet", *, formulas: bool = False) -> bytes:
    """An xlsx file with one sheet; a text that begins with = is a formula only where `formulas`."""
    book = openpyxl.Workbook()
    sheet = book.active
    assert sheet is not None
    sheet.title = title
    for row in rows:
        sheet.append(row)
    for cell in sheet._cells.values() if not formulas else ():
        if isinstance(cell.value, str):
            cell.data_type = "s"
    data = io.BytesIO()
    book.save(data)
    return data.getvalue()


def parquet(frame: pd.DataFrame) -> bytes:
    """A parquet file."""
    data = io.BytesIO()
    frame.to_parquet(data, index=False)
    return data.getvalue()


def grid_rows(cohort: Cohort) -> list[tuple[object, ...]]:
    """Every test as plain values, in the grid's order: person, day, purpose, valid, levels and responses."""
    grid = cohort.grid
    ids = cohort.people.person_id.to_pylist()
    return [
        (
            ids[grid.person[t]],
            int(grid.day[t]),
            int(grid.purpose[t]),
            bool(grid.valid[t]),
            grid.test_id[t].as_py(),
            tuple(grid.threshold[:, :, t].ravel().tolist()),
            tuple(grid.response[:, :, t].ravel().tolist()),
        )
        for t in range(len(grid))
    ]
