"""Which folders are offered as cohorts."""

from pathlib import Path

import pytest

from audiokit.widgets import folders
from audiokit.widgets.folders import cohort_folders, first_choice


def _touch(base: Path, *names: str) -> None:
    for name in names:
        path = base / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.touch()


def test_folders_with_a_cohort_are_found_and_others_are_not(tmp_path: Path) -> None:
    _touch(
        tmp_path,
        "a/cohort.toml",
        "b/people.csv",
        "b/tests.xlsx",
        "c/people.csv",
        "d/tests.csv",
        "x/y/z/cohort.toml",
        "x/y/z/deep/cohort.toml",
        ".hidden/cohort.toml",
        "_private/cohort.toml",
    )
    (tmp_path / "link").symlink_to(tmp_path / "a", target_is_directory=True)
    assert cohort_folders(tmp_path) == ["a", "b", "x/y/z"]


def test_the_notebooks_own_folder_can_be_the_cohort(tmp_path: Path) -> None:
    _touch(tmp_path, "cohort.toml")
    assert cohort_folders(tmp_path) == ["."]


def test_a_folder_that_is_not_there_offers_nothing(tmp_path: Path) -> None:
    assert cohort_folders(tmp_path / "nowhere") == []


def test_a_link_to_itself_hides_nothing(tmp_path: Path) -> None:
    _touch(tmp_path, "a/cohort.toml")
    (tmp_path / "a" / "loop").symlink_to("loop")
    assert cohort_folders(tmp_path) == ["a"]


def test_a_big_tree_is_not_searched_to_its_end(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    _touch(tmp_path, *(f"d{at:02}/x/none.txt" for at in range(20)), "d00/cohort.toml", "d19/x/cohort.toml")
    assert cohort_folders(tmp_path) == ["d00", "d19/x"]
    monkeypatch.setattr(folders, "_MOST_FOLDERS", 15)
    assert cohort_folders(tmp_path) == ["d00"]


def test_the_first_choice(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.delenv("AUDIOKIT_COHORT", raising=False)
    assert first_choice([]) == ""
    assert first_choice(["a", "b"]) == "a"
    assert first_choice(["a", "example_cohort"]) == "example_cohort"
    monkeypatch.setenv("AUDIOKIT_COHORT", "elsewhere")
    assert first_choice(["a", "example_cohort"]) == "elsewhere"
