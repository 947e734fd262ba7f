"""The whole panel without a browser: loading, the figures at its head, filters, intake and years."""

import re
from pathlib import Path

import ipywidgets as widgets
import pandas as pd
import pytest
from cohorts import person, write
from cohorts import test_row as row

from audiokit.core.errors import CohortError
from audiokit.reports.summary import yearly_figures
from audiokit.surveillance.review import Review
from audiokit.widgets import YearlyReview, load_panel
from audiokit.widgets.review_lookup import ReviewLookup
from audiokit.widgets.worklist_panel import WorklistPanel


def _open(panel: YearlyReview) -> bool:
    return panel.answer.layout.display != "none"


def test_loading_shows_the_answer_and_what_it_rests_on(panel: YearlyReview) -> None:
    assert _open(panel)
    assert "Loaded: by hand." in panel.loader.told.value
    assert "as of <b><bdi>2024-06-01</bdi></b>" in panel.figures.value
    assert "age correction <b><bdi>off</bdi></b>" in panel.figures.value
    assert panel.loader.bar.layout.display == "none"
    assert not panel.loader.button.disabled


def test_settings_reach_the_review(panel: YearlyReview) -> None:
    import datetime

    panel.loader.as_of.value = datetime.date(2023, 6, 1)
    panel.loader.age_correction.value = "on"
    panel.loader.revision.value = "automatic"
    assert "press Load" in panel.loader.told.value
    assert "age correction <b><bdi>off</bdi></b>" in panel.figures.value
    panel.load()
    assert panel.review is not None
    settings = panel.review.cohort.settings
    assert (settings.as_of, settings.age_correction) == (datetime.date(2023, 6, 1), True)
    assert settings.baseline_revision == "automatic"
    assert "2023-06-01" in panel.figures.value
    assert "age correction <b><bdi>on</bdi></b>" in panel.figures.value


@pytest.mark.parametrize("name", ["nowhere", "tests.csv", ""])
def test_a_folder_that_cannot_be_read_is_a_message_and_no_old_answer(panel: YearlyReview, name: str) -> None:
    panel.loader.folder.value = ""
    panel.loader.other.value = f"mixed/{name}" if name == "tests.csv" else name
    panel.load()
    assert panel.review is None
    assert not _open(panel)
    assert "ak-error" in panel.loader.told.value
    assert "What to do:" in panel.loader.told.value
    assert "Traceback" not in panel.loader.told.value


def test_a_broken_setting_names_the_mend(panel: YearlyReview, tmp_path: Path) -> None:
    folder = write(tmp_path / "odd", [person("B1")], [], "colour = 3\n")
    panel.loader.folder.value = ""
    panel.loader.other.value = str(folder)
    panel.load()
    assert "colour" in panel.loader.told.value
    assert panel.review is None


def test_a_defect_while_loading_hides_the_answer(panel: YearlyReview, monkeypatch: pytest.MonkeyPatch) -> None:
    def broken(*_arguments: object, **_more: object) -> None:
        raise RuntimeError("made for this test")

    monkeypatch.setattr(load_panel, "review", broken)
    with pytest.raises(RuntimeError):
        panel.load()
    assert panel.review is None
    assert not _open(panel)
    assert "cannot be shown" in panel.loader.told.value
    assert not panel.loader.button.disabled


def test_progress_is_told_while_loading(panel: YearlyReview) -> None:
    told: list[str] = []
    shares: list[int] = []
    panel.loader.told.observe(lambda change: told.append(change["new"]), "value")
    panel.loader.bar.observe(lambda change: shares.append(change["new"]), "value")
    panel.load()
    assert any("reading people.csv" in words for words in told)
    assert shares[1:] == sorted(shares[1:])
    assert max(shares) > 60


