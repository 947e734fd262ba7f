"""A shift's arithmetic as it stands in shifts.csv, line by line, with the cells it starts from in a table above it."""

from collections.abc import Mapping, Sequence
from html import escape
from typing import Any

import numpy as np

from audiokit.core.vocabulary import Bound, Response
from audiokit.measures.shifts import bound_of
from audiokit.measures.sums import MISSING, OPEN
from audiokit.rules.spec import Criterion
from audiokit.widgets.audiogram_svg import Cell
from audiokit.widgets.look import MET_WORDS, decibels, table, text

Row = Mapping[Any, Any]
"""One row of the shifts table by column."""

_STAND_IN = "\ue000"
_CAPTION = "dB HL and difference in dB, by frequency in Hz; the mean is of those in bold"
_FLAG = {Response.MEASURED: 0, Response.NO_RESPONSE: int(OPEN)}
_BOUND_SIGNS = {Bound.EXACT: "", Bound.AT_LEAST: "≥ ", Bound.AT_MOST: "≤ "}


def clauses(why: str, clause: str, baseline_id: str) -> list[str]:
    """The parts of a `why`, one per line and in order; nothing is left out.

    clause, baseline_id : the rule's clause that heads it and the test it names, either of which may hold a separator
    """
    held = why.replace(baseline_id, _STAND_IN) if baseline_id else why
    head, rest = (clause, held[len(clause) :].lstrip(": ")) if clause and held.startswith(clause) else ("", held)
    parts = [part for piece in rest.split("; ") for part in _before(piece, f" less baseline {_STAND_IN}")]
    return [part.replace(_STAND_IN, baseline_id) for part in ([head] if head else []) + parts]


def _before(piece: str, words: str) -> list[str]:
    at = piece.find(words)
    return [piece] if at < 0 else [piece[:at], piece[at + 1 :]]


def difference(current: Cell, baseline: Cell) -> str:
    """Current less baseline at one frequency in dB, with its sign where a no response leaves it open."""
    flags = [np.array([_FLAG.get(cell.response, int(MISSING))]) for cell in (current, baseline)]
    bound = Bound(int(bound_of(flags[0], flags[1])[0]))
    if bound == Bound.NONE:
        return "?"
    value = current.tenths - baseline.tenths
    sign = "+" if value > 0 else "−" if value < 0 else ""
    return f"{_BOUND_SIGNS[bound]}{sign}{abs(value) / 10:g}"


def cells_table(caption: str, current: Sequence[Cell], baseline: Sequence[Cell], marked_hz: Sequence[int]) -> str:
    """Levels of both tests and their differences, a column for each frequency; the criterion's own are in bold."""
    columns = [("", "left"), *((f"{cell.hz}", "right") for cell in current)]
    named = (("Current", [cell.short() for cell in current]), ("Baseline", [cell.short() for cell in baseline]))
    rows = [
        (name, *(_strong(text(short), cell.hz in marked_hz) for short, cell in zip(cells, current, strict=True)))
        for name, cells in named
        if cells
    ]
    if baseline:
        pairs = zip(current, baseline, strict=True)
        rows.append(("Difference", *(_strong(difference(now, then), now.hz in marked_hz) for now, then in pairs)))
    return table(caption, columns, rows, kind="ak-cells")


def _strong(cell: str, marked: bool) -> str:
    return f"<b>{cell}</b>" if marked else cell


def arithmetic_block(
    ear: str, criterion: Criterion, row: Row, current: Sequence[Cell], baseline: Sequence[Cell]
) -> str:
    """One ear's arithmetic for one criterion: verdict, cells, and every clause of `why` on a line of its own.

    row : the ear's row of the shifts table
    """
    met = str(row["met"])
    value = decibels(_number(row["value_db"]), str(row["bound"]))
    corrected = "corrected shift" if row["correction_db"] else "mean shift"
    lines = clauses(str(row["why"]), criterion.shift_at_least_db.at, str(row["baseline_test_id"]))
    base = str(row["baseline_test_id"])
    named = [text(line).replace(escape(base), text(base)) if line.startswith("less ") else text(line) for line in lines]
    listed = "".join(f"<li>{line}</li>" for line in named)
    return (
        f'<section class="ak-arithmetic" aria-label="{ear} ear, arithmetic">'
        f'<h4 class="ak-verdict ak-{met}">{ear.capitalize()} ear: <b>{MET_WORDS[met]}</b>'
        f" <span>{corrected} {value}, {text(criterion.id)}</span></h4>"
        f"{cells_table(_CAPTION, current, baseline, criterion.frequencies_hz.value)}"
        f'<ol class="ak-clauses">{listed}</ol></section>'
    )


def _number(value: object) -> float | None:
    return float(value) if isinstance(value, (int, float)) else None


def verdict_table(criteria: Mapping[str, Criterion], rows: Mapping[tuple[str, str], Row]) -> str:
    """Every criterion's answer for both ears of one test. rows : the shifts table's rows by criterion and ear"""
    body = [
        (
            f"{text(criterion.name)} <small>{text(name)}</small>",
            *(_verdict(rows.get((name, ear))) for ear in ("right", "left")),
        )
        for name, criterion in criteria.items()
    ]
    return table(
        "What each criterion says of this test",
        [("Criterion", "left"), ("Right ear", "left"), ("Left ear", "left")],
        body,
    )


def _verdict(row: Row | None) -> str:
    if row is None:
        return "not compared"
    met = str(row["met"])
    return f'<b class="ak-{met}">{MET_WORDS[met]}</b>, {decibels(_number(row["value_db"]), str(row["bound"]))}'
