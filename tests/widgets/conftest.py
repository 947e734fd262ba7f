"""Panels on cohorts that the tests share."""

from pathlib import Path

import pytest
from cohorts import mixed

import audiokit
from audiokit.surveillance.review import Review
from audiokit.widgets import YearlyReview

ROOT = Path(__file__).parents[2]


@pytest.fixture(scope="session")
def mixed_folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return mixed(tmp_path_factory.mktemp("cohorts") / "mixed")


@pytest.fixture
def panel(mixed_folder: Path) -> YearlyReview:
    """The panel with the mixed cohort loaded."""
    made = YearlyReview(base=mixed_folder.parent)
    made.load()
    assert made.review is not None, made.loader.told.value
    return made


@pytest.fixture(scope="session")
def example_review() -> Review:
    return audiokit.review(audiokit.read_cohort(ROOT / "example_cohort"))
