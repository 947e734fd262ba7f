"""The README is true: its commands run, its settings are those accepted, its figures are those of the rule file."""

import csv
import re
import shlex
import shutil
import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from audiokit.cli.main import main
from audiokit.core.errors import CohortError
from audiokit.io.columns import OPTIONAL_TEST_COLUMNS, THRESHOLD_COLUMNS
from audiokit.io.decisions import KINDS
from audiokit.io.settings import read_plan
from audiokit.reports.folder import FILES
from audiokit.surveillance.events import OUTCOMES

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")
_FENCE = re.compile(r"^```(?P<kind>\w+) ?(?P<file>\S*)\n(?P<text>.*?)^```$", re.MULTILINE | re.DOTALL)
_PROGRAM = ".venv/bin/audiokit "


def _section(heading: str) -> str:
    """The text under a heading, up to the next one of any level."""
    found = re.search(rf"^#+ {re.escape(heading)}\n(.*?)(?=^#+ |\Z)", README, re.MULTILINE | re.DOTALL)
    assert found, heading
    return found[1]


def _rows(heading: str) -> list[list[str]]:
    """The cells of the tables in a section, their heads left out."""
    lines = [line for line in _section(heading).splitlines() if line.startswith("| ")]
    cells = [[cell.strip() for cell in line.strip("| ").split(" | ")] for line in lines]
    return [row for row, following in zip(cells, [*cells[1:], [""]], strict=True)
            if set(row[0]) != {"-"} and set(following[0]) != {"-"}]  # fmt: skip


def _names(text: str) -> list[str]:
    return re.findall(r"`([^`]+)`", text)


def _set_up_commands() -> list[str]:
    return [line for line in README.splitlines() if line.startswith("python3 -m venv")]


def test_job_is_told_before_anything_else() -> None:
    first = README.split("\n\n")[1]
    assert "yearly review" in first
    assert "hearing-conservation" in first
    assert "#" not in first


def test_one_line_opens_the_workbench_and_one_runs_the_tests() -> None:
    opens, tests = _set_up_commands()
    assert " && .venv/bin/audiokit open example_cohort" in opens
    assert tests.endswith("/pytest") or "/pytest -" in tests
    assert all(" -c .ci/constraints.txt " in line for line in (opens, tests))


def test_ci_runs_the_very_command_of_the_readme() -> None:
    _, tests = _set_up_commands()
    assert tests in (ROOT / ".ci" / "run").read_text(encoding="utf-8").splitlines()


def test_picture_and_links_exist() -> None:
    links = re.findall(r"\]\(([^)#]+)(#[^)]*)?\)", README)
    assert any(target.endswith(".png") for target, _ in links)
    assert [target for target, _ in links if not (ROOT / target).is_file()] == []
    headings = {h.lower().replace(" ", "-").replace(".", "") for h in re.findall(r"^#+ (.+)$", README, re.MULTILINE)}
    assert [a for a in re.findall(r"\]\(#([^)]+)\)", README) if a not in headings] == []


@pytest.fixture(scope="module")
def printed(tmp_path_factory: pytest.TempPathFactory) -> Iterator[dict[str, Any]]:
    """Every command of the README but the two that set up, and its Python, run in order on the files that it prints."""
    folder = tmp_path_factory.mktemp("readme")
    shutil.copytree(ROOT / "example_cohort", folder / "example_cohort")
    codes = {}
    with pytest.MonkeyPatch.context() as patch:
        patch.chdir(folder)
        for block in _FENCE.finditer(README):
            if block["file"]:
                (folder / block["file"]).parent.mkdir(exist_ok=True)
                (folder / block["file"]).write_text(block["text"], encoding="utf-8")
            if block["kind"] == "python":
                exec(compile(block["text"], "README.md", "exec"), {})
            for line in block["text"].splitlines() if block["kind"] == "sh" else ():
                if line not in _set_up_commands():
                    assert line.startswith(_PROGRAM), line
                    codes[line] = main(shlex.split(line.removeprefix(_PROGRAM)))
    yield {"folder": folder, "codes": codes}


