"""Bench sheets in lists: open ones, those that wait, those of a lot or standard lot."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from sqlalchemy import ColumnElement, func, select
from sqlalchemy.orm import Session

from server.records.tables.bench import Entry, Evaluation, Sheet
from server.records.tables.lots import Lot
from server.records.tables.people import Person

_WAITS = (
    Sheet.handed_in_at.is_not(None),
    Sheet.sent_back_at.is_(None),
    Sheet.countersigned_at.is_(None),
    Sheet.abandoned_at.is_(None),
)
_OPEN = (
    Sheet.countersigned_at.is_(None),
    Sheet.abandoned_at.is_(None),
    Sheet.handed_in_at.is_(None) | Sheet.sent_back_at.is_not(None),
)


@dataclass(frozen=True, slots=True)
class ListedSheet:
    """A sheet with its lot, who began it, and how many entries it holds."""

    sheet: Sheet
    lot: Lot
    begun_by: str
    entries: int


def open_sheets(session: Session) -> list[ListedSheet]:
    """Return the sheets that are open or sent back, begun last first."""
    return _listed(session, _select().where(*_OPEN).order_by(Sheet.begun_at.desc()))


def sheets_of_lot(session: Session, lot_id: str) -> list[ListedSheet]:
    """Return all sheets of a lot, begun last first."""
    return _listed(session, _select(Sheet.lot_id == lot_id).order_by(Sheet.begun_at.desc()))


def sheets_written_on(session: Session, sheet_ids: Sequence[str], person_id: str) -> set[str]:
    """Return which of the sheets a person has written on."""
    found = session.scalars(
        select(Entry.sheet_id)
        .where(Entry.sheet_id.in_(sheet_ids), Entry.person_id == person_id)
        .distinct()
    )
    return set(found)


def count_waiting(session: Session) -> int:
    """Return how many sheets wait for a second person."""
    return session.scalar(select(func.count()).select_from(Sheet).where(*_WAITS)) or 0


def waiting_sheet_ids(session: Session) -> list[str]:
    """Return the sheets that wait for a second person, longest waiting first."""
    ordered = select(Sheet.id).where(*_WAITS).order_by(Sheet.handed_in_at, Sheet.number)
    return list(session.scalars(ordered))


def done_sheet_ids(session: Session, *, most: int) -> list[str]:
    """Return the sheets that were countersigned last, the newest first."""
    done = select(Sheet.id).where(Sheet.countersigned_at.is_not(None))
    return list(session.scalars(done.order_by(Sheet.countersigned_at.desc()).limit(most)))


def sheets_on_standard_lot(session: Session, standard_lot_id: str) -> list[Sheet]:
    """Return the sheets that weigh a standard lot, begun last first."""
    used = select(Sheet).where(Sheet.standard_lot_id == standard_lot_id)
    return list(session.scalars(used.order_by(Sheet.begun_at.desc())))


def snapshots_of(session: Session, sheet_id: str) -> dict[str, str]:
    """Return the kept text of each evaluation of a sheet, by the evaluation's id."""
    rows = session.execute(
        select(Evaluation.id, Evaluation.snapshot).where(Evaluation.sheet_id == sheet_id)
    )
    return {row.id: row.snapshot for row in rows}


def _select(*where: ColumnElement[bool]) -> Any:
    joined = select(Sheet, Lot, Person.printed_name)
    joined = joined.join(Lot, Lot.id == Sheet.lot_id).join(Person, Person.id == Sheet.begun_by)
    return joined.where(*where)


def _listed(session: Session, asked: Any) -> list[ListedSheet]:
    rows = session.execute(asked).all()
    ids = [sheet.id for sheet, _, _ in rows]
    counted = session.execute(
        select(Entry.sheet_id, func.count()).where(Entry.sheet_id.in_(ids)).group_by(Entry.sheet_id)
    )
    entries = {row[0]: row[1] for row in counted}
    return [ListedSheet(sheet, lot, name, entries.get(sheet.id, 0)) for sheet, lot, name in rows]
