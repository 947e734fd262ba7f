"""The three layouts in which the sites deliver their tests, and the cohort.toml that maps them."""

import datetime
import io
import re
import zipfile
from importlib import resources
from typing import Any

import openpyxl
import pandas as pd
from openpyxl.cell import WriteOnlyCell
from openpyxl.styles import Font
from openpyxl.utils import get_column_letter

from audiokit.core.vocabulary import EARS
from audiokit.example.scenario import AS_OF, DELIVERED, FREQUENCIES_HZ, SHARE_8000_OF_6000, SITES
from audiokit.example.tables import RECHECKS, THRESHOLDS

SHEET = "Audiometry"
TITLES = ("Print hall: hearing tests", f"delivered {DELIVERED.isoformat()}, levels in dB HL")
HEADER_ROW = len(TITLES) + 1

_PRINT_HEADINGS = {
    "person_id": "Emp No",
    "tested_on": "Date of test",
    "purpose": "Reason",
    "valid": "Usable",
    "hours_since_noise": "Quiet (h)",
    "audiometer_id": "Device",
    **{f"{ear}_{frequency}": f"{ear[0].upper()} {frequency}" for ear in EARS for frequency in FREQUENCIES_HZ},
    **{name: f"{name[0].upper()} 1000 again" for name in RECHECKS},
    "remarks": "Comment",
}
_PRINT_CODES = {"NR": "999", "DNT": "-"}
_PURPOSE_LETTERS = {"baseline": "B", "annual": "A", "retest": "R", "exit": "X"}

_BOTTLING_HEADINGS = {
    "person_id": "Person",
    "test_id": "Visit",
    "tested_on": "Day",
    "purpose": "Occasion",
    "valid": "OK",
    "audiometer_id": "Device",
    "ear": "Ear",
    "frequency_hz": "Hz",
    "threshold": "dB",
    "remarks": "Remarks",
}
_BOTTLING_EARS = {"right": "R", "left": "L"}
BOTTLING_DELIMITER = ";"
BOTTLING_ENCODING = "cp1252"

_FIXED_TIME = datetime.datetime.combine(DELIVERED, datetime.time())


def csv_bytes(table: pd.DataFrame, delimiter: str = ",", encoding: str = "utf-8") -> bytes:
    """A CSV file with a heading row and plain line feeds."""
    return table.to_csv(index=False, sep=delimiter, lineterminator="\n").encode(encoding)


def print_hall_table(tests: pd.DataFrame) -> pd.DataFrame:
    """The second site's own codes, still under our column names; it numbers no tests."""
    coded = tests.drop(columns=["test_id"])
    cells = list(THRESHOLDS)
    coded[cells] = coded[cells].replace(_PRINT_CODES)
    coded["purpose"] = coded["purpose"].replace(_PURPOSE_LETTERS)
    return coded[list(_PRINT_HEADINGS)]


def print_hall_workbook(table: pd.DataFrame) -> bytes:
    """Sheet with two merged title rows above the headings, numbers and dates typed; always the same bytes."""
    book = openpyxl.Workbook()
    sheet: Any = book.active
    sheet.title = SHEET
    last = get_column_letter(len(_PRINT_HEADINGS))
    for row, title in enumerate(TITLES, start=1):
        sheet.cell(row, 1, title).font = Font(bold=True)
        sheet.merge_cells(f"A{row}:{last}{row}")
    sheet.append(list(_PRINT_HEADINGS.values()))
    for record in table.itertuples(index=False, name=None):
        sheet.append([_sheet_value(sheet, text) for text in record])
    buffer = io.BytesIO()
    book.save(buffer)
    return _with_fixed_times(buffer.getvalue())


def _sheet_value(sheet: Any, text: str) -> Any:
    if re.fullmatch(r"-?\d{1,3}", text):
        return int(text)
    if re.fullmatch(r"\d+\.\d+", text):
        return float(text)
    if re.fullmatch(r"\d{4}-\d{2}-\d{2}", text):
        return datetime.date.fromisoformat(text)
    if text.startswith("="):
        cell = WriteOnlyCell(sheet, text)
        cell.data_type = "s"  # a remark that looks like a formula, not a formula
        return cell
    return text or None


