"""Sessions and failed sign-ins."""

from datetime import datetime

from sqlalchemy import select
from sqlalchemy.orm import Session

from server.records.tables.bench import Signature
from server.records.tables.people import SignIn, SignInFailure


def end_sign_ins(session: Session, person_id: str, *, now: datetime) -> None:
    """End all of a person's sessions that have not ended yet."""
    rows = session.scalars(
        select(SignIn).where(SignIn.person_id == person_id, SignIn.ended_at.is_(None))
    )
    for row in rows:
        row.ended_at = now


def failures_of(session: Session, key: str, *, lock: bool = False) -> SignInFailure | None:
    """Return the failures in a row of an account or a source."""
    return session.get(SignInFailure, key, with_for_update=lock)


def signed_since(session: Session, person_id: str, at: datetime) -> bool:
    """Say whether a person has set a signature at or after an instant."""
    found = select(Signature.id).where(Signature.person_id == person_id, Signature.at >= at)
    return session.scalar(found.limit(1)) is not None
