"""Pictures of a titration curve: where points and marks stand, told without colour."""

import math
import re
import xml.etree.ElementTree as ET
from itertools import pairwise

import pytest

from server.drawing.titration.gran import GranDrawn, gran_picture
from server.drawing.titration.near import near_end_point, slopes_near, span
from server.drawing.titration.residuals import residuals_picture
from server.drawing.titration.told import Drawn, Marked, method_mark, shape, slope_words
from server.drawing.titration.whole import reading_at, whole_along, whole_curve

SVG = "{http://www.w3.org/2000/svg}"
METHODS = (
    "steepest segment",
    "first derivative",
    "second derivative",
    "gran acid side",
    "gran alkaline side",
    "model fit",
)
STEPS = [
    0.0,
    4.0,
    8.0,
    12.0,
    16.0,
    18.0,
    19.0,
    19.5,
    19.8,
    19.9,
    20.0,
    20.1,
    20.2,
    20.5,
    21,
    22,
    24,
]


def rising(V):
    return 8 + 3 * math.tanh(4 * (V - 20.0)) + 0.05 * V


def drawn(taken="model fit", falls=False, aside=(), off=0.004):
    y = [rising(V) for V in STEPS]
    return Drawn(
        kind="pH",
        V=tuple(STEPS),
        y=tuple(16 - one for one in y) if falls else tuple(y),
        aside=frozenset(aside),
        model=None,
        marks=tuple(
            Marked(name, 20.0 + off * (at - 2), 0.003, taken=name == taken)
            for at, name in enumerate(METHODS)
        ),
    )


def read(text):
    return ET.fromstring(text)


def texts(root):
    return ["".join(one.itertext()) for one in root.iter(f"{SVG}text")]


def of_class(root, name):
    return [one for one in root.iter() if name in (one.get("class") or "").split()]


def places_of(d):
    """Where the dots of a path of relative moves stand."""
    x = y = 0.0
    places = []
    for letter, dx, dy in re.findall(r"([Mm])(-?[\d.]+) ?(-?[\d.]+)h0", d):
        x, y = (float(dx), float(dy)) if letter == "M" else (x + float(dx), y + float(dy))
        places.append((x, y))
    return places


@pytest.mark.parametrize("falls", [False, True])
def test_whole_curve_names_every_method_with_its_volume(falls):
    root = read(whole_curve(drawn(falls=falls), says="A curve of 17 points."))
    assert root.get("aria-label") == "A curve of 17 points."
    words = texts(root)
    for at, name in enumerate(METHODS):
        assert f"{name} {20.0 + 0.004 * (at - 2):.3f}" in words


def test_names_stand_inside_the_picture_and_apart_from_each_other():
    root = read(whole_curve(drawn(), says="x"))
    places = [
        (float(one.get("x")), float(one.get("y")))
        for one in root.iter(f"{SVG}text")
        if "chart-halo" in one.get("class")
    ]
    assert len(places) == 6
    heights = sorted(y for _, y in places)
    assert min(b - a for a, b in pairwise(heights)) >= 15
    assert all(0 < y < 412 for y in heights)


def test_names_never_stand_over_the_points_of_the_curve():
    for falls in (False, True):
        root = read(whole_curve(drawn(falls=falls), says="x"))
        dots = places_of(of_class(root, "chart-dots")[0].get("d"))
        names = [one for one in root.iter(f"{SVG}text") if "chart-halo" in one.get("class")]
        for one in names:
            right, y = float(one.get("x")), float(one.get("y"))
            for x, at in dots:
                if right - 170 <= x <= right:
                    assert abs(at - y) > 8, (falls, one.text, x, at)


def test_one_mark_alone_carries_the_accent_and_every_shape_differs():
    root = read(whole_curve(drawn(taken="second derivative"), says="x"))
    assert len(of_class(root, "chart-taken")) == 1
    assert len(of_class(root, "chart-other")) == 5
    assert len({method_mark(name) for name in METHODS}) == 6


@pytest.mark.parametrize("name", METHODS)
def test_shape_stands_about_its_place(name):
    root = read(shape(name, 50, 30))
    if root.get("cx"):
        assert (root.get("cx"), root.get("cy")) == ("50", "30")
        return
    numbers = [float(one) for one in re.findall(r"[\d.]+", root.get("d"))]
    assert all(25 <= one <= 55 for one in numbers)


def test_points_that_count_little_are_crosses_and_no_dots():
    root = read(whole_curve(drawn(aside=(2, 5)), says="x"))
    assert of_class(root, "chart-dots")[0].get("d").count("h0") == len(STEPS) - 2
    assert of_class(root, "chart-aside")[0].get("d").count("l7 7") == 2


def test_dots_stand_where_the_readings_are_without_rounding_adding_up():
    told = drawn()
    along = whole_along(told)
    root = read(whole_curve(told, says="x"))
    places = places_of(of_class(root, "chart-dots")[0].get("d"))
    assert len(places) == len(told.V)
    for (x, _), V in zip(places, told.V, strict=True):
        assert x == pytest.approx(along.at(V), abs=0.051)


