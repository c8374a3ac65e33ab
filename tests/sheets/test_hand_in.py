"""The hand-in page: what is read here is what is signed."""

import json

import pytest

from server.lab.actor import Proof
from server.lab.refusal import NotAllowed
from server.procedures.hand_in import HandIn, evaluate_sheet, hand_in_sheet, prepare_hand_in
from server.records.tables.bench import Evaluation, Sheet
from server.sheets.hand_in import evaluate_hand_in, read_hand_in


def test_hand_in_shows_the_result_that_is_then_signed(own_demo) -> None:
    sheet_id, actor = own_demo.summary.sent_back_sheet_id, own_demo.people["imke"]
    page = evaluate_hand_in(own_demo.read(read_hand_in, sheet_id, who="imke"))
    assert page.problem is None
    prepared = own_demo.transactions.read(
        lambda s: prepare_hand_in(s, sheet_id, actor=actor, now=own_demo.now)
    )
    evaluated = evaluate_sheet(prepared)
    reasons = {one.name: "as before" for one in page.findings if one.verdict == "fails"}
    command = HandIn(sheet_id, page.sheet.revision, reasons)
    proof = Proof(actor.person_id, own_demo.now)
    signed = own_demo.write(
        lambda s: hand_in_sheet(s, command, evaluated, actor=actor, proof=proof, now=own_demo.now)
    )
    assert page.reported == signed["reported"]

    def kept(session):
        row = session.get_one(Evaluation, session.get_one(Sheet, sheet_id).evaluation_id)
        return json.loads(row.snapshot)["result"]["findings"]

    shown = [(one.name, one.verdict, one.says) for one in page.findings]
    findings = own_demo.transactions.read(kept)
    assert shown == [(one["name"], one["verdict"], one["says"]) for one in findings]


def test_hand_in_again_offers_the_reasons_given_before(demo) -> None:
    page = evaluate_hand_in(demo.read(read_hand_in, demo.summary.sent_back_sheet_id, who="imke"))
    (spread,) = [one for one in page.findings if one.name == "spread"]
    assert (spread.verdict, spread.reason) == ("fails", "replicate 3 lies low, no cause found")
    assert page.signer == "Imke Thorvald"
    assert page.factor == page.reported.split()[0].replace("0.1", "1.", 1)


def test_hand_in_with_a_row_missing_says_which(demo) -> None:
    page = evaluate_hand_in(demo.read(read_hand_in, demo.summary.open_sheet_id, who="bashir"))
    assert page.problem == "Replicate 3: the burette start is not written yet."
    assert (page.reported, page.findings, page.dots) == (None, (), "")


def test_hand_in_of_a_sheet_that_waits_says_so(demo) -> None:
    page = evaluate_hand_in(demo.read(read_hand_in, demo.summary.waiting_sheet_id, who="bashir"))
    assert page.problem == "This sheet is handed in."
    assert page.reported is None


def test_hand_in_by_a_countersigner_is_refused(demo) -> None:
    with pytest.raises(NotAllowed, match="analyst"):
        evaluate_hand_in(demo.read(read_hand_in, demo.summary.sent_back_sheet_id, who="ottilie"))
