"""The panel of the yearly review: choose a cohort, read its intake, its years, its worklist and its people."""

from pathlib import Path

import ipywidgets as widgets

from audiokit.surveillance.review import Review
from audiokit.widgets.headline import headline
from audiokit.widgets.intake_panel import IntakePanel
from audiokit.widgets.load_panel import LoadPanel
from audiokit.widgets.person_panel import PersonPanel
from audiokit.widgets.review_lookup import ReviewLookup
from audiokit.widgets.worklist_panel import WorklistPanel
from audiokit.widgets.year_panel import YearPanel

TABS = ("Worklist and person", "Years", "Intake")


class YearlyReview(widgets.VBox):
    """The yearly review as one panel.

    cohort : the folder to begin with; default: what `audiokit open` named, else example_cohort, else the first found
    base   : cohort folders are looked for below it; default: the notebook's own folder
    review : the finished review (None until a cohort is loaded), for cells of one's own: panel.review.worklist
    """

    def __init__(self, cohort: str | Path | None = None, *, base: str | Path | None = None) -> None:
        self.review: Review | None = None
        self.loader = LoadPanel(Path.cwd() if base is None else Path(base), cohort, self._hide, self._show)
        self.figures = widgets.HTML()
        self.worklist = WorklistPanel(self._picked)
        self.person = PersonPanel(self.worklist.lines.focus)
        self.years, self.intake = YearPanel(), IntakePanel()
        both = widgets.Box([self.worklist, self.person]).add_class("ak-work")
        self.tabs = widgets.Tab([both, self.years, self.intake], titles=TABS)
        self.answer = widgets.VBox([self.figures, self.tabs])
        super().__init__([self.loader, self.answer])
        self.add_class("ak-root").add_class("ak-review")
        self._hide()

    def show(self) -> None:
        """Show the panel in the notebook, then load the chosen cohort where there is one."""
        from IPython.display import display

        display(self)
        if self.loader.chosen() is not None:
            self.load()

    def load(self) -> None:
        """Load the cohort with the settings chosen, as the button does."""
        self.loader.load()

    def choose_person(self, person_id: str, test_id: str = "", criterion: str = "") -> bool:
        """Show a person; False where the cohort has none of that id or nothing is loaded."""
        return self.review is not None and self.person.show(person_id, test_id, criterion)

    def _hide(self) -> None:
        """Nobody shall read the last answer for the next one."""
        self.review = None
        self.answer.layout.display = "none"

    def _show(self, found: Review) -> None:
        lookup = ReviewLookup(found)
        self.figures.value = headline(found)
        self.worklist.show(lookup)
        self.person.clear(lookup)
        self.years.show(found)
        self.intake.show(found)
        self.review = found
        self.answer.layout.display = ""

    def _picked(self, person_id: str, test_id: str, criterion: str) -> None:
        self.person.show(person_id, test_id, criterion, reveal=True)
