"""Holds that nobody has released yet, with who holds."""

from collections.abc import Iterable
from dataclasses import dataclass
from datetime import datetime

from sqlalchemy import select
from sqlalchemy.orm import Session

from server.records.tables.people import Person
from server.records.tables.stores import Hold


@dataclass(frozen=True, slots=True)
class StandingHold:
    """A doubt that stands: who, since when, why."""

    held_by: str
    printed_name: str
    held_at: datetime
    reason: str


def standing_holds(
    session: Session, kinds: Iterable[str], *, thing_ids: Iterable[str] | None = None
) -> dict[tuple[str, str], StandingHold]:
    """Return the standing holds of some kinds of things, by kind and thing.

    ``thing_ids`` asks for some things only.
    """
    asked = (
        select(Hold, Person.printed_name)
        .join(Person, Person.id == Hold.held_by)
        .where(Hold.kind.in_(list(kinds)), Hold.released_at.is_(None))
        .order_by(Hold.held_at.desc(), Hold.id)
    )
    if thing_ids is not None:
        asked = asked.where(Hold.thing_id.in_(list(thing_ids)))
    return {
        (row.kind, row.thing_id): StandingHold(row.held_by, name, row.held_at, row.reason)
        for row, name in session.execute(asked)
    }
