"""The years at a glance: a figure, the same numbers in a table beside it, and both in a sentence."""

import ipywidgets as widgets
import pandas as pd

from audiokit.reports.summary import yearly_figures
from audiokit.surveillance.review import Review
from audiokit.widgets.look import count, table, text, words
from audiokit.widgets.year_figure import OUTCOME_MARKS, figure_output, year_figure, year_summary


class YearPanel(widgets.VBox):
    """Events by year and outcome for one criterion at a time."""

    def __init__(self) -> None:
        self.criterion = widgets.Dropdown(description="Criterion", style={"description_width": "initial"})
        self.summary = widgets.HTML()
        self.chart = widgets.Output().add_class("ak-chart")
        self.numbers = widgets.HTML()
        self._years = pd.DataFrame()
        self.criterion.observe(lambda _: self._draw(), "value")
        beside = widgets.Box([self.chart, self.numbers]).add_class("ak-columns")
        super().__init__([widgets.Box([self.criterion]).add_class("ak-controls"), self.summary, beside])

    def show(self, review: Review) -> None:
        """Show the years of a review."""
        self._years = yearly_figures(review)
        criteria = [criterion for book in review.books for criterion in book.rulebook.criteria]
        self.criterion.options = [(f"{criterion.name} ({criterion.id})", criterion.id) for criterion in criteria]
        self.criterion.value = criteria[0].id
        self._draw()

    def _draw(self) -> None:
        name = self.criterion.value
        if name is None:
            return
        label = next(label for label, value in self.criterion.options if value == name)
        years = self._years[self._years["criterion"] == name].reset_index(drop=True)
        self.summary.value = f'<p class="ak-note">{text(year_summary(years, label))}</p>'
        self.chart.outputs = figure_output(year_figure(years)) if len(years) else ()
        self.numbers.value = _numbers(years)


def _numbers(years: pd.DataFrame) -> str:
    columns = [
        ("Year", "left"),
        ("Tests", "right"),
        ("People tested", "right"),
        ("People with event", "right"),
        ("Events that stand", "right"),
        *((words(outcome).capitalize(), "right") for outcome in OUTCOME_MARKS),
        ("Cannot tell", "right"),
    ]
    keys = ["tests", "people", "people_with_event", "events", *OUTCOME_MARKS, "tests_unknown"]
    rows = [(str(int(row["year"])), *(count(int(row[key])) for key in keys)) for row in years.to_dict("records")]
    return table(
        "Events per ear; those confirmed, without retest or found at the retest stand",
        columns,
        rows,
        "no test",
        "ak-years",
    )
