"""Bench sheets as lines of a list."""

from datetime import datetime

from server.lab.states import ABANDONED, COUNTERSIGNED, HANDED_IN, SENT_BACK, sheet_state
from server.records.queries.list_sheets import ListedSheet
from server.records.tables.bench import Sheet
from server.records.tables.lots import Lot
from server.sheets.bench import SheetLine
from server.sheets.parts.shelf_state import nominal_words
from server.sheets.parts.telling import count_words, moment_words


def sheet_title(titrant: str, nominal: str) -> str:
    """Return what is standardized, in a few characters."""
    return f"{titrant} {nominal_words(nominal)}"


def state_of_sheet(sheet: Sheet) -> str:
    """Return the state of a sheet's row."""
    return sheet_state(
        handed_in_at=sheet.handed_in_at,
        sent_back_at=sheet.sent_back_at,
        countersigned_at=sheet.countersigned_at,
        abandoned_at=sheet.abandoned_at,
    )


def sheet_line(one: ListedSheet, zone: str, *, certified: str = "") -> SheetLine:
    """Return a sheet as a line; ``certified`` is what its certificate says, where it has one."""
    sheet, lot = one.sheet, one.lot
    state = state_of_sheet(sheet)
    return SheetLine(
        id=sheet.id,
        number=sheet.number,
        title=sheet_title(lot.titrant, lot.nominal),
        lot_name=lot.name,
        state=state,
        says=_says(one, state, zone, certified),
        url=sheet_url(sheet, state),
    )


def sheet_url(sheet: Sheet, state: str) -> str:
    """Return the page on which a sheet in this state is read."""
    room = "countersign" if state in {HANDED_IN, COUNTERSIGNED} else "bench"
    return f"/{room}/{sheet.id}"


def _says(one: ListedSheet, state: str, zone: str, certified: str) -> str:
    sheet = one.sheet

    def when(at: datetime | None) -> str:
        return moment_words(at, zone) if at else ""

    begun = f"begun {when(sheet.begun_at)} by {one.begun_by}"
    return {
        SENT_BACK: f"sent back: “{sheet.sent_back_remark or ''}”",
        HANDED_IN: f"handed in {when(sheet.handed_in_at)}",
        COUNTERSIGNED: certified or f"countersigned {when(sheet.countersigned_at)}",
        ABANDONED: f"{begun}, abandoned {when(sheet.abandoned_at)}",
    }.get(state, f"{begun}, {count_words(one.entries, 'entry', 'entries')}")


def lot_words(lot: Lot) -> str:
    """Return a lot's titrant and nominal concentration."""
    return sheet_title(lot.titrant, lot.nominal)
