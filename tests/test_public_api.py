"""The public names: few, lazy, documented, and enough to do the yearly review from Python."""

import ast
import datetime
import importlib
import inspect
from pathlib import Path

import pytest

import audiokit
from audiokit.core import errors

ROOT = Path(__file__).parents[1]

EXPECTED = {
    "__version__",
    "AudiokitError",
    "list_rulebooks",
    "load_rulebook",
    "read_cohort",
    "review",
    "write_review",
}
"""A name added or taken away is a decision; it belongs in DEVELOPERS.md as well as here."""


def test_public_names_are_these() -> None:
    assert set(audiokit.__all__) == EXPECTED
    assert set(dir(audiokit)) == EXPECTED


@pytest.mark.parametrize("name", sorted(EXPECTED - {"__version__"}))
def test_public_name_resolves_and_is_documented(name: str) -> None:
    """Each has a docstring of its own, and a function's parameters and result are annotated."""
    thing = getattr(audiokit, name)
    assert thing.__module__.startswith("audiokit.")
    assert (thing.__doc__ or "").strip()
    if inspect.isfunction(thing):
        signature = inspect.signature(thing)
        assert signature.return_annotation is not inspect.Signature.empty
        assert all(p.annotation is not inspect.Parameter.empty for p in signature.parameters.values())


def test_unknown_name_lists_the_known_ones() -> None:
    with pytest.raises(AttributeError, match=r"no attribute 'reviews'.*read_cohort, review"):
        _ = audiokit.reviews


def test_errors_a_user_sees_share_one_ancestor() -> None:
    classes = [c for _, c in inspect.getmembers(errors, inspect.isclass) if c.__module__ == errors.__name__]
    assert len(classes) > 1
    assert all(issubclass(c, audiokit.AudiokitError) for c in classes)


def test_error_shows_its_mend() -> None:
    error = audiokit.AudiokitError("people.csv, row 3: no person is named", "enter the person's identifier")
    assert str(error) == "people.csv, row 3: no person is named\n  mend: enter the person's identifier"
    assert str(audiokit.AudiokitError("no mend known")) == "no mend known"


def test_version_is_that_of_the_project() -> None:
    assert f'version = "{audiokit.__version__}"' in (ROOT / "pyproject.toml").read_text(encoding="utf-8")


def test_rulebooks_are_found_by_date() -> None:
    assert "us-osha" in audiokit.list_rulebooks()
    assert audiokit.load_rulebook("us-osha", datetime.date(2026, 3, 1)).id == "us-osha"


def test_yearly_review_from_python(tmp_path: Path) -> None:
    """The three calls that the README shows."""
    cohort = audiokit.read_cohort(ROOT / "example_cohort")
    findings = audiokit.review(cohort)
    audiokit.write_review(findings, tmp_path / "review")
    lines = (tmp_path / "review" / "worklist.csv").read_text(encoding="utf-8").splitlines()
    assert len(lines) == 1 + len(findings.worklist) > 1


def _public_definitions() -> list[tuple[str, str]]:
    found = []
    for path in sorted((ROOT / "audiokit").glob("**/*.py")):
        module = ".".join(path.relative_to(ROOT).with_suffix("").parts).removesuffix(".__init__")
        tree = ast.parse(path.read_text(encoding="utf-8"))
        found.append((module, ""))
        for node in tree.body:
            if isinstance(node, ast.FunctionDef | ast.ClassDef) and not node.name.startswith("_"):
                found.append((module, node.name))
    return found


def test_every_public_function_and_class_has_a_docstring() -> None:
    """Modules too; a dataclass needs one that is not the signature made by the machine."""
    missing = []
    for module, name in _public_definitions():
        if module.endswith("__main__"):
            continue
        thing = importlib.import_module(module)
        doc = inspect.getdoc(getattr(thing, name) if name else thing) or ""
        if not doc or doc.startswith(f"{name}("):
            missing.append(f"{module} {name}".strip())
    assert missing == []
