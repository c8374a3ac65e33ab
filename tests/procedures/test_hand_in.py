import json
from datetime import timedelta
from uuid import uuid4

import pytest

from server.evaluation.from_sheet import evaluate_sheet
from server.lab.canonical import digest
from server.lab.refusal import NotAllowed, NotSignedIn, Stale, Unacceptable
from server.lab.signing import signature_holds
from server.procedures.entries import NewEntry
from server.procedures.hand_in import HandIn, failing, hand_in_sheet, prepare_hand_in
from server.procedures.holds import HoldThing, ReleaseThing, hold_thing, release_thing

SLOTS = ("container_and_standard", "container_less_standard", "burette_start", "burette_end")
SHEET = ((0, "step:mixed", "done"), (0, "indicator", "phenolphthalein"), (0, "temperature", "20.4"))
GOOD = (
    ("60.4084", "60.0000", "0.00", "20.00"),
    ("60.4102", "60.0000", "0.00", "20.08"),
    ("60.4066", "60.0000", "0.00", "19.91"),
)


def lines(*replicates):
    found = list(SHEET)
    for number, readings in enumerate(replicates, start=1):
        found += [(number, slot, text) for slot, text in zip(SLOTS, readings, strict=True)]
    return found


def remark(text="x", **more):
    return NewEntry(str(uuid4()), 0, "remark", text, **more)


def prepared(lab):
    actor = lab.people["analyst"]
    return lab.transactions.read(
        lambda session: prepare_hand_in(session, lab.sheet, actor=actor, now=lab.clock())
    )


def sign(lab, evaluated, *, revision=None, reasons=None, proof=None, who="analyst"):
    command = HandIn(lab.sheet, revision or evaluated.revision, reasons or {})
    return lab.act(
        lambda session, command, **more: hand_in_sheet(session, command, evaluated, **more),
        command, who, proof=proof or lab.proof(who),
    )  # fmt: skip


def refusal(lab, kind, *arguments, **more):
    before = (lab.facts(), lab.acts())
    with pytest.raises(kind) as refused:
        sign(lab, *arguments, **more)
    assert (lab.facts(), lab.acts()) == before
    return refused.value


@pytest.fixture
def evaluated(lab):
    """The evaluation of a sheet whose findings all hold."""
    lab.write_lines(lines(*GOOD))
    return lab.evaluate()


@pytest.fixture
def on_sqlite(sqlite_lab):
    """The same on SQLite alone."""
    sqlite_lab.write_lines(lines(*GOOD))
    return sqlite_lab.evaluate()


def test_sheet_handed_in_is_signed_as_measured_and_kept_with_its_snapshot(lab, evaluated):
    answer = sign(lab, evaluated)
    facts = lab.facts()
    assert answer == {
        "sheet_id": lab.sheet,
        "number": "S-2026-0001",
        "revision": facts.revision,
        "reported": evaluated.result["concentration"]["reported"],
    }
    assert facts.state == "handed in"
    assert facts.evaluation.result == json.loads(json.dumps(evaluated.result))
    assert digest(facts.evaluation.snapshot) == facts.evaluation.snapshot_digest
    (signature,) = facts.signatures
    assert (signature.printed_name, signature.meaning) == ("Ida Mohnke", "measured")
    assert (signature.at, signature.zone) == (lab.clock(), "Europe/Berlin")
    assert signature_holds(signature, facts, facts.evaluation.snapshot_digest)
    assert lab.acts()[-1] == ("Ida Mohnke", "handed in a bench sheet", "sheet")
    assert lab.chain().holds


def test_snapshot_replayed_gives_the_same_number(sqlite_lab, on_sqlite):
    again = evaluate_sheet(prepared(sqlite_lab), trials=0)
    assert again.result == on_sqlite.result
    assert again.snapshot_digest == on_sqlite.snapshot_digest


def test_sheet_handed_in_takes_no_more_ink(sqlite_lab, on_sqlite):
    sign(sqlite_lab, on_sqlite)
    with pytest.raises(NotAllowed, match="A countersigner can send it back"):
        sqlite_lab.write(remark())
    with pytest.raises(NotAllowed, match="This sheet is handed in"):
        prepared(sqlite_lab)


# the race: something happens between the second and the third beat


def test_hand_in_reading_changed_after_evaluation_is_stale(lab, evaluated):
    lab.correct((3, "burette_end", 1), "19.93", "misread")
    revision = lab.facts().revision
    assert refusal(lab, Stale, evaluated, revision=revision).field == "revision"


def test_hand_in_remark_written_after_the_page_was_opened_is_stale(lab, evaluated):
    lab.write(remark("the tip dripped"), who="second analyst")
    refused = refusal(lab, Stale, evaluated)
    assert refused.shown == {"seen": evaluated.revision, "standing": evaluated.revision + 1}


