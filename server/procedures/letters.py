"""Letters about changes: written once for each change, tried until the server has taken them."""

from collections.abc import Iterable
from dataclasses import dataclass
from datetime import datetime, timedelta
from uuid import uuid4

from sqlalchemy.orm import Session

from server.records.queries.list_letters import letter_of, next_letter
from server.records.tables.shelf import Letter

_FIRST_WAIT = timedelta(minutes=1)


@dataclass(frozen=True, slots=True)
class NewLetter:
    """A letter about one change of a watched thing."""

    watch_id: str
    changed_at: datetime
    address: str
    subject: str
    body: str


@dataclass(frozen=True, slots=True)
class TakenLetter:
    """A letter that this process sends now; nobody else tries it before its wait is over."""

    id: str
    address: str
    subject: str
    body: str


def keep_letters(session: Session, letters: Iterable[NewLetter], *, now: datetime) -> int:
    """Keep letters that are not written yet; return how many were new."""
    new = 0
    for one in letters:
        if letter_of(session, one.watch_id, one.changed_at) is not None:
            continue
        row = Letter(
            id=str(uuid4()),
            watch_id=one.watch_id,
            changed_at=one.changed_at,
            address=one.address,
            subject=one.subject,
            body=one.body,
            next_try_at=now,
            tries=0,
        )
        session.add(row)
        session.flush()
        new += 1
    return new


def take_letter(session: Session, *, now: datetime) -> TakenLetter | None:
    """Return a letter to be sent now, None where none is due; each try doubles the next wait."""
    row = next_letter(session, now=now)
    if row is None:
        return None
    row.next_try_at = now + _FIRST_WAIT * 2**row.tries
    row.tries += 1
    session.flush()
    return TakenLetter(row.id, row.address, row.subject, row.body)


def record_sent(session: Session, letter_id: str, *, now: datetime) -> None:
    """Write down that the server has taken a letter."""
    row = session.get_one(Letter, letter_id)
    row.sent_at, row.problem = now, None
    session.flush()


def record_unsent(session: Session, letter_id: str, problem: str) -> None:
    """Write down why a letter could not be sent this time."""
    session.get_one(Letter, letter_id).problem = problem
    session.flush()
