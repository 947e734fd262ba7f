"""One file while it is being read: its raw table, the meaning of its columns, and its problems so far."""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from audiokit.io.date_cells import FIRST_YEAR, LAST_YEAR, ParsedDates, accepted_forms, parse_dates
from audiokit.io.headings import Mapped
from audiokit.io.quarantine import ProblemLog, looks_like_formula
from audiokit.io.raw import Encoded, RawTable
from audiokit.io.source_settings import SourceSettings
from audiokit.io.words import UNKNOWN_WORD, parse_words


@dataclass(frozen=True)
class SourceTable:
    """A file's raw table with the names of its columns, how it is written, and the log of its problems."""

    raw: RawTable
    mapped: Mapped
    settings: SourceSettings
    log: ProblemLog

    def __len__(self) -> int:
        return len(self.raw)

    def has(self, name: str) -> bool:
        """True where the file has a column of our name."""
        return name in self.mapped.heading

    def column(self, name: str) -> Encoded:
        """The column of our name."""
        return self.raw.encoded(self.mapped.heading[name])

    def named(self, name: str) -> Encoded | None:
        """A column by our name, or by its heading where no name of ours stands for it; None where there is none."""
        if self.has(name):
            return self.column(name)
        return self.raw.encoded(name) if name in self.mapped.others else None

    def add(self, code: str, where: NDArray, name: str = "", detail: str | pa.StringArray = "") -> None:
        """Note a problem in the column of our name."""
        self.log.add(code, where, self.mapped.heading[name] if name else "", detail)

    def add_faults(self, name: str, fault: NDArray[np.object_], details: dict[str, str] | None = None) -> None:
        """Note the faults of a column's distinct texts: a code of problem each, "" where there is none."""
        for code in sorted(set(fault) - {""}):
            self.add(code, self.column(name).spread(fault == code), name, (details or {}).get(code, ""))

    def check_blank_rows(self) -> NDArray[np.bool_]:
        """Note rows that hold nothing at all; returns where they are. [row]"""
        blank = self.column("person_id").blank()
        for heading in self.raw.headings:
            if not blank.any():
                break
            at = np.flatnonzero(blank)
            column = self.raw.encoded(heading)
            texts_blank = pc.equal(column.stripped, "").to_numpy(zero_copy_only=False)
            blank[at] = texts_blank[column.codes[at]]
        self.add("blank_row", blank)
        return blank

    def check_ids(self, name: str, skip: NDArray[np.bool_]) -> None:
        """Note identifiers that a spreadsheet would run as a formula, and, for person_id, missing ones."""
        column = self.column(name)
        if name == "person_id":
            self.add("missing_person_id", column.blank() & ~skip, name)
        self.add("formula_like_id", column.spread(looks_like_formula(column.stripped)), name)

    def dates(self, name: str, first_year: int = FIRST_YEAR) -> ParsedDates:
        """Dates of a column's distinct texts; faulty ones are noted."""
        parsed = parse_dates(self.column(name).stripped, self.settings.date_order, first_year=first_year)
        details = {
            "unreadable_date": accepted_forms(self.settings.date_order),
            "impossible_date": f"{first_year} to {LAST_YEAR}",
        }
        self.add_faults(name, parsed.fault, details)
        return parsed

    def words(self, name: str, accepted: Mapping[str, int], skip: NDArray[np.bool_]) -> NDArray[np.int8]:
        """Codes of a column of words; unknown words are noted as unknown_<name> and coded UNKNOWN_WORD. [row]"""
        column = self.column(name)
        codes = parse_words(column.stripped.to_pylist(), accepted, self.settings.codes.get(name, {}), name)
        unknown = codes == UNKNOWN_WORD
        if unknown.any():
            self.add(f"unknown_{name}", column.spread(unknown) & ~skip, name)
        return column.spread(codes)