def test_hand_in_standard_lot_held_after_evaluation_is_stale(sqlite_lab, on_sqlite):
    sqlite_lab.act(hold_thing, HoldThing("standard lot", sqlite_lab.standard_lot, "damp"), "keeper")
    assert refusal(sqlite_lab, Stale, on_sqlite)


def test_hand_in_evaluation_of_another_sheet_is_stale(sqlite_lab, on_sqlite):
    first, sqlite_lab.sheet = sqlite_lab.sheet, sqlite_lab.begin()
    sqlite_lab.write_lines(lines(*GOOD))
    assert sqlite_lab.sheet != first
    assert refusal(sqlite_lab, Stale, on_sqlite, revision=sqlite_lab.facts().revision)


# what is missing, what fails


def test_hand_in_with_something_missing_names_the_row(sqlite_lab):
    sqlite_lab.write_lines(lines(GOOD[0])[:-1])
    with pytest.raises(Unacceptable) as refused:
        sqlite_lab.evaluate()
    assert refused.value.field == "burette_end"
    assert "Replicate 1: the burette end is not written yet." in refused.value.says
    assert {one.slot for one in prepared(sqlite_lab).missing} == {"burette_end"}


def test_hand_in_of_an_empty_sheet_names_all_that_is_missing(sqlite_lab):
    missing = {(one.replicate, one.slot) for one in prepared(sqlite_lab).missing}
    assert missing == {(0, "temperature"), (0, "step:mixed"), (0, "indicator"), (1, "")}


def test_hand_in_written_after_evaluation_and_struck_to_nothing_is_refused(sqlite_lab, on_sqlite):
    stands = {one.place: one for one in sqlite_lab.facts().entries}[(1, "burette_end", 1)]
    strike = NewEntry(
        str(uuid4()), 1, "burette_end", "", strikes=stands.id, reason="not at rest"
    )  # fmt: skip
    sqlite_lab.write(strike)
    refused = refusal(sqlite_lab, Unacceptable, on_sqlite, revision=sqlite_lab.facts().revision)
    assert refused.field == "burette_end"


def test_finding_that_fails_needs_its_own_reason(sqlite_lab):
    # R050 and R051: spread and number of replicates; the reason is asked for by name
    sqlite_lab.write_lines(lines(GOOD[0], ("60.4102", "60.0000", "0.00", "20.28")))
    evaluated = sqlite_lab.evaluate()
    assert failing(evaluated.result["findings"]) == ["replicates", "spread"]
    refused = refusal(sqlite_lab, Unacceptable, evaluated, reasons={"spread": "no cause found"})
    assert refused.field == "reasons.replicates"
    refused = refusal(
        sqlite_lab, Unacceptable, evaluated, reasons={"replicates": "x", "spread": " "}
    )
    assert refused.field == "reasons.spread"
    reasons = {"replicates": "lot used up", "spread": "no cause found"}
    sign(sqlite_lab, evaluated, reasons=reasons)
    assert sqlite_lab.facts().measured_signature.reasons == reasons


def test_concentration_far_from_nominal_fails(sqlite_lab):
    # R050: more than 10 % from nominal
    off = [(before, after, start, "17.50") for before, after, start, _ in GOOD]
    sqlite_lab.write_lines(lines(*off))
    assert "nominal" in failing(sqlite_lab.evaluate().result["findings"])


def test_other_indicator_than_the_recipes_fails(sqlite_lab):
    # R052: the end point of the recipe
    written = [line for line in lines(*GOOD) if line[1] != "indicator"]
    sqlite_lab.write_lines([*written, (0, "indicator", "methyl red")])
    assert failing(sqlite_lab.evaluate().result["findings"]) == ["end point"]


def test_reason_for_what_does_not_fail_is_refused(sqlite_lab, on_sqlite):
    refused = refusal(sqlite_lab, Unacceptable, on_sqlite, reasons={"spread": "just so"})
    assert refused.field == "reasons.spread"


def test_reason_too_long_is_refused_never_cut(sqlite_lab):
    sqlite_lab.write_lines(lines(*GOOD[:2]))
    evaluated = sqlite_lab.evaluate()
    refused = refusal(sqlite_lab, Unacceptable, evaluated, reasons={"replicates": "x" * 1001})
    assert refused.field == "reasons.replicates"


def test_nothing_delivered_is_refused_in_words(sqlite_lab):
    sqlite_lab.write_lines(lines(*GOOD[:2], ("60.4066", "60.0000", "5.00", "5.00")))
    with pytest.raises(Unacceptable) as refused:
        sqlite_lab.evaluate()
    assert refused.value.field


# proof and validity


