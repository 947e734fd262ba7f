"""The yearly review in a real browser: filters, people, keyboard, reload; and nothing leaves the machine."""

import re
import shutil
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from workbench import BROWSER_ARGUMENTS, ERRORS, Workbench, find_chromium, serve

ROOT = Path(__file__).parents[2]

pytestmark = [
    pytest.mark.browser,
    pytest.mark.skipif(find_chromium() is None, reason="no Chromium on this machine: the notebook is not driven"),
]


@pytest.fixture(scope="module")
def bench(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Workbench]:
    """The notebook, opened by `audiokit open` in a folder with the example cohort, all cells run."""
    from playwright.sync_api import sync_playwright

    folder, private = tmp_path_factory.mktemp("work"), tmp_path_factory.mktemp("private")
    shutil.copytree(ROOT / "example_cohort", folder / "example_cohort")
    with serve(folder, folder / "example_cohort", private) as base, sync_playwright() as play:
        browser = play.chromium.launch(executable_path=find_chromium(), args=list(BROWSER_ARGUMENTS))
        made = Workbench(browser.new_page(viewport={"width": 1366, "height": 768}), base)
        made.page.set_default_timeout(15_000)
        made.watch()
        made.open()
        made.run_all()
        made.page.locator("tr.ak-pickable").first.wait_for()
        yield made
        browser.close()


@pytest.fixture
def page(bench: Workbench) -> Any:
    """The page with the worklist in front and no filter."""
    bench.page.get_by_role("tab", name="Worklist and person").click()
    _search(bench.page, "")
    return bench.page


def _search(page: Any, words: str) -> None:
    page.get_by_role("textbox", name="Search").fill(words)


def _lines(page: Any) -> Any:
    return page.locator(".ak-worklist tr.ak-pickable").locator("visible=true")


def _await_lines(page: Any, words: str) -> None:
    """Wait until every line shown holds some words."""
    page.wait_for_function(
        "words => (rows => rows.length && rows.every(row => row.innerText.includes(words)))"
        "([...document.querySelectorAll('.ak-worklist tr.ak-pickable')])",
        arg=words,
    )


def _await_caption(page: Any, words: str) -> None:
    page.locator("caption", has_text=words).first.wait_for()


def test_the_notebook_runs_without_errors_and_shows_the_worklist(bench: Workbench) -> None:
    assert bench.page.locator(ERRORS).count() == 0
    assert bench.errors == []
    assert bench.page.locator("tr.ak-pickable").count() == 10
    assert "Loaded: Example cooperative" in bench.page.locator("[role=status].ak-status").first.inner_text()


def test_filters_leave_the_lines_they_name(page: Any) -> None:
    page.get_by_label("Site", exact=True).select_option(label=_option(page, "Site", "sawmill"))
    page.get_by_label("Action", exact=True).select_option(label=_option(page, "Action", "annual test"))
    _await_lines(page, "annual test")
    cells = _lines(page).all_inner_texts()
    assert cells
    assert all("sawmill" in line and "annual test" in line for line in cells)
    for name in ("Site", "Action"):
        page.get_by_label(name, exact=True).select_option(index=0)
    _search(page, "S9006 notify")
    _await_caption(page, "Worklist: 1 of")
    assert _lines(page).count() == 1


def _option(page: Any, field: str, word: str) -> str:
    labels = page.get_by_label(field, exact=True).locator("option").all_inner_texts()
    return next(label for label in labels if word in label.replace("\xa0", " "))


