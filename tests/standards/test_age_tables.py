"""29 CFR 1910.95 Appendix F through the age-table functions."""

import numpy as np
import pytest

from audiokit.core.errors import OutOfScopeError
from audiokit.core.vocabulary import Sex
from audiokit.standards.age_tables import age_table
from audiokit.standards.registry import TableError, load_table

NAME = "us_29cfr1910_95_appendix_f"
ALL = (1000, 2000, 3000, 4000, 6000)
SUMS = {"female": [417, 314, 354, 358, 535], "male": [305, 276, 465, 649, 828]}
WEIGHTED = {"female": [17729, 13718, 15950, 16249, 23680], "male": [13076, 12427, 21322, 29903, 37443]}


def test_values_of_the_printed_example():
    """29 CFR 1910.95 Appendix F, worked example: man, 27 and 32 years (printed; the same in 49 CFR 227 Appendix F)."""
    table = age_table(NAME)
    at_32 = [int(table.values(Sex.MALE, 32, frequency)) for frequency in ALL]
    at_27 = [int(table.values(Sex.MALE, 27, frequency)) for frequency in ALL]
    assert at_32 == [6, 5, 7, 10, 14]
    assert at_27 == [5, 4, 6, 7, 11]
    assert np.subtract(at_32, at_27).tolist() == [1, 1, 1, 3, 3]
    assert 25 - (at_32[3] - at_27[3]) == 22, "the example's corrected threshold at 4000 Hz"


@pytest.mark.parametrize(
    ("sex", "from_age", "to_age", "difference"),
    [
        # Derived by hand from Tables F-1 and F-2 for 2000, 3000, 4000 Hz.
        (Sex.MALE, 30, 58, [8, 16, 22]),
        (Sex.FEMALE, 40, 50, [3, 3, 4]),
        (Sex.FEMALE, 40, 51, [3, 4, 4]),
        (Sex.MALE, 45, 48, [1, 1, 2]),
        (Sex.MALE, 40, 48, [2, 4, 6]),
        (Sex.MALE, 61, 70, [0, 0, 0]),
    ],
)
def test_differences_worked_out_by_hand(sex, from_age, to_age, difference):
    lookup = age_table(NAME).lookup((2000, 3000, 4000))
    ages = np.clip([from_age, to_age], 0, age_table(NAME).oldest)
    assert (lookup[sex, :, ages[1]] - lookup[sex, :, ages[0]]).tolist() == difference


def test_all_82_rows_by_column_sums():
    """Derived: sums, and sums weighted by age, over the 41 rows of each table, worked out apart from this code."""
    frame = load_table(NAME).frame
    assert len(frame) == 82
    columns = [f"db_{frequency}" for frequency in ALL]
    sums = frame.groupby("sex")[columns].sum()
    assert sums.loc["female"].tolist() == SUMS["female"]
    assert sums.loc["male"].tolist() == SUMS["male"]
    weighted = frame[columns].mul(frame["age_years"], axis=0).groupby(frame["sex"]).sum()
    assert weighted.loc["female"].tolist() == WEIGHTED["female"]
    assert weighted.loc["male"].tolist() == WEIGHTED["male"]


def test_values_never_fall_with_age():
    dense = age_table(NAME).dense
    assert (np.diff(dense, axis=2) >= 0).all()


def test_ages_clamp_to_the_first_and_last_row():
    """Appendix F: the row of 20 stands for 20 or younger, that of 60 for 60 or older."""
    table = age_table(NAME)
    assert (table.youngest, table.oldest) == (20, 60)
    assert table.values(Sex.MALE, [0, 15, 20], 4000).tolist() == [5, 5, 5]
    assert table.values(Sex.MALE, [60, 61, 99], 3000).tolist() == [23, 23, 23]
    assert table.values(Sex.MALE, -3, 4000) == 5


def test_unknown_sex_has_no_values_and_is_marked():
    table = age_table(NAME)
    assert table.values(Sex.UNKNOWN, [20, 45, 60], 4000).tolist() == [0, 0, 0]
    assert table.covers([Sex.UNKNOWN, Sex.FEMALE, Sex.MALE]).tolist() == [False, True, True]
    assert not table.lookup((2000,))[Sex.UNKNOWN].any()


def test_broadcasting_equals_looping():
    table = age_table(NAME)
    sexes, ages = np.array([[1], [2]]), np.arange(15, 70)
    whole = table.values(sexes, ages, 3000)
    assert whole.shape == (2, 55)
    assert whole.tolist() == [[int(table.values(int(sex), int(age), 3000)) for age in ages] for sex in (1, 2)]
    assert table.values([], [], 3000).shape == (0,)


def test_a_frequency_without_values_is_refused():
    with pytest.raises(OutOfScopeError, match=r"no values at 500, 8000 Hz(.|\n)*use some of: 1000, 2000"):
        age_table(NAME).lookup((500, 2000, 8000))


def test_another_kind_of_table_is_refused():
    with pytest.raises(TableError, match="iso1999_2013 is no age-correction table"):
        age_table("iso1999_2013")


def test_the_shared_array_cannot_be_changed():
    with pytest.raises(ValueError, match="read-only"):
        age_table(NAME).dense[0, 0, 0] = 1
