"""A rule file of an invented jurisdiction, to be changed in tests. None of its figures is anybody's law."""

import types
from pathlib import Path

import pytest

from audiokit.rules import catalogue

SOURCE = 'at = "Decree 1, section {n}", source = "decree", standing = "our choice"'


def value(text: str, section: int = 1) -> str:
    """One figure in the grammar of rule files."""
    return f"{{ value = {text}, {SOURCE.format(n=section)} }}"


CRITERION = f"""
[[version.criterion]]
id = "xx-invented.shift"
name = "invented shift"
statistic = {value('"mean"')}
frequencies_hz = {value("[500, 1000, 2000, 4000]", 2)}
shift_at_least_db = {value("15", 3)}
baseline = {value('"revised"')}
retest_window_days = {value("90", 4)}
retest_started_by = {value('["xx-invented.shift"]', 4)}
"""

RULE_FILE = f"""
id = "xx-invented"
title = "An invented jurisdiction"
caution = "Invented."

[source.decree]
title = "An invented decree"
edition = "first"
issuer = "nobody"

[[version]]
from = {value("2000-01-01")}
{CRITERION}
[version.revision]
criterion = "xx-invented.shift"
improvement_at_least_db = {value("10", 5)}
persistence_months = {value("3", 6)}

[version.schedule]
periodic_test_months = {value("24", 7)}
baseline_test_months = {value("1", 8)}

[version.quality]
required_frequencies_hz = {value("[500, 4000]", 9)}
quiet_hours_before_baseline = {value("12", 9)}
recheck_agreement_db = {value("10", 9)}
"""


def install(monkeypatch: pytest.MonkeyPatch, folder: Path, **files: str) -> None:
    """Put rule files in the place of the package's own for one test; `xx_invented=text` is xx-invented.toml."""
    rules = folder / "rules"
    (rules / "data").mkdir(parents=True)
    for name, text in files.items():
        (rules / "data" / f"{name.replace('_', '-')}.toml").write_text(text, encoding="utf-8")
    (rules / "data" / "notes.md").write_text("no rule file", encoding="utf-8")
    resources = types.SimpleNamespace(files=lambda _: rules, as_file=catalogue.resources.as_file)
    monkeypatch.setattr(catalogue, "resources", resources)
    catalogue._versions.cache_clear()
