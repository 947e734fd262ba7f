"""Numbers as text: exact quotients, rounded half to even at the fourth decimal, without trailing noughts."""

from decimal import ROUND_HALF_EVEN, Decimal, localcontext

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from audiokit.reports.numbers import Numbers, quotient_text, tenths_text


def rounded(numerator: int, denominator: int, decimals: int) -> Decimal:
    with localcontext() as context:
        context.prec = 60
        return (Decimal(numerator) / Decimal(denominator)).quantize(Decimal(1).scaleb(-decimals), ROUND_HALF_EVEN)


@settings(deadline=None, max_examples=500)
@given(st.integers(-40000, 40000), st.sampled_from((1, 2, 3, 4, 6, 7, 8, 10, 16, 30, 40, 160)), st.integers(1, 4))
def test_quotients(numerator: int, denominator: int, decimals: int) -> None:
    text = quotient_text(numerator, denominator, decimals)
    assert Decimal(text) == rounded(numerator, denominator, decimals)
    assert text not in ("-0", "") and not text.endswith(".") and not ("." in text and text.endswith("0"))


def test_by_hand() -> None:
    assert [quotient_text(n, 30) for n in (300, 290, 250, -100, 0, 1, 100)] == [
        *("10", "9.6667", "8.3333", "-3.3333", "0", "0.0333", "3.3333")
    ]
    assert [tenths_text(n) for n in (75, 150, -5, 0, 1000)] == ["7.5", "15", "-0.5", "0", "100"]
    assert [quotient_text(n, 16 * 10000) for n in (8, 24, -8, -24)] == ["0", "0.0002", "0", "-0.0002"]


@settings(deadline=None, max_examples=200)
@given(st.lists(st.integers(-4000, 4000), min_size=1, max_size=20), st.integers(1, 9))
def test_numbers_as_decimals_are_the_same_as_text(numerators: list[int], count: int) -> None:
    """Events hold floats, shifts hold texts: they must not differ."""
    empty = np.zeros(len(numerators), dtype=np.int32)
    numbers = Numbers(
        empty, np.array(numerators, dtype=np.int32), empty, empty.astype(np.int8), empty.astype(np.int8), count
    )
    shown = numbers.db(numbers.value()).tolist()
    assert shown == [float(quotient_text(numerator, 10 * count)) for numerator in numerators]
    assert not any(str(value) == "-0.0" for value in shown)
