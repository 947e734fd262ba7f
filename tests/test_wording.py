"""What people read: facts, dates and arithmetic. No clinical readings, and no paths of somebody's machine."""

import ast
import json
import re
from collections.abc import Iterator
from pathlib import Path

import pytest

import audiokit

ROOT = Path(__file__).parents[1]
_CACHES = {"__pycache__", ".ipynb_checkpoints"}

CLINICAL = re.compile(
    r"\b(?:(?:ab)?normal|mild(?:ly)?|moderate(?:ly)?|severe(?:ly)?|profound(?:ly)?|(?:good|poor|bad|perfect) hearing"
    r"|impair\w*|handicap\w*|disab(?:ility|ilities)|deaf\w*|hard of hearing|hearing[ -]impaired"
    r"|patients?|diagnos\w*|prognos\w*|patholog\w*|diseases?|disorders?|symptoms?|syndromes?|healthy|unhealthy"
    r"|therap\w*|treatments?|cured?|suffer\w*|tinnitus|presbycusis|conductive|sensorineural"
    r"|alarming|worrying|harmless|nothing to worry)\b",
    re.IGNORECASE,
)
"""Words that read a threshold for somebody, which is for licensed audiologists and physicians."""

ALLOWED = re.compile(
    r"\b(?:no|not a|never a|nor a|makes no) diagnos[ei]s\b"  # what the package is not
    r"|otologically normal"  # the population of ISO 7029, in the standard's own words
    r"|standard normal|normal d(?:istribution|eviate)"  # statistics
    r"|tinnitus in the right ear"  # a tester's remark in the invented files
    r"|no clinical readings?",
    re.IGNORECASE,
)

MACHINE_PATH = re.compile(
    r"(?<![\w.:/<*~})\]-])/(?:home|root|Users|work|mnt|srv)/|\b[A-Z]:\\Users\\|\bfile://", re.ASCII
)
REGISTRY = re.compile(r"\bpypi\.org|pythonhosted|index-url|registry\.npmjs|deb\.debian\.org", re.IGNORECASE)


def clinical_words(text: str) -> list[str]:
    """The clinical readings in a text."""
    return CLINICAL.findall(ALLOWED.sub(" ", " ".join(text.split())))


def _texts_of_code(path: Path) -> Iterator[str]:
    """Every text constant of a module: messages, wording and docstrings, but no names of functions.

    "normal" alone is a keyword of charts and style sheets; a label would begin with a capital, or have company.
    """
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Constant) and isinstance(node.value, str) and node.value != "normal":
            yield node.value


def _text(path: Path) -> str:
    """What a person reads of one file."""
    if path.suffix == ".py":
        return "\n".join(_texts_of_code(path))
    text = path.read_text(encoding="utf-8")
    if path.suffix == ".ipynb":
        return "\n".join("".join(cell["source"]) for cell in json.loads(text)["cells"])
    return text


def _files(*folders: str, suffixes: tuple[str, ...]) -> list[Path]:
    found = []
    for folder in folders:
        paths = [ROOT / folder] if (ROOT / folder).is_file() else sorted((ROOT / folder).rglob("*"))
        files = [path for path in paths if path.is_file() and not _CACHES & set(path.parts)]
        found += [path for path in files if path.suffix in suffixes]
    return found


READ_BY_PEOPLE = _files(
    "README.md", "DEVELOPERS.md", "audiokit", "notebooks", "example_cohort/about.md", "example_cohort/cohort.toml",
    suffixes=(".py", ".md", ".toml", ".html", ".ipynb", ".js", ".json"),
)  # fmt: skip
EVERYTHING = _files(
    "README.md", "DEVELOPERS.md", "pyproject.toml", ".ci", ".gitignore", "audiokit", "notebooks", "tests",
    "example_cohort", suffixes=("", ".py", ".md", ".toml", ".html", ".ipynb", ".js", ".css", ".json", ".txt", ".csv"),
)  # fmt: skip


def _name(path: Path) -> str:
    return path.relative_to(ROOT).as_posix()


@pytest.mark.parametrize("path", READ_BY_PEOPLE, ids=_name)
def test_no_clinical_readings(path: Path) -> None:
    assert clinical_words(_text(path)) == []


def test_no_clinical_readings_in_what_a_review_writes(tmp_path: Path) -> None:
    """Every sentence of every outcome; the example cohort holds them all. Users' own texts are not ours to judge."""
    findings = audiokit.review(audiokit.read_cohort(ROOT / "example_cohort", age_correction=True))
    audiokit.write_review(findings, tmp_path / "review")
    written = sorted((tmp_path / "review").iterdir())
    assert len(written) >= 8
    for path in written:
        assert (path.name, clinical_words(path.read_text(encoding="utf-8"))) == (path.name, [])


def test_files_name_no_machine_and_no_registry() -> None:
    """Nothing points outside the project: it can be copied anywhere."""
    found = {
        _name(path): hits
        for path in EVERYTHING
        if path != Path(__file__) and (hits := _outside(path.read_text(encoding="utf-8", errors="replace")))
    }
    assert found == {}


def _outside(text: str) -> list[str]:
    return [*MACHINE_PATH.findall(text), *REGISTRY.findall(text)]


def test_the_lists_find_what_they_should() -> None:
    for bad in ("Hearing is normal.", "mild shift", "the patient", "an impaired ear", "no disease", "diagnosed"):
        assert clinical_words(bad), bad
    for good in (
        "decision support, no diagnosis",
        "of otologically normal persons",
        "mean shift 10 dB: yes",
        "normative",
    ):
        assert clinical_words(good) == [], good
    for bad in ("open /home/ada/cohort", "in '/root/x'", "see C:\\Users\\ada", "--index-url x"):
        assert _outside(bad), bad
    for good in ("notebooks/yearly_review.ipynb", "a/home/b", "https://example.org/work/x", "on the way home/"):
        assert _outside(good) == [], good


def test_every_kind_of_file_is_read() -> None:
    """A new kind of text file must be given to the lists above, not pass unseen."""
    known = {"", ".py", ".md", ".toml", ".html", ".ipynb", ".js", ".css", ".json", ".txt", ".csv", ".typed"}
    binary = {".png", ".svg", ".xlsx", ".parquet", ".db"}
    folders = ("audiokit", "notebooks", "example_cohort")
    paths = [p for f in folders for p in (ROOT / f).rglob("*") if p.is_file() and not _CACHES & set(p.parts)]
    assert {path.suffix for path in paths} - known - binary == set()
