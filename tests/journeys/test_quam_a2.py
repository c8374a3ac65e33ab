"""QUAM A2 the whole way, and what happens to the bottle afterwards.

Published: EURACHEM/CITAC Guide CG 4, Quantifying Uncertainty in Analytical Measurement, third
edition (2012), example A2: c(NaOH) = 0.10214 mol/L, u = 0.00010 mol/L, U = 0.0002 mol/L (k = 2).
"""

import json

import pytest

from server.evaluation.from_sheet import HAND_IN_TRIALS
from server.lab.canonical import digest
from server.lab.refusal import NotAllowed, Unacceptable
from server.lab.signing import signature_holds
from server.procedures.bench import LetBeUsed, let_be_used
from server.procedures.hand_in import failing
from server.procedures.holds import HoldThing, ReleaseThing, hold_thing, release_thing
from server.procedures.lots import (
    ConfirmPull,
    ProposePull,
    UseUpBottle,
    confirm_pull,
    propose_pull,
    use_up_bottle,
)
from server.records.queries.list_certificates import certificate_by_number

QUAM_A2 = ("60.5450", "60.1562", "0.00", "18.64")
REPORTED = "0.10214 ± 0.00020 mol/L (k = 2.0)"
WHY = {"replicates": "the rest is kept for the plant", "burette_use": "one delivery was enough"}


def certified(quam, *replicates):
    """Take a sheet the whole way; QUAM's figures where no others are given."""
    sheet = quam.begin()
    quam.titrate(sheet, *(replicates or (QUAM_A2,)))
    quam.hand_in(sheet, **WHY)
    return quam.countersign(sheet, "replicates", "burette use")["certificate"]


def certificate(quam, number):
    return quam.transactions.read(lambda session: certificate_by_number(session, number))


def document(quam, number):
    return certificate(quam, number).document


def test_quam_a2_whole_way_is_certified_by_a_second_person(quam):
    quam.trials = HAND_IN_TRIALS
    sheet = quam.begin()
    quam.titrate(sheet, QUAM_A2)
    evaluated = quam.evaluate(sheet)
    concentration = evaluated.result["concentration"]
    # published to 5 decimals
    assert round(concentration["value"], 5) == 0.10214
    assert round(concentration["u"], 5) == 0.00010
    assert concentration["reported"] == REPORTED
    assert evaluated.result["monte_carlo"]["value"] == pytest.approx(0.10214, abs=1e-5)

    # nothing is public before a second person has signed (R010)
    before = quam.shelf()
    assert (before["state"], before["in_force"], before["concentration"]) == (
        "unproven",
        False,
        None,
    )
    assert "0.1021" not in json.dumps(before)

    # what fails asks for a reason, each by its name
    assert failing(evaluated.result["findings"]) == ["replicates", "burette use"]
    (use,) = [one for one in evaluated.result["findings"] if one["name"] == "burette use"]
    assert use["figure"] == pytest.approx(93.2)
    with pytest.raises(Unacceptable) as refused:
        quam.hand_in(sheet, replicates="one only")
    assert refused.value.field == "reasons.burette use"
    assert quam.hand_in(sheet, **WHY)["reported"] == REPORTED
    assert not quam.shelf()["in_force"]

    # nobody countersigns the own work; somebody else accepts by name what fails
    with pytest.raises(NotAllowed, match="You made up this lot; somebody else countersigns"):
        quam.countersign(sheet, "replicates", "burette use", who="analyst")
    with pytest.raises(Unacceptable, match="accept it by name"):
        quam.countersign(sheet, "replicates")
    assert not quam.shelf()["in_force"]
    assert quam.countersign(sheet, "replicates", "burette use")["reported"] == REPORTED

    # the number on the bottle
    shelf = quam.shelf()
    assert (shelf["state"], shelf["in_force"]) == ("in force", True)
    assert shelf["concentration"]["reported"] == REPORTED
    assert shelf["certificate"]["number"] == "TL-2026-0001"
    issued = document(quam, "TL-2026-0001")
    assert issued["result"]["concentration"]["reported"] == REPORTED
    assert [(one["printed_name"], one["meaning"]) for one in issued["signatures"]] == [
        ("Ida Mohnke", "measured"),
        ("Lene Tiedt", "countersigned"),
    ]
    facts = quam.facts(sheet)
    assert all(
        signature_holds(one, facts, facts.evaluation.snapshot_digest) for one in facts.signatures
    )

    # every act stands in the trail (R029)
    assert quam.acts() == [
        ("Runa Askvall", "set up the laboratory"),
        *[("Runa Askvall", "added a person")] * 3,
        *[
            ("Nils Obermark", "registered an instrument"),
            ("Nils Obermark", "recorded a calibration"),
        ]
        * 3,
        ("Nils Obermark", "received a standard lot"),
        ("Nils Obermark", "wrote a recipe"),
        ("Ida Mohnke", "made up a lot"),
        ("Ida Mohnke", "filled a bottle"),
        ("Ida Mohnke", "began a bench sheet"),
        *[("Ida Mohnke", "wrote entries")] * 2,
        ("Ida Mohnke", "handed in a bench sheet"),
        ("Lene Tiedt", "countersigned"),
        ("Lene Tiedt", "issued a certificate"),
    ]
    assert quam.chain().holds


