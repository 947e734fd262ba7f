"""Threshold cells, word cells, numbers: the contract's syntax, and one step past each limit."""

import math

import pytest

from audiokit.core.vocabulary import Purpose, Response, Sex
from audiokit.io.cells import CellRules, parse_cells
from audiokit.io.words import (
    EAR_WORDS,
    PURPOSE_WORDS,
    SEX_WORDS,
    UNKNOWN_WORD,
    VALID_WORDS,
    parse_frequencies,
    parse_numbers,
    parse_words,
)

MEASURED, NR, DNT, CNT, BLANK = list(Response)


CONTRACT = CellRules()


def cell(text: str, rules: CellRules = CONTRACT, limit: int = 1000) -> tuple[int, int] | str:
    parsed = parse_cells([text], rules)
    if parsed.fault[0]:
        return str(parsed.fault[0])
    return int(parsed.levels(limit)[0]), int(parsed.response[0])


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("15", (150, MEASURED)), ("-5", (-50, MEASURED)), ("7.5", (75, MEASURED)), ("15.0", (150, MEASURED)),
        ("15.00", (150, MEASURED)), ("-0.5", (-5, MEASURED)), ("-0", (0, MEASURED)), ("\u22125", (-50, MEASURED)),
        ("007", (70, MEASURED)), ("-20", (-200, MEASURED)), ("120", (1200, MEASURED)), ("120.0", (1200, MEASURED)),
        ("-20.1", "out_of_range"), ("120.1", "out_of_range"), ("-21", "out_of_range"), ("666", "out_of_range"),
        ("9" * 400, "out_of_range"), ("15.05", "finer_than_tenth"), ("15.001", "finer_than_tenth"),
        ("NR@90", (900, NR)), (">90", (900, NR)), ("90+", (900, NR)), ("nr @ 90", (900, NR)), ("> 90", (900, NR)),
        ("90 +", (900, NR)), ("NR@92.5", (925, NR)), ("NR@-5", (-50, NR)), ("NR@120", (1200, NR)),
        ("NR@121", "out_of_range"), (">120.1", "out_of_range"), ("90.05+", "finer_than_tenth"), ("NR", (1000, NR)),
        ("nr", (1000, NR)), ("DNT", (0, DNT)), ("dnt", (0, DNT)), ("CNT", (0, CNT)), ("Cnt", (0, CNT)),
        ("", (0, BLANK)), ("+5", "unreadable_threshold"), ("1 5", "unreadable_threshold"),
        ("7,5", "unreadable_threshold"),
        ("15.", "unreadable_threshold"), (".5", "unreadable_threshold"), ("1e1", "unreadable_threshold"),
        ("NR 90", "unreadable_threshold"), (">90+", "unreadable_threshold"), ("<10", "unreadable_threshold"),
        ("NaN", "unreadable_threshold"), ("\u0661\u0665", "unreadable_threshold"), ("15 dB", "unreadable_threshold"),
        ("-", "unreadable_threshold"), ("--5", "unreadable_threshold"),
    ],
)  # fmt: skip
def test_contract_syntax(text, expected):
    assert cell(text) == expected


def test_decimal_comma_is_a_setting():
    assert cell("7,5", CellRules(decimal_comma=True)) == (75, MEASURED)
    assert cell("NR@92,5", CellRules(decimal_comma=True)) == (925, NR)
    assert cell("7.5", CellRules(decimal_comma=True)) == (75, MEASURED)


def test_own_codes_win_and_are_compared_exactly():
    rules = CellRules({"15": CNT, "x": DNT, "999": NR, "-": BLANK, "": DNT})
    assert cell("15", rules) == (0, CNT)
    assert cell("x", rules) == (0, DNT)
    assert cell("X", rules) == "unreadable_threshold"
    assert cell("999", rules, 900) == (900, NR)
    assert cell("999.0", rules) == "out_of_range"
    assert cell("-", rules) == (0, BLANK)
    assert cell("", rules) == (0, DNT)


def test_own_codes_are_compared_by_number_where_numbers_come_as_numbers():
    rules = CellRules({"999.0": NR, "-10": CNT}, by_number=True)
    assert cell("999", rules) == (1000, NR)
    assert cell("-10", rules) == (0, CNT)


def test_limits_of_a_bare_no_response():
    rules = CellRules(limits={500: 850})
    assert [rules.limit(hz) for hz in (250, 500, 1000, 8000)] == [900, 850, 1000, 900]


@pytest.mark.parametrize(
    ("column", "words", "pairs"),
    [
        ("sex", SEX_WORDS, [("F", Sex.FEMALE), ("Woman", Sex.FEMALE), ("female", Sex.FEMALE), ("m", Sex.MALE),
                            ("MAN", Sex.MALE), ("", Sex.UNKNOWN), ("U", Sex.UNKNOWN), ("Not stated", Sex.UNKNOWN),
                            ("x", UNKNOWN_WORD), ("1", UNKNOWN_WORD)]),
        ("purpose", PURPOSE_WORDS, [("Baseline", Purpose.BASELINE), ("ANNUAL", Purpose.ANNUAL), ("", Purpose.BLANK),
                                    ("retest", Purpose.RETEST), ("exit", Purpose.EXIT), ("other", Purpose.OTHER),
                                    ("blank", UNKNOWN_WORD), ("yearly", UNKNOWN_WORD)]),
        ("valid", VALID_WORDS, [("", 1), ("Yes", 1), ("y", 1), ("TRUE", 1), ("1", 1), ("no", 0), ("N", 0),
                                ("false", 0), ("0", 0), ("2", UNKNOWN_WORD)]),
        ("ear", EAR_WORDS, [("Right", 0), ("R", 0), ("left", 1), ("l", 1), ("", UNKNOWN_WORD), ("both", UNKNOWN_WORD)]),
    ],
)  # fmt: skip
def test_words(column, words, pairs):
    texts, codes = zip(*pairs, strict=True)
    assert parse_words(list(texts), words, {}, column).tolist() == list(codes)


def test_own_words_win_over_ours():
    own = {"periodic": "annual", "annual": "other", "none": "blank"}
    texts = ["Periodic", "annual", "exit", "none"]
    expected = [Purpose.ANNUAL, Purpose.OTHER, Purpose.EXIT, Purpose.BLANK]
    assert parse_words(texts, PURPOSE_WORDS, own, "purpose").tolist() == expected


def test_numbers_and_frequencies():
    found = parse_numbers(["14", "0.5", "-1", "x", "", "1,5"], False)
    assert found[:2].tolist() == [14, 0.5] and all(math.isnan(n) for n in found[2:])
    assert parse_numbers(["1,5"], True).tolist() == [1.5]
    assert parse_frequencies(["1000", "1000.0", "900", "1k", "", "16000"], False).tolist() == [
        1000,
        1000,
        0,
        0,
        0,
        16000,
    ]
