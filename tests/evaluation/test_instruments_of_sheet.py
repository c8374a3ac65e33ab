"""What the instruments of a sheet bring into its record and its findings."""

import pytest

from server.evaluation.assembly import EntryValue, SheetMaterials, assemble
from server.evaluation.circumstances import Circumstances, Interim, read_circumstances, to_document
from server.evaluation.entrance import evaluate

RECORD = {
    "format": "bench-record/1",
    "titrant": {"substance": "NaOH", "nominal": {"value": "0.1", "unit": "mol/L"}},
    "route": "weighed",
    "standard": {"substance": "KHP", "mass_fraction": {"value": "1.0", "u": "0.0003"}},
    "balance": {"linearity": {"unit": "g", "u": "0.0001"}, "buoyancy": False},
    "burette": {"capacity": {"value": "25", "unit": "mL"}},
    "repeatability": {"relative_u": "0.0005"},
    "replicates": [{"mass": "0.3888", "burette": [["0.00", "18.64"]]}],
}
TABLE = [["10", "0.00"], ["20", "0.30"], ["30", "-0.10"]]


def assembled(text, thermometer, replicate=0):
    entries = (
        EntryValue(replicate, "temperature", 1, text),
        EntryValue(1, "burette_start", 1, "0.00"), EntryValue(1, "burette_end", 1, "18.64"),
    )  # fmt: skip
    each = {"temperature_each": replicate > 0}
    burette = {"capacity": {"value": "25", "unit": "mL"}}
    materials = SheetMaterials("NaOH", "0.1", burette, entries, thermometer=thermometer, **each)
    return assemble(materials).draft


@pytest.mark.parametrize(
    ("typed", "corrected"),
    [("20", "20.3"), ("15.0", "15.15"), ("25.0", "25.1"), ("10", "10"), ("30,0", "29.9")],
)
def test_temperature_in_the_record_is_corrected_by_the_thermometers_table(typed, corrected):
    reading = {"unit": "Cel", "u": "0.05"}
    found = assembled(typed, {"reading": reading, "error_table": TABLE})["temperature"]
    assert found == {"value": corrected, "unit": "Cel", "u": "0.05"}


def test_temperature_of_each_replicate_is_corrected_as_well():
    thermometer = {"reading": {"unit": "Cel", "u": "0.05"}, "error_table": TABLE}
    draft = assembled("20.0", thermometer, replicate=1)
    assert draft["replicates"][0]["temperature"] == "20.3"
    assert draft["temperature"]["value"] == "20.3"


def test_temperature_without_a_table_stays_as_typed():
    found = assembled("20.00", {"reading": {"unit": "Cel", "u": "0.05"}})["temperature"]
    assert found["value"] == "20.00"


def finding(name, *interim):
    result = evaluate(RECORD, circumstances=Circumstances(interim=interim))
    return next((one for one in result["findings"] if one["name"] == name), None)


@pytest.mark.parametrize(
    ("on", "verdict", "wanted"),
    [
        ("2026-05-04", "holds", "holds"),
        ("2026-05-04", "look", "look"),
        ("2026-05-04", "fails", "fails"),
        ("2026-05-03", "holds", "look"),
        ("2026-05-03", "fails", "fails"),
        (None, None, "look"),
    ],
)
def test_check_between_calibrations_is_wanted_on_the_day_of_use(on, verdict, wanted):
    one = Interim("check weighing", "Balance B-1", "2026-05-04", on, verdict, "off by much.", "b")
    found = finding("check weighing", one)
    assert found["verdict"] == wanted
    assert "Balance B-1" in found["says"]
    assert "6.4.10" in found["basis"]
    assert finding("check weighing") is None


def test_circumstances_with_checks_are_read_back_from_a_snapshot():
    one = Interim("buffer check", "Probe E-1", "2026-05-04", "2026-05-04", "holds", "says", "b")
    whole = Circumstances(interim=(one,))
    assert read_circumstances(to_document(whole)) == whole
    older = to_document(whole)
    del older["interim"]
    assert read_circumstances(older).interim == ()
