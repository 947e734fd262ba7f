"""The drawn people and tests as tables of text, with our own column names, ready to be faulted and laid out."""

from collections.abc import Callable
from importlib import resources

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from audiokit.core.dates import iso_text
from audiokit.core.vocabulary import EARS, Purpose, Response, Sex
from audiokit.example.faults import USED
from audiokit.example.measuring import NO_RECHECK, REMARKS, TestBlock
from audiokit.example.scenario import FREQUENCIES_HZ, SITES, Job
from audiokit.example.workforce import Workforce

THRESHOLDS = tuple(f"{ear}_{frequency}" for ear in EARS for frequency in FREQUENCIES_HZ)
RECHECKS = tuple(f"{ear}_1000_recheck" for ear in EARS)
TEST_COLUMNS = (
    "test_id", "person_id", "tested_on", "purpose", "valid", "hours_since_noise", "audiometer_id",
    *THRESHOLDS, *RECHECKS, "remarks",
)  # fmt: skip
PEOPLE_COLUMNS = (
    "person_id", "sex", "birth_date", "birth_year", "site", "department", "job",
    "hired_on", "left_on", "noise_since", "crew", "note",
)  # fmt: skip

_CREWS = ("early", "late", "night")
_RESPONSE_WORDS = {
    Response.NO_RESPONSE: "NR",
    Response.DID_NOT_TEST: "DNT",
    Response.COULD_NOT_TEST: "CNT",
    Response.NOT_RECORDED: "",
}


def person_ids(workforce: Workforce) -> NDArray[np.object_]:
    """A letter for the site and a running number: S1001, P1001, B1001, S1002, …"""
    prefix = np.array([site.prefix for site in SITES], dtype=object)[workforce.site]
    number = (1001 + np.arange(len(workforce)) // len(SITES)).astype(str).astype(object)
    return prefix + number


def people_table(rng: np.random.Generator, workforce: Workforce) -> pd.DataFrame:
    """One row per drawn person, text; sex written as files do, and a few unknown; some with a year of birth only."""
    count = len(workforce)
    words = np.array([["unknown", ""], ["female", "F"], ["male", "M"]], dtype=object)
    style = (rng.random(count) < 0.25).astype(np.int64)
    sex = np.where(rng.random(count) < 0.01, Sex.UNKNOWN, workforce.sex)
    year_only, unknown_birth = rng.random(count) < 0.03, rng.random(count) < 0.005
    birth = iso_text(workforce.birth_day)
    year = np.array([text[:4] for text in birth], dtype=object)
    titles = _per_job(lambda job: job.title)
    departments = _per_job(lambda job: job.department)
    return pd.DataFrame(
        {
            "person_id": person_ids(workforce),
            "sex": words[sex, style],
            "birth_date": np.where(year_only | unknown_birth, "", birth),
            "birth_year": np.where(year_only, year, ""),
            "site": np.array([site.name for site in SITES], dtype=object)[workforce.site],
            "department": departments[workforce.site, workforce.job],
            "job": titles[workforce.site, workforce.job],
            "hired_on": iso_text(workforce.hired_day),
            "left_on": iso_text(workforce.left_day),
            "noise_since": iso_text(workforce.noise_since_day),
            "crew": np.array(_CREWS, dtype=object)[rng.integers(0, len(_CREWS), count)],
            "note": "",
        },
        columns=PEOPLE_COLUMNS,
        dtype=object,
    )


def _per_job(text: Callable[[Job], str]) -> NDArray[np.object_]:
    """Texts of all jobs [site, job], filled up with blanks."""
    longest = max(len(site.jobs) for site in SITES)
    rows = [[text(job) for job in site.jobs] + [""] * (longest - len(site.jobs)) for site in SITES]
    return np.array(rows, dtype=object)


def site_table(workforce: Workforce, tests: TestBlock, site: int) -> pd.DataFrame:
    """One row per test of one site, text, in order of date; index = serial of the test."""
    chosen = np.flatnonzero(workforce.site[tests.person] == site)
    chosen = chosen[np.lexsort((tests.serial[chosen], tests.day[chosen]))]
    rows, count = tests.take(chosen), len(chosen)
    place = SITES[site]
    devices = np.array(place.audiometers, dtype=object)
    hours = np.char.mod("%g", np.nan_to_num(rows.hours)).astype(object)
    columns = {
        "test_id": f"T{place.prefix}-" + np.char.mod("%05d", 1 + np.arange(count)).astype(object),
        "person_id": person_ids(workforce)[rows.person],
        "tested_on": iso_text(rows.day),
        "purpose": np.array([_purpose_word(code) for code in Purpose], dtype=object)[rows.purpose],
        "valid": np.where(rows.valid, "yes", "no"),
        "hours_since_noise": np.where(np.isnan(rows.hours), "", hours),
        "audiometer_id": devices[rows.audiometer % len(devices)],
        "remarks": np.array(REMARKS, dtype=object)[rows.remark],
    }
    cells = _cell_texts(rows.threshold, rows.response).reshape(count, len(THRESHOLDS))
    columns |= {name: cells[:, place] for place, name in enumerate(THRESHOLDS)}
    rechecks = np.where(rows.recheck == NO_RECHECK, "", rows.recheck.astype(str).astype(object))
    columns |= {name: rechecks[:, ear] for ear, name in enumerate(RECHECKS)}
    return pd.DataFrame(columns, columns=TEST_COLUMNS, index=rows.serial, dtype=object)


def _purpose_word(code: Purpose) -> str:
    return "" if code == Purpose.BLANK else code.name.lower()


def _cell_texts(threshold: NDArray[np.int16], response: NDArray[np.int8]) -> NDArray[np.object_]:
    texts = threshold.astype(str).astype(object)
    for code, word in _RESPONSE_WORDS.items():
        texts[response == code] = word
    return texts


def constructed_people() -> pd.DataFrame:
    """People made up by hand so that every outcome occurs, whatever chance gives; `note` says what each is for."""
    frame = _read_data("constructed_people.csv")
    return frame.assign(birth_year="", site=SITES[0].name, crew="day")[list(PEOPLE_COLUMNS)]


def constructed_tests() -> pd.DataFrame:
    """Their tests, as rows for the first site's table; their index says that they are to stay sound."""
    frame = _read_data("constructed_tests.csv")
    cells = pd.concat([frame[ear].str.split(" ", expand=True) for ear in EARS], axis=1)
    cells.columns = pd.Index(THRESHOLDS)
    frame = pd.concat([frame, cells], axis=1)
    frame = frame.assign(hours_since_noise="16", audiometer_id="SAW-1", **dict.fromkeys(RECHECKS, ""))
    return frame[list(TEST_COLUMNS)].set_index(pd.Index([USED] * len(frame)))


def _read_data(name: str) -> pd.DataFrame:
    with (resources.files("audiokit.example") / "data" / name).open("r", encoding="utf-8") as file:
        return pd.read_csv(file, dtype=str, keep_default_na=False).astype(object)
