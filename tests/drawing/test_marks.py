"""Marks: a word and a shape for every state, and different shapes for different verdicts."""

import re
from xml.etree import ElementTree as ET

import pytest

from server.drawing.marks import mark

STATES = [
    "holds", "look", "fails", "open", "handed in", "sent back", "countersigned", "abandoned",
    "standing", "replaced", "pulled", "unproven", "in force", "check due", "lapsed", "held",
    "used up", "in date", "due soon",
]  # fmt: skip


def shape(name: str) -> list[str]:
    return re.findall(r' d="([^"]+)"', mark(name))


@pytest.mark.parametrize("name", STATES)
def test_mark_carries_its_word_and_a_shape(name) -> None:
    read = ET.fromstring(mark(name))
    assert read.get("role") == "img"
    assert read.get("aria-label") == name
    assert shape(name)
    assert "style" not in mark(name)


def test_mark_verdicts_differ_by_shape() -> None:
    assert len({tuple(shape(name)) for name in ("holds", "look", "fails")}) == 3


def test_mark_lot_states_differ_by_shape() -> None:
    lots = ("unproven", "in force", "check due", "lapsed", "held", "pulled", "used up")
    assert len({tuple(shape(name)) for name in lots}) == len(lots)


def test_mark_size_is_taken() -> None:
    assert ET.fromstring(mark("holds", size=22)).get("width") == "22"


def test_mark_unknown_word_gets_a_ring_and_is_escaped() -> None:
    assert ET.fromstring(mark("<x>")).get("aria-label") == "<x>"
    assert len(shape("<x>")) == 1
