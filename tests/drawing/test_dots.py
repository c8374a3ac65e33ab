"""Replicate dots: heights follow the values, what was left out stays in the picture."""

from xml.etree import ElementTree as ET

import pytest

from server.drawing.dots import Dot, replicate_dots

SVG = "{http://www.w3.org/2000/svg}"
DOTS = [Dot("1", 0.1021, False), Dot("2", 0.1022, False), Dot("3", 0.1025, True)]


def drawn(dots=DOTS, **changed):
    given = {"mean": 0.10215, "low": 0.1020, "high": 0.1023, "decimals": 5, "unit": "mol/L"}
    return ET.fromstring(replicate_dots(dots, **{**given, **changed}))


def heights(read):
    return [float(c.get("cy")) for c in read.iter(f"{SVG}circle")]


def test_dots_higher_value_stands_higher() -> None:
    first, second, third = heights(drawn())
    assert first > second > third


def test_dots_spacing_is_proportional_to_the_differences() -> None:
    first, second, third = heights(drawn())
    assert (second - third) / (first - second) == pytest.approx(3, rel=0.01)


def test_dots_mean_line_lies_between_its_neighbours() -> None:
    read = drawn()
    line = next(e for e in read.iter(f"{SVG}line") if e.get("class") == "chart-point-line")
    first, second, _ = heights(read)
    assert float(line.get("y1")) == pytest.approx((first + second) / 2, abs=0.02)


def test_dots_excluded_replicate_is_hollow_and_said() -> None:
    read = drawn()
    fills = [c.get("fill") for c in read.iter(f"{SVG}circle")]
    assert fills == ["currentColor", "currentColor", "none"]
    assert "3: 0.10250 (left out)" in read.get("aria-label")


def test_dots_without_interval_draw_no_band() -> None:
    read = drawn(DOTS[:1], low=None, high=None, mean=0.1021)
    assert list(read.iter(f"{SVG}rect")) == []
    assert "interval" not in read.get("aria-label")


def test_dots_print_the_asked_decimals() -> None:
    texts = [t.text for t in drawn(decimals=4).iter(f"{SVG}text")]
    assert "0.1021" in texts or "0.1022" in texts
    assert not [t for t in texts if t.startswith("0.") and len(t) != 6]


def test_dots_markup_in_a_label_is_text() -> None:
    read = drawn([Dot("<b>1</b>", 0.1, False)], mean=0.1)
    assert "<b>1</b>" in [t.text for t in read.iter(f"{SVG}text")]


def test_dots_none_yet_says_so() -> None:
    assert drawn([], low=None, high=None).get("aria-label") == "No replicate yet."
