"""Takes the README's picture of the notebook anew: python tests/notebooks/picture.py"""

import shutil
import sys
import tempfile
from pathlib import Path

from playwright.sync_api import Page, sync_playwright

sys.path.insert(0, str(Path(__file__).parent))

from workbench import BROWSER_ARGUMENTS, Workbench, find_chromium, serve

ROOT = Path(__file__).parents[2]
PICTURE = ROOT / "notebooks" / "yearly_review.png"


def take(page: Page) -> None:
    """Filter the worklist, open the person of one line, and photograph the panel."""
    page.get_by_role("tab", name="Worklist and person").wait_for()
    page.get_by_role("textbox", name="Search").fill("S9006")
    page.locator("tr.ak-pickable", has_text="record").first.click()
    page.locator(".ak-clauses").first.wait_for()
    page.evaluate("document.activeElement.blur(); document.querySelector('.ak-review').scrollIntoView()")
    page.mouse.move(5, 5)
    page.wait_for_timeout(500)
    box = page.locator(".ak-review").bounding_box()
    assert box is not None
    tests = page.locator(".ak-person-tests").bounding_box()
    assert tests is not None
    page.screenshot(
        path=PICTURE,
        clip={"x": box["x"] - 8, "y": box["y"], "width": box["width"] + 16, "height": tests["y"] - box["y"]},
    )


def main() -> None:
    """Serve the example cohort, open the notebook, take the picture."""
    with tempfile.TemporaryDirectory() as name, sync_playwright() as play:
        folder, private = Path(name) / "work", Path(name) / "private"
        private.mkdir()
        shutil.copytree(ROOT / "example_cohort", folder / "example_cohort")
        with serve(folder, folder / "example_cohort", private) as base:
            browser = play.chromium.launch(executable_path=find_chromium(), args=list(BROWSER_ARGUMENTS))
            page = browser.new_page(viewport={"width": 1366, "height": 1600})
            bench = Workbench(page, base)
            bench.open()
            bench.run_all()
            take(page)
            browser.close()
    print(f"{PICTURE}: {PICTURE.stat().st_size // 1024} KB")


if __name__ == "__main__":
    main()
