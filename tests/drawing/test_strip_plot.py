"""Strips: places follow the values, each method has a shape of its own, the words say it all."""

from xml.etree import ElementTree as ET

import pytest

from server.drawing.strip_plot import Middle, Strip, shape, shape_name, strip_plot

SVG = "{http://www.w3.org/2000/svg}"
FIT = Strip("model fit", (0.1000, 0.1001, 0.1002), 0.1001, (0.0999, 0.1003), chosen=True)
OTHER = Strip("<first> derivative", (0.1004, 0.1006), 0.1005, (0.0990, 0.1020))
MIDDLE = Middle(0.1001, "mean of model fit", 0.1)


def drawn(strips=(FIT, OTHER), middle=MIDDLE):
    return ET.fromstring(strip_plot(strips, middle, decimals=5, unit="mol/L"))


def starts(read, look):
    """Where the shapes of a look begin, after the one beside the name."""
    paths = [e.get("d") for e in read.iter(f"{SVG}path") if e.get("class") == look]
    return [
        tuple(map(float, one[1:].split("m")[0].split("a")[0].split()))
        for one in paths
        if "m" in one
    ]


def test_strips_values_stand_in_their_order_and_at_their_distances() -> None:
    first, second, third = [x for x, _ in starts(drawn(), "chart-point")][1:4]
    assert first < second < third
    assert second - first == pytest.approx(third - second, abs=0.02)


def test_strips_the_chosen_one_alone_has_the_colour_of_the_point() -> None:
    read = drawn()
    assert len(starts(read, "chart-point")) == 1 + 3
    other = [Strip(one.name, one.values, one.mean, one.interval) for one in (FIT, OTHER)]
    assert starts(drawn(other), "chart-point") == []


def test_strips_shapes_differ_from_strip_to_strip_and_not_by_colour_alone() -> None:
    shapes = [shape(place) for place in range(9)]
    assert len({one.partition("<path")[2] for one in shapes}) == 9
    assert len({shape_name(place) for place in range(9)}) == 9
    assert shape_name(9) == shape_name(0)


def test_strips_values_that_are_alike_do_not_hide_each_other() -> None:
    same = Strip("a", (0.1, 0.1, 0.1), 0.1, (0.1, 0.1), chosen=True)
    found = starts(drawn([same]), "chart-point")[1:]
    assert len({y for _, y in found}) == 3


def test_strips_margin_is_as_wide_as_it_is() -> None:
    read = drawn()
    band = next(read.iter(f"{SVG}rect"))
    first, _, third = [x for x, _ in starts(read, "chart-point")][1:4]
    # 0.1 % either way of 0.1001, against 0.0002 between the outer values
    per_unit = (third - first) / 0.0002
    assert float(band.get("width")) == pytest.approx(2 * 0.0001001 * per_unit, rel=1e-3)


def test_strips_interval_that_leaves_the_picture_ends_in_arrows_at_its_edges() -> None:
    paths = [e.get("d") for e in drawn().iter(f"{SVG}path")]
    heads = [one for one in paths if one.count("L") == 2 and "m" not in one and "z" not in one]
    assert len(heads) == 2
    bar = [one for one in paths if one.startswith("M14.00") and "H406.00" in one]
    assert len(bar) == 1


def test_strips_method_far_beyond_is_an_arrow_with_its_distance() -> None:
    far = Strip("gran acid side", (0.1031, 0.1033), 0.1032, (0.102, 0.104))
    read = drawn([FIT, far])
    texts = [e.text for e in read.iter(f"{SVG}text")]
    assert "+3.10 %" in texts
    # the near one keeps its room
    first, _, third = [x for x, _ in starts(read, "chart-point")][1:4]
    assert third - first > 100


def test_strips_are_said_in_words_with_shape_mean_interval_and_margin() -> None:
    says = drawn().get("aria-label")
    assert "model fit (filled circle): 3 values, mean 0.10010" in says
    assert "95 % interval 0.09990 to 0.10030" in says
    assert "<first> derivative (hollow square): 2 values" in says
    assert says.endswith("Seen against mean of model fit 0.10010, margin ± 0.1 %.")


def test_strips_single_value_has_no_interval() -> None:
    one = Strip("a", (0.1,), 0.1, None, chosen=True)
    says = drawn([one]).get("aria-label")
    assert "1 value, mean 0.10000" in says
    assert "interval" not in says