def _with_fixed_times(workbook: bytes) -> bytes:
    """The same workbook without the clock's traces: times of the archive's members and of its properties."""
    stamp = f"{_FIXED_TIME.isoformat()}Z".encode()
    buffer = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(workbook)) as source, zipfile.ZipFile(buffer, "w") as target:
        for name in source.namelist():
            data = source.read(name)
            if name == "docProps/core.xml":
                data = re.sub(rb"(<dcterms:(created|modified)[^>]*>)[^<]*", rb"\g<1>" + stamp, data)
            member = zipfile.ZipInfo(name, _FIXED_TIME.timetuple()[:6])
            member.compress_type = zipfile.ZIP_DEFLATED
            member.create_system = 0
            target.writestr(member, data)
    return buffer.getvalue()


def bottling_hall_table(tests: pd.DataFrame) -> pd.DataFrame:
    """One row per threshold with the third site's codes, still under our column names; dates day first."""
    kept = [name for name in _BOTTLING_HEADINGS if name not in ("ear", "frequency_hz", "threshold")]
    rows = tests[kept].loc[tests.index.repeat(len(THRESHOLDS))]
    rows["ear"] = [_BOTTLING_EARS[ear] for ear in EARS for _ in FREQUENCIES_HZ] * len(tests)
    rows["frequency_hz"] = [str(frequency) for _ in EARS for frequency in FREQUENCIES_HZ] * len(tests)
    rows["threshold"] = tests[list(THRESHOLDS)].to_numpy(dtype=object).ravel()
    rows["tested_on"] = rows["tested_on"].str.replace(r"^(\d{4})-(\d{2})-(\d{2})$", r"\3/\2/\1", regex=True)
    return rows[list(_BOTTLING_HEADINGS)]


def bottling_hall_csv(table: pd.DataFrame) -> bytes:
    """Long CSV with semicolons, in the encoding of an old spreadsheet."""
    return csv_bytes(table.rename(columns=_BOTTLING_HEADINGS), BOTTLING_DELIMITER, BOTTLING_ENCODING)


def about(seed: int, people: int) -> bytes:
    """What the folder is and how it was made."""
    text = (resources.files("audiokit.example") / "data" / "about.md").read_text(encoding="utf-8")
    filled = text.format(seed=seed, people=people, as_of=AS_OF.isoformat(), share=SHARE_8000_OF_6000)
    return filled.encode()


def cohort_toml() -> bytes:
    """Settings, file names, and the mapping of the two sites whose files differ from ours."""
    at_8000, elsewhere = SITES[2].booth_limit_db
    lines = [
        "# Invented data, made by `audiokit example`. Nobody in this cohort exists.",
        'name = "Example cooperative (invented): sawmill, print hall, bottling hall"',
        'rulebook = "us-osha"',
        "age_correction = false",
        'baseline_revision = "reviewed"',
        f"as_of = {AS_OF.isoformat()}",
        "",
        "[files]",
        'people = "people.csv"',
        'tests = ["sawmill.csv"]',
        "",
        "# The print hall sends a sheet with two title rows, its own headings and its own codes.",
        "[[source]]",
        'tests = "print_hall.xlsx"',
        "[source.sheet]",
        f'name = "{SHEET}"',
        f"header_row = {HEADER_ROW}",
        "[source.columns]",
        *(f'{ours} = "{theirs}"' for ours, theirs in _PRINT_HEADINGS.items()),
        "[source.cells]",
        'no_response = ["999"]',
        'did_not_test = ["-"]',
        'could_not_test = ["CNT"]',
        "[source.codes.purpose]",
        *(f'{ours} = ["{theirs}"]' for ours, theirs in _PURPOSE_LETTERS.items()),
        "",
        "# The bottling hall sends one row per threshold, days before months, from a portable audiometer.",
        "[[source]]",
        'tests = "bottling_hall.csv"',
        f'delimiter = "{BOTTLING_DELIMITER}"',
        f'encoding = "{BOTTLING_ENCODING}"',
        'date_order = "dmy"',
        "[source.columns]",
        *(f'{ours} = "{theirs}"' for ours, theirs in _BOTTLING_HEADINGS.items()),
        "[source.codes.ear]",
        *(f'{ours} = ["{theirs}"]' for ours, theirs in _BOTTLING_EARS.items()),
        "[source.response_limits]",
        *(f"{frequency} = {at_8000 if frequency == 8000 else elsewhere}" for frequency in FREQUENCIES_HZ),
    ]
    return ("\n".join(lines) + "\n").encode()
