"""All lines of the trail that answer to a filter, to be taken out."""

from collections.abc import Sequence
from datetime import datetime
from typing import Any, TypeVar

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.refusal import Unacceptable
from server.records.queries.list_trail import trail_rows, trail_rows_forward
from server.sheets.countersign import TrailLine
from server.sheets.parts.acts import trail_lines
from server.sheets.parts.doors import need_reader
from server.sheets.trail_page import trail_filter

MOST_LINES = 50_000
_COLUMNS = (
    "seq", "at", "zone", "person_id", "person_name", "act", "kind", "thing_id", "thing_name", "why",
    "body", "previous_hash", "hash",
)  # fmt: skip
T = TypeVar("T")


def open_trail_list(
    session: Session,
    *,
    person: str,
    thing: str,
    day: str,
    actor: Actor | None,
    now: datetime,
    words: str = "",
) -> tuple[TrailLine, ...]:
    """Return every line that answers, the newest first.

    Raises:
        NotSignedIn: a visitor.
        Unacceptable: ``day`` is no day, or more lines answer than go into one file.
    """
    del now
    reader = need_reader(actor)
    wanted = trail_filter(person, thing, day, words, zone=reader.zone)
    rows = trail_rows(session, wanted, offset=0, most=MOST_LINES + 1)
    return trail_lines(_not_too_many(rows), reader.zone)


def open_trail_record(
    session: Session,
    *,
    person: str,
    thing: str,
    day: str,
    actor: Actor | None,
    now: datetime,
    words: str = "",
) -> tuple[dict[str, Any], ...]:
    """Return every row that answers as it is kept, the oldest first, instants in ISO 8601.

    Raises:
        NotSignedIn: a visitor.
        Unacceptable: ``day`` is no day, or more rows answer than go into one file.
    """
    del now
    reader = need_reader(actor)
    wanted = trail_filter(person, thing, day, words, zone=reader.zone)
    rows = _not_too_many(trail_rows_forward(session, wanted, most=MOST_LINES + 1))
    return tuple(
        {name: getattr(row, name) for name in _COLUMNS} | {"at": row.at.isoformat()} for row in rows
    )


def _not_too_many(rows: Sequence[T]) -> Sequence[T]:
    if len(rows) > MOST_LINES:
        says = f"More than {MOST_LINES} lines answer to this: take them out day by day."
        raise Unacceptable(says, field="day", example="2026-05-31")
    return rows
