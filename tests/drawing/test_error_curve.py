"""Curves of errors and charts of checks: where points and limits stand."""

import re
import xml.etree.ElementTree as ET

import pytest

from server.drawing.control_chart import CheckPoint, Limits, control_chart
from server.drawing.error_curve import CurveWords, ErrorPoint, decimals_for, error_curve

TOLD = CurveWords("Burette <i>1</i>", "mL")
POINTS = [ErrorPoint(10, 0.01, 0.004), ErrorPoint(5, 0.005, 0.004), ErrorPoint(20, -0.01, 0.004)]
SVG = "{http://www.w3.org/2000/svg}"


def drawn(text):
    return ET.fromstring(text)


def circles(root):
    return [(float(c.get("cx")), float(c.get("cy"))) for c in root.iter(f"{SVG}circle")]


def test_curve_goes_through_its_points_in_the_order_of_readings():
    root = drawn(error_curve(POINTS, told=TOLD, limit=0.03))
    places = circles(root)
    assert [x for x, _ in places] == sorted(x for x, _ in places)
    # +0.005 lies between 0.01 (higher up) and −0.01
    assert places[1][1] < places[0][1] < places[2][1]
    title = root.find(f"{SVG}title").text
    assert "5: +0.005 ± 0.004; 10: +0.01 ± 0.004; 20: -0.01 ± 0.004" in title
    assert "Permitted are ± 0.03 mL." in title
    assert "Burette <i>1</i>" in title


def test_limit_is_drawn_where_it_leaves_room_and_told_where_it_would_not():
    near = drawn(error_curve(POINTS, told=TOLD, limit=0.03))
    assert len([one for one in near.iter(f"{SVG}line") if one.get("class") == "chart-limit"]) == 2
    far = drawn(error_curve(POINTS, told=TOLD, limit=0.5))
    assert [one for one in far.iter(f"{SVG}line") if one.get("class") == "chart-limit"] == []
    assert any("far outside" in (one.text or "") for one in far.iter(f"{SVG}text"))


@pytest.mark.parametrize(("step", "decimals"), [(1.0, 0), (0.5, 1), (0.002, 3), (0.00025, 5)])
def test_scale_has_as_many_decimals_as_its_step(step, decimals):
    assert decimals_for(step) == decimals


def test_curve_without_points_and_without_uncertainty_is_drawn():
    assert "No point yet." in error_curve([], told=TOLD, limit=None)
    assert circles(drawn(error_curve([ErrorPoint(5, 0.0, 0.0)], told=TOLD, limit=None)))


LIMITS = Limits("100 g <W>", "g", 0.0002, 0.0003)
CHECKS = [
    CheckPoint("1 May 2026", 0.0001, "holds"),
    CheckPoint("2 May 2026", 0.00025, "look"),
    CheckPoint("3 May 2026", -0.0009, "fails"),
]


def test_chart_gives_each_verdict_a_shape_of_its_own():
    root = drawn(control_chart(CHECKS, LIMITS))
    kinds = [one.get("class") for one in root.iter() if one.get("class")]
    assert (kinds.count("chart-hollow"), kinds.count("chart-look"), kinds.count("chart-fails")) == (
        1, 1, 1,
    )  # fmt: skip
    assert kinds.count("chart-action") == kinds.count("chart-warning") == 2


def test_chart_holds_every_point_inside_and_says_what_failed():
    text = control_chart(CHECKS, LIMITS)
    title = drawn(text).find(f"{SVG}title").text
    assert "3 checks from 1 May 2026 to 3 May 2026" in title
    assert "Beyond the warning limit: 2 May 2026." in title
    assert "Failed: 3 May 2026." in title
    height = float(drawn(text).get("height"))
    ys = [float(y) for y in re.findall(r"M[\d.]+ ([\d.]+)l10 10", text)]
    assert ys
    assert all(0 < y < height for y in ys)


def test_chart_of_one_check_and_of_none_is_drawn():
    assert "one check, 1 May 2026" in control_chart(CHECKS[:1], LIMITS)
    assert "No check yet." in control_chart([], LIMITS)
