"""The audiogram's drawing against the published conventions that the module names."""

import math
import re
from xml.etree import ElementTree

import pytest

from audiokit.core.vocabulary import FREQUENCIES_HZ, Response
from audiokit.widgets.audiogram_svg import Cell, Curve, draw_audiogram, summary
from audiokit.widgets.audiogram_view import AudiogramView

SVG = "{http://www.w3.org/2000/svg}"
HZ = (500, 1000, 2000, 3000, 4000, 6000, 8000)


def _curve(name: str, tenths: int, states: dict[int, Response] | None = None, hz: tuple[int, ...] = HZ) -> Curve:
    cells = tuple(Cell(f, tenths, (states or {}).get(f, Response.MEASURED)) for f in hz)
    return Curve(name, f"{name}-1", "2024-05-05", cells)


def _drawn(ear: str, *curves: Curve, marked: tuple[int, ...] = ()) -> ElementTree.Element:
    return ElementTree.fromstring(draw_audiogram(ear, curves, marked))


def _group(root: ElementTree.Element, name: str) -> ElementTree.Element:
    return next(group for group in root.iter(f"{SVG}g") if group.get("class") == f"ak-{name}")


def _points(root: ElementTree.Element, name: str) -> dict[int, ElementTree.Element]:
    groups = _group(root, name).iter(f"{SVG}g")
    return {int(g.get("data-hz", "0")): g for g in groups if g.get("class") == "ak-point"}


def _place(point: ElementTree.Element) -> tuple[float, float]:
    target = next(c for c in point.iter(f"{SVG}circle") if c.get("class") == "ak-target")
    return float(target.get("cx", "nan")), float(target.get("cy", "nan"))


def _texts(root: ElementTree.Element) -> dict[str, ElementTree.Element]:
    return {text.text or "": text for text in root.iter(f"{SVG}text")}


def test_one_octave_is_as_long_as_twenty_decibels() -> None:
    root = _drawn(
        "right",
        Curve(
            "current", "a", "b", tuple(Cell(f, 10 * at, Response.MEASURED) for at, f in enumerate((1000, 2000, 4000)))
        ),
    )
    low, middle, high = (_place(_points(root, "current")[hz]) for hz in (1000, 2000, 4000))
    octave = middle[0] - low[0]
    assert math.isclose(high[0] - middle[0], octave, abs_tol=0.11)
    one_db = middle[1] - low[1]
    assert math.isclose(20 * one_db, octave, abs_tol=0.11)


def test_levels_grow_downwards_and_frequencies_to_the_right() -> None:
    soft, loud = (_points(_drawn("right", _curve("current", level)), "current") for level in (0, 800))
    assert _place(soft[1000])[1] < _place(loud[1000])[1]
    assert [_place(soft[hz])[0] for hz in HZ] == sorted(_place(soft[hz])[0] for hz in HZ)


@pytest.mark.parametrize("name", ["current", "baseline"])
def test_right_is_a_circle_and_left_a_cross(name: str) -> None:
    for ear, circles, paths in (("right", 1, 0), ("left", 0, 1)):
        point = _points(_drawn(ear, _curve(name, 100)), name)[1000]
        drawn = [
            c for c in point.iter(f"{SVG}circle") if c.get("class") != "ak-target" and f"ak-{ear}" in c.get("style", "")
        ]
        crosses = [p for p in point.iter(f"{SVG}path") if f"ak-{ear}" in p.get("style", "")]
        assert (len(drawn), len(crosses)) == (circles, paths)


def test_current_and_baseline_differ_in_line_size_and_label() -> None:
    root = _drawn("right", _curve("current", 300), _curve("baseline", 100))
    dashes = {
        name: {"dasharray" in line.get("style", "") for line in _group(root, name).iter(f"{SVG}line")}
        for name in ("current", "baseline")
    }
    assert dashes == {"current": {False}, "baseline": {True}}
    assert {"current 2024-05-05", "baseline 2024-05-05"} <= set(_texts(root))
    sizes = {
        name: {c.get("r") for c in _points(root, name)[1000].iter(f"{SVG}circle") if c.get("class") != "ak-target"}
        for name in ("current", "baseline")
    }
    assert sizes["current"].isdisjoint(sizes["baseline"])


