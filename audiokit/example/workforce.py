"""The people of the example: who works where since when, and how well each hears for their age."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from audiokit.core.dates import NO_DATE, to_days
from audiokit.core.vocabulary import EARS, Sex
from audiokit.example.scenario import AS_OF, CAMPAIGN_YEARS, DELIVERED, EXPOSED_FROM_DB, FREQUENCIES_HZ, SITES

DAYS_PER_YEAR = 365.25

_PROGRAMME_START = to_days(AS_OF.replace(year=CAMPAIGN_YEARS[0]))
_RETIREMENT_AGE = 66.0
_VARIANCE_SHARES = (0.60, 0.15, 0.25)
"""How much of a person's deviate is common to all cells, to an ear, and to the cell itself (invented; sum 1)."""


@dataclass(frozen=True)
class Workforce:
    """Arrays with one entry per person; days since 1970-01-01, NO_DATE where there is none.

    site, job : index into SITES and its jobs      sex : codes of `Sex`, never unknown here
    deviate   : standard normal deviate from the median of the same age and sex [person, ear, frequency]
    other_db  : hearing loss of other origin, all frequencies of one ear alike [person, ear]
    """

    site: NDArray[np.int64]
    job: NDArray[np.int64]
    sex: NDArray[np.int8]
    birth_day: NDArray[np.int32]
    hired_day: NDArray[np.int32]
    left_day: NDArray[np.int32]
    noise_since_day: NDArray[np.int32]
    level_db: NDArray[np.float64]
    deviate: NDArray[np.float64]
    other_db: NDArray[np.float64]

    def __len__(self) -> int:
        return len(self.site)

    def exposed(self) -> NDArray[np.bool_]:
        """True where the person works in noise."""
        return self.noise_since_day != NO_DATE


def draw_workforce(rng: np.random.Generator, people: int) -> Workforce:
    """Draw `people` people, site after site in turn."""
    site = np.arange(people) % len(SITES)
    job_counts = np.array([len(each.jobs) for each in SITES])
    job = (rng.random(people) * job_counts[site]).astype(np.int64)
    level = np.array(
        [[place.jobs[min(i, len(place.jobs) - 1)].level_db for i in range(job_counts.max())] for place in SITES]
    )
    own_level = level[site, job] + np.clip(rng.normal(0.0, 1.5, people), -3.0, 3.0)
    birth, hired, left = _draw_careers(rng, people)
    earlier = np.where(rng.random(people) < 0.25, rng.random(people) * 10.0 * DAYS_PER_YEAR, 0.0).astype(np.int32)
    since = np.maximum(hired - earlier, birth + np.int32(17 * DAYS_PER_YEAR))
    return Workforce(
        site=site,
        job=job,
        sex=np.where(rng.random(people) < 0.38, Sex.FEMALE, Sex.MALE).astype(np.int8),
        birth_day=birth,
        hired_day=hired,
        left_day=left,
        noise_since_day=np.where(level[site, job] >= EXPOSED_FROM_DB, since, NO_DATE).astype(np.int32),
        level_db=own_level,
        deviate=_draw_deviates(rng, people),
        other_db=_draw_other_loss(rng, people),
    )


def _draw_careers(
    rng: np.random.Generator, people: int
) -> tuple[NDArray[np.int32], NDArray[np.int32], NDArray[np.int32]]:
    """Days of birth, hiring and leaving; nobody is tested before 18 or after 66, well inside the limits of ISO 7029."""
    age_at_hire = 18.2 + 30.0 * rng.beta(1.2, 2.4, people)
    veteran = rng.random(people) < 0.6
    tenure = np.minimum(rng.random(people) * 25.0, 58.0 - age_at_hire) * DAYS_PER_YEAR
    newcomer_span = to_days(AS_OF) - 60 - _PROGRAMME_START
    hired = np.where(veteran, _PROGRAMME_START - tenure, _PROGRAMME_START + rng.random(people) * newcomer_span)
    birth = hired - age_at_hire * DAYS_PER_YEAR
    earliest_leave = np.maximum(hired, _PROGRAMME_START) + 200
    leave = earliest_leave + rng.random(people) * 8.5 * DAYS_PER_YEAR
    leave = np.minimum(np.where(rng.random(people) < 0.4, leave, np.inf), birth + _RETIREMENT_AGE * DAYS_PER_YEAR)
    left = np.where(leave <= to_days(DELIVERED), leave, float(NO_DATE))
    return birth.astype(np.int32), hired.astype(np.int32), left.astype(np.int32)


def _draw_deviates(rng: np.random.Generator, people: int) -> NDArray[np.float64]:
    """Correlated over ears and frequencies; each cell alone is standard normal, cut at 2.5 standard deviations."""
    common, of_ear, of_cell = np.sqrt(_VARIANCE_SHARES)
    ears, frequencies = len(EARS), len(FREQUENCIES_HZ)
    deviate = (
        common * rng.standard_normal((people, 1, 1))
        + of_ear * rng.standard_normal((people, ears, 1))
        + of_cell * rng.standard_normal((people, ears, frequencies))
    )
    return np.clip(deviate, -2.5, 2.5)


def _draw_other_loss(rng: np.random.Generator, people: int) -> NDArray[np.float64]:
    """Three people in a hundred have one ear that is 30 to 85 dB worse for reasons of its own."""
    affected = rng.random(people) < 0.03
    ear = rng.integers(0, len(EARS), people)
    loss = np.zeros((people, len(EARS)))
    loss[np.arange(people), ear] = np.where(affected, 30.0 + 55.0 * rng.random(people), 0.0)
    return loss
