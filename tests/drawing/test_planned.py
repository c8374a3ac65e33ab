import re
from xml.etree import ElementTree as ET

import pytest

from server.drawing.planned import Expected, expected_uncertainty

POINTS = [Expected(n, 0.2 + 0.3 / n, chosen=n == 4) for n in range(3, 9)]
SVG = "{http://www.w3.org/2000/svg}"


def parts(text, name):
    return ET.fromstring(text).iter(f"{SVG}{name}")


def dots(text):
    return parts(text, "circle")


def test_expected_uncertainty_falls_from_left_to_right():
    drawn = list(dots(expected_uncertainty(POINTS)))
    assert len(drawn) == 6
    heights = [float(one.get("cy")) for one in drawn]
    assert heights == sorted(heights)
    assert heights[0] < heights[-1]


def test_expected_uncertainty_marks_the_number_planned():
    marked = [
        one for one in dots(expected_uncertainty(POINTS)) if one.get("class") == "chart-point"
    ]
    assert len(marked) == 1


def test_expected_uncertainty_draws_heights_from_zero():
    double = [Expected(3, 0.2, chosen=False), Expected(4, 0.1, chosen=True)]
    text = expected_uncertainty(double)
    stems = [one for one in parts(text, "line") if one.get("class") == "chart-reach"]
    high, low = (float(one.get("y1")) - float(one.get("y2")) for one in stems)
    assert high / low == pytest.approx(2.0, rel=1e-3)  # two decimals of a pixel


def test_expected_uncertainty_says_all_figures_and_the_wanted_one():
    text = expected_uncertainty(POINTS, wanted_percent=0.15)
    says = re.search(r'aria-label="([^"]*)"', text)[1]
    assert "3: 0.300 %" in says
    assert "7: 0.243 %" in says
    assert "Wanted: 0.15 %" in says
    assert "wanted 0.15 %" in text


def test_expected_uncertainty_of_nothing_is_said():
    assert "Nothing is planned yet." in expected_uncertainty([])
