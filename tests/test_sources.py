"""Every figure of a rule file or published table says where it comes from and how it is known."""

import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

ROOT = Path(__file__).parents[1]
RULE_FILES = sorted((ROOT / "audiokit" / "rules" / "data").glob("*.toml"))
SHEETS = sorted((ROOT / "audiokit" / "standards" / "tables").glob("*.toml"))

RULE_STANDINGS = {
    "read",
    "read in part",
    "read in a secondary text",
    "from memory, unverified",
    "common practice, no source",
    "our choice",
}
TABLE_STANDINGS = {"read", "read in a secondary text", "from memory, unverified"}
VALUE_KEYS = {"value", "at", "source", "standing"}
_PLAIN = {"id", "name", "note", "criterion"}
"""Texts of a version that are names, not figures of a law."""


def unsourced(version: dict[str, Any], sources: dict[str, Any], where: str = "version") -> Iterator[str]:
    """A line for each figure that stands without place, source and standing. Reads the file itself, not our parser."""
    for key, entry in version.items():
        place = f"{where}.{key}"
        if isinstance(entry, list) and all(isinstance(item, dict) for item in entry):
            for number, item in enumerate(entry):
                yield from unsourced(item, sources, f"{place}[{number}]")
        elif isinstance(entry, dict) and "value" in entry:
            if VALUE_KEYS - set(entry) or not str(entry["at"]).strip():
                yield f"{place}: has only {', '.join(sorted(entry))}"
            elif entry["source"] not in sources or entry["standing"] not in RULE_STANDINGS:
                yield f"{place}: source {entry['source']!r}, standing {entry['standing']!r}"
        elif isinstance(entry, dict):
            yield from unsourced(entry, sources, place)
        elif not (key in _PLAIN and isinstance(entry, str)):
            yield f"{place}: {entry!r} stands alone"


def _read(path: Path) -> dict[str, Any]:
    return tomllib.loads(path.read_text(encoding="utf-8"))


def test_there_are_rule_files_and_tables() -> None:
    assert RULE_FILES
    assert SHEETS


@pytest.mark.parametrize("path", RULE_FILES, ids=lambda path: path.stem)
def test_every_value_of_a_rule_file_has_source_and_standing(path: Path) -> None:
    content = _read(path)
    assert all({"title", "edition", "issuer"} <= set(source) for source in content["source"].values())
    for version in content["version"]:
        assert list(unsourced(version, content["source"])) == []


@pytest.mark.parametrize("path", SHEETS, ids=lambda path: path.stem)
def test_every_published_table_says_how_it_is_known(path: Path) -> None:
    sheet = _read(path)
    assert all(sheet[key].strip() for key in ("issuer", "title", "edition", "locator", "unit"))
    assert sheet["known"]
    for part in sheet["known"]:
        assert part["part"].strip()
        assert part["standing"] in TABLE_STANDINGS
    assert path.with_suffix(".csv").is_file()


def test_every_table_of_numbers_has_a_sheet() -> None:
    numbers = {path.stem for path in (ROOT / "audiokit" / "standards" / "tables").glob("*.csv")}
    assert numbers == {path.stem for path in SHEETS}


@pytest.mark.parametrize(
    "entry",
    [
        {"days": 21},
        {"days": {"value": 21, "at": "(g)(8)(i)", "source": "cfr"}},
        {"days": {"value": 21, "at": " ", "source": "cfr", "standing": "read"}},
        {"days": {"value": 21, "at": "(g)(8)(i)", "source": "nowhere", "standing": "read"}},
        {"days": {"value": 21, "at": "(g)(8)(i)", "source": "cfr", "standing": "well known"}},
        {"criterion": [{"id": "x", "hz": [2000, 3000]}]},
        {"schedule": {"months": 12}},
    ],
)
def test_the_check_itself(entry: dict[str, Any]) -> None:
    """The walk finds figures without source at any depth."""
    assert len(list(unsourced(entry, {"cfr": {}}))) == 1


def test_what_is_known_from_memory_is_told_in_the_readme() -> None:
    """The README's list names every value and every part of a table that was not read anywhere."""
    readme = (ROOT / "README.md").read_text(encoding="utf-8")
    remembered = [(sheet.stem, part["part"]) for sheet in SHEETS for part in _read(sheet)["known"]
                  if part["standing"] == "from memory, unverified"]  # fmt: skip
    for path in RULE_FILES:
        remembered += [(path.stem, at) for at in _remembered(_read(path)["version"])]
    assert remembered
    missing = [(name, what) for name, what in remembered if not (f"`{name}`" in readme and what in readme)]
    assert missing == []


def _remembered(node: Any) -> Iterator[str]:
    if isinstance(node, dict) and node.get("standing") == "from memory, unverified":
        yield node["at"]
    elif isinstance(node, dict | list):
        for inner in node.values() if isinstance(node, dict) else node:
            yield from _remembered(inner)
