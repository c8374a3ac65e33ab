"""Holds: those that stand, and all that a thing ever had, with who held and released."""

from collections.abc import Iterable
from dataclasses import dataclass
from datetime import datetime

from sqlalchemy import select
from sqlalchemy.orm import Session, aliased

from server.records.tables.people import Person
from server.records.tables.stores import Hold


@dataclass(frozen=True, slots=True)
class StandingHold:
    """A doubt that stands: who, since when, why."""

    held_by: str
    printed_name: str
    held_at: datetime
    reason: str


@dataclass(frozen=True, slots=True)
class PastHold:
    """A hold with its release, None where it stands."""

    held_by: str
    held_at: datetime
    reason: str
    released_by: str | None
    released_at: datetime | None
    release_reason: str | None


def hold_history(session: Session, kind: str, thing_id: str) -> list[PastHold]:
    """Return all holds of a thing, the newest first."""
    holder, releaser = aliased(Person), aliased(Person)
    rows = session.execute(
        select(Hold, holder.printed_name, releaser.printed_name)
        .join(holder, holder.id == Hold.held_by)
        .outerjoin(releaser, releaser.id == Hold.released_by)
        .where(Hold.kind == kind, Hold.thing_id == thing_id)
        .order_by(Hold.held_at.desc(), Hold.id)
    )
    return [
        PastHold(held_by, row.held_at, row.reason, released_by, row.released_at, row.release_reason)
        for row, held_by, released_by in rows
    ]


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