def test_a_click_shows_the_person_with_the_arithmetic(page: Any) -> None:
    _search(page, "S9024")
    _await_lines(page, "S9024")
    _lines(page).first.click()
    page.locator(".ak-heading", has_text="S9024").wait_for()
    page.locator(".ak-clauses li").first.wait_for()
    clauses = page.locator(".ak-clauses li").all_inner_texts()
    assert any(clause.startswith("29 CFR 1910.95(g)(10)(i)") for clause in clauses)
    assert any("= 10 dB, at least 10: yes" in clause for clause in clauses)
    assert page.locator("svg.ak-audiogram").locator("visible=true").count() == 2
    assert page.locator(".ak-baseline .ak-point").count() == page.locator(".ak-current .ak-point").count() == 14
    assert page.evaluate("document.activeElement.textContent") == "Person S9024"


def test_sorting_by_a_heading(page: Any) -> None:
    page.get_by_role("button", name="Person", exact=True).click()
    head = page.locator("th[aria-sort=ascending]")
    head.wait_for()
    assert head.inner_text().startswith("Person")
    shown = [line.split("\t")[3] for line in _lines(page).all_inner_texts()]
    assert shown == sorted(shown)
    page.get_by_role("button", name="Person", exact=False).first.click()
    page.locator("th[aria-sort=descending]").wait_for()
    page.get_by_role("button", name="Person", exact=False).first.click()
    page.wait_for_function("!document.querySelector('th[aria-sort=descending]')")


def test_everything_is_reached_by_keyboard(page: Any) -> None:
    """From the search by Tab to a line, Enter opens the person, Tab and arrows read the chart, Enter goes back."""
    _search(page, "S9006 notify")
    _await_caption(page, "Worklist: 1 of")
    page.get_by_role("textbox", name="Search").focus()
    _tab_until(page, "document.activeElement.matches('tr.ak-pickable')")
    page.keyboard.press("Enter")
    page.wait_for_function("document.activeElement.textContent === 'Person S9006'")
    _tab_until(page, "document.activeElement.matches('.ak-point')")
    first = page.evaluate("document.activeElement.getAttribute('aria-label')")
    assert first.startswith("right ear, current")
    assert first.endswith("500 Hz: 10 dB HL")
    page.keyboard.press("ArrowRight")
    second = page.evaluate("document.activeElement.getAttribute('aria-label')")
    assert second != first
    assert page.locator(".ak-readout").first.inner_text() == second
    page.keyboard.press("Tab")
    assert page.evaluate("document.activeElement.getAttribute('aria-label')").startswith("left ear")
    _tab_until(page, "document.activeElement.matches('.ak-person-tests tr.ak-pickable')")
    page.keyboard.press("ArrowDown")
    page.keyboard.press("Enter")
    page.locator("svg.ak-audiogram", has_text=re.compile("current 2026-01-26")).first.wait_for()
    page.get_by_role("button", name="Back to the worklist").focus()
    page.keyboard.press("Enter")
    page.wait_for_function("document.activeElement.matches('.ak-worklist tr.ak-pickable[aria-current]')")
    assert "S9006" in page.evaluate("document.activeElement.textContent")


def _tab_until(page: Any, reached: str, most: int = 25) -> None:
    for _ in range(most):
        page.keyboard.press("Tab")
        if page.evaluate(reached):
            return
    raise AssertionError(f"{most} times Tab did not reach: {reached}")


def test_the_years_have_a_chart_that_sends_nothing_and_a_table(page: Any) -> None:
    page.get_by_role("tab", name="Years").click()
    page.locator(".js-plotly-plot .xtick text").first.wait_for()
    titles = page.locator(".modebar-btn").evaluate_all(
        "all => all.map(b => b.dataset.title + ' ' + b.getAttribute('aria-label'))"
    )
    assert titles
    assert not [title for title in titles if re.search(r"share|cloud|edit in|studio|send", title, re.IGNORECASE)]
    assert page.locator(".js-plotly-plot a[href]").count() == 0
    drawn = sum(int(text) for text in page.locator(".bars text").all_text_contents() if text)
    assert drawn > 0
    assert page.locator("table.ak-years tbody tr").count() == 9


