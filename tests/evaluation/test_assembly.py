"""From a sheet's standing values to a bench record, and what is missing for it."""

import pytest

from server.evaluation.assembly import EntryValue, SheetMaterials, assemble

BURETTE = {"capacity": {"value": "25", "unit": "mL"}}
KHP = {"substance": "KHP", "mass_fraction": {"value": "0.9999", "u": "0.0002"}}
FULL = (
    (1, "container_and_standard", "60.5450"),
    (1, "container_less_standard", "60.1562"),
    (1, "burette_start", "0.00"),
    (1, "burette_end", "18.64"),
)


def materials(*entries, **changed):
    usual = {
        "titrant_substance": "NaOH", "nominal": "0.1", "burette": BURETTE, "standard": KHP,
        "balance": {"linearity": {"unit": "g", "u": "0.0001"}},
    }  # fmt: skip
    values = tuple(
        EntryValue(one[0], one[1], one[3] if len(one) > 3 else 1, one[2]) for one in entries
    )
    return SheetMaterials(**usual | changed, entries=values)


def missing(*entries, **changed):
    return [(one.replicate, one.slot) for one in assemble(materials(*entries, **changed)).missing]


def test_assembly_of_a_whole_replicate_gives_a_document():
    found = assemble(materials(*FULL))
    assert found.missing == ()
    assert found.document == found.draft
    assert found.document["replicates"] == [
        {
            "label": "1",
            "container_and_standard": "60.5450",
            "container_less_standard": "60.1562",
            "burette": [["0.00", "18.64"]],
        }
    ]
    assert found.document["balance"]["buoyancy"] is False


def test_assembly_keeps_digits_and_turns_only_the_comma():
    found = assemble(materials(*FULL[:3], (1, "burette_end", " 18,60 ")))
    assert found.document["replicates"][0]["burette"] == [["0.00", "18.60"]]


def test_assembly_of_nothing_misses_a_replicate():
    assert missing() == [(1, "")]
    assert assemble(materials()).document is None


@pytest.mark.parametrize("left", range(4))
def test_assembly_names_the_one_reading_that_is_missing(left):
    written = [one for i, one in enumerate(FULL) if i != left]
    assert missing(*written) == [(1, FULL[left][1])]


def test_assembly_of_a_second_filling_asks_for_its_end():
    entries = (*FULL, (1, "burette_start", "0.10", 2))
    assert missing(*entries) == [(1, "burette_end")]
    whole = assemble(materials(*entries, (1, "burette_end", "3.10", 2))).document
    assert whole["replicates"][0]["burette"] == [["0.00", "18.64"], ["0.10", "3.10"]]


def test_assembly_remarks_steps_and_exclusions_begin_no_replicate():
    entries = ((2, "remark", "x"), (3, "step:mixed", "done"), (4, "excluded", "spilled: x"))
    found = assemble(materials(*FULL, *entries))
    assert [one["label"] for one in found.document["replicates"]] == ["1"]


@pytest.mark.parametrize("count", range(1, 5))
def test_assembly_excluded_replicate_may_be_as_incomplete_as_it_is(count):
    half = [(2, slot, text) for _, slot, text in FULL[:count]]
    found = assemble(materials(*FULL, *half, (2, "excluded", "spilled or lost: fell over")))
    assert found.missing == ()
    out = found.document["replicates"][1]
    assert out["excluded"] == "spilled or lost: fell over"
    assert ("container_and_standard" in out) is (count >= 2)
    assert ("burette" in out) is (count == 4)


def test_assembly_excluded_replicate_with_a_load_only_drops_it():
    entries = ((1, "tare_load", "25.0"), (1, "excluded", "spilled or lost: x"))
    found = assemble(materials(*entries, weighing="tared"))
    assert found.document["replicates"] == [{"label": "1", "excluded": "spilled or lost: x"}]


def test_assembly_draft_keeps_half_a_weighing_of_a_replicate_that_counts():
    draft = assemble(materials(FULL[0])).draft
    assert draft["replicates"] == [{"label": "1", "container_and_standard": "60.5450"}]


def test_assembly_asks_for_air_blank_and_temperature_where_the_recipe_does():
    asked = missing(
        *FULL, buoyancy=True, blank_kind="reagent", thermometer={"reading": {"unit": "Cel"}}
    )
    assert asked == [
        (0, "temperature"), (0, "air_temperature"), (0, "air_pressure"), (0, "air_humidity"),
        (0, "blank"),
    ]  # fmt: skip


def test_assembly_names_the_paper_of_every_uncertain_quantity_once():
    own = {"delivery": {"unit": "mL", "u": "0.01", "id": "own"}, **BURETTE}
    roots = {"standard": "standard lot 7", "balance": "calibration 3", "burette": "calibration 4"}
    document = assemble(materials(*FULL, burette=own, roots=roots)).document
    assert document["standard"]["mass_fraction"]["id"] == "standard lot 7: mass fraction"
    assert document["balance"]["linearity"]["id"] == "calibration 3: linearity"
    assert document["burette"]["delivery"]["id"] == "own"
    assert "id" not in document["burette"]["capacity"]
