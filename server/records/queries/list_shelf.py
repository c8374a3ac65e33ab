"""Bottles and lots with all that their states are computed from, in a fixed number of selects."""

import json
from collections.abc import Iterable
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any

from sqlalchemy import func, or_, select
from sqlalchemy.orm import InstrumentedAttribute, Session, aliased

from server.lab.canonical import digest
from server.lab.opened import bottle_until
from server.lab.states import bottle_state, lot_state
from server.lab.validity import ValidUntil
from server.records.queries.list_holds import StandingHold, standing_holds
from server.records.tables.bench import Certificate
from server.records.tables.lots import Bottle, Lot, Pull


@dataclass(frozen=True, slots=True)
class StandingCertificate:
    """The certificate that no other one replaces, with its document as read."""

    row: Certificate
    document: dict[str, Any] = field(repr=False)

    @property
    def holds(self) -> bool:
        """Whether the text is the one that was issued, and its last instant the one it states."""
        stated = datetime.fromisoformat(self.document["validity"]["until"])
        return digest(self.row.document) == self.row.document_digest and (
            stated == self.row.valid_until
        )


@dataclass(frozen=True, slots=True)
class LotOnShelf:
    """A lot with its standing certificate, its standing hold, and whether it was pulled."""

    lot: Lot
    certificate: StandingCertificate | None
    hold: StandingHold | None
    pulled: bool

    @property
    def is_altered(self) -> bool:
        """Whether its standing certificate is not the text that was issued."""
        return self.certificate is not None and not self.certificate.holds

    @property
    def good_until(self) -> ValidUntil | None:
        """Until when its standing certificate is good, and which rule says so."""
        if self.certificate is None:
            return None
        rule = self.certificate.document["validity"]["rule"]
        return ValidUntil(self.certificate.row.valid_until, rule)

    def state(self, now: datetime) -> str:
        """Return the lot's state at an instant."""
        return self.state_until(self.good_until, now)

    def state_until(self, until: ValidUntil | None, now: datetime) -> str:
        """Return the lot's state at an instant, were it good until another one."""
        certificate = self.certificate
        return lot_state(
            valid_until=until.at if until else None,
            notice_days=certificate.document["validity"]["notice_days"] if certificate else 0,
            held=self.hold is not None or self.is_altered,
            pulled=self.pulled,
            now=now,
        )


@dataclass(frozen=True, slots=True)
class BottleOnShelf:
    """A bottle with its lot and its own standing hold."""

    bottle: Bottle
    lot: LotOnShelf
    hold: StandingHold | None

    @property
    def good_until(self) -> ValidUntil | None:
        """The earlier of the certificate's end and that of the opened bottle, with its rule."""
        certified = self.lot.good_until
        return bottle_until(certified, self.bottle.opened_until) if certified else None

    def state(self, now: datetime) -> str:
        """Return the graver of the bottle's own state and its lot's at an instant."""
        used_up = self.bottle.used_up_at is not None
        lot = self.lot.state_until(self.good_until, now)
        return bottle_state(lot, held=self.hold is not None, used_up=used_up)


def bottles_on_shelf(session: Session) -> list[BottleOnShelf]:
    """Return all bottles, lot by lot and by their numbers."""
    asked = select(Bottle).order_by(Bottle.lot_id, Bottle.number)
    bottles = session.scalars(asked).all()
    lots = {one.lot.id: one for one in _lots(session, None)}
    holds = standing_holds(session, ("bottle",))
    return [BottleOnShelf(one, lots[one.lot_id], holds.get(("bottle", one.id))) for one in bottles]


def lot_on_shelf(session: Session, lot_id: str) -> LotOnShelf:
    """Return one lot with all that its state is computed from."""
    return _lots(session, (lot_id,))[0]


def bottle_on_shelf(session: Session, bottle: Bottle) -> BottleOnShelf:
    """Return one bottle with all that its state is computed from."""
    holds = standing_holds(session, ("bottle",), thing_ids=(bottle.id,))
    lot = lot_on_shelf(session, bottle.lot_id)
    return BottleOnShelf(bottle, lot, holds.get(("bottle", bottle.id)))


def bottles_of_lot(session: Session, lot: LotOnShelf) -> list[BottleOnShelf]:
    """Return the bottles of a lot by their numbers."""
    asked = select(Bottle).where(Bottle.lot_id == lot.lot.id).order_by(Bottle.number)
    bottles = session.scalars(asked).all()
    holds = standing_holds(session, ("bottle",), thing_ids=[one.id for one in bottles])
    return [BottleOnShelf(one, lot, holds.get(("bottle", one.id))) for one in bottles]


def all_lots(session: Session) -> list[LotOnShelf]:
    """Return all lots, made up last first."""
    return _lots(session, None)


def bottles_by_lot(session: Session) -> dict[str, int]:
    """Return how many bottles each lot was filled into, used up ones among them."""
    rows = session.execute(select(Bottle.lot_id, func.count()).group_by(Bottle.lot_id))
    return {row[0]: row[1] for row in rows}


def bottle_codes_with(session: Session, pieces: Iterable[str]) -> list[str]:
    """Return the codes of bottles that hold one of the pieces."""
    return _codes_with(session, Bottle.code, pieces)


def lot_codes_with(session: Session, pieces: Iterable[str]) -> list[str]:
    """Return the codes of lots that hold one of the pieces."""
    return _codes_with(session, Lot.code, pieces)


def lot_names_like(session: Session, start: str) -> set[str]:
    """Return the names of lots that begin with a text."""
    return set(session.scalars(select(Lot.name).where(Lot.name.startswith(start, autoescape=True))))


def last_pull(session: Session, lot_id: str) -> Pull | None:
    """Return the pull of a lot that was proposed last, confirmed or not."""
    asked = select(Pull).where(Pull.lot_id == lot_id).order_by(Pull.proposed_at.desc())
    return session.scalar(asked.limit(1))


def _codes_with(
    session: Session, code: InstrumentedAttribute[str], pieces: Iterable[str]
) -> list[str]:
    wanted = [code.contains(piece, autoescape=True) for piece in pieces if piece]
    return list(session.scalars(select(code).where(or_(*wanted)))) if wanted else []


def _lots(session: Session, lot_ids: Iterable[str] | None) -> list[LotOnShelf]:
    ids = None if lot_ids is None else list(lot_ids)
    lots = select(Lot).order_by(Lot.made_at.desc(), Lot.id)
    later = aliased(Certificate)
    standing = (
        select(Certificate)
        .outerjoin(later, later.replaces_id == Certificate.id)
        .where(later.id.is_(None))
    )
    pulls = select(Pull.lot_id).where(Pull.confirmed_at.is_not(None))
    if ids is not None:
        lots = lots.where(Lot.id.in_(ids))
        standing = standing.where(Certificate.lot_id.in_(ids))
        pulls = pulls.where(Pull.lot_id.in_(ids))
    certificates = {
        one.lot_id: StandingCertificate(one, json.loads(one.document))
        for one in session.scalars(standing)
    }
    pulled = set(session.scalars(pulls))
    holds = standing_holds(session, ("lot",), thing_ids=ids)
    return [
        LotOnShelf(one, certificates.get(one.id), holds.get(("lot", one.id)), one.id in pulled)
        for one in session.scalars(lots)
    ]
