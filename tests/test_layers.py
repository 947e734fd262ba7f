"""Imports point down only, and importing the package stays light."""

import ast
import json
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parents[1] / "audiokit"

LAYERS = (
    ("core",),
    ("model", "standards"),
    ("measures", "io"),
    ("rules",),
    ("surveillance", "cohort"),
    ("reports", "example"),
    ("widgets", "cli"),
)
"""From the bottom up; rooms of one row do not import each other."""

RANK = {room: row for row, rooms in enumerate(LAYERS) for room in rooms}


def _imported(node: ast.AST) -> list[str]:
    """Dotted names that one statement or call imports; `import_module` with a text counts too."""
    if isinstance(node, ast.Import):
        return [alias.name for alias in node.names]
    if isinstance(node, ast.ImportFrom):
        if node.level:
            return ["audiokit.(relative)"]
        return [f"audiokit.{a.name}" for a in node.names] if node.module == "audiokit" else [node.module or ""]
    if isinstance(node, ast.Call) and node.args:
        called = node.func.attr if isinstance(node.func, ast.Attribute) else getattr(node.func, "id", "")
        first = node.args[0].values[0] if isinstance(node.args[0], ast.JoinedStr) else node.args[0]
        if called in ("import_module", "__import__", "files") and isinstance(first, ast.Constant):
            return [str(first.value)]
    return []


def upward_imports(package: Path) -> Iterator[str]:
    """A line for each import that does not point down. The modules at the top of the package are exempt."""
    for path in sorted(package.glob("*/**/*.py")):
        here = path.relative_to(package).parts[0]
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            for name in _imported(node):
                parts = name.split(".")
                if parts[0] != "audiokit" or len(parts) < 2 or parts[1] in (here, "__version__"):
                    continue
                if RANK.get(parts[1], len(LAYERS)) >= RANK[here]:
                    yield f"{path.relative_to(package)}:{node.lineno}: {here} may not import {name}"


def test_every_room_has_a_row() -> None:
    """A new folder must be given its place first; folders without modules hold files only."""
    rooms = {path.relative_to(PACKAGE).parts[0] for path in PACKAGE.glob("*/**/*.py")}
    assert rooms - set(RANK) == set()


def test_imports_point_down() -> None:
    assert list(upward_imports(PACKAGE)) == []


@pytest.mark.parametrize(
    ("room", "line", "allowed"),
    [
        ("io", "from audiokit.core.errors import CohortError", True),
        ("io", "import audiokit.model.grid", True),
        ("io", "from audiokit import __version__", True),
        ("io", "from audiokit.io.cells import parse_cells", True),
        ("io", "from audiokit.measures.sums import Sums", False),
        ("core", "def f():\n    from audiokit.reports import folder", False),
        ("rules", "import audiokit.surveillance.review as r", False),
        ("model", "from audiokit import cli", False),
        ("model", "from audiokit import read_cohort", False),
        ("model", "if TYPE_CHECKING:\n    from audiokit.io.cohort import read_cohort", False),
        ("widgets", "import_module('audiokit.cli.main')", False),
        ("widgets", "importlib.import_module(f'audiokit.cli.{name}')", False),
        ("measures", "from ..rules import spec", False),
        ("measures", "import numpy", True),
    ],
)
def test_the_check_itself(tmp_path: Path, room: str, line: str, allowed: bool) -> None:
    """On a toy package the check finds each kind of import, and lets downward ones pass."""
    (tmp_path / room).mkdir()
    (tmp_path / room / "module.py").write_text(line, encoding="utf-8")
    assert bool(list(upward_imports(tmp_path))) is not allowed


def _run(code: str) -> str:
    return subprocess.run([sys.executable, "-c", code], check=True, capture_output=True, text=True).stdout


def _loaded_after(code: str) -> set[str]:
    return set(json.loads(_run(f"{code}\nimport json, sys\nprint(json.dumps(sorted(sys.modules)))")))


def test_importing_the_package_brings_no_heavy_library() -> None:
    loaded = _loaded_after("import audiokit")
    assert "audiokit" in loaded
    assert {"plotly", "ipywidgets", "anywidget", "pandas", "numpy", "pyarrow", "openpyxl"} & loaded == set()


def test_the_review_brings_no_widgets_and_no_charts() -> None:
    """The headless command, with every public name touched."""
    loaded = _loaded_after(
        "import audiokit, audiokit.cli.review, audiokit.cli.decide\nfor n in audiokit.__all__: getattr(audiokit, n)"
    )
    assert "pandas" in loaded
    assert {"plotly", "ipywidgets", "anywidget", "IPython", "jupyterlab"} & loaded == set()


def test_importing_the_package_costs_under_a_quarter_of_pandas() -> None:
    """Both times are taken in the same processes, so that a busy machine slows both; the least of three counts."""
    code = """
import time
start = time.perf_counter()
import pandas
middle = time.perf_counter()
import audiokit
print(middle - start, time.perf_counter() - middle)
"""
    seconds = [tuple(map(float, _run(code).split())) for _ in range(3)]
    pandas, audiokit = (min(column) for column in zip(*seconds, strict=True))
    assert audiokit < pandas / 4
