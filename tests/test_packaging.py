"""What is installed: the wheel holds everything that the commands need outside a checkout, and the pins are sound."""

import os
import re
import subprocess
import sys
import tomllib
import zipfile
from pathlib import Path
from typing import Any

import pytest
from packaging.requirements import Requirement
from packaging.utils import canonicalize_name

ROOT = Path(__file__).parents[1]
_CACHES = {"__pycache__", ".ipynb_checkpoints"}


def _project() -> dict[str, Any]:
    return tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))


def _files(folder: Path) -> set[str]:
    """Names of the files in a folder and below, without what programs leave behind."""
    paths = [path for path in folder.rglob("*") if path.is_file() and not _CACHES & set(path.parts)]
    return {path.relative_to(folder).as_posix() for path in paths if not path.name.startswith(".")}


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The wheel, built from the tree as it is."""
    out = tmp_path_factory.mktemp("wheel")
    command = [sys.executable, "-m", "hatchling", "build", "-t", "wheel", "-d", str(out)]
    done = subprocess.run(command, cwd=ROOT, capture_output=True, text=True)
    assert done.returncode == 0, done.stderr
    (found,) = out.glob("*.whl")
    return found


@pytest.fixture(scope="module")
def installed(wheel: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with the contents of the wheel, as an installation has them."""
    folder = tmp_path_factory.mktemp("installed")
    with zipfile.ZipFile(wheel) as archive:
        archive.extractall(folder)
    return folder


def _python(installed: Path, *arguments: str) -> str:
    """Run Python on the installed package, away from the checkout."""
    environment = {**os.environ, "PYTHONPATH": str(installed)}
    command = [sys.executable, "-P", *arguments]
    done = subprocess.run(command, cwd=installed.parent, env=environment, capture_output=True, text=True)
    assert done.returncode == 0, done.stderr
    return done.stdout.strip()


def test_wheel_holds_every_file_of_the_package(installed: Path) -> None:
    assert _files(ROOT / "audiokit") - _files(installed / "audiokit") == set()


def test_wheel_holds_the_notebooks(installed: Path) -> None:
    """`audiokit open` works outside a checkout only if they travel in the package."""
    notebooks = {path.name for path in (ROOT / "notebooks").glob("*.ipynb")}
    assert "yearly_review.ipynb" in notebooks
    assert _files(installed / "audiokit" / "notebooks") == notebooks
    for name in notebooks:
        assert (installed / "audiokit" / "notebooks" / name).read_bytes() == (ROOT / "notebooks" / name).read_bytes()


def test_wheel_holds_nothing_else(wheel: Path) -> None:
    """No tests, no example cohort, no caches: only the package and its metadata."""
    with zipfile.ZipFile(wheel) as archive:
        names = archive.namelist()
    assert {name.split("/")[0] for name in names} == {
        "audiokit",
        f"audiokit-{_project()['project']['version']}.dist-info",
    }
    assert [name for name in names if _CACHES & set(name.split("/")) or name.endswith((".pyc", ".db"))] == []


def test_installed_package_is_the_one_that_runs(installed: Path) -> None:
    where = _python(installed, "-c", "import audiokit; print(audiokit.__file__)")
    assert Path(where).resolve() == (installed / "audiokit" / "__init__.py").resolve()
    assert _python(installed, "-m", "audiokit", "--version") == f"audiokit {_project()['project']['version']}"


def test_installed_package_makes_and_reviews_a_cohort(installed: Path, tmp_path: Path) -> None:
    """Rule files, tables and the summary's template are found where the package is installed."""
    cohort, out = str(tmp_path / "cohort"), str(tmp_path / "review")
    _python(installed, "-m", "audiokit", "example", cohort, "--people", "120")
    _python(installed, "-m", "audiokit", "review", cohort, "--out", out, "--age-correction")
    assert (tmp_path / "review" / "summary.html").stat().st_size > 1000


def test_installed_command_is_named() -> None:
    assert _project()["project"]["scripts"] == {"audiokit": "audiokit.cli.main:main"}


_PIN = re.compile(r"(?P<name>[A-Za-z0-9._-]+)==(?P<version>[A-Za-z0-9.!+]+)(?: ; (?P<marker>[^#]+))?")


def _pins() -> dict[str, list[str]]:
    """Pinned versions by name. A name may have several, each for its own versions of Python."""
    pins: dict[str, list[str]] = {}
    for line in (ROOT / ".ci" / "constraints.txt").read_text(encoding="utf-8").splitlines():
        match = _PIN.fullmatch(line)
        assert match, f"not a plain pin: {line!r}"
        pins.setdefault(canonicalize_name(match["name"]), []).append(match["version"])
    return pins


def test_pin_list_is_plain() -> None:
    """Name, version, and where it applies: no address, no option, no comment."""
    assert len(_pins()) > 50


def test_every_dependency_has_a_lower_bound_and_a_tested_version() -> None:
    project = _project()["project"]
    pins = _pins()
    wanted = [*project["dependencies"], *(r for extra in project["optional-dependencies"].values() for r in extra)]
    for requirement in map(Requirement, wanted):
        assert [s.operator for s in requirement.specifier] == [">="], f"{requirement}: give a lower bound, and no other"
        versions = pins[canonicalize_name(requirement.name)]
        assert all(requirement.specifier.contains(version) for version in versions), f"{requirement}: pinned {versions}"


def test_top_level_holds_only_what_it_should() -> None:
    """In a checkout nothing else is tracked, names that begin with a dot aside; what users keep there is theirs."""
    expected = {"README.md", "DEVELOPERS.md", "pyproject.toml", "audiokit", "notebooks", "tests", "example_cohort"}
    assert all((ROOT / name).exists() for name in expected)
    if (ROOT / ".git").exists():
        listed = subprocess.run(["git", "ls-files"], cwd=ROOT, capture_output=True, text=True, check=True).stdout
        found = {line.split("/")[0] for line in listed.splitlines()}
        assert {name for name in found if not name.startswith(".")} == expected
