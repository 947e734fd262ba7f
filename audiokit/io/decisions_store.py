"""The SQLite file behind the reviewers' decisions: schema, soundness checks, transactions.

Rollback journal, synchronous=EXTRA and BEGIN IMMEDIATE: writers queue for the lock, and what a killed writer left is
rolled back by whoever opens the file next, reader or writer. The file system must honour locks; some network mounts
do not.
"""

import sqlite3
from collections.abc import Iterator
from contextlib import closing, contextmanager
from pathlib import Path

from audiokit.core.errors import DecisionError, OutputError
from audiokit.io.atomic import create_file

FILE_NAME = "decisions.db"
SCHEMA_VERSION = 1
BUSY_SECONDS = 30.0
"""How long a reader or writer waits for another process to finish. [s]"""

_APPLICATION_ID = 0x41554449
"""In the header of every decisions file ("AUDI"), so that another program's database is not taken for one."""

_RESTORE = (
    "restore decisions.db from a backup, or move it out of the cohort folder if no decision was ever recorded; "
    "nothing was changed"
)

_SCHEMA = (
    """CREATE TABLE decision (
  decision_id INTEGER PRIMARY KEY,
  kind TEXT NOT NULL CHECK (trim(kind) <> ''),
  person_id TEXT,
  ear TEXT CHECK (ear IN ('right', 'left')),
  test_id TEXT,
  criterion TEXT,
  takes_effect_on TEXT NOT NULL,
  recorded_at TEXT NOT NULL,
  reviewer TEXT NOT NULL CHECK (trim(reviewer) <> ''),
  role TEXT NOT NULL CHECK (trim(role) <> ''),
  reason TEXT NOT NULL CHECK (trim(reason) <> ''),
  undoes INTEGER REFERENCES decision (decision_id) CHECK (undoes < decision_id),
  CHECK ((kind = 'undo') = (undoes IS NOT NULL))
)""",
    # Also stops INSERT OR REPLACE, which deletes without firing the trigger on DELETE.
    """CREATE TRIGGER decision_numbers BEFORE INSERT ON decision
WHEN NEW.decision_id IS NOT (SELECT coalesce(max(decision_id), 0) + 1 FROM decision)
BEGIN SELECT raise(ABORT, 'decisions are append-only: the next entry takes the next number'); END""",
    """CREATE TRIGGER decision_no_update BEFORE UPDATE ON decision
BEGIN SELECT raise(ABORT, 'decisions are append-only: record an undo instead'); END""",
    """CREATE TRIGGER decision_no_delete BEFORE DELETE ON decision
BEGIN SELECT raise(ABORT, 'decisions are append-only: record an undo instead'); END""",
)


@contextmanager
def reading(folder: Path) -> Iterator[sqlite3.Connection | None]:
    """A checked, unchanging view of the decisions; None where the folder has no decisions file.

    Raises DecisionError: no such folder; file damaged, foreign, of another version, locked or without rights.
    """
    path = _decisions_file(folder)
    if not path.exists():
        if path.is_symlink():
            raise DecisionError(f"{path} is a link to a file that is not there", "mend the link, or remove it")
        yield None
        return
    with _transaction(path, "BEGIN") as connection:
        yield connection


@contextmanager
def appending(folder: Path) -> Iterator[sqlite3.Connection]:
    """A checked transaction that holds the only right to append; committed to disk when the block ends.

    Raises DecisionError as `reading` does, and where the folder or file cannot be written; then nothing is recorded.
    """
    path = _decisions_file(folder)
    if not path.exists():
        try:
            create_file(path, _empty_database())
        except OutputError as error:
            raise DecisionError(error.message, error.mend) from error
    with _transaction(path, "BEGIN IMMEDIATE") as connection:
        yield connection


def _decisions_file(folder: Path) -> Path:
    """Where the folder's decisions are, or would be."""
    try:
        if not folder.is_dir():
            raise DecisionError(f"{folder} is not a folder", "give the cohort folder, the one that holds the tests")
        path = folder.resolve() / FILE_NAME
        path.exists()
    except OSError as error:
        raise DecisionError(
            f"{folder} cannot be read ({error.strerror})", "get the right to read the folder"
        ) from error
    return path


