"""Lines in the logs of standard lots and instruments, with what was struck through."""

from collections.abc import Sequence
from datetime import datetime

from sqlalchemy import select
from sqlalchemy.orm import Session

from server.lab.sheet_facts import LogFact, PersonFact, StrikeFact
from server.records.tables.people import Person
from server.records.tables.stores import Log


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
    asked = (
        select(Log, Person)
        .join(Person, Person.id == Log.person_id)
        .where(Log.kind == kind, Log.thing_id.in_(thing_ids))
        .order_by(Log.at, Log.id)
    )
    if since is not None:
        asked = asked.where((Log.at >= since) | Log.what.in_(always))
    rows = session.execute(asked).all()
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
