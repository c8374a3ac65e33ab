from dataclasses import replace
from datetime import UTC, datetime, timedelta

import pytest

from server.lab.canonical import canonical
from server.lab.certificate_document import (
    NOT_REVIEWED,
    Issue,
    build_certificate,
    corrections,
    measured_at,
)
from server.lab.in_use import things_in_use
from server.lab.sheet_facts import LaboratoryFact, LogFact, OverrideFact
from server.lab.validity import ValidUntil

ISSUE = Issue(
    "TL-2026-0002",
    datetime(2026, 5, 4, 12, tzinfo=UTC),
    "TL-2026-0001",
    ValidUntil(datetime(2026, 5, 18, 22, tzinfo=UTC), "interval of the recipe"),
)


@pytest.fixture
def whole(facts, entry):
    """A sheet with readings, a correction, and a replicate that is left out."""
    first = entry(1, "burette_end", "19.64", unit="mL")
    return facts(
        entries=(
            entry(1, "container_and_standard", "60.5450", unit="g"),
            entry(1, "container_less_standard", "60.1562", unit="g"),
            entry(1, "burette_start", "0.00", unit="mL"),
            first,
            entry(1, "burette_end", "18.64", unit="mL", strikes=first.id, reason="misread"),
            entry(2, "excluded", "spilled or lost", reason="flask fell over"),
        )
    )


@pytest.fixture
def issue_of(sheet_parts):
    """A maker of the certificate's document of a sheet."""

    def make(sheet, second=None):
        measured = sheet_parts["signature"](
            sheet_parts["writer"], "measured", reasons={"replicates": "the rest is used up"}
        )
        signature = sheet_parts["signature"](
            second or sheet_parts["second"], "countersigned", reasons=["replicates"]
        )
        return build_certificate(
            sheet, sheet_parts["evaluation"](), issue=ISSUE, in_use=things_in_use(sheet),
            measured=measured, countersigned=signature,
        )  # fmt: skip

    return make


def test_certificate_names_all_that_a_reader_needs(whole, issue_of):
    document = issue_of(whole)
    assert document["number"] == "TL-2026-0002"
    assert document["replaces"] == "TL-2026-0001"
    assert document["title"] == "Titrant standardization certificate (in-house)"
    assert document["lot"]["made_by"] == "Pavel Orrin"
    assert document["validity"]["last_day"] == "2026-05-18"
    assert document["valid_for"] == "visual, phenolphthalein"
    assert document["measured"]["by"] == ["Ida Mohnke"]
    assert [one["kind"] for one in document["traceability"]] == [
        "standard lot", "balance", "burette", "thermometer",
    ]  # fmt: skip
    assert canonical(document)


def test_certificate_signatures_show_name_time_zone_and_meaning(whole, issue_of):
    # R033 with R045: printed name, date and time with its zone, meaning
    signatures = issue_of(whole)["signatures"]
    shown = [(one["printed_name"], one["meaning"], one["zone"]) for one in signatures]
    assert shown == [
        ("Ida Mohnke", "measured", "Europe/Berlin"),
        ("Lene Tiedt", "countersigned", "Europe/Berlin"),
    ]
    assert all(datetime.fromisoformat(one["at"]).tzinfo for one in signatures)


def test_certificate_finding_that_fails_carries_reason_and_who_accepted_it(whole, issue_of):
    by_name = {one["name"]: one for one in issue_of(whole)["findings"]}
    assert by_name["replicates"]["reason"] == "the rest is used up"
    assert by_name["replicates"]["accepted_by"] == "Lene Tiedt"
    assert by_name["nominal"]["reason"] is by_name["nominal"]["accepted_by"] is None


def test_certificate_tells_what_was_corrected_and_left_out(whole, issue_of):
    document = issue_of(whole)
    (correction,) = document["corrections"]
    assert (correction["was"], correction["now"]) == ("19.64", "18.64")
    assert (correction["reason"], correction["by"]) == ("misread", "Ida Mohnke")
    assert correction["label"] == "Burette, end"
    (left_out,) = document["replicates_left_out"]
    assert (left_out["criterion"], left_out["reason"]) == ("spilled or lost", "flask fell over")
    texts = {one["slot"]: one["text"] for one in document["entries"] if one["replicate"] == 1}
    assert texts["burette_end"] == "18.64"


