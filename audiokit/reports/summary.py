"""One self-contained page that a manager can read: the year's figures, what is open, and the cautions."""

from importlib import resources

import jinja2
import numpy as np
import pandas as pd
from numpy.typing import NDArray

from audiokit import __version__
from audiokit.core.dates import add_months, calendar_number
from audiokit.core.vocabulary import Met
from audiokit.surveillance.events import OUTCOMES
from audiokit.surveillance.review import Review


def yearly_figures(review: Review) -> pd.DataFrame:
    """Per calendar year and criterion: tests that took part, people tested, events by outcome, tests with unknown.

    `events` counts the ears whose event stands, `people_with_event` the people who have one.
    """
    year = calendar_number(review.grid.day) // 10000
    years, which = np.unique(year, return_inverse=True)
    frames = []
    for book in review.books:
        for name, events in book.events.items():
            stands = events.stands()
            unknown = ((book.findings[name].trail.met == Met.UNKNOWN) & ~review.history.before).any(axis=0)
            counts = {
                "year": years,
                "criterion": np.full(len(years), name, dtype=object),
                "tests": np.bincount(which, minlength=len(years)),
                "people": _people_per_year(review, which, np.arange(len(which)), len(years)),
                "events": np.bincount(which[events.test[stands]], minlength=len(years)),
                "people_with_event": _people_per_year(review, which, events.test[stands], len(years)),
            }
            for code, outcome in enumerate(OUTCOMES):
                counts[outcome] = np.bincount(which[events.test[events.outcome == code]], minlength=len(years))
            counts["tests_unknown"] = np.bincount(which[unknown], minlength=len(years))
            frames.append(pd.DataFrame(counts))
    table = pd.concat(frames, ignore_index=True)
    return table.sort_values(["year", "criterion"], kind="stable").reset_index(drop=True)


def _people_per_year(
    review: Review, year: NDArray[np.integer], tests: NDArray[np.integer], years: int
) -> NDArray[np.int64]:
    """How many different people some tests are of, per year; tests in their order, so that repeats are neighbours."""
    person, when = review.grid.person[tests], year[tests]
    first = np.ones(len(tests), dtype=bool)
    first[1:] = (person[1:] != person[:-1]) | (when[1:] != when[:-1])
    return np.bincount(when[first], minlength=years)


def worklist_figures(review: Review) -> pd.DataFrame:
    """Lines of the worklist by action: how many, of how many people, how many overdue, the first date due."""
    lines = review.worklist
    late = lines["overdue"] == "yes"
    dated = lines[lines["due_on"] != ""]
    grouped = lines.groupby("action", sort=True)
    figures = pd.DataFrame({"lines": grouped.size(), "people": grouped["person_id"].nunique()})
    figures["overdue"] = lines[late].groupby("action").size().reindex(figures.index, fill_value=0)
    figures["first_due"] = dated.groupby("action")["due_on"].first().reindex(figures.index).fillna("")
    return figures.reset_index()


def site_figures(review: Review) -> pd.DataFrame:
    """Per site, where the people table has one: people, tested in the last twelve months, open and overdue lines."""
    table = review.cohort.people.table
    if "site" not in table:
        return pd.DataFrame()
    site = table["site"].replace("", "not recorded").fillna("not recorded").astype(object).to_numpy()
    recent = review.grid.day > add_months(np.array([review.as_of_day]), -12)[0]
    tested = np.zeros(len(site), dtype=bool)
    tested[review.grid.person[recent]] = True
    people = pd.DataFrame({"site": site, "people": 1, "tested": tested.astype(int)}).groupby("site", sort=True).sum()
    where = pd.Series(site, index=review.cohort.people.person_id.to_pylist())
    lines = review.worklist
    line_site = lines["person_id"].map(where)
    people["open"] = lines.groupby(line_site).size().reindex(people.index, fill_value=0)
    people["overdue"] = (lines["overdue"] == "yes").groupby(line_site).sum().reindex(people.index, fill_value=0)
    return people.reset_index()


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
        sites=site_figures(review).to_dict("records"),
        work=worklist_figures(review).to_dict("records"),
        people=len(review.cohort.people),
        tests=len(review.grid),
        version=__version__,
    )
