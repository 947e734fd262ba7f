"""How one file is written: its columns, codes, sheet and number formats, as cohort.toml tells."""

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from typing import Any

from audiokit.core.vocabulary import FREQUENCIES_HZ, HIGHEST_DB_HL, LOWEST_DB_HL, Response
from audiokit.io.columns import PEOPLE_COLUMNS, TEST_COLUMNS
from audiokit.io.date_cells import DATE_ORDERS
from audiokit.io.toml_tables import TomlTable, shown

FORMAT_KEYS = ("encoding", "delimiter", "date_order", "decimal_comma", "cells", "response_limits", "sheet", "codes")
"""Keys that may stand at the top of cohort.toml and in a [[source]] table."""

_LAST_ROW = 2**31

CODE_WORDS = {
    "sex": ("female", "male", "unknown"),
    "purpose": ("baseline", "annual", "retest", "exit", "other", "blank"),
    "ear": ("right", "left"),
    "valid": ("yes", "no"),
}
"""Columns whose words a site may map, and our words."""

_CELL_RESPONSES = {
    "no_response": Response.NO_RESPONSE,
    "did_not_test": Response.DID_NOT_TEST,
    "could_not_test": Response.COULD_NOT_TEST,
    "not_recorded": Response.NOT_RECORDED,
}


@dataclass(frozen=True)
class SourceSettings:
    """How one file is written.

    columns         : our column name -> heading in the file
    columns_section : where that was set, for messages
    cells           : the site's own threshold codes, exact text -> response
    response_limits : frequency -> level of a bare "no response" [tenths of a dB HL]
    sheet, header_row : sheet name, and row of the headings counted from 1; None: the only sheet, its first row
    codes           : column -> the site's word in lower case -> our word
    """

    columns: Mapping[str, str] = field(default_factory=dict)
    columns_section: str = "[columns.tests]"
    cells: Mapping[str, Response] = field(default_factory=dict)
    response_limits: Mapping[int, int] = field(default_factory=dict)
    sheet: str | None = None
    header_row: int | None = None
    encoding: str | None = None
    delimiter: str = ","
    date_order: str | None = None
    decimal_comma: bool = False
    codes: Mapping[str, Mapping[str, str]] = field(default_factory=dict)


def read_columns(table: TomlTable, kind: str) -> dict[str, str]:
    """Our column names and the headings that stand for them. `kind` is people or tests."""
    table.only(PEOPLE_COLUMNS if kind == "people" else TEST_COLUMNS)
    found = {}
    for key in table.content:
        heading = table.text(key)
        assert heading is not None
        found[key] = heading.strip()
    return found


def _read_cells(table: TomlTable) -> dict[str, Response]:
    table.only(tuple(_CELL_RESPONSES))
    found: dict[str, Response] = {}
    for key in table.content:
        for code in table.codes(key):
            if found.get(code, _CELL_RESPONSES[key]) is not _CELL_RESPONSES[key]:
                raise table.error(key, f"the code {code!r} is given two meanings", "leave one of them")
            found[code] = _CELL_RESPONSES[key]
    return found


def _read_limits(table: TomlTable) -> dict[int, int]:
    table.only(tuple(map(str, FREQUENCIES_HZ)))
    found = {}
    for key, value in table.content.items():
        number = isinstance(value, int | float) and not isinstance(value, bool)
        if not number or not LOWEST_DB_HL <= value <= HIGHEST_DB_HL or round(value * 10) / 10 != value:
            raise table.error(
                key,
                f"{shown(value)} is not a level of {LOWEST_DB_HL} to {HIGHEST_DB_HL} dB HL",
                "write a number with at most one decimal",
            )
        found[int(key)] = round(value * 10)
    return found


def _read_codes(table: TomlTable) -> dict[str, dict[str, str]]:
    table.only(tuple(CODE_WORDS))
    found: dict[str, dict[str, str]] = {}
    for column in table.content:
        words = table.table(column)
        assert words is not None
        words.only(CODE_WORDS[column])
        theirs: dict[str, str] = {}
        for ours in words.content:
            for code in words.codes(ours):
                if theirs.setdefault(code.casefold(), ours) != ours:
                    raise words.error(ours, f"the code {code!r} is given two meanings", "leave one of them")
        found[column] = theirs
    return found


def _read_sheet(table: TomlTable) -> dict[str, Any]:
    table.only(("name", "header_row"))
    row = table.content.get("header_row")
    if row is not None and (isinstance(row, bool) or not isinstance(row, int) or not 1 <= row <= _LAST_ROW):
        raise table.error("header_row", f"{shown(row)} is not a row number", "write a whole number from 1")
    return {"sheet": table.text("name"), "header_row": row}


def _read_encoding(table: TomlTable) -> str | None:
    name = table.text("encoding")
    try:
        "a".encode(name or "utf-8")
    except (LookupError, ValueError):
        raise table.error("encoding", f"{name!r} is not known", 'write for example "utf-8" or "cp1252"') from None
    return name


def _read_delimiter(table: TomlTable) -> str | None:
    value = table.typed("delimiter", str)
    if value is not None and (len(value) != 1 or not value.isascii() or value.isalnum() or value in '"\r\n.-'):
        raise table.error("delimiter", f"{value!r} cannot stand between cells", 'write one character, such as ";"')
    return value


def read_format(table: TomlTable, inherited: SourceSettings) -> SourceSettings:
    """Settings of one table; what it does not set is inherited, a table that it sets replaces the inherited one."""
    changes: dict[str, Any] = {
        "encoding": _read_encoding(table),
        "delimiter": _read_delimiter(table),
        "date_order": table.choice("date_order", DATE_ORDERS),
        "decimal_comma": table.flag("decimal_comma"),
    }
    changes = {key: value for key, value in changes.items() if value is not None}
    if (cells := table.table("cells")) is not None:
        changes["cells"] = _read_cells(cells)
    if (limits := table.table("response_limits")) is not None:
        changes["response_limits"] = _read_limits(limits)
    if (codes := table.table("codes")) is not None:
        changes["codes"] = {**inherited.codes, **_read_codes(codes)}
    if (sheet := table.table("sheet")) is not None:
        changes |= _read_sheet(sheet)
    return replace(inherited, **changes)