@pytest.mark.parametrize(("ear", "side"), [("right", -1), ("left", 1)])
def test_a_no_response_has_an_arrow_to_its_side_and_no_line(ear: str, side: int) -> None:
    root = _drawn(ear, _curve("current", 900, {4000: Response.NO_RESPONSE}))
    point = _points(root, "current")[4000]
    x, y = _place(point)
    arrow = next(
        p for p in point.iter(f"{SVG}path") if p.get("d", "").count("M") == 2 and p.get("d", "").count("L") == 3
    )
    ends = [float(number) for number in re.findall(r"-?[\d.]+", arrow.get("d", ""))]
    assert (ends[2] - x) * side > 0
    assert ends[3] > y
    lines = [
        (float(line.get("x1", "0")), float(line.get("x2", "0"))) for line in _group(root, "current").iter(f"{SVG}line")
    ]
    assert len(lines) == len(HZ) - 1 - 2
    assert all(x not in ends for ends in lines)
    assert "no response at that level" in _texts(root)


def test_without_a_no_response_there_is_no_arrow_in_the_key() -> None:
    assert "no response at that level" not in _texts(_drawn("right", _curve("current", 100)))


def test_cells_without_a_level_have_no_symbol_but_letters() -> None:
    states = {2000: Response.DID_NOT_TEST, 3000: Response.COULD_NOT_TEST, 4000: Response.NOT_RECORDED}
    root = _drawn("left", _curve("current", 100, states))
    assert set(_points(root, "current")) == set(HZ) - set(states)
    assert {"DNT", "CNT", "–"} <= set(_texts(root))


def test_a_line_passes_what_was_not_recorded_but_not_what_was_not_tested() -> None:
    def lines(state: Response) -> int:
        root = _drawn("right", _curve("current", 100, {3000: state}))
        return sum(1 for _ in _group(root, "current").iter(f"{SVG}line"))

    assert lines(Response.NOT_RECORDED) == lines(Response.COULD_NOT_TEST) + 1 == len(HZ) - 2


def test_every_point_says_itself_with_its_unit() -> None:
    root = _drawn("left", _curve("current", 255, {8000: Response.NO_RESPONSE}))
    points = _points(root, "current")
    assert points[1000].get("aria-label") == "left ear, current 2024-05-05, 1000 Hz: 25.5 dB HL"
    assert points[8000].get("aria-label") == "left ear, current 2024-05-05, 8000 Hz: no response at 25.5 dB HL"
    assert {point.get("tabindex") for point in points.values()} == {"-1"}


def test_the_picture_has_a_name_in_words() -> None:
    curve = _curve("current", 100, {3000: Response.DID_NOT_TEST})
    label = _drawn("right", curve).get("aria-label", "")
    assert label == summary("right", [curve])
    assert "current test current-1 of 2024-05-05" in label
    assert "1000 Hz 10 dB HL" in label
    assert "3000 Hz did not test" in label


def test_without_a_test_there_is_an_empty_chart_that_says_so() -> None:
    root = ElementTree.fromstring(AudiogramView("right").svg)
    assert "No test to show" in root.get("aria-label", "")


def test_names_of_every_script_and_markup_stay_text() -> None:
    curve = Curve("current", '<script>&"עברית', "2024-05-05", _curve("current", 100).cells)
    label = ElementTree.fromstring(draw_audiogram("right", [curve])).get("aria-label", "")
    assert '<script>&"עברית' in label


@pytest.mark.parametrize("hz", [HZ, FREQUENCIES_HZ, (750, 1500)])
def test_everything_lies_inside_and_no_label_lies_on_another(hz: tuple[int, ...]) -> None:
    """Width of a text: at most 0.64 of its size per character in DejaVu Sans, measured on digits and capitals."""
    states = dict.fromkeys(hz, Response.COULD_NOT_TEST)
    root = _drawn("right", _curve("current", 100, states, hz), marked=(2000,))
    _, _, width, height = (float(part) for part in root.get("viewBox", "").split())
    boxes = []
    for text in root.iter(f"{SVG}text"):
        if "transform" in text.attrib:
            continue
        size, long = float(text.get("font-size", "0")), 0.64 * float(text.get("font-size", "0")) * len(text.text or "")
        start = float(text.get("x", "0")) - {"middle": long / 2, "end": long, "start": 0}[text.get("text-anchor", "")]
        boxes.append(
            (start, start + long, float(text.get("y", "0")) - size * 0.75, float(text.get("y", "0")), text.text)
        )
    for left, right, top, bottom, content in boxes:
        assert left >= 0, content
        assert right <= width, content
        assert top >= 0, content
        assert bottom <= height, content
    in_key = {"current 2024-05-05"}
    for at, one in enumerate(boxes):
        for other in boxes[at + 1 :]:
            if one[4] not in in_key and other[4] not in in_key:
                apart = one[1] <= other[0] or other[1] <= one[0] or one[3] <= other[2] or other[3] <= one[2]
                assert apart, (one, other)


def test_levels_above_the_usual_top_are_still_on_the_chart() -> None:
    root = _drawn("right", _curve("current", -200))
    assert _place(_points(root, "current")[1000])[1] >= 50
