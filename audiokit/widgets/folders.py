"""Cohort folders that lie below the notebook's own folder."""

import os
from pathlib import Path

COHORT_VARIABLE = "AUDIOKIT_COHORT"
"""Environment variable with which `audiokit open` names the cohort to begin with."""

_DEPTH = 3
_PREFERRED = "example_cohort"


def cohort_folders(base: Path) -> list[str]:
    """Folders at most three levels below `base` that hold a cohort, relative to it; not hidden ones, not links."""
    found: list[str] = []
    _search(base, base, _DEPTH, found)
    return sorted(found, key=lambda name: (name.count("/"), name))


def _search(folder: Path, base: Path, depth: int, found: list[str]) -> None:
    try:
        with os.scandir(folder) as entries:
            listed = list(entries)
    except OSError:  # A folder without rights is no cohort that can be offered.
        return
    names = {entry.name for entry in listed if entry.is_file()}
    if _is_cohort(names):
        found.append(folder.relative_to(base).as_posix())
    if depth:
        for entry in listed:
            if entry.is_dir(follow_symlinks=False) and not entry.name.startswith((".", "_")):
                _search(Path(entry.path), base, depth - 1, found)


def _is_cohort(names: set[str]) -> bool:
    kinds = {name.partition(".")[0] for name in names if name.endswith((".csv", ".xlsx", ".parquet"))}
    return "cohort.toml" in names or {"people", "tests"} <= kinds


def first_choice(folders: list[str]) -> str:
    """The folder to begin with: the one `audiokit open` named, else the example, else the first one; blank for none."""
    named = os.environ.get(COHORT_VARIABLE, "")
    if named:
        return named
    return _PREFERRED if _PREFERRED in folders else next(iter(folders), "")
