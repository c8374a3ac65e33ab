"""Whether what is kept of a sheet is still what the trail noted, in words for a badge."""

from sqlalchemy.orm import Session

from server.lab.integrity import first_broken
from server.records.queries.load_kept import load_kept_sheet
from server.records.trail import DoesNotHold


def altered_says(session: Session, sheet_id: str) -> str:
    """Return what of a sheet, its signatures or its certificate was altered; empty if nothing."""
    try:
        return first_broken(load_kept_sheet(session, sheet_id)) or ""
    except DoesNotHold as broken:
        return broken.says
