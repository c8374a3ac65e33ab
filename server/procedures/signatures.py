"""Setting a signature on a bench sheet."""

from dataclasses import dataclass, replace
from datetime import datetime
from typing import Any
from uuid import uuid4

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.free_text import read_text
from server.lab.sheet_facts import SheetFacts, SignatureFact
from server.lab.signing import digest_to_sign
from server.records.tables.bench import Signature


@dataclass(frozen=True, slots=True)
class ToSign:
    """What is signed: the meaning, the evaluation with its snapshot, reasons and remark."""

    meaning: str
    evaluation_id: str
    snapshot_digest: str
    reasons: Any
    remark: str


def sign(
    session: Session, facts: SheetFacts, to_sign: ToSign, *, actor: Actor, now: datetime
) -> SignatureFact:
    """Set the actor's signature on a sheet and return it."""
    unsigned = SignatureFact(
        id=str(uuid4()),
        person_id=actor.person_id,
        printed_name=actor.printed_name,
        meaning=to_sign.meaning,
        at=now,
        zone=actor.zone,
        evaluation_id=to_sign.evaluation_id,
        signed_digest="",
        reasons=to_sign.reasons,
        remark=read_text(to_sign.remark, "remark") or None,
    )
    digest = digest_to_sign(unsigned, facts, to_sign.snapshot_digest)
    signature = replace(unsigned, signed_digest=digest)
    session.add(
        Signature(
            id=signature.id,
            sheet_id=facts.id,
            person_id=signature.person_id,
            printed_name=signature.printed_name,
            meaning=signature.meaning,
            at=signature.at,
            zone=signature.zone,
            evaluation_id=signature.evaluation_id,
            signed_digest=signature.signed_digest,
            reasons=signature.reasons,
            remark=signature.remark,
        )
    )
    session.flush()
    return signature
