"""The figure of events by year and outcome: colour, pattern and number all say the outcome."""

from typing import Any

import pandas as pd

from audiokit.widgets.look import words

CONFIG: dict[str, Any] = {
    "showSendToCloud": False,
    "plotlyServerURL": "",
    "displaylogo": False,
    "displayModeBar": True,
    "responsive": False,
    "modeBarButtonsToRemove": ["sendDataToCloud", "editInChartStudio", "select2d", "lasso2d", "autoScale2d"],
}
"""Health data stay on the machine: no button of the chart may offer to send them anywhere."""

OUTCOME_MARKS = {
    "confirmed": ("#0072b2", ""),
    "no_retest": ("#56b4e9", "/"),
    "found_at_retest": ("#009e73", "x"),
    "retest_open": ("#e69f00", "\\"),
    "not_confirmed": ("#b5b5b5", "."),
}
"""Colour and pattern of each outcome; the first three stand. Colours: palette of Okabe and Ito (from memory)."""

STANDING = ("confirmed", "no_retest", "found_at_retest")
_MIME = "application/vnd.plotly.v1+json"


def year_figure(years: pd.DataFrame) -> Any:
    """Stacked bars by year as a plotly figure.

    years : rows of `yearly_figures` for one criterion
    """
    import plotly.graph_objects as go

    figure = go.Figure()
    for outcome, (colour, pattern) in OUTCOME_MARKS.items():
        counts = years[outcome].tolist()
        figure.add_bar(
            x=years["year"].astype(str).tolist(),
            y=counts,
            name=words(outcome),
            text=[str(number) if number else "" for number in counts],
            textposition="inside",
            insidetextanchor="middle",
            textangle=0,
            textfont={"color": "#111", "size": 12},
            marker={
                "color": colour,
                "line": {"color": "#222", "width": 1},
                "pattern": {"shape": pattern, "fillmode": "overlay", "fgcolor": "#fff", "size": 7, "solidity": 0.25},
            },
            hovertemplate="%{x}, " + words(outcome) + ": %{y}<extra></extra>",
        )
    figure.update_layout(
        template="none",
        barmode="stack",
        width=500,
        height=350,
        margin={"l": 48, "r": 34, "t": 52, "b": 44},
        uniformtext={"minsize": 11, "mode": "hide"},
        legend={
            "orientation": "h",
            "x": 0,
            "y": 1.02,
            "yanchor": "bottom",
            "traceorder": "normal",
            "font": {"size": 12},
        },
        xaxis={"title": {"text": "Year of the test"}, "type": "category", "fixedrange": True},
        yaxis={"title": {"text": "Events (ears)"}, "rangemode": "tozero", "fixedrange": True, "gridcolor": "#8888884d"},
        paper_bgcolor="rgba(0,0,0,0)",
        plot_bgcolor="rgba(0,0,0,0)",
        bargap=0.3,
        modebar={"orientation": "v", "bgcolor": "rgba(0,0,0,0)"},
    )
    return figure


def figure_output(figure: Any) -> tuple[dict[str, Any], ...]:
    """The figure as the outputs of an Output widget, drawn by the notebook itself without any network."""
    shown = figure.to_plotly_json()
    bundle = {_MIME: {"data": shown["data"], "layout": shown["layout"], "config": dict(CONFIG)}}
    return ({"output_type": "display_data", "data": bundle, "metadata": {}},)


def year_summary(years: pd.DataFrame, name: str) -> str:
    """The figure in words, for those who do not see it."""
    if years.empty:
        return f"No test takes part, so there is nothing to count for {name}."
    last = years.iloc[-1]
    most = years.iloc[int(years["events"].to_numpy().argmax())]
    told = f"{name}: {int(last['events'])} events stand in {int(last['year'])}, "
    told += f"{int(last['retest_open'])} more wait for a retest."
    if int(most["events"]):
        told += f" Most in one year: {int(most['events'])} in {int(most['year'])}."
    return told
