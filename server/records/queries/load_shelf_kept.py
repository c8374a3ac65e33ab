"""Lots and bottles as they stand, for checking them against what the trail noted of them."""

from collections.abc import Iterator
from datetime import datetime
from typing import Any, NamedTuple

from sqlalchemy import select
from sqlalchemy.orm import Session

from server.records.tables.lots import Bottle, Lot
from server.records.trail import DoesNotHold, fetched

MADE_UP, FILLED = "made up a lot", "filled a bottle"


class Shelved(NamedTuple):
    """A lot or bottle as it stands: whose act brought it there, and what is to be as noted."""

    act: str
    thing_id: str
    name: str
    person_id: str
    at: datetime
    body: dict[str, Any]


def things_as_they_stand(session: Session) -> Iterator[Shelved]:
    """Yield each lot, then each bottle.

    Raises:
        DoesNotHold: something of them can no longer be read.
    """
    for lot in fetched(session, select(*Lot.__table__.columns), "A lot"):
        if not isinstance(lot.document, dict):
            says = f"What lot {lot.name} was made from cannot be read: it is damaged."
            raise DoesNotHold(says)
        body = {"code": lot.code, "titrant": lot.titrant, "nominal": lot.nominal}
        body |= {"medium": lot.medium, **lot.document}
        yield Shelved(MADE_UP, lot.id, lot.name, lot.made_by, lot.made_at, body)
    columns = (*Bottle.__table__.columns, Lot.name.label("lot_name"))
    bottles = select(*columns).outerjoin(Lot, Lot.id == Bottle.lot_id)
    for one in fetched(session, bottles, "A bottle"):
        body = {"lot": one.lot_name, "number": one.number, "volume_mL": one.volume_mL}
        yield Shelved(FILLED, one.id, one.code, one.filled_by, one.filled_at, body)
