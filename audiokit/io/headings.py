"""Headings of a file, and which of our columns stands under which of them."""

import difflib
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import pyarrow as pa

from audiokit.core.errors import CohortError
from audiokit.core.vocabulary import FREQUENCIES_HZ
from audiokit.io.columns import (
    LONG_COLUMNS,
    PEOPLE_COLUMNS,
    TEST_COLUMNS,
    THRESHOLD_COLUMNS,
    is_false_threshold_column,
)
from audiokit.io.raw import RawTable, encode

_MOST_SHOWN, _LONGEST_SHOWN = 60, 80


def clean_headings(
    names: Sequence[str], columns: Sequence[pa.ChunkedArray], file: str
) -> tuple[tuple[str, ...], tuple[pa.ChunkedArray, ...]]:
    """Headings without white space at the ends; a column without heading is dropped if empty, else named by its place.

    Raises CohortError where two columns have the same heading.
    """
    headings: dict[str, int] = {}
    kept = []
    for place, (name, column) in enumerate(zip(names, columns, strict=True), start=1):
        heading = name.strip()
        if not heading:
            if encode(column).blank().all():
                continue
            heading = f"(column {place})"
        if heading in headings:
            raise CohortError(
                f"{file}: columns {headings[heading]} and {place} have the same heading {heading!r}",
                "give every column its own heading, or delete the one that is not needed",
            )
        headings[heading] = place
        kept.append(column)
    return tuple(headings), tuple(kept)


@dataclass(frozen=True)
class Mapped:
    """A file's headings by our names.

    heading : our column name -> heading in the file
    others  : headings that no name of ours stands for
    is_long : True for a tests table with one row per threshold
    """

    heading: Mapping[str, str]
    others: tuple[str, ...]
    is_long: bool = False

    def ours(self, heading: str) -> str:
        """Our name of a heading where there is one, else the heading itself."""
        return next((name for name, theirs in self.heading.items() if theirs == heading), heading)


def _listed(headings: Sequence[str]) -> str:
    """Headings for a message: not more than can be read."""
    cut = [f"{h[: _LONGEST_SHOWN - 1]}…" if len(h) > _LONGEST_SHOWN else h for h in headings[:_MOST_SHOWN]]
    return ", ".join(cut + ["…"] * (len(headings) > _MOST_SHOWN)) if headings else "none"


def _map(table: RawTable, known: Sequence[str], mapping: Mapping[str, str], section: str) -> Mapped:
    heading: dict[str, str] = {}
    for name, theirs in mapping.items():
        if theirs not in table.headings:
            near = difflib.get_close_matches(theirs, table.headings, 1)
            raise CohortError(
                f"{table.file}: no column has the heading {theirs!r}, which {section} names for {name}"
                + (f"; the nearest is {near[0]!r}" if near else ""),
                f"correct cohort.toml; the file's headings are: {_listed(table.headings)}",
            )
        if theirs != name and name in table.headings and name not in mapping.values():
            raise CohortError(
                f"{table.file}: {section} takes {name} from {theirs!r}, but the file also has a column {name!r}",
                f"remove {name} from {section} in cohort.toml, or rename that column of the file",
            )
        if theirs in heading.values():
            raise CohortError(
                f"{table.file}: {section} names the heading {theirs!r} for two columns", "name each heading once"
            )
        heading[name] = theirs
    taken = set(heading.values())
    heading |= {name: name for name in table.headings if name in known and name not in taken}
    others = tuple(name for name in table.headings if name not in set(heading.values()))
    for theirs in others:
        name = re.sub(r"[\s\-_]+", "_", theirs).casefold()
        if name in known and name not in heading:
            raise CohortError(
                f"{table.file}: the column {theirs!r} would not be read, as our name for it is written {name}",
                f'rename it, or name it under {section} in cohort.toml: {name} = "{theirs}"',
            )
    return Mapped(heading, others)


def _missing(table: RawTable, names: Sequence[str], others: Sequence[str], section: str, what: str) -> CohortError:
    near = [(name, match[0]) for name in names if (match := difflib.get_close_matches(name, others, 1))]
    hint = "; ".join(f"{name} may be the column {match!r}" for name, match in near)
    lower = " If the headings stand further down, set header_row under [sheet]."
    return CohortError(
        f"{table.file}: {what}" + (f"; {hint}" if hint else ""),
        f"name the column under {section} in cohort.toml (ours = theirs); "
        f"the file's headings are: {_listed(table.headings)}" + (lower if len(others) == len(table.headings) else ""),
    )


def map_people(table: RawTable, mapping: Mapping[str, str], section: str = "[columns.people]") -> Mapped:
    """Our names for the columns of a people table.

    Raises CohortError where a required column is missing, or a mapped heading is not in the file.
    """
    mapped = _map(table, PEOPLE_COLUMNS, mapping, section)
    missing = [name for name in ("person_id", "sex") if name not in mapped.heading]
    if missing:
        raise _missing(table, missing, mapped.others, section, f"the column {' and '.join(missing)} is missing")
    if not {"birth_date", "birth_year"} & set(mapped.heading):
        names = ["birth_date", "birth_year"]
        raise _missing(table, names, mapped.others, section, "a column birth_date or birth_year is missing")
    return mapped


def map_tests(table: RawTable, mapping: Mapping[str, str], section: str = "[columns.tests]") -> Mapped:
    """Our names for the columns of a tests table, wide or long.

    Raises CohortError where a required column is missing, a mapped heading is not in the file, a column is built like
    a threshold column of no audiometric frequency, or the table is wide and long at once.
    """
    mapped = _map(table, TEST_COLUMNS, mapping, section)
    for name in mapped.others:
        if is_false_threshold_column(name):
            raise CohortError(
                f"{table.file}: the column {name!r} is of no audiometric frequency",
                f"rename it; audiometric frequencies are {', '.join(map(str, FREQUENCIES_HZ))} Hz",
            )
    missing = [name for name in ("person_id", "tested_on") if name not in mapped.heading]
    if missing:
        raise _missing(table, missing, mapped.others, section, f"the column {' and '.join(missing)} is missing")
    wide = [name for name in mapped.heading if name in THRESHOLD_COLUMNS]
    long = [name for name in LONG_COLUMNS if name in mapped.heading]
    if wide and long:
        raise CohortError(
            f"{table.file}: the columns {', '.join(long)} belong to a table with one row per threshold, "
            f"{', '.join(wide)} to one with one row per test",
            "keep one of the two forms",
        )
    if long and len(long) < len(LONG_COLUMNS):
        missing = [name for name in LONG_COLUMNS if name not in long]
        raise _missing(table, missing, mapped.others, section, f"the column {' and '.join(missing)} is missing")
    if not wide and not long:
        raise _missing(
            table,
            ["right_1000", "left_1000", *LONG_COLUMNS],
            mapped.others,
            section,
            "no column holds thresholds (right_500 … left_8000, or ear, frequency_hz and threshold)",
        )
    return Mapped(mapped.heading, mapped.others, bool(long))
