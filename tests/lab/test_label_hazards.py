import json

import pytest

from server.lab.canonical import canonical
from server.lab.label_hazards import (
    PICTOGRAMS,
    SolutionHazards,
    check_hazards,
    hazards_of,
    kept_hazards,
)
from server.lab.label_print import LabelText, LabelValue, read_label_text
from server.lab.refusal import Unacceptable

LYE = SolutionHazards(
    "NaOH", "0.5", "water", ("GHS05",), "Danger", ("H314 burns",), "Maren Lind", "2026-05-04"
)
SETTINGS = {
    "label_hazards": [
        {
            "titrant": "NaOH",
            "nominal": "0.5",
            "medium": "water",
            "pictograms": ["GHS05"],
            "signal_word": "Danger",
            "statements": ["H314 burns"],
            "confirmed_by": "Maren Lind",
            "confirmed_on": "2026-05-04",
        }
    ]
}


@pytest.mark.parametrize("nominal", ["0.5", "0.50", "0.500"])
def test_hazards_are_those_of_the_same_solution_however_its_strength_is_written(nominal):
    assert hazards_of(SETTINGS, "NaOH", nominal, "water") == LYE


@pytest.mark.parametrize(
    ("titrant", "nominal", "medium"),
    [("NaOH", "0.1", "water"), ("KOH", "0.5", "water"), ("NaOH", "0.5", "ethanol")],
)
def test_hazards_of_another_solution_are_not_taken(titrant, nominal, medium):
    assert hazards_of(SETTINGS, titrant, nominal, medium) is None
    assert kept_hazards({}) == ()


def test_hazards_take_the_nine_pictograms_and_no_other():
    check_hazards(list(PICTOGRAMS), "Warning")
    assert len(PICTOGRAMS) == 9
    for pictograms, word, field in ((["GHS10"], "", "pictograms"), ([], "Beware", "signal_word")):
        with pytest.raises(Unacceptable) as refused:
            check_hazards(pictograms, word)
        assert refused.value.field == field


@pytest.mark.parametrize("hazards", [None, LYE])
@pytest.mark.parametrize("value", [None, LabelValue("0.1 mol/L", "TL-1", "2026-05-18")])
def test_label_comes_back_from_the_trail_as_it_was(hazards, value):
    label = LabelText(
        "CODE", "NaOH", "0.5", "lot", 2, "2026-05-01", "Lab", "1 Lane", "UTC", value, hazards, "wet"
    )
    assert read_label_text(json.loads(canonical(label.kept()))) == label
