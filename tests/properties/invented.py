"""Strategies for small invented cohorts near every limit: rows of files, settings and reviewers' decisions."""

import datetime
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from hypothesis import HealthCheck, settings
from hypothesis import strategies as st

from audiokit.io.decisions import record_decision
from tests.surveillance.small_cohorts import SIGNED, Row, Tables, hearing_test, reviewed, write_cohort

LEVELS = (0, 5, 9.9, 10, 10.1, 14.9, 15, 20, 24.9, 25, 35)
GAPS = (0, 1, 15, 29, 30, 31, 90, 181, 184, 365, 366)
PURPOSES = ("annual", "annual", "annual", "retest", "retest", "", "other", "baseline")
OTHER_CELLS = ("10", "15", "NR@90", "CNT", "")

few = settings(deadline=None, max_examples=10, suppress_health_check=list(HealthCheck))
"""Every example is a whole review or several, so they are few, and each holds several people."""


@dataclass
class Invented:
    """A cohort as rows, the settings of its review, and decisions (kind, person, test, ear, effect)."""

    people: list[Row]
    tests: list[Row]
    options: dict[str, Any]
    decisions: list[tuple[str, str, str, str, str]] = field(default_factory=list)

    def write(self, folder: Path, only: str | None = None) -> Path:
        """A cohort folder; `only` of one person. Decisions on others become notes, so that numbers stay."""
        mine = [row for row in self.people if only in (None, row["person_id"])]
        tests = [row for row in self.tests if only in (None, row["person_id"])]
        write_cohort(folder, tests, mine)
        for kind, person, test, ear, effect in self.decisions:
            about: dict[str, Any] = {"kind": kind, "person_id": person, "test_id": test, "takes_effect_on": effect}
            if only not in (None, person):
                about = {"kind": "note", "person_id": str(only)}
            elif kind != "invalidate_test":
                about["ear"] = ear
            record_decision(folder, **about, **SIGNED)
        return folder

    def review(self, folder: Path, only: str | None = None) -> Tables:
        return reviewed(self.write(folder, only), **self.options)


@st.composite
def cells(draw: st.DrawFn) -> tuple[str, str, str]:
    """Three cells of one ear: mostly one level, sometimes uneven, silent or missing at one frequency."""
    level = draw(st.sampled_from(LEVELS))
    three = [f"{level:g}"] * 3
    change = draw(st.sampled_from(("", "", "", "uneven", "silent", "missing")))
    if change == "uneven":
        three = [f"{level + 10:g}", f"{level:g}", f"{level - 10:g}"]
    elif change == "silent":
        three[draw(st.integers(0, 2))] = f"NR@{draw(st.sampled_from((20, 40, 90)))}"
    elif change == "missing":
        three[draw(st.integers(0, 2))] = draw(st.sampled_from(("", "DNT", "CNT")))
    return three[0], three[1], three[2]


@st.composite
def persons(draw: st.DrawFn, name: str) -> tuple[Row, list[Row]]:
    """One person, and that person's tests in order of time."""
    day = datetime.date(2018, 3, 31) + datetime.timedelta(days=draw(st.integers(0, 200)))
    rows = []
    for number in range(draw(st.integers(1, 6))):
        day += datetime.timedelta(days=draw(st.sampled_from(GAPS)))
        purpose = "baseline" if number == 0 and draw(st.booleans()) else draw(st.sampled_from(PURPOSES))
        other = {"hz500": draw(st.sampled_from(OTHER_CELLS)), "right_6000": draw(st.sampled_from(OTHER_CELLS))}
        valid = draw(st.sampled_from(("", "", "", "", "no")))
        row = hearing_test(f"{name}{number}", day.isoformat(), draw(cells()), draw(cells()), purpose, name, valid)
        rows.append(
            row | {key: other["hz500"] for key in ("right_500", "left_500")} | {"right_6000": other["right_6000"]}
        )
    sex, born = (
        draw(st.sampled_from(("male", "female", "unknown"))),
        draw(st.sampled_from(("1960-05-05", "1999-01-01", ""))),
    )
    left_on = draw(st.sampled_from(("", "", "2021-06-01")))
    return {"person_id": name, "sex": sex, "birth_date": born, "left_on": left_on}, rows


@st.composite
def cohorts(draw: st.DrawFn, people: int = 4, decided: bool = True) -> Invented:
    """A cohort of one to so many people under any settings, with some decisions."""
    made = [draw(persons("PQRS"[n])) for n in range(draw(st.integers(1, people)))]
    tests = [row for _, rows in made for row in rows]
    options = {
        "as_of": draw(st.sampled_from((datetime.date(2030, 1, 1), datetime.date(2019, 6, 15)))),
        "age_correction": draw(st.booleans()),
        "baseline_revision": draw(st.sampled_from(("reviewed", "automatic"))),
        "recording_baseline": draw(st.sampled_from(("original", "in_force"))),
    }
    decisions = []
    for _ in range(draw(st.integers(0, 3)) if decided else 0):
        row = draw(st.sampled_from(tests))
        kind = draw(st.sampled_from(("revise_baseline", "revise_baseline", "invalidate_test")))
        effect = datetime.date.fromisoformat(row["tested_on"]) + datetime.timedelta(days=draw(st.sampled_from(GAPS)))
        ear = draw(st.sampled_from(("right", "left")))
        decisions.append((kind, row["person_id"], row["test_id"], ear, effect.isoformat()))
    return Invented([person for person, _ in made], tests, options, decisions)
