"""Curves on a bench sheet: from entries to record, running values, and what a page shows."""

import dataclasses

import pytest

from server.evaluation.from_sheet import evaluate_sheet, prepare_sheet
from server.evaluation.running import running
from server.evaluation.sheet_curves import curves_of_sheet
from server.lab.curve_entry import CurveDrop, CurveEntry, write_curve_entry

KHP = "khp-manual-burette"
ASKED = {
    "mode": "potentiometric",
    "method": "model fit",
    "flask_volume_mL": "50",
}


def curve_entry(curve_records, seed=1, **more):
    held = curve_records.replicate(KHP, seed=seed)["curve"]
    return CurveEntry("pH", tuple(held["volume_mL"]), tuple(held["pH"]), None, {}, **more)


@pytest.fixture
def written(curve_records, entry):
    """A maker of one replicate's entries: masses and a curve, the method where one is named."""

    def make(replicate, *, method=None, curve=None, mass=True):
        held = curve or curve_entry(curve_records, seed=replicate)
        found = [entry(replicate, "curve", held.words, raw=write_curve_entry(held))]
        if mass:
            less = f"{60 - curve_records.mass(KHP):.4f}"
            found.append(entry(replicate, "container_and_standard", "60.0000"))
            found.append(entry(replicate, "container_less_standard", less))
        if method is not None:
            found.append(entry(replicate, "end_point_method", method, reason="the fit bends"))
        return found

    return make


@pytest.fixture
def sheet(facts, recipe, entry):
    def make(*entries, end_point=ASKED, **changed):
        begun = facts()
        asked = dataclasses.replace(begun.recipe, document=recipe(end_point=end_point))
        first = (entry(0, "temperature", "25.0"), entry(0, "step:mixed", "done"))
        return dataclasses.replace(begun, recipe=asked, entries=(*first, *entries), **changed)

    return make


def test_curve_of_a_sheet_becomes_the_records_curve(sheet, written, curve_records):
    prepared = prepare_sheet(sheet(*written(1), *written(2), *written(3)))
    assert prepared.missing == ()
    document = prepared.document
    assert document["end_point"] == {
        "method": "model fit",
        "flask_volume": {"value": "50", "unit": "mL"},
    }
    assert document["replicates"][0] == {
        "label": "1",
        "container_and_standard": "60.0000",
        "container_less_standard": f"{60 - curve_records.mass(KHP):.4f}",
        "curve": curve_records.replicate(KHP, seed=1)["curve"],
    }


def test_sheet_with_curves_is_evaluated_with_its_snapshot(sheet, written, curve_records):
    held = curve_records.curves[KHP]
    done = evaluate_sheet(prepare_sheet(sheet(*written(1), *written(2), *written(3))), trials=1000)
    # at 25 Cel the volume at 20 Cel is smaller by the expansion of water, about 0.11 %
    expected = held["n_acid_mmol"] / held["equivalence_mL"] / (0.9970470 / 0.9982067)
    assert done.result["concentration"]["value"] == pytest.approx(expected, rel=6e-4)
    assert [one["taken"] for one in done.result["methods"]] == ["model fit"] * 3
    assert '"curves":[' in done.snapshot


def test_method_entry_goes_before_the_recipe(sheet, written):
    prepared = prepare_sheet(sheet(*written(1), *written(2, method="first derivative")))
    assert "method" not in prepared.document["replicates"][0]
    assert prepared.document["replicates"][1]["method"] == "first derivative"


def test_method_alone_does_not_begin_a_replicate(sheet, written, entry):
    prepared = prepare_sheet(sheet(*written(1), entry(2, "end_point_method", "model fit")))
    assert [one["label"] for one in prepared.draft["replicates"]] == ["1"]
    assert not [one for one in prepared.missing if one.replicate == 2]


def test_replicate_without_its_curve_misses_it_and_no_burette(sheet, entry):
    found = prepare_sheet(sheet(entry(1, "container_and_standard", "60.0000")))
    missing = [(one.replicate, one.slot) for one in found.missing if one.replicate == 1]
    assert missing == [(1, "container_less_standard"), (1, "curve")]


def test_drop_of_a_curve_enters_with_its_instrument_as_root(sheet, written, curve_records):
    drop = CurveDrop("0.0500", "0.0001", "Drop counter 2")
    held = curve_entry(curve_records, drop=drop)
    prepared = prepare_sheet(sheet(*written(1, curve=held)))
    assert prepared.draft["replicates"][0]["curve"]["drop"] == {
        "value": "0.0500",
        "unit": "mL",
        "u": "0.0001",
        "id": "Drop counter 2: volume of a drop",
    }


def test_running_values_are_there_for_each_curve(sheet, written):
    prepared = prepare_sheet(sheet(*written(1), *written(2), *written(3, mass=False)))
    found = running(prepared, wanted=3)
    assert found.replicates[0].value == pytest.approx(0.0957, rel=2e-3)
    assert found.replicates[2].value is None
    assert found.mean is not None
    assert found.to_go == 1


def test_curves_of_a_sheet_are_analysed_as_the_evaluation_does(sheet, written):
    held = sheet(*written(1), *written(2, method="first derivative"), *written(3))
    shown = curves_of_sheet(held)
    result = evaluate_sheet(prepare_sheet(held), trials=1000).result
    assert [one.replicate for one in shown] == [1, 2, 3]
    for one, row in zip(shown, result["methods"], strict=True):
        assert one.problem is None
        assert one.taken == row["taken"]
        assert one.recipe_method == "model fit"
        assert [answer.to_document() for answer in one.analysis.outcomes] == row["methods"]
    assert shown[0].changed is None
    assert shown[1].changed.reason == "the fit bends"
    assert shown[1].entry.slot == "curve"
    assert shown[1].curve.kind == "pH"


def test_curve_before_the_mass_is_weighed_still_has_its_derivatives(sheet, written):
    (found,) = curves_of_sheet(sheet(*written(1, mass=False)))
    answers = {one.method: one.to_document() for one in found.analysis.outcomes}
    assert answers["first derivative"]["volume_mL"] == pytest.approx(21.788, abs=0.035)
    assert "amount of standard" in answers["model fit"]["unable"]
    assert "The model fit has no answer" in found.problem


def test_curve_of_a_replicate_left_out_is_shown_as_well(sheet, written, entry):
    left_out = entry(1, "excluded", "spilled or lost", reason="seen on the floor")
    (found,) = curves_of_sheet(sheet(*written(1), left_out))
    assert found.analysis.proposed == "model fit"
    assert found.problem is None


def test_curve_that_jumps_nowhere_is_told_in_words(sheet, written, curve_records):
    held = curve_entry(curve_records)
    held = dataclasses.replace(held, reading=("7.00",) * len(held.volume_mL))
    (found,) = curves_of_sheet(sheet(*written(1, curve=held)))
    assert found.analysis is None
    assert "All readings are the same" in found.problem
    assert found.taken == "model fit"


def test_struck_curve_is_gone(sheet, written, entry):
    first = written(1)
    strike = entry(1, "curve", "", strikes=first[0].id, reason="wrong file")
    assert curves_of_sheet(sheet(*first, strike)) == ()
