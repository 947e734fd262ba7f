"""One look for every panel: the stylesheet, the words for codes, and the small pieces of HTML they are shown in."""

import re
from collections.abc import Iterable, Mapping, Sequence
from html import escape
from pathlib import Path

import anywidget

STATIC = Path(__file__).parent / "static"

_TAG = re.compile(r"<[^>]*>")
_SHORT = 18

MET_WORDS = {"yes": "● met", "no": "○ not met", "unknown": "? cannot tell"}
"""Symbol and word for the three answers, so that none depends on colour."""

SIGNS = {"exact": "", "at_least": "≥\u202f", "at_most": "≤\u202f"}
"""What stands before a value that a no response leaves open on one side."""


class LookWidget(anywidget.AnyWidget):
    """A widget with a script of its own that brings the panels' stylesheet with it."""

    _esm: Path | str = "export default { render() {} }"
    _css = STATIC / "look.css"


def words(code: str) -> str:
    """A code as words: retest_open reads "retest open"."""
    return code.replace("_", " ")


def text(value: object) -> str:
    """Any text as HTML; ids and names of every script keep their own direction."""
    return f"<bdi>{escape(str(value))}</bdi>"


def decibels(value: float | None, bound: str = "exact") -> str:
    """A value in dB as the files write it, with its sign where it is open on one side."""
    if value is None or value != value or bound == "none":
        return "not computable"
    return f"{SIGNS[bound]}{value:.4f}".rstrip("0").rstrip(".").replace("-", "−") + "\u202fdB"


def count(number: int) -> str:
    """A whole number with thin spaces between thousands."""
    return f"{number:,}".replace(",", "\u202f")


def table(
    caption: str, columns: Sequence[tuple[str, str]], rows: Iterable[Sequence[str]], empty: str = "none", kind: str = ""
) -> str:
    """A plain table as HTML.

    columns : heading and alignment ("left", "right", "middle") of each; the first column heads its row
    rows : cells as HTML
    """
    head = "".join(f'<th scope="col" class="ak-{side}">{escape(label)}</th>' for label, side in columns)
    sides = [side for _, side in columns]
    body = "".join(f"<tr>{_cells(row, sides)}</tr>" for row in rows)
    if not body:
        body = f'<tr><td colspan="{len(columns)}" class="ak-empty">{escape(empty)}</td></tr>'
    return (
        f'<table class="ak-table {kind}"><caption>{escape(caption)}</caption>'
        f"<thead><tr>{head}</tr></thead><tbody>{body}</tbody></table>"
    )


def _cells(row: Sequence[str], sides: Sequence[str]) -> str:
    first = f'<th scope="row" class="ak-{sides[0]}{_short(row[0])}">{row[0]}</th>'
    rest = (f'<td class="ak-{side}{_short(cell)}">{cell}</td>' for cell, side in zip(row[1:], sides[1:], strict=True))
    return first + "".join(rest)


def _short(cell: str) -> str:
    """Short texts are not broken over lines."""
    return " ak-short" if len(_TAG.sub("", cell)) <= _SHORT else ""


def status(message: str, mend: str = "", kind: str = "note") -> str:
    """The line that says what happened; read out by screen readers. kind : "note", "busy" or "error"."""
    mark = {"note": "", "busy": "… ", "error": "✕ "}[kind]
    told = f"{mark}{text(message)}" + (f'<br><span class="ak-mend">What to do: {text(mend)}</span>' if mend else "")
    return f'<p role="status" aria-live="polite" class="ak-status ak-{kind}">{told}</p>'


def tiles(figures: Iterable[tuple[str, str, str]]) -> str:
    """Headline figures: what it is, the figure, and a line of detail for each."""
    cards = "".join(
        f'<li class="ak-tile">{escape(name)} <b>{escape(figure)}</b> <span>{escape(detail)}</span></li>'
        for name, figure, detail in figures
    )
    return f'<ul class="ak-tiles">{cards}</ul>'


def facts(pairs: Mapping[str, str]) -> str:
    """Name and value pairs on one line that wraps."""
    return (
        '<p class="ak-facts">'
        + " · ".join(f"{escape(words(name))} <b>{text(value)}</b>" for name, value in pairs.items())
        + "</p>"
    )


def heading(title: str, level: int = 3) -> str:
    """A heading of a part of the panel."""
    return f'<h{level} class="ak-heading">{escape(title)}</h{level}>'
