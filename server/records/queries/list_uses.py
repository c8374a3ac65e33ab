"""Where standard lots were weighed and what was taken of them."""

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime
from decimal import Decimal

from sqlalchemy import select
from sqlalchemy.orm import Session

from server.lab.in_use import MASS_SLOTS
from server.lab.lot_uses import Taken, taken_by_hand, weighed_masses
from server.lab.sheet_facts import STANDARD_LOT
from server.records.queries.list_log import log_lines
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
    weighings = _weighings(session, lot_ids)
    found: dict[str, tuple[SheetOnLot, ...]] = {}
    for sheet, name, number in rows:
        lot_id = sheet.standard_lot_id or ""
        used = SheetOnLot(sheet, name, number, weighings.get(sheet.id, ()))
        found[lot_id] = (*found.get(lot_id, ()), used)
    return found


def all_taken(
    session: Session, lot_id: str, sheets: Sequence[SheetOnLot] | None = None
) -> tuple[Taken, ...]:
    """Return all that was taken of one lot: on sheets, and by hand in its log."""
    found = sheets_on_lots(session, (lot_id,)).get(lot_id, ()) if sheets is None else sheets
    log = log_lines(session, STANDARD_LOT, (lot_id,)).get(lot_id, ())
    return (*taken_on_sheets(found), *taken_by_hand(log))


def taken_on_sheets(sheets: Sequence[SheetOnLot]) -> tuple[Taken, ...]:
    """Return what each sheet took, at the time of its last weighing."""
    return tuple(
        Taken(
            at=max(one.at for one in used.weighings),
            mass_g=sum(masses, Decimal(0)),
            what=f"{len(masses)} weighing{'s' if len(masses) != 1 else ''}",
            by=used.begun_by,
            sheet_id=used.sheet.id,
        )
        for used in sheets
        if (masses := weighed_masses((one.replicate, one.slot, one.text) for one in used.weighings))
    )


def _weighings(session: Session, lot_ids: Sequence[str]) -> dict[str, tuple[WeighedEntry, ...]]:
    """Return the readings of balances that nobody struck through, by sheet."""
    rows = session.execute(
        select(
            Entry.id, Entry.sheet_id, Entry.strikes, Entry.replicate, Entry.slot, Entry.text,
            Entry.received_at,
        )
        .join(Sheet, Sheet.id == Entry.sheet_id)
        .where(Sheet.standard_lot_id.in_(lot_ids), Entry.slot.in_(MASS_SLOTS))
        .order_by(Entry.sheet_id, Entry.position)
    ).all()  # fmt: skip
    struck = {row.strikes for row in rows if row.strikes}
    found: dict[str, tuple[WeighedEntry, ...]] = {}
    for row in rows:
        if row.id not in struck and row.text.strip():
            read = WeighedEntry(row.replicate, row.slot, row.text, row.received_at)
            found[row.sheet_id] = (*found.get(row.sheet_id, ()), read)
    return found
