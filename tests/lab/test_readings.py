from decimal import Decimal

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from server.lab.canonical import canonical
from server.lab.readings import Beside, check_reading
from server.lab.refusal import Unacceptable
from server.lab.rig import Rig, Span
from server.lab.slots import Row
from server.metrology.decimal_text import decimals_of, read_typed_decimal

SCALES = Rig(
    balance_decimals=4, balance=Span("0", "220"), balance_table=None,
    burette_decimals=2, burette=Span("0", "25"), burette_table=None, thermometer_decimals=1,
)  # fmt: skip
MASS = Row(1, "mass", 1, "Standard, tared", "g", decimals=4, low="0", high="220")
BEFORE = Row(1, "container_and_standard", 1, "Container with standard", "g", decimals=4)
AFTER = Row(1, "container_less_standard", 1, "Container after", "g", decimals=4)
START = Row(1, "burette_start", 1, "Burette, start", "mL", decimals=2, low="0", high="25")
END = Row(1, "burette_end", 1, "Burette, end", "mL", decimals=2, low="0", high="25")
WARM = Row(
    0, "temperature", 1, "Temperature of the titrant", "Cel", decimals=1,
    low="0", high="40", usual_low="15", usual_high="30",
)  # fmt: skip


def check(row, text, *, values=None, unit=None, reason=None, rig=SCALES):
    check_reading(row, text, unit, Beside(values=values or {}, rig=rig, reason=reason))


def refusal(row, text, **more):
    with pytest.raises(Unacceptable) as refused:
        check(row, text, **more)
    return refused.value


# R082: what is typed stays as typed, and reads as the number that was meant

TYPED = st.from_regex(r"[0-9]{1,6}([.,][0-9]{1,8})?", fullmatch=True)


@settings(deadline=None, max_examples=60)
@given(TYPED)
def test_typed_number_round_trip_keeps_every_digit(text):
    number = read_typed_decimal(text, "reading")
    point = text.replace(",", ".")
    assert number == Decimal(point)
    assert decimals_of(text) == len(point.partition(".")[2])
    assert f"{number:f}" == str(Decimal(point))
    assert canonical({"text": text}) == f'{{"text":"{text}"}}'


@settings(deadline=None, max_examples=60)
@given(TYPED)
def test_typed_number_with_the_right_decimals_is_taken_and_with_one_less_refused(text):
    decimals = decimals_of(text)
    row = Row(0, "blank", 1, "Blank", "mL", decimals=decimals)
    check(row, text)
    wanted = Row(0, "blank", 1, "Blank", "mL", decimals=decimals + 1)
    assert "type all digits shown" in refusal(wanted, text).says


@settings(deadline=None, max_examples=60)
@given(st.text(max_size=12))
def test_typed_text_that_is_no_number_is_refused_never_crashes(text):
    row = Row(0, "blank", 1, "Blank", "mL", signed=True)
    try:
        check(row, text)
    except Unacceptable:
        return
    number = text.strip().replace(",", ".").replace("−", "-")
    assert Decimal(number).is_finite()
    assert number.isascii()


@pytest.mark.parametrize(
    "text",
    ["1.234,5", "1 234", "1e3", "18.6.0", "", " ", "١٨", "１８", "0x12", "--1", "NaN", "inf"],
)
def test_reading_odd_spelling_is_refused_by_the_row(text):
    assert refusal(END, text).field == "Burette, end"


# R083: decimals fit the instrument


def test_reading_with_fewer_decimals_asks_for_the_final_zeros():
    refused = refusal(END, "18.6")
    assert "type all digits shown, including final zeros; 2 decimals are read here" in refused.says
    assert refused.example == "18.60"


def test_reading_with_more_decimals_is_refused():
    assert "has more decimals than the instrument shows; it has 2" in refusal(END, "18.640").says


def test_reading_with_comma_counts_its_decimals():
    check(END, "18,64")


def test_reading_on_a_scale_without_decimals_is_a_whole_number():
    row = Row(0, "air_humidity", 1, "Air humidity", "%", decimals=0)
    check(row, "47")
    assert "it has no decimal" in refusal(row, "47.0").says


# spans


def test_reading_negative_is_refused_in_words():
    assert refusal(MASS, "-0.3888").says == "Standard, tared cannot be negative."
    assert refusal(MASS, "−0.3888").says == "Standard, tared cannot be negative."


def test_reading_beyond_the_scale_is_refused():
    assert refusal(END, "25.01").says == "25.01 mL is above 25 mL, where the scale ends."


def test_reading_outside_the_error_table_is_told_so():
    rig = Rig(4, None, Span("5", "100"), 2, Span("0", "25"), Span("1", "20"), 1)
    row = Row(1, "burette_end", 1, "Burette, end", "mL", decimals=2, low="1", high="20")
    assert (
        "above 20 mL, where the error table of the calibration ends"
        in refusal(row, "20.50", rig=rig).says
    )
    mass = Row(1, "mass", 1, "Standard, tared", "g", decimals=4, low="5", high="100")
    assert (
        "below 5 g, where the error table of the calibration ends"
        in refusal(mass, "4.9999", rig=rig).says
    )


