"""Rule files that a test reads are forgotten after it."""

from collections.abc import Iterator

import pytest

from audiokit.rules import catalogue


@pytest.fixture(autouse=True)
def forget_rule_files() -> Iterator[None]:
    yield
    catalogue._versions.cache_clear()