def test_slip_corrected_before_hand_in_stays_readable_on_the_certificate(quam):
    # R002
    sheet = quam.begin()
    quam.titrate(sheet, (*QUAM_A2[:3], "18.46"))
    quam.correct(sheet, (1, "burette_end", "18.64"), "misread: digits swapped")
    quam.hand_in(sheet, **WHY)
    quam.countersign(sheet, "replicates", "burette use")
    issued = document(quam, "TL-2026-0001")
    assert issued["result"]["concentration"]["reported"] == REPORTED
    (correction,) = issued["corrections"]
    assert (correction["was"], correction["now"]) == ("18.46", "18.64")
    assert (correction["by"], correction["reason"]) == ("Ida Mohnke", "misread: digits swapped")
    assert ("Ida Mohnke", "corrected entries") in quam.acts()


def test_second_standardization_replaces_the_certificate_and_leaves_the_first_unchanged(quam):
    certified(quam)
    first = certificate(quam, "TL-2026-0001").row
    quam.clock.move(days=7)
    # a little weaker by now: 18.66 mL for the same mass
    number = certified(quam, (*QUAM_A2[:3], "18.66"))
    assert number == "TL-2026-0002"
    issued = document(quam, number)
    assert issued["replaces"] == "TL-2026-0001"
    (last,) = [one for one in issued["findings"] if one["name"] == "last certificate"]
    assert last["verdict"] == "holds"
    assert "TL-2026-0001" in last["says"]
    again = certificate(quam, "TL-2026-0001")
    assert again.replaced_by == "TL-2026-0002"
    assert again.row.document == first.document
    assert digest(again.row.document) == first.document_digest
    shelf = quam.shelf()
    assert shelf["certificate"]["number"] == "TL-2026-0002"
    assert shelf["concentration"]["reported"].startswith("0.10203 ")
    assert quam.chain().holds


def test_lot_that_moved_away_since_its_last_certificate_is_found(quam):
    certified(quam)
    quam.clock.move(days=7)
    sheet = quam.begin()
    quam.titrate(sheet, (*QUAM_A2[:3], "19.00"))
    assert "last certificate" in failing(quam.evaluate(sheet).result["findings"])


