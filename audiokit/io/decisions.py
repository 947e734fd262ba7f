"""What licensed reviewers decided, the only thing people enter: append-only, an undo is a new entry.

`takes_effect_on` is the date from which an entry counts, `recorded_at` the moment it was entered. For revise_baseline,
tests dated after `takes_effect_on` are compared with the new baseline.
"""

import datetime
import operator
import re
import sqlite3
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from audiokit.core.errors import DecisionError
from audiokit.core.vocabulary import EARS
from audiokit.io.decisions_store import appending, reading

if TYPE_CHECKING:
    import pandas as pd

COLUMNS = (
    "decision_id", "kind", "person_id", "ear", "test_id", "criterion",
    "takes_effect_on", "recorded_at", "reviewer", "role", "reason",
)  # fmt: skip
LOG_COLUMNS = (*COLUMNS, "undoes", "in_force")
DEFAULT_CRITERION = "us-osha.recordable"

_SUBJECT = ("person_id", "ear", "test_id", "criterion")


@dataclass(frozen=True)
class _Shape:
    """Which of person_id, ear, test_id and criterion an entry must and may name."""

    needed: tuple[str, ...] = ()
    optional: tuple[str, ...] = ()


_SHAPES = {
    "invalidate_test": _Shape(needed=("person_id", "test_id")),
    "revise_baseline": _Shape(needed=("person_id", "ear", "test_id")),
    "refuse_baseline": _Shape(needed=("person_id", "ear", "test_id")),
    "not_work_related": _Shape(needed=("person_id", "ear", "test_id"), optional=("criterion",)),
    "notice_given": _Shape(needed=("person_id", "ear", "test_id")),
    "entry_made": _Shape(needed=("person_id", "ear", "test_id")),
    "note": _Shape(needed=("person_id",), optional=("ear", "test_id")),
    "undo": _Shape(),
}
KINDS = tuple(_SHAPES)


def record_decision(
    folder: Path | str,
    *,
    kind: str,
    person_id: str | None = None,
    ear: str | None = None,
    test_id: str | None = None,
    criterion: str | None = None,
    takes_effect_on: datetime.date | str | None = None,
    reviewer: str,
    role: str,
    reason: str,
    recorded_at: datetime.datetime | None = None,
    undoes: int | None = None,
) -> int:
    """Append one entry to decisions.db in the cohort folder; returns its number once it is safe on disk.

    kind : one of KINDS, with what it is about:
        invalidate_test (person_id, test_id), revise_baseline (person_id, ear, test_id: that ear's new baseline),
        refuse_baseline (person_id, ear, test_id: does not become that ear's baseline),
        not_work_related (person_id, ear, test_id; criterion, default DEFAULT_CRITERION),
        notice_given, entry_made (person_id, ear, test_id: the event's test, as the worklist names it),
        note (person_id; ear and test_id optional), undo (undoes: the number of an entry in force, an undo included)
    takes_effect_on : ISO text or date; default the calendar date of recorded_at in its own time zone
    reviewer, role, reason : who decided, licence or role, and why; not blank
    recorded_at : with time zone; default now, in local time

    Whether person and test exist is for the caller to check: this module knows the decisions only.
    Raises DecisionError: something missing, blank, superfluous or unknown; entry already undone; file unsound or not
    to be written. Then nothing is recorded.
    """
    subject = _subject(kind, {"person_id": person_id, "ear": ear, "test_id": test_id, "criterion": criterion})
    signature = {name: _text(name, text) for name, text in (("reviewer", reviewer), ("role", role), ("reason", reason))}
    moment = datetime.datetime.now().astimezone() if recorded_at is None else recorded_at
    if not isinstance(moment, datetime.datetime) or moment.utcoffset() is None:
        raise DecisionError(f"recorded_at {moment!r} has no time zone", "give a date-time with its time zone")
    effect = moment.date() if takes_effect_on is None else _date(takes_effect_on)
    undone = None if undoes is None else _number(undoes)
    if (kind == "undo") != (undone is not None):
        raise DecisionError(f"{kind}: undoes is {undoes!r}", "an undo, and nothing else, names the entry it undoes")
    entry: dict[str, str | None] = {
        "kind": kind,
        **subject,
        "takes_effect_on": effect.isoformat(),
        "recorded_at": moment.astimezone(datetime.UTC).isoformat(timespec="seconds").replace("+00:00", "Z"),
        **signature,
    }
    return _append(Path(folder), entry, undone)


def read_decisions(folder: Path | str) -> "pd.DataFrame":
    """The entries in force, ordered by number: undone entries and the undo entries themselves are left out.

    Columns COLUMNS: decision_id is int64, all others hold text, None where an entry does not name it; takes_effect_on
    is an ISO date, recorded_at an ISO date-time in UTC. No decisions.db: an empty frame with these columns.
    Raises DecisionError: no such folder; file damaged, foreign, of another version, locked or without rights.
    """
    log = read_log(folder)
    return log.loc[log["in_force"] & (log["kind"] != "undo"), list(COLUMNS)].reset_index(drop=True)


