"""What is written on a sheet makes the bench record that a person would have written by hand."""

from uuid import uuid4

import pytest

from server.evaluation.entrance import evaluate
from server.evaluation.from_sheet import limits_of, prepare_sheet
from server.procedures.entries import NewEntry
from server.procedures.instruments import (
    RecordCalibration,
    RegisterInstrument,
    record_calibration,
    register_instrument,
)
from server.procedures.laboratory import ChangeSettings, change_settings
from server.procedures.stores import (
    ReceiveStandardLot,
    WriteRecipe,
    receive_standard_lot,
    write_recipe,
)

LINEARITY = {"unit": "g", "half_width": "0.00015", "shape": "rectangular"}
LOADS = [["0", "0.0000"], ["20", "0.0001"], ["50", "0.0003"], ["200", "-0.0002"]]
ERROR_U = {"unit": "g", "u": "0.00005"}
GLASS = "9.9e-6"
CAPACITY = {"value": "25", "unit": "mL"}
DELIVERY = {"unit": "mL", "half_width": "0.015", "shape": "triangular"}
READINGS = [["0", "0.000"], ["10", "0.006"], ["25", "-0.005"]]
WARMTH = {"unit": "Cel", "U": "0.2", "k": "2"}
ROOM = {
    "temperature": {"unit": "Cel", "U": "0.4", "k": "2"},
    "pressure": {"unit": "hPa", "U": "1.0", "k": "2"},
    "humidity": {"unit": "%", "half_width": "3", "shape": "rectangular"},
}
FRACTION = {"value": "0.99978", "U": "0.00044", "k": "2"}
RECIPE = {
    "title": "Hydrochloric acid 0.1 mol/L against TRIS",
    "titrant": {"substance": "NaOH", "nominal": "0.1"},
    "standard": "KHP",
    "weighing": "tared",
    "replicates": 3,
    "end_point": {"mode": "visual", "indicator": "phenolphthalein"},
    "blank": "indicator",
    "buoyancy": True,
    "temperature": "each",
    "limits": {"spread_percent": "0.15"},
}
ENTRIES = [
    (0, "indicator", "phenolphthalein", 1),
    (0, "air_temperature", "21,3", 1),
    (0, "air_pressure", "1008.6", 1),
    (0, "air_humidity", "47", 1),
    (0, "blank", "0.02", 1),
    (1, "tare_load", "25.1013", 1),
    (1, "mass", "0.4084", 1),
    (1, "burette_start", "0.00", 1),
    (1, "burette_end", "20,01", 1),
    (1, "temperature", "20.9", 1),
    (2, "tare_load", "24.9870", 1),
    (2, "mass", "0.4102", 1),
    (2, "burette_start", "0.10", 1),
    (2, "burette_end", "15.10", 1),
    (2, "burette_start", "0.05", 2),
    (2, "burette_end", "5.14", 2),
    (2, "temperature", "21.0", 1),
    (3, "tare_load", "25.0001", 1),
    (3, "mass", "0.4066", 1),
    (3, "burette_start", "0.00", 1),
    (3, "burette_end", "20.93", 1),
    (3, "temperature", "21.1", 1),
]


def add_instrument(lab, kind, document, **identity):
    register = RegisterInstrument(kind, f"New {kind}", "Holm", "x", "1", "Room", **identity)
    key = lab.act(register_instrument, register, "keeper")
    calibration = RecordCalibration(
        key, "C-1", "house", "2026-01-12", "2026-12-31", "plan", document
    )
    return key, lab.act(record_calibration, calibration, "keeper")


@pytest.fixture
def written(sqlite_lab):
    """A sheet that uses everything that a weighed recipe may ask for."""
    lab, calibrations = sqlite_lab, {}
    lab.balance, calibrations["balance"] = add_instrument(
        lab, "balance", {"linearity": LINEARITY, "error_table": LOADS, "error_u": ERROR_U},
        resolution="0.0001",
    )  # fmt: skip
    lab.burette, calibrations["burette"] = add_instrument(
        lab, "burette",
        {
            "capacity": CAPACITY, "delivery": DELIVERY, "error_table": READINGS,
            "glass_expansion": GLASS,
        },
        resolution="0.01",
    )  # fmt: skip
    lab.thermometer, calibrations["thermometer"] = add_instrument(
        lab, "thermometer", {"reading": WARMTH}, resolution="0.1"
    )
    room, calibrations["room"] = add_instrument(lab, "room monitor", ROOM)
    received = ReceiveStandardLot(
        "KHP lot 8", "KHP", "RM-8", "house", "2027-01-31", "expiry", FRACTION, basis="dried",
        density={"value": "1.636", "unit": "g/cm3"}, minimum_sample_g="0.1",
    )  # fmt: skip
    lab.standard_lot = lab.act(receive_standard_lot, received, "keeper")
    lab.recipe = lab.act(write_recipe, WriteRecipe("All of it", RECIPE), "keeper")
    lab.sheet = lab.begin(room_id=room)
    lab.write(
        *(
            NewEntry(str(uuid4()), replicate, slot, text, segment)
            for replicate, slot, text, segment in ENTRIES
        )
    )
    lab.write(
        NewEntry(str(uuid4()), 3, "excluded", "titrated past the end point", reason="deep pink")
    )
    return lab, calibrations


