import json
from concurrent.futures import ThreadPoolExecutor
from dataclasses import replace
from uuid import uuid4

import pytest
from sqlalchemy import func, select, text

from server.lab.canonical import digest
from server.lab.refusal import NotAllowed, NotSignedIn, Refusal, Stale, Unacceptable
from server.lab.signing import signature_holds
from server.procedures.bench import LetBeUsed, let_be_used
from server.procedures.countersign import Countersign, countersign_sheet
from server.procedures.entries import NewEntry
from server.procedures.holds import HoldThing, hold_thing
from server.procedures.laboratory import ChangeSettings, change_settings
from server.procedures.lots import (
    ConfirmPull,
    MakeUpLot,
    ProposePull,
    confirm_pull,
    make_up_lot,
    propose_pull,
)
from server.procedures.repeats import once
from server.procedures.send_back import SendBack, send_back_sheet
from server.records.queries.load_lots import lot_of_code, standing_certificate
from server.records.tables.bench import Certificate, Signature
from server.records.trail import head

SHEET = ((0, "step:mixed", "done"), (0, "indicator", "phenolphthalein"), (0, "temperature", "20.4"))
SLOTS = ("container_and_standard", "container_less_standard", "burette_start", "burette_end")
GOOD = (
    ("60.4084", "60.0000", "0.00", "20.00"),
    ("60.4102", "60.0000", "0.00", "20.08"),
    ("60.4066", "60.0000", "0.00", "19.91"),
)


def lines(count=3):
    found = list(SHEET)
    for number, readings in enumerate(GOOD[:count], start=1):
        found += [(number, slot, text) for slot, text in zip(SLOTS, readings, strict=True)]
    return found


def waiting(lab, count=3):
    """Write a sheet and hand it in."""
    lab.write_lines(lines(count))
    lab.hand_in()
    return lab


def refusal(lab, kind, who="countersigner", *, accepted=(), revision=None, proof=None):
    before = (lab.facts(), lab.acts())
    command = Countersign(
        lab.sheet, revision or before[0].revision, accepted, trail_seen=lab.last_act()
    )
    with pytest.raises(kind) as refused:
        lab.act(countersign_sheet, command, who, proof=proof or lab.proof(who))
    assert (lab.facts(), lab.acts()) == before
    assert certificates(lab) == 0
    return refused.value


def certificates(lab):
    asked = select(func.count()).select_from(Certificate)
    return lab.transactions.read(lambda session: session.scalar(asked))


def standing(lab):
    def work(session):
        return standing_certificate(session, lot_of_code(session, lab.lot).id)

    return lab.transactions.read(work)


# the act that certifies


def test_sheet_countersigned_is_certified_and_every_act_is_in_the_trail(lab):
    # R029
    answer = lab.certify()
    facts = lab.facts()
    assert facts.state == "countersigned"
    assert answer["certificate"] == "TL-2026-0001"
    assert answer["reported"].startswith("0.1000")
    assert answer["reported"].endswith("(k = 2.0)")
    assert [act for act in lab.acts() if act[2] in {"sheet", "certificate"}] == [
        ("Ida Mohnke", "began a bench sheet", "sheet"),
        ("Ida Mohnke", "wrote entries", "sheet"),
        ("Ida Mohnke", "handed in a bench sheet", "sheet"),
        ("Lene Tiedt", "countersigned", "sheet"),
        ("Lene Tiedt", "issued a certificate", "certificate"),
    ]
    assert lab.chain().holds


def test_certificate_is_anchored_to_the_trail_and_to_its_own_digest(lab):
    waiting(lab)
    anchor = lab.transactions.read(head)
    lab.countersign()
    row = standing(lab)
    assert (row.trail_seq, row.trail_hash) == anchor
    assert digest(row.document) == row.document_digest
    document = json.loads(row.document)
    assert document["number"] == row.number
    assert document["replaces"] is None


def test_both_signatures_are_bound_to_sheet_ink_and_evaluation(lab):
    # R033
    lab.certify()
    facts = lab.facts()
    snapshot = facts.evaluation.snapshot_digest
    assert [one.meaning for one in facts.signatures] == ["measured", "countersigned"]
    for one in facts.signatures:
        assert signature_holds(one, facts, snapshot)
        assert not signature_holds(one, replace(facts, id=str(uuid4())), snapshot)
        assert not signature_holds(one, facts, "0" * 64)
        assert not signature_holds(one, replace(facts, entries=facts.entries[1:]), snapshot)


