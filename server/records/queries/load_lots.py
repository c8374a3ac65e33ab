"""Lots, bottles, pulls and certificates as the procedures need them."""

from sqlalchemy import func, select
from sqlalchemy.orm import Session, aliased

from server.records.tables.bench import Certificate
from server.records.tables.lots import Bottle, Lot, Pull


def lot_by_code(session: Session, code: str) -> Lot | None:
    """Return the lot of a code."""
    return session.scalar(select(Lot).where(Lot.code == code))


def lot_by_name(session: Session, name: str) -> Lot | None:
    """Return the lot of a name."""
    return session.scalar(select(Lot).where(Lot.name == name))


def bottle_by_code(session: Session, code: str) -> Bottle | None:
    """Return the bottle of a code."""
    return session.scalar(select(Bottle).where(Bottle.code == code))


def lot_of_code(session: Session, code: str) -> Lot | None:
    """Return the lot of a code that may be the lot's own or one of its bottles'."""
    bottle = bottle_by_code(session, code)
    return session.get(Lot, bottle.lot_id) if bottle else lot_by_code(session, code)


def code_is_taken(session: Session, code: str) -> bool:
    """Say whether a bottle or a lot already has this code."""
    return bottle_by_code(session, code) is not None or lot_by_code(session, code) is not None


def last_bottle_number(session: Session, lot_id: str) -> int:
    """Return the highest bottle number of a lot, 0 where it has none."""
    return session.scalar(select(func.max(Bottle.number)).where(Bottle.lot_id == lot_id)) or 0


def open_pull(session: Session, lot_id: str) -> Pull | None:
    """Return the proposed pull of a lot that nobody has confirmed yet."""
    return session.scalar(select(Pull).where(Pull.lot_id == lot_id, Pull.confirmed_at.is_(None)))


def lot_is_pulled(session: Session, lot_id: str) -> bool:
    """Say whether a lot was pulled for good."""
    pull = select(Pull.id).where(Pull.lot_id == lot_id, Pull.confirmed_at.is_not(None))
    return session.scalar(pull.limit(1)) is not None


def standing_certificate(session: Session, lot_id: str) -> Certificate | None:
    """Return the certificate of a lot that no other one replaces."""
    later = aliased(Certificate)
    return session.scalar(
        select(Certificate)
        .outerjoin(later, later.replaces_id == Certificate.id)
        .where(Certificate.lot_id == lot_id, later.id.is_(None))
    )
