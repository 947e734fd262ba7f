"""One self-contained page that a manager can read: the year's figures, what is open, and the cautions."""

from importlib import resources

import jinja2
import numpy as np
import pandas as pd

from audiokit import __version__
from audiokit.core.dates import year_month_day
from audiokit.core.vocabulary import Met
from audiokit.surveillance.events import OUTCOMES
from audiokit.surveillance.review import Review


def yearly_figures(review: Review) -> pd.DataFrame:
    """Per calendar year and criterion: tests that took part, people tested, events that stand, events still open."""
    year = year_month_day(review.grid.day)[0]
    rows = []
    for book in review.books:
        for name, events in book.events.items():
            event_year = year[events.test]
            unknown = ((book.findings[name].trail.met == Met.UNKNOWN) & ~review.history.before).any(axis=0)
            for value in np.unique(year):
                mine = event_year == value
                rows.append(
                    {
                        "year": int(value),
                        "criterion": name,
                        "tests": int((year == value).sum()),
                        "people": len(np.unique(review.grid.person[year == value])),
                        "events": int((mine & events.stands()).sum()),
                        "people_with_event": len(np.unique(review.grid.person[events.test[mine & events.stands()]])),
                        **{name: int((mine & (events.outcome == code)).sum()) for code, name in enumerate(OUTCOMES)},
                        "tests_unknown": int((unknown & (year == value)).sum()),
                    }
                )
    columns = ["year", "criterion", "tests", "people", "events", "people_with_event", *OUTCOMES, "tests_unknown"]
    return pd.DataFrame(rows, columns=columns)


def worklist_figures(review: Review) -> pd.DataFrame:
    """Lines of the worklist by action: how many, how many overdue, the soonest date."""
    lines = review.worklist
    grouped = lines.groupby("action", sort=True)
    return pd.DataFrame(
        {
            "lines": grouped.size(),
            "people": grouped["person_id"].nunique(),
            "overdue": grouped["overdue"].agg(lambda values: int((values == "yes").sum())),
            "soonest": grouped["due_on"].agg(lambda values: min((v for v in values if v), default="")),
        }
    ).reset_index()


def summary_page(review: Review) -> str:
    """The page as HTML text, without any reference to another file."""
    template = resources.files("audiokit.reports").joinpath("templates", "summary.html").read_text(encoding="utf-8")
    environment = jinja2.Environment(autoescape=True, undefined=jinja2.StrictUndefined, trim_blocks=True)
    settings = review.cohort.settings
    quarantine = review.cohort.quarantine
    problems = (
        quarantine.groupby(["file", "code"], sort=True).size().rename("problems").reset_index().to_dict("records")
        if len(quarantine)
        else []
    )
    return environment.from_string(template).render(
        name=settings.name or review.cohort.folder.name,
        settings=settings,
        books=[book.rulebook for book in review.books],
        intake=review.cohort.intake,
        after_as_of=review.tests_after_as_of(),
        problems=problems,
        years=yearly_figures(review).to_dict("records"),
        work=worklist_figures(review).to_dict("records"),
        people=len(review.cohort.people),
        tests=len(review.grid),
        version=__version__,
    )
