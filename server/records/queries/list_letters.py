"""Letters that wait to be sent, and how far each watch has been written about."""

from collections.abc import Iterable, Sequence
from datetime import datetime

from sqlalchemy import func, select
from sqlalchemy.orm import Session

from server.records.tables.shelf import Letter, Watch

MOST_TRIES = 10


def written_until(session: Session, watch_ids: Iterable[str]) -> dict[str, datetime]:
    """Return the last change of each watch that a letter was written about."""
    rows = session.execute(
        select(Letter.watch_id, func.max(Letter.changed_at))
        .where(Letter.watch_id.in_(list(watch_ids)))
        .group_by(Letter.watch_id)
    )
    return {row[0]: row[1] for row in rows}


def letter_of(session: Session, watch_id: str, changed_at: datetime) -> Letter | None:
    """Return the letter about one change of a watch."""
    return session.scalar(
        select(Letter).where(Letter.watch_id == watch_id, Letter.changed_at == changed_at)
    )


def due_letters(session: Session, *, now: datetime) -> Sequence[str]:
    """Return the ids of letters that are to be sent now, the oldest change first."""
    return session.scalars(
        select(Letter.id)
        .where(Letter.sent_at.is_(None), Letter.next_try_at <= now, Letter.tries < MOST_TRIES)
        .order_by(Letter.changed_at, Letter.id)
    ).all()


def next_letter(session: Session, *, now: datetime) -> Letter | None:
    """Return a letter that is to be sent now, locked; what another process holds is passed over."""
    return session.scalar(
        select(Letter)
        .where(Letter.sent_at.is_(None), Letter.next_try_at <= now, Letter.tries < MOST_TRIES)
        .order_by(Letter.changed_at, Letter.id)
        .limit(1)
        .with_for_update(skip_locked=True)
    )


def unsent_problem(session: Session, person_id: str) -> str:
    """Return why a person's last unsent letter could not be sent; empty where none waits."""
    found = session.scalar(
        select(Letter.problem)
        .join(Watch, Watch.id == Letter.watch_id)
        .where(Watch.person_id == person_id, Letter.sent_at.is_(None), Letter.problem.is_not(None))
        .order_by(Letter.changed_at.desc())
        .limit(1)
    )
    return found or ""
