"""A sheet of an Excel workbook to a RawTable: values as they were stored, dates and numbers as canonical text."""

import datetime
import io
import re
import warnings
import zipfile
from collections.abc import Sequence
from typing import Any

import numpy as np
import openpyxl
import pyarrow as pa

from audiokit.core.errors import CohortError
from audiokit.io.headings import clean_headings
from audiokit.io.raw import RawTable
from audiokit.io.texts import number_text

_FORMULA_WITHOUT_RESULT = re.compile(
    rb"<(?:\w+:)?c\b(?P<cell>[^>]*)>\s*<(?:\w+:)?f\b[^>]*(?:/>|>[^<]*</(?:\w+:)?f>)\s*"
    rb"(?P<empty><(?:\w+:)?v\s*/>|<(?:\w+:)?v></(?:\w+:)?v>)?\s*</(?:\w+:)?c>"
)

_PLACE = re.compile(rb'<(?:\w+:)?(?:row|c)\b[^>]*?\br="([A-Z]*)([0-9]+)"')


def cell_text(value: Any) -> str:
    """Canonical text of a stored value: whole numbers without ".0", ISO dates, yes and no; "" for an empty cell."""
    if value is None:
        return ""
    if isinstance(value, str):
        return value
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, int):
        return str(value)
    if isinstance(value, float):
        return number_text(value)
    if isinstance(value, datetime.datetime):
        text = value.isoformat()
        return text.removesuffix("T00:00:00")
    if isinstance(value, datetime.date | datetime.time):
        return value.isoformat()
    return str(value)


def _choose_sheet(book: Any, name: str | None, file: str) -> Any:
    sheets = {sheet.title: sheet for sheet in book.worksheets}
    if name is not None:
        if name not in sheets:
            raise CohortError(
                f"{file}: there is no sheet {name!r}", f"correct [sheet] name; the sheets are: {', '.join(sheets)}"
            )
        return sheets[name]
    for sheet in sheets.values():
        sheet.reset_dimensions()
    filled = [sheet for sheet in sheets.values() if any(any(v is not None for v in r) for r in _rows(sheet))]
    if len(filled) != 1:
        raise CohortError(
            f"{file}: {len(filled) or 'none'} of the sheets hold data ({', '.join(sheets)})",
            'say which sheet is meant: [sheet] name = "…" in cohort.toml',
        )
    return filled[0]


def _rows(sheet: Any) -> Any:
    return sheet.iter_rows(values_only=True)


def _check_formulas(content: bytes, sheet: Any, file: str) -> None:
    """A formula whose result was never stored would read as an empty cell: that is refused."""
    for found in _FORMULA_WITHOUT_RESULT.finditer(content):
        cell = found.group("cell")
        if found.group("empty") and b't="str"' in cell:
            continue  # the stored result is an empty text
        place = re.search(rb'\br="(\w+)"', cell)
        where = f", cell {place.group(1).decode()}" if place else ""
        raise CohortError(
            f"{file}, sheet {sheet.title!r}{where}: the formula has no stored result",
            "open the workbook in a spreadsheet program and save it, or replace formulas by their values",
        )


def _check_order(content: bytes, sheet: Any, file: str) -> None:
    """openpyxl drops rows, and cells of a row, that stand after one with a higher number: that is refused."""
    last = (0, 0, "")
    for found in _PLACE.finditer(content):
        letters, number = found.group(1).decode(), int(found.group(2))
        here = (number, len(letters), letters)
        if here <= last:
            what = f"cell {letters}{number}" if letters else f"row {number}"
            raise CohortError(
                f"{file}, sheet {sheet.title!r}: {what} stands out of order in the file",
                "open the workbook in a spreadsheet program and save it again",
            )
        last = here


def _filled_rows(sheet: Any) -> tuple[list[tuple[Any, ...]], list[int]]:
    rows, numbers = [], []
    for number, row in enumerate(_rows(sheet), start=1):
        if any(value is not None for value in row):
            rows.append(row)
            numbers.append(number)
    return rows, numbers


def _columns(rows: Sequence[tuple[Any, ...]], width: int) -> list[pa.ChunkedArray]:
    columns = []
    for i in range(width):
        texts = [cell_text(row[i]) if i < len(row) else "" for row in rows]
        columns.append(pa.chunked_array([pa.array(texts, pa.string()).dictionary_encode()]))
    return columns


def read_xlsx(data: bytes, file: str, *, sheet: str | None = None, header_row: int | None = None) -> RawTable:
    """One sheet of a workbook. Row numbers are those of the sheet; empty rows are no rows.

    sheet      : its name; by default the only sheet that holds data
    header_row : row of the headings, counted from 1; by default the first that is not empty
    Raises CohortError where the workbook is damaged, the sheet or its rows are missing or out of order, or a formula
    has no result.
    """
    try:
        with warnings.catch_warnings(action="ignore"):  # of dates that are none, styles, validations
            book = openpyxl.load_workbook(io.BytesIO(data), read_only=True, data_only=True)
            chosen = _choose_sheet(book, sheet, file)
            with zipfile.ZipFile(io.BytesIO(data)) as archive:
                content = archive.read(chosen._worksheet_path.lstrip("/"))
            _check_formulas(content, chosen, file)
            _check_order(content, chosen, file)
            chosen.reset_dimensions()
            rows, numbers = _filled_rows(chosen)
    except CohortError:
        raise
    except Exception as error:  # a damaged workbook raises whatever its broken part leads to
        raise CohortError(
            f"{file}: the workbook is damaged or no .xlsx ({type(error).__name__}: {str(error)[:200]})",
            "open it in a spreadsheet program and save it again as .xlsx, or export it as .csv",
        ) from error
    head = 0 if header_row is None else numbers.index(header_row) if header_row in numbers else len(rows)
    if head == len(rows):
        raise CohortError(f"{file}: the sheet has no row {header_row or 1} with headings", "correct [sheet] header_row")
    body = rows[head + 1 :]
    width = max(len(rows[head]), max((len(row) for row in body), default=0))
    names = [cell_text(value) for value in rows[head]] + [""] * (width - len(rows[head]))
    headings, columns = clean_headings(names, _columns(body, width), file)
    return RawTable(file, headings, columns, np.asarray(numbers[head + 1 :], np.int64), typed=True)
