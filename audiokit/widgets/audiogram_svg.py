"""An audiogram of one ear as SVG text, drawn from the cells as they were recorded.

Conventions: frequency on a logarithmic axis ascending to the right, hearing level downwards, one octave as long as
20 dB (NINDS common data element form, citing ASHA 1990). Unmasked air conduction: right ear circle, left ear cross; no
response: an arrow from the symbol, to the lower left for the right ear, to the lower right for the left ear
(21 NCAC 22I .0111). Right red, left blue, colour never the only cue; no line to or from a no response (both from
memory, unverified). Whether the test was masked is not in the files; the symbols say "unmasked" by convention only.
"""

import itertools
import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from html import escape

from audiokit.core.vocabulary import Response

PX_PER_DB = 2.4
PX_PER_OCTAVE = 20 * PX_PER_DB
_LEFT, _TOP, _RIGHT = 44.0, 58.0, 20.0
_LOWEST, _HIGHEST = -10, 120
_OCTAVES_HZ = (125, 250, 500, 1000, 2000, 4000, 8000, 16000)
_SHORT = {Response.DID_NOT_TEST: "DNT", Response.COULD_NOT_TEST: "CNT", Response.NOT_RECORDED: "–"}
_LONG = {
    Response.DID_NOT_TEST: "did not test",
    Response.COULD_NOT_TEST: "could not test",
    Response.NOT_RECORDED: "not recorded",
}
_INK = "fill:var(--jp-ui-font-color1,#222)"
_SOFT_INK = "fill:var(--jp-ui-font-color2,#555)"
_GRID = "stroke:var(--jp-border-color2,#ccc);stroke-width:1"
_GROUND = "var(--jp-layout-color1,#fff)"
_EAR_COLOUR = {"right": "var(--ak-right,#b3121f)", "left": "var(--ak-left,#00509d)"}


@dataclass(frozen=True)
class Cell:
    """One threshold cell: frequency in Hz, level in tenths of a dB HL (meaningless where there is none), its state."""

    hz: int
    tenths: int
    response: Response

    @property
    def drawn(self) -> bool:
        """Whether the cell has a level."""
        return self.response <= Response.NO_RESPONSE

    def said(self) -> str:
        """The cell in words, with its unit."""
        if self.response == Response.MEASURED:
            return f"{self.tenths / 10:g} dB HL"
        if self.response == Response.NO_RESPONSE:
            return f"no response at {self.tenths / 10:g} dB HL"
        return _LONG[self.response]

    def short(self) -> str:
        """The cell as a table shows it: 25, NR@90, DNT, CNT or –."""
        if self.drawn:
            level = f"{self.tenths / 10:g}".replace("-", "−")
            return level if self.response == Response.MEASURED else f"NR@{level}"
        return _SHORT[self.response]


@dataclass(frozen=True)
class Curve:
    """One test's cells of one ear. name : "current" or "baseline"; it decides line and size of the symbols."""

    name: str
    test_id: str
    tested_on: str
    cells: tuple[Cell, ...]


@dataclass(frozen=True)
class _Axes:
    first_hz: int
    last_hz: int
    lowest_db: int

    @classmethod
    def around(cls, cells: Iterable[Cell]) -> "_Axes":
        known = list(cells)
        low = min((cell.tenths for cell in known if cell.drawn), default=0)
        return cls(
            min([250, *(cell.hz for cell in known)]),
            max([8000, *(cell.hz for cell in known)]),
            min(_LOWEST, 10 * math.floor(low / 100)),
        )

    def x(self, hz: float) -> float:
        return round(_LEFT + 16 + PX_PER_OCTAVE * math.log2(hz / self.first_hz), 1)

    def y(self, db: float) -> float:
        return round(_TOP + PX_PER_DB * (db - self.lowest_db), 1)

    @property
    def right(self) -> float:
        return self.x(self.last_hz) + 16

    @property
    def bottom(self) -> float:
        return self.y(_HIGHEST)


def draw_audiogram(ear: str, curves: Sequence[Curve], marked_hz: Sequence[int] = ()) -> str:
    """The audiogram of one ear as a complete SVG element.

    curves    : the current test and, where there is one, its baseline; later ones are drawn on top
    marked_hz : the frequencies that the criterion takes its mean of, set in bold on the axis
    Each point is a focusable group that says ear, test, frequency, level and unit.
    """
    cells = [cell for curve in curves for cell in curve.cells]
    axes = _Axes.around(cells)
    absent, absent_height = _absent_letters(axes, curves)
    key_top = axes.bottom + 18 + absent_height
    key = _key(ear, curves, key_top, any(cell.response == Response.NO_RESPONSE for cell in cells))
    height = key_top + 17 * key.count('class="ak-key"') + 2
    width = axes.right + _RIGHT
    drawn = "".join(_curve(ear, curve, axes) for curve in curves)
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" class="ak-audiogram" viewBox="0 0 {width:g} {height:g}" '
        f'width="{width:g}" height="{height:g}" role="group" aria-label="{escape(summary(ear, curves))}" '
        f'style="font-family:var(--jp-ui-font-family,DejaVu Sans,sans-serif)">'
        f"{_frame(ear, axes, [cell.hz for cell in cells], marked_hz)}{absent}{drawn}{key}</svg>"
    )


