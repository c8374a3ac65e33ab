"""Standard lots as plain values: with their holds, their logs, and the rule that ends them."""

from datetime import datetime

from sqlalchemy import select
from sqlalchemy.orm import Session

from server.lab.lot_log import expiry_of_lot
from server.lab.refusal import NotFound
from server.lab.sheet_facts import STANDARD_LOT, HoldFact, LogFact, StandardLotFact
from server.records.queries.list_log import log_lines
from server.records.queries.list_stores import holds_by_thing
from server.records.queries.loading import laboratory_row
from server.records.tables.stores import StandardLot


def standard_lot_facts(
    session: Session, *, substance: str | None = None, lot_id: str | None = None
) -> list[StandardLotFact]:
    """Return the standard lots by name; of one substance, or one lot, where that is named."""
    asked = select(StandardLot).order_by(StandardLot.name)
    if substance is not None:
        asked = asked.where(StandardLot.substance == substance)
    if lot_id is not None:
        asked = asked.where(StandardLot.id == lot_id)
    rows = session.scalars(asked).all()
    ids = [row.id for row in rows]
    holds, logs = holds_by_thing(session, STANDARD_LOT, ids), log_lines(session, STANDARD_LOT, ids)
    zone = laboratory_row(session).zone
    return [
        standard_lot_fact(row, holds.get(row.id, ()), logs.get(row.id, ()), zone=zone)
        for row in rows
    ]


def load_standard_lot_fact(session: Session, standard_lot_id: str) -> StandardLotFact:
    """Return one standard lot.

    Raises:
        NotFound: there is no such standard lot.
    """
    found = standard_lot_facts(session, lot_id=standard_lot_id)
    if not found:
        raise NotFound("There is no such standard lot.", field="standard_lot_id")
    return found[0]


def standard_lot_fact(
    row: StandardLot,
    holds: tuple[HoldFact, ...],
    log: tuple[LogFact, ...],
    *,
    zone: str,
    as_of: datetime | None = None,
) -> StandardLotFact:
    """Return a standard lot's row as a plain value; its end by the log as it stood ``as_of``."""
    end = expiry_of_lot(row.document, (row.due_at, row.due_basis), log, zone=zone, as_of=as_of)
    return StandardLotFact(
        id=row.id,
        name=row.name,
        substance=row.substance,
        certificate_number=row.certificate_number,
        issuer=row.issuer,
        due_at=end.at,
        due_basis=end.basis,
        document=row.document,
        holds=holds,
        log=log,
    )
