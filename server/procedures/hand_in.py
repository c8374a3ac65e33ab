"""Handing in a bench sheet, in three beats: read, evaluate with nothing open, write."""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any
from uuid import uuid4

from sqlalchemy.orm import Session

from server.evaluation.from_sheet import (
    EvaluatedSheet,
    PreparedSheet,
    evaluate_sheet,
    prepare_sheet,
)
from server.lab.actor import Actor, Proof
from server.lab.free_text import MOST_REASON, read_text
from server.lab.in_use import things_in_use
from server.lab.refusal import NotAllowed, Stale, Unacceptable
from server.lab.roles import Act
from server.lab.sheet_facts import SheetFacts
from server.lab.signing import MEASURED
from server.lab.states import OPEN, SENT_BACK
from server.procedures.acts import Thing, note_act
from server.procedures.bench import lock_sheet, need_revision
from server.procedures.proofs import need_proof
from server.procedures.signatures import ToSign, sign
from server.records.queries.load_sheet import load_sheet_facts
from server.records.tables.bench import Evaluation, Sheet

__all__ = ["HandIn", "evaluate_sheet", "hand_in_sheet", "prepare_hand_in"]


@dataclass(frozen=True, slots=True)
class HandIn:
    """A sheet handed in with the reasons for what fails, by the name of the finding."""

    sheet_id: str
    revision: int
    reasons: dict[str, str] = field(default_factory=dict)
    remark: str = ""


def prepare_hand_in(
    session: Session, sheet_id: str, *, actor: Actor, now: datetime
) -> PreparedSheet:
    """Read a sheet for evaluation; close the transaction before ``evaluate_sheet``."""
    del now
    actor.need(Act.HAND_IN)
    facts = load_sheet_facts(session, sheet_id)
    _need_open(facts)
    return prepare_sheet(facts)


def hand_in_sheet(
    session: Session,
    command: HandIn,
    evaluated: EvaluatedSheet,
    *,
    actor: Actor,
    proof: Proof,
    now: datetime,
) -> dict[str, Any]:
    """Hand in a sheet as *measured*; return its id, number, revision and reported value.

    Raises:
        Stale: the sheet or what it rests on has changed since it was evaluated.
        Unacceptable: a required entry is missing, or something that fails has no reason.
        NotAllowed: something was not valid when it was used.
    """
    actor.need(Act.HAND_IN)
    need_proof(proof, actor, now=now)
    sheet = lock_sheet(session, command.sheet_id)
    facts = load_sheet_facts(session, sheet.id)
    _need_open(facts)
    need_revision(sheet, command.revision)
    _need_same_input(prepare_sheet(facts), evaluated)
    refuse_not_valid(facts)
    reasons = _reasons(evaluated.result["findings"], command.reasons)
    evaluation = _keep_evaluation(session, sheet, evaluated, now)
    to_sign = ToSign(MEASURED, evaluation.id, evaluation.snapshot_digest, reasons, command.remark)
    signature = sign(session, facts, to_sign, actor=actor, now=now)
    sheet.evaluation_id = evaluation.id
    sheet.handed_in_at = now
    sheet.sent_back_at = None
    sheet.sent_back_remark = None
    sheet.revision += 1
    session.flush()
    reported = evaluated.result["concentration"]["reported"]
    # not the number itself: it is not certified yet, and everybody reads the trail
    body = {
        "reasons": reasons,
        "evaluation": evaluation.id,
        "snapshot_digest": evaluation.snapshot_digest,
        "calculation": evaluation.calculation,
        "input_digest": evaluation.input_digest,
        "signature": signature.id,
        "signed_digest": signature.signed_digest,
    }
    thing = Thing("sheet", sheet.id, sheet.number)
    why = "; ".join(f"{name}: {reason}" for name, reason in reasons.items())
    note_act(session, "handed in a bench sheet", thing, actor=actor, now=now, why=why, body=body)
    return {
        "sheet_id": sheet.id,
        "number": sheet.number,
        "revision": sheet.revision,
        "reported": reported,
    }


def failing(findings: Iterable[Mapping[str, Any]]) -> list[str]:
    """Return the names of the findings that fail, once each."""
    return list(dict.fromkeys(one["name"] for one in findings if one["verdict"] == "fails"))


def refuse_not_valid(facts: SheetFacts) -> None:
    """Refuse to sign where an instrument or lot was not valid when it was used."""
    for one in things_in_use(facts):
        if one.blocks:
            says = (
                f"{one.says} It was used all the same; a keeper may let it be used with a reason."
            )
            raise NotAllowed(says, field=one.kind)


def _need_open(facts: SheetFacts) -> None:
    if facts.state not in {OPEN, SENT_BACK}:
        raise NotAllowed(f"This sheet is {facts.state}.")
    if facts.lot.pulled:
        raise NotAllowed("This lot was pulled: it is out of use for good.")


def _need_same_input(prepared: PreparedSheet, evaluated: EvaluatedSheet) -> None:
    if prepared.missing:
        first = prepared.missing[0]
        raise Unacceptable(first.says, field=first.slot or None)
    if prepared.sheet_id != evaluated.sheet_id or prepared.input_digest != evaluated.input_digest:
        says = "Something was written since this was evaluated; look again before you sign."
        raise Stale(says, field="revision")


def _reasons(findings: Iterable[Mapping[str, Any]], given: Mapping[str, str]) -> dict[str, str]:
    """Return the reasons for all that fails; each is needed, none may be for something else."""
    names = failing(findings)
    for name in given:
        if name not in names and given[name].strip():
            says = f"“{name[:40]}” does not fail, so it needs no reason."
            raise Unacceptable(says, field=f"reasons.{name[:40]}")
    reasons = {
        name: read_text(given.get(name) or "", f"reasons.{name}", most=MOST_REASON)
        for name in names
    }
    for name, reason in reasons.items():
        if not reason:
            says = f"“{name}” fails: give the reason; it is printed on the certificate."
            example = "one replicate only, the rest of the lot is used up today"
            raise Unacceptable(says, field=f"reasons.{name}", example=example)
    return reasons


def _keep_evaluation(
    session: Session, sheet: Sheet, evaluated: EvaluatedSheet, now: datetime
) -> Evaluation:
    row = Evaluation(
        id=str(uuid4()),
        sheet_id=sheet.id,
        calculation=evaluated.calculation,
        input_digest=evaluated.input_digest,
        snapshot=evaluated.snapshot,
        snapshot_digest=evaluated.snapshot_digest,
        made_at=now,
    )
    session.add(row)
    session.flush()
    return row