def test_the_intake_lists_rows_with_their_mend(page: Any) -> None:
    page.get_by_role("tab", name="Intake").click()
    page.locator("table", has_text="bottling_hall.csv").first.wait_for()
    page.get_by_label("Problem", exact=True).select_option(label=_option(page, "Problem", "unknown person"))
    page.wait_for_function(
        "(rows => rows.length && rows.every(row => row.innerText.includes('unknown person')))"
        "([...document.querySelectorAll('.ak-quarantine tbody tr')])"
    )
    assert "Add or correct the person's row" in page.locator(".ak-quarantine tbody tr").first.inner_text()


def test_nothing_is_wider_than_a_small_screen(page: Any) -> None:
    for tab in ("Worklist and person", "Years", "Intake"):
        page.get_by_role("tab", name=tab).click()
        page.wait_for_timeout(200)
        wide = page.evaluate(
            "(all => all.filter(e => e.offsetParent && e.getBoundingClientRect().right >"
            " all[0].getBoundingClientRect().right + 1).map(e => e.className))"
            "([...document.querySelectorAll('.ak-review, .ak-review *')])"
        )
        assert wide == []
        outer = page.evaluate(
            "(e => [e.scrollWidth, e.clientWidth])(document.querySelector('.jp-WindowedPanel-outer'))"
        )
        assert outer[0] <= outer[1]


def test_a_bad_folder_is_a_message(page: Any) -> None:
    page.get_by_label("Cohort", exact=True).select_option(label="another folder …")
    page.get_by_label("Folder", exact=True).fill("nowhere")
    page.get_by_role("button", name="Load").click()
    error = page.locator(".ak-error").first
    error.wait_for()
    assert "there is no such folder" in error.inner_text()
    assert not page.locator(".ak-tiles").is_visible()
    page.get_by_label("Cohort", exact=True).select_option("example_cohort")
    page.get_by_role("button", name="Load").click()
    page.locator(".ak-tiles").wait_for()


_BAR_NUMBERS = "[...document.querySelectorAll('.bars text')].map(text => text.textContent).join(' ')"


def _bar_numbers(page: Any) -> str:
    return str(page.evaluate(_BAR_NUMBERS))


def test_a_saved_and_reloaded_page_shows_what_was_shown_last(bench: Workbench, page: Any) -> None:
    page.get_by_label("Go to person").fill("S9012")
    page.get_by_label("Go to person").press("Enter")
    page.locator(".ak-heading", has_text="S9012").wait_for()
    _search(page, "S9012")
    _await_caption(page, "Worklist: 1 of")
    page.get_by_role("tab", name="Years").click()
    first = _bar_numbers(page)
    page.get_by_label("Criterion", exact=True).select_option(label=_option(page, "Criterion", "recordable"))
    page.wait_for_function(f"{_BAR_NUMBERS} !== {first!r}")
    before = _bar_numbers(page)
    page.evaluate("jupyterapp.commands.execute('docmanager:save')")
    page.reload()
    page.locator(".ak-review").wait_for(timeout=60_000)
    page.locator(".js-plotly-plot .xtick text").first.wait_for()
    page.wait_for_function(f"{_BAR_NUMBERS} !== ''")
    assert _bar_numbers(page) == before != first
    page.get_by_role("tab", name="Worklist and person").click()
    assert page.get_by_role("textbox", name="Search").input_value() == "S9012"
    assert _lines(page).first.inner_text().count("S9012")
    assert page.locator(".ak-heading", has_text="S9012").count() == 1
    assert page.locator(".ak-clauses").count() == 2
    _search(page, "S9006 notify")
    _await_caption(page, "Worklist: 1 of")
    _lines(page).first.click()
    page.locator(".ak-heading", has_text="S9006").wait_for()


def test_nothing_left_this_machine(bench: Workbench) -> None:
    """Runs last: every address that any of the steps above asked for."""
    assert len(bench.asked) > 50
    assert bench.strangers() == []
    assert bench.errors == []
