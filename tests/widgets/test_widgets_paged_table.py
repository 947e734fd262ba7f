"""The paged table: the kernel sorts and pages, and only one page is sent."""

import json
import time
from typing import Any

import numpy as np
import pandas as pd
import pytest

from audiokit.widgets.paged_table import Column, PagedTable

COLUMNS = (Column("name", "Name"), Column("size", "Size", "right"))


def _frame(rows: int) -> pd.DataFrame:
    return pd.DataFrame({"name": [f"n{at % 7}" for at in range(rows)], "size": np.arange(rows) * 31 % 101})


def _table(rows: int, **more: Any) -> PagedTable:
    made = PagedTable(COLUMNS, "Things", **more)
    made.set_rows(_frame(rows))
    return made


def _cells(table: PagedTable) -> list[list[str]]:
    return [row["cells"] for row in table.view["rows"]]


def test_pages_join_to_the_whole() -> None:
    table = _table(23)
    seen = []
    for page in range(table.view["pages"]):
        table.go_to(page)
        seen += _cells(table)
    assert seen == [[name, str(size)] for name, size in _frame(23).itertuples(index=False)]
    assert table.view["place"] == "21 to 23 of 23"


def test_pages_outside_become_the_nearest() -> None:
    table = _table(23)
    table.go_to(99)
    assert table.view["page"] == 2
    table.go_to(-4)
    assert table.view["page"] == 0


def test_sorting_goes_up_down_and_back() -> None:
    table = _table(23)
    original = _cells(table)
    table.sort_by("size")
    assert table.view["columns"][1]["sort"] == "ascending"
    assert table.frame["size"].is_monotonic_increasing
    table.sort_by("size")
    assert table.view["columns"][1]["sort"] == "descending"
    assert table.frame["size"].is_monotonic_decreasing
    table.sort_by("size")
    assert table.view["columns"][1]["sort"] == "none"
    assert _cells(table) == original


def test_numbers_sort_as_numbers_and_equals_keep_their_order() -> None:
    table = PagedTable(COLUMNS, "Things")
    table.set_rows(pd.DataFrame({"name": ["b", "a", "b", "a"], "size": [10, 9, 100, 10]}))
    table.sort_by("size")
    assert table.frame["size"].tolist() == [9, 10, 10, 100]
    table.sort_by("name")
    assert table.frame.index.tolist() == [1, 3, 0, 2]


@pytest.mark.parametrize("times", [1, 2])
def test_blanks_stay_last_in_both_directions(times: int) -> None:
    table = PagedTable(COLUMNS, "Things")
    table.set_rows(pd.DataFrame({"name": ["", "b", "a", ""], "size": [1, 2, 3, 4]}))
    for _ in range(times):
        table.sort_by("name")
    assert table.frame["name"].tolist()[2:] == ["", ""]


def test_a_pick_is_told_and_marked() -> None:
    told: list[Any] = []
    table = _table(23, on_pick=told.append)
    table.sort_by("size")
    wanted = table.view["rows"][3]["id"]
    table._handle_custom_msg({"do": "pick", "id": wanted, "stamp": table.view["stamp"]}, [])
    assert told == [wanted]
    assert [row["id"] for row in table.view["rows"] if row["picked"]] == [wanted]


def test_a_pick_on_rows_that_are_gone_is_ignored() -> None:
    """A click that was on its way when the rows changed must not open somebody else."""
    told: list[Any] = []
    table = _table(23, on_pick=told.append)
    stamp = table.view["stamp"]
    table.set_rows(_frame(23))
    table._handle_custom_msg({"do": "pick", "id": 3, "stamp": stamp}, [])
    assert told == []


@pytest.mark.parametrize(
    "message",
    [
        {},
        {"do": "sort", "key": "nothing"},
        {"do": "size", "size": 10**9},
        {"do": "page", "page": "x"},
        {"do": "pick", "id": 99, "stamp": 1},
        "text",
        None,
    ],
)
def test_nonsense_from_the_page_changes_nothing(message: Any) -> None:
    table = _table(23, on_pick=lambda label: pytest.fail(f"picked {label}"))
    before = json.dumps(table.view)
    table._handle_custom_msg(message, [])
    assert json.dumps(table.view) == before


def test_another_page_size_keeps_the_first_row_in_sight() -> None:
    table = _table(230)
    table.go_to(7)
    table._handle_custom_msg({"do": "size", "size": 50}, [])
    assert table.view["page"] == 1
    assert len(table.view["rows"]) == 50


def test_marking_shows_the_page_of_the_row() -> None:
    table = _table(95)
    table.mark(57)
    assert table.view["page"] == 5
    assert [row["id"] for row in table.view["rows"] if row["picked"]] == [57]


def test_no_rows_say_so() -> None:
    table = PagedTable(COLUMNS, "Things", empty="nothing here")
    assert table.view["rows"] == []
    assert (table.view["empty"], table.view["place"]) == ("nothing here", "nothing to show")


def test_a_hundred_thousand_rows_are_quick_and_send_one_page() -> None:
    table = _table(100_000)
    start = time.perf_counter()
    table.sort_by("name")
    table.go_to(5000)
    assert time.perf_counter() - start < 2
    assert len(json.dumps(table.view)) < 5000
