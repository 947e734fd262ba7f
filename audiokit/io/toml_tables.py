"""Checked access to the tables of a TOML file: unknown keys and wrong types become errors that name file and key."""

import difflib
from collections.abc import Mapping, Sequence
from typing import Any

from audiokit.core.errors import CohortError
from audiokit.io.texts import number_text

_LONGEST_SHOWN = 100
_LARGEST_CODE = 10**15
_TYPE_NAMES = {str: "text", bool: "true or false", dict: "a table", list: "a list"}


def shown(value: Any) -> str:
    """A value for a message, cut off where it is long."""
    try:
        text = repr(value)
    except ValueError:  # Python writes no number of more than some thousand digits.
        return "a number of thousands of digits"
    return text if len(text) <= _LONGEST_SHOWN else text[: _LONGEST_SHOWN - 1] + "…"


def _code(item: Any) -> str | None:
    """A code as stripped text, a number by its shortest; None where it is neither text nor a number of some size."""
    if isinstance(item, str):
        return item.strip()
    if isinstance(item, bool) or not isinstance(item, int | float) or not abs(item) <= _LARGEST_CODE:
        return None
    return str(item) if isinstance(item, int) else number_text(item)


class TomlTable:
    """One table of a TOML file, with its place for messages.

    file    : the file's name
    place   : the table's name in brackets, "" at the top
    content : what tomllib read
    """

    def __init__(self, file: str, place: str, content: Mapping[str, Any]) -> None:
        self.file = file
        self.place = place
        self.content = content

    def error(self, key: str, message: str, mend: str) -> CohortError:
        """An error about one key of this table."""
        where = f"{self.file}, {self.place} {key}" if self.place else f"{self.file}, {key}"
        return CohortError(f"{where}: {message}", mend)

    def only(self, known: Sequence[str]) -> None:
        """Raises CohortError where a key is none of `known`, naming them and the nearest."""
        for key in self.content:
            if key not in known:
                near = difflib.get_close_matches(key, known, 1)
                hint = f" (did you mean {near[0]}?)" if near else ""
                place = f" in {self.place}" if self.place else ""
                raise CohortError(
                    f"{self.file}: unknown key {key!r}{place}{hint}", f"known keys are: {', '.join(known)}"
                )

    def typed(self, key: str, kind: type) -> Any:
        """The key's value, of the given type; None where the key is absent."""
        value = self.content.get(key)
        if value is not None and not isinstance(value, kind):
            raise self.error(key, f"{shown(value)} is not {_TYPE_NAMES[kind]}", f"write {_TYPE_NAMES[kind]}")
        return value

    def text(self, key: str) -> str | None:
        """A text, not blank; None where the key is absent."""
        value = self.typed(key, str)
        if value is not None and not value.strip():
            raise self.error(key, "the text is blank", "write a text, or remove the key")
        return value

    def flag(self, key: str) -> bool | None:
        """True, false, or None where the key is absent."""
        return self.typed(key, bool)

    def choice(self, key: str, allowed: Sequence[str]) -> str | None:
        """One of the allowed words; None where the key is absent."""
        value = self.text(key)
        if value is not None and value not in allowed:
            raise self.error(key, f"{shown(value)} is not known", f"write one of {', '.join(allowed)}")
        return value

    def texts(self, key: str) -> tuple[str, ...] | None:
        """One text or a list of texts; None where the key is absent."""
        value = self.content.get(key)
        if value is None:
            return None
        values = value if isinstance(value, list) else [value]
        if not values or not all(isinstance(v, str) and v.strip() for v in values):
            message = f"{shown(value)} is neither a text nor a list of texts"
            raise self.error(key, message, 'write "a" or ["a", "b"]')
        return tuple(values)

    def codes(self, key: str) -> tuple[str, ...]:
        """A code or list of codes as stripped texts; numbers are taken by their shortest text."""
        value = self.content.get(key)
        values = value if isinstance(value, list) else [value]
        found = tuple(code for item in values if (code := _code(item)) is not None)
        if len(found) < len(values):
            raise self.error(key, f"{shown(value)} is not a list of codes", 'write a list of texts, such as ["999"]')
        return found

    def table(self, key: str) -> "TomlTable | None":
        """A table inside this one; None where the key is absent."""
        value = self.typed(key, dict)
        place = f"[{self.place[1:-1]}.{key}]" if self.place else f"[{key}]"
        return None if value is None else TomlTable(self.file, place, value)

    def tables(self, key: str) -> "list[TomlTable]":
        """The tables of an array of tables, [[key]]."""
        value = self.typed(key, list) or []
        if not all(isinstance(item, dict) for item in value):
            raise self.error(key, "this is not a list of tables", f"write each as its own [[{key}]] table")
        return [TomlTable(self.file, f"[{key}]", item) for item in value]
