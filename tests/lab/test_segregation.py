import pytest

from server.lab.segregation import (
    countersign_refusal,
    own_part,
    pull_refusal,
    release_refusal,
)
from server.lab.sheet_facts import LaboratoryFact, OverrideFact

STRANGER = "p-stranger"


def test_countersigning_by_somebody_else_is_allowed(facts, entry):
    assert countersign_refusal(facts(entries=(entry(1, "mass", "0.3888"),)), STRANGER) is None


def test_countersigning_by_the_maker_of_the_lot_is_refused(facts, sheet_parts):
    assert "made up this lot" in countersign_refusal(facts(), sheet_parts["maker"].id)


@pytest.mark.parametrize("changed", [{"person_id": STRANGER}, {"posted_by": STRANGER}])
def test_countersigning_by_who_wrote_or_posted_is_refused(facts, entry, changed):
    sheet = facts(entries=(entry(1, "mass", "0.3888", **changed),))
    assert "wrote on this sheet" in countersign_refusal(sheet, STRANGER)


def test_countersigning_by_who_only_struck_something_is_refused(facts, entry):
    strike = entry(1, "mass", "", strikes="e-0", reason="misread", person_id=STRANGER)
    assert countersign_refusal(facts(entries=(strike,)), STRANGER)


def test_countersigning_by_who_handed_in_is_refused(facts, sheet_parts):
    signature = sheet_parts["signature"](sheet_parts["second"], "measured")
    sheet = facts(signatures=(signature,))
    assert "handed in this sheet" in countersign_refusal(sheet, sheet_parts["second"].id)


def test_countersigning_by_who_let_something_be_used_is_refused(facts, sheet_parts):
    keeper = sheet_parts["keeper"]
    words = OverrideFact("burette", "checked", keeper, sheet_parts["now"])
    assert "out of date" in countersign_refusal(facts(overrides=(words,)), keeper.id)


def test_own_signature_setting_allows_it_but_the_own_part_stays_known(facts, sheet_parts):
    alone = LaboratoryFact("Laboratory", "1 Lane", "Europe/Berlin", {}, own_signature=True)
    sheet = facts(laboratory=alone)
    assert countersign_refusal(sheet, sheet_parts["maker"].id) is None
    assert own_part(sheet, sheet_parts["maker"].id)


def test_release_and_pull_by_the_same_person_are_refused():
    assert release_refusal("p-1", "p-1") == "You held it; somebody else releases."
    assert release_refusal("p-1", "p-2") is None
    assert pull_refusal("p-1", "p-1") == "You proposed the pull; somebody else confirms."
    assert pull_refusal("p-1", "p-2") is None
