"""Where standard lots were weighed, with the readings of each weighing that stands."""

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime

from sqlalchemy import select
from sqlalchemy.orm import Session

from server.lab.in_use import MASS_SLOTS
from server.records.tables.bench import Certificate, Entry, Sheet
from server.records.tables.people import Person


@dataclass(frozen=True, slots=True)
class WeighedEntry:
    """A reading of a balance that nobody struck through; replicates count from 1."""

    replicate: int
    slot: str
    text: str
    at: datetime


@dataclass(frozen=True, slots=True)
class SheetOnLot:
    """A sheet that weighs a standard lot: who began it, its weighings, its certificate."""

    sheet: Sheet
    begun_by: str
    certificate: str | None
    weighings: tuple[WeighedEntry, ...]


def sheets_on_lots(session: Session, lot_ids: Sequence[str]) -> dict[str, tuple[SheetOnLot, ...]]:
    """Return the sheets that weigh some standard lots, begun first, by the standard lot."""
    rows = session.execute(
        select(Sheet, Person.printed_name, Certificate.number)
        .join(Person, Person.id == Sheet.begun_by)
        .outerjoin(Certificate, Certificate.sheet_id == Sheet.id)
        .where(Sheet.standard_lot_id.in_(lot_ids))
        .order_by(Sheet.begun_at, Sheet.id)
    ).all()
    entries = session.scalars(
        select(Entry)
        .join(Sheet, Sheet.id == Entry.sheet_id)
        .where(Sheet.standard_lot_id.in_(lot_ids), Entry.slot.in_(MASS_SLOTS))
        .order_by(Entry.sheet_id, Entry.position)
    ).all()
    struck = {one.strikes for one in entries if one.strikes}
    weighings: dict[str, tuple[WeighedEntry, ...]] = {}
    for one in entries:
        if one.id not in struck and one.text.strip():
            read = WeighedEntry(one.replicate, one.slot, one.text, one.received_at)
            weighings[one.sheet_id] = (*weighings.get(one.sheet_id, ()), read)
    found: dict[str, tuple[SheetOnLot, ...]] = {}
    for sheet, name, number in rows:
        lot_id = sheet.standard_lot_id or ""
        used = SheetOnLot(sheet, name, number, weighings.get(sheet.id, ()))
        found[lot_id] = (*found.get(lot_id, ()), used)
    return found
