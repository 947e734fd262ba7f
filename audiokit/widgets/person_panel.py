"""One person: audiogram of baseline and current test, the arithmetic, and everything the review says of them."""

from collections.abc import Callable
from typing import Any

import ipywidgets as widgets
import pandas as pd

from audiokit.core.vocabulary import EARS
from audiokit.widgets.arithmetic import arithmetic_block, verdict_table
from audiokit.widgets.audiogram_svg import Curve
from audiokit.widgets.audiogram_view import AudiogramView
from audiokit.widgets.look import facts, status, text, words
from audiokit.widgets.paged_table import Column, PagedTable
from audiokit.widgets.person_tables import findings_html, tests_frame
from audiokit.widgets.review_lookup import ReviewLookup, TestLine
from audiokit.widgets.spot import Spot

_OWN_WIDTH = {"description_width": "initial"}
_NOT_COMPARED = {
    "baseline": "This test is the initial baseline: there is nothing before it to compare it with.",
    "earlier": "This test is earlier than the initial baseline: it is not compared.",
}
_TESTS = (
    Column("tested_on", "Date"),
    Column("test_id", "Test"),
    Column("purpose", "Purpose"),
    Column("standing", "Standing"),
    Column("right", "Right ear"),
    Column("left", "Left ear"),
)


