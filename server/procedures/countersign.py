"""Countersigning: the act of a second person that certifies."""

import json
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date, datetime
from typing import Any
from uuid import uuid4

from sqlalchemy.orm import Session

from server.lab.actor import Actor, Proof
from server.lab.canonical import canonical, digest
from server.lab.certificate_document import Issue, build_certificate, measured_at
from server.lab.free_text import MOST_REASON, read_text
from server.lab.in_use import things_in_use
from server.lab.refusal import NotAllowed, Stale, Unacceptable
from server.lab.roles import Act
from server.lab.segregation import countersign_refusal
from server.lab.sheet_facts import EvaluationFact, SheetFacts, SignatureFact
from server.lab.signing import COUNTERSIGNED, countersign_reasons, signature_holds
from server.lab.states import HANDED_IN
from server.lab.validity import local_day, valid_until
from server.procedures.acts import Thing, note_act
from server.procedures.bench import lock_sheet, need_revision
from server.procedures.hand_in import failing, refuse_not_valid
from server.procedures.proofs import need_proof
from server.procedures.signatures import ToSign, sign
from server.records.queries.load_lots import standing_certificate
from server.records.queries.load_sheet import load_sheet_facts
from server.records.queries.loading import next_number
from server.records.queries.sheet_trail import last_act_of_sheet
from server.records.tables.bench import Certificate
from server.records.tables.lots import Lot
from server.records.trail import head


@dataclass(frozen=True, slots=True)
class Countersign:
    """A second signature; ``accepted`` names each finding that fails and is accepted.

    ``trail_seen`` is the number of the last act in the sheet's trail that was read before signing;
    ``because`` says why the lot's standing certificate is replaced, printed on the new one.
    """

    sheet_id: str
    revision: int
    accepted: tuple[str, ...] = ()
    remark: str = ""
    trail_seen: int = 0
    because: str = ""


def countersign_sheet(
    session: Session, command: Countersign, *, actor: Actor, proof: Proof, now: datetime
) -> dict[str, Any]:
    """Countersign a sheet and issue its certificate; return number, id and the reported value.

    Raises:
        NotAllowed: one's own work, a sheet that does not wait, or something that was not valid.
        Unacceptable: a finding that fails is not accepted by name, or the trail was not read.
        Stale: the sheet or its trail has changed since it was looked at.
    """
    actor.need(Act.COUNTERSIGN)
    need_proof(proof, actor, now=now)
    sheet = lock_sheet(session, command.sheet_id)
    facts = load_sheet_facts(session, sheet.id)
    evaluation, measured = waiting_parts(facts)
    refusal = countersign_refusal(facts, actor.person_id)
    if refusal:
        raise NotAllowed(refusal)
    need_revision(sheet, command.revision)
    _need_same_last(facts, evaluation)
    refuse_not_valid(facts)
    accepted = _accepted(evaluation, command.accepted)
    _need_trail_seen(session, sheet.id, command.trail_seen)
    because = read_text(command.because, "because", most=MOST_REASON)
    _need_intact(facts, evaluation, measured)
    reasons = countersign_reasons(accepted, command.trail_seen)
    to_sign = ToSign(
        COUNTERSIGNED, evaluation.id, evaluation.snapshot_digest, reasons, command.remark
    )
    signature = sign(session, facts, to_sign, actor=actor, now=now)
    signed = _Signed(evaluation, measured, signature, because)
    certificate = _issue(session, facts, signed, actor=actor, now=now)
    sheet.countersigned_at = now
    sheet.revision += 1
    session.flush()
    reported = evaluation.result["concentration"]["reported"]
    body = {
        "reported": reported,
        "accepted": accepted,
        "trail_seen": command.trail_seen,
        "signature": signature.id,
        "signed_digest": signature.signed_digest,
        "certificate": certificate.number,
        "document_digest": certificate.document_digest,
        "replaces": certificate.replaces_id,
    }
    thing = Thing("sheet", sheet.id, sheet.number)
    why = command.remark.strip()
    note_act(session, "countersigned", thing, actor=actor, now=now, why=why, body=body)
    _note_certificate(session, facts, certificate, actor=actor, now=now)
    return {
        "sheet_id": sheet.id,
        "certificate": certificate.number,
        "certificate_id": certificate.id,
        "reported": reported,
    }


def _need_trail_seen(session: Session, sheet_id: str, seen: int) -> None:
    """Refuse to sign before the sheet's trail was read, up to its last act."""
    last = last_act_of_sheet(session, sheet_id)
    if not 1 <= seen <= last:
        says = f"Read the trail of this sheet before you sign; its last act is no. {last}."
        raise Unacceptable(says, field="trail_seen", example=str(last))
    if seen < last:
        says = (
            f"Since you read the trail of this sheet up to act {seen}, act {last} was noted; look "
            "again before you sign."
        )
        raise Stale(says, field="trail_seen", shown={"standing": {"last act": last}})


