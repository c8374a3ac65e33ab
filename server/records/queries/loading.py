"""Rows that the procedures need by name or relation, and numbers of a series."""

from collections.abc import Sequence

from sqlalchemy import func, select
from sqlalchemy.orm import Session

from server.lab.refusal import NotFound
from server.records.tables.people import Laboratory, Person
from server.records.tables.stores import Calibration, Hold, Instrument, Log, Recipe, StandardLot
from server.records.tables.trail import Counter


def laboratory_row(session: Session) -> Laboratory:
    """Return the laboratory's one row.

    Raises:
        NotFound: the laboratory is not set up yet.
    """
    row: Laboratory | None = session.scalar(select(Laboratory))
    if row is None:
        raise NotFound("This laboratory is not set up yet.")
    return row


def there_is_a_laboratory(session: Session) -> bool:
    """Say whether the laboratory is set up."""
    return session.scalar(select(func.count()).select_from(Laboratory)) != 0


def there_is_anybody(session: Session) -> bool:
    """Say whether there is any person."""
    return session.scalar(select(func.count()).select_from(Person)) != 0


def person_by_name(session: Session, sign_in_name: str) -> Person | None:
    """Return the person of a sign-in name as it is kept."""
    return session.scalar(select(Person).where(Person.sign_in_name == sign_in_name))


def other_stewards(session: Session, person_id: str) -> int:
    """Return how many other active stewards there are."""
    rows = session.scalars(select(Person).where(Person.id != person_id))
    return sum(1 for row in rows if row.active and "steward" in row.roles)


def newest_recipe_version(session: Session, name: str) -> int:
    """Return the newest version's number of a recipe's name, 0 where there is none."""
    return session.scalar(select(func.max(Recipe.version)).where(Recipe.name == name)) or 0


def standard_lot_by_name(session: Session, name: str) -> StandardLot | None:
    """Return the standard lot of a name."""
    return session.scalar(select(StandardLot).where(StandardLot.name == name))


def instrument_by_name(session: Session, name: str) -> Instrument | None:
    """Return the instrument of a name."""
    return session.scalar(select(Instrument).where(Instrument.name == name))


def newest_calibration(session: Session, instrument_id: str) -> Calibration | None:
    """Return the newest version of an instrument's calibration: the one that serves."""
    return session.scalar(
        select(Calibration)
        .where(Calibration.instrument_id == instrument_id)
        .order_by(Calibration.version.desc())
        .limit(1)
    )


def holds_of(session: Session, kind: str, thing_id: str) -> Sequence[Hold]:
    """Return all holds of a thing, oldest first."""
    return session.scalars(
        select(Hold)
        .where(Hold.kind == kind, Hold.thing_id == thing_id)
        .order_by(Hold.held_at, Hold.id)
    ).all()


def standing_hold(session: Session, kind: str, thing_id: str) -> Hold | None:
    """Return the hold of a thing that nobody has released yet."""
    return session.scalar(
        select(Hold).where(Hold.kind == kind, Hold.thing_id == thing_id, Hold.released_at.is_(None))
    )


def line_that_strikes(session: Session, line_id: str) -> Log | None:
    """Return the line that strikes a line of a log through, or None where it stands."""
    return session.scalar(select(Log).where(Log.strikes == line_id))


def next_number(session: Session, series: str) -> int:
    """Return the next number of a series, counting from 1; the row is locked until the commit."""
    counter = session.get(Counter, series, with_for_update=True)
    if counter is None:
        counter = Counter(series=series, last=0)
        session.add(counter)
    counter.last += 1
    session.flush()
    return counter.last
