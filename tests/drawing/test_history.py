"""Certificates over time: bars reach value ± U, the standing one differs by shape."""

from xml.etree import ElementTree as ET

import pytest

from server.drawing.history import HistoryPoint, certificate_history

SVG = "{http://www.w3.org/2000/svg}"
POINTS = [
    HistoryPoint("28 Sep", 30.0, 0.1023, 0.0002, False),
    HistoryPoint("1 Sep", 3.0, 0.1025, 0.0002, False),
    HistoryPoint("30 Oct", 62.0, 0.1021, 0.0001, True),
]


def drawn(points=POINTS):
    return ET.fromstring(certificate_history(points, unit="mol/L", decimals=4))


def test_history_stands_in_the_order_of_days() -> None:
    labels = [t.text for t in drawn().iter(f"{SVG}text") if t.get("class") == "chart-soft"]
    assert labels == ["mol/L", "1 Sep", "28 Sep", "30 Oct"]


def test_history_reach_is_twice_u_in_the_same_scale() -> None:
    reaches = []
    for path in drawn().iter(f"{SVG}path"):
        top, bottom = path.get("d").split("V")
        reaches.append(float(bottom.split("M")[0]) - float(top.split()[1]))
    assert reaches[0] / reaches[2] == pytest.approx(2, rel=0.01)


def test_history_only_the_standing_one_is_filled() -> None:
    kinds = [c.get("class") for c in drawn().iter(f"{SVG}circle")]
    assert kinds == ["chart-hollow", "chart-hollow", "chart-point"]
    assert "30 Oct: 0.1021 ± 0.0001 (standing)" in drawn().get("aria-label")


def test_history_crowded_days_name_the_newest_first() -> None:
    crowd = [HistoryPoint(f"c{n}", float(n), 0.1, 0.001, n == 29) for n in range(30)]
    labels = [t.text for t in drawn(crowd).iter(f"{SVG}text") if t.text.startswith("c")]
    assert "c29" in labels
    assert 1 < len(labels) < 8


def test_history_one_certificate_stands_in_the_middle() -> None:
    circle = next(drawn(POINTS[:1]).iter(f"{SVG}circle"))
    assert float(circle.get("cx")) == pytest.approx((84 + 536) / 2)


def test_history_none_says_so() -> None:
    assert drawn([]).get("aria-label") == "No certificate yet."
