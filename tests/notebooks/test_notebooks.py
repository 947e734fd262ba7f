"""Every notebook that is shipped: kept without outputs, thin, and run once from the first cell to the last."""

import json
import shutil
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

ROOT = Path(__file__).parents[2]
NOTEBOOKS = sorted((ROOT / "notebooks").glob("*.ipynb"))
MOST_LINES = 3


def _cells(path: Path) -> list[dict[str, Any]]:
    return json.loads(path.read_text(encoding="utf-8"))["cells"]


def test_there_are_notebooks() -> None:
    assert [path.name for path in NOTEBOOKS] == ["yearly_review.ipynb"]


@pytest.mark.parametrize("path", NOTEBOOKS, ids=lambda path: path.stem)
def test_kept_without_outputs(path: Path) -> None:
    done = subprocess.run(
        [sys.executable, "-m", "nbstripout", "--verify", str(path)], capture_output=True, text=True, check=False
    )
    assert (done.returncode, done.stdout + done.stderr) == (0, "")


@pytest.mark.parametrize("path", NOTEBOOKS, ids=lambda path: path.stem)
def test_thin_over_the_package(path: Path) -> None:
    """A notebook imports, calls, and says its cautions; what it shows is made and tested in the package."""
    cells = _cells(path)
    for cell in cells:
        if cell["cell_type"] == "code":
            assert len(cell["source"]) <= MOST_LINES
    prose = " ".join("".join(cell["source"]) for cell in cells if cell["cell_type"] == "markdown")
    assert "Decision support." in prose
    assert "audiologists and physicians" in prose


@pytest.mark.parametrize("path", NOTEBOOKS, ids=lambda path: path.stem)
def test_runs_from_the_first_cell_to_the_last(path: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    import nbformat
    from nbclient import NotebookClient

    monkeypatch.setenv("AUDIOKIT_COHORT", "")
    shutil.copytree(ROOT / "example_cohort", tmp_path / "example_cohort")
    notebook = nbformat.read(path, as_version=4)
    check = "assert panel.review is not None, panel.loader.told.value\nprint(len(panel.worklist.lines.frame))"
    notebook.cells.append(nbformat.v4.new_code_cell(check))
    client = NotebookClient(
        notebook, resources={"metadata": {"path": str(tmp_path)}}, store_widget_state=False, timeout=60
    )
    client.execute()
    outputs = [output for cell in notebook.cells for output in cell.get("outputs", [])]
    assert not [output for output in outputs if output.output_type == "error" or output.get("name") == "stderr"]
    views = [output for output in outputs if "application/vnd.jupyter.widget-view+json" in output.get("data", {})]
    assert len(views) == 1
    assert int(outputs[-1]["text"]) > 100