@pytest.mark.parametrize("who", ["second analyst", "countersigner"])
def test_hand_in_with_somebody_elses_password_is_refused(sqlite_lab, on_sqlite, who):
    assert (
        refusal(sqlite_lab, NotSignedIn, on_sqlite, proof=sqlite_lab.proof(who)).field == "password"
    )


def test_hand_in_with_an_old_proof_is_refused(sqlite_lab, on_sqlite):
    proof = sqlite_lab.proof("analyst")
    sqlite_lab.clock.move(minutes=3)
    assert refusal(sqlite_lab, NotSignedIn, on_sqlite, proof=proof)


def test_hand_in_while_an_instrument_is_held_is_refused_by_its_kind(sqlite_lab, on_sqlite):
    sqlite_lab.act(
        hold_thing, HoldThing("instrument", sqlite_lab.burette, "tip chipped"), "analyst"
    )
    refused = refusal(sqlite_lab, NotAllowed, sqlite_lab.evaluate())
    assert refused.field == "burette"
    assert "tip chipped" in refused.says
    sqlite_lab.clock.move(minutes=5)
    release = ReleaseThing("instrument", sqlite_lab.burette, "it was the stand")
    sqlite_lab.act(release_thing, release, "keeper")
    # read at the very instant at which it was doubted: that stays within the doubt
    assert refusal(sqlite_lab, NotAllowed, sqlite_lab.evaluate())


def test_hand_in_after_a_doubt_that_began_after_the_readings_and_is_gone(sqlite_lab, on_sqlite):
    sqlite_lab.clock.move(minutes=1)
    sqlite_lab.act(
        hold_thing, HoldThing("instrument", sqlite_lab.burette, "tip chipped"), "analyst"
    )
    sqlite_lab.clock.move(minutes=5)
    sqlite_lab.act(
        release_thing, ReleaseThing("instrument", sqlite_lab.burette, "it was the stand"), "keeper"
    )
    sign(sqlite_lab, sqlite_lab.evaluate())
    assert sqlite_lab.facts().state == "handed in"


def test_hand_in_after_the_calibration_lapsed_stays_possible(sqlite_lab, on_sqlite):
    # what counts is that it was in date when it was used
    sqlite_lab.clock.move(days=400)
    assert sqlite_lab.facts().instrument("burette").due_at < sqlite_lab.clock() - timedelta(
        days=100
    )
    sign(sqlite_lab, sqlite_lab.evaluate())
    assert sqlite_lab.facts().state == "handed in"


# left out: R046


def test_replicate_left_out_stays_visible_with_criterion_and_reason(sqlite_lab):
    sqlite_lab.write_lines(lines(*GOOD, ("60.4080", "60.0000", "0.00", "20.60")))
    sqlite_lab.write(
        NewEntry(str(uuid4()), 4, "excluded", "titrated past the end point", reason="deep pink")
    )
    result = sqlite_lab.evaluate().result
    out = result["replicates"][3]
    assert out["excluded"] == "titrated past the end point: deep pink"
    assert out["value"] == pytest.approx(0.0970, abs=2e-4)
    assert result["spread"]["n"] == 3
    assert failing(result["findings"]) == []


@pytest.mark.parametrize("written", [1, 2, 3])
def test_replicate_spilled_half_way_is_left_out_without_more_readings(sqlite_lab, written):
    spilled = [(4, slot, text) for slot, text in zip(SLOTS, GOOD[0], strict=True)][:written]
    sqlite_lab.write_lines([*lines(*GOOD), *spilled])
    sqlite_lab.write(NewEntry(str(uuid4()), 4, "excluded", "spilled or lost", reason="fell over"))
    result = sqlite_lab.evaluate().result
    assert result["replicates"][3]["excluded"] == "spilled or lost: fell over"
    assert result["spread"]["n"] == 3


def test_replicate_that_counts_again_must_be_whole(sqlite_lab):
    sqlite_lab.write_lines([*lines(*GOOD), (4, "container_and_standard", "60.4084")])
    (out,) = sqlite_lab.write(
        NewEntry(str(uuid4()), 4, "excluded", "spilled or lost", reason="fell over")
    )
    sqlite_lab.write(
        NewEntry(
            str(uuid4()), 4, "excluded", "counts again", strikes=out.id, reason="it was another"
        )
    )
    missing = {(one.replicate, one.slot) for one in prepared(sqlite_lab).missing}
    assert missing == {(4, slot) for slot in SLOTS[1:]}


def test_every_replicate_left_out_is_refused_in_words(sqlite_lab):
    sqlite_lab.write_lines(lines(GOOD[0]))
    sqlite_lab.write(NewEntry(str(uuid4()), 1, "excluded", "spilled or lost", reason="fell over"))
    with pytest.raises(Unacceptable, match="nothing is left"):
        sqlite_lab.evaluate()