def test_reading_unusual_asks_for_a_reason_and_takes_it():
    assert "is unusual (15 to 30 °C is expected)" in refusal(WARM, "31.0").says
    check(WARM, "31.0", reason="heating of the room is out of order")


def test_reading_impossible_is_refused_with_any_reason():
    assert "above 40 °C" in refusal(WARM, "41.0", reason="summer").says


# units


def test_reading_in_another_unit_is_refused_by_name():
    refused = refusal(MASS, "388.8000", unit="mg")
    assert refused.says == "Standard, tared is written in g, not in mg."
    assert refused.example == "g"


def test_words_with_a_unit_are_refused():
    row = Row(0, "remark", 1, "Remark", kind="text", required=False)
    assert "written in words" in refusal(row, "cloudy", unit="g").says


# neighbours


def test_mass_not_less_than_before_is_refused():
    values = {(1, "container_and_standard", 1): "60.5450"}
    says = refusal(AFTER, "60.5450", values=values).says
    assert "the mass of the standard would not be positive" in says
    check(AFTER, "60.1562", values=values)


def test_mass_not_more_than_after_is_refused():
    values = {(1, "container_less_standard", 1): "60,1562"}
    assert (
        "not more than the container after, 60.1562 g"
        in refusal(BEFORE, "60.0000", values=values).says
    )


def test_mass_of_another_replicate_does_not_matter():
    check(AFTER, "70.0000", values={(2, "container_and_standard", 1): "60.5450"})


def test_mass_of_zero_is_refused():
    assert refusal(MASS, "0.0000").says == "Standard, tared cannot be zero."


TABLE = Rig(4, Span("0", "220"), Span("0", "100"), 2, None, None, 1)
TARE = Row(1, "tare_load", 1, "Load before taring", "g", decimals=4, low="0", high="100")


def test_load_and_standard_beyond_the_table_are_refused_whichever_comes_last():
    row = Row(1, "mass", 1, "Standard, tared", "g", decimals=4, low="0", high="100")
    says = "Load and standard together are above 100 g"
    tare, mass = {(1, "tare_load", 1): "99.8000"}, {(1, "mass", 1): "0.3888"}
    assert says in refusal(row, "0.3888", values=tare, rig=TABLE).says
    assert says in refusal(TARE, "99.8000", values=mass, rig=TABLE).says
    check(TARE, "0.0000", values=mass, rig=TABLE)


def test_burette_end_below_start_offers_a_segment():
    values = {(1, "burette_start", 1): "5.00"}
    assert "Refilled? Add a segment, or type it again." in refusal(END, "3.10", values=values).says


def test_burette_start_above_end_is_refused():
    values = {(1, "burette_end", 1): "5.00"}
    assert "more than the end, 5.00 mL" in refusal(START, "5.01", values=values).says


def test_second_filling_needs_the_end_of_the_first():
    row = Row(1, "burette_start", 2, "Burette, start, filling 2", "mL", decimals=2)
    assert refusal(row, "0.00").says == "Write the end of filling 1 first."
    check(row, "0.00", values={(1, "burette_start", 1): "0.00", (1, "burette_end", 1): "24.90"})


def test_second_filling_is_compared_with_its_own_start():
    row = Row(1, "burette_end", 2, "Burette, end, filling 2", "mL", decimals=2)
    values = {(1, "burette_end", 1): "24.90", (1, "burette_start", 2): "0.50"}
    check(row, "3.10", values=values)
    assert "less than the start, 0.50 mL" in refusal(row, "0.10", values=values).says


# words and choices


@pytest.mark.parametrize("text", ["", "   ", "x" * 2001])
def test_words_empty_or_endless_are_refused(text):
    row = Row(0, "remark", 1, "Remark", kind="text", required=False)
    assert "takes 1 to 2000 characters" in refusal(row, text).says


def test_choice_not_offered_is_refused():
    row = Row(0, "indicator", 1, "Indicator used", kind="choice", choices=("phenolphthalein",))
    assert "pick one of phenolphthalein" in refusal(row, "beetroot").says


def test_exclusion_without_reason_is_refused_and_with_it_taken():
    row = Row(1, "excluded", 1, "Left out", kind="choice", choices=("spilled or lost",))
    refused = refusal(row, "spilled or lost")
    assert refused.field == "reason"
    check(row, "spilled or lost", reason="flask fell over")


def test_exclusion_undone_needs_a_reason_too():
    row = Row(1, "excluded", 1, "Left out", kind="choice", choices=("counts again",))
    assert "why this replicate counts again" in refusal(row, "counts again", reason="  ").says
