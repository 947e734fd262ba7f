"""True hearing thresholds: ISO 7029 (2017) by age plus ISO 1999 (2013) by noise, each person at their own fractile."""

import numpy as np
from numpy.typing import NDArray

from audiokit.core.dates import NO_DATE
from audiokit.example.scenario import FREQUENCIES_HZ, SHARE_8000_OF_6000
from audiokit.example.workforce import DAYS_PER_YEAR, Workforce
from audiokit.standards import iso1999, iso7029

_FREQUENCIES = np.array(FREQUENCIES_HZ)
_NOISE_DEVIATE_LIMIT = float(iso7029.normal_deviate(5)) - 1e-9
_HIGHEST_LEVEL_DB = 100.0
_LONGEST_YEARS = 40.0


def true_thresholds(workforce: Workforce, person: NDArray[np.int64], day: NDArray[np.int32]) -> NDArray[np.float64]:
    """Threshold levels of these people on these days, before any scatter of measurement. [test, ear, frequency] [dB HL]

    The median of 18-year-olds is taken as 0 dB HL. Ages are clamped to 18…70 years, exposures to 40 years and 100 dB,
    the fractile of the noise part to 5…95 per cent: the limits of the standards. Under one year of noise the shift
    grows in a straight line up to the standard's value for one year (ours: the standard starts at one year).
    """
    age = np.clip((day - workforce.birth_day[person]) / DAYS_PER_YEAR, 18.0, 70.0)
    deviate = workforce.deviate[person]
    by_age = iso7029.threshold_at_deviate(
        deviate, workforce.sex[person][:, None, None], age[:, None, None], _FREQUENCIES, edition="2017"
    )
    by_noise = _noise_shift(workforce, person, day, deviate)
    return iso1999.combine(by_age, by_noise, compress="everywhere") + workforce.other_db[person][:, :, None]


def _noise_shift(
    workforce: Workforce, person: NDArray[np.int64], day: NDArray[np.int32], deviate: NDArray[np.float64]
) -> NDArray[np.float64]:
    since = workforce.noise_since_day[person]
    years = np.where(since == NO_DATE, 0.0, (day - since.astype(np.int64)) / DAYS_PER_YEAR)
    years = np.clip(years, 0.0, _LONGEST_YEARS)[:, None, None]
    level = np.minimum(workforce.level_db[person], _HIGHEST_LEVEL_DB)[:, None, None]
    limited = np.clip(deviate[:, :, :-1], -_NOISE_DEVIATE_LIMIT, _NOISE_DEVIATE_LIMIT)
    shift = iso1999.shift_at_deviate(
        limited, level, np.where(years > 0, np.maximum(years, 1.0), 0.0), _FREQUENCIES[:-1]
    )
    shift = shift * np.minimum(years, 1.0)
    return np.concatenate([shift, SHARE_8000_OF_6000 * shift[:, :, -1:]], axis=2)