def test_the_folder_audiokit_open_named_comes_first(mixed_folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("AUDIOKIT_COHORT", str(mixed_folder))
    inside = YearlyReview(base=mixed_folder.parent)
    assert inside.loader.folder.value == "mixed"
    outside = YearlyReview(base=mixed_folder)
    assert outside.loader.chosen() == mixed_folder
    outside.load()
    assert outside.review is not None


def test_without_any_cohort_below_the_panel_waits(tmp_path: Path) -> None:
    made = YearlyReview(base=tmp_path)
    assert made.loader.chosen() is None
    assert made.loader.other.layout.display == ""
    made.load()
    assert "No folder is named" in made.loader.told.value


def test_headline_figures_are_those_of_the_review(example_review: Review) -> None:
    from audiokit.widgets.headline import headline

    shown = headline(example_review)
    tiles = re.findall(r'class="ak-tile">([^<]*) <b>([^<]*)</b> <span>([^<]*)<', shown)
    figures = {name: (figure.replace("\u202f", ""), detail.replace("\u202f", "")) for name, figure, detail in tiles}
    work = example_review.worklist
    assert figures["Overdue"] == (str((work["overdue"] == "yes").sum()), f"of {len(work)} lines of the worklist")
    sizes = work["action"].value_counts()
    assert figures["Open"][0] == " + ".join(str(sizes.get(action, 0)) for action in ("retest", "notify", "record"))
    unused = sum(file.quarantined for file in example_review.cohort.intake)
    assert figures["Rows not used"][0] == str(unused)
    events = example_review.summary()["events"]["us-osha.sts"]
    years = yearly_figures(example_review)
    stand = years[years["criterion"] == "us-osha.sts"]["events"].sum()
    assert stand == events["confirmed"] + events["no_retest"] + events["found_at_retest"]


class TestWorklist:
    """The filters against the same filters written by hand on the review's own worklist."""

    @pytest.fixture
    def shown(self, example_review: Review) -> WorklistPanel:
        made = WorklistPanel(lambda *_: None)
        made.show(ReviewLookup(example_review))
        return made

    def _expected(self, review: Review, **wanted: str) -> pd.DataFrame:
        people = review.cohort.people
        site = dict(zip(people.person_id.to_pylist(), people.table["site"], strict=True))
        work = review.worklist.assign(site=review.worklist["person_id"].map(site))
        for column, value in wanted.items():
            work = work[work[column] == value]
        return work

    def test_all_lines_in_the_order_of_the_file(self, shown: WorklistPanel, example_review: Review) -> None:
        frame = shown.lines.frame
        for column in ("due_on", "person_id", "test_id", "ear", "why"):
            assert frame[column].tolist() == example_review.worklist[column].tolist()

    def test_each_filter_and_all_together(self, shown: WorklistPanel, example_review: Review) -> None:
        site = str(shown.site.options[2][1])
        shown.site.value = site
        expected = self._expected(example_review, site=site)
        assert 0 < len(expected) < len(example_review.worklist)
        assert shown.lines.frame["why"].tolist() == expected["why"].tolist()
        shown.action.value = "annual test"
        expected = self._expected(example_review, site=site, action="annual_test")
        assert shown.lines.frame["person_id"].tolist() == expected["person_id"].tolist()
        shown.overdue.value = "▲ yes"
        expected = self._expected(example_review, site=site, action="annual_test", overdue="yes")
        assert len(expected)
        assert shown.lines.frame["person_id"].tolist() == expected["person_id"].tolist()
        shown.search.value = expected["person_id"].iloc[0].lower()
        assert shown.lines.frame["person_id"].unique().tolist() == [expected["person_id"].iloc[0]]

    def test_choices_count_their_lines(self, shown: WorklistPanel, example_review: Review) -> None:
        counts = example_review.worklist["action"].value_counts()
        for label, value in shown.action.options[1:]:
            assert label == f"{value} ({counts[value.replace(' ', '_')]})"

    def test_search_takes_every_word_and_finds_none_without_complaint(self, shown: WorklistPanel) -> None:
        shown.search.value = "retest (29 CFR"
        assert len(shown.lines.frame)
        shown.search.value = "retest ("
        shown.search.value = "no such words at all [.*"
        assert shown.lines.view["rows"] == []
        assert shown.lines.view["empty"] == "no line of the worklist fits"

    def test_people_without_a_site_can_be_chosen(self, panel: YearlyReview) -> None:
        panel.worklist.site.value = ""
        assert set(panel.worklist.lines.frame["person_id"]) == {"A3"}

    def test_a_new_cohort_begins_without_filters(self, panel: YearlyReview) -> None:
        panel.worklist.search.value = "A1"
        panel.worklist.site.value = "north"
        panel.load()
        assert panel.worklist.search.value == ""
        assert len(panel.worklist.lines.frame) == len(panel.review.worklist)  # type: ignore[union-attr]
        assert panel.worklist.lines.picked is None


class TestIntake:
    """What was read, and what could not be used."""

    def test_files_and_problems(self, panel: YearlyReview) -> None:
        assert panel.review is not None
        overview = panel.intake.overview.value
        for file in panel.review.cohort.intake:
            cells = (file.file, file.role, str(file.rows_read), str(file.accepted), str(file.quarantined))
            plain = re.sub(r"<[^>]+>", "|", overview)
            assert re.search(r"\|+".join(map(re.escape, cells)), plain)
        assert "out of range" in overview
        assert "name it under [cells] in cohort.toml" in overview
        assert "1 are later than 2024-06-01" in overview

    def test_quarantined_rows_by_problem_and_file(self, panel: YearlyReview) -> None:
        assert panel.review is not None
        rows = panel.intake.rows
        assert len(rows.frame) == len(panel.review.cohort.quarantine) == 2
        panel.intake.problem.value = "unknown person"
        assert [r["cells"][3] for r in rows.view["rows"]] == ["nobody"]
        panel.intake.file.value = "tests.csv"
        assert len(rows.frame) == 1


class TestYears:
    """The figure and its table say the same."""

    def test_bars_and_table_are_the_figures_of_the_summary(self, example_review: Review) -> None:
        from audiokit.widgets.year_panel import YearPanel

        panel = YearPanel()
        panel.show(example_review)
        for name in ("us-osha.sts", "us-osha.recordable"):
            panel.criterion.value = name
            years = yearly_figures(example_review)
            years = years[years["criterion"] == name]
            (output,) = panel.chart.outputs
            traces = output["data"]["application/vnd.plotly.v1+json"]["data"]
            assert {trace["name"].replace(" ", "_"): list(trace["y"]) for trace in traces} == {
                trace["name"].replace(" ", "_"): years[trace["name"].replace(" ", "_")].tolist() for trace in traces
            }
            numbers = re.findall(r"<tr>(.*?)</tr>", panel.numbers.value)[1:]
            assert len(numbers) == len(years)
            assert (
                f"{int(years['events'].iloc[-1])} events stand in {int(years['year'].iloc[-1])}" in panel.summary.value
            )

    def test_outcomes_differ_without_colour(self) -> None:
        from audiokit.surveillance.events import OUTCOMES
        from audiokit.widgets.year_figure import OUTCOME_MARKS

        assert set(OUTCOME_MARKS) == set(OUTCOMES)
        assert len({pattern for _, pattern in OUTCOME_MARKS.values()}) == len(OUTCOMES)
        assert len({colour for colour, _ in OUTCOME_MARKS.values()}) == len(OUTCOMES)

    def test_no_chart_offers_to_send_anything(self, panel: YearlyReview) -> None:
        """plotly's own switches; the browser test reads the buttons that are really there."""
        (output,) = panel.years.chart.outputs
        config = output["data"]["application/vnd.plotly.v1+json"]["config"]
        assert config["showSendToCloud"] is False
        assert config["plotlyServerURL"] == ""
        assert config["displaylogo"] is False
        assert {"sendDataToCloud", "editInChartStudio"} <= set(config["modeBarButtonsToRemove"])


class TestSmallCohorts:
    """Nothing, one person, people without tests."""

    def _loaded(self, folder: Path) -> YearlyReview:
        made = YearlyReview(base=folder.parent)
        made.load()
        assert made.review is not None, made.loader.told.value
        return made

    def test_nobody_at_all(self, tmp_path: Path) -> None:
        """Every row of both tables is in quarantine."""
        made = self._loaded(write(tmp_path / "empty", [person("B1", sex="?")], [row("B1", "b1", "2024-01-01")]))
        assert made.worklist.lines.view["rows"] == []
        assert made.years.chart.outputs == ()
        assert "No test takes part" in made.years.summary.value
        assert ">0</b> <span>of 0 lines" in made.figures.value
        assert not made.choose_person("A1")
        assert "among the 0 people" in made.person.told.value

    def test_one_person(self, tmp_path: Path) -> None:
        made = self._loaded(write(tmp_path / "one", [person("B1")], [row("B1", "b1", "2024-01-01")]))
        assert [r["cells"][3] for r in made.worklist.lines.view["rows"]] == ["B1"]
        assert made.choose_person("B1")
        assert "initial baseline" in made.person.arithmetic.value

    def test_people_without_tests(self, tmp_path: Path) -> None:
        made = self._loaded(write(tmp_path / "none", [person("B1"), person("B2")], [row("B3", "b1", "2024-01-01")]))
        assert made.years.chart.outputs == ()
        assert made.choose_person("B2")
        assert "No test of this person was accepted" in made.person.told.value

    def test_a_people_table_without_sites_has_no_filter_for_them(self, tmp_path: Path) -> None:
        folder = write(tmp_path / "plain", [person("B1")], [row("B1", "b1", "2023-01-01")])
        (folder / "people.csv").write_text("person_id,sex,birth_year\nB1,female,1980\n", encoding="utf-8")
        made = self._loaded(folder)
        assert made.worklist.site.layout.display == "none"
        assert made.worklist.lines.view["rows"]


def _inside(widget: widgets.Widget) -> list[widgets.Widget]:
    children = [child for part in getattr(widget, "children", ()) for child in _inside(part)]
    return [widget, *children]


def test_every_field_has_a_name_and_nothing_needs_a_mouse(panel: YearlyReview) -> None:
    """A description is the field's name for screen readers; accordions are not reached by Tab, sliders lack a name."""
    parts = _inside(panel)
    fields = [
        part for part in parts if isinstance(part, (widgets.Dropdown, widgets.Text, widgets.DatePicker, widgets.Button))
    ]
    assert len(fields) > 12
    assert [field for field in fields if not field.description] == []
    assert not [
        part for part in parts if isinstance(part, (widgets.Accordion, widgets.IntSlider, widgets.RadioButtons))
    ]


def test_errors_of_the_package_are_what_the_panel_expects() -> None:
    error = CohortError("found", "mend")
    assert (error.message, error.mend) == ("found", "mend")
