"""Uses of one bottle, or of all bottles of a lot since a day."""

from datetime import date, datetime

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.roles import Act
from server.lab.validity import read_day
from server.records.queries.list_bottle_uses import uses_of_bottle, uses_of_lot
from server.records.queries.list_watches import bottle_histories
from server.records.tables.lots import Bottle
from server.sheets.parts.by_code import find_bottle, find_lot
from server.sheets.parts.doors import need_reader
from server.sheets.parts.uses import MOST, uses_view
from server.sheets.uses import UsesView


def open_uses_of_bottle(
    session: Session, code: str, *, actor: Actor | None, now: datetime
) -> UsesView:
    """Return what one bottle was used for.

    Raises:
        NotFound: no bottle has this code; ``shown["nearest"]`` holds codes close to it.
        NotSignedIn: a visitor.
    """
    del now
    reader = need_reader(actor)
    return uses_of(session, find_bottle(session, code).bottle, reader=reader)


def open_uses_of_lot(
    session: Session,
    code: str,
    *,
    since: str,
    actor: Actor | None,
    now: datetime,
    whole: bool = False,
) -> UsesView:
    """Return what all bottles of a lot were used for, from a day on where one is given.

    ``whole``: however many there are.

    Raises:
        NotFound: no lot has this code; ``shown["nearest"]`` holds codes close to it.
        NotSignedIn: a visitor.
        Unacceptable: ``since`` is no day.
    """
    del now
    reader = need_reader(actor)
    day = read_day(since, "since") if since.strip() else None
    lot = find_lot(session, code)
    return lot_uses(session, lot.id, since=day, reader=reader, most=None if whole else MOST)


def lot_uses(
    session: Session,
    lot_id: str,
    *,
    since: date | None,
    reader: Actor,
    most: int | None = MOST,
) -> UsesView:
    """Return what the bottles of a lot were used for."""
    return uses_view(
        uses_of_lot(session, lot_id),
        bottle_histories(session, lot_id),
        since=since,
        most=most,
        zone=reader.zone,
        may_write=reader.may(Act.USE),
    )


def uses_of(session: Session, bottle: Bottle, *, reader: Actor) -> UsesView:
    """Return what a bottle was used for."""
    return uses_view(
        uses_of_bottle(session, bottle.id),
        bottle_histories(session, bottle.lot_id),
        since=None,
        most=MOST,
        zone=reader.zone,
        may_write=reader.may(Act.USE),
    )