class PersonPanel(widgets.VBox):
    """What the review says of one person. on_back : called when the reader wants to go back to the worklist"""

    def __init__(self, on_back: Callable[[], None]) -> None:
        self._lookup: ReviewLookup | None = None
        self._person, self._tests = "", list[TestLine]()
        self._shifts = pd.DataFrame()
        self._frequencies: tuple[int, ...] = ()
        self._setting = False
        self.spot = Spot(lead="Person", name="")
        self.asked = widgets.Text(
            description="Go to person", placeholder="person id, then Enter", style=_OWN_WIDTH, continuous_update=False
        )
        self.back = widgets.Button(description="Back to the worklist", icon="arrow-up")
        self.told, self.facts, self.findings = widgets.HTML(), widgets.HTML(), widgets.HTML()
        self.test = widgets.Dropdown(description="Current test", style=_OWN_WIDTH)
        self.criterion = widgets.Dropdown(description="Arithmetic of", style=_OWN_WIDTH)
        self.audiograms = {ear: AudiogramView(ear) for ear in EARS}
        self.verdicts, self.arithmetic = widgets.HTML(), widgets.HTML()
        self.tests = PagedTable(_TESTS, "Tests", on_pick=self.choose_test, empty="no test was accepted")
        self.tests.add_class("ak-person-tests")
        self.back.on_click(lambda _: on_back())
        self.asked.observe(self._asked, "value")
        self.test.observe(lambda _: self._draw(), "value")
        self.criterion.observe(lambda _: self._draw(), "value")
        self.shown = self._layout()
        head = widgets.Box([self.spot, self.asked, self.back]).add_class("ak-person-head")
        super().__init__([head, self.told, self.shown])
        self.clear()

    def _layout(self) -> widgets.VBox:
        choices = widgets.Box([self.test, self.criterion]).add_class("ak-controls")
        charts = widgets.Box(list(self.audiograms.values())).add_class("ak-charts")
        beside = widgets.VBox([self.verdicts, self.arithmetic]).add_class("ak-beside")
        main = widgets.Box([charts, beside]).add_class("ak-columns")
        self._of_tests = widgets.VBox([choices, main, self.tests])
        return widgets.VBox([self.facts, self._of_tests, self.findings])

    @property
    def person_id(self) -> str:
        """The person shown, blank where none is."""
        return self._person

    def clear(self, lookup: ReviewLookup | None = None) -> None:
        """Show nobody; from now on people are looked up in another review."""
        self._lookup, self._person, self._tests = lookup, "", []
        self.spot.name = ""
        self.shown.layout.display = "none"
        self.told.value = status("Click a line of the worklist, press Enter on it, or type a person's id.")

    def show(self, person_id: str, test_id: str = "", criterion: str = "", *, reveal: bool = False) -> bool:
        """Show a person; says so and shows nobody where there is none of that id.

        test_id   : the test shown as current; blank: the latest one that takes part
        criterion : whose arithmetic is shown; blank: the first of the rulebook
        """
        assert self._lookup is not None
        row = self._lookup.person_row(person_id)
        if row < 0:
            self.clear(self._lookup)
            self.told.value = status(*self._unknown(person_id), kind="error")
            return False
        try:
            self._fill(self._lookup, person_id, row, (test_id, criterion))
        except Exception as error:  # A defect: nobody shall read half of one person and half of another.
            self.clear(self._lookup)
            self.told.value = status(f"{person_id} cannot be shown: {error!r}", "report this message", "error")
            raise
        if reveal:
            self.spot.reveal()
        return True

    def _fill(self, lookup: ReviewLookup, person_id: str, row: int, wanted: tuple[str, str]) -> None:
        self._person, self._tests = person_id, lookup.tests(row)
        self._shifts, self._frequencies = lookup.shifts(row), lookup.frequencies(row)
        self.spot.name = person_id
        self.facts.value = facts(lookup.facts(row))
        self.told.value = status(
            "" if self._tests else "No test of this person was accepted, so there is no audiogram."
        )
        self._of_tests.layout.display = "" if self._tests else "none"
        self._offer(*wanted)
        self.findings.value = findings_html(lookup, person_id)
        self._draw()
        self.shown.layout.display = ""

    def choose_test(self, index: Any) -> None:
        """Show another test as current, named by its row in the table of tests."""
        self.test.value = int(index)

    def _unknown(self, person_id: str) -> tuple[str, str]:
        assert self._lookup is not None
        near = self._lookup.similar(person_id)
        people = len(self._lookup.review.cohort.people)
        mend = f"did you mean {', '.join(near)}?" if near else "check the id; a person in quarantine cannot be found"
        return f"There is no person {person_id} among the {people} people of this cohort.", mend

    def _asked(self, _change: Any) -> None:
        wanted = self.asked.value.strip()
        if wanted and self._lookup is not None and self.show(wanted, reveal=True):
            self.asked.value = ""  # so that the same id can be asked for again

    def _offer(self, test_id: str, criterion: str) -> None:
        """Fill both choices and choose; nothing is drawn until both stand."""
        assert self._lookup is not None
        criteria = self._lookup.criteria()
        wanted = [at for at, test in enumerate(self._tests) if test.test_id == test_id]
        latest = [at for at, test in enumerate(self._tests) if not test.left_out] or list(range(len(self._tests)))
        self._setting = True
        self.test.options = [(_test_label(test), at) for at, test in reversed(list(enumerate(self._tests)))]
        self.test.value = (wanted or latest)[-1] if self._tests else None
        self.criterion.options = [(f"{entry.name} ({name})", name) for name, entry in criteria.items()]
        self.criterion.value = criterion if criterion in criteria else next(iter(criteria))
        self._setting = False

    def _draw(self) -> None:
        """Audiograms, verdicts and arithmetic of the test and the criterion chosen."""
        if self._setting or self._lookup is None or not self._person:
            return
        at, criterion = self.test.value, self.criterion.value
        frame = tests_frame(self._tests, self._shifts, criterion)
        self.tests.set_rows(frame, f"Tests of this person, {criterion}: Enter on one shows it as current", picked=at)
        self.tests.mark(at)
        if at is None:
            for view in self.audiograms.values():
                view.show(())
            self.verdicts.value = self.arithmetic.value = ""
            return
        self._draw_test(self._tests[at], criterion)

    def _draw_test(self, test: TestLine, criterion_id: str) -> None:
        assert self._lookup is not None
        criteria = self._lookup.criteria()
        own = self._shifts[self._shifts["test_id"] == test.test_id]
        rows = {(row["criterion"], row["ear"]): row for row in own.to_dict("records")}
        by_id = {other.test_id: other for other in self._tests}
        blocks = []
        for ear, view in self.audiograms.items():
            current = Curve("current", test.test_id, test.tested_on, self._lookup.cells(test, ear, self._frequencies))
            curves, row = [current], rows.get((criterion_id, ear))
            if row is not None:
                base = by_id[str(row["baseline_test_id"])]
                curves.append(
                    Curve("baseline", base.test_id, base.tested_on, self._lookup.cells(base, ear, self._frequencies))
                )
                blocks.append(arithmetic_block(ear, criteria[criterion_id], row, curves[0].cells, curves[1].cells))
            elif test.standing == "compared":
                raise LookupError(f"test {test.test_id} is compared, but its {ear} ear has no shift")
            view.show(curves, criteria[criterion_id].frequencies_hz.value)
        self.verdicts.value = verdict_table(criteria, rows) if rows else ""
        self.arithmetic.value = "".join(blocks) or f'<p class="ak-note">{text(_no_comparison(test))}</p>'


def _no_comparison(test: TestLine) -> str:
    return _NOT_COMPARED.get(test.standing, f"This test takes no part: {words(test.left_out)}.")


def _test_label(test: TestLine) -> str:
    told = [test.tested_on, test.test_id, test.purpose, "" if test.standing == "compared" else test.standing]
    return ", ".join(part for part in told if part)
