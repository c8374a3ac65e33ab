"""Lines in the logs of standard lots and instruments, with what was struck through."""

from collections.abc import Sequence
from datetime import datetime
from typing import Any

from sqlalchemy import bindparam, select
from sqlalchemy.orm import Session

from server.lab.sheet_facts import LogFact, PersonFact, StrikeFact
from server.records.queries.by_ids import IDS, any_of
from server.records.tables.people import Person
from server.records.tables.stores import Log

_LINES = (
    select(Log, Person)
    .join(Person, Person.id == Log.person_id)
    .where(Log.kind == bindparam("kind"), Log.thing_id.in_(any_of()))
    .order_by(Log.at, Log.id)
)
_LINES_SINCE = _LINES.where(
    (Log.at >= bindparam("since")) | Log.what.in_(bindparam("always", expanding=True))
)


def log_lines(
    session: Session,
    kind: str,
    thing_ids: Sequence[str],
    *,
    since: datetime | None = None,
    always: Sequence[str] = (),
) -> dict[str, tuple[LogFact, ...]]:
    """Return the lines about some things of one kind, oldest first, by the thing.

    ``since`` leaves out what was written earlier, but for the kinds of line in ``always``.
    """
    told: dict[str, Any] = {"kind": kind, IDS: list(thing_ids)}
    if since is None:
        rows = session.execute(_LINES, told).all()
    else:
        told |= {"since": since, "always": list(always)}
        rows = session.execute(_LINES_SINCE, told).all()
    strikes = {
        row.strikes: StrikeFact(_person(person), row.at, row.reason or "")
        for row, person in rows
        if row.strikes
    }
    found: dict[str, tuple[LogFact, ...]] = {}
    for row, person in rows:
        if row.strikes:
            continue
        line = LogFact(
            id=row.id,
            what=row.what,
            document=row.document,
            by=_person(person),
            at=row.at,
            struck=strikes.get(row.id),
        )
        found[row.thing_id] = (*found.get(row.thing_id, ()), line)
    return found


def _person(row: Person) -> PersonFact:
    return PersonFact(row.id, row.printed_name, row.initials)
