"""Certificates by number, sheet or lot, with what replaces them."""

import json
from dataclasses import dataclass, field
from typing import Any

from sqlalchemy import select
from sqlalchemy.orm import Session, aliased

from server.records.tables.bench import Certificate
from server.records.tables.lots import Pull
from server.records.tables.trail import TrailRow


@dataclass(frozen=True, slots=True)
class KeptCertificate:
    """A certificate as kept: the row, its text as read, what replaced it, whether it was pulled."""

    row: Certificate
    document: dict[str, Any] = field(repr=False)
    replaced_by: str | None
    pulled: bool


def certificate_by_number(session: Session, number: str) -> KeptCertificate | None:
    """Return the certificate of a number."""
    found = _kept(session, Certificate.number == number)
    return found[0] if found else None


def certificate_of_sheet(session: Session, sheet_id: str) -> Certificate | None:
    """Return the certificate that was issued from a sheet."""
    return session.scalar(select(Certificate).where(Certificate.sheet_id == sheet_id))


def certificates_of_lot(session: Session, lot_id: str) -> list[KeptCertificate]:
    """Return all certificates of a lot, the newest first."""
    return _kept(session, Certificate.lot_id == lot_id)


def anchor_hash(session: Session, seq: int) -> str | None:
    """Return the hash of a row of the trail."""
    return session.scalar(select(TrailRow.hash).where(TrailRow.seq == seq))


def _kept(session: Session, where: Any) -> list[KeptCertificate]:
    later = aliased(Certificate)
    rows = session.execute(
        select(Certificate, later.number)
        .outerjoin(later, later.replaces_id == Certificate.id)
        .where(where)
        .order_by(Certificate.issued_at.desc(), Certificate.number.desc())
    ).all()
    lots = {row.lot_id for row, _ in rows}
    pulled = set(
        session.scalars(
            select(Pull.lot_id).where(Pull.lot_id.in_(lots), Pull.confirmed_at.is_not(None))
        )
    )
    return [
        KeptCertificate(row, json.loads(row.document), replaced_by, row.lot_id in pulled)
        for row, replaced_by in rows
    ]