def test_valid_until_is_the_end_of_the_local_day_after_the_interval(sqlite_lab):
    waiting(sqlite_lab)
    sqlite_lab.clock.move(days=2)
    sqlite_lab.countersign()
    # measured on 4 May, 14 days; the day ends at 22:00 UTC in summer
    assert standing(sqlite_lab).valid_until.isoformat() == "2026-05-18T22:00:00+00:00"


def test_valid_until_is_not_lengthened_by_a_late_remark(sqlite_lab):
    sqlite_lab.write_lines(lines())
    sqlite_lab.clock.move(days=5)
    sqlite_lab.write(NewEntry(str(uuid4()), 0, "remark", "looked at it again"))
    sqlite_lab.hand_in()
    sqlite_lab.countersign()
    assert standing(sqlite_lab).valid_until.isoformat() == "2026-05-18T22:00:00+00:00"


def test_valid_until_use_by_day_of_the_lot_rules(sqlite_lab):
    command = MakeUpLot("NaOH", "0.1", use_by="2026-05-07")
    sqlite_lab.lot = sqlite_lab.act(make_up_lot, command, "second analyst")
    sqlite_lab.sheet = sqlite_lab.begin()
    sqlite_lab.certify()
    row = standing(sqlite_lab)
    assert row.valid_until.isoformat() == "2026-05-07T22:00:00+00:00"
    assert json.loads(row.document)["validity"]["rule"] == "use-by day of the lot"


# who may not: R058


@pytest.mark.parametrize("part", ["made up the lot", "wrote", "corrected", "let be used"])
def test_countersigning_ones_own_work_is_refused(sqlite_lab, part):
    lab, own = sqlite_lab, "all hands"
    if part == "made up the lot":
        lab.lot = lab.act(make_up_lot, MakeUpLot("NaOH", "0.1"), own)
        lab.sheet = lab.begin()
    lab.write_lines(lines())
    if part == "wrote":
        lab.write(NewEntry(str(uuid4()), 0, "remark", "seen"), who=own)
    if part == "corrected":
        lab.correct((1, "burette_end", 1), "20.01", "misread", who=own)
    if part == "let be used":
        lab.act(let_be_used, LetBeUsed(lab.sheet, "burette", "checked"), own)
    lab.hand_in()
    assert "somebody else countersigns" in refusal(lab, NotAllowed, own).says
    command = SendBack(lab.sheet, lab.facts().revision, "look again")
    with pytest.raises(NotAllowed, match="somebody else sends it back"):
        lab.act(send_back_sheet, command, own)
    lab.countersign()


def test_countersigning_ones_own_hand_in_is_refused(sqlite_lab):
    sqlite_lab.write_lines(lines())
    sqlite_lab.hand_in(who="all hands")
    assert "You handed in this sheet" in refusal(sqlite_lab, NotAllowed, "all hands").says


def test_countersigning_by_somebody_of_many_roles_without_a_part_is_allowed(sqlite_lab):
    waiting(sqlite_lab)
    assert sqlite_lab.countersign(who="all hands")["certificate"] == "TL-2026-0001"


def test_one_persons_laboratory_says_on_the_certificate_that_nobody_reviewed(sqlite_lab):
    command = ChangeSettings("Small laboratory", "1 Lane", "Europe/Berlin", 1, own_signature=True)
    sqlite_lab.act(change_settings, command, "steward")
    sqlite_lab.sheet = sqlite_lab.begin("all hands")
    sqlite_lab.write_lines(lines(), who="all hands")
    sqlite_lab.hand_in(who="all hands")
    sqlite_lab.countersign(who="all hands")
    document = json.loads(standing(sqlite_lab).document)
    assert document["independently_reviewed"] is False
    assert document["statements"][-1].startswith("Not independently reviewed")


# proof, revision, findings


