"""ISO 7029 against printed values and a second source of the normal distribution."""

from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from scipy import stats

from audiokit.core.errors import OutOfScopeError
from audiokit.core.vocabulary import Sex
from audiokit.standards import iso7029
from audiokit.standards.registry import TableError

FREQUENCIES = [125, 250, 500, 750, 1000, 1500, 2000, 3000, 4000, 6000, 8000]
MEDIANS_2000 = pd.read_csv(Path(__file__).parent / "published" / "iso7029_2000_medians.csv")
CODE = {"female": Sex.FEMALE, "male": Sex.MALE}


def _median_cases():
    for row in MEDIANS_2000.itertuples():
        contested = row.frequency_hz == 1000 and row.age_years == 70
        reason = "contested: the text prints 10 dB at 1000 Hz, 70 years; the formula gives 10.8"
        marks = [pytest.mark.xfail(strict=True, reason=reason)] if contested else []
        yield pytest.param(row.sex, row.age_years, row.frequency_hz, row.median_db, marks=marks)


@pytest.mark.parametrize(("sex", "age", "frequency", "printed"), list(_median_cases()))
def test_medians_of_edition_2000_as_printed(sex, age, frequency, printed):
    """28 medians printed as whole dB in a secondary text (published/SOURCES.md)."""
    assert round(float(iso7029.median(CODE[sex], age, frequency, edition="2000"))) == printed


@pytest.mark.parametrize(("frequency", "printed"), [(1000, 14), (2000, 21), (4000, 36)])
def test_worst_tenth_of_men_of_50_in_edition_2000(frequency, printed):
    """ISO 1999:2013 Annex C quoting its Table A.3, the 2000 data (read in a secondary text)."""
    assert round(float(iso7029.threshold_at_fractile(10, Sex.MALE, 50, frequency, edition="2000"))) == printed


def test_check_values_of_edition_2017():
    """Man of 60, printed in a secondary text: median at 4000 Hz 20.2085, s_u at 1000 Hz 10.1533."""
    assert round(float(iso7029.median(Sex.MALE, 60, 4000, edition="2017")), 4) == 20.2085
    assert round(float(iso7029.spread_upper(Sex.MALE, 60, 1000, edition="2017")), 4) == 10.1533


def test_medians_of_edition_2017_as_printed():
    """Man of 60, printed example output in a secondary text."""
    medians = iso7029.median(Sex.MALE, 60, [500, 1000, 2000, 3000, 4000, 6000], edition="2017")
    assert np.round(medians, 1).tolist() == [6.0, 7.8, 12.5, 16.6, 20.2, 25.9]


def test_normal_deviates_against_scipy():
    """Second source: scipy.stats.norm."""
    share = np.concatenate([np.linspace(0.001, 99.999, 1001), [1e-9, 50, 10, 5, 2.5]])
    assert np.allclose(iso7029.normal_deviate(share), stats.norm.isf(share / 100), rtol=1e-9, atol=1e-12)


@pytest.mark.parametrize("edition", iso7029.EDITIONS)
def test_fractiles_stand_on_the_spread_of_their_side(edition):
    place = (Sex.FEMALE, 55, 3000)
    middle = iso7029.median(*place, edition=edition)
    worse = iso7029.threshold_at_fractile(20, *place, edition=edition)
    better = iso7029.threshold_at_fractile(80, *place, edition=edition)
    assert worse == pytest.approx(middle + stats.norm.isf(0.2) * iso7029.spread_upper(*place, edition=edition))
    assert better == pytest.approx(middle - stats.norm.isf(0.2) * iso7029.spread_lower(*place, edition=edition))
    assert iso7029.threshold_at_fractile(50, *place, edition=edition) == pytest.approx(middle)


@pytest.mark.parametrize(("edition", "oldest"), [("2000", 70), ("2017", 70)])
def test_medians_start_at_zero_and_never_fall_with_age(edition, oldest):
    ages = np.arange(18, oldest + 1)
    grid = iso7029.median(np.array([1, 2])[:, None, None], ages[:, None], np.array(FREQUENCIES), edition=edition)
    assert (grid[:, 0] == 0).all()
    assert (np.diff(grid, axis=1) >= 0).all()


