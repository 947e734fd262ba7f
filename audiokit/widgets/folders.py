"""Cohort folders that lie below the notebook's own folder."""

import os
from collections import deque
from pathlib import Path

COHORT_VARIABLE = "AUDIOKIT_COHORT"
"""Environment variable with which `audiokit open` names the cohort to begin with."""

_DEPTH = 3
_MOST_FOLDERS = 2000
_PREFERRED = "example_cohort"


def cohort_folders(base: Path) -> list[str]:
    """Folders at most three levels below `base` that hold a cohort, relative to it; not hidden ones, not links.

    Only so many folders are looked into, the upper ones first, so that a notebook in a big tree still starts at once.
    """
    found: list[str] = []
    waiting = deque([(base, 0)])
    for _ in range(_MOST_FOLDERS):
        if not waiting:
            break
        folder, depth = waiting.popleft()
        files, folders = _listing(folder)
        if _is_cohort(files):
            found.append(folder.relative_to(base).as_posix())
        if depth < _DEPTH:
            waiting += [(folder / name, depth + 1) for name in sorted(folders) if not name.startswith((".", "_"))]
    return sorted(found, key=lambda name: (name.count("/"), name))


def _listing(folder: Path) -> tuple[set[str], set[str]]:
    """Names of the files and of the folders in a folder; none where it cannot be read."""
    files, folders = set(), set()
    try:
        with os.scandir(folder) as entries:
            for entry in entries:
                if entry.is_dir(follow_symlinks=False):
                    folders.add(entry.name)
                elif _is_file(entry):
                    files.add(entry.name)
    except OSError:  # A folder without rights is no cohort that can be offered.
        return set(), set()
    return files, folders


def _is_file(entry: os.DirEntry[str]) -> bool:
    try:
        return entry.is_file()
    except OSError:  # A link that leads to itself.
        return False


def _is_cohort(names: set[str]) -> bool:
    kinds = {name.partition(".")[0] for name in names if name.endswith((".csv", ".xlsx", ".parquet"))}
    return "cohort.toml" in names or {"people", "tests"} <= kinds


def first_choice(folders: list[str]) -> str:
    """The folder to begin with: the one `audiokit open` named, else the example, else the first one; blank for none."""
    named = os.environ.get(COHORT_VARIABLE, "")
    if named:
        return named
    return _PREFERRED if _PREFERRED in folders else next(iter(folders), "")