@pytest.mark.parametrize("whose", ["analyst", "second countersigner"])
def test_countersigning_with_somebody_elses_password_is_refused(sqlite_lab, whose):
    waiting(sqlite_lab)
    assert refusal(sqlite_lab, NotSignedIn, proof=sqlite_lab.proof(whose)).field == "password"


def test_countersigning_what_was_not_looked_at_is_stale(sqlite_lab):
    waiting(sqlite_lab)
    revision = sqlite_lab.facts().revision
    sqlite_lab.act(
        send_back_sheet, SendBack(sqlite_lab.sheet, revision, "look at 3"), "second countersigner"
    )
    sqlite_lab.hand_in()
    refused = refusal(sqlite_lab, Stale, revision=revision)
    assert refused.shown["standing"] == sqlite_lab.facts().revision


def test_countersigning_a_sheet_that_does_not_wait_is_refused(sqlite_lab):
    assert "This sheet is open" in refusal(sqlite_lab, NotAllowed).says


def test_finding_that_fails_is_accepted_by_name_or_not_at_all(sqlite_lab):
    waiting(sqlite_lab, count=2)
    assert refusal(sqlite_lab, Unacceptable).example == "replicates"
    refused = refusal(sqlite_lab, Unacceptable, accepted=("replicates", "spread"))
    assert "“spread” does not fail" in refused.says
    seen = sqlite_lab.last_act()
    command = Countersign(
        sqlite_lab.sheet, sqlite_lab.facts().revision, ("replicates",), "seen", seen
    )
    sqlite_lab.act(
        countersign_sheet, command, "countersigner", proof=sqlite_lab.proof("countersigner")
    )
    document = json.loads(standing(sqlite_lab).document)
    (failing,) = [one for one in document["findings"] if one["verdict"] == "fails"]
    assert failing["reason"] == "seen and accepted"
    assert failing["accepted_by"] == "Lene Tiedt"


def test_certificate_issued_since_hand_in_is_not_replaced_without_a_comparison(lab):
    # two sheets of one lot wait at once
    first = lab.sheet
    waiting(lab)
    lab.sheet = lab.begin("second analyst")
    lab.write_lines(lines(), who="second analyst")
    lab.hand_in(who="second analyst")
    lab.countersign(first)
    with pytest.raises(Stale, match="TL-2026-0001 was issued for this lot since"):
        lab.countersign()
    lab.act(send_back_sheet, SendBack(lab.sheet, lab.facts().revision, "compare"), "countersigner")
    lab.hand_in()
    lab.countersign()
    document = json.loads(standing(lab).document)
    assert document["replaces"] == "TL-2026-0001"
    (last,) = [one for one in document["findings"] if one["name"] == "last certificate"]
    assert last["verdict"] == "holds"


def test_instrument_held_after_hand_in_stops_the_certificate(sqlite_lab):
    waiting(sqlite_lab)
    sqlite_lab.act(hold_thing, HoldThing("instrument", sqlite_lab.balance, "drifts"), "keeper")
    assert refusal(sqlite_lab, NotAllowed).field == "balance"


def test_lot_pulled_after_hand_in_stops_the_certificate(sqlite_lab):
    waiting(sqlite_lab)
    sqlite_lab.act(propose_pull, ProposePull(sqlite_lab.lot, "wrong salt"), "keeper")
    sqlite_lab.act(confirm_pull, ConfirmPull(sqlite_lab.lot), "second countersigner")
    assert "out of use for good" in refusal(sqlite_lab, NotAllowed).says


def test_remark_too_long_is_refused_never_cut(sqlite_lab):
    waiting(sqlite_lab)
    seen = sqlite_lab.last_act()
    command = Countersign(sqlite_lab.sheet, sqlite_lab.facts().revision, (), "x" * 2001, seen)
    with pytest.raises(Unacceptable) as refused:
        sqlite_lab.act(
            countersign_sheet, command, "countersigner", proof=sqlite_lab.proof("countersigner")
        )
    assert refused.value.field == "remark"


# sending back