def test_certificate_without_a_second_person_says_so(whole, issue_of, sheet_parts):
    alone = LaboratoryFact("Laboratory", "1 Lane", "Europe/Berlin", {}, own_signature=True)
    document = issue_of(replace(whole, laboratory=alone), second=sheet_parts["writer"])
    assert document["independently_reviewed"] is False
    assert NOT_REVIEWED in document["statements"]
    assert issue_of(whole)["independently_reviewed"] is True


def test_certificate_prints_a_keepers_word_for_what_was_out_of_date(whole, issue_of, sheet_parts):
    keeper, now = sheet_parts["keeper"], sheet_parts["now"]
    burette = sheet_parts["instrument"]("burette", due_at=now - timedelta(days=1))
    instruments = (*(one for one in whole.instruments if one.kind != "burette"), burette)
    words = OverrideFact("burette", "checked by weighing water", keeper, now)
    document = issue_of(replace(whole, instruments=instruments, overrides=(words,)))
    root = next(one for one in document["traceability"] if one["kind"] == "burette")
    assert (root["state"], root["override"]["by"]) == ("lapsed", "Nils Obermark")
    printed = (
        "Used out of date by Nils Obermark's word: Burette 1. Reason: checked by weighing water."
    )
    assert printed in document["statements"]


def test_certificate_prints_a_keepers_word_for_a_balance_that_failed_its_check(
    whole, issue_of, sheet_parts
):
    keeper, now = sheet_parts["keeper"], sheet_parts["now"]
    limits = {"name": "100 g", "centre": "100.0000", "warning": "0.0002", "action": "0.0003"}
    before = now - timedelta(hours=1)
    log = (
        LogFact("l1", "check weight", limits, keeper, before - timedelta(days=1)),
        LogFact("l2", "check weighing", {"chart": "l1", "reading": "100.0009"}, keeper, before),
    )
    balance = sheet_parts["instrument"]("balance", log=log)
    instruments = (balance, *(one for one in whole.instruments if one.kind != "balance"))
    word = OverrideFact("balance", "the check weight was dropped", keeper, now)
    document = issue_of(replace(whole, instruments=instruments, overrides=(word,)))
    (printed,) = [one for one in document["statements"] if "word: Balance 1" in one]
    assert printed.startswith("Used after a failed check by Nils Obermark's word: Balance 1. ")
    assert "100 g: 100.0009 g is +0.0009" in printed
    assert printed.endswith("Reason: the check weight was dropped.")


def test_corrections_of_a_second_filling_name_their_row(facts, entry):
    first = entry(1, "burette_end", "3.10", segment=2)
    again = entry(1, "burette_end", "3.11", segment=2, strikes=first.id, reason="misread")
    (found,) = corrections(facts(entries=(first, again)))
    assert found["label"] == "Burette, end, filling 2"


def test_measured_at_is_the_last_reading_not_a_later_remark(whole, entry, sheet_parts):
    # a remark written weeks later must not lengthen what the certificate promises
    late = sheet_parts["now"] + timedelta(days=20)
    remark = entry(0, "remark", "seen again", received_at=late)
    out = entry(3, "excluded", "spilled or lost", reason="x", received_at=late)
    sheet = replace(whole, entries=(*whole.entries, remark, out))
    assert measured_at(sheet) == measured_at(whole) < late


def test_measured_at_without_readings_is_the_beginning(facts, sheet_parts):
    assert measured_at(facts()) == sheet_parts["now"]


def test_certificate_of_curves_says_by_which_way_each_end_point_was_taken(
    whole, issue_of, sheet_parts, recipe
):
    # R052: a number is good for the way to the end point that it was found by
    asked = {"mode": "potentiometric", "method": "model fit", "flask_volume_mL": "50"}
    document = recipe(blank="none", end_point=asked)
    by_probe = replace(whole, entries=(), recipe=replace(whole.recipe, document=document))
    ways = ("model fit", "first derivative", "steepest segment")
    found = [
        {"label": str(at), "taken": way, "excluded": "spilled" if at == 3 else None}
        for at, way in enumerate(ways, start=1)
    ]
    sheet_parts["evaluation"] = with_methods(sheet_parts["evaluation"], found)
    document = issue_of(by_probe)
    assert document["end_point"]["methods"] == [
        {"method": "model fit", "replicates": ["1"]},
        {"method": "first derivative", "replicates": ["2"]},
    ]
    assert document["valid_for"] == "potentiometric, model fit and first derivative"
    assert issue_of(whole)["valid_for"] == "visual, phenolphthalein"


def with_methods(evaluation, methods):
    """Return a maker of evaluations whose result has these curves."""

    def make():
        made = evaluation()
        return replace(made, result={**made.result, "methods": methods})

    return make
