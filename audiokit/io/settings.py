"""cohort.toml and the folder's files: which files there are, how each is written, and the settings of the review."""

import datetime
import os
import tomllib
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path, PurePath
from typing import Any

from audiokit.core.errors import CohortError
from audiokit.io.date_cells import FIRST_YEAR, LAST_YEAR
from audiokit.io.source_settings import FORMAT_KEYS, SourceSettings, read_columns, read_format
from audiokit.io.toml_tables import TomlTable, shown
from audiokit.model.cohort import Settings

FILE_NAME = "cohort.toml"
SUFFIXES = (".csv", ".xlsx", ".parquet")
_BASELINE_REVISIONS = ("reviewed", "automatic")
_RECORDING_BASELINES = ("original", "in_force")
_SETTING_KEYS = ("name", "rulebook", "age_correction", "baseline_revision", "as_of", "recording_baseline")
_TOP_KEYS = (*_SETTING_KEYS, "files", "columns", "source", *FORMAT_KEYS)
_SOURCE_KEYS = ("people", "tests", "columns", *FORMAT_KEYS)


@dataclass(frozen=True)
class SourceFile:
    """One file of the cohort: its name as cohort.toml writes it, where it lies, and how it is written."""

    name: str
    path: Path
    settings: SourceSettings


@dataclass(frozen=True)
class CohortPlan:
    """What is to be read: the settings, and the files of each kind in the order in which they are read."""

    settings: Settings
    people: tuple[SourceFile, ...]
    tests: tuple[SourceFile, ...]


def _read_toml(folder: Path) -> TomlTable:
    path = folder / FILE_NAME
    try:
        data = path.read_bytes()
    except FileNotFoundError:
        return TomlTable(FILE_NAME, "", {})
    except OSError as error:
        raise CohortError(f"{FILE_NAME} cannot be read: {error.strerror}", "check the file and its rights") from error
    try:
        return TomlTable(FILE_NAME, "", tomllib.loads(data.decode("utf-8-sig")))
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise CohortError(f"{FILE_NAME}, line {line}: not UTF-8 text", "save the file as UTF-8") from None
    except RecursionError:
        raise CohortError(
            f"{FILE_NAME}: lists or tables are nested too deep", "write each key on a line of its own"
        ) from None
    except ValueError as error:  # tomllib lets pass what Python says to a number of thousands of digits
        last = data.rstrip().count(b"\n") + 1
        message = str(error).replace("at end of document", f"at line {last}, the end of the document")
        raise CohortError(f"{FILE_NAME}: {message}", "correct that line; texts stand in quotation marks") from None


def _as_of(table: TomlTable) -> datetime.date | None:
    value = table.content.get("as_of")
    if isinstance(value, str):
        try:
            return datetime.date.fromisoformat(value)
        except ValueError:
            pass
    elif value is None or (isinstance(value, datetime.date) and not isinstance(value, datetime.datetime)):
        return value
    words = value if isinstance(value, datetime.datetime | datetime.time) else shown(value)
    raise table.error("as_of", f"{words} is not a date", "write a date such as 2026-03-01")


def _settings(table: TomlTable, folder: Path) -> Settings:
    given: dict[str, Any] = {
        "rulebooks": table.texts("rulebook"),
        "age_correction": table.flag("age_correction"),
        "baseline_revision": table.choice("baseline_revision", _BASELINE_REVISIONS),
        "recording_baseline": table.choice("recording_baseline", _RECORDING_BASELINES),
    }
    given = {key: value for key, value in given.items() if value is not None}
    if len(set(given.get("rulebooks", ()))) < len(given.get("rulebooks", ())):
        raise table.error("rulebook", "a rulebook is named twice", "name each once")
    name = table.text("name") or os.fsencode(_title(folder)).decode(errors="replace")
    return Settings(name=name, as_of=_as_of(table) or datetime.date.today(), **given)


def override(settings: Settings, **arguments: Any) -> Settings:
    """Settings with the caller's own arguments put over those of the file; None leaves a setting as it is.

    Raises CohortError where an argument is none of the allowed words, or as_of lies outside the years that files may
    hold.
    """
    for key, allowed in (("baseline_revision", _BASELINE_REVISIONS), ("recording_baseline", _RECORDING_BASELINES)):
        if arguments.get(key) is not None and arguments[key] not in allowed:
            raise CohortError(f"{key}: {arguments[key]!r} is not known", f"use one of {', '.join(allowed)}")
    rulebooks: str | Sequence[str] | None = arguments.get("rulebooks")
    if rulebooks is not None:
        arguments["rulebooks"] = (rulebooks,) if isinstance(rulebooks, str) else tuple(rulebooks)
        if not arguments["rulebooks"]:
            raise CohortError("no rulebook is named", "name at least one, for example us-osha")
    found = replace(settings, **{key: value for key, value in arguments.items() if value is not None})
    if not FIRST_YEAR <= found.as_of.year <= LAST_YEAR:
        raise CohortError(
            f"as_of: {found.as_of} lies outside the years {FIRST_YEAR} to {LAST_YEAR}",
            "name the date for which the review shall speak, for example 2026-03-01",
        )
    return found


