"""ISO 1999:2013 against the printed cells of Annex D and the example of Annex C."""

from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from scipy import stats

from audiokit.core.errors import OutOfScopeError
from audiokit.core.vocabulary import Sex
from audiokit.standards import iso1999, iso7029

ANNEX_D = pd.read_csv(Path(__file__).parent / "published" / "iso1999_2013_annex_d.csv")
FREQUENCIES = np.array([500, 1000, 2000, 3000, 4000, 6000])


def test_there_are_72_printed_cells():
    assert len(ANNEX_D) == 72


@pytest.mark.parametrize("row", ANNEX_D.to_numpy().tolist(), ids=str)
def test_cells_of_annex_d(row):
    """ISO 1999:2013 Annex D, whole dB (read in a secondary text)."""
    level, years, frequency, per_cent_worse, printed = row
    assert round(float(iso1999.shift_at_fractile(per_cent_worse, level, years, frequency))) == printed


def test_example_of_annex_c():
    """ISO 1999:2013 Annex C (read in a secondary text): men of 50, 90 dB, 30 years, worst tenth.

    H = 14, 21, 36 and N = 0, 9, 19 at 1000, 2000, 4000 Hz; only 4000 Hz exceeds 40 dB: 19 − 36·19/120 = 13.3;
    mean N 7.4, mean H 23.7, together 31.1.
    """
    age_level, shift = np.array([14.0, 21.0, 36.0]), np.array([0.0, 9.0, 19.0])
    level = iso1999.combine(age_level, shift, compress="above_40_db")
    assert round(float((level - age_level)[2]), 1) == 13.3
    assert round(float((level - age_level).mean()), 1) == 7.4
    assert round(float(level.mean()), 1) == 31.1


def test_the_plain_formula_gives_half_a_decibel_less_in_that_example():
    """Derived: (14 + 21 + 36 + 0 + 9 + 19 − 21·9/120 − 36·19/120)/3 = 30.6."""
    level = iso1999.combine([14, 21, 36], [0, 9, 19], compress="everywhere")
    assert round(float(level.mean()), 1) == 30.6


def test_example_with_the_2017_age_data():
    """Man of 60, 95 dB, 30 years, median: printed example output in a secondary text."""
    age_level = iso7029.median(Sex.MALE, 60, FREQUENCIES, edition="2017")
    shift = iso1999.median_shift(95, 30, FREQUENCIES)
    assert np.round(shift, 1).tolist() == [0.5, 3.0, 11.8, 21.6, 24.8, 17.6]
    level = iso1999.combine(age_level, shift, compress="everywhere")
    assert np.round(level, 1).tolist() == [6.5, 10.7, 23.0, 35.2, 40.8, 39.8]


def test_under_ten_years():
    """Derived: 95 dB, 4000 Hz: 20.00 at 10 years, times lg 6/lg 11 = 14.94 at 5 years (ISO 1999:2013 Formula 3)."""
    assert round(float(iso1999.median_shift(95, 10, 4000)), 2) == 20.00
    assert round(float(iso1999.median_shift(95, 5, 4000)), 2) == 14.94
    years = np.linspace(1, 40, 400)
    assert (np.diff(iso1999.median_shift(95, years[:, None], FREQUENCIES), axis=0) > 0).all()


def test_a_level_below_l0_gives_no_shift():
    """Derived: L0 is 93 dB at 500 Hz and 89 dB at 1000 Hz, so 85 dB gives 0 at any fractile."""
    shares = np.array([5, 10, 50, 90, 95])[:, None]
    assert not iso1999.shift_at_fractile(shares, 85, 40, [500, 1000]).any()
    assert not iso1999.median_shift(60, 40, FREQUENCIES).any()


def test_fractiles_stand_on_the_spread_of_their_side():
    """Second source of the deviates: scipy.stats.norm."""
    place = (97, 20, FREQUENCIES)
    middle, deviate = iso1999.median_shift(*place), stats.norm.isf(0.2)
    worse = middle + deviate * iso1999.spread_upper(*place)
    better = middle - deviate * iso1999.spread_lower(*place)
    assert np.allclose(iso1999.shift_at_fractile(20, *place), worse)
    assert np.allclose(iso1999.shift_at_fractile(80, *place), better)


def test_shifts_are_never_negative():
    shares = np.array([5, 50, 95])[:, None, None]
    years = np.array([0, 1, 2, 9, 10, 40])[:, None]
    assert (iso1999.shift_at_fractile(shares, 100, years, FREQUENCIES) >= 0).all()


@pytest.mark.parametrize(
    ("level", "years", "frequency", "words"),
    [
        (100.1, 10, 4000, "a level of 100.1 dB is above 100 dB"),
        (90, 0.9, 4000, "0.9 years of exposure are outside 1 to 40"),
        (90, -1, 4000, "-1 years"),
        (90, 40.1, 4000, "40.1 years"),
        (90, 10, 8000, "no values at 8000 Hz"),
        (90, 10, 250, "no values at 250 Hz"),
    ],
)
def test_one_past_each_limit_is_refused(level, years, frequency, words):
    with pytest.raises(OutOfScopeError, match=words):
        iso1999.median_shift(level, years, frequency)


def test_tails_beyond_five_per_cent_are_refused():
    iso1999.shift_at_fractile([5, 95], 90, 10, 4000)
    for share in (4.9, 95.1):
        with pytest.raises(OutOfScopeError, match="tails beyond 5 %"):
            iso1999.shift_at_fractile(share, 90, 10, 4000)


def test_an_unnamed_reading_is_refused():
    with pytest.raises(OutOfScopeError, match="everywhere, above_40_db"):
        iso1999.combine(10, 10, compress="sometimes")


def test_shapes_nan_and_empty():
    assert np.ndim(iso1999.median_shift(90, 20, 4000)) == 0
    whole = iso1999.median_shift(np.array([85, 95])[:, None], [0, 5, 20], 4000)
    assert whole.tolist() == [[float(iso1999.median_shift(x, t, 4000)) for t in (0, 5, 20)] for x in (85, 95)]
    assert iso1999.median_shift([], [], 4000).shape == (0,)
    assert np.isnan(iso1999.median_shift([np.nan, 90], 20, 4000)).tolist() == [True, False]
    assert np.isnan(iso1999.median_shift(90, [np.nan, 20], 4000)).tolist() == [True, False]
