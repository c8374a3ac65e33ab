import pytest

from server.lab import reading_documents as reading
from server.lab.refusal import Unacceptable


def refused_field(work, *arguments, **more):
    with pytest.raises(Unacceptable) as refused:
        work(*arguments, **more)
    return refused.value.field


def test_known_keys_unknown_one_is_named_with_its_path():
    assert refused_field(reading.known_keys, {"a": 1, "b": 2}, "top", ("a",)) == "top.b"
    assert refused_field(reading.known_keys, {"b": 2}, "", ("a",)) == "b"
    assert reading.known_keys({"a": 1}, "top", ("a",)) == {"a": 1}


def test_text_at_strips_and_defaults():
    assert reading.text_at({"a": " x "}, "a", "", example="y") == "x"
    assert reading.text_at({}, "a", "", example="y", default="z") == "z"
    assert reading.text_at({}, "a", "", example="y", default="") == ""


@pytest.mark.parametrize("value", [None, 7, "", "  ", "xxxx", "a\0", ["x"]])
def test_text_at_odd_value_is_refused(value):
    assert refused_field(reading.text_at, {"a": value}, "a", "top", example="y", most=3) == "top.a"


@pytest.mark.parametrize("value", [3, "3"])
def test_count_at_whole_number_is_read(value):
    assert reading.count_at({"a": value}, "a", "", low=1, high=9, default=2) == 3


@pytest.mark.parametrize("value", [0, 10, "٣", "3.0", 3.0, True, None, "9" * 5000])
def test_count_at_odd_value_is_refused(value):
    assert refused_field(reading.count_at, {"a": value}, "a", "", low=1, high=9, default=2) == "a"


def test_truth_at_takes_true_and_false_only():
    assert reading.truth_at({"a": False}, "a", "", default=True) is False
    assert refused_field(reading.truth_at, {"a": 0}, "a", "", default=True) == "a"


def test_quantity_at_returns_what_was_typed():
    typed = {"value": "18.60", "unit": "mL", "u": "0.010"}
    assert reading.quantity_at({"a": typed}, "a", "", unit="mL") == typed
    assert reading.quantity_at({}, "a", "", unit="mL") is None


def test_quantity_at_wrong_unit_is_refused_by_path():
    typed = {"value": "18.60", "unit": "L"}
    assert refused_field(reading.quantity_at, {"a": typed}, "a", "top", unit="mL") == "top.a.unit"


@pytest.mark.parametrize("value", ["0", "-1", "-1e-9"])
def test_positive_at_zero_or_below_is_refused(value):
    typed = {"a": {"value": value, "unit": "mL"}}
    assert refused_field(reading.positive_at, typed, "a", "", unit="mL") == "a.value"
