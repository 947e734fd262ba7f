"""The small pieces of HTML that every panel is made of."""

import re
from pathlib import Path

import pytest

from audiokit.widgets import look

CSS = (look.STATIC / "look.css").read_text(encoding="utf-8")


def test_texts_of_files_cannot_become_markup() -> None:
    assert look.text('<b>"&') == "<bdi>&lt;b&gt;&quot;&amp;</bdi>"
    for shown in (
        look.table("<i>", [("<u>", "left")], [("x",)]),
        look.status("<i>", "<u>"),
        look.tiles([("<i>", "<u>", "<s>")]),
        look.facts({"<i>": "<u>"}),
    ):
        assert not re.search(r"<(i|u|s)>", shown)


@pytest.mark.parametrize(
    ("value", "bound", "shown"),
    [
        (10.0, "exact", "10 dB"),
        (9.6667, "exact", "9.6667 dB"),
        (-5.0, "exact", "−5 dB"),
        (8.3333, "at_least", "≥ 8.3333 dB"),
        (0.0, "at_most", "≤ 0 dB"),
        (3.0, "none", "not computable"),
        (None, "exact", "not computable"),
        (float("nan"), "exact", "not computable"),
    ],
)
def test_decibels_stand_as_in_the_files(value: float | None, bound: str, shown: str) -> None:
    assert look.decibels(value, bound).replace("\u202f", " ") == shown


def test_a_table_has_caption_scopes_and_numbers_to_the_right() -> None:
    shown = look.table("Files", [("File", "left"), ("Rows", "right")], [("a", "3")])
    assert "<caption>Files</caption>" in shown
    assert shown.count('scope="col"') == 2
    assert shown.count('scope="row"') == 1
    assert re.search(r'<td class="ak-right[^"]*">3</td>', shown)


def test_an_empty_table_says_so() -> None:
    assert "no file" in look.table("Files", [("File", "left"), ("Rows", "right")], [], "no file")


def test_messages_are_read_out() -> None:
    for kind in ("note", "busy", "error"):
        assert 'role="status" aria-live="polite"' in look.status("done", "", kind)
    assert "What to do:" in look.status("done", "this", "error")


def _contrast(first: str, second: str) -> float:
    """Contrast of two colours (WCAG 2.1, relative luminance and contrast ratio; from memory, unverified)."""

    def luminance(colour: str) -> float:
        parts = [int(colour[at : at + 2], 16) / 255 for at in (1, 3, 5)]
        linear = [part / 12.92 if part <= 0.04045 else ((part + 0.055) / 1.055) ** 2.4 for part in parts]
        return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]

    light, dark = sorted((luminance(first), luminance(second)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


def test_colours_stand_out_from_both_grounds() -> None:
    """4.5 : 1 against the ground of JupyterLab's light (#ffffff) and dark (#212121) theme."""
    light, dark = CSS.split('body[data-jp-theme-light="false"]')[:2]
    for block, ground in ((light, "#ffffff"), (dark[: dark.index("}")], "#212121")):
        colours = dict(re.findall(r"--ak-(right|left|alert): (#[0-9a-f]{6})", block))
        assert set(colours) == {"right", "left", "alert"}
        for name, colour in colours.items():
            assert _contrast(colour, ground) >= 4.5, (name, ground)


def test_scripts_and_style_ask_for_nothing_from_outside() -> None:
    for path in Path(look.STATIC).iterdir():
        text = path.read_text(encoding="utf-8")
        assert not re.search(r"https?://|//cdn|@import|\bimport\s|fetch\(|XMLHttpRequest|url\(", text), path.name