def read_log(folder: Path | str) -> "pd.DataFrame":
    """Every entry ever recorded, ordered by number.

    Columns LOG_COLUMNS: as `read_decisions`, with undoes (nullable integer: the entry that this one undoes) and
    in_force (False where an undo that is itself in force undoes the entry). Raises DecisionError as `read_decisions`.
    """
    columns = LOG_COLUMNS[:-1]
    with reading(Path(folder)) as connection:
        query = f"SELECT {', '.join(columns)} FROM decision ORDER BY decision_id"
        rows = [] if connection is None else connection.execute(query).fetchall()
    import pandas as pd  # Only now: a file that cannot be read is said at once.

    log = pd.DataFrame(rows, columns=list(columns), dtype=object)
    undos = [(int(row[0]), int(row[-1])) for row in rows if row[-1] is not None]
    log["in_force"] = ~log["decision_id"].isin(list(_undone(undos))).astype(bool)
    return log.astype({"decision_id": "int64", "undoes": "Int64"})


def _undone(undos: list[tuple[int, int]]) -> dict[int, int]:
    """Entry -> the undo in force that undoes it. An undo is younger than its entry, so the youngest are settled first.

    undos : (number of the undo, number of the entry it undoes)
    """
    undone: dict[int, int] = {}
    for number, target in sorted(undos, reverse=True):
        if number not in undone:
            undone[target] = number
    return undone


def _append(folder: Path, entry: dict[str, str | None], undoes: int | None) -> int:
    if undoes is not None:
        with reading(folder) as connection:
            if connection is None:
                raise DecisionError(f"there is no decision in {folder} to undo", "check the cohort folder")
    with appending(folder) as connection:
        if undoes is not None:
            undos = connection.execute("SELECT decision_id, undoes FROM decision WHERE undoes IS NOT NULL").fetchall()
            _check_undo(undoes, highest=_highest(connection), undone=_undone(undos))
        number = _highest(connection) + 1
        names = ("decision_id", *entry, "undoes")
        marks = ", ".join("?" * len(names))
        connection.execute(
            f"INSERT INTO decision ({', '.join(names)}) VALUES ({marks})", (number, *entry.values(), undoes)
        )
    return number


def _highest(connection: sqlite3.Connection) -> int:
    (highest,) = connection.execute("SELECT coalesce(max(decision_id), 0) FROM decision").fetchone()
    return int(highest)


def _check_undo(undoes: int, highest: int, undone: dict[int, int]) -> None:
    if not 1 <= undoes <= highest:
        raise DecisionError(f"there is no decision number {undoes!r}", f"the numbers so far are 1 to {highest}")
    if undoes in undone:
        by = undone[undoes]
        raise DecisionError(f"decision {undoes} is already undone by {by}", f"to restore it, undo number {by}")


def _subject(kind: str, given: dict[str, str | None]) -> dict[str, str | None]:
    """What the entry is about, checked against the shape of its kind."""
    shape = _SHAPES.get(kind)
    if shape is None:
        raise DecisionError(f"{kind!r} is not a kind of decision", f"the kinds are {', '.join(KINDS)}")
    allowed = (*shape.needed, *shape.optional)
    for name in _SUBJECT:
        if name in shape.needed and given[name] is None:
            raise DecisionError(f"{kind}: {name} is missing", f"{kind} needs {', '.join(shape.needed)}")
        if name not in allowed and given[name] is not None:
            raise DecisionError(f"{kind} takes no {name}, but it is {given[name]!r}", f"leave {name} out")
    subject = {name: None if text is None else _text(name, text) for name, text in given.items()}
    if subject["ear"] not in (None, *EARS):
        raise DecisionError(f"ear is {subject['ear']!r}", f"give {' or '.join(EARS)}")
    if kind == "not_work_related" and subject["criterion"] is None:
        subject["criterion"] = DEFAULT_CRITERION
    return subject


def _text(name: str, text: object) -> str:
    """Text without outer blanks, sure to be stored and read back as it is."""
    if not isinstance(text, str):
        raise DecisionError(f"{name} is {text!r}, not text", f"give {name} as text")
    stripped = text.strip()
    if not stripped:
        raise DecisionError(
            f"{name} is blank", "every decision names its reviewer, licence or role, reason and subject"
        )
    if "\0" in stripped or any("\ud800" <= character <= "\udfff" for character in stripped):
        raise DecisionError(f"{name} {text!r} holds characters that are not text", f"type {name} anew")
    return stripped


def _number(value: object) -> int:
    try:
        return operator.index(value)  # type: ignore[arg-type]
    except TypeError:
        raise DecisionError(f"{value!r} is not the number of a decision", "give a whole number") from None


def _date(value: datetime.date | str) -> datetime.date:
    if isinstance(value, datetime.datetime):
        return value.date()
    if isinstance(value, datetime.date):
        return value
    try:
        if re.fullmatch(r"\d{4}-\d{2}-\d{2}", value, re.ASCII):
            return datetime.date.fromisoformat(value)
    except (TypeError, ValueError):
        pass
    raise DecisionError(f"takes_effect_on is {value!r}", "give a date as year-month-day, for example 2026-03-01")
