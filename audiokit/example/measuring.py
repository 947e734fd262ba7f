"""One round of measurement: true thresholds become what an audiometer in a booth writes down."""

from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

from audiokit.core.vocabulary import EARS, Purpose, Response
from audiokit.example.hearing import true_thresholds
from audiokit.example.scenario import FREQUENCIES_HZ, FREQUENCY_SD_DB, SESSION_SD_DB, SITES
from audiokit.example.workforce import Workforce

STEP_DB = 5
LOWEST_DB_HL = -10
NO_RECHECK = np.int16(-999)

REMARKS = (
    "",
    "cold that day",
    "tinnitus in the right ear",
    "arrived straight from the line",
    "ear wax, sent on",
    "naïve listener, explained twice",
)
"""The ï makes the encoding of a file matter."""
_QUIET_HOURS = 14.0
_AT_1000 = FREQUENCIES_HZ.index(1000)


@dataclass(frozen=True)
class TestBlock:
    """Tests in no particular order, one entry each.

    serial    : unique number      day : days since 1970-01-01      purpose : codes of `Purpose`
    hours     : hours since noise, NaN where not noted      audiometer : index into the site's audiometers
    threshold : int16 [test, ear, frequency], the booth's limit where there was no response [dB HL]
    response  : int8 codes of `Response` [test, ear, frequency]
    recheck   : int16 second threshold at 1000 Hz, NO_RECHECK where not made [test, ear] [dB HL]
    remark    : index into REMARKS
    """

    serial: NDArray[np.int64]
    person: NDArray[np.int64]
    day: NDArray[np.int32]
    purpose: NDArray[np.int8]
    valid: NDArray[np.bool_]
    hours: NDArray[np.float64]
    audiometer: NDArray[np.int64]
    threshold: NDArray[np.int16]
    response: NDArray[np.int8]
    recheck: NDArray[np.int16]
    remark: NDArray[np.int64]

    __test__ = False

    def __len__(self) -> int:
        return len(self.person)

    def take(self, rows: NDArray) -> "TestBlock":
        """The tests of these rows, or marked in this mask."""
        return TestBlock(*(getattr(self, each.name)[rows] for each in fields(self)))


def join(blocks: list[TestBlock]) -> TestBlock:
    """All tests of several blocks."""
    return TestBlock(*(np.concatenate([getattr(block, each.name) for block in blocks]) for each in fields(TestBlock)))


def measure(
    rng: np.random.Generator,
    workforce: Workforce,
    person: NDArray[np.int64],
    day: NDArray[np.int32],
    purpose: NDArray,
    first_serial: int,
) -> TestBlock:
    """Test these people on these days: scatter, after-effect of noise, 5 dB steps, booth limits, gaps."""
    count = len(person)
    hours = _hours_since_noise(rng, workforce, person, purpose)
    level = true_thresholds(workforce, person, day) + _scatter(rng, count)
    level += _after_effect(rng, workforce, person, hours)
    level += np.where(purpose == Purpose.BASELINE, 1.5, 0.0)[:, None, None]  # the first test is the least practised
    threshold = np.maximum(np.floor(level / STEP_DB + 0.5) * STEP_DB, LOWEST_DB_HL).astype(np.int16)
    threshold, response = _respond(rng, workforce.site[person], threshold)
    return TestBlock(
        serial=first_serial + np.arange(count, dtype=np.int64),
        person=person,
        day=day,
        purpose=np.where(rng.random(count) < 0.03, Purpose.BLANK, purpose).astype(np.int8),
        valid=rng.random(count) >= 0.012,
        hours=hours,
        audiometer=rng.integers(0, 2, count),
        threshold=threshold,
        response=response,
        recheck=_recheck(rng, threshold, response),
        remark=np.where(rng.random(count) < 0.03, rng.integers(1, len(REMARKS), count), 0),
    )


def _hours_since_noise(
    rng: np.random.Generator, workforce: Workforce, person: NDArray[np.int64], purpose: NDArray
) -> NDArray[np.float64]:
    """Baselines and retests mostly after 14 hours or more of quiet, yearly tests often within the shift."""
    count = len(person)
    quiet = 14.0 + np.floor(rng.random(count) * 50.0)
    soon = np.floor(rng.random(count) * 24.0) / 4.0
    share = np.where(purpose == Purpose.ANNUAL, 0.45, 0.94)
    hours = np.where(rng.random(count) < share, quiet, soon)
    return np.where(workforce.exposed()[person], hours, np.nan)


def _scatter(rng: np.random.Generator, count: int) -> NDArray[np.float64]:
    shape = (count, len(EARS), len(FREQUENCIES_HZ))
    session = SESSION_SD_DB * rng.standard_normal((count, len(EARS), 1))
    return session + np.array(FREQUENCY_SD_DB) * rng.standard_normal(shape)


def _after_effect(
    rng: np.random.Generator, workforce: Workforce, person: NDArray[np.int64], hours: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Temporary threshold shift of people tested soon after noise, from 2000 Hz up; strong in a few (invented)."""
    count = len(person)
    soon = np.where(np.isnan(hours), False, hours < _QUIET_HOURS)
    mild = np.maximum(rng.normal(0.5, 1.5, count), 0.0)
    strong = np.where(rng.random(count) < 0.04, 8.0 + 8.0 * rng.random(count), 0.0)
    weight = np.array([0.0, 0.2, 0.8, 1.0, 1.0, 0.8, 0.4])
    return np.where(soon, mild + strong, 0.0)[:, None, None] * weight


def _respond(
    rng: np.random.Generator, site: NDArray[np.int64], threshold: NDArray[np.int16]
) -> tuple[NDArray[np.int16], NDArray[np.int8]]:
    """Levels above the booth's limit get no response; a few cells are not tested, could not be, or were left blank."""
    at_8000, elsewhere = np.array([place.booth_limit_db for place in SITES]).T
    limit = np.repeat(elsewhere[site][:, None], len(FREQUENCIES_HZ), axis=1)
    limit[:, FREQUENCIES_HZ.index(8000)] = at_8000[site]
    limits = np.broadcast_to(limit[:, None, :], threshold.shape)
    response = np.where(threshold > limits, Response.NO_RESPONSE, Response.MEASURED)
    threshold = np.minimum(threshold, limits).astype(np.int16)
    chance = rng.random(threshold.shape)
    response = np.where(chance < 0.001, Response.DID_NOT_TEST, response)
    response = np.where((chance >= 0.001) & (chance < 0.002), Response.NOT_RECORDED, response)
    whole_ear = rng.random(threshold.shape[:2]) < 0.003
    response = np.where(whole_ear[:, :, None], Response.COULD_NOT_TEST, response)
    return threshold, response.astype(np.int8)


def _recheck(rng: np.random.Generator, threshold: NDArray[np.int16], response: NDArray[np.int8]) -> NDArray[np.int16]:
    """The second threshold at 1000 Hz lies mostly within 5 dB of the first, one in fifty further off."""
    step = rng.choice(np.array([-15, -5, 0, 5, 10]), size=threshold.shape[:2], p=[0.01, 0.2, 0.58, 0.2, 0.01])
    second = np.maximum(threshold[:, :, _AT_1000] + step, LOWEST_DB_HL)
    made = (response[:, :, _AT_1000] == Response.MEASURED) & (rng.random(threshold.shape[:2]) < 0.9)
    return np.where(made, second, NO_RECHECK).astype(np.int16)
