"""The figures at the head of the panel."""

from audiokit.reports.summary import worklist_figures, yearly_figures
from audiokit.surveillance.review import Review
from audiokit.widgets.look import count, facts, tiles, words

_SHORT_LINE = ("retest", "notify", "record")


def headline(review: Review) -> str:
    """What is overdue, what is open, how many shifts stand this year, and what could not be used, as HTML."""
    work = worklist_figures(review)
    lines, overdue = int(work["lines"].sum()), int(work["overdue"].sum())
    by_action = dict(zip(work["action"], work["lines"], strict=True))
    read = sum(file.rows_read for file in review.cohort.intake)
    unused = sum(file.quarantined for file in review.cohort.intake)
    left_out = int((review.left_out != "").sum())
    return _settings(review) + tiles(
        (
            ("Overdue", count(overdue), f"of {count(lines)} lines of the worklist"),
            (
                "Open",
                " + ".join(count(int(by_action.get(action, 0))) for action in _SHORT_LINE),
                " + ".join(_SHORT_LINE),
            ),
            _standing(review),
            (
                "For a reviewer",
                count(sum(int(number) for action, number in by_action.items() if action.startswith("review_"))),
                ", ".join(words(action) for action in by_action if action.startswith("review_")) or "nothing",
            ),
            ("Rows not used", count(unused), f"of {count(read)} read; see Intake"),
            (
                "People",
                count(len(review.cohort.people)),
                f"{count(len(review.grid))} tests, {count(left_out)} left out",
            ),
        )
    )


def _settings(review: Review) -> str:
    """What the answers below rest on, whatever the fields above say by now."""
    settings = review.cohort.settings
    recording = {} if settings.recording_baseline == "original" else {"recording baseline": "the one in force"}
    return facts(
        {
            "cohort": settings.name,
            "as of": settings.as_of.isoformat(),
            "rulebook": ", ".join(settings.rulebooks),
            "age correction": "on" if settings.age_correction else "off",
            "baselines revised": {
                "reviewed": "by decisions",
                "automatic": "by published rules",
            }[settings.baseline_revision],
            **recording,
        }
    )


def _standing(review: Review) -> tuple[str, str, str]:
    """Events of the revision criterion that stand in the year of the review's date."""
    year, book = review.cohort.settings.as_of.year, review.books[0]
    name = book.rulebook.revision.criterion
    years = yearly_figures(review)
    own = years[(years["criterion"] == name) & (years["year"].isin((year, year - 1)))].set_index("year")["events"]
    return (
        f"Shifts that stand, {year}",
        count(int(own.get(year, 0))),
        f"ears, {name}; {year - 1}: {count(int(own.get(year - 1, 0)))}",
    )
