"""Finds rule files: which exist, and the version that is in force on a date."""

import datetime
import difflib
from functools import cache
from importlib import resources
from pathlib import Path

from audiokit.core.errors import RuleFileError
from audiokit.rules.spec import Rulebook, parse_rule_file


@cache
def _versions(rulebook_id: str) -> tuple[Rulebook, ...]:
    with resources.as_file(resources.files("audiokit.rules") / "data" / f"{rulebook_id}.toml") as path:
        return parse_rule_file(Path(path))


def list_rulebooks() -> tuple[str, ...]:
    """Ids of the rulebooks that come with the package."""
    folder = resources.files("audiokit.rules") / "data"
    return tuple(sorted(entry.name.removesuffix(".toml") for entry in folder.iterdir() if entry.name.endswith(".toml")))


def load_rulebook(rulebook_id: str, on: datetime.date) -> Rulebook:
    """The version of a rulebook in force on a date.

    Raises RuleFileError: unknown id (lists those that exist), or no version in force yet on that date.
    """
    known = list_rulebooks()
    if rulebook_id not in known:
        near = difflib.get_close_matches(rulebook_id, known, n=1)
        hint = f"did you mean {near[0]}? " if near else ""
        raise RuleFileError(f"unknown rulebook {rulebook_id!r}", f"{hint}known rulebooks: {', '.join(known)}")
    in_force = [book for book in _versions(rulebook_id) if book.from_date <= on]
    if not in_force:
        first = _versions(rulebook_id)[0].from_date
        raise RuleFileError(f"rulebook {rulebook_id} has no version in force on {on}", f"its first starts on {first}")
    return in_force[-1]
