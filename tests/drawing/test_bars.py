"""Budget bars: lengths in proportion, longest first, shared ones striped."""

from xml.etree import ElementTree as ET

import pytest

from server.drawing.bars import Bar, budget_bars

SVG = "{http://www.w3.org/2000/svg}"
# QUAM:2012 A2 names these sources; the shares here are made up for the picture.
BARS = [
    Bar("mass of KHP", 20.0, False),
    Bar("volume", 60.0, True),
    Bar("purity", 19.8, True),
    Bar("molar mass", 0.2, True),
]


def drawn(bars=BARS):
    return ET.fromstring(budget_bars(bars))


def test_bars_stand_longest_first() -> None:
    texts = [t.text for t in drawn().iter(f"{SVG}text") if "chart-words" in t.get("class")]
    assert texts == ["volume", "mass of KHP", "purity", "molar mass"]


def test_bars_lengths_are_in_proportion_to_the_longest() -> None:
    widths = [float(r.get("width")) for r in drawn().iter(f"{SVG}rect")]
    assert widths[1] / widths[0] == pytest.approx(20 / 60, abs=0.01)
    assert widths == sorted(widths, reverse=True)


def test_bars_shared_source_is_striped_and_explained() -> None:
    read = drawn()
    solid = [r for r in read.iter(f"{SVG}rect") if r.get("fill") == "currentColor"]
    assert len(solid) == 1
    assert any((t.text or "").startswith("Striped") for t in read.iter(f"{SVG}text"))
    assert "volume 60 % (shared by the replicates)" in read.get("aria-label")


def test_bars_nothing_shared_leaves_the_legend_out() -> None:
    texts = [t.text for t in drawn([Bar("volume", 100.0, False)]).iter(f"{SVG}text")]
    assert texts == ["volume", "100 %"]


def test_bars_small_share_is_not_printed_as_nought() -> None:
    assert "< 1 %" in [t.text for t in drawn().iter(f"{SVG}text")]


def test_bars_stripes_stay_inside_their_bar() -> None:
    for path in drawn().iter(f"{SVG}path"):
        for stroke in path.get("d").split("M")[1:]:
            ends = [float(p.split()[0]) for p in stroke.split("L")]
            assert 0 <= min(ends) <= max(ends) <= 420


@pytest.mark.parametrize("bars", [[], [Bar("volume", 0.0, False)]])
def test_bars_nothing_to_show_is_still_a_picture(bars) -> None:
    assert drawn(bars).get("role") == "img"


def test_bars_markup_in_a_label_is_text() -> None:
    assert "<i>x</i>" in [t.text for t in drawn([Bar("<i>x</i>", 1, True)]).iter(f"{SVG}text")]


def test_bars_long_label_takes_two_lines_and_never_meets_its_share() -> None:
    long = "indicator blank (one blank, two readings of the burette)"
    read = drawn([Bar(long, 74.0, True), Bar("volume", 18.0, True)])
    texts = [t for t in read.iter(f"{SVG}text") if "chart-words" in t.get("class")]
    first, second, volume = texts
    assert f"{first.text} {second.text}" == long
    # at 14 px a letter is 8 px wide at most: 42 of them leave room for the share
    assert len(first.text) <= 42
    rows = [float(r.get("y")) for r in read.iter(f"{SVG}rect")]
    assert float(second.get("y")) < rows[0] < float(volume.get("y")) < rows[1]
