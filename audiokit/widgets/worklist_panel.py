"""The worklist with its filters."""

from typing import Any

import ipywidgets as widgets
import pandas as pd

from audiokit.widgets.look import count, words
from audiokit.widgets.paged_table import Column, PagedTable
from audiokit.widgets.review_lookup import Pick, ReviewLookup

_COLUMNS = (
    Column("due_on", "Due"),
    Column("overdue", "Overdue", emphasis=("▲ yes",)),
    Column("action", "Action"),
    Column("person_id", "Person"),
    Column("site", "Site"),
    Column("ear", "Ear"),
    Column("test_id", "Test"),
    Column("why", "Why"),
)
_OVERDUE = {"yes": "▲ yes", "no": "no", "unknown": "? unknown"}
_NO_SITE = "(no site)"
_ALL = "\x00all"
"""A value that no cell of a file can hold."""


class WorklistPanel(widgets.VBox):
    """Who needs what by when. on_pick : told of the line that a click or Enter picks"""

    def __init__(self, on_pick: Pick) -> None:
        self._on_pick = on_pick
        own = {"style": {"description_width": "initial"}}
        self.site = widgets.Dropdown(options=[("all", _ALL)], description="Site", **own)
        self.action = widgets.Dropdown(options=[("all", _ALL)], description="Action", **own)
        self.overdue = widgets.Dropdown(options=[("all", _ALL)], description="Overdue", **own)
        self.search = widgets.Text(description="Search", placeholder="person, test, reason …", **own)
        self.lines = PagedTable(_COLUMNS, "Worklist", on_pick=self._picked, empty="no line of the worklist fits")
        self.lines.add_class("ak-worklist")
        self._worklist = pd.DataFrame()
        self._shown = pd.DataFrame({column.key: [] for column in _COLUMNS})
        self._searched = pd.Series(dtype=object)
        self._setting = False
        for control in (self.site, self.action, self.overdue, self.search):
            control.observe(lambda _: self._filter(self.lines.picked), "value")
        filters = widgets.Box([self.site, self.action, self.overdue, self.search]).add_class("ak-controls")
        super().__init__([filters, self.lines])

    def show(self, lookup: ReviewLookup) -> None:
        """Show the worklist of a review, without filters."""
        self._worklist = lookup.review.worklist.reset_index(drop=True)
        site = lookup.people_column(self._worklist["person_id"], "site")
        self._shown = self._worklist.assign(
            action=self._worklist["action"].map(words),
            overdue=self._worklist["overdue"].map(_OVERDUE),
            site=site.fillna("").astype(str),
        )
        texts = [self._shown[column.key].astype(str) for column in _COLUMNS]
        self._searched = texts[0].str.cat(pd.concat(texts[1:], axis=1), sep=" ").str.casefold()
        self._setting = True
        self.site.options = _choices(self._shown["site"], _NO_SITE)
        self.site.layout.display = "" if lookup.column("site") is not None else "none"
        self.action.options = _choices(self._shown["action"], "")
        self.overdue.options = _choices(self._shown["overdue"], "")
        for control in (self.site, self.action, self.overdue):
            control.value = _ALL  # Options that are equal to the last ones would keep the last choice.
        self.search.value = ""
        self._setting = False
        self._filter(picked=None)

    def _filter(self, picked: Any) -> None:
        if self._setting:
            return
        keep = pd.Series(True, index=self._shown.index)
        for control, column in ((self.site, "site"), (self.action, "action"), (self.overdue, "overdue")):
            if control.value != _ALL:
                keep &= self._shown[column] == control.value
        for word in self.search.value.casefold().split():
            keep &= self._searched.str.contains(word, regex=False)
        shown = self._shown[keep]
        overdue = int((shown["overdue"] == _OVERDUE["yes"]).sum())
        self.lines.set_rows(
            shown,
            f"Worklist: {count(len(shown))} of {count(len(self._shown))} lines, {count(overdue)} overdue. "
            "Click a line, or press Enter on it, to see the person.",
            picked=picked,
        )

    def _picked(self, label: Any) -> None:
        line = self._worklist.loc[label]
        self._on_pick(str(line["person_id"]), str(line["test_id"]), str(line["criterion"]).partition(";")[0])


def _choices(values: pd.Series, blank: str) -> list[tuple[str, str]]:
    """A filter's choices with the number of lines each leaves."""
    sizes = values.value_counts().sort_index()
    named = [(f"{value or blank} ({count(int(size))})", str(value)) for value, size in sizes.items()]
    return [(f"all ({count(len(values))})", _ALL), *named]