def test_many_points_that_cover_each_other_are_drawn_once():
    V = tuple(at / 100 for at in range(3000))
    many = Drawn("pH", V, tuple(5 + one / 10 for one in V), frozenset(), None, ())
    path = of_class(read(whole_curve(many, says="x")), "chart-dots")[0].get("d")
    assert 200 < path.count("h0") < 1000


def test_reading_at_a_volume_lies_between_the_neighbours():
    one = Drawn("pH", (0.0, 1.0, 1.0, 3.0), (4.0, 5.0, 6.0, 8.0), frozenset(), None, ())
    assert reading_at(one, 0.25) == pytest.approx(4.25)
    assert reading_at(one, 2.0) == pytest.approx(7.0)
    assert reading_at(one, 9.0) == pytest.approx(8.0)


def test_near_picture_has_a_lane_with_two_u_for_each_method_in_view():
    told = drawn()
    root = read(near_end_point(told))
    along = span(told)
    reaches = of_class(root, "chart-reach")
    assert len(reaches) == 6
    low, high = map(float, re.match(r"M([\d.]+) [\d.]+H([\d.]+)", reaches[0].get("d")).groups())
    assert low == pytest.approx(along.at(20.0 - 0.008 - 0.006), abs=0.01)
    assert high == pytest.approx(along.at(20.0 - 0.008 + 0.006), abs=0.01)
    assert "first derivative 19.996 ± 0.0060 mL" in root.get("aria-label")


def test_near_picture_shows_the_steps_of_the_jump_and_not_the_whole_curve():
    along = span(drawn())
    assert along.low < 19.8
    assert along.high > 20.2
    assert along.high - along.low < 4


def test_method_far_off_is_left_to_the_table_where_it_would_flatten_the_rest():
    told = drawn()
    far = Drawn(
        told.kind,
        told.V,
        told.y,
        told.aside,
        None,
        (*told.marks[1:], Marked("steepest segment", 12.0, 0.1)),
    )
    root = read(near_end_point(far))
    assert len(of_class(root, "chart-reach")) == 5
    assert "steepest segment" not in texts(root)


def test_slopes_are_as_wide_as_their_steps_and_tell_the_greatest():
    steps = tuple((a, b, (rising(b) - rising(a)) / (b - a)) for a, b in pairwise(STEPS))
    root = read(slopes_near(drawn(), steps))
    greatest = max(steps, key=lambda one: one[2])
    assert f"greatest {slope_words(greatest[2])} pH per mL" in root.get("aria-label")
    assert f"between {greatest[0]:.3f} and {greatest[1]:.3f} mL" in root.get("aria-label")
    outline = of_class(root, "chart-curve")[0].get("d")
    along = span(drawn())
    x1, x2 = (f"{along.at(one):.1f}" for one in greatest[:2])
    assert re.search(rf"[ML]{x1} [\d.]+H{x2}(?![\d.])", outline)


@pytest.mark.parametrize(
    ("slope", "words"), [(26.234, "26.2"), (7750.4, "7750"), (0.123456, "0.123"), (-3.0, "-3")]
)
def test_slope_has_three_digits_and_no_power_of_ten(slope, words):
    assert slope_words(slope) == words


def test_residuals_beyond_the_edge_stand_at_it_and_the_rest_counts():
    residuals = [0.5, -1.0, 40.0, 1.9, -2.5, *[0.1] * 12]
    root = read(residuals_picture(drawn(aside=(2,)), residuals))
    assert "15 of 16 within ± 2" in root.get("aria-label")
    assert "Crosses: 1 that count" in root.get("aria-label")
    cross = of_class(root, "chart-aside")[0].get("d")
    assert float(cross.split(" ")[1].partition("l")[0]) == pytest.approx(30 - 3.5)


def test_gran_line_leads_from_its_far_point_to_its_zero():
    line = GranDrawn("gran acid side", 20.0, (12.0, 14.0, 16.0), (1.0, 0.75, 0.5), 2.5, -0.125)
    root = read(gran_picture(drawn(), [line]))
    said = root.get("aria-label")
    assert "3 points from 12.00 to 16.00 mL, reaches zero at 20.000 mL" in said
    straight = of_class(root, "chart-curve")[0].get("d")
    x1, y1, x2, y2 = map(
        float, re.match(r"M([\d.]+) ([\d.]+)L([\d.]+) ([\d.]+)", straight).groups()
    )
    assert (x1 < x2, y1 < y2) == (True, True)
    assert y2 == pytest.approx(190.0)


def test_without_lines_gran_picture_says_so():
    assert "none could be drawn" in gran_picture(drawn(), [])


def test_marks_outside_the_points_do_not_break_the_pictures():
    told = drawn()
    outside = Drawn(
        told.kind, told.V, told.y, told.aside, None, (Marked("gran acid side", 40.0, 0.1),)
    )
    for text in (whole_curve(outside, says="x"), near_end_point(outside), slopes_near(outside, ())):
        read(text)