def by_hand(lab, calibrations):
    """Return the bench record of the sheet as a person would write it."""

    def root(stated, paper, quantity):
        name = calibrations.get(paper)
        owner = f"calibration {name}" if name else f"standard lot {lab.standard_lot}"
        return {**stated, "id": f"{owner}: {quantity}"}

    def air(key, value):
        return {"value": value, **root(ROOM[key], "room", key)}

    return {
        "format": "bench-record/1",
        "titrant": {
            "substance": "NaOH", "nominal": {"value": "0.1", "unit": "mol/L"}, "medium": "water",
        },
        "route": "weighed",
        "standard": {
            "substance": "KHP", "basis": "dried",
            "mass_fraction": root(FRACTION, "standard", "mass fraction"),
            "density": {"value": "1.636", "unit": "g/cm3"},
        },
        "balance": {
            "linearity": root(LINEARITY, "balance", "linearity"), "error_table": LOADS,
            "error_u": root(ERROR_U, "balance", "error u"), "buoyancy": True,
        },
        "air": {
            "temperature": air("temperature", "21.3"), "pressure": air("pressure", "1008.6"),
            "humidity": air("humidity", "47"),
        },
        "burette": {
            "capacity": CAPACITY, "delivery": root(DELIVERY, "burette", "delivery"),
            "error_table": READINGS, "glass_expansion": GLASS,
        },
        "temperature": {"value": "20.9", **root(WARMTH, "thermometer", "reading")},
        "blank": {
            "value": "0.02",
            "unit": "mL",
            "kind": "indicator",
            "half_width": "0.01",
            "shape": "triangular",
            "source": "one blank, two readings of the burette",
        },
        "replicates": [
            {"label": "1", "tare_load": "25.1013", "mass": "0.4084",
             "burette": [["0.00", "20.01"]], "temperature": "20.9"},
            {"label": "2", "tare_load": "24.9870", "mass": "0.4102",
             "burette": [["0.10", "15.10"], ["0.05", "5.14"]], "temperature": "21.0"},
            {"label": "3", "tare_load": "25.0001", "mass": "0.4066",
             "burette": [["0.00", "20.93"]], "temperature": "21.1",
             "excluded": "titrated past the end point: deep pink"},
        ],
    }  # fmt: skip


def test_sheet_makes_the_record_that_one_would_write_by_hand(written):
    lab, calibrations = written
    prepared = prepare_sheet(lab.facts())
    assert prepared.missing == ()
    assert prepared.document == by_hand(lab, calibrations)


def test_sheet_evaluates_like_the_record_written_by_hand(written):
    lab, calibrations = written
    of_sheet = lab.evaluate().result
    of_hand = evaluate(by_hand(lab, calibrations))
    for key in ("concentration", "factor", "replicates", "spread", "budget"):
        assert of_sheet[key] == of_hand[key]


def test_sheet_findings_know_papers_limits_and_what_was_not_dried(written):
    lab, _ = written
    findings = {one["name"]: one for one in lab.evaluate().result["findings"]}
    assert findings["in date"]["verdict"] == "holds"
    assert findings["drying"]["verdict"] == "fails"
    assert findings["spread"]["limit"] == 0.15
    assert findings["spread"]["basis"] == "set by the recipe"
    assert findings["replicates"]["verdict"] == "fails"


def test_input_digest_changes_with_ink_and_circumstances_only(written):
    lab, _ = written
    before = prepare_sheet(lab.facts())
    lab.write(NewEntry(str(uuid4()), 0, "remark", "nothing to add"))
    assert prepare_sheet(lab.facts()).input_digest == before.input_digest
    lab.correct((1, "mass", 1), "0.4085", "misread")
    after = prepare_sheet(lab.facts())
    assert after.input_digest != before.input_digest
    assert after.revision == before.revision + 2
    settings = ChangeSettings(
        "Test laboratory", "", "Europe/Berlin", 1, limits={"nominal_percent": "5"}
    )  # fmt: skip
    lab.act(change_settings, settings, "steward")
    assert prepare_sheet(lab.facts()).input_digest != after.input_digest


@pytest.mark.parametrize(
    ("replicate", "slot"), [(0, "air_pressure"), (0, "blank"), (2, "temperature")]
)
def test_row_struck_to_nothing_is_missing_by_its_slot(written, replicate, slot):
    lab, _ = written
    lab.correct((replicate, slot, 1), "", "not sure")
    assert [one.slot for one in prepare_sheet(lab.facts()).missing] == [slot]


def test_limits_of_the_recipe_go_before_those_of_the_laboratory():
    limits = limits_of(
        {"spread_percent": "0.25", "nominal_percent": "5"},
        {"spread_percent": "0.15", "replicates_least": "4"},
    )
    assert (limits.spread_percent, limits.nominal_percent, limits.replicates_least) == (
        0.15,
        5.0,
        4,
    )
    assert limits.basis("spread_percent") == "set by the recipe"
    assert limits.basis("nominal_percent") == "set by the laboratory"
    assert limits.basis("burette_most_percent").startswith("common practice")