@pytest.mark.parametrize("edition", iso7029.EDITIONS)
def test_spreads_stay_positive_inside_the_limits(edition):
    ages = np.arange(18, 70.5, 0.5)[:, None]
    for sex in (Sex.FEMALE, Sex.MALE):
        assert (iso7029.spread_upper(sex, ages, FREQUENCIES, edition=edition) > 0).all()
        assert (iso7029.spread_lower(sex, ages, FREQUENCIES, edition=edition) > 0).all()


@pytest.mark.parametrize(
    ("age", "frequency", "edition", "informative"),
    [
        (17.99, 1000, "2017", False),
        (80.01, 1000, "2017", False),
        (70.01, 3000, "2017", False),
        (80.01, 3000, "2017", True),
        (70.01, 1000, "2000", False),
        (70.01, 1000, "2000", True),
    ],
)
def test_one_past_each_age_limit_is_refused(age, frequency, edition, informative):
    with pytest.raises(OutOfScopeError, match=f"age {age} years at {frequency} Hz is outside"):
        iso7029.median(Sex.MALE, age, frequency, edition=edition, informative=informative)


def test_the_limits_themselves_are_allowed():
    assert iso7029.median(Sex.MALE, [18, 80], 2000, edition="2017").shape == (2,)
    assert iso7029.median(Sex.MALE, [18, 70], 3000, edition="2017").shape == (2,)
    assert iso7029.median(Sex.MALE, 80, 3000, edition="2017", informative=True) > 0
    assert iso7029.median(Sex.FEMALE, [18, 70], 8000, edition="2000").shape == (2,)


def test_what_the_tables_do_not_have_is_refused():
    with pytest.raises(OutOfScopeError, match="no values at 9000 Hz"):
        iso7029.median(Sex.MALE, 40, [8000, 9000], edition="2017")
    with pytest.raises(OutOfScopeError, match="no values at 1001 Hz"):
        iso7029.median(Sex.MALE, 40, 1001, edition="2000")
    with pytest.raises(OutOfScopeError, match="women and men only"):
        iso7029.median([Sex.MALE, Sex.UNKNOWN], 40, 1000, edition="2017")
    with pytest.raises(TableError, match="no edition '2023'"):
        iso7029.median(Sex.MALE, 40, 1000, edition="2023")
    for share in (0, 100, -1, 101):
        with pytest.raises(OutOfScopeError, match="between 0 and 100"):
            iso7029.threshold_at_fractile(share, Sex.MALE, 40, 1000, edition="2017")


def test_shapes_nan_and_empty():
    assert np.ndim(iso7029.median(Sex.MALE, 40, 1000, edition="2017")) == 0
    whole = iso7029.threshold_at_deviate(
        np.array([-1.0, 0.5])[:, None, None], np.array([1, 2])[:, None], [25.5, 40, 60], 4000, edition="2017"
    )
    looped = [
        [
            [float(iso7029.threshold_at_deviate(k, sex, age, 4000, edition="2017")) for age in (25.5, 40, 60)]
            for sex in (1, 2)
        ]
        for k in (-1.0, 0.5)
    ]
    assert whole.tolist() == looped
    assert iso7029.median([], [], 1000, edition="2017").shape == (0,)
    assert np.isnan(iso7029.median(Sex.MALE, [np.nan, 40], 1000, edition="2017")).tolist() == [True, False]
    assert np.isnan(iso7029.normal_deviate(np.nan))


def test_the_editions_differ_as_known():
    """Derived: man of 50, worst tenth, 4000 Hz: 36.4 dB in the 2000 edition, 28.2 dB in the 2017 edition."""
    place = (10, Sex.MALE, 50, 4000)
    assert round(float(iso7029.threshold_at_fractile(*place, edition="2000")), 1) == 36.4
    assert round(float(iso7029.threshold_at_fractile(*place, edition="2017")), 1) == 28.2