def summary(ear: str, curves: Sequence[Curve]) -> str:
    """The picture in words: which tests, and each frequency's levels."""
    told = [
        f"{curve.name} test {curve.test_id} of {curve.tested_on}: "
        + ", ".join(f"{cell.hz} Hz {cell.said()}" for cell in curve.cells)
        for curve in curves
    ]
    return f"Audiogram, {ear} ear. " + (". ".join(told) or "No test to show") + "."


def _line(x1: float, y1: float, x2: float, y2: float, style: str) -> str:
    return f'<line x1="{x1:g}" y1="{y1:g}" x2="{x2:g}" y2="{y2:g}" style="{style}"/>'


def _text(x: float, y: float, content: str, style: str, anchor: str = "middle", size: float = 11) -> str:
    place = f'x="{x:g}" y="{y:g}" text-anchor="{anchor}" font-size="{size:g}"'
    return f'<text {place} style="{style}">{escape(content)}</text>'


def _frame(ear: str, axes: _Axes, tested_hz: Iterable[int], marked_hz: Sequence[int]) -> str:
    title = _text(_LEFT - 40, 14, f"{ear.capitalize()} ear", f"{_INK};font-weight:600", "start", 14)
    return f'<g aria-hidden="true">{title}{_frequencies(axes, tested_hz, marked_hz)}{_levels(axes)}</g>'


def _frequencies(axes: _Axes, tested_hz: Iterable[int], marked_hz: Sequence[int]) -> str:
    """Octaves on a row of their own; those between them below, where there is room for their names."""
    octaves = [hz for hz in _OCTAVES_HZ if axes.first_hz <= hz <= axes.last_hz]
    every = sorted({*octaves, *tested_hz})
    between = [hz for hz in every if hz not in octaves]
    rows = dict(zip(between, _stagger([axes.x(hz) for hz in between], 28), strict=True))
    parts = [_text(axes.right, 14, "Frequency, Hz", _SOFT_INK, "end")]
    for hz in every:
        x, dashes = axes.x(hz), ";stroke-dasharray:2 3" if hz in rows else ""
        parts.append(_line(x, _TOP, x, axes.bottom, _GRID + dashes))
        style = f"{_INK};font-weight:700" if hz in marked_hz else _SOFT_INK
        if rows.get(hz, 0) == 0:
            parts.append(_text(x, _TOP - (6 if hz in rows else 20), str(hz), style, size=10.5 if hz in rows else 11))
    return "".join(parts)


def _levels(axes: _Axes) -> str:
    parts = []
    for db in range(axes.lowest_db, _HIGHEST + 1, 10):
        style = "stroke:var(--jp-border-color1,#999);stroke-width:1" if db == 0 else _GRID
        parts.append(_line(_LEFT, axes.y(db), axes.right, axes.y(db), style))
        if db % 20 == 0:
            parts.append(_text(_LEFT - 6, axes.y(db) + 4, str(db).replace("-", "−"), _SOFT_INK, "end"))
    middle = (axes.y(axes.lowest_db) + axes.bottom) / 2
    place = f'transform="translate(11 {middle:g}) rotate(-90)" text-anchor="middle" font-size="11"'
    return "".join(parts) + f'<text {place} style="{_SOFT_INK}">Hearing level, dB HL</text>'


def _stagger(places: Sequence[float], gap: float) -> list[int]:
    """For texts at ascending places the first row in which each stands clear of the one before it."""
    rows: list[int] = []
    ends: list[float] = []
    for x in places:
        row = next((n for n, end in enumerate(ends) if x - end >= gap), len(ends))
        ends[row : row + 1] = [x]
        rows.append(row)
    return rows


def _stroke(ear: str, name: str) -> str:
    width = "2.2" if name == "current" else "1.6"
    return f"fill:none;stroke:{_EAR_COLOUR[ear]};stroke-width:{width}"


def _dots(name: str) -> str:
    return "" if name == "current" else ";stroke-dasharray:1.5 4;stroke-linecap:round"


