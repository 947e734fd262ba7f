"""A table of which only one page is sent: the kernel filters, sorts and pages, so its length does not matter."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
import traitlets

from audiokit.widgets.look import STATIC, LookWidget, count

PAGE_SIZES = (10, 25, 50)


@dataclass(frozen=True)
class Column:
    """One column: its key in the frame, its heading, its side ("left" or "right"), and cells shown in bold."""

    key: str
    label: str
    align: str = "left"
    emphasis: tuple[str, ...] = ()


class PagedTable(LookWidget):
    """A real HTML table with caption, sortable headings and rows that Tab and Enter reach.

    view : what is drawn, replaced as a whole with each change
    """

    _esm = STATIC / "paged_table.js"
    view = traitlets.Dict().tag(sync=True)

    def __init__(
        self,
        columns: Sequence[Column],
        caption: str,
        *,
        on_pick: Callable[[Any], None] | None = None,
        empty: str = "no rows",
        page_size: int = PAGE_SIZES[0],
    ) -> None:
        self._columns = tuple(columns)
        self._caption, self._empty, self._on_pick = caption, empty, on_pick
        self._size, self._page, self._stamp = page_size, 0, 0
        self._sort: tuple[str, bool] | None = None
        self._frame = pd.DataFrame({column.key: [] for column in columns})
        self._order = np.arange(0)
        self._picked: Any = None
        super().__init__(view=self._drawn())
        self.on_msg(self._asked)

    @property
    def frame(self) -> pd.DataFrame:
        """The rows shown on all pages, in the order shown."""
        return self._frame.iloc[self._order]

    @property
    def picked(self) -> Any:
        """Index label of the row picked last, None where none was."""
        return self._picked

    def set_rows(self, frame: pd.DataFrame, caption: str | None = None, *, picked: Any = None) -> None:
        """Show other rows from the first page on; the order stays as it was asked for. Index labels must be unique."""
        self._frame, self._page, self._picked = frame, 0, picked
        self._stamp += 1
        self._caption = self._caption if caption is None else caption
        self._arrange()
        self._draw()

    def sort_by(self, key: str) -> None:
        """Sort by a column; ascending first, then descending, then as the rows came."""
        then: dict[Any, tuple[str, bool] | None] = {(key, False): (key, True), (key, True): None}
        self._sort = then.get(self._sort, (key, False))
        self._page = 0
        self._arrange()
        self._draw()

    def go_to(self, page: int) -> None:
        """Show a page, counted from nought; the nearest one where there is none."""
        self._page = page
        self._draw()

    def set_size(self, size: int) -> None:
        """Show that many rows a page, and the page that holds the first row shown now."""
        self._page = self._page * self._size // size
        self._size = size
        self._draw()

    def mark(self, label: Any) -> None:
        """Mark a row as picked without telling anybody, and show its page."""
        self._picked = label
        at = np.flatnonzero(self._frame.index[self._order] == label)
        if len(at):
            self._page = int(at[0]) // self._size
        self._draw()

    def pick(self, label: Any) -> None:
        """Pick a row by its index label, as a click or Enter does."""
        self._picked = label
        self._draw()
        if self._on_pick is not None:
            self._on_pick(label)

    def focus(self) -> None:
        """Move the keyboard's focus to the picked row, else to the first one."""
        self.send({"do": "focus"})

    def _asked(self, _widget: Any, asked: Any, _buffers: Any) -> None:
        """What the script asks for. Rows of an earlier view are ignored: they may be other people's."""
        match asked:
            case {"do": "sort", "key": key} if key in {column.key for column in self._columns}:
                self.sort_by(key)
            case {"do": "page", "page": int(page)}:
                self.go_to(page)
            case {"do": "size", "size": int(size)} if size in PAGE_SIZES:
                self.set_size(size)
            case {"do": "pick", "id": label, "stamp": self._stamp} if label in self._frame.index:
                self.pick(label)

    def _arrange(self) -> None:
        self._order = np.arange(len(self._frame))
        if self._sort is None:
            return
        key, descending = self._sort
        values = self._frame[key]
        blank = (values.isna() | (values.astype(str) == "")).to_numpy()
        filled = self._order[~blank]
        ranked = pd.Series(values.to_numpy()[filled]).sort_values(ascending=not descending, kind="stable").index
        self._order = np.concatenate((filled[ranked.to_numpy()], self._order[blank]))

    def _draw(self) -> None:
        self._page = max(0, min(self._page, self._pages() - 1))
        self.view = self._drawn()

    def _pages(self) -> int:
        return max(1, -(-len(self._frame) // self._size))

    def _drawn(self) -> dict[str, Any]:
        start = self._page * self._size
        shown = self._frame.iloc[self._order[start : start + self._size]]
        keys = [column.key for column in self._columns]
        rows = [
            {"id": label, "cells": [str(cell) for cell in cells], "picked": label == self._picked}
            for label, cells in zip(shown.index.tolist(), shown[keys].itertuples(index=False), strict=True)
        ]
        return {
            "caption": self._caption,
            "columns": [self._heading(column) for column in self._columns],
            "rows": rows,
            "empty": self._empty,
            "pickable": self._on_pick is not None,
            "page": self._page,
            "pages": self._pages(),
            "place": self._place(start, len(rows)),
            "paged": len(self._frame) > PAGE_SIZES[0],
            "size": self._size,
            "sizes": list(PAGE_SIZES),
            "stamp": self._stamp,
        }

    def _heading(self, column: Column) -> dict[str, Any]:
        sort = "none"
        if self._sort is not None and self._sort[0] == column.key:
            sort = "descending" if self._sort[1] else "ascending"
        return {
            "key": column.key,
            "label": column.label,
            "align": column.align,
            "emphasis": list(column.emphasis),
            "sort": sort,
        }

    def _place(self, start: int, shown: int) -> str:
        total = len(self._frame)
        if not total:
            return "nothing to show"
        return f"{count(start + 1)} to {count(start + shown)} of {count(total)}"
