"""The register of published tables: one CSV of numbers and one source sheet (TOML) per table and edition."""

import functools
import tomllib
from dataclasses import dataclass
from importlib import resources
from importlib.resources.abc import Traversable
from typing import Any

import pandas as pd

from audiokit.core.errors import AudiokitError

STANDINGS = ("read", "read in a secondary text", "from memory, unverified")
"""How a number is known, best first: in the text itself; in another text's copy of it; only recalled."""

_SHEET_KEYS = {"issuer", "title", "edition", "locator", "unit", "limits", "known", "errata"}
_REQUIRED_KEYS = _SHEET_KEYS - {"errata"}
_KNOWN_KEYS = {"part", "standing", "remark"}


class TableError(AudiokitError):
    """A published table is not in the register, or its sheet breaks the grammar of sheets."""


@dataclass(frozen=True)
class KnownPart:
    """How one part of a table is known; `part` names columns or rows, `standing` is one of STANDINGS."""

    part: str
    standing: str
    remark: str = ""


@dataclass(frozen=True)
class SourceSheet:
    """Where a table comes from.

    locator : clause or table of the text      unit : of the values in the CSV
    limits  : name of a limit -> value, as the text states it (ages in years, frequencies in Hz, levels in dB)
    known   : how each part is known      errata : slips found in the text or between its copies
    """

    name: str
    issuer: str
    title: str
    edition: str
    locator: str
    unit: str
    limits: dict[str, Any]
    known: tuple[KnownPart, ...]
    errata: tuple[str, ...] = ()

    @property
    def standing(self) -> str:
        """The weakest standing of any part of the table."""
        return max((part.standing for part in self.known), key=STANDINGS.index)


@dataclass(frozen=True)
class PublishedTable:
    """The numbers of one table (`frame`, columns as in its CSV) with their source sheet."""

    frame: pd.DataFrame
    sheet: SourceSheet


def _folder() -> Traversable:
    return resources.files("audiokit.standards") / "tables"


def list_tables() -> tuple[str, ...]:
    """Names of all tables in the register, sorted."""
    return tuple(sorted(entry.name.removesuffix(".toml") for entry in _folder().iterdir() if _is_sheet(entry.name)))


def _is_sheet(file_name: str) -> bool:
    return file_name.endswith(".toml")


def parse_sheet(name: str, text: str) -> SourceSheet:
    """Read a source sheet.

    Raises: TableError where the text is no TOML, a key is missing or unknown, or a standing is none of STANDINGS.
    """
    try:
        content = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise TableError(f"source sheet of {name}: {error}", "write it as TOML") from error
    unknown, missing = set(content) - _SHEET_KEYS, _REQUIRED_KEYS - set(content)
    if unknown or missing:
        raise TableError(
            f"source sheet of {name}: unknown keys {sorted(unknown)}, missing keys {sorted(missing)}",
            f"use exactly these keys: {', '.join(sorted(_SHEET_KEYS))} (errata may be left out)",
        )
    known = tuple(_parse_known(name, entry) for entry in content.pop("known"))
    if not known:
        raise TableError(f"source sheet of {name}: no [[known]] entry", "say how each part of the table is known")
    return SourceSheet(name=name, known=known, errata=tuple(content.pop("errata", ())), **content)


def _parse_known(name: str, entry: dict[str, str]) -> KnownPart:
    if set(entry) - _KNOWN_KEYS or {"part", "standing"} - set(entry):
        raise TableError(
            f"source sheet of {name}: [[known]] has the keys {sorted(entry)}", "use part, standing and remark"
        )
    if entry["standing"] not in STANDINGS:
        raise TableError(
            f"source sheet of {name}: standing '{entry['standing']}'", f"use one of: {'; '.join(STANDINGS)}"
        )
    return KnownPart(**entry)


@functools.cache
def load_table(name: str) -> PublishedTable:
    """A table of the register by its name, which carries the edition. The result is shared: do not change it.

    Raises: TableError for an unknown name; it lists those that exist.
    """
    if name not in list_tables():
        raise TableError(f"there is no published table '{name}'", f"use one of: {', '.join(list_tables())}")
    sheet = parse_sheet(name, (_folder() / f"{name}.toml").read_text(encoding="utf-8"))
    with (_folder() / f"{name}.csv").open("r", encoding="utf-8") as file:
        return PublishedTable(pd.read_csv(file), sheet)
