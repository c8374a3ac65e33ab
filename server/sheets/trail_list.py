"""All lines of the trail that answer to a filter, to be taken out."""

from datetime import datetime

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.refusal import Unacceptable
from server.records.queries.list_trail import trail_rows
from server.sheets.countersign import TrailLine
from server.sheets.parts.acts import trail_lines
from server.sheets.parts.doors import need_reader
from server.sheets.trail_page import trail_filter

MOST_LINES = 50_000


def open_trail_list(
    session: Session, *, person: str, thing: str, day: str, actor: Actor | None, now: datetime
) -> tuple[TrailLine, ...]:
    """Return every line that answers, the newest first.

    Raises:
        NotSignedIn: a visitor.
        Unacceptable: ``day`` is no day, or more lines answer than go into one file.
    """
    del now
    reader = need_reader(actor)
    wanted = trail_filter(person, thing, day, reader.zone)
    rows = trail_rows(session, wanted, offset=0, most=MOST_LINES + 1)
    if len(rows) > MOST_LINES:
        says = f"More than {MOST_LINES} lines answer to this: take them out day by day."
        raise Unacceptable(says, field="day", example="2026-05-31")
    return trail_lines(rows, reader.zone)
