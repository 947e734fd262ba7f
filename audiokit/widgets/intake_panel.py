"""What was read, and every row that could not be used, with the mend."""

import ipywidgets as widgets
import pandas as pd

from audiokit.core.problems import PROBLEMS
from audiokit.surveillance.review import Review
from audiokit.widgets.look import count, table, text, words
from audiokit.widgets.paged_table import Column, PagedTable

_ALL = "all"
_COLUMNS = (
    Column("file", "File"),
    Column("row", "Row", "right"),
    Column("column", "Column"),
    Column("value", "Value"),
    Column("code", "Problem"),
    Column("problem", "What is wrong"),
    Column("mend", "What to do"),
)


class IntakePanel(widgets.VBox):
    """Files, problems by kind, and the rows in quarantine."""

    def __init__(self) -> None:
        self.overview = widgets.HTML()
        self.problem = widgets.Dropdown(options=[_ALL], description="Problem", style={"description_width": "initial"})
        self.file = widgets.Dropdown(options=[_ALL], description="File", style={"description_width": "initial"})
        self.rows = PagedTable(_COLUMNS, "Rows in quarantine", empty="no row is in quarantine")
        self.rows.add_class("ak-quarantine")
        self._quarantine = pd.DataFrame({column.key: [] for column in _COLUMNS})
        self.problem.observe(lambda _: self._filter(), "value")
        self.file.observe(lambda _: self._filter(), "value")
        super().__init__([self.overview, widgets.Box([self.problem, self.file]).add_class("ak-controls"), self.rows])

    def show(self, review: Review) -> None:
        """Show the intake of a review's cohort."""
        self._quarantine = review.cohort.quarantine.assign(code=review.cohort.quarantine["code"].map(words))
        self.overview.value = f'<div class="ak-columns">{_files(review)}{_problems(review)}</div>'
        self.problem.options = [_ALL, *sorted(self._quarantine["code"].unique())]
        self.file.options = [_ALL, *sorted(self._quarantine["file"].unique())]
        self.problem.value = self.file.value = _ALL
        self._filter()

    def _filter(self) -> None:
        shown = self._quarantine
        for choice, column in ((self.problem.value, "code"), (self.file.value, "file")):
            if choice not in (None, _ALL):
                shown = shown[shown[column] == choice]
        self.rows.set_rows(shown, f"Rows in quarantine: {count(len(shown))} problems")


def _files(review: Review) -> str:
    columns = [
        ("File", "left"),
        ("Table", "left"),
        ("Rows read", "right"),
        ("Accepted", "right"),
        ("Quarantined", "right"),
    ]
    rows = [
        (text(file.file), text(file.role), count(file.rows_read), count(file.accepted), count(file.quarantined))
        for file in review.cohort.intake
    ]
    after = review.tests_after_as_of()
    left_out = int((review.left_out != "").sum())
    told = (
        f'<p class="ak-note">Of the accepted tests {count(left_out)} take no part: {count(after)} are later than '
        f"{review.cohort.settings.as_of}, {count(left_out - after)} are not valid by the file or by a decision.</p>"
    )
    return f"<div>{table('Files: read = accepted + quarantined', columns, rows, 'no file')}{told}</div>"


def _problems(review: Review) -> str:
    quarantine = review.cohort.quarantine
    sizes = quarantine.groupby("code").size().sort_values(ascending=False, kind="stable")
    rows = [
        (text(words(str(code))), count(int(size)), text(PROBLEMS[code].mend if code in PROBLEMS else ""))
        for code, size in sizes.items()
    ]
    columns = [("Problem", "left"), ("Number", "right"), ("What to do", "left")]
    return f"<div>{table('Problems by kind', columns, rows, 'no problem was found')}</div>"