def test_held_lot_is_not_in_force_at_the_very_next_read(quam):
    certified(quam)
    assert quam.shelf()["in_force"]
    quam.act(hold_thing, HoldThing("lot", quam.lot, "cloudy since this morning"), "analyst")
    held = quam.shelf()
    assert (held["state"], held["in_force"], held["concentration"]) == ("held", False, None)
    with pytest.raises(NotAllowed, match="You held it"):
        quam.act(release_thing, ReleaseThing("lot", quam.lot, "it is clear"), "analyst")
    assert not quam.shelf()["in_force"]
    quam.act(release_thing, ReleaseThing("lot", quam.lot, "filtered and checked"), "keeper")
    assert quam.shelf()["in_force"]


def test_pulled_lot_and_empty_bottle_are_out_of_use_for_good(quam):
    certified(quam)
    quam.act(propose_pull, ProposePull(quam.lot, "made with the wrong water"), "keeper")
    assert quam.shelf()["in_force"]
    quam.act(confirm_pull, ConfirmPull(quam.lot), "second")
    assert (quam.shelf()["state"], quam.shelf()["concentration"]) == ("pulled", None)
    quam.act(use_up_bottle, UseUpBottle(quam.bottle), "analyst")
    assert quam.shelf()["state"] == "used up"


def test_bottle_lapses_at_the_end_of_the_local_day_to_the_second(quam):
    certified(quam)
    # measured on 4 May, valid 14 days; the day in Berlin ends at 22:00 UTC
    quam.clock.at = quam.clock.at.replace(month=5, day=15, hour=21, minute=59, second=59)
    assert quam.shelf()["state"] == "in force"
    quam.clock.move(seconds=1)
    assert (quam.shelf()["state"], quam.shelf()["in_force"]) == ("check due", True)
    quam.clock.move(days=3, seconds=-1)
    assert quam.shelf()["in_force"]
    quam.clock.move(seconds=1)
    lapsed = quam.shelf()
    assert (lapsed["state"], lapsed["in_force"], lapsed["concentration"]) == ("lapsed", False, None)


def test_burette_out_of_date_is_refused_and_a_keepers_word_is_printed(quam):
    # R005
    old = quam.add_instrument("burette", "Burette 0", "2026-05-03")
    with pytest.raises(Unacceptable, match="Burette 0 was good until 2026-05-03") as refused:
        quam.begin(burette_id=old)
    assert refused.value.field == "burette_id"
    reason = "delivered volume weighed this morning"
    sheet = quam.begin("keeper", burette_id=old, override_reason=reason)
    quam.titrate(sheet, QUAM_A2)
    (finding,) = [
        one for one in quam.evaluate(sheet).result["findings"] if one["name"] == "in date"
    ]
    assert finding["verdict"] == "look"
    quam.hand_in(sheet, **WHY)
    quam.countersign(sheet, "replicates", "burette use")
    issued = document(quam, "TL-2026-0001")
    assert (
        f"Used out of date by Nils Obermark's word: Burette 0. Reason: {reason}."
        in issued["statements"]
    )
    (root,) = [one for one in issued["traceability"] if one["kind"] == "burette"]
    assert (root["state"], root["override"]["by"]) == ("lapsed", "Nils Obermark")


def test_burette_that_lapses_during_the_work_stops_the_pen_until_a_keeper_lets_it(quam):
    quam.instruments["burette"] = quam.add_instrument("burette", "Burette 0", "2026-05-04")
    sheet = quam.begin()
    quam.clock.move(hours=14)
    with pytest.raises(Unacceptable, match="it has lapsed"):
        quam.titrate(sheet, QUAM_A2)
    quam.act(let_be_used, LetBeUsed(sheet, "burette", "weighed this morning"), "keeper")
    lines = zip(("burette_start", "burette_end"), QUAM_A2[2:], strict=True)
    masses = zip(("container_and_standard", "container_less_standard"), QUAM_A2[:2], strict=True)
    quam.write(sheet, *((1, slot, text) for slot, text in (*masses, *lines)))
    quam.hand_in(sheet, **WHY)
    number = quam.countersign(sheet, "replicates", "burette use")["certificate"]
    assert any("Burette 0" in line for line in document(quam, number)["statements"])
