"""What bottles were used for, line by line in ink."""

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime

from sqlalchemy import select
from sqlalchemy.orm import Session, aliased

from server.records.tables.lots import Bottle
from server.records.tables.people import Person
from server.records.tables.shelf import AccessToken, BottleUse


@dataclass(frozen=True, slots=True)
class KeptUse:
    """A use with the bottle's code, who wrote it, by which token, and how it was struck."""

    row: BottleUse
    bottle: str
    by: str
    token: str
    struck_by: str
    struck_why: str


def uses_of_lot(session: Session, lot_id: str) -> list[KeptUse]:
    """Return the uses of all bottles of a lot, used last first, struck ones among them."""
    return _kept(session, Bottle.lot_id == lot_id)


def uses_of_bottle(session: Session, bottle_id: str) -> list[KeptUse]:
    """Return the uses of a bottle, used last first, struck ones among them."""
    return _kept(session, Bottle.id == bottle_id)


def same_uses(session: Session, bottle_id: str, result_id: str) -> Sequence[BottleUse]:
    """Return the standing uses of a bottle for one result."""
    strike = aliased(BottleUse)
    return session.scalars(
        select(BottleUse)
        .outerjoin(strike, strike.strikes == BottleUse.id)
        .where(
            BottleUse.bottle_id == bottle_id,
            BottleUse.result_id == result_id,
            BottleUse.strikes.is_(None),
            strike.id.is_(None),
        )
    ).all()


def use_that_strikes(session: Session, use_id: str) -> BottleUse | None:
    """Return the line that strikes a use through, or None where it stands."""
    return session.scalar(select(BottleUse).where(BottleUse.strikes == use_id))


def _kept(session: Session, where: object) -> list[KeptUse]:
    strike, striker = aliased(BottleUse), aliased(Person)
    rows = session.execute(
        select(
            BottleUse, Bottle.code, Person.printed_name, AccessToken.name,
            striker.printed_name, strike.reason,
        )
        .join(Bottle, Bottle.id == BottleUse.bottle_id)
        .join(Person, Person.id == BottleUse.person_id)
        .outerjoin(AccessToken, AccessToken.id == BottleUse.token_id)
        .outerjoin(strike, strike.strikes == BottleUse.id)
        .outerjoin(striker, striker.id == strike.person_id)
        .where(where, BottleUse.strikes.is_(None))  # type: ignore[arg-type]
        .order_by(BottleUse.used_at.desc(), BottleUse.at.desc(), BottleUse.id)
    )  # fmt: skip
    return [
        KeptUse(row, code, by, token or "", struck_by or "", struck_why or "")
        for row, code, by, token, struck_by, struck_why in rows
    ]


def used_since(uses: Sequence[KeptUse], since: datetime) -> list[KeptUse]:
    """Return the uses at or after an instant that nobody struck through."""
    return [one for one in uses if one.row.used_at >= since and not one.struck_by]