def _table(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def test_every_command_runs_as_printed(printed: dict[str, Any]) -> None:
    assert len(printed["codes"]) >= 9
    assert {line: code for line, code in printed["codes"].items() if code != 0} == {}


def test_printed_arithmetic_is_what_the_review_writes(printed: dict[str, Any]) -> None:
    (why,) = [block["text"].strip() for block in _FENCE.finditer(README) if block["kind"] == "text"]
    assert why in {row["why"] for row in _table(printed["folder"] / "my_review" / "shifts.csv")}


def test_printed_mistake_is_the_one_in_quarantine(printed: dict[str, Any]) -> None:
    (row,) = _table(printed["folder"] / "my_review" / "quarantine.csv")
    assert (row["file"], row["row"], row["value"]) == ("tests.csv", "4", "200")
    assert "row 4 of `tests.csv` says 200" in README


def test_second_site_is_read_as_printed(printed: dict[str, Any]) -> None:
    """The long file with other headings, days before months and a code for no response."""
    baselines = _table(printed["folder"] / "my_review" / "baselines.csv")
    assert {row["test_id"] for row in baselines if row["person_id"] == "A19"} == {"A19@2026-02-03"}


def test_output_files_and_columns_are_all_told(printed: dict[str, Any]) -> None:
    assert {_names(row[0])[0] for row in _rows("What each file holds")} == FILES
    told = [name for row in _rows("How to read shifts.csv") for name in _names(row[0])]
    assert told == list(_table(printed["folder"] / "my_review" / "shifts.csv")[0])
    assert [_names(row[0])[0] for row in _rows("How to read events.csv")] == list(OUTCOMES)


def test_kinds_of_decision_are_all_told() -> None:
    assert sorted(_names(row[0])[0] for row in _rows("Decisions of reviewers")) == sorted(KINDS)


def _accepted(folder: Path, toml: str) -> list[str]:
    """The keys that a table of cohort.toml knows, as the reader's own message lists them."""
    (folder / "people.csv").touch()
    (folder / "tests.csv").touch()
    (folder / "cohort.toml").write_text(toml, encoding="utf-8")
    with pytest.raises(CohortError, match="unknown key 'zzz'") as caught:
        read_plan(folder)
    return caught.value.mend.removeprefix("known keys are: ").split(", ")


_PLAIN_TABLES = ("files", "columns", "cells", "sheet")
_TABLES = ("files", "columns", "cells", "codes", "sheet", "response_limits", "source")


def _told_settings() -> list[str]:
    return [_names(row[0])[0] for row in _rows("All settings of cohort.toml")]


def test_settings_are_exactly_those_that_the_reader_accepts(tmp_path: Path) -> None:
    told = set(_told_settings())
    top = [key for key in _accepted(tmp_path, "zzz = 1") if key not in _TABLES]
    inner = [
        f"[{t}] {key}" for t in ("files", "columns", "cells", "sheet") for key in _accepted(tmp_path, f"[{t}]\nzzz = 1")
    ]
    codes = [f"[codes.{key}]" for key in _accepted(tmp_path, "[codes]\nzzz = 1")]
    assert told == {*top, *inner, *codes, "[response_limits]", "[[source]]"}
    assert set(_accepted(tmp_path, "zzz = 1")) - set(top) == set(_TABLES)


def test_keys_of_a_source_are_exactly_those_accepted(tmp_path: Path) -> None:
    sentence = (
        _section("All settings of cohort.toml").split("A `[[source]]` table may hold")[1].split(", written as")[0]
    )
    told = {*_names(sentence), "people", "tests"}
    assert told == set(_accepted(tmp_path, "[[source]]\ntests = 'tests.csv'\nzzz = 1"))


def test_words_of_the_codes_are_exactly_those_accepted(tmp_path: Path) -> None:
    allowed = {_names(row[0])[0]: row[1] for row in _rows("All settings of cohort.toml")}
    for column in _accepted(tmp_path, "[codes]\nzzz = 1"):
        words = allowed[f"[codes.{column}]"].split(" = ")[0].split(", ")
        assert words == _accepted(tmp_path, f"[codes.{column}]\nzzz = 1")


def test_choices_are_exactly_those_accepted(tmp_path: Path) -> None:
    for key, allowed in ((_names(row[0])[0], _names(row[1])) for row in _rows("All settings of cohort.toml")):
        if key not in ("baseline_revision", "recording_baseline", "date_order"):
            continue
        (tmp_path / "people.csv").touch()
        (tmp_path / "tests.csv").touch()
        (tmp_path / "cohort.toml").write_text(f"{key} = 'zzz'", encoding="utf-8")
        with pytest.raises(CohortError) as caught:
            read_plan(tmp_path)
        assert caught.value.mend == f"write one of {', '.join(allowed)}"


def test_columns_are_exactly_those_that_have_a_meaning(tmp_path: Path) -> None:
    people = [name for row in _rows("People") for name in _names(row[0])]
    assert sorted(people) == sorted(_accepted(tmp_path, "[columns.people]\nzzz = 'x'"))
    tests = {name for row in _rows("Tests") for name in _names(row[0])}
    accepted = set(_accepted(tmp_path, "[columns.tests]\nzzz = 'x'"))
    assert accepted - set(THRESHOLD_COLUMNS) == tests - set(THRESHOLD_COLUMNS)
    assert set(OPTIONAL_TEST_COLUMNS) <= tests


def test_figures_and_clauses_are_those_of_the_rule_file() -> None:
    """Every number of the rule file stands in the table with its clause and standing, and nothing else does."""
    content = tomllib.loads((ROOT / "audiokit" / "rules" / "data" / "us-osha.toml").read_text(encoding="utf-8"))
    figures = {
        (", ".join(map(str, v["value"])) if isinstance(v["value"], list) else str(v["value"]), v["at"], v["standing"])
        for v in _values(content["version"])
        if _is_figure(v["value"])
    }
    told = {tuple(row[1:]) for row in _rows("What the rulebook fixes, and where")}
    assert told == figures


def _values(node: Any) -> Iterator[dict[str, Any]]:
    if isinstance(node, dict) and "value" in node:
        yield node
    elif isinstance(node, dict | list):
        for inner in node.values() if isinstance(node, dict) else node:
            yield from _values(inner)


def _is_figure(value: Any) -> bool:
    if isinstance(value, list):
        return all(map(_is_figure, value))
    return isinstance(value, int | float) and not isinstance(value, bool)
