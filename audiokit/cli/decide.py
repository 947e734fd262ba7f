"""`audiokit decide`: record what a licensed reviewer decided, undo it, or list what was recorded."""

import argparse
import datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

from audiokit.cli.console import printable
from audiokit.cli.review import iso_date

if TYPE_CHECKING:
    import pandas as pd

_KINDS = {
    "invalidate_test": "leave a test out of everything",
    "revise_baseline": "make a test one ear's new baseline, for tests dated after it takes effect",
    "refuse_baseline": "a proposed test does not become one ear's baseline",
    "not_work_related": "a recordable shift is not work-related",
    "notice_given": "the written notice of a shift was given: closes its line on the worklist",
    "entry_made": "the entry in the log was made: closes its line on the worklist",
    "note": "a remark on a person, a test or an ear",
}


def register(subparsers: Any) -> None:
    """Add the subcommand to the parser of `audiokit`."""
    parser = subparsers.add_parser(
        "decide",
        help="record a reviewer's decision, undo one, or list them",
        description="Decisions are kept in decisions.db in the cohort folder. Nothing there is ever changed or "
        "deleted: an undo is a new entry, and undoing the undo restores.",
    )
    parser.add_argument("cohort", metavar="COHORT", type=Path, help="folder with people and tests")
    kinds = parser.add_subparsers(dest="kind", metavar="KIND", required=True)
    for kind, meaning in _KINDS.items():
        _add_kind(kinds, kind, meaning)
    undo = kinds.add_parser("undo", help="undo an entry by its number", description="Undo an entry by its number.")
    undo.add_argument("number", metavar="NUMBER", type=int, help="number of the entry, as `list` shows it")
    _add_signature(undo)
    undo.set_defaults(run=_undo)
    log = kinds.add_parser("list", help="show every entry", description="Show every entry, those undone included.")
    log.set_defaults(run=_list)


def _add_kind(kinds: Any, kind: str, meaning: str) -> None:
    parser = kinds.add_parser(kind, help=meaning, description=meaning.capitalize() + ".")
    optional = kind == "note"
    parser.add_argument("--person", metavar="ID", required=True, help="person_id")
    if kind != "invalidate_test":
        parser.add_argument("--ear", choices=("right", "left"), required=not optional)
    parser.add_argument("--test", metavar="ID", required=not optional, help="test_id, as the review's files show it")
    if kind == "revise_baseline":
        parser.add_argument(
            "--takes-effect",
            metavar="DATE",
            type=iso_date,
            help="tests dated after this are compared with the new baseline (default: today)",
        )
    _add_signature(parser)
    parser.set_defaults(run=_record, ear=None, takes_effect=None)


def _add_signature(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("--reviewer", metavar="NAME", required=True, help="who decided")
    parser.add_argument("--role", metavar="TEXT", required=True, help="the reviewer's licence or role")
    parser.add_argument("--reason", metavar="TEXT", required=True, help="why")


def _record(arguments: argparse.Namespace) -> int:
    from audiokit.cli.decide_check import check_subject
    from audiokit.io.decisions import record_decision

    effect = arguments.takes_effect or datetime.date.today()
    check_subject(arguments.cohort, arguments.kind, arguments.person, arguments.test, effect)
    number = record_decision(
        arguments.cohort,
        kind=arguments.kind,
        person_id=arguments.person,
        ear=arguments.ear,
        test_id=arguments.test,
        takes_effect_on=effect,
        reviewer=arguments.reviewer,
        role=arguments.role,
        reason=arguments.reason,
    )
    subject = _subject(arguments.person, arguments.ear, arguments.test)
    after = f", for tests after {effect}" if arguments.kind == "revise_baseline" else ""
    print(printable(f"decision {number} recorded: {arguments.kind}, {subject}{after}"))
    return 0


def _undo(arguments: argparse.Namespace) -> int:
    from audiokit.io.decisions import record_decision

    number = record_decision(
        arguments.cohort,
        kind="undo",
        undoes=arguments.number,
        reviewer=arguments.reviewer,
        role=arguments.role,
        reason=arguments.reason,
    )
    print(f"decision {number} recorded: undo of {arguments.number}")
    return 0


def _list(arguments: argparse.Namespace) -> int:
    from audiokit.io.decisions import read_log

    log = read_log(arguments.cohort)
    print(printable(log_text(log)))
    return 0


def log_text(log: "pd.DataFrame") -> str:
    """Every entry of the log on a line with its subject, and a line with who decided and why."""
    if log.empty:
        return "no decision is recorded"
    undos = log[log["in_force"] & log["undoes"].notna()]
    undone_by = dict(zip(undos["undoes"], undos["decision_id"], strict=True))
    return "\n".join(_entry_text(entry, undone_by.get(entry["decision_id"])) for entry in log.to_dict("records"))


def _entry_text(entry: dict[Any, Any], undone_by: int | None) -> str:
    if entry["kind"] == "undo":
        what = f"undo of {entry['undoes']}"
    else:
        what = f"{entry['kind']}, {_subject(entry['person_id'], entry['ear'], entry['test_id'])}"
    if entry["criterion"]:
        what += f", {entry['criterion']}"
    if entry["kind"] == "revise_baseline":
        what += f", for tests after {entry['takes_effect_on']}"
    if undone_by is not None:
        what += f" [undone by {undone_by}]"
    lines = (
        f"{entry['decision_id']}  {entry['recorded_at']}  {what}",
        f"    {entry['reviewer']}, {entry['role']}: {entry['reason']}",
    )
    # Line breaks inside an entry are indented, so that no text looks like an entry of its own.
    return "\n".join(line.replace("\n", "\n    ") for line in lines)


def _subject(person: str, ear: str | None, test: str | None) -> str:
    return f"person {person}" + (f", {ear} ear" if ear else "") + (f", test {test}" if test else "")
