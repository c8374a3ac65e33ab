from decimal import Decimal

import pytest

from server.metrology.decimal_text import (
    DecimalProblem,
    decimals_of,
    read_typed_decimal,
    read_wire_decimal,
)


@pytest.mark.parametrize(
    ("text", "value"), [("18.60", "18.60"), ("18,6", "18.6"), (" 20 ", "20"), ("−0.5", "-0.5")]
)
def test_typed_decimal_point_or_comma_is_read_digit_for_digit(text, value):
    assert str(read_typed_decimal(text, "burette end")) == value


@pytest.mark.parametrize(
    "text",
    ["", "1.2.3", "1,234.5", "1e3", "nan", "18. 6", "١٨", "1_000", "0x10", ".", "5.", "9" * 41],
)
def test_typed_decimal_odd_text_is_refused_by_field(text):
    with pytest.raises(DecimalProblem, match="burette end"):
        read_typed_decimal(text, "burette end")


def test_wire_decimal_exponent_is_read_and_comma_refused_in_words():
    assert read_wire_decimal("9.9e-6", "glass") == Decimal("0.0000099")
    with pytest.raises(DecimalProblem) as refused:
        read_wire_decimal("18,6", "mass")
    assert "decimal point, not a comma" in refused.value.says


@pytest.mark.parametrize("text", ["inf", "NaN", "1e999", "--1", "1e31"])
def test_wire_decimal_not_a_reading_is_refused(text):
    with pytest.raises(DecimalProblem):
        read_wire_decimal(text, "mass")


@pytest.mark.parametrize(("text", "count"), [("18.60", 2), ("18,6", 1), ("18", 0), ("9.9e-6", 1)])
def test_decimals_of_counts_what_was_typed(text, count):
    assert decimals_of(text) == count
