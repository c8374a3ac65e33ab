"""The people of the laboratory in a list."""

from sqlalchemy import select
from sqlalchemy.orm import Session

from server.records.tables.people import Person


def all_people(session: Session) -> list[Person]:
    """Return everybody, those with an open account first, by name."""
    rows = session.scalars(select(Person)).all()
    return sorted(rows, key=lambda one: (not one.active, one.printed_name.casefold(), one.id))
