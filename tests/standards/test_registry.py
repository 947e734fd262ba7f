"""The register of published tables and the grammar of source sheets."""

import pytest

from audiokit.standards.registry import STANDINGS, TableError, list_tables, load_table, parse_sheet

GOOD = """
issuer = "a"
title = "b"
edition = "c"
locator = "d"
unit = "dB"
limits = {}
[[known]]
part = "all"
standing = "read"
"""


def test_every_table_loads_with_its_sheet():
    assert {"us_29cfr1910_95_appendix_f", "iso7029_2000", "iso7029_2017", "iso1999_2013"} <= set(list_tables())
    for name in list_tables():
        table = load_table(name)
        assert len(table.frame) > 0
        assert table.frame.notna().all(axis=None), f"{name} has an empty cell"
        assert table.sheet.name == name
        assert table.sheet.standing in STANDINGS


def test_the_standing_of_a_table_is_that_of_its_weakest_part():
    assert load_table("us_29cfr1910_95_appendix_f").sheet.standing == "read"
    assert load_table("iso7029_2017").sheet.standing == "read in a secondary text"
    assert load_table("iso7029_2000").sheet.standing == "from memory, unverified"


def test_standings_of_single_rows_use_the_same_words():
    for name in list_tables():
        frame = load_table(name).frame
        for column in [column for column in frame.columns if column.endswith("standing")]:
            assert set(frame[column]) <= set(STANDINGS)


def test_an_unknown_name_lists_the_known_ones():
    with pytest.raises(TableError, match=r"no published table 'iso7029'(.|\n)*iso7029_2000, iso7029_2017"):
        load_table("iso7029")


def test_a_good_sheet_is_read():
    sheet = parse_sheet("x", GOOD)
    assert (sheet.issuer, sheet.known[0].part, sheet.errata) == ("a", "all", ())


@pytest.mark.parametrize(
    ("text", "words"),
    [
        (GOOD.replace("issuer", "isuer"), "unknown keys \\['isuer'\\], missing keys \\['issuer'\\]"),
        (GOOD.replace('"read"', '"certain"'), "standing 'certain'"),
        (GOOD.replace("standing", "stand"), "known.* has the keys"),
        (GOOD[: GOOD.index("[[known]]")] + "known = []", "no \\[\\[known\\]\\] entry"),
        ("= 3", "source sheet of x: "),
    ],
)
def test_a_bad_sheet_is_refused_with_the_place(text, words):
    with pytest.raises(TableError, match=words):
        parse_sheet("x", text)
