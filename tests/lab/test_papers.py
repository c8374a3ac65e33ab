import pytest

from server.lab.papers import check_kind, read_calibration
from server.lab.refusal import Unacceptable
from server.lab.sheet_facts import INSTRUMENT_KINDS

BOUND_G = {"unit": "g", "half_width": "0.00015", "shape": "rectangular"}
BOUND_ML = {"unit": "mL", "half_width": "0.03", "shape": "triangular"}
LINEAR = {"linearity": BOUND_G}
CAPACITY = {"value": "20", "unit": "mL"}
NEGATIVE = {"value": "-20", "unit": "mL"}
STATED = {"capacity": CAPACITY, "delivery": BOUND_ML}
ERRORS = "document.error_table"
TABLE = [["0", "0.000"], ["10", "-0.003"], ["20", "0.001"]]


def refusal(kind, document):
    with pytest.raises(Unacceptable) as refused:
        read_calibration(kind, document)
    return refused.value


@pytest.mark.parametrize(
    ("kind", "document"),
    [
        ("balance", {"linearity": BOUND_G}),
        ("balance", LINEAR | {"error_table": TABLE, "error_u": {"unit": "g", "u": "0.00005"}}),
        ("burette", {"capacity": CAPACITY, "delivery": BOUND_ML, "glass_expansion": "9.9e-6"}),
        ("burette", {"capacity": CAPACITY, "error_table": TABLE}),
        ("thermometer", {"reading": {"unit": "Cel", "U": "0.2", "k": "2"}}),
        (
            "thermometer",
            {"reading": {"unit": "Cel", "u": "0.05"}, "error_table": [["-5", "0.1"], ["20", "0"]]},
        ),
        ("balance", LINEAR | {"minimum_g": "0.020"}),
        ("pipette", {"delivery": CAPACITY | {"U": "0.01", "k": "2"}, "glass_expansion": "9.9e-6"}),
        ("flask", {"volume": CAPACITY | {"u": "0.01"}}),
        ("probe", {"slope_percent": "98.6", "u_slope_percent": "0.3", "u_offset_mV": "0.5",
                   "offset_mV": "-4.2"}),
        (
            "room monitor",
            {
                "temperature": {"unit": "Cel", "u": "0.2"},
                "pressure": {"unit": "hPa", "u": "0.5"},
                "humidity": {"unit": "%", "u": "2"},
            },
        ),
    ],
)  # fmt: skip
def test_calibration_stated_well_is_kept_as_typed(kind, document):
    assert read_calibration(kind, document) == document


def test_calibration_empty_table_counts_as_none():
    read = read_calibration("balance", {"linearity": BOUND_G, "error_table": []})
    assert "error_table" not in read


@pytest.mark.parametrize(
    ("kind", "document", "field"),
    [
        ("balance", {}, "document.linearity"),
        ("balance", LINEAR | {"colour": "grey"}, "document.colour"),
        ("balance", {"linearity": BOUND_ML}, "document.linearity.unit"),
        ("balance", {"linearity": BOUND_G | {"value": "1"}}, "document.linearity"),
        ("balance", {"linearity": {"unit": "g"}}, "document.linearity"),
        ("balance", {"linearity": BOUND_G | {"half_width": "-1"}}, "document.linearity.half_width"),
        ("balance", LINEAR | {"error_table": [["0", "0"]]}, ERRORS),
        ("balance", LINEAR | {"error_table": ["00", "10"]}, ERRORS),
        ("balance", LINEAR | {"error_table": {}}, ERRORS),
        ("balance", LINEAR | {"error_table": 7}, ERRORS),
        ("balance", LINEAR | {"error_table": [["5", "0"], ["5", "0"]]}, ERRORS),
        ("balance", LINEAR | {"error_table": [["0", "0"], ["5,0", "0"]]}, f"{ERRORS}[1]"),
        ("balance", LINEAR | {"error_table": [["0", "0"], ["5", 0]]}, f"{ERRORS}[1]"),
        ("burette", {"delivery": BOUND_ML}, "document.capacity"),
        ("burette", {"capacity": CAPACITY}, "document.delivery"),
        ("burette", STATED | {"capacity": NEGATIVE}, "document.capacity.value"),
        ("burette", STATED | {"glass_expansion": []}, "document.glass_expansion"),
        ("burette", STATED | {"glass_expansion": "9.9"}, "document.glass_expansion"),
        ("thermometer", {}, "document.reading"),
        ("balance", LINEAR | {"minimum_g": "0"}, "document.minimum_g"),
        ("balance", LINEAR | {"minimum_g": 1}, "document.minimum_g"),
        ("pipette", {}, "document.delivery"),
        ("pipette", {"delivery": CAPACITY}, "document.delivery"),
        ("pipette", {"volume": CAPACITY | {"u": "0.01"}}, "document.volume"),
        ("flask", {"volume": BOUND_ML}, "document.volume.value"),
        ("flask", {"volume": NEGATIVE | {"u": "0.01"}}, "document.volume.value"),
        ("probe", {"offset_mV": "1"}, "document.slope_percent"),
        ("probe", {"slope_percent": "98"}, "document.offset_mV"),
        ("probe", {"slope_percent": "98", "offset_mV": "x"}, "document.offset_mV"),
        ("probe", {"slope_percent": "-1", "offset_mV": "1"}, "document.slope_percent"),
        ("room monitor", {"temperature": {"unit": "Cel", "u": "0.2"}}, "document.pressure"),
    ],
)  # fmt: skip
def test_calibration_odd_statement_is_refused_by_its_path(kind, document, field):
    assert refusal(kind, document).field == field


def test_kind_unknown_is_refused_with_the_known_ones():
    assert check_kind("burette") == "burette"
    with pytest.raises(Unacceptable) as refused:
        check_kind("stopwatch")
    assert refused.value.field == "kind"
    assert all(kind in refused.value.says for kind in INSTRUMENT_KINDS)