def _symbol(ear: str, name: str, x: float, y: float) -> str:
    """Circle or cross. The baseline's is smaller, with a rim of ground around it, so that equal levels show both."""
    outline = _circle if ear == "right" else _cross
    if name == "current":
        return outline(x, y, 6.5 if ear == "right" else 7.5, _stroke(ear, name))
    rim = outline(x, y, 4 if ear == "right" else 4.5, f"fill:{_GROUND};stroke:{_GROUND};stroke-width:4.5")
    return rim + outline(x, y, 4 if ear == "right" else 3.2, _stroke(ear, name))


def _circle(x: float, y: float, size: float, style: str) -> str:
    return f'<circle cx="{x:g}" cy="{y:g}" r="{size:g}" style="{style}"/>'


def _cross(x: float, y: float, size: float, style: str) -> str:
    left, right, top, bottom = x - size, x + size, y - size, y + size
    return f'<path d="M{left:g} {top:g}L{right:g} {bottom:g}M{left:g} {bottom:g}L{right:g} {top:g}" style="{style}"/>'


def _arrow(ear: str, name: str, x: float, y: float) -> str:
    side = -1 if ear == "right" else 1
    start, end = 5.0, 17.0
    tip_x, tip_y = x + side * end, y + end
    head = f"M{tip_x - side * 6:g} {tip_y:g}L{tip_x:g} {tip_y:g}L{tip_x:g} {tip_y - 6:g}"
    return f'<path d="M{x + side * start:g} {y + start:g}L{tip_x:g} {tip_y:g}{head}" style="{_stroke(ear, name)}"/>'


def _curve(ear: str, curve: Curve, axes: _Axes) -> str:
    lines, points = [], []
    recorded = [cell for cell in curve.cells if cell.response != Response.NOT_RECORDED]
    for before, after in itertools.pairwise(recorded):
        if before.response == after.response == Response.MEASURED:
            ends = (axes.x(before.hz), axes.y(before.tenths / 10), axes.x(after.hz), axes.y(after.tenths / 10))
            lines.append(_line(*ends, _stroke(ear, curve.name) + _dots(curve.name)))
    for cell in curve.cells:
        if not cell.drawn:
            continue
        x, y = axes.x(cell.hz), axes.y(cell.tenths / 10)
        arrow = _arrow(ear, curve.name, x, y) if cell.response == Response.NO_RESPONSE else ""
        said = escape(f"{ear} ear, {curve.name} {curve.tested_on}, {cell.hz} Hz: {cell.said()}")
        points.append(
            f'<g class="ak-point" role="img" tabindex="-1" data-hz="{cell.hz}" aria-label="{said}">'
            f'<circle class="ak-target" cx="{x:g}" cy="{y:g}" r="10" fill="transparent"/>'
            f"{arrow}{_symbol(ear, curve.name, x, y)}</g>"
        )
    return f'<g class="ak-{curve.name}"><g aria-hidden="true">{"".join(lines)}</g>{"".join(points)}</g>'


def _absent_letters(axes: _Axes, curves: Sequence[Curve]) -> tuple[str, float]:
    """Under the axis: what stands in the current test's cells without a level; and the height that takes."""
    cells = [cell for curve in curves if curve.name == "current" for cell in curve.cells if not cell.drawn]
    rows = _stagger([axes.x(cell.hz) for cell in cells], 28)
    letters = (
        _text(axes.x(cell.hz), axes.bottom + 13 + 12 * row, cell.short(), _INK, size=10)
        for cell, row in zip(cells, rows, strict=True)
    )
    return "".join(letters), 12.0 * (max(rows, default=-1) + 1)


def _key(ear: str, curves: Sequence[Curve], y: float, with_arrow: bool) -> str:
    rows = []
    for curve in curves:
        line = _line(_LEFT, y, _LEFT + 34, y, _stroke(ear, curve.name) + _dots(curve.name))
        label = f"{curve.name} {curve.tested_on}"
        rows.append((line + _symbol(ear, curve.name, _LEFT + 17, y), label))
    if with_arrow:
        rows.append(
            (_arrow(ear, "current", _LEFT + 17 + (6 if ear == "right" else -6), y - 11), "no response at that level")
        )
    labels = [_text(_LEFT + 44, y + 4, label, _INK, "start") for _, label in rows]
    drawn = (
        f'<g class="ak-key" transform="translate(0 {17 * at})">{mark}{label}</g>'
        for at, ((mark, _), label) in enumerate(zip(rows, labels, strict=True))
    )
    return f'<g aria-hidden="true">{"".join(drawn)}</g>'
