"""Refusals on pages name what stands on the page; over the API they name the field."""

from typing import Any

import pytest

from server.lab.refusal import NotAllowed, Unacceptable
from server.web.forms.field_words import in_words


@pytest.mark.parametrize(
    ("says", "shown"),
    [
        ("nominal: “x” is not a decimal number.", "Nominal volume: “x” is not a decimal number."),
        ("air.pressure is missing.", "Air pressure is missing."),
        ("document.linearity is missing.", "Linearity of one reading is missing."),
        (
            "document.linearity.half_width: “0.0O2” is not a decimal number.",
            "Linearity of one reading, its bound: “0.0O2” is not a decimal number.",
        ),
        (
            "document.error_table[1]: “x” is not a decimal number.",
            "Correction, added to the reading, line 2: “x” is not a decimal number.",
        ),
        ("due_basis takes 1 to 80.", "The basis of the due date takes 1 to 80."),
        ("odd_field must be above zero.", "Odd field must be above zero."),
        ("It fails: systematic error.", "It fails: systematic error."),
        ("The due day lies before it.", "The due day lies before it."),
        ("Weighing 3, water: 99 must be below 40.", "Weighing 3, water: 99 must be below 40."),
    ],
)
def test_sentence_begins_as_the_page_calls_the_field(says: str, shown: str) -> None:
    assert in_words(Unacceptable(says, field="f")).says == shown


def test_refusal_keeps_its_kind_field_and_what_both_sides_need() -> None:
    told = in_words(NotAllowed("due_on is past.", field="due_on", example="2027", shown={"a": 1}))
    assert (type(told), told.field, told.example, told.shown) == (
        NotAllowed, "due_on", "2027", {"a": 1},
    )  # fmt: skip
    assert in_words(Unacceptable("Say it.", field="f", example='{"value": "1"}')).example is None


def test_page_names_its_label_and_the_api_its_field(web: Any) -> None:
    keeper = web.client("jonas")
    listed = keeper.get("/api/instruments").json()["instruments"]
    balance = next(one["id"] for one in listed if one["kind"] == "balance")
    papers = {
        "certificate_number": "C-9", "issuer": "house", "done_on": "2026-05-04",
        "due_on": "2027-05-04", "due_basis": "yearly",
    }  # fmt: skip
    bound = {
        "linearity_unit": "g", "linearity_statement": "half_width", "linearity_bound": "0.0O2",
        "linearity_shape": "rectangular",
    }  # fmt: skip
    page = keeper.form(f"/instruments/{balance}/calibrations/new", **papers, **bound)
    assert page.status_code == 422
    assert "Linearity of one reading, its bound: “0.0O2” is not" in page.text
    assert "document." not in page.text
    linearity = {"unit": "g", "half_width": "0.0O2", "shape": "rectangular"}
    body = {**papers, "document": {"linearity": linearity}}
    api = keeper.post(f"/api/instruments/{balance}/calibrations", body)
    assert (api.status_code, api.json()["field"]) == (422, "document.linearity.half_width")
