"""The example's hearing follows the standards it claims to follow."""

import dataclasses

import numpy as np
import pytest

from audiokit.core.dates import NO_DATE
from audiokit.core.vocabulary import Purpose, Response, Sex
from audiokit.example.hearing import true_thresholds
from audiokit.example.measuring import NO_RECHECK, measure
from audiokit.example.scenario import FREQUENCIES_HZ, SITES
from audiokit.example.workforce import draw_workforce
from audiokit.standards import iso1999, iso7029

DAY = np.int32(20_000)
FREQUENCIES = np.array(FREQUENCIES_HZ)


def _workforce(people, *, age, noise_years, level=95.0, deviate=None):
    """People alike in everything but their fractile."""
    drawn = draw_workforce(np.random.default_rng(5), people)
    full = np.full(people, 0, dtype=np.int32)
    noise = NO_DATE if noise_years == 0 else np.int32(DAY - round(noise_years * 365.25))
    return dataclasses.replace(
        drawn,
        sex=np.full(people, Sex.MALE, dtype=np.int8),
        birth_day=full + np.int32(DAY - round(age * 365.25)),
        noise_since_day=full + noise,
        level_db=np.full(people, level),
        other_db=np.zeros((people, 2)),
        deviate=drawn.deviate if deviate is None else np.full(drawn.deviate.shape, deviate),
    )


def _true(workforce):
    person = np.arange(len(workforce))
    return true_thresholds(workforce, person, np.full(len(workforce), DAY))


@pytest.mark.parametrize("deviate", [-1.0, 0.0, 1.2])
def test_without_noise_it_is_the_age_distribution(deviate):
    """Second source: ISO 7029:2017 asked directly, at the same fractile."""
    got = _true(_workforce(1, age=50, noise_years=0, deviate=deviate))[0, 0]
    age = round(50 * 365.25) / 365.25
    assert np.allclose(got, iso7029.threshold_at_deviate(deviate, Sex.MALE, age, FREQUENCIES, edition="2017"))


def test_with_noise_it_is_the_combination_of_both_standards():
    got = _true(_workforce(1, age=45, noise_years=20, deviate=0.0))[0, 1]
    age, years = round(45 * 365.25) / 365.25, round(20 * 365.25) / 365.25
    by_age = iso7029.median(Sex.MALE, age, FREQUENCIES[:-1], edition="2017")
    by_noise = iso1999.median_shift(95, years, FREQUENCIES[:-1])
    assert np.allclose(got[:-1], by_age + by_noise - by_age * by_noise / 120)


def test_medians_of_a_large_group_are_those_of_the_standard():
    """Monte Carlo: 4000 people, fractiles drawn; the median lies within 1 dB of ISO 7029:2017."""
    level = _true(_workforce(4000, age=60, noise_years=0))
    expected = iso7029.median(Sex.MALE, round(60 * 365.25) / 365.25, FREQUENCIES, edition="2017")
    assert np.abs(np.median(level, axis=(0, 1)) - expected).max() < 1.0
    worst_tenth = iso7029.threshold_at_fractile(10, Sex.MALE, 60, FREQUENCIES, edition="2017")
    assert np.abs(np.percentile(level, 90, axis=(0, 1)) - worst_tenth).max() < 2.0


def test_deviates_are_correlated_over_ears_and_frequencies():
    deviate = draw_workforce(np.random.default_rng(1), 20_000).deviate
    assert abs(deviate.mean()) < 0.02
    assert abs(deviate.std() - 1) < 0.03
    ears = np.corrcoef(deviate[:, 0, 4], deviate[:, 1, 4])[0, 1]
    neighbours = np.corrcoef(deviate[:, 0, 3], deviate[:, 0, 4])[0, 1]
    assert abs(ears - 0.60) < 0.03
    assert abs(neighbours - 0.75) < 0.03


def test_the_first_year_of_noise_grows_without_a_jump():
    levels = [_true(_workforce(1, age=30, noise_years=y, deviate=0.0))[0, 0, 4] for y in (0, 0.01, 0.5, 0.999, 1.001)]
    assert np.all(np.diff(levels) >= -1e-9)
    assert np.diff(levels).max() < 4.0


@pytest.mark.parametrize("age", [16, 75])
def test_ages_are_clamped_to_the_limits_of_the_standard(age):
    inside = 18 if age < 18 else 70
    got = _true(_workforce(1, age=age, noise_years=0, deviate=0.5))
    expected = iso7029.threshold_at_deviate(0.5, Sex.MALE, float(inside), FREQUENCIES, edition="2017")
    assert np.allclose(got[0, 0], expected)


def test_two_tests_scatter_as_stated():
    """5.5 dB at one frequency and 4 dB in the mean of 2000, 3000, 4000 Hz, as the scenario says of itself."""
    workforce = _workforce(8000, age=40, noise_years=0)
    person, day = np.arange(8000), np.full(8000, DAY)
    purpose = np.full(8000, Purpose.RETEST)
    one, two = (measure(np.random.default_rng(seed), workforce, person, day, purpose, 0) for seed in (1, 2))
    measured = ((one.response == Response.MEASURED) & (two.response == Response.MEASURED)).all(axis=(1, 2))
    difference = (one.threshold - two.threshold.astype(float))[measured]
    assert np.abs(difference[:, :, :5].std(axis=(0, 1)) - 5.5).max() < 0.4
    assert abs(difference[:, :, 2:5].mean(axis=2).std() - 4.0) < 0.3


def test_readings_are_what_an_audiometer_writes():
    rng = np.random.default_rng(3)
    workforce = draw_workforce(rng, 3000)
    person = np.arange(3000)
    tests = measure(rng, workforce, person, np.full(3000, DAY), np.full(3000, Purpose.ANNUAL), 100)
    at_8000, elsewhere = np.array([site.booth_limit_db for site in SITES])[workforce.site].T
    limit = np.repeat(elsewhere[:, None], len(FREQUENCIES_HZ), axis=1)
    limit[:, -1] = at_8000
    assert (tests.threshold % 5 == 0).all()
    assert tests.threshold.min() >= -10
    silent = tests.response == Response.NO_RESPONSE
    assert silent.any()
    assert (tests.threshold <= limit[:, None, :]).all()
    assert (tests.threshold[silent] == np.broadcast_to(limit[:, None, :], silent.shape)[silent]).all()
    assert set(np.unique(tests.response)) == set(Response)
    assert tests.serial.tolist() == list(range(100, 3100))
    made = tests.recheck != NO_RECHECK
    assert (np.abs(tests.recheck - tests.threshold[:, :, 1])[made] <= 15).all()