def test_sheet_sent_back_is_written_on_and_handed_in_again(lab):
    waiting(lab)
    command = SendBack(lab.sheet, lab.facts().revision, "replicate 3: read at rest?")
    lab.act(send_back_sheet, command, "countersigner")
    facts = lab.facts()
    assert (facts.state, facts.sent_back_remark) == ("sent back", "replicate 3: read at rest?")
    lab.clock.move(minutes=20)
    lab.correct((3, "burette_end", 1), "19.92", "read again at rest")
    assert lab.facts().state == "open"
    lab.hand_in()
    lab.countersign()
    facts = lab.facts()
    assert [one.meaning for one in facts.signatures] == ["measured", "measured", "countersigned"]
    document = json.loads(standing(lab).document)
    assert [one["was"] for one in document["corrections"]] == ["19.91"]
    assert lab.chain().holds


def test_sheet_sent_back_and_handed_in_in_one_instant_still_certifies(sqlite_lab):
    # two measured signatures of one instant: the one that counts is the standing evaluation's
    waiting(sqlite_lab)
    for n in range(4):
        command = SendBack(sqlite_lab.sheet, sqlite_lab.facts().revision, "look again")
        sqlite_lab.act(send_back_sheet, command, "countersigner")
        sqlite_lab.correct((3, "burette_end", 1), f"19.9{n + 2}", "read again")
        sqlite_lab.hand_in()
    assert sqlite_lab.countersign()["certificate"] == "TL-2026-0001"


@pytest.mark.parametrize("remark", ["", "  \n"])
def test_sending_back_without_remark_is_refused(sqlite_lab, remark):
    waiting(sqlite_lab)
    command = SendBack(sqlite_lab.sheet, sqlite_lab.facts().revision, remark)
    with pytest.raises(Unacceptable) as refused:
        sqlite_lab.act(send_back_sheet, command, "countersigner")
    assert refused.value.field == "remark"


# what was tampered with is not certified


def test_sheet_with_an_entry_smuggled_in_is_not_certified(sqlite_lab):
    waiting(sqlite_lab)
    columns = (
        "position, replicate, slot, segment, text, person_id, posted_by, received_at, "
        "body_digest, late, sheet_id"
    )
    smuggle = text(
        f"INSERT INTO entry (id, {columns}) SELECT :id, 99, replicate, 'remark', segment, 'x', "
        "person_id, posted_by, received_at, 'x', late, sheet_id FROM entry WHERE position = 1"
    )
    sqlite_lab.transactions.write(lambda session: session.execute(smuggle, {"id": str(uuid4())}))
    assert "its digest does not agree" in refusal(sqlite_lab, NotAllowed).says


# several at once


def test_twenty_countersign_at_once_and_exactly_one_certificate_is_issued(lab):
    waiting(lab)
    revision, seen = lab.facts().revision, lab.last_act()

    def countersign(n):
        who = "countersigner" if n % 2 else "second countersigner"
        command = Countersign(lab.sheet, revision, trail_seen=seen)
        try:
            return lab.act(countersign_sheet, command, who, proof=lab.proof(who))
        except Refusal as refused:
            return refused

    with ThreadPoolExecutor(20) as pool:
        answers = list(pool.map(countersign, range(20)))
    assert sum(isinstance(one, dict) for one in answers) == 1
    assert {type(one) for one in answers if not isinstance(one, dict)} == {NotAllowed}
    assert certificates(lab) == 1
    assert lab.chain().holds


def test_countersigning_tapped_twenty_times_with_one_key_gets_equal_answers(lab):
    # R087: the second tap comes while the first is under way
    waiting(lab)
    actor = lab.people["countersigner"]
    command = Countersign(lab.sheet, lab.facts().revision, trail_seen=lab.last_act())
    proof = lab.proof("countersigner")

    def tap(_):
        def work(session):
            return once(
                session, actor=actor, key="tap", body={"sheet": lab.sheet}, now=lab.clock(),
                work=lambda: countersign_sheet(
                    session, command, actor=actor, proof=proof, now=lab.clock()
                ),
            )  # fmt: skip

        return lab.transactions.write(work)

    with ThreadPoolExecutor(20) as pool:
        answers = list(pool.map(tap, range(20)))
    assert all(one == answers[0] for one in answers)
    assert certificates(lab) == 1
    asked = select(func.count()).select_from(Signature)
    assert lab.transactions.read(lambda session: session.scalar(asked)) == 2
