"""The shape of a rule file: frozen records and the strict parser that makes them.

Every figure of a law is a `Value` that knows its clause, source and standing. Unknown keys, missing sources and
overlapping versions are errors that name the file and the place in it.
"""

import datetime
import itertools
import tomllib
from collections.abc import Mapping
from dataclasses import MISSING, dataclass, fields
from fractions import Fraction
from pathlib import Path
from typing import Any

from audiokit.core.errors import RuleFileError

STANDINGS = (
    "read",
    "read in part",
    "read in a secondary text",
    "from memory, unverified",
    "common practice, no source",
    "our choice",
)
BASELINE_POLICIES = ("revised", "moves_at_event")
STATISTICS = ("mean",)


@dataclass(frozen=True)
class Value:
    """One figure of a rule: the value, its clause, the source entry and how it is known."""

    value: Any
    at: str
    source: str
    standing: str
    note: str = ""


@dataclass(frozen=True)
class Criterion:
    """One criterion for a shift, per ear.

    shift_at_least_db, level_at_least_db : limits in dB, met when reached exactly
    baseline : "revised" (the baseline in force, revised by rule or decision) or "moves_at_event" (each standing event
               becomes the next reference)
    baseline_in_force_of : the criterion whose baseline serves instead, where the cohort asks for it
    retest_started_by : the criteria of which one, met in either ear, opens the retest window
    """

    id: str
    name: str
    statistic: Value
    frequencies_hz: Value
    shift_at_least_db: Value
    baseline: Value
    retest_window_days: Value
    retest_started_by: Value
    level_at_least_db: Value | None = None
    baseline_in_force_of: Value | None = None
    age_table: Value | None = None
    notify_days: Value | None = None
    record_days_after_retest: Value | None = None
    record_days_without_retest: Value | None = None


@dataclass(frozen=True)
class Revision:
    """When a baseline should be revised or proposed for revision, on the named criterion."""

    criterion: str
    improvement_at_least_db: Value
    persistence_months: Value


@dataclass(frozen=True)
class Schedule:
    """When tests are due, in calendar months."""

    periodic_test_months: Value
    baseline_test_months: Value


@dataclass(frozen=True)
class QualityLimits:
    """What the rule asks of a test itself."""

    required_frequencies_hz: Value
    quiet_hours_before_baseline: Value
    recheck_agreement_db: Value


@dataclass(frozen=True)
class Rulebook:
    """One version of one jurisdiction's rules, in force from a date."""

    id: str
    title: str
    caution: str
    from_date: datetime.date
    from_value: Value
    sources: Mapping[str, Mapping[str, str]]
    criteria: tuple[Criterion, ...]
    revision: Revision
    schedule: Schedule
    quality: QualityLimits
    note: str = ""

    def criterion(self, criterion_id: str) -> Criterion:
        """The criterion of that id; KeyError when there is none."""
        return {c.id: c for c in self.criteria}[criterion_id]


def tenths(value: Value, per: int = 1) -> int:
    """A limit in dB as a whole number of tenths, times the number of frequencies summed; exact or an error."""
    exact = Fraction(str(value.value)) * 10 * per
    if exact.denominator != 1:
        raise RuleFileError(f"limit {value.value} dB at {value.at} is finer than 0.1 dB")
    return int(exact)