def _title(folder: Path) -> str:
    return folder.resolve().name or str(folder)


def _names(table: TomlTable, kind: str) -> list[str]:
    """The files that a table names under people or tests, each written in one way only."""
    names = table.texts(kind) or ()
    if any("\0" in name for name in names):
        raise table.error(kind, "a file's name cannot hold a zero character", "correct the name")
    return [PurePath(name).as_posix() for name in names]


def _default_file(folder: Path, kind: str) -> str | None:
    found = [f"{kind}{suffix}" for suffix in SUFFIXES if os.path.lexists(folder / f"{kind}{suffix}")]
    if len(found) > 1:
        raise CohortError(
            f"{_title(folder)}: the folder holds {' and '.join(found)}",
            f'keep one of them, or name the right one: [files] {kind} = "{found[0]}" in {FILE_NAME}',
        )
    return found[0] if found else None


def _sources(table: TomlTable, shared: SourceSettings) -> dict[str, dict[str, SourceSettings]]:
    """For people and tests: the files that have their own [[source]] table, in order."""
    found: dict[str, dict[str, SourceSettings]] = {"people": {}, "tests": {}}
    for source in table.tables("source"):
        source.only(_SOURCE_KEYS)
        kinds = [kind for kind in found if kind in source.content]
        if len(kinds) != 1:
            raise CohortError(
                f"{FILE_NAME}: a [[source]] table names {' and '.join(kinds) or 'no file'}",
                'name one file in each, for example tests = "north.csv"',
            )
        kind = kinds[0]
        settings = read_format(source, replace(shared, **_top_columns(table, kind)))
        if (columns := source.table("columns")) is not None:
            settings = replace(settings, columns=read_columns(columns, kind), columns_section="[source.columns]")
        for name in _names(source, kind):
            if name in found[kind]:
                raise CohortError(f"{FILE_NAME}: two [[source]] tables describe {name}", "keep one of them")
            found[kind][name] = settings
    return found


def _top_columns(table: TomlTable, kind: str) -> dict[str, Any]:
    columns = table.table("columns")
    inner = None
    if columns is not None:
        columns.only(("people", "tests"))
        inner = columns.table(kind)
    return {"columns": read_columns(inner, kind) if inner else {}, "columns_section": f"[columns.{kind}]"}


def _files(
    table: TomlTable, kind: str, folder: Path, own: dict[str, SourceSettings], shared: SourceSettings
) -> tuple[SourceFile, ...]:
    files = table.table("files")
    names = []
    if files is not None:
        files.only(("people", "tests"))
        names = _names(files, kind)
    if not names and not (kind == "people" and own) and (default := _default_file(folder, kind)):
        names = [default]
    if len(set(names)) < len(names):
        raise CohortError(f"{FILE_NAME}, [files] {kind}: a file is named twice", "name each file once")
    names += [name for name in own if name not in names]
    if not names:
        alike = sorted(entry.name for entry in folder.iterdir() if entry.stem.casefold() == kind and entry.is_file())
        hint = f"; {' and '.join(alike)} cannot be taken for it" if alike else ""
        raise CohortError(
            f"{_title(folder)}: there is no {kind} table ({', '.join(kind + suffix for suffix in SUFFIXES)}){hint}",
            f'put it into the folder, or name it: [files] {kind} = "…" in {FILE_NAME}',
        )
    general = replace(shared, **_top_columns(table, kind))
    return tuple(SourceFile(name, folder / name, own.get(name, general)) for name in names)


def read_plan(folder: Path) -> CohortPlan:
    """The settings and files of a cohort folder.

    Raises CohortError where the folder is none, cohort.toml breaks its grammar, or a table is missing.
    """
    try:
        next(iter(folder.iterdir()), None)
    except FileNotFoundError:
        raise CohortError(f"{folder}: there is no such folder", "check the path") from None
    except NotADirectoryError:
        raise CohortError(f"{folder}: this is a file", "name the folder that holds people and tests") from None
    except OSError as error:
        raise CohortError(
            f"{folder}: the folder cannot be read ({error.strerror})", "ask for the right to read it"
        ) from (error)
    table = _read_toml(folder)
    table.only(_TOP_KEYS)
    shared = read_format(table, SourceSettings())
    own = _sources(table, shared)
    files = {kind: _files(table, kind, folder, own[kind], shared) for kind in own}
    both = {file.name for file in files["people"]} & {file.name for file in files["tests"]}
    told_apart = {kind: tuple(_with_sheet(file, kind, both) for file in files[kind]) for kind in files}
    return CohortPlan(_settings(table, folder), **told_apart)


def _with_sheet(file: SourceFile, kind: str, both: set[str]) -> SourceFile:
    """A file of people and tests at once, such as a workbook, goes by its sheets, so that row numbers stay clear."""
    return replace(file, name=f"{file.name} [{file.settings.sheet or kind}]") if file.name in both else file