def _empty_database() -> bytes:
    with closing(sqlite3.connect(":memory:", isolation_level=None)) as connection:
        connection.execute(f"PRAGMA application_id = {_APPLICATION_ID}")
        connection.execute(f"PRAGMA user_version = {SCHEMA_VERSION}")
        for statement in _SCHEMA:
            connection.execute(statement)
        return connection.serialize()


@contextmanager
def _transaction(path: Path, begin: str) -> Iterator[sqlite3.Connection]:
    try:
        # mode=rw also for reading: rolling back what a killed writer left needs the right to write, where there is one.
        uri = f"{path.as_uri()}?mode=rw"
        with closing(sqlite3.connect(uri, uri=True, timeout=BUSY_SECONDS, isolation_level=None)) as connection:
            connection.execute("PRAGMA synchronous = EXTRA")
            connection.execute("PRAGMA foreign_keys = ON")
            connection.execute(begin)
            try:
                _check(connection, path)
                yield connection
                connection.execute("COMMIT")
            finally:
                if connection.in_transaction:
                    connection.execute("ROLLBACK")
    except sqlite3.Error as error:
        raise _explained(error, path) from error


def _check(connection: sqlite3.Connection, path: Path) -> None:
    """Refuse every file that is not, whole and unaltered, what this version of audiokit writes."""
    (application,) = connection.execute("PRAGMA application_id").fetchone()
    if path.stat().st_size == 0:
        raise DecisionError(f"{path} is empty (0 bytes)", _RESTORE)
    if application != _APPLICATION_ID:
        raise DecisionError(f"{path} is an SQLite database, but not one that audiokit wrote", _RESTORE)
    (version,) = connection.execute("PRAGMA user_version").fetchone()
    if version != SCHEMA_VERSION:
        age = "a newer" if version > SCHEMA_VERSION else "an unknown older"
        mend = "use the audiokit that wrote it, or a later one" if version > SCHEMA_VERSION else _RESTORE
        raise DecisionError(f"{path} has {age} format ({version}); this audiokit reads {SCHEMA_VERSION}", mend)
    found = {sql for (sql,) in connection.execute("SELECT sql FROM sqlite_master WHERE name NOT LIKE 'sqlite_%'")}
    if found != set(_SCHEMA):
        raise DecisionError(f"{path}: its tables or its locks against change were altered", _RESTORE)
    problems = [text for (text,) in connection.execute("PRAGMA quick_check(1)")]
    pages, page_size = (connection.execute(f"PRAGMA {what}").fetchone()[0] for what in ("page_count", "page_size"))
    if path.stat().st_size < pages * page_size:  # SQLite reads what a last page lacks as zeros.
        problems = ["it is cut short"]
    if problems != ["ok"]:
        raise DecisionError(f"{path} is damaged: {problems[0]}", _RESTORE)
    count, highest = connection.execute("SELECT count(*), coalesce(max(decision_id), 0) FROM decision").fetchone()
    if count != highest:
        raise DecisionError(f"{path} has {count} entries but numbers up to {highest}: some were taken out", _RESTORE)


def _explained(error: sqlite3.Error, path: Path) -> DecisionError:
    """What SQLite said, in words that name the file and the mend."""
    code = getattr(error, "sqlite_errorname", None) or ""
    if code.startswith("SQLITE_READONLY") and Path(f"{path}-journal").exists():
        return DecisionError(
            f"{path}: an interrupted recording must be rolled back first, and the file or folder is read-only",
            "open the cohort once where you may write; decisions.db-journal belongs to it and must stay beside it",
        )
    if code.startswith(("SQLITE_READONLY", "SQLITE_CANTOPEN", "SQLITE_PERM", "SQLITE_AUTH")):
        return DecisionError(
            f"{path} cannot be opened or written ({error})", "get the right to read and write this file and its folder"
        )
    if code.startswith(("SQLITE_BUSY", "SQLITE_LOCKED")):
        return DecisionError(
            f"{path} has been locked by another program for {BUSY_SECONDS:g} seconds",
            "close the other program, then try again; nothing was recorded",
        )
    if code.startswith("SQLITE_FULL"):
        return DecisionError(f"{path}: the disk is full", "free some space, then try again; nothing was recorded")
    if code.startswith(("SQLITE_NOTADB", "SQLITE_CORRUPT")):
        return DecisionError(f"{path} is damaged, or is no SQLite database ({error})", _RESTORE)
    return DecisionError(f"{path}: {error}", "check the disk and the file; nothing was recorded")