class _Parser:
    """Walks one parsed TOML file and turns it into records, keeping the path for messages."""

    def __init__(self, file: str, sources: Mapping[str, Any]) -> None:
        self.file = file
        self.sources = sources

    def fail(self, where: str, problem: str, mend: str) -> RuleFileError:
        return RuleFileError(f"rule file {self.file}, {where}: {problem}", mend)

    def value(self, raw: Any, where: str) -> Value:
        known = [f.name for f in fields(Value)]
        if not isinstance(raw, dict):
            raise self.fail(where, f"{raw!r} stands without a source", f"write a table with {', '.join(known)}")
        self.check_keys(raw, Value, where)
        made = Value(**raw)
        if made.source not in self.sources:
            raise self.fail(where, f"unknown source {made.source!r}", f"name one of {', '.join(self.sources)}")
        if made.standing not in STANDINGS:
            raise self.fail(where, f"unknown standing {made.standing!r}", f"use one of: {'; '.join(STANDINGS)}")
        return made

    def check_keys(self, raw: Mapping[str, Any], record: type, where: str) -> None:
        known = {f.name: f for f in fields(record)}
        for key in raw:
            if key not in known:
                raise self.fail(where, f"unknown key {key!r}", f"known keys: {', '.join(known)}")
        for name, field in known.items():
            if name not in raw and field.default is MISSING:
                raise self.fail(where, f"key {name!r} is missing", f"add {name} = …")

    def record(self, raw: Mapping[str, Any], record: Any, where: str, plain: tuple[str, ...] = ()) -> Any:
        self.check_keys(raw, record, where)
        made = {k: v if k in plain else self.value(v, f"{where}.{k}") for k, v in raw.items()}
        return record(**made)

    def criterion(self, raw: Mapping[str, Any], where: str) -> Criterion:
        made: Criterion = self.record(raw, Criterion, where, ("id", "name"))
        for key, allowed in (("statistic", STATISTICS), ("baseline", BASELINE_POLICIES)):
            found = getattr(made, key).value
            if found not in allowed:
                raise self.fail(f"{where}.{key}", f"unknown value {found!r}", f"use one of {', '.join(allowed)}")
        return made


_TOP = ("id", "title", "caution", "source", "version")
_VERSION = ("from", "note", "criterion", "revision", "schedule", "quality")


def _only(parser: _Parser, raw: Mapping[str, Any], known: tuple[str, ...], where: str, free: str = "") -> None:
    for key in raw:
        if key not in known:
            raise parser.fail(where, f"unknown key {key!r}", f"known keys: {', '.join(known)}")
    for key in known:
        if key not in raw and key != free:
            raise parser.fail(where, f"key {key!r} is missing", f"add {key}")


def parse_rule_file(path: Path) -> tuple[Rulebook, ...]:
    """All versions in one rule file, oldest first.

    Raises RuleFileError: no TOML, unknown or missing key, value without source, two versions from one date.
    """
    try:
        raw = tomllib.loads(path.read_text(encoding="utf-8"))
    except tomllib.TOMLDecodeError as error:
        raise RuleFileError(f"rule file {path.name}: {error}", "mend the TOML at that place") from error
    parser = _Parser(path.name, raw.get("source", {}))
    _only(parser, raw, _TOP, "top level")
    books = [_version(parser, raw, entry, f"version {n}") for n, entry in enumerate(raw["version"], start=1)]
    books.sort(key=lambda book: book.from_date)
    for earlier, later in itertools.pairwise(books):
        if earlier.from_date == later.from_date:
            raise parser.fail("version", f"two versions start on {later.from_date}", "give each its own start")
    return tuple(books)


def _version(parser: _Parser, raw: Mapping[str, Any], entry: Mapping[str, Any], where: str) -> Rulebook:
    _only(parser, entry, _VERSION, where, free="note")
    start = parser.value(entry["from"], f"{where}.from")
    if not isinstance(start.value, datetime.date):
        raise parser.fail(f"{where}.from", f"{start.value!r} is no date", "write it as 1983-04-07, without quotes")
    criteria = tuple(parser.criterion(c, f"{where}.criterion {c.get('id', '?')}") for c in entry["criterion"])
    ids = [c.id for c in criteria]
    for criterion in criteria:
        named = list(criterion.retest_started_by.value)
        if criterion.baseline_in_force_of is not None:
            named.append(criterion.baseline_in_force_of.value)
        for other in named:
            if other not in ids[: ids.index(criterion.id) + 1]:
                raise parser.fail(f"{where}.criterion {criterion.id}", f"{other!r} is not defined before it", "reorder")
    revision: Revision = parser.record(entry["revision"], Revision, f"{where}.revision", ("criterion",))
    if revision.criterion not in ids:
        raise parser.fail(f"{where}.revision", f"unknown criterion {revision.criterion!r}", f"one of {', '.join(ids)}")
    return Rulebook(
        id=raw["id"],
        title=raw["title"],
        caution=raw["caution"],
        from_date=start.value,
        from_value=start,
        sources=parser.sources,
        criteria=criteria,
        revision=revision,
        schedule=parser.record(entry["schedule"], Schedule, f"{where}.schedule"),
        quality=parser.record(entry["quality"], QualityLimits, f"{where}.quality"),
        note=entry.get("note", ""),
    )