def waiting_parts(facts: SheetFacts) -> tuple[EvaluationFact, SignatureFact]:
    """Return the evaluation and the *measured* signature of a sheet that waits.

    Raises:
        NotAllowed: it does not wait, or its lot was pulled.
    """
    if facts.state != HANDED_IN or facts.evaluation is None or facts.measured_signature is None:
        raise NotAllowed(f"This sheet is {facts.state}; it does not wait for a second person.")
    if facts.lot.pulled:
        raise NotAllowed("This lot was pulled: it is out of use for good.")
    return facts.evaluation, facts.measured_signature


def _need_same_last(facts: SheetFacts, evaluation: EvaluationFact) -> None:
    """Refuse where the lot got another certificate since the sheet was compared with its last."""
    compared = json.loads(evaluation.snapshot)["circumstances"]["last_certificate"]
    standing = facts.last_certificate
    if standing is not None and (compared is None or compared["number"] != standing.number):
        says = (
            f"Certificate {standing.number} was issued for this lot since this sheet was handed "
            "in; send the sheet back, so that the two are compared."
        )
        raise Stale(says, field="revision", shown={"standing": standing.number})


def _accepted(evaluation: EvaluationFact, accepted: Sequence[str]) -> list[str]:
    """Return the findings accepted by name: exactly those that fail."""
    names = failing(evaluation.result["findings"])
    for name in names:
        if name not in accepted:
            says = f"“{name}” fails: accept it by name, or send the sheet back."
            raise Unacceptable(says, field="accepted", example=name)
    for name in accepted:
        if name not in names:
            says = f"“{name[:40]}” does not fail, so there is nothing to accept."
            raise Unacceptable(says, field="accepted")
    return names


def _need_intact(facts: SheetFacts, evaluation: EvaluationFact, measured: SignatureFact) -> None:
    """Refuse to certify what is no longer what was signed."""
    intact = digest(evaluation.snapshot) == evaluation.snapshot_digest
    if not intact or not signature_holds(measured, facts, evaluation.snapshot_digest):
        says = (
            "What stands here is not what was handed in: its digest does not agree. Nothing is "
            "certified; tell the steward."
        )
        raise NotAllowed(says)


@dataclass(frozen=True, slots=True)
class _Signed:
    """An evaluation with its two signatures, and why it replaces what stood."""

    evaluation: EvaluationFact
    measured: SignatureFact
    countersigned: SignatureFact
    because: str


def _issue(
    session: Session, facts: SheetFacts, signed: _Signed, *, actor: Actor, now: datetime
) -> Certificate:
    """Issue the certificate; it replaces the lot's standing one."""
    session.get_one(Lot, facts.lot.id, with_for_update=True)
    before = standing_certificate(session, facts.lot.id)
    year = local_day(now, actor.zone).year
    use_by = facts.lot.document.get("use_by")
    valid = valid_until(
        measured_at=measured_at(facts),
        interval_days=facts.recipe.document.interval_days,
        use_by=date.fromisoformat(use_by) if use_by else None,
        zone=facts.laboratory.zone,
    )
    issue = Issue(
        number=f"TL-{year}-{next_number(session, f'certificate {year}'):04d}",
        issued_at=now,
        replaces=before.number if before else None,
        valid=valid,
        because=signed.because,
    )
    document = canonical(
        build_certificate(
            facts,
            signed.evaluation,
            issue=issue,
            in_use=things_in_use(facts),
            measured=signed.measured,
            countersigned=signed.countersigned,
        )
    )
    seq, anchor = head(session)
    row = Certificate(
        id=str(uuid4()),
        number=issue.number,
        lot_id=facts.lot.id,
        sheet_id=facts.id,
        evaluation_id=signed.evaluation.id,
        replaces_id=before.id if before else None,
        issued_at=now,
        valid_until=valid.at,
        document=document,
        document_digest=digest(document),
        trail_seq=seq,
        trail_hash=anchor,
    )
    session.add(row)
    session.flush()
    return row


def _note_certificate(
    session: Session, facts: SheetFacts, certificate: Certificate, *, actor: Actor, now: datetime
) -> None:
    body = {
        "lot": facts.lot.name,
        "valid_until": certificate.valid_until.isoformat(),
        "document_digest": certificate.document_digest,
        "trail_seq": certificate.trail_seq,
    }
    thing = Thing("certificate", certificate.id, certificate.number)
    note_act(session, "issued a certificate", thing, actor=actor, now=now, body=body)
