"""The tables of one person: tests with their answers, events, baselines, worklist lines and quality notes."""

from collections.abc import Sequence

import pandas as pd

from audiokit.core.vocabulary import EARS
from audiokit.widgets.look import MET_WORDS, decibels, table, text, words
from audiokit.widgets.review_lookup import ReviewLookup, TestLine

_CODES = {"outcome", "reason", "status", "action", "check"}
_TABLES = {
    "worklist": ("Lines of the worklist", ("due_on", "overdue", "action", "ear", "test_id", "why")),
    "events": (
        "Events",
        ("tested_on", "test_id", "ear", "criterion", "outcome", "value_db", "mean_hl_db", "recordable", "why"),
    ),
    "baselines": (
        "Baselines in force, superseded and proposed",
        ("ear", "test_id", "in_force_from", "in_force_until", "reason", "status", "why"),
    ),
    "quality": ("Notes on the tests themselves", ("tested_on", "test_id", "ear", "check", "value", "limit", "why")),
}
_LABELS = {
    "due_on": "Due", "test_id": "Test", "tested_on": "Date", "value_db": "Shift, dB", "mean_hl_db": "Mean level, dB HL",
    "in_force_from": "In force from", "in_force_until": "Until", "recordable": "Recordable, if work-related",
}  # fmt: skip


def tests_frame(tests: Sequence[TestLine], shifts: pd.DataFrame, criterion: str) -> pd.DataFrame:
    """One row per test, the latest first, with both ears' answers by one criterion; indexed by place in `tests`."""
    own = shifts[shifts["criterion"] == criterion]
    answers = {(row["test_id"], row["ear"]): _answer(row) for row in own.to_dict("records")}
    rows = [
        {
            "tested_on": test.tested_on,
            "test_id": test.test_id,
            "purpose": test.purpose,
            "standing": words(test.left_out) or test.standing,
            **{ear: answers.get((test.test_id, ear), "") for ear in EARS},
        }
        for test in tests
    ]
    columns = ["tested_on", "test_id", "purpose", "standing", *EARS]
    return pd.DataFrame(rows, columns=columns).iloc[::-1]


def _answer(row: dict) -> str:
    return f"{MET_WORDS[row['met']]}, {decibels(row['value_db'], row['bound'])}"


def findings_html(lookup: ReviewLookup, person_id: str) -> str:
    """Worklist, events, baselines and quality notes of a person, as they stand in the files."""
    frames = {
        "worklist": lookup.worklist(person_id),
        "events": lookup.events(person_id),
        "baselines": lookup.baselines(person_id),
        "quality": lookup.quality(person_id),
    }
    return "".join(_one(name, frame) for name, frame in frames.items())


def _one(name: str, frame: pd.DataFrame) -> str:
    caption, keys = _TABLES[name]
    columns = [(_LABELS.get(key, words(key).capitalize()), "right" if key.endswith("_db") else "left") for key in keys]
    rows = [tuple(_cell(key, row[key]) for key in keys) for row in frame.to_dict("records")]
    return table(caption, columns, rows, f"{caption}: none")


def _cell(key: str, value: object) -> str:
    if value is None or value != value or value == "":
        return ""
    if isinstance(value, float):
        return f"{value:.4f}".rstrip("0").rstrip(".").replace("-", "−")
    if key == "overdue" and value == "yes":
        return '<b class="ak-strong">▲ yes</b>'
    return text(words(str(value)) if key in _CODES else value)
